/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Moments over time: means.csv.
 *
 * A slot is one channel at one time; every cell gives it one value. The first cell of a group fixes
 * the slot's shift c there, and the sums are those of x - c and of its square: for counts they are
 * whole numbers of the size of the spread, exact to 2^53, whatever the counts themselves. Merging
 * moves the sums of one group to the shift of the other, which for counts is exact as well.
 * (Shifted data: Chan, Golub & LeVeque 1983, Am. Stat. 37:242.)
 *
 * Data may lack values: then each slot has its own number of cells, and its standard errors rest on
 * the groups that have any there.
 *
 * Standard errors are worked out in `report`, slot by slot, from the groups' sums. Formulas:
 * docs/statistics.md, "Moments". */
#include "base/table.h"
#include "tally/channels.h"
#include "tally/kinds.h"
#include "tally/moments.h"
#include "tally/results.h"

#include <math.h>

/* Above this relative error of the sd its interval held in 92 % of trials or fewer; and a note
 * tells of it where more than this share of rows are so (docs/statistics.md, "Moments"). */
static const double large_error = 0.1, few_rows = 0.1;

/* Where everything lies: frames of the recorded channels in the order of the record, then snapshots
 * of all channels. */
typedef struct slots {
    size_t n_frames; /* slots of each sort */
    size_t n_snapshots;
    size_t n;
    size_t shift, sum, squares, cells; /* where they start in the sums */
    bool gaps;                         /* a number of cells for each slot, not one for all */
} slots;

static slots slots_of(const tarry_network *network) {
    const tarry_run_plan *run = &network->run;
    slots s = {.n_frames = (size_t)tarry_channels_recorded(network) * run->n_frames,
               .n_snapshots = (size_t)network->n_channels * run->n_snapshots};
    s.n = s.n_frames + s.n_snapshots;
    s.sum = s.n;
    s.squares = 2 * s.n;
    s.cells = 3 * s.n;
    s.gaps = network->gaps;
    return s;
}

static size_t moments_size(const tarry_network *network) {
    const slots s = slots_of(network);
    return s.cells + (s.gaps ? s.n : 1);
}

static size_t moments_form(const tarry_network *network) {
    return slots_of(network).n;
}

/* Cells that have a value in slot i. */
static double cells_in(const slots *s, const double *sums, size_t i) {
    return sums[s->cells + (s->gaps ? i : 0)];
}

/* ---- sums ------------------------------------------------------------------------------------ */

static void add_values(const double *values, size_t n, bool first, double *restrict shift,
                       double *restrict sum, double *restrict squares) {
    if (first)
        for (size_t i = 0; i < n; i++)
            shift[i] = values[i];
    for (size_t i = 0; i < n; i++) {
        const double d = values[i] - shift[i];
        sum[i] += d;
        squares[i] += d * d;
    }
}

/* Values that are there, to the slots from number `slot` on. */
static void add_known(const slots *s, const double *values, size_t n, size_t slot, double *sums) {
    for (size_t i = 0; i < n; i++) {
        const size_t at = slot + i;
        if (isnan(values[i]))
            continue;
        if (sums[s->cells + at] <= 0.0)
            sums[s->shift + at] = values[i];
        const double d = values[i] - sums[s->shift + at];
        sums[s->sum + at] += d;
        sums[s->squares + at] += d * d;
        sums[s->cells + at] += 1.0;
    }
}

static void moments_add(const tarry_network *network, const tarry_record *record, double *sums,
                        double *scratch) {
    (void)scratch;
    const slots s = slots_of(network);
    if (s.gaps) {
        add_known(&s, record->frames, s.n_frames, 0, sums);
        add_known(&s, record->snapshots, s.n_snapshots, s.n_frames, sums);
        return;
    }
    const bool first = sums[s.cells] <= 0.0;
    add_values(record->frames, s.n_frames, first, sums + s.shift, sums + s.sum, sums + s.squares);
    add_values(record->snapshots, s.n_snapshots, first, sums + s.shift + s.n_frames,
               sums + s.sum + s.n_frames, sums + s.squares + s.n_frames);
    sums[s.cells] += 1.0;
}

