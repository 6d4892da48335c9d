/* Moments pooled over the frames of a window and over cells: P_mean, P_fano and P_cv2 of each
 * product P of a gene in bursts.csv; signal_mean, signal_sd and signal_cv2 in signals.csv.
 *
 * Frames of one cell are not independent. The mean of squares about the pooled mean is short by the
 * variance of that mean, which is estimated from the spread of the cells' own means and added; with
 * one frame a cell this is the usual n - 1 divisor. Sums are about a shift as in tally_moments.c,
 * fixed by the first frame of the group's first cell. Formulas: docs/statistics.md, "Pooled". */
#include "base/table.h"
#include "tally/channels.h"
#include "tally/kinds.h"
#include "tally/moments.h"
#include "tally/results.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

/* Sums of one channel in one window; d is value less shift. */
enum {
    SUM,     /* of d over frames and cells */
    SQUARES, /* of d^2 over frames and cells */
    CELLS,   /* of (sum of d over a cell's frames)^2 over cells */
    N_SUMS
};

/* The sums: a shift for each channel and window, then N_SUMS for each, then the number of cells. */
typedef struct layout {
    size_t n_windows;
    size_t n; /* recorded channels times windows */
} layout;

static layout layout_of(const tarry_network *network) {
    const size_t n_windows = network->run.n_windows;
    return (layout){n_windows, tarry_channels_recorded(network) * n_windows};
}

static size_t pooled_size(const tarry_network *network) {
    return layout_of(network).n * (1 + N_SUMS) + 1;
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

static void pooled_add(const tarry_network *network, const tarry_record *record, double *sums,
                       double *scratch) {
    (void)scratch;
    const layout l = layout_of(network);
    double *cells = sums + l.n * (1 + N_SUMS);
    for (size_t i = 0; i < l.n; i++) {
        const tarry_range range = network->run.windows[i % l.n_windows].frames;
        const double *frames = record->frames + i / l.n_windows * network->run.n_frames;
        if (range.from >= range.to)
            continue;
        if (*cells <= 0.0)
            sums[i] = frames[range.from];
        add_frames(frames + range.from, range.to - range.from, sums[i], sums + l.n + i * N_SUMS);
    }
    *cells += 1.0;
}

static void pooled_align(const tarry_network *network, double *one, double *other) {
    const layout l = layout_of(network);
    const double cells = other[l.n * (1 + N_SUMS)];
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

static void work_out(const double *sums, const double *less, layout l, size_t i, double frames,
                     double figures[TARRY_N_MOMENTS]) {
    const size_t at = l.n + i * N_SUMS, cells_at = l.n * (1 + N_SUMS);
    double left[N_SUMS];
    for (size_t j = 0; j < N_SUMS; j++)
        left[j] = sums[at + j] - (less ? less[at + j] : 0.0);
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

static int add_row(tarry_table *table, const char *name, const char *window, const char *quantity,
                   const char *unit, tarry_estimate estimate, double cells, tarry_error *error) {
    return tarry_table_add(table, error, name, window, quantity, unit, estimate.value, estimate.low,
                           estimate.high, cells);
}

/* "transcript" of "vela.transcript". */
static const char *product_name(const char *species, const char *gene) {
    const size_t n = strlen(gene);
    return strncmp(species, gene, n) == 0 && species[n] == '.' ? species + n + 1 : species;
}

static int report_product(const char *gene, const char *window, const char *product,
                          const tarry_estimate estimates[TARRY_N_MOMENTS], double cells,
                          tarry_table *table, tarry_error *error) {
    static const struct {
        int moment;
        const char *ending, *unit;
    } rows[] = {{TARRY_MEAN, "mean", "molecules per cell"},
                {TARRY_FANO, "fano", "1"},
                {TARRY_CV2, "cv2", "1"}};
    int code = TARRY_OK;
    for (size_t i = 0; !code && i < sizeof rows / sizeof rows[0]; i++) {
        char quantity[256];
        snprintf(quantity, sizeof quantity, "%.240s_%s", product, rows[i].ending);
        code = add_row(table, gene, window, quantity, rows[i].unit, estimates[rows[i].moment],
                       cells, error);
    }
    return code;
}

static int report_signal(const char *signal, const char *window,
                         const tarry_estimate estimates[TARRY_N_MOMENTS], double cells,
                         tarry_table *table, tarry_error *error) {
    int code = add_row(table, signal, window, "signal_mean", "signal", estimates[TARRY_MEAN], cells,
                       error);
    if (!code)
        code = add_row(table, signal, window, "signal_sd", "signal", estimates[TARRY_SD], cells,
                       error);
    if (!code)
        code = add_row(table, signal, window, "signal_cv2", "1", estimates[TARRY_CV2], cells,
                       error);
    return code;
}

static int report_channel(const tarry_network *network, const tarry_tally_set *set,
                          const tarry_tally_kind *kind, const tarry_channel *channel, size_t first,
                          tarry_results *results, tarry_error *error) {
    const double cells = tarry_tally_cells(set);
    const bool signal = channel->signal != TARRY_NONE;
    int code = TARRY_OK;
    for (uint32_t w = 0; !code && w < network->run.n_windows; w++) {
        const char *window = network->run.windows[w].name;
        tarry_estimate estimates[TARRY_N_MOMENTS];
        estimate(network, set, kind, first + w, signal ? TARRY_SCALE_PLAIN : TARRY_SCALE_LOG,
                 estimates);
        if (signal) {
            code = report_signal(channel->name, window, estimates, cells,
                                 results->tables[TARRY_TABLE_signals], error);
            continue;
        }
        const char *gene = network->genes[network->species[channel->species].gene].name;
        code = report_product(gene, window, product_name(channel->name, gene), estimates, cells,
                              results->tables[TARRY_TABLE_bursts], error);
    }
    return code;
}

static int pooled_report(const tarry_network *network, const tarry_tally_set *set,
                         const tarry_tally_kind *kind, tarry_results *results, tarry_error *error) {
    size_t first = 0;
    int code = TARRY_OK;
    for (uint32_t i = 0; !code && i < network->n_channels; i++) {
        const tarry_channel *channel = &network->channels[i];
        if (!channel->recorded)
            continue;
        if (channel->signal != TARRY_NONE || tarry_channel_is_product(network, channel))
            code = report_channel(network, set, kind, channel, first, results, error);
        first += network->run.n_windows;
    }
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
