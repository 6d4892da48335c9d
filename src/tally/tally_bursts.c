/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Burst figures of each gene and window: bursts.csv.
 *
 * The alleles of a gene are pooled, and so are cells. A period, and an interval from one opening to
 * the next, belongs to the window in which it starts and counts whole, since cells run on until
 * those under way have closed. What is still under way at the end is cut off: its time stays in the
 * sum over which closings are counted, which is right where the rate of closing does not hang on
 * how long a period has lasted (n / total time, the estimate of a rate from censored exponential
 * times; common practice), and a note says so once they are over 1 % of all. Formulas:
 * docs/statistics.md, "Bursts". */
#include "base/error.h"
#include "base/table.h"
#include "tally/kinds.h"
#include "tally/periods.h"
#include "tally/quantities.h"
#include "tally/results.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

/* Sums of one gene in one window. Power sums are over whole periods only. */
enum {
    CLOSED,   /* active periods that closed */
    CUT_OFF,  /* ... that did not */
    CUT_LOUD, /* ... of those, with an initiation before `until` */
    SILENT,   /* closed without one */
    SIZE,     /* initiations in those closed: sum, squares, third and fourth powers */
    SIZE_2,
    SIZE_3,
    SIZE_4,
    CLOSED_TIME, /* time in those closed */
    ACTIVE_TIME, /* ... and in those cut off */
    INACTIVE_CLOSED,
    INACTIVE_CUT_OFF,
    INACTIVE_TIME,
    INTERVALS,     /* between openings, that ended */
    INTERVAL_REST, /* time in their inactive part, those cut off included */
    INTERVAL,      /* their lengths: sum and powers */
    INTERVAL_2,
    INTERVAL_3,
    INTERVAL_4,
    TIME_ACTIVE, /* within the window */
    TIME_KNOWN,
    INITIATIONS, /* within the window, of any kind */
    INITIATIONS_KNOWN,
    INITIATIONS_OUTSIDE,
    N_SUMS
};

_Static_assert((int)TARRY_N_BURST_QUANTITIES == (int)TARRY_BURST_FIGURES, "rows of bursts.csv");

enum {
    FEW_PERIODS = 20,  /* below this an interval is rough */
    MOST_CAVEATS = 40, /* notes of their own; the rest is counted */
};

/* Periods cut off below this share move no figure by more than the like. */
static const double small_share = 0.01;

/* Above this relative standard error of a variance, sqrt((kurtosis + 2) / n), its interval is
 * short: it then held the truth in 93 % of trials or fewer (docs/statistics.md, "Bursts"). */
static const double large_spread = 0.15;

/* A spread below this share of the mean cannot be told from rounding in sums of squares. */
static const double least_spread = 1e-6;

static size_t bursts_size(const tarry_network *network) {
    return (size_t)network->n_genes * network->run.n_windows * N_SUMS;
}

/* ---- one cell ---- */

typedef struct add_context {
    const tarry_network *network;
    const tarry_record *record;
    double *sums;
} add_context;

static void add_powers(double *sums, double x) {
    sums[0] += x;
    sums[1] += x * x;
    sums[2] += x * x * x;
    sums[3] += x * x * x * x;
}

static void add_active(double *sums, const tarry_period *period) {
    const double time = period->end - period->start;
    const double size = (double)(period->count_end - period->count_start);
    sums[ACTIVE_TIME] += time;
    if (period->cut_off) {
        sums[CUT_OFF] += 1.0;
        sums[CUT_LOUD] += size > 0.0;
        return;
    }
    sums[CLOSED] += 1.0;
    sums[CLOSED_TIME] += time;
    sums[SILENT] += size <= 0.0;
    add_powers(sums + SIZE, size);
}

static void add_inactive(double *sums, const tarry_period *period) {
    sums[INACTIVE_TIME] += period->end - period->start;
    sums[period->cut_off ? INACTIVE_CUT_OFF : INACTIVE_CLOSED] += 1.0;
}

