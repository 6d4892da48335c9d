/* SPDX-License-Identifier: GPL-3.0-or-later */

/* How often and how long names with thresholds are visible: rows of signals.csv and curves of
 * dwells.csv.
 *
 * Frames and starts are counted window by window, each frame standing for one interval. Means are
 * ratios over the window (time visible over starts, the first frame of a trace left out, at which
 * nothing can start): completed periods alone would be short. The curves are those of periods that
 * start in the window; since none is shorter than the shortest length, they say how many last
 * longer of those that last so long. Formulas: docs/statistics.md, "Visible periods". */
#include "base/table.h"
#include "tally/channels.h"
#include "tally/kinds.h"
#include "tally/results.h"
#include "tally/survival.h"
#include "tally/visible.h"

#include <math.h>
#include <stdio.h>

/* Sums of one name and window; curves are numbered alike. */
enum { DARK, VISIBLE, N_PERIODS };
enum { FRAMES, EXPOSED, STARTS, N_SUMS }; /* exposed: frames at which a period could start */

static const char *const period_names[N_PERIODS] = {"dark", "visible"};

static bool is_seen(const tarry_channel *channel) {
    return channel->recorded && channel->thresholds;
}

static size_t n_slots(const tarry_network *network) {
    size_t n = 0;
    for (uint32_t i = 0; i < network->n_channels; i++)
        n += is_seen(&network->channels[i]);
    return n * network->run.n_windows;
}

static size_t visible_size(const tarry_network *network) {
    return n_slots(network) * N_PERIODS * N_SUMS;
}

static size_t visible_n_blocks(const tarry_network *network) {
    return n_slots(network) * N_PERIODS * TARRY_SURVIVAL_BLOCKS;
}

static size_t least_frames(const tarry_network *network, const tarry_thresholds *thresholds) {
    const double frames = ceil(thresholds->least / network->run.every * (1.0 - 1e-9));
    return frames > 1.0 ? (size_t)frames : 1;
}

/* No period is longer than the record. */
static double longest_of(const tarry_network *network) {
    return (double)network->run.n_frames * network->run.every;
}

/* ---- sums ------------------------------------------------------------------------------------ */

typedef struct adding {
    const tarry_network *network;
    double *sums;
    tarry_blocks *blocks;
    size_t slot; /* the name's first */
    int failed;
} adding;

static size_t overlap(const tarry_visible_period *period, tarry_range frames) {
    const size_t from = period->from > frames.from ? period->from : frames.from;
    const size_t to = period->to < frames.to ? period->to : frames.to;
    return to > from ? to - from : 0;
}

static void add_period(const tarry_visible_period *period, void *context) {
    adding *a = context;
    const tarry_run_plan *run = &a->network->run;
    for (uint32_t w = 0; w < run->n_windows && !a->failed; w++) {
        const tarry_range frames = run->windows[w].frames;
        const size_t which = (a->slot + w) * N_PERIODS + period->visible;
        double *sums = a->sums + which * N_SUMS;
        const size_t n = overlap(period, frames);
        const bool begins = period->from >= frames.from && period->from < frames.to;
        sums[FRAMES] += (double)n;
        sums[EXPOSED] += (double)n - (begins && !period->starts);
        if (!begins || !period->starts)
            continue;
        sums[STARTS] += 1.0;
        a->failed = tarry_survival_add(a->blocks, which,
                                       (double)(period->to - period->from) * run->every,
                                       longest_of(a->network), period->cut_off);
    }
}

static int visible_add(const tarry_network *network, const tarry_record *record, double *sums,
                       tarry_blocks *blocks, double *scratch) {
    (void)scratch;
    adding a = {.network = network, .sums = sums, .blocks = blocks};
    const double *frames = record->frames;
    for (uint32_t i = 0; i < network->n_channels && !a.failed; i++) {
        const tarry_channel *channel = &network->channels[i];
        if (is_seen(channel)) {
            const tarry_thresholds *t = channel->thresholds;
            tarry_visible_periods(frames, network->run.n_frames, t->low, t->high,
                                  least_frames(network, t), add_period, &a);
            a.slot += network->run.n_windows;
        }
        frames += channel->recorded ? network->run.n_frames : 0;
    }
    return a.failed;
}

/* ---- rows ------------------------------------------------------------------------------------ */

/* What signals.csv tells, as ratios of sums. */
typedef enum quantity { FRACTION, FREQUENCY, VISIBLE_TIME, DARK_TIME, N_QUANTITIES } quantity;

static const char *const quantity_names[N_QUANTITIES] = {"visible_fraction", "visible_frequency",
                                                         "visible_time_mean", "dark_time_mean"};

typedef struct reporting {
    const tarry_network *network;
    const tarry_tally_set *set;
    const tarry_tally_kind *kind;
    tarry_results *results;
} reporting;

static double ratio(const double sums[N_PERIODS * N_SUMS], quantity which, double every) {
    const double *dark = sums, *visible = sums + N_SUMS;
    switch (which) {
    case FREQUENCY:
        return visible[STARTS] / ((dark[EXPOSED] + visible[EXPOSED]) * every);
    case VISIBLE_TIME:
        return visible[EXPOSED] * every / visible[STARTS];
    case DARK_TIME:
        return dark[EXPOSED] * every / dark[STARTS];
    case FRACTION:
    case N_QUANTITIES:
        break;
    }
    return visible[FRAMES] / (dark[FRAMES] + visible[FRAMES]);
}

