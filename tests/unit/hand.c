/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "hand.h"

#include "base/memory.h"

#include <check.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

static const char *const window_names[] = {"w1", "w2", "w3", "w4", "w5", "w6", "w7", "w8"};

static tarry_range range(uint32_t from, uint32_t to) {
    return (tarry_range){from, to};
}

void hand_init(hand *h, double settle, double until, uint32_t n_frames) {
    memset(h, 0, sizeof *h);
    tarry_network *network = &h->network;
    network->title = "";
    network->time_unit = "min";
    network->genes = h->genes;
    network->tracks = h->tracks;
    network->promoters = h->promoters;
    network->species = h->species;
    network->signals = h->signals;
    network->channels = h->channels;
    network->segments = h->segments;
    network->responses = h->responses;
    network->firsts = h->firsts;
    h->segments[0].start = -settle;
    network->n_segments = 1;
    tarry_run_plan *run = &network->run;
    run->settle = settle;
    run->until = until;
    run->n_frames = n_frames;
    run->every = n_frames > 1 ? until / (n_frames - 1) : until;
    run->n_lags = n_frames;
    run->n_snapshots = 1;
    run->snapshots = h->snapshots;
    h->snapshots[0] = until;
    run->windows = h->windows;
    run->bounds = h->bounds;
    hand_windows(h, (const double[]){0.0, until}, 1);
    h->windows[0].name = "all";
}

void hand_windows(hand *h, const double *bounds, uint32_t n) {
    tarry_run_plan *run = &h->network.run;
    ck_assert_uint_le(n, sizeof window_names / sizeof window_names[0]);
    memcpy(h->bounds, bounds, (n + 1) * sizeof *bounds);
    run->n_spans = run->n_windows = n;
    for (uint32_t w = 0; w < n; w++) {
        uint32_t from = 0, to = 0;
        while (from < run->n_frames && from * run->every < bounds[w])
            from++;
        for (to = from; to < run->n_frames; to++)
            if (w + 1 < n && to * run->every >= bounds[w + 1])
                break;
        h->windows[w] = (tarry_window){window_names[w], bounds[w], bounds[w + 1], range(w, w + 1),
                                       range(from, to)};
    }
}

void hand_step(hand *h, double at) {
    h->segments[h->network.n_segments++].start = at;
}

void hand_response(hand *h, double from, double to) {
    h->responses[h->network.n_responses++] = (tarry_response){from, to};
}

void hand_first(hand *h, const char *name) {
    h->firsts[h->network.n_firsts++] = (tarry_first){.name = name, .species = TARRY_NONE};
}

static uint32_t add_gene(hand *h, const char *name, uint32_t copies, bool tells, bool promoters) {
    tarry_network *network = &h->network;
    const uint32_t first = network->n_tracks, promoter = network->n_promoters;
    ck_assert_uint_le(first + copies, HAND_MOST);
    for (uint32_t i = 0; i < copies; i++) {
        h->tracks[first + i] = (tarry_track){
            name, promoters ? (int32_t)network->n_genes : TARRY_NONE, i, tells};
        if (promoters)
            h->promoters[network->n_promoters++] = (tarry_promoter){
                .gene = network->n_genes, .allele = i, .track = first + i};
    }
    network->n_tracks += copies;
    h->genes[network->n_genes] = (tarry_gene){.name = name,
                                              .promoters = range(promoter, network->n_promoters),
                                              .tracks = range(first, network->n_tracks),
                                              .n_copies = copies,
                                              .tells = tells};
    return network->n_genes++;
}

uint32_t hand_gene(hand *h, const char *name, uint32_t copies, bool tells) {
    return add_gene(h, name, copies, tells, true);
}

uint32_t hand_named(hand *h, const char *name) {
    return add_gene(h, name, 1, true, false);
}