/* What follows a burst, up to the next opening, ends the interval that began with it. */
static void add_interval(double *sums, const tarry_period *period) {
    sums[INTERVAL_REST] += period->end - period->start;
    if (period->cut_off)
        return;
    sums[INTERVALS] += 1.0;
    add_powers(sums + INTERVAL, period->end - period->opened);
}

/* The part of a period that lies in the window: its time and its initiations. */
static void add_part(const add_context *adding, const tarry_window *window, double *sums,
                     const tarry_period *period) {
    const double from = fmax(period->start, window->from), to = fmin(period->end, window->to);
    const bool before = period->start < window->from && period->end <= window->from;
    if (before || period->start >= window->to || period->status == TARRY_TRACK_UNKNOWN)
        return;
    const bool active = period->status == TARRY_TRACK_OPEN;
    const int64_t count_from = period->start >= window->from
                                   ? period->count_start
                                   : tarry_count_at(adding->network, adding->record,
                                                    window->spans.from, period->track);
    const int64_t count_to = period->end <= window->to && !period->cut_off
                                 ? period->count_end
                                 : tarry_count_at(adding->network, adding->record, window->spans.to,
                                                  period->track);
    const double initiations = (double)(count_to - count_from);
    sums[TIME_KNOWN] += to - from;
    sums[INITIATIONS_KNOWN] += initiations;
    if (active)
        sums[TIME_ACTIVE] += to - from;
    else
        sums[INITIATIONS_OUTSIDE] += initiations;
}

static void add_period(const tarry_period *period, void *context) {
    const add_context *adding = context;
    const tarry_run_plan *run = &adding->network->run;
    const bool active = period->status == TARRY_TRACK_OPEN;
    for (uint32_t w = 0; w < run->n_windows; w++) {
        const tarry_window *window = &run->windows[w];
        double *sums = adding->sums + ((size_t)period->gene * run->n_windows + w) * N_SUMS;
        add_part(adding, window, sums, period);
        if (period->starts && tarry_window_holds(window, period->start)) {
            if (active)
                add_active(sums, period);
            else
                add_inactive(sums, period);
        }
        if (!active && tarry_window_holds(window, period->opened))
            add_interval(sums, period);
    }
}

static void add_initiations(const add_context *adding) {
    const tarry_network *network = adding->network;
    const tarry_run_plan *run = &network->run;
    for (uint32_t g = 0; g < network->n_genes; g++) {
        const tarry_range tracks = network->genes[g].tracks;
        for (uint32_t w = 0; w < run->n_windows; w++) {
            const tarry_range spans = run->windows[w].spans;
            double *sums = adding->sums + ((size_t)g * run->n_windows + w) * N_SUMS;
            for (uint32_t i = tracks.from; i < tracks.to; i++)
                sums[INITIATIONS] += (double)(tarry_count_at(network, adding->record, spans.to, i) -
                                              tarry_count_at(network, adding->record, spans.from,
                                                             i));
        }
    }
}

static void bursts_add(const tarry_network *network, const tarry_record *record, double *sums,
                       double *scratch) {
    add_context adding = {network, record, sums};
    add_initiations(&adding);
    tarry_periods(network, record, scratch, add_period, &adding);
}

/* ---- figures from sums ---- */

/* sd from a number, a sum and a sum of squares. */
static double sd_of(double n, const double *powers) {
    if (n < 2.0)
        return NAN;
    const double mean = powers[0] / n;
    const double sd = sqrt(fmax((powers[1] - powers[0] * mean) / (n - 1.0), 0.0));
    return sd > least_spread * fabs(mean) ? sd : 0.0;
}

/* Relative standard error of the variance of n independent values; 0 where they hardly vary. */
static double variance_spread(double n, const double *powers) {
    const double sd = sd_of(n, powers), mean = powers[0] / n;
    if (!(sd > 1e-3 * mean))
        return 0.0;
    const double m2 = powers[1] / n, m3 = powers[2] / n, m4 = powers[3] / n;
    const double variance = m2 - mean * mean;
    const double fourth = m4 - 4.0 * mean * m3 + 6.0 * mean * mean * m2 - 3.0 * pow(mean, 4.0);
    return sqrt(fmax(fourth / (variance * variance) - 1.0, 0.0) / n);
}

