/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "tally/survival.h"

/* First bin of those that ended; those cut off follow. */
static size_t first_bin(size_t curve) {
    return curve * 2 * TARRY_SURVIVAL_ROOM;
}

int tarry_survival_add(tarry_blocks *blocks, size_t curve, double time, double longest,
                       bool cut_off) {
    const size_t bin = tarry_dwell_bin(time, longest) + (cut_off ? TARRY_SURVIVAL_ROOM : 0);
    double *sum = tarry_blocks_at(blocks, first_bin(curve) + bin);
    if (!sum)
        return 1;
    *sum += 1.0;
    return 0;
}

/* The curve of all cells and of all but each group, walked side by side. */
typedef struct curve_walk {
    const tarry_survival *curve;
    size_t first;
    size_t n_groups;
    double at_risk, survival;
    double left_at_risk[TARRY_GROUPS], left_survival[TARRY_GROUPS];
} curve_walk;

static double sum_of(const tarry_blocks *blocks, size_t first, size_t n) {
    double sum = 0.0;
    for (size_t i = 0; i < n; i++)
        sum += tarry_blocks_get(blocks, first + i);
    return sum;
}

static double all_of(const tarry_blocks *blocks, size_t first) {
    return sum_of(blocks, first, 2 * (size_t)TARRY_SURVIVAL_ROOM);
}

static void walk_begin(curve_walk *walk) {
    const tarry_survival *curve = walk->curve;
    walk->n_groups = tarry_tally_n_groups(curve->set);
    walk->at_risk = all_of(tarry_tally_blocks(curve->set, curve->kind), walk->first);
    walk->survival = 1.0;
    for (size_t g = 0; g < walk->n_groups; g++) {
        const tarry_blocks *group = tarry_tally_group_blocks(curve->set, curve->kind, g);
        walk->left_at_risk[g] = walk->at_risk - all_of(group, walk->first);
        walk->left_survival[g] = 1.0;
    }
}

/* The product limit over one bin. */
static void pass(double ended, double cut_off, double *at_risk, double *survival) {
    if (ended > 0.0)
        *survival *= (*at_risk - ended) / *at_risk;
    *at_risk -= ended + cut_off;
}

/* Returns how many ended in the bin. */
static double walk_bin(curve_walk *walk, size_t bin) {
    const tarry_survival *curve = walk->curve;
    const tarry_blocks *total = tarry_tally_blocks(curve->set, curve->kind);
    const size_t at = walk->first + bin, beyond = at + TARRY_SURVIVAL_ROOM;
    const double ended = tarry_blocks_get(total, at);
    const double cut_off = tarry_blocks_get(total, beyond);
    if (ended <= 0.0 && cut_off <= 0.0)
        return 0.0;
    pass(ended, cut_off, &walk->at_risk, &walk->survival);
    for (size_t g = 0; g < walk->n_groups; g++) {
        const tarry_blocks *group = tarry_tally_group_blocks(curve->set, curve->kind, g);
        pass(ended - tarry_blocks_get(group, at), cut_off - tarry_blocks_get(group, beyond),
             &walk->left_at_risk[g], &walk->left_survival[g]);
    }
    return ended;
}

int tarry_survival_rows(const tarry_survival *survival, tarry_survival_row *row, void *context,
                        tarry_error *error) {
    curve_walk walk = {.curve = survival, .first = first_bin(survival->curve)};
    walk_begin(&walk);
    if (walk.at_risk <= 0.0)
        return TARRY_OK;
    const tarry_estimate start = {.value = 1.0, .low = 1.0, .high = 1.0};
    int code = row(context, 0.0, &start, error);
    for (size_t bin = 0; !code && bin < TARRY_DWELL_BINS; bin++) {
        if (walk_bin(&walk, bin) <= 0.0)
            continue;
        const tarry_estimate estimate = tarry_jackknife_estimate(
            tarry_tally_jackknife(survival->set), walk.survival, walk.left_survival,
            TARRY_SCALE_LOGLOG);
        code = row(context, tarry_dwell_bin_end((uint32_t)bin, survival->longest), &estimate,
                   error);
    }
    return code;
}

tarry_estimate tarry_survival_end(const tarry_survival *survival) {
    const size_t first = first_bin(survival->curve);
    const size_t n_groups = tarry_tally_n_groups(survival->set);
    double lasted[TARRY_GROUPS] = {0}, totals[TARRY_GROUPS] = {0};
    for (size_t g = 0; g < n_groups; g++) {
        const tarry_blocks *group = tarry_tally_group_blocks(survival->set, survival->kind, g);
        lasted[g] = sum_of(group, first + TARRY_SURVIVAL_ROOM, TARRY_SURVIVAL_ROOM);
        totals[g] = all_of(group, first);
    }
    return tarry_jackknife_share(tarry_tally_jackknife(survival->set), lasted, totals,
                                 tarry_tally_cells(survival->set));
}
