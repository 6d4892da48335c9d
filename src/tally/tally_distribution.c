/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Distributions of recorded names at each snapshot and pooled over each window: distribution.csv.
 *
 * Species are counted into the bins of tally/bins.h, kept in blocks since few of them are ever in
 * use; signals into those of tally/real_bins.h. Only bins in which something was counted are
 * reported. Pooled over a window each frame counts, and the error bars, from groups of whole cells,
 * allow for frames of one cell being alike. Formulas: docs/statistics.md, "Distributions". */
#include "base/table.h"
#include "tally/bins.h"
#include "tally/channels.h"
#include "tally/kinds.h"
#include "tally/real_bins.h"
#include "tally/results.h"

#include <math.h>

enum { BLOCKS_PER_SLOT = (TARRY_BINS + TARRY_BLOCK - 1) / TARRY_BLOCK };

/* A slot is one name at one snapshot or in one window; snapshots come first. */
typedef struct shape {
    size_t n_slots; /* of each name */
    size_t n_species;
    size_t n_signals; /* slots of all signals: first their forms, then their bins */
} shape;

static shape shape_of(const tarry_network *network) {
    shape s = {.n_slots = (size_t)network->run.n_snapshots + network->run.n_windows};
    for (uint32_t i = 0; i < network->n_channels; i++) {
        const tarry_channel *channel = &network->channels[i];
        const bool real = tarry_channel_is_real(channel);
        s.n_species += channel->recorded && !real ? s.n_slots : 0;
        s.n_signals += channel->recorded && real ? s.n_slots : 0;
    }
    return s;
}

static size_t distribution_size(const tarry_network *network) {
    return shape_of(network).n_signals * (TARRY_REAL_BINS_FORM + TARRY_REAL_BINS);
}

static size_t distribution_form(const tarry_network *network) {
    return shape_of(network).n_signals * TARRY_REAL_BINS_FORM;
}

static size_t distribution_n_blocks(const tarry_network *network) {
    return shape_of(network).n_species * BLOCKS_PER_SLOT;
}

/* ---- the bins of one signal's slot ----------------------------------------------------------- */

static tarry_real_bins_form form_get(const double *sums, size_t slot) {
    const double *form = sums + slot * TARRY_REAL_BINS_FORM;
    return (tarry_real_bins_form){form[0], form[1], form[2]};
}

static void form_put(double *sums, size_t slot, tarry_real_bins_form form) {
    double *to = sums + slot * TARRY_REAL_BINS_FORM;
    to[0] = form.width;
    to[1] = form.lowest;
    to[2] = form.highest;
}

static size_t bins_at(const shape *s, size_t slot) {
    return s->n_signals * TARRY_REAL_BINS_FORM + slot * TARRY_REAL_BINS;
}

/* Bins start 2^-20 times as wide as the largest number in the signal's description, or as the
 * range of the data. */
static double least_width(const tarry_network *network, uint32_t channel) {
    const tarry_signal *signal = &network->signals[network->channels[channel].signal];
    if (network->data) {
        const double range = network->data->ranges[channel];
        return ldexp(1.0, (range > 0.0 ? ilogb(range) : 0) - 20);
    }
    double most = fmax(fabs(signal->background), fabs(signal->noise));
    for (uint32_t i = signal->weights.from; i < signal->weights.to; i++)
        most = fmax(most, fabs(network->weights[i].weight));
    for (uint32_t i = signal->ramps.from; i < signal->ramps.to; i++)
        most = fmax(most, fabs(network->ramps[network->signal_ramps[i]].brightness));
    return ldexp(1.0, (most > 0.0 ? ilogb(most) : 0) - 20);
}

/* ---- adding ---------------------------------------------------------------------------------- */

static int add_counts(tarry_blocks *blocks, size_t slot, const double *values, size_t n) {
    const size_t first = slot * BLOCKS_PER_SLOT * TARRY_BLOCK;
    for (size_t i = 0; i < n; i++) {
        if (isnan(values[i])) /* missing in data */
            continue;
        double *at = tarry_blocks_at(blocks, first + tarry_bin_of(values[i]));
        if (!at)
            return 1;
        *at += 1.0;
    }
    return 0;
}