/* The fraction of a share's figure: what is counted, of what. */
static void share_of(int quantity, const double *sums, double *count, double *total) {
    switch (quantity) {
    case TARRY_silent_fraction:
        *count = sums[SILENT];
        *total = sums[CLOSED] + sums[CUT_LOUD];
        break;
    case TARRY_active_fraction:
        *count = sums[TIME_ACTIVE];
        *total = sums[TIME_KNOWN];
        break;
    default:
        *count = sums[INITIATIONS_OUTSIDE];
        *total = sums[INITIATIONS_KNOWN];
    }
}

/* `exposure`: alleles times length of the window. Shares are not worked out here. */
static void figures_of(const double *sums, double exposure,
                       double figures[TARRY_N_BURST_QUANTITIES]) {
    const double closed = sums[CLOSED], loud = closed - sums[SILENT];
    /* Initiations so far of a burst cut off are not known: those closed give them per active time.
     */
    const double whole = sums[CUT_OFF] > 0.0 ? sums[ACTIVE_TIME] / sums[CLOSED_TIME] : 1.0;
    figures[TARRY_burst_frequency] = (closed + sums[CUT_OFF]) / exposure;
    figures[TARRY_burst_size_mean] = sums[SIZE] * whole / closed;
    figures[TARRY_burst_size_sd] = sd_of(closed, sums + SIZE);
    figures[TARRY_loud_frequency] = (loud + sums[CUT_LOUD]) / exposure;
    figures[TARRY_loud_size_mean] = sums[SIZE] * whole / loud;
    figures[TARRY_active_time_mean] = sums[ACTIVE_TIME] / closed;
    figures[TARRY_inactive_time_mean] = sums[INACTIVE_TIME] / sums[INACTIVE_CLOSED];
    figures[TARRY_interval_mean] = sums[ACTIVE_TIME] / closed +
                                   sums[INTERVAL_REST] / sums[INTERVALS];
    figures[TARRY_interval_sd] = sd_of(sums[INTERVALS], sums + INTERVAL);
    figures[TARRY_initiation_rate] = sums[INITIATIONS] / exposure;
    for (int i = 0; i < TARRY_N_BURST_QUANTITIES; i++)
        if (!isfinite(figures[i]))
            figures[i] = NAN;
}

static void samples_of(const double *sums, double alleles,
                       double samples[TARRY_N_BURST_QUANTITIES]) {
    const double closed = sums[CLOSED], loud = closed - sums[SILENT];
    samples[TARRY_burst_frequency] = closed + sums[CUT_OFF];
    samples[TARRY_burst_size_mean] = samples[TARRY_burst_size_sd] =
        samples[TARRY_active_time_mean] = closed;
    samples[TARRY_silent_fraction] = closed + sums[CUT_LOUD];
    samples[TARRY_loud_frequency] = loud + sums[CUT_LOUD];
    samples[TARRY_loud_size_mean] = loud;
    samples[TARRY_inactive_time_mean] = sums[INACTIVE_CLOSED];
    samples[TARRY_interval_mean] = samples[TARRY_interval_sd] = sums[INTERVALS];
    samples[TARRY_active_fraction] = alleles;
    samples[TARRY_initiation_rate] = sums[INITIATIONS];
    samples[TARRY_outside_fraction] = sums[INITIATIONS_KNOWN];
}

/* ---- the table ---- */

/* All figures of one gene in one window. */
typedef struct burst_row {
    const tarry_gene *gene;
    const tarry_window *window;
    double sums[N_SUMS];
    tarry_estimate estimates[TARRY_N_BURST_QUANTITIES];
    double samples[TARRY_N_BURST_QUANTITIES];
} burst_row;

