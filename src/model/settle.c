/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "model/builder.h"

/* `settle: auto`: the time after which the means that can be worked out are as good as steady. The
 * readers have built the network; the time goes into its plan and its first segment. */

#include "base/error.h"
#include "model/analysis.h"
#include "model/read_run.h"

#include <math.h>
#include <string.h>

static const double NEAR_ENOUGH = 0.001; /* of each steady mean */

/* Up to three digits: what the search finds is no more exact. */
static double round_up(double time) {
    if (!(time > 0))
        return 0;
    const double power = floor(log10(time)) - 2;
    const double unit = pow(10, fabs(power));
    return power < 0 ? ceil(time * unit) / unit : ceil(time / unit) * unit;
}

typedef struct settle_count {
    size_t n_known, n_unknown;
    size_t n_left_out; /* genes */
    size_t n_plain;    /* species that something changes */
    const char *first; /* of the unknown, or NULL */
    const char *why;
} settle_count;

/* Plain species that something changes. */
static int count_plain(const tarry_network *network, tarry_arena *arena, size_t *n,
                       tarry_error *error) {
    bool *changed = tarry_arena_calloc(arena, network->n_species, sizeof *changed);
    if (changed == NULL)
        return tarry_fail_memory(error, "the time to settle");
    for (uint32_t e = 0; e < network->n_effects; e++) {
        const tarry_range changes = network->effects[e].changes;
        const tarry_range amounts = network->effects[e].amounts;
        for (uint32_t i = changes.from; i < changes.to; i++)
            changed[network->changes[i].species] = true;
        for (uint32_t i = amounts.from; i < amounts.to; i++)
            changed[network->amounts[i].species] = true;
    }
    for (uint32_t i = 0; i < network->n_species; i++)
        *n += network->species[i].role == TARRY_SPECIES_PLAIN && changed[i];
    return 0;
}

static int count(const tarry_network *network, tarry_arena *arena, settle_count *c,
                 tarry_error *error) {
    tarry_distances d;
    const int code = tarry_analysis_distances(network, 0, arena, &d, error);
    if (code != 0)
        return code;
    c->n_left_out = d.n_left_out;
    for (size_t i = 0; i < d.n; i++) {
        if (d.items[i].why == NULL) {
            c->n_known++;
        } else if (c->n_unknown++ == 0) {
            c->first = network->species[d.items[i].species].name;
            c->why = d.items[i].why;
        }
    }
    return count_plain(network, arena, &c->n_plain, error);
}

static int fail_unknown(const settle_count *c, tarry_place place, tarry_error *error) {
    if (c->first != NULL)
        return tarry_fail_at(error, TARRY_INPUT, place,
                             "no time to settle can be worked out, since no product has a steady "
                             "mean that is known ('%s': %s); give a time, as settle: 10 h",
                             c->first, c->why);
    return tarry_fail_at(error, TARRY_INPUT, place,
                         "no time to settle can be worked out, since it goes by the means of the "
                         "products of genes and there are none; give a time, as settle: 10 h");
}

/* What the time does not take into account. */
static int note_unknown(tarry_builder *builder, const settle_count *c, tarry_place place,
                        tarry_error *error) {
    tarry_notes *notes = &builder->model->notes;
    int code = 0;
    if (c->n_unknown > 0)
        code = tarry_notes_add(notes, place, error,
                               "'settle: auto' goes by the %zu mean%s that can be worked out; %zu "
                               "cannot, and may take longer to be steady ('%s'%s: %s)",
                               c->n_known, c->n_known == 1 ? "" : "s", c->n_unknown, c->first,
                               c->n_unknown > 1 ? " and others" : "", c->why);
    if (code == 0 && c->n_plain > 0)
        code = tarry_notes_add(notes, place, error,
                               "'settle: auto' does not look at plain species, of which %zu "
                               "change%s in this model and may take longer to be steady",
                               c->n_plain, c->n_plain == 1 ? "s" : "");
    if (code == 0 && c->n_left_out > 0)
        code = tarry_notes_add(notes, place, error,
                               "'settle: auto' looks at the first %d genes that differ; %zu more "
                               "may take longer to be steady",
                               TARRY_DISTANCES_MOST, c->n_left_out);
    return code;
}

static int find_time(const tarry_network *network, tarry_place place, double *settle,
                     tarry_error *error) {
    size_t n_unknown = 0;
    tarry_error search;
    const int code = tarry_analysis_settle(network, NEAR_ENOUGH, settle, &n_unknown, &search);
    if (code == TARRY_NUMERIC)
        return tarry_fail_at(error, TARRY_INPUT, place,
                             "no time was found after which all means are steady; give a time, as "
                             "settle: 10 h");
    if (code != 0)
        return tarry_fail_memory(error, "the time to settle");
    *settle = round_up(*settle);
    return 0;
}

static int put_settle(tarry_network *network, double settle, tarry_error *error) {
    const size_t n = network->n_segments;
    tarry_segment *segments = tarry_arena_calloc(network->arena, n, sizeof *segments);
    if (segments == NULL)
        return tarry_fail_memory(error, "the time to settle");
    memcpy(segments, network->segments, n * sizeof *segments);
    segments[0].start = settle > 0 ? -settle : 0;
    network->segments = segments;
    network->run.settle = settle;
    return 0;
}

int tarry_settle(tarry_builder *builder, tarry_error *error) {
    tarry_network *network = builder->network;
    tarry_arena arena = {0};
    tarry_run_value from;
    settle_count c = {0};
    double settle = 0;
    if (!network->run.settle_auto)
        return 0;
    const tarry_node *run = tarry_node_get(builder->root, "run");
    tarry_run_find(builder, run, "settle", &from);
    const tarry_place place = from.node->place;
    int code = count(network, &arena, &c, error);
    if (code == 0 && c.n_known == 0)
        code = fail_unknown(&c, place, error);
    if (code == 0)
        code = find_time(network, place, &settle, error);
    if (code == 0)
        code = note_unknown(builder, &c, place, error);
    tarry_arena_release(&arena);
    if (code != 0)
        return tarry_run_context(&from, code, error);
    return put_settle(network, settle, error);
}
