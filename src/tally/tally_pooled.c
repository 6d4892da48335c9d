/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Moments pooled over the frames of a window and over cells: P_mean, P_fano and P_cv2 of each
 * product P of a gene in bursts.csv; signal_mean, signal_sd and signal_cv2 in signals.csv.
 *
 * Frames of one cell are not independent. The mean of squares about the pooled mean is short by the
 * variance of that mean, which is estimated from the spread of the cells' own means and added; with
 * one frame a cell this is the usual n - 1 divisor. Of data each cell has as many frames as are
 * known of it; the mean is then a ratio, and its variance that of a ratio estimator (Cochran 1977,
 * Sampling Techniques, section 6.3), which with equal numbers of frames is the same. Sums are about
 * a shift as in tally_moments.c, fixed by the first frame of the group's first cell. Formulas:
 * docs/statistics.md, "Pooled". */
#include "base/table.h"
#include "tally/channels.h"
#include "tally/kinds.h"
#include "tally/moments.h"
#include "tally/quantities.h"
#include "tally/results.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

enum { MOST_CAVEATS = 10 };

/* Below so many effective bursts intervals of a Fano factor hold the truth in 91 % of runs or less:
 * trials with negative binomial counts (docs/statistics.md, "Pooled"). */
static const double fewest_bursts = 200.0;

/* Sums of one channel in one window; d is value less shift. */
enum {
    SUM,     /* of d over frames and cells */
    SQUARES, /* of d^2 over frames and cells */
    CELLS,   /* of (sum of d over a cell's frames)^2 over cells */
    N_SUMS,
    /* where frames may be missing also, over cells, sums of */
    FRAMES = N_SUMS, /* their number f, */
    FRAMES_SQUARED,  /* f^2, */
    PRODUCTS,        /* f times the sum of d, */
    KNOWN,           /* and 1 for each cell with f > 0 */
    N_SUMS_GAPS
};

/* The sums: a shift for each channel and window, then n_sums for each, then the number of cells. */
typedef struct layout {
    size_t n_windows;
    size_t n; /* recorded channels times windows */
    size_t n_sums;
} layout;

static layout layout_of(const tarry_network *network) {
    const size_t n_windows = network->run.n_windows;
    return (layout){n_windows, tarry_channels_recorded(network) * n_windows,
                    network->gaps ? N_SUMS_GAPS : N_SUMS};
}

static size_t pooled_size(const tarry_network *network) {
    const layout l = layout_of(network);
    return l.n * (1 + l.n_sums) + 1;
}

static size_t pooled_form(const tarry_network *network) {
    return layout_of(network).n;
}

static double n_frames(const tarry_window *window) {
    return (double)window->frames.to - (double)window->frames.from;
}

/* ---- sums ------------------------------------------------------------------------------------ */

static void add_frames(const double *frames, size_t n, double shift, double sums[N_SUMS]) {
    double sum = 0.0, squares = 0.0;
    for (size_t i = 0; i < n; i++) {
        const double d = frames[i] - shift;
        sum += d;
        squares += d * d;
    }
    sums[SUM] += sum;
    sums[SQUARES] += squares;
    sums[CELLS] += sum * sum;
}

/* Frames that are known; the first of the group gives the shift. */
static void add_known(const double *frames, size_t n, double *shift, double sums[N_SUMS_GAPS]) {
    double sum = 0.0, squares = 0.0, known = 0.0;
    for (size_t i = 0; i < n; i++) {
        if (isnan(frames[i]))
            continue;
        if (sums[FRAMES] + known <= 0.0)
            *shift = frames[i];
        const double d = frames[i] - *shift;
        sum += d;
        squares += d * d;
        known += 1.0;
    }
    sums[SUM] += sum;
    sums[SQUARES] += squares;
    sums[CELLS] += sum * sum;
    sums[FRAMES] += known;
    sums[FRAMES_SQUARED] += known * known;
    sums[PRODUCTS] += known * sum;
    sums[KNOWN] += known > 0.0;
}

static void pooled_add(const tarry_network *network, const tarry_record *record, double *sums,
                       double *scratch) {
    (void)scratch;
    const layout l = layout_of(network);
    double *cells = sums + l.n * (1 + l.n_sums);
    for (size_t i = 0; i < l.n; i++) {
        const tarry_range range = network->run.windows[i % l.n_windows].frames;
        const double *frames = record->frames + i / l.n_windows * network->run.n_frames;
        double *own = sums + l.n + i * l.n_sums;
        if (range.from >= range.to)
            continue;
        if (l.n_sums == N_SUMS_GAPS) {
            add_known(frames + range.from, range.to - range.from, &sums[i], own);
            continue;
        }
        if (*cells <= 0.0)
            sums[i] = frames[range.from];
        add_frames(frames + range.from, range.to - range.from, sums[i], own);
    }
    *cells += 1.0;
}