static void estimate_ratios(const tarry_network *network, const tarry_tally_set *set,
                            const tarry_tally_kind *kind, size_t at, burst_row *row) {
    (void)network;
    const size_t n_groups = tarry_tally_n_groups(set);
    const double tracks = row->gene->tracks.to - row->gene->tracks.from;
    const double exposure = tracks * (row->window->to - row->window->from);
    const double cells = tarry_tally_cells(set);
    double figures[TARRY_N_BURST_QUANTITIES] = {0}, left[N_SUMS];
    double replicates[TARRY_N_BURST_QUANTITIES][TARRY_GROUPS];
    figures_of(row->sums, exposure * cells, figures);
    for (size_t g = 0; g < n_groups; g++) {
        const double *group = tarry_tally_group_sums(set, kind, g) + at;
        double of_group[TARRY_N_BURST_QUANTITIES] = {0};
        for (int i = 0; i < N_SUMS; i++)
            left[i] = row->sums[i] - group[i];
        figures_of(left, exposure * (cells - tarry_tally_group_cells(set, g)), of_group);
        for (int i = 0; i < TARRY_N_BURST_QUANTITIES; i++)
            replicates[i][g] = of_group[i];
    }
    for (int i = 0; i < TARRY_N_BURST_QUANTITIES; i++)
        row->estimates[i] = tarry_jackknife_estimate(tarry_tally_jackknife(set), figures[i],
                                                     replicates[i], TARRY_SCALE_LOG);
}

static void estimate_shares(const tarry_tally_set *set, const tarry_tally_kind *kind, size_t at,
                            burst_row *row) {
    static const int shares[] = {TARRY_silent_fraction, TARRY_active_fraction,
                                 TARRY_outside_fraction};
    const size_t n_groups = tarry_tally_n_groups(set);
    for (size_t i = 0; i < sizeof shares / sizeof shares[0]; i++) {
        double counts[TARRY_GROUPS], totals[TARRY_GROUPS];
        for (size_t g = 0; g < n_groups; g++)
            share_of(shares[i], tarry_tally_group_sums(set, kind, g) + at, &counts[g], &totals[g]);
        row->estimates[shares[i]] = tarry_jackknife_share(tarry_tally_jackknife(set), counts,
                                                          totals, tarry_tally_cells(set));
    }
}

static int add_rows(const tarry_network *network, const burst_row *row, tarry_results *results,
                    tarry_error *error) {
    int code = TARRY_OK;
    for (tarry_burst_quantity i = 0; !code && i < TARRY_N_BURST_QUANTITIES; i++) {
        if (!row->gene->tells && i != TARRY_initiation_rate)
            continue;
        const tarry_estimate *estimate = &row->estimates[i];
        char room[64];
        code = tarry_table_add(results->tables[TARRY_TABLE_bursts], error, row->gene->name,
                               row->window->name, tarry_burst_quantity_name(i),
                               tarry_burst_quantity_unit(network, row->gene, i, room),
                               estimate->value, estimate->low, estimate->high, row->samples[i]);
        if (!code)
            code = tarry_results_keep(results, TARRY_LEDGER_bursts_value, estimate, error);
    }
    return code;
}

/* ---- caveats ---- */

/* Figures that rest on periods, and so on few of them. */
static bool rests_on_periods(tarry_burst_quantity quantity) {
    return quantity != TARRY_active_fraction && quantity != TARRY_initiation_rate &&
           quantity != TARRY_outside_fraction;
}

static void list_few(const burst_row *row, tarry_text *text) {
    for (tarry_burst_quantity i = 0; i < TARRY_N_BURST_QUANTITIES; i++)
        if (rests_on_periods(i) && row->samples[i] < FEW_PERIODS)
            tarry_text_printf(text, "%s%s (%.0f)", text->size > 0 ? ", " : "",
                              tarry_burst_quantity_name(i), row->samples[i]);
}

static int note_few(const burst_row *row, tarry_notes *notes, tarry_error *error, size_t *n) {
    tarry_text list = {0};
    list_few(row, &list);
    int code = TARRY_OK;
    if (list.failed)
        code = tarry_fail_memory(error, "a caveat");
    else if (list.size > 0 && (*n)++ < MOST_CAVEATS)
        code = tarry_notes_add(notes, (tarry_place){0}, error,
                               "%s, window %s: fewer than %d periods behind %s; intervals from so "
                               "few are rough",
                               row->gene->name, row->window->name, FEW_PERIODS, list.data);
    tarry_text_release(&list);
    return code;
}