static void add_reals(const shape *s, double *sums, size_t slot, double least, const double *values,
                      size_t n) {
    tarry_real_bins_form form = form_get(sums, slot);
    for (size_t i = 0; i < n; i++)
        tarry_real_bins_add(&form, sums + bins_at(s, slot), least, values[i]);
    form_put(sums, slot, form);
}

/* Values of a name that belong to one slot. */
static const double *slot_values(const tarry_run_plan *run, const double *frames,
                                 const double *snapshots, size_t slot, size_t *n) {
    *n = 1;
    if (slot < run->n_snapshots)
        return snapshots + slot;
    const tarry_range range = run->windows[slot - run->n_snapshots].frames;
    *n = range.to > range.from ? range.to - range.from : 0;
    return frames + range.from;
}

static int distribution_add(const tarry_network *network, const tarry_record *record, double *sums,
                            tarry_blocks *blocks, double *scratch) {
    (void)scratch;
    const tarry_run_plan *run = &network->run;
    const shape s = shape_of(network);
    const double *frames = record->frames;
    size_t species_slot = 0, signal_slot = 0;
    int failed = 0;
    for (uint32_t i = 0; !failed && i < network->n_channels; i++) {
        const tarry_channel *channel = &network->channels[i];
        if (!channel->recorded)
            continue;
        const bool real = tarry_channel_is_real(channel);
        const double least = real ? least_width(network, i) : 0.0;
        for (size_t slot = 0; !failed && slot < s.n_slots; slot++) {
            size_t n;
            const double *values = slot_values(
                run, frames, record->snapshots + (size_t)i * run->n_snapshots, slot, &n);
            if (real)
                add_reals(&s, sums, signal_slot++, least, values, n);
            else
                failed = add_counts(blocks, species_slot++, values, n);
        }
        frames += run->n_frames;
    }
    return failed;
}

static void distribution_align(const tarry_network *network, double *one, double *other) {
    const shape s = shape_of(network);
    for (size_t slot = 0; slot < s.n_signals; slot++) {
        tarry_real_bins_form one_form = form_get(one, slot), other_form = form_get(other, slot);
        tarry_real_bins_align(&one_form, one + bins_at(&s, slot), &other_form,
                              other + bins_at(&s, slot));
        form_put(one, slot, one_form);
        form_put(other, slot, other_form);
    }
}

/* ---- reporting ------------------------------------------------------------------------------- */

/* One slot of one name, ready to be told bin by bin. */
typedef struct telling {
    const tarry_network *network;
    const tarry_tally_set *set;
    const tarry_tally_kind *kind;
    const char *name, *window;
    double time;
    size_t slot; /* among the species' or the signals' */
    double totals[TARRY_GROUPS];
    tarry_results *results;
} telling;

static int tell_bin(const telling *t, double count, double width, const double counts[TARRY_GROUPS],
                    tarry_error *error) {
    const size_t n_groups = tarry_tally_n_groups(t->set);
    double here[TARRY_GROUPS], totals[TARRY_GROUPS], n_values = 0.0;
    size_t n = 0; /* groups that have a value in this slot */
    for (size_t g = 0; g < n_groups; g++) {
        if (!(t->totals[g] > 0.0))
            continue;
        here[n] = counts[g];
        totals[n++] = t->totals[g];
        n_values += t->totals[g];
    }
    const tarry_jackknife some = n < n_groups ? tarry_jackknife_of(n)
                                              : *tarry_tally_jackknife(t->set);
    const double n_cells = t->window ? tarry_tally_cells(t->set) : n_values;
    const tarry_estimate share = tarry_jackknife_share(&some, here, totals, n_cells);
    const int code = tarry_table_add(t->results->tables[TARRY_TABLE_distribution], error, t->name,
                                     t->window, t->time, count, width, share.value, share.low,
                                     share.high);
    return code ? code
                : tarry_results_keep(t->results, TARRY_LEDGER_distribution_probability, &share,
                                     error);
}