/* Move the other's sums to the shift of `one`. */
static void moments_align(const tarry_network *network, double *one, double *other) {
    const slots s = slots_of(network);
    for (size_t i = 0; i < s.n; i++) {
        const double cells = cells_in(&s, other, i);
        if (!(cells_in(&s, one, i) > 0.0))
            one[s.shift + i] = other[s.shift + i];
        const double by = other[s.shift + i] - one[s.shift + i];
        const double sum = other[s.sum + i];
        other[s.squares + i] += by * (2.0 * sum + cells * by);
        other[s.sum + i] += cells * by;
        other[s.shift + i] = one[s.shift + i];
    }
}

/* ---- figures --------------------------------------------------------------------------------- */

static void work_out(double cells, double shift, double sum, double squares,
                     double figures[TARRY_N_MOMENTS]) {
    const double mean = sum / cells;
    const double variance = cells >= 2.0 ? (squares - sum * mean) / (cells - 1.0) : NAN;
    tarry_moments_of(shift + mean, variance, figures);
}

/* What one slot's figures are worked out from: the total's sums and those of each group. */
typedef struct source {
    const tarry_jackknife *jackknife;
    const double *total;
    const double *groups[TARRY_GROUPS];
    slots slots;
    size_t n_groups;
} source;

static source source_of(const tarry_network *network, const tarry_tally_set *set,
                        const tarry_tally_kind *kind) {
    source from = {.jackknife = tarry_tally_jackknife(set),
                   .total = tarry_tally_sums(set, kind),
                   .slots = slots_of(network),
                   .n_groups = tarry_tally_n_groups(set)};
    for (size_t g = 0; g < from.n_groups; g++)
        from.groups[g] = tarry_tally_group_sums(set, kind, g);
    return from;
}

static void estimate_slot(const source *from, size_t i, tarry_estimate estimates[TARRY_N_MOMENTS]) {
    const slots *s = &from->slots;
    const double *total = from->total;
    const double shift = total[s->shift + i];
    const double cells = cells_in(s, total, i);
    double figures[TARRY_N_MOMENTS];
    double replicates[TARRY_N_MOMENTS][TARRY_GROUPS];
    size_t n = 0; /* groups that have a value here */
    work_out(cells, shift, total[s->sum + i], total[s->squares + i], figures);
    for (size_t g = 0; g < from->n_groups; g++) {
        const double *group = from->groups[g];
        double without[TARRY_N_MOMENTS];
        if (!(cells_in(s, group, i) > 0.0))
            continue;
        work_out(cells - cells_in(s, group, i), shift, total[s->sum + i] - group[s->sum + i],
                 total[s->squares + i] - group[s->squares + i], without);
        for (int j = 0; j < TARRY_N_MOMENTS; j++)
            replicates[j][n] = without[j];
        n++;
    }
    const tarry_jackknife some = n < from->n_groups ? tarry_jackknife_of(n) : *from->jackknife;
    for (int j = 0; j < TARRY_N_MOMENTS; j++)
        estimates[j] = tarry_jackknife_estimate(&some, figures[j], replicates[j], TARRY_SCALE_LOG);
}

/* ---- the table ------------------------------------------------------------------------------- */

/* Rows whose spread rests on few large values, for the note. */
typedef struct rough_rows {
    size_t n, all;
    const char *worst; /* name with the largest error of its sd, */
    double error;      /* as a share of the sd */
} rough_rows;

static void look_at(const tarry_channel *channel, const tarry_estimate *sd, rough_rows *rough) {
    const double error = sd->se / sd->value;
    rough->all++;
    if (!(error > large_error))
        return;
    rough->n++;
    if (error > rough->error) {
        rough->error = error;
        rough->worst = channel->name;
    }
}