static const double *group_sums(const reporting *r, size_t group, size_t slot) {
    return tarry_tally_group_sums(r->set, r->kind, group) + slot * N_PERIODS * N_SUMS;
}

static tarry_estimate estimate_fraction(const reporting *r, size_t slot) {
    double visible[TARRY_GROUPS], all[TARRY_GROUPS];
    for (size_t g = 0; g < tarry_tally_n_groups(r->set); g++) {
        const double *sums = group_sums(r, g, slot);
        visible[g] = sums[VISIBLE * N_SUMS + FRAMES];
        all[g] = visible[g] + sums[DARK * N_SUMS + FRAMES];
    }
    return tarry_jackknife_share(tarry_tally_jackknife(r->set), visible, all,
                                 tarry_tally_cells(r->set));
}

static tarry_estimate estimate(const reporting *r, size_t slot, quantity which) {
    const double *sums = tarry_tally_sums(r->set, r->kind) + slot * N_PERIODS * N_SUMS;
    const double every = r->network->run.every;
    double replicates[TARRY_GROUPS], left[N_PERIODS * N_SUMS];
    if (which == FRACTION)
        return estimate_fraction(r, slot);
    for (size_t g = 0; g < tarry_tally_n_groups(r->set); g++) {
        const double *group = group_sums(r, g, slot);
        for (int i = 0; i < N_PERIODS * N_SUMS; i++)
            left[i] = sums[i] - group[i];
        replicates[g] = ratio(left, which, every);
    }
    return tarry_jackknife_estimate(tarry_tally_jackknife(r->set), ratio(sums, which, every),
                                    replicates, TARRY_SCALE_LOG);
}

static int report_quantities(const reporting *r, const tarry_channel *channel,
                             const tarry_window *window, size_t slot, tarry_error *error) {
    const double *sums = tarry_tally_sums(r->set, r->kind) + slot * N_PERIODS * N_SUMS;
    char per_time[64];
    snprintf(per_time, sizeof per_time, "/%.30s", r->network->time_unit);
    const char *const units[N_QUANTITIES] = {"1", per_time, r->network->time_unit,
                                             r->network->time_unit};
    int code = TARRY_OK;
    for (quantity i = FRACTION; !code && i < N_QUANTITIES; i++) {
        const tarry_estimate e = estimate(r, slot, i);
        const int starts = i == DARK_TIME ? DARK : VISIBLE;
        code = tarry_table_add(
            r->results->tables[TARRY_TABLE_signals], error, channel->name, window->name,
            quantity_names[i], units[i], isfinite(e.value) ? e.value : NAN, e.low, e.high,
            i == FRACTION ? tarry_tally_cells(r->set) : sums[starts * N_SUMS + STARTS]);
    }
    return code;
}

typedef struct curve_rows {
    tarry_table *table;
    const char *name, *window, *period;
    double every;
} curve_rows;

/* Lengths are whole numbers of frames: the curve falls there, not where a bin of the grid ends. */
static int add_row(void *context, double time, const tarry_estimate *survival, tarry_error *error) {
    const curve_rows *rows = context;
    return tarry_table_add(rows->table, error, rows->name, rows->window, rows->period,
                           floor(time / rows->every * (1.0 + 1e-9)) * rows->every, survival->value,
                           survival->low, survival->high);
}

static int report_curves(const reporting *r, const tarry_channel *channel,
                         const tarry_window *window, size_t slot, tarry_error *error) {
    int code = TARRY_OK;
    for (int period = N_PERIODS - 1; !code && period >= 0; period--) {
        curve_rows rows = {r->results->tables[TARRY_TABLE_dwells], channel->name, window->name,
                           period_names[period], r->network->run.every};
        const tarry_survival curve = {r->set, r->kind, slot * N_PERIODS + (size_t)period,
                                      longest_of(r->network)};
        code = tarry_survival_rows(&curve, add_row, &rows, error);
    }
    return code;
}

static int visible_report(const tarry_network *network, const tarry_tally_set *set,
                          const tarry_tally_kind *kind, tarry_results *results,
                          tarry_error *error) {
    const reporting r = {network, set, kind, results};
    size_t slot = 0;
    int code = TARRY_OK;
    if (tarry_tally_cells(set) <= 0.0)
        return TARRY_OK;
    for (uint32_t i = 0; i < network->n_channels; i++) {
        const tarry_channel *channel = &network->channels[i];
        for (uint32_t w = 0; !code && is_seen(channel) && w < network->run.n_windows; w++) {
            code = report_quantities(&r, channel, &network->run.windows[w], slot, error);
            if (!code)
                code = report_curves(&r, channel, &network->run.windows[w], slot, error);
            slot++;
        }
    }
    return code;
}

const tarry_tally_kind tarry_tally_visible = {
    .name = "visible",
    .size = visible_size,
    .n_blocks = visible_n_blocks,
    .add_blocks = visible_add,
    .report = visible_report,
};