void hand_species(hand *h, const char *name, int32_t gene) {
    tarry_network *network = &h->network;
    const int32_t species = (int32_t)network->n_species++;
    h->species[species] = (tarry_species){
        .name = name, .role = TARRY_SPECIES_PRODUCT, .gene = gene};
    h->channels[network->n_channels++] = (tarry_channel){.name = name,
                                                         .species = species,
                                                         .signal = TARRY_NONE,
                                                         .recorded = true,
                                                         .correlates = true};
}

void hand_signal(hand *h, const char *name, double background, double noise) {
    tarry_network *network = &h->network;
    const int32_t signal = (int32_t)network->n_signals++;
    h->signals[signal] = (tarry_signal){.name = name,
                                        .background = background,
                                        .noise = noise,
                                        .responds_above = NAN,
                                        .detects_above = NAN};
    h->channels[network->n_channels++] = (tarry_channel){.name = name,
                                                         .species = TARRY_NONE,
                                                         .signal = signal,
                                                         .recorded = true,
                                                         .correlates = true};
}

void hand_record(const hand *h, tarry_record *record, int64_t cell) {
    ck_assert_int_eq(tarry_record_init(record, &h->network, NULL), TARRY_OK);
    record->cell = cell;
    record->end = h->network.run.until;
    for (uint32_t i = 0; i < h->network.n_tracks; i++)
        record->status[i] = TARRY_TRACK_CLOSED;
}

void hand_mark(tarry_record *record, double time, uint32_t track, bool opens, int64_t count) {
    ck_assert_int_eq(tarry_grow((void **)&record->marks, &record->marks_capacity,
                                record->n_marks + 1, sizeof *record->marks),
                     0);
    record->marks[record->n_marks++] = (tarry_mark){time, track, opens, count};
}

void hand_counts(const hand *h, tarry_record *record, uint32_t track, const int64_t *counts) {
    for (uint32_t bound = 0; bound <= h->network.run.n_spans; bound++)
        record->counts[bound * h->network.n_tracks + track] = counts[bound];
}

int hand_try(const hand *h, const tarry_tally_kind *kind, const tarry_record *records, size_t n,
             tarry_results **results) {
    *results = NULL;
    tarry_tally_set *set = NULL;
    double *scratch = calloc(tarry_tally_set_scratch(&h->network) + 1, sizeof *scratch);
    int code = scratch ? tarry_tally_set_new_of(&h->network, &kind, 1, &set, NULL) : TARRY_MEMORY;
    for (size_t i = 0; !code && i < n; i++)
        code = tarry_tally_set_add(set, &records[i], scratch, NULL);
    if (!code)
        code = tarry_tally_set_finish(set, 1, NULL);
    if (!code)
        code = tarry_results_new(results, NULL);
    if (!code)
        code = tarry_tally_set_report(set, *results, NULL);
    tarry_tally_set_free(set);
    free(scratch);
    return code;
}

tarry_results *hand_results(const hand *h, const tarry_tally_kind *kind,
                            const tarry_record *records, size_t n) {
    tarry_results *results;
    ck_assert_int_eq(hand_try(h, kind, records, n, &results), TARRY_OK);
    return results;
}

size_t hand_row(const tarry_table *table, const char *first, const char *second,
                const char *third) {
    const char *const texts[] = {first, second, third};
    for (size_t row = 0; row < tarry_table_n_rows(table); row++) {
        bool same = true;
        for (int i = 0; i < 3 && texts[i]; i++)
            same = same && strcmp(tarry_table_text(table, row, i), texts[i]) == 0;
        if (same)
            return row;
    }
    ck_abort_msg("%s has no row %s %s %s", tarry_table_name(table), first, second ? second : "",
                 third ? third : "");
}

double hand_number(const tarry_table *table, size_t row, const char *column) {
    const int at = tarry_table_column(table, column);
    ck_assert_int_ge(at, 0);
    ck_assert_uint_lt(row, tarry_table_n_rows(table));
    return tarry_table_number(table, row, at);
}

bool hand_noted(const tarry_results *results, const char *text) {
    for (size_t i = 0; i < results->notes.n; i++)
        if (strstr(results->notes.lines[i], text))
            return true;
    return false;
}