static void align_known(double *one_shift, const double *one, double *other_shift, double *other) {
    if (one[FRAMES] <= 0.0)
        *one_shift = *other_shift;
    const double by = *other_shift - *one_shift;
    other[SQUARES] += by * (2.0 * other[SUM] + other[FRAMES] * by);
    other[CELLS] += by * (2.0 * other[PRODUCTS] + other[FRAMES_SQUARED] * by);
    other[PRODUCTS] += by * other[FRAMES_SQUARED];
    other[SUM] += by * other[FRAMES];
    *other_shift = *one_shift;
}

static void pooled_align(const tarry_network *network, double *one, double *other) {
    const layout l = layout_of(network);
    const double cells = other[l.n * (1 + l.n_sums)];
    for (size_t i = 0; i < l.n && l.n_sums == N_SUMS_GAPS; i++)
        align_known(&one[i], one + l.n + i * l.n_sums, &other[i], other + l.n + i * l.n_sums);
    if (l.n_sums == N_SUMS_GAPS)
        return;
    for (size_t i = 0; i < l.n; i++) {
        const double frames = n_frames(&network->run.windows[i % l.n_windows]);
        const double by = other[i] - one[i], by_cell = frames * by;
        double *sums = other + l.n + i * N_SUMS;
        sums[SQUARES] += by * (2.0 * sums[SUM] + cells * by_cell);
        sums[CELLS] += by_cell * (2.0 * sums[SUM] + cells * by_cell);
        sums[SUM] += cells * by_cell;
        other[i] = one[i];
    }
}

/* ---- figures --------------------------------------------------------------------------------- */

/* One cell alone cannot tell how far its mean is off; its frames are then taken as independent. */
static double variance_of(double cells, double frames, const double sums[N_SUMS]) {
    const double n = cells * frames, mean = sums[SUM] / n;
    const double about_mean = sums[SQUARES] - sums[SUM] * mean;
    if (cells < 2.0)
        return n >= 2.0 ? about_mean / (n - 1.0) : NAN;
    const double between = sums[CELLS] - sums[SUM] * sums[SUM] / cells;
    return about_mean / n + between / (cells - 1.0) / cells / (frames * frames);
}

/* The same where cells differ in their number of frames. */
static double variance_known(const double sums[N_SUMS_GAPS]) {
    const double n = sums[FRAMES], cells = sums[KNOWN], mean = sums[SUM] / n;
    const double about_mean = sums[SQUARES] - sums[SUM] * mean;
    if (cells < 2.0)
        return n >= 2.0 ? about_mean / (n - 1.0) : NAN;
    const double between = sums[CELLS] - 2.0 * mean * sums[PRODUCTS] +
                           mean * mean * sums[FRAMES_SQUARED];
    return about_mean / n + between / (n * n) * cells / (cells - 1.0);
}

static void work_out(const double *sums, const double *less, layout l, size_t i, double frames,
                     double figures[TARRY_N_MOMENTS]) {
    const size_t at = l.n + i * l.n_sums, cells_at = l.n * (1 + l.n_sums);
    double left[N_SUMS_GAPS] = {0};
    for (size_t j = 0; j < l.n_sums; j++)
        left[j] = sums[at + j] - (less ? less[at + j] : 0.0);
    if (l.n_sums == N_SUMS_GAPS) {
        tarry_moments_of(sums[i] + left[SUM] / left[FRAMES], variance_known(left), figures);
        return;
    }
    const double cells = sums[cells_at] - (less ? less[cells_at] : 0.0);
    tarry_moments_of(sums[i] + left[SUM] / (cells * frames), variance_of(cells, frames, left),
                     figures);
}

/* All figures of channel and window number i. Signals may be negative, so that their mean has its
 * interval on the plain scale. */
static void estimate(const tarry_network *network, const tarry_tally_set *set,
                     const tarry_tally_kind *kind, size_t i, tarry_scale mean_scale,
                     tarry_estimate estimates[TARRY_N_MOMENTS]) {
    const layout l = layout_of(network);
    const double *sums = tarry_tally_sums(set, kind);
    const double frames = n_frames(&network->run.windows[i % l.n_windows]);
    double figures[TARRY_N_MOMENTS], without[TARRY_N_MOMENTS];
    double replicates[TARRY_N_MOMENTS][TARRY_GROUPS];
    work_out(sums, NULL, l, i, frames, figures);
    for (size_t g = 0; g < tarry_tally_n_groups(set); g++) {
        work_out(sums, tarry_tally_group_sums(set, kind, g), l, i, frames, without);
        for (int j = 0; j < TARRY_N_MOMENTS; j++)
            replicates[j][g] = without[j];
    }
    for (int j = 0; j < TARRY_N_MOMENTS; j++)
        estimates[j] = tarry_jackknife_estimate(tarry_tally_jackknife(set), figures[j],
                                                replicates[j],
                                                j == TARRY_MEAN ? mean_scale : TARRY_SCALE_LOG);
}

/* ---- the tables ------------------------------------------------------------------------------ */

/* What reporting goes by. */
typedef struct reporting {
    const tarry_network *network;
    const tarry_tally_set *set;
    const tarry_tally_kind *kind;
    tarry_results *results;
    size_t n_caveats;
} reporting;

