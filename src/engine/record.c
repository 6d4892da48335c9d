/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "engine/record.h"

#include "base/error.h"
#include "base/memory.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

uint32_t tarry_lag_bin(double x) {
    const double lowest = ldexp(1, TARRY_LAG_LOWEST);
    if (!(x >= lowest))
        return 0;
    uint64_t bits;
    memcpy(&bits, &x, sizeof bits);
    /* Exponent and the first three digits of the fraction count the bins of eight an octave. */
    const uint64_t bin = (bits >> 49) - (uint64_t)(1023 + TARRY_LAG_LOWEST) * TARRY_LAG_BINS_OCTAVE;
    return bin < TARRY_LAG_BINS ? (uint32_t)bin : TARRY_LAG_BINS - 1;
}

double tarry_lag_bin_start(uint32_t bin) {
    if (bin == 0)
        return 0;
    const uint32_t octave = bin / TARRY_LAG_BINS_OCTAVE;
    const uint32_t part = bin % TARRY_LAG_BINS_OCTAVE;
    return ldexp(1 + (double)part / TARRY_LAG_BINS_OCTAVE, TARRY_LAG_LOWEST + (int)octave);
}

static uint32_t count_recorded(const tarry_network *network) {
    uint32_t n = 0;
    for (uint32_t i = 0; i < network->n_channels; i++)
        n += network->channels[i].recorded;
    return n;
}

typedef struct record_shape {
    size_t frames, snapshots, counts, lags, bins, firsts;
} record_shape;

static record_shape shape_of(const tarry_network *network) {
    const tarry_run_plan *run = &network->run;
    const size_t n_lags = network->n_lags;
    return (record_shape){
        .frames = (size_t)count_recorded(network) * run->n_frames,
        .snapshots = (size_t)network->n_channels * run->n_snapshots,
        .counts = (size_t)(run->n_spans + 1) * network->n_tracks,
        .lags = n_lags * run->n_spans,
        .bins = n_lags <= TARRY_MOST_LAGS_WITH_BINS ? n_lags * TARRY_LAG_BINS : 0,
        .firsts = (size_t)network->n_responses * network->n_firsts,
    };
}

int tarry_record_init(tarry_record *record, const tarry_network *network, tarry_error *error) {
    *record = (tarry_record){.cell = -1, .n_recorded = count_recorded(network)};
    const record_shape shape = shape_of(network);
    record->frames = tarry_calloc(shape.frames, sizeof *record->frames);
    record->snapshots = tarry_calloc(shape.snapshots, sizeof *record->snapshots);
    record->status = tarry_calloc(network->n_tracks, sizeof *record->status);
    record->counts = tarry_calloc(shape.counts, sizeof *record->counts);
    record->firings = tarry_calloc(network->n_reactions, sizeof *record->firings);
    record->completions = tarry_calloc(network->n_lags, sizeof *record->completions);
    record->skipped = tarry_calloc(network->n_lags, sizeof *record->skipped);
    record->lags = tarry_calloc(shape.lags, sizeof *record->lags);
    record->firsts = tarry_calloc(shape.firsts, sizeof *record->firsts);
    record->under_way = tarry_calloc(shape.firsts, sizeof *record->under_way);
    record->lag_bins = shape.bins ? tarry_calloc(shape.bins, sizeof *record->lag_bins) : NULL;
    if (record->frames && record->snapshots && record->status && record->counts &&
        record->firings && record->completions && record->skipped && record->lags &&
        record->firsts && record->under_way && (record->lag_bins || !shape.bins))
        return TARRY_OK;
    tarry_record_release(record);
    return tarry_fail_memory(error, "the record of a cell");
}

void tarry_record_release(tarry_record *record) {
    free(record->frames);
    free(record->snapshots);
    free(record->marks);
    free(record->status);
    free(record->counts);
    free(record->firings);
    free(record->completions);
    free(record->skipped);
    free(record->lags);
    free(record->lag_bins);
    free(record->firsts);
    free(record->under_way);
    *record = (tarry_record){.cell = -1};
}

/* memset refuses NULL even for no bytes. */
static void zero(void *array, size_t n, size_t size) {
    if (n > 0 && array)
        memset(array, 0, n * size);
}

void tarry_record_reset(tarry_record *record, const tarry_network *network) {
    const record_shape shape = shape_of(network);
    record->cell = -1;
    record->n_marks = 0;
    record->end = 0;
    record->ignored = 0;
    zero(record->frames, shape.frames, sizeof *record->frames);
    zero(record->snapshots, shape.snapshots, sizeof *record->snapshots);
    zero(record->status, network->n_tracks, sizeof *record->status);
    zero(record->counts, shape.counts, sizeof *record->counts);
    zero(record->firings, network->n_reactions, sizeof *record->firings);
    zero(record->completions, network->n_lags, sizeof *record->completions);
    zero(record->skipped, network->n_lags, sizeof *record->skipped);
    zero(record->lags, shape.lags, sizeof *record->lags);
    zero(record->lag_bins, shape.bins, sizeof *record->lag_bins);
    zero(record->under_way, shape.firsts, sizeof *record->under_way);
    for (size_t i = 0; i < shape.firsts; i++)
        record->firsts[i] = NAN;
}

size_t tarry_record_bytes(const tarry_network *network) {
    const record_shape shape = shape_of(network);
    return shape.frames * sizeof(double) + shape.snapshots * sizeof(double) +
           network->n_tracks * sizeof(tarry_track_status) + shape.counts * sizeof(int64_t) +
           network->n_reactions * sizeof(int64_t) + 2 * sizeof(int64_t) * network->n_lags +
           shape.lags * sizeof(tarry_lag_sums) + shape.bins * sizeof(int64_t) +
           2 * shape.firsts * sizeof(double);
}