static int note_rough(const rough_rows *rough, tarry_notes *notes, tarry_error *error) {
    if ((double)rough->n <= few_rows * (double)rough->all)
        return TARRY_OK;
    return tarry_notes_add(
        notes, (tarry_place){0}, error,
        "means.csv: in %.0f %% of its rows (most of all those of %s) the spread rests on few large "
        "values, so that intervals made of sd_se and fano_se hold the truth in 90 %% of runs, not "
        "in "
        "95 %%, and lie too low more often than too high; more cells mend it",
        100.0 * (double)rough->n / (double)rough->all, rough->worst);
}

static int report_slot(const source *from, const tarry_channel *channel, size_t slot, double time,
                       tarry_results *results, rough_rows *rough, tarry_error *error) {
    tarry_estimate e[TARRY_N_MOMENTS];
    if (!(cells_in(&from->slots, from->total, slot) > 0.0))
        return TARRY_OK;
    estimate_slot(from, slot, e);
    if (!(from->slots.gaps && tarry_channel_is_real(channel))) /* few replicates, as a rule */
        look_at(channel, &e[TARRY_SD], rough);
    if (tarry_channel_is_real(channel))
        e[TARRY_FANO].value = e[TARRY_FANO].se = NAN;
    int code = tarry_table_add(results->tables[TARRY_TABLE_means], error, channel->name, time,
                               e[TARRY_MEAN].value, e[TARRY_SD].value, e[TARRY_MEAN].se,
                               e[TARRY_SD].se, e[TARRY_FANO].value, e[TARRY_FANO].se,
                               e[TARRY_CV2].value, e[TARRY_CV2].se);
    return code ? code
                : tarry_results_keep(results, TARRY_LEDGER_means_mean, &e[TARRY_MEAN], error);
}

/* Frames and snapshots of one channel in the order of time, `frame` being the slot of its first
 * frame; a snapshot that falls on a frame stands for both. */
static int report_channel(const tarry_network *network, const source *from, uint32_t channel,
                          size_t frame, tarry_results *results, rough_rows *rough,
                          tarry_error *error) {
    const tarry_run_plan *run = &network->run;
    const tarry_channel *c = &network->channels[channel];
    const size_t snapshot = from->slots.n_frames + (size_t)channel * run->n_snapshots;
    const uint32_t n_frames = c->recorded ? run->n_frames : 0;
    const double same = 1e-9 * run->every, start = network->data ? network->data->start : 0.0;
    int code = TARRY_OK;
    for (uint32_t i = 0, j = 0; !code && (i < n_frames || j < run->n_snapshots);) {
        const double at = i + 1 < n_frames ? start + i * run->every : run->until;
        const double frame_time = i < n_frames ? at : INFINITY;
        const double snapshot_time = j < run->n_snapshots ? run->snapshots[j] : INFINITY;
        if (snapshot_time <= frame_time + same) {
            code = report_slot(from, c, snapshot + j, snapshot_time, results, rough, error);
            j++;
            i += frame_time <= snapshot_time + same;
        } else {
            code = report_slot(from, c, frame + i, frame_time, results, rough, error);
            i++;
        }
    }
    return code;
}

static int moments_report(const tarry_network *network, const tarry_tally_set *set,
                          const tarry_tally_kind *kind, tarry_results *results,
                          tarry_error *error) {
    const source from = source_of(network, set, kind);
    size_t frame = 0;
    rough_rows rough = {0};
    int code = TARRY_OK;
    for (uint32_t i = 0; !code && i < network->n_channels; i++) {
        code = report_channel(network, &from, i, frame, results, &rough, error);
        frame += network->channels[i].recorded ? network->run.n_frames : 0;
    }
    return code ? code : note_rough(&rough, &results->notes, error);
}

const tarry_tally_kind tarry_tally_moments = {
    .name = "moments",
    .size = moments_size,
    .form = moments_form,
    .add = moments_add,
    .align = moments_align,
    .report = moments_report,
};