static double count_all(const tarry_blocks *blocks, size_t slot) {
    double sum = 0.0;
    for (size_t b = slot * BLOCKS_PER_SLOT; b < (slot + 1) * BLOCKS_PER_SLOT; b++)
        for (size_t i = 0; blocks->block[b] && i < TARRY_BLOCK; i++)
            sum += blocks->block[b][i];
    return sum;
}

static int tell_counts(telling *t, tarry_error *error) {
    const size_t n_groups = tarry_tally_n_groups(t->set);
    const tarry_blocks *total = tarry_tally_blocks(t->set, t->kind), *groups[TARRY_GROUPS];
    const size_t first = t->slot * BLOCKS_PER_SLOT * TARRY_BLOCK;
    for (size_t g = 0; g < n_groups; g++) {
        groups[g] = tarry_tally_group_blocks(t->set, t->kind, g);
        t->totals[g] = count_all(groups[g], t->slot);
    }
    int code = TARRY_OK;
    for (uint32_t bin = 0; !code && bin < TARRY_BINS; bin++) {
        double counts[TARRY_GROUPS];
        if (!(tarry_blocks_get(total, first + bin) > 0.0))
            continue;
        for (size_t g = 0; g < n_groups; g++)
            counts[g] = tarry_blocks_get(groups[g], first + bin);
        code = tell_bin(t, tarry_bin_start(bin), tarry_bin_width(bin), counts, error);
    }
    return code;
}

static int tell_reals(telling *t, tarry_error *error) {
    const shape s = shape_of(t->network);
    const size_t n_groups = tarry_tally_n_groups(t->set), at = bins_at(&s, t->slot);
    const double *total = tarry_tally_sums(t->set, t->kind), *groups[TARRY_GROUPS];
    const tarry_real_bins_form form = form_get(total, t->slot);
    for (size_t g = 0; g < n_groups; g++) {
        groups[g] = tarry_tally_group_sums(t->set, t->kind, g);
        t->totals[g] = 0.0;
        for (size_t i = 0; i < TARRY_REAL_BINS; i++)
            t->totals[g] += groups[g][at + i];
    }
    int code = TARRY_OK;
    for (double k = form.lowest; !code && form.width > 0.0 && k <= form.highest; k += 1.0) {
        const size_t i = at + tarry_real_bins_index(k);
        double counts[TARRY_GROUPS];
        if (!(total[i] > 0.0))
            continue;
        for (size_t g = 0; g < n_groups; g++)
            counts[g] = groups[g][i];
        code = tell_bin(t, (k + 0.5) * form.width, form.width, counts, error);
    }
    return code;
}

static int distribution_report(const tarry_network *network, const tarry_tally_set *set,
                               const tarry_tally_kind *kind, tarry_results *results,
                               tarry_error *error) {
    const tarry_run_plan *run = &network->run;
    const size_t n_slots = shape_of(network).n_slots;
    size_t species_slot = 0, signal_slot = 0;
    int code = TARRY_OK;
    for (uint32_t i = 0; !code && i < network->n_channels; i++) {
        const tarry_channel *channel = &network->channels[i];
        for (size_t slot = 0; !code && channel->recorded && slot < n_slots; slot++) {
            const bool pooled = slot >= run->n_snapshots, real = tarry_channel_is_real(channel);
            telling t = {.network = network, .set = set, .kind = kind, .name = channel->name};
            t.window = pooled ? run->windows[slot - run->n_snapshots].name : NULL;
            t.time = pooled ? NAN : run->snapshots[slot];
            t.slot = real ? signal_slot++ : species_slot++;
            t.results = results;
            code = real ? tell_reals(&t, error) : tell_counts(&t, error);
        }
    }
    return code;
}

const tarry_tally_kind tarry_tally_distribution = {
    .name = "distribution",
    .size = distribution_size,
    .form = distribution_form,
    .n_blocks = distribution_n_blocks,
    .add_blocks = distribution_add,
    .align = distribution_align,
    .report = distribution_report,
};