static int note_tails(const burst_row *row, tarry_notes *notes, tarry_error *error, size_t *n) {
    const bool size = variance_spread(row->sums[CLOSED], row->sums + SIZE) > large_spread;
    const bool interval = variance_spread(row->sums[INTERVALS], row->sums + INTERVAL) >
                          large_spread;
    if ((!size && !interval) || (*n)++ >= MOST_CAVEATS)
        return TARRY_OK;
    return tarry_notes_add(
        notes, (tarry_place){0}, error,
        "%s, window %s: long tails for so few periods make the interval of %s%s%s "
        "too short; more cells would help",
        row->gene->name, row->window->name, size ? "burst_size_sd" : "",
        size && interval ? " and " : "", interval ? "interval_sd" : "");
}

static int note_cut_off(const burst_row *row, tarry_notes *notes, tarry_error *error, size_t *n) {
    const double active = row->sums[CUT_OFF], all_active = row->sums[CLOSED] + active;
    const double inactive = row->sums[INACTIVE_CUT_OFF];
    const double all_inactive = row->sums[INACTIVE_CLOSED] + inactive;
    if (active <= small_share * all_active && inactive <= small_share * all_inactive)
        return TARRY_OK;
    if ((*n)++ >= MOST_CAVEATS)
        return TARRY_OK;
    return tarry_notes_add(
        notes, (tarry_place){0}, error,
        "%s, window %s: %.0f of %.0f active and %.0f of %.0f inactive periods were still under way "
        "when the cells ended: means take it that these close at the same rate as the others, "
        "standard deviations leave them out and are short; a longer `until` would help",
        row->gene->name, row->window->name, active, all_active, inactive, all_inactive);
}

static int note_caveats(const burst_row *row, tarry_notes *notes, tarry_error *error, size_t *n) {
    if (!row->gene->tells)
        return TARRY_OK;
    int code = note_few(row, notes, error, n);
    if (!code)
        code = note_tails(row, notes, error, n);
    if (!code)
        code = note_cut_off(row, notes, error, n);
    return code;
}

static int bursts_report(const tarry_network *network, const tarry_tally_set *set,
                         const tarry_tally_kind *kind, tarry_results *results, tarry_error *error) {
    const double *sums = tarry_tally_sums(set, kind);
    const uint32_t n_windows = network->run.n_windows;
    size_t n_caveats = 0;
    int code = TARRY_OK;
    for (uint32_t g = 0; !code && sums && g < network->n_genes; g++) {
        burst_row row = {.gene = &network->genes[g]};
        const double tracks = row.gene->tracks.to - row.gene->tracks.from;
        for (uint32_t w = 0; !code && w < n_windows; w++) {
            const size_t at = ((size_t)g * n_windows + w) * N_SUMS;
            row.window = &network->run.windows[w];
            memcpy(row.sums, sums + at, sizeof row.sums);
            samples_of(row.sums, tracks * tarry_tally_cells(set), row.samples);
            estimate_ratios(network, set, kind, at, &row);
            estimate_shares(set, kind, at, &row);
            code = add_rows(network, &row, results, error);
            if (!code)
                code = note_caveats(&row, &results->notes, error, &n_caveats);
        }
    }
    if (!code && n_caveats > MOST_CAVEATS)
        code = tarry_notes_add(&results->notes, (tarry_place){0}, error,
                               "%zu more caveats of this kind on burst figures are not listed; the "
                               "column `samples` of bursts.csv tells how much each figure rests on",
                               n_caveats - MOST_CAVEATS);
    return code;
}

const tarry_tally_kind tarry_tally_bursts = {
    .name = "bursts",
    .size = bursts_size,
    .scratch = tarry_periods_scratch,
    .add = bursts_add,
    .report = bursts_report,
};