/* Rows of one name: quantities are `what` and an ending. */
static int add_rows(const reporting *r, tarry_result_table table, const char *name,
                    const char *window, const char *what, const tarry_moment_row *rows,
                    size_t n_rows, const tarry_estimate *estimates, tarry_error *error) {
    int code = TARRY_OK;
    for (size_t i = 0; !code && i < n_rows; i++) {
        const tarry_estimate *e = &estimates[rows[i].moment];
        char quantity[256];
        snprintf(quantity, sizeof quantity, "%.240s_%s", what, rows[i].ending);
        code = tarry_table_add(r->results->tables[table], error, name, window, quantity,
                               rows[i].unit, e->value, e->low, e->high, tarry_tally_cells(r->set));
        if (!code)
            code = tarry_results_keep(r->results,
                                      table == TARRY_TABLE_bursts ? TARRY_LEDGER_bursts_value
                                                                  : TARRY_LEDGER_signals_value,
                                      e, error);
    }
    return code;
}

static int add_product(const reporting *r, const tarry_channel *channel, const char *window,
                       const tarry_estimate *estimates, tarry_error *error) {
    const tarry_network *network = r->network;
    const char *gene = network->genes[network->species[channel->species].gene].name;
    return add_rows(r, TARRY_TABLE_bursts, gene, window, tarry_product_name(channel->name, gene),
                    tarry_product_rows, TARRY_MOMENT_ROWS, estimates, error);
}

static int add_signal(const reporting *r, const tarry_channel *channel, const char *window,
                      const tarry_estimate *estimates, tarry_error *error) {
    return add_rows(r, TARRY_TABLE_signals, channel->name, window, "signal", tarry_signal_rows,
                    TARRY_MOMENT_ROWS, estimates, error);
}

/* How many bursts the cells have told of: counts with this mean and variance, were they negative
 * binomial, have mean / (Fano - 1) bursts each, and there are as many independent cells as make the
 * mean's standard error what it is. Infinite where counts are not bursty. */
static double effective_bursts(const tarry_estimate *estimates) {
    const double fano = estimates[TARRY_FANO].value, mean = estimates[TARRY_MEAN].value;
    if (fano <= 1.0)
        return INFINITY;
    return pow(estimates[TARRY_SD].value / estimates[TARRY_MEAN].se, 2) * mean / (fano - 1.0);
}

/* Say where the interval of a Fano factor is short, since few bursts make up the spread. */
static int add_caveat(reporting *r, const tarry_channel *channel, const char *window,
                      const tarry_estimate *estimates, tarry_error *error) {
    if (!(effective_bursts(estimates) < fewest_bursts) || r->n_caveats++ >= MOST_CAVEATS)
        return TARRY_OK;
    return tarry_notes_add(
        &r->results->notes, (tarry_place){0}, error,
        "%s, window %s: few bursts make up its spread, so that the intervals of "
        "fano and cv2 hold the truth in 91 %% of runs or less, not in 95 %%, and "
        "lie too low more often than too high; more cells mend it",
        channel->name, window);
}

static int report_channel(reporting *r, const tarry_channel *channel, size_t first,
                          tarry_error *error) {
    const bool signal = channel->signal != TARRY_NONE;
    int code = TARRY_OK;
    for (uint32_t w = 0; !code && w < r->network->run.n_windows; w++) {
        const char *window = r->network->run.windows[w].name;
        tarry_estimate estimates[TARRY_N_MOMENTS];
        estimate(r->network, r->set, r->kind, first + w,
                 signal ? TARRY_SCALE_PLAIN : TARRY_SCALE_LOG, estimates);
        code = signal ? add_signal(r, channel, window, estimates, error)
                      : add_product(r, channel, window, estimates, error);
        if (!code && !signal)
            code = add_caveat(r, channel, window, estimates, error);
    }
    return code;
}

static int pooled_report(const tarry_network *network, const tarry_tally_set *set,
                         const tarry_tally_kind *kind, tarry_results *results, tarry_error *error) {
    reporting r = {network, set, kind, results, 0};
    size_t first = 0;
    int code = TARRY_OK;
    for (uint32_t i = 0; !code && i < network->n_channels; i++) {
        const tarry_channel *channel = &network->channels[i];
        if (!channel->recorded)
            continue;
        if (channel->signal != TARRY_NONE || tarry_channel_is_product(network, channel))
            code = report_channel(&r, channel, first, error);
        first += network->run.n_windows;
    }
    if (!code && r.n_caveats > MOST_CAVEATS)
        code = tarry_notes_add(&results->notes, (tarry_place){0}, error,
                               "few bursts make up the spread of %zu more names and windows",
                               r.n_caveats - MOST_CAVEATS);
    return code;
}

const tarry_tally_kind tarry_tally_pooled = {
    .name = "pooled",
    .size = pooled_size,
    .form = pooled_form,
    .add = pooled_add,
    .align = pooled_align,
    .report = pooled_report,
};
