/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Autocorrelations of signals and products and cross-correlations of signals: autocorrelation.csv,
 * decay times in bursts.csv (products) and signals.csv.
 *
 * The sums and what follows from them are in tally/correlation.h; here is what is kept of which
 * channel and window, and the figures. A window is taken as stationary where the cells settled and
 * no protocol step comes before its end; elsewhere the mean over cells at each frame is taken off.
 * For data it is as their reader was told. Their read-out noise is not known: what counts as the
 * variance is the line through lags 1 to 3, put back to 0.
 * Formulas: docs/statistics.md, "Autocorrelation". */
#include "base/error.h"
#include "base/memory.h"
#include "base/number.h"
#include "base/table.h"
#include "tally/channels.h"
#include "tally/correlation.h"
#include "tally/kinds.h"
#include "tally/results.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

/* A spread below this share of the mean is rounding. */
static const double least_spread = 1e-13;

/* A decay time above this share of the longest lag is short: see the note. */
static const double long_decay = 0.2;

enum { MOST_CAVEATS = 40 };

/* ---- layout ---- */

/* Channels that correlate are numbered in order; signals come last among them. */
typedef struct film_layout {
    size_t n_series, n_signals;
} film_layout;

static film_layout layout_of(const tarry_network *network) {
    film_layout layout = {0, 0};
    for (uint32_t c = 0; c < network->n_channels; c++) {
        layout.n_series += network->channels[c].correlates;
        layout.n_signals += network->channels[c].correlates &&
                            network->channels[c].signal != TARRY_NONE;
    }
    return layout;
}

static size_t n_pairs(const film_layout *layout) {
    return layout->n_signals * (layout->n_signals - (layout->n_signals > 0)) / 2;
}

static bool is_stationary(const tarry_network *network, const tarry_window *window) {
    if (network->data)
        return network->data->mean != TARRY_FILM_MEAN_FRAME;
    if (network->gaps)
        return true; /* one mean for all, as of data in which frames are missing */
    for (uint32_t i = 1; i < network->n_segments; i++)
        if (network->segments[i].start < window->to)
            return false;
    return network->run.settle > 0.0;
}

/* Windows of fewer than 2 frames hold nothing to correlate. */
static bool is_film(const tarry_window *window) {
    return window->frames.to >= window->frames.from + 2;
}

static tarry_film_shape shape_of(const tarry_network *network, const tarry_window *window) {
    const bool gaps = network->gaps;
    const uint32_t n_frames = window->frames.to - window->frames.from;
    tarry_film_shape shape = tarry_film_shape_of(
        gaps && network->data ? network->data->longest : n_frames, network->run.n_lags,
        is_stationary(network, window));
    shape.gaps = gaps;
    shape.own_mean = gaps && network->data && network->data->mean == TARRY_FILM_MEAN_CELL;
    return shape;
}

/* Form: a shift for each window and series. Sums of a window: number of cells, those of its series,
 * those of its pairs. */
static size_t autocorrelation_form(const tarry_network *network) {
    return (size_t)network->run.n_windows * layout_of(network).n_series;
}

static size_t window_size(const film_layout *layout, const tarry_film_shape *shape) {
    return 1 + layout->n_series * tarry_series_n_sums(shape) +
           n_pairs(layout) * tarry_pair_n_sums(shape);
}

static size_t autocorrelation_size(const tarry_network *network) {
    const film_layout layout = layout_of(network);
    size_t n = autocorrelation_form(network);
    for (uint32_t w = 0; w < network->run.n_windows; w++) {
        const tarry_film_shape shape = shape_of(network, &network->run.windows[w]);
        if (is_film(&network->run.windows[w]))
            n += window_size(&layout, &shape);
    }
    return n;
}

/* Traces of all signals, which pair, and of one product at a time; then room to work in. */
static size_t autocorrelation_scratch(const tarry_network *network) {
    size_t most = 0;
    for (uint32_t w = 0; w < network->run.n_windows; w++) {
        const tarry_film_shape shape = shape_of(network, &network->run.windows[w]);
        const size_t n = tarry_trace_size(&shape) * (layout_of(network).n_signals + 1) +
                         tarry_trace_work(&shape);
        if (is_film(&network->run.windows[w]) && n > most)
            most = n;
    }
    return most;
}

/* One window's part of the sums. */
typedef struct window_view {
    const tarry_window *window;
    tarry_film_shape shape;
    size_t n_series, n_signals;
    double *shifts;     /* [series] */
    double *n_cells;    /* 1 */
    double *series_sum; /* [series][tarry_series_n_sums] */
    double *pair_sum;   /* [pair][tarry_pair_n_sums] */
} window_view;

/* Set the view to the first window that is a film, from number *w on; *w is then its number. `next`
 * is where its sums begin, moved to where the following begin. False where there is none. */
static bool view_next(const tarry_network *network, double *sums, window_view *view, uint32_t *w,
                      double **next) {
    const film_layout layout = layout_of(network);
    const tarry_run_plan *run = &network->run;
    while (*w < run->n_windows && !is_film(&run->windows[*w]))
        ++*w;
    if (*w == run->n_windows)
        return false;
    view->window = &run->windows[*w];
    view->shape = shape_of(network, view->window);
    view->n_series = layout.n_series;
    view->n_signals = layout.n_signals;
    view->shifts = sums + *w * layout.n_series;
    view->n_cells = *next;
    view->series_sum = *next + 1;
    view->pair_sum = view->series_sum + layout.n_series * tarry_series_n_sums(&view->shape);
    *next += window_size(&layout, &view->shape);
    return true;
}

static double *series_of(const window_view *view, size_t series) {
    return view->series_sum + series * tarry_series_n_sums(&view->shape);
}

/* Sums of the pair of signals number i < j. */
static double *pair_of(const window_view *view, size_t i, size_t j) {
    const size_t pair = i * (2 * view->n_signals - i - 1) / 2 + (j - i - 1);
    return view->pair_sum + pair * tarry_pair_n_sums(&view->shape);
}

/* ---- one cell ---- */

/* Where the trace of a cell begins that has no frame before: at the first that is known of any
 * channel. */
static uint32_t first_known(const tarry_network *network, const tarry_record *record,
                            const tarry_window *window) {
    uint32_t first = window->frames.to;
    const double *frames = record->frames;
    for (uint32_t c = 0; c < network->n_channels; c++) {
        uint32_t t = window->frames.from;
        while (t < first && isnan(frames[t]))
            t++;
        first = t;
        frames += network->run.n_frames;
    }
    const uint32_t last = window->frames.to - network->data->longest;
    return first < last ? first : last;
}

/* Amid the values of all cells. */
static double shift_of_gaps(const tarry_network *network, uint32_t channel) {
    const int32_t number = network->channels[channel].signal;
    if (network->data)
        return network->data->shifts[channel];
    if (number == TARRY_NONE) /* of whole films any will do */
        return 0.0;
    const tarry_signal *signal = &network->signals[number];
    return isnan(signal->detects_above) || signal->from_first ? signal->background
                                                              : signal->detects_above;
}

static void add_window(const tarry_network *network, const tarry_record *record,
                       const window_view *view, double *scratch) {
    const size_t n_products = view->n_series - view->n_signals;
    const size_t trace_size = tarry_trace_size(&view->shape);
    double *work = scratch + (1 + view->n_signals) * trace_size;
    const uint32_t from = view->shape.gaps && network->data
                              ? first_known(network, record, view->window)
                              : view->window->frames.from;
    size_t series = 0, recorded = 0;
    for (uint32_t c = 0; c < network->n_channels; c++) {
        const double *frames = record->frames + recorded * network->run.n_frames + from;
        recorded += network->channels[c].recorded;
        if (!network->channels[c].correlates)
            continue;
        if (*view->n_cells <= 0.0)
            view->shifts[series] = view->shape.gaps
                                       ? shift_of_gaps(network, c)
                                       : tarry_trace_mean(frames, view->shape.n_frames);
        double *trace = scratch + (series < n_products ? 0 : 1 + series - n_products) * trace_size;
        tarry_trace_prepare(&view->shape, frames, view->shifts[series], trace);
        tarry_series_add(&view->shape, frames, view->shifts[series], trace, work,
                         series_of(view, series));
        series++;
    }
    for (size_t i = 0; i < view->n_signals; i++)
        for (size_t j = i + 1; j < view->n_signals; j++)
            tarry_pair_add(&view->shape, scratch + (1 + i) * trace_size,
                           scratch + (1 + j) * trace_size, work, pair_of(view, i, j));
    *view->n_cells += 1.0;
}

static void autocorrelation_add(const tarry_network *network, const tarry_record *record,
                                double *sums, double *scratch) {
    double *next = sums + autocorrelation_form(network);
    window_view view;
    for (uint32_t w = 0; view_next(network, sums, &view, &w, &next); w++)
        add_window(network, record, &view, scratch);
}

/* ---- one form ---- */

/* Give `other` the shifts of `one`. */
static void align_window(const window_view *one, const window_view *other) {
    const size_t n_products = one->n_series - one->n_signals;
    const double n = *other->n_cells;
    for (size_t i = 0; i < one->n_signals; i++) {
        const double by_i = other->shifts[n_products + i] - one->shifts[n_products + i];
        for (size_t j = i + 1; j < one->n_signals; j++)
            tarry_pair_move(&one->shape, n, series_of(other, n_products + i), by_i,
                            series_of(other, n_products + j),
                            other->shifts[n_products + j] - one->shifts[n_products + j],
                            pair_of(other, i, j));
    }
    for (size_t s = 0; s < one->n_series; s++) {
        tarry_series_move(&one->shape, n, other->shifts[s] - one->shifts[s], series_of(other, s));
        other->shifts[s] = one->shifts[s];
    }
}

static void autocorrelation_align(const tarry_network *network, double *one, double *other) {
    double *next_one = one + autocorrelation_form(network);
    double *next_other = other + autocorrelation_form(network);
    window_view of_one, of_other;
    for (uint32_t w = 0; view_next(network, one, &of_one, &w, &next_one); w++) {
        view_next(network, other, &of_other, &w, &next_other);
        if (*of_one.n_cells <= 0.0)
            memcpy(of_one.shifts, of_other.shifts, of_one.n_series * sizeof *of_one.shifts);
        align_window(&of_one, &of_other);
    }
}

/* ---- figures ---- */

/* Of one series: three curves, then these. */
enum { DECAY_TIME, PLATEAU, AMPLITUDE, N_SCALARS };

static size_t series_n_figures(const tarry_film_shape *shape) {
    return 3 * shape->n_lags + N_SCALARS;
}

static size_t pair_n_figures(const tarry_film_shape *shape) {
    return 3 * (2 * shape->n_lags - 1);
}

static size_t autocorrelation_n_figures(const tarry_network *network) {
    const film_layout layout = layout_of(network);
    size_t n = 0;
    for (uint32_t w = 0; w < network->run.n_windows; w++) {
        const tarry_film_shape shape = shape_of(network, &network->run.windows[w]);
        if (is_film(&network->run.windows[w]))
            n += layout.n_series * series_n_figures(&shape) +
                 n_pairs(&layout) * pair_n_figures(&shape);
    }
    return n;
}

/* What the figures of a series need of its signal. */
typedef struct series_level {
    double mean;     /* background off */
    double variance; /* read-out noise off; NaN where the series does not vary */
} series_level;

/* The variance without read-out noise: docs/statistics.md, "Autocorrelation". */
static double without_noise(const tarry_signal *signal, const window_view *view, size_t series,
                            double covariance_0) {
    const double share = signal->share * signal->share;
    const double fixed = covariance_0 - signal->noise * signal->noise;
    if (!(share > 0.0))
        return fixed;
    const double square = tarry_series_mean_square(&view->shape, *view->n_cells,
                                                   view->shifts[series], series_of(view, series));
    return (fixed - share * square) / (1.0 + share);
}

/* Of data, and where the values that are found are those with much noise. */
static bool noise_is_unknown(const tarry_network *network, const tarry_channel *channel) {
    return tarry_channel_is_real(channel) &&
           (network->data || !isnan(network->signals[channel->signal].detects_above));
}

static series_level level_of(const tarry_network *network, const tarry_channel *channel,
                             const window_view *view, size_t series, const double *covariance) {
    const double mean = view->shifts[series] +
                        tarry_series_mean(&view->shape, *view->n_cells, series_of(view, series));
    const double background = channel->signal == TARRY_NONE
                                  ? 0.0
                                  : network->signals[channel->signal].background;
    series_level level = {mean - background, covariance[0]};
    if (noise_is_unknown(network, channel) && view->shape.n_lags >= TARRY_LAGS_PUT_BACK)
        level.variance = tarry_put_back(covariance);
    else if (channel->signal != TARRY_NONE)
        level.variance = without_noise(&network->signals[channel->signal], view, series,
                                       covariance[0]);
    const double least = least_spread * fabs(mean);
    if (!(level.variance > least * least))
        level.variance = NAN;
    return level;
}

static void series_figures(const tarry_network *network, const tarry_channel *channel,
                           const window_view *view, size_t series, double *work,
                           series_level *level, double *figures) {
    const size_t n = view->shape.n_lags;
    double *covariance = figures, *correlation = figures + n, *per_mean_squared = figures + 2 * n;
    double *scalars = figures + 3 * n;
    tarry_series_covariance(&view->shape, *view->n_cells, series_of(view, series), work,
                            covariance);
    *level = level_of(network, channel, view, series, covariance);
    const double squared = level->mean * level->mean;
    for (size_t k = 0; k < n; k++) {
        correlation[k] = covariance[k] / level->variance;
        per_mean_squared[k] = squared > 0.0 ? covariance[k] / squared : NAN;
    }
    if (isfinite(correlation[0]))
        correlation[0] = 1.0; /* of the signal without its noise */
    scalars[PLATEAU] = tarry_correlation_plateau(correlation, n);
    scalars[DECAY_TIME] = tarry_correlation_decay(correlation, n, scalars[PLATEAU]) *
                          network->run.every;
    scalars[AMPLITUDE] = squared > 0.0 ? level->variance / squared : NAN;
}

static void pair_figures(const window_view *view, size_t i, size_t j, const series_level *levels,
                         double *work, double *figures) {
    const size_t n_products = view->n_series - view->n_signals;
    const size_t n = 2 * view->shape.n_lags - 1;
    double *covariance = figures, *correlation = figures + n, *per_mean_squared = figures + 2 * n;
    tarry_pair_covariance(&view->shape, *view->n_cells, series_of(view, n_products + i),
                          series_of(view, n_products + j), pair_of(view, i, j), work, covariance);
    const double scale = sqrt(levels[i].variance * levels[j].variance);
    const double product = levels[i].mean * levels[j].mean;
    for (size_t k = 0; k < n; k++) {
        correlation[k] = covariance[k] / scale;
        per_mean_squared[k] = product != 0.0 ? covariance[k] / product : NAN;
    }
}

/* Figures of one window; returns where the next ones go. */
static double *window_figures(const tarry_network *network, const window_view *view, double *work,
                              series_level *levels, double *figures) {
    const size_t n_products = view->n_series - view->n_signals;
    size_t series = 0;
    for (uint32_t c = 0; c < network->n_channels; c++) {
        if (!network->channels[c].correlates)
            continue;
        series_level level;
        series_figures(network, &network->channels[c], view, series, work, &level, figures);
        if (series >= n_products)
            levels[series - n_products] = level;
        figures += series_n_figures(&view->shape);
        series++;
    }
    for (size_t i = 0; i < view->n_signals; i++) {
        for (size_t j = i + 1; j < view->n_signals; j++) {
            pair_figures(view, i, j, levels, work, figures);
            figures += pair_n_figures(&view->shape);
        }
    }
    return figures;
}

static size_t most_padded(const tarry_network *network) {
    size_t most = 0;
    for (uint32_t w = 0; w < network->run.n_windows; w++) {
        const size_t n = shape_of(network, &network->run.windows[w]).n_padded;
        most = n > most ? n : most;
    }
    return most;
}

static int autocorrelation_figures(const tarry_network *network, const double *sums,
                                   double *figures, tarry_error *error) {
    double *work = tarry_calloc(2 * most_padded(network), sizeof *work);
    series_level *levels = tarry_calloc(layout_of(network).n_signals, sizeof *levels);
    if (!work || !levels) {
        free(work);
        free(levels);
        return tarry_fail_memory(error, "autocorrelations");
    }
    double *shifts = (double *)sums; /* views are for reading here */
    double *next = shifts + autocorrelation_form(network);
    window_view view;
    for (uint32_t w = 0; view_next(network, shifts, &view, &w, &next); w++)
        figures = window_figures(network, &view, work, levels, figures);
    free(work);
    free(levels);
    return TARRY_OK;
}

/* ---- tables ---- */

typedef struct report_state {
    const tarry_network *network;
    const tarry_tally_set *set;
    const tarry_tally_kind *kind;
    tarry_results *results;
    size_t n_caveats;
} report_state;

static tarry_estimate ask(const report_state *reporting, size_t figure, tarry_scale scale) {
    return tarry_tally_estimate(reporting->set, reporting->kind, figure, scale);
}

/* n_rows rows of one curve, the first at lag `least`, from three runs of figures; `sums` are those
 * of the series or pair. */
static int report_curve(const report_state *reporting, const window_view *view, const char *first,
                        const char *second, ptrdiff_t least, size_t n_rows, size_t figure,
                        const double *sums, tarry_error *error) {
    tarry_results *results = reporting->results;
    int code = TARRY_OK;
    for (size_t i = 0; !code && i < n_rows; i++) {
        const ptrdiff_t lag = least + (ptrdiff_t)i;
        const double pairs = least < 0 ? tarry_pair_pairs(&view->shape, *view->n_cells, sums, lag)
                                       : tarry_series_pairs(&view->shape, *view->n_cells, sums,
                                                            (size_t)lag);
        const tarry_estimate covariance = ask(reporting, figure + i, TARRY_SCALE_PLAIN);
        const tarry_estimate correlation = ask(reporting, figure + n_rows + i, TARRY_SCALE_PLAIN);
        const tarry_estimate squared = ask(reporting, figure + 2 * n_rows + i, TARRY_SCALE_PLAIN);
        code = tarry_table_add(
            results->tables[TARRY_TABLE_autocorrelation], error, view->window->name, first, second,
            (double)lag * reporting->network->run.every, pairs, covariance.value, correlation.value,
            correlation.low, correlation.high, squared.value, squared.low, squared.high);
        if (!code)
            code = tarry_results_keep(results, TARRY_LEDGER_autocorrelation_correlation,
                                      &correlation, error);
    }
    return code;
}

static int report_signal(const report_state *reporting, const window_view *view, const char *name,
                         size_t figure, tarry_error *error) {
    static const struct {
        const char *quantity;
        int figure;
        tarry_scale scale;
    } rows[] = {
        {"decay_time", DECAY_TIME, TARRY_SCALE_LOG},
        {"plateau", PLATEAU, TARRY_SCALE_PLAIN},
        {"amplitude", AMPLITUDE, TARRY_SCALE_LOG},
    };
    tarry_table *table = reporting->results->tables[TARRY_TABLE_signals];
    int code = TARRY_OK;
    for (size_t i = 0; !code && i < sizeof rows / sizeof rows[0]; i++) {
        const tarry_estimate estimate = ask(reporting, figure + (size_t)rows[i].figure,
                                            rows[i].scale);
        code = tarry_table_add(table, error, name, view->window->name, rows[i].quantity,
                               rows[i].figure == DECAY_TIME ? reporting->network->time_unit : "1",
                               estimate.value, estimate.low, estimate.high, *view->n_cells);
    }
    return code;
}

/* "transcript_decay_time" of the gene's "vela.transcript". */
static int report_product(const report_state *reporting, const window_view *view,
                          const tarry_channel *channel, size_t figure, tarry_error *error) {
    const tarry_network *network = reporting->network;
    const int32_t gene = network->species[channel->species].gene;
    if (gene == TARRY_NONE)
        return TARRY_OK;
    const char *dot = strrchr(channel->name, '.');
    tarry_text quantity = {0};
    tarry_text_printf(&quantity, "%s_decay_time", dot ? dot + 1 : channel->name);
    int code = TARRY_OK;
    const tarry_estimate estimate = ask(reporting, figure + DECAY_TIME, TARRY_SCALE_LOG);
    if (quantity.failed)
        code = tarry_fail_memory(error, "a decay time");
    else
        code = tarry_table_add(reporting->results->tables[TARRY_TABLE_bursts], error,
                               network->genes[gene].name, view->window->name, quantity.data,
                               network->time_unit, estimate.value, estimate.low, estimate.high,
                               *view->n_cells);
    tarry_text_release(&quantity);
    return code;
}

/* Say where a decay time misleads. */
static int note_decay(report_state *reporting, const window_view *view, const char *name,
                      size_t figure, tarry_error *error) {
    const tarry_run_plan *run = &reporting->network->run;
    const double longest = (double)(view->shape.n_lags - 1) * run->every;
    const double decay = ask(reporting, figure + DECAY_TIME, TARRY_SCALE_LOG).value;
    const double amplitude = ask(reporting, figure + AMPLITUDE, TARRY_SCALE_LOG).value;
    char time[TARRY_NUMBER_SIZE];
    const bool is_long = isnan(decay) || decay > long_decay * longest;
    if (!isfinite(amplitude) || (!is_long && decay >= run->every) ||
        reporting->n_caveats++ >= MOST_CAVEATS)
        return TARRY_OK;
    tarry_number_write(is_long ? longest : run->every, time);
    if (is_long)
        return tarry_notes_add(&reporting->results->notes, (tarry_place){0}, error,
                               "%s, window %s: the correlation has not levelled off at the longest "
                               "lag (%s %s), so that its plateau is high and its decay time short "
                               "or missing; a larger `%s` would help",
                               name, view->window->name, time, reporting->network->time_unit,
                               reporting->network->data ? "--lags" : "lags");
    return tarry_notes_add(&reporting->results->notes, (tarry_place){0}, error,
                           "%s, window %s: the correlation decays within one frame (%s %s); its "
                           "decay time is no more than a bound",
                           name, view->window->name, time, reporting->network->time_unit);
}

static int report_series(report_state *reporting, const window_view *view,
                         const tarry_channel *channel, size_t series, size_t figure,
                         tarry_error *error) {
    const size_t n_lags = view->shape.n_lags, scalars = figure + 3 * n_lags;
    int code = report_curve(reporting, view, channel->name, channel->name, 0, n_lags, figure,
                            series_of(view, series), error);
    if (!code)
        code = channel->signal != TARRY_NONE
                   ? report_signal(reporting, view, channel->name, scalars, error)
                   : report_product(reporting, view, channel, scalars, error);
    return code ? code : note_decay(reporting, view, channel->name, scalars, error);
}

/* Name of signal number i among those that correlate. */
static const char *signal_name(const tarry_network *network, size_t i) {
    uint32_t c = 0;
    for (size_t seen = 0;; c++) {
        const tarry_channel *channel = &network->channels[c];
        if (channel->correlates && channel->signal != TARRY_NONE && seen++ == i)
            return channel->name;
    }
}

static int report_window(report_state *reporting, const window_view *view, size_t *figure,
                         tarry_error *error) {
    const tarry_network *network = reporting->network;
    const size_t n_lags = view->shape.n_lags;
    size_t series = 0;
    int code = TARRY_OK;
    for (uint32_t c = 0; !code && c < network->n_channels; c++) {
        if (!network->channels[c].correlates)
            continue;
        code = report_series(reporting, view, &network->channels[c], series++, *figure, error);
        *figure += series_n_figures(&view->shape);
    }
    for (size_t i = 0; !code && i < view->n_signals; i++) {
        for (size_t j = i + 1; !code && j < view->n_signals; j++) {
            code = report_curve(reporting, view, signal_name(network, i), signal_name(network, j),
                                1 - (ptrdiff_t)n_lags, 2 * n_lags - 1, *figure, pair_of(view, i, j),
                                error);
            *figure += pair_n_figures(&view->shape);
        }
    }
    return code;
}

static int note_one_cell(const report_state *reporting, tarry_error *error) {
    if (tarry_tally_cells(reporting->set) > 1.0 || layout_of(reporting->network).n_series == 0)
        return TARRY_OK;
    return tarry_notes_add(
        &reporting->results->notes, (tarry_place){0}, error,
        "one cell has no mean but its own: its autocorrelation is too low by "
        "about the variance of that mean, and is left out where the mean changes "
        "with time");
}

/* How many cells make intervals of correlations right (docs/statistics.md, "How often the intervals
 * hold"). */
enum { CELLS_UNLIKE = 2000, CELLS_CHANGING = 1000 };

static bool changes(const tarry_network *network) {
    for (uint32_t w = 0; w < network->run.n_windows; w++)
        if (is_film(&network->run.windows[w]) && !is_stationary(network, &network->run.windows[w]))
            return true;
    return false;
}

/* Spreads between cells are skewed where cells differ, and where few of them respond early. */
static int note_short(const report_state *reporting, tarry_error *error) {
    const double cells = tarry_tally_cells(reporting->set);
    const tarry_network *network = reporting->network;
    tarry_notes *notes = &reporting->results->notes;
    if (layout_of(network).n_series == 0 || cells <= 1.0)
        return TARRY_OK;
    if (network->variation && cells < CELLS_UNLIKE)
        return tarry_notes_add(
            notes, (tarry_place){0}, error,
            "cells differ in their parameters, and the plateau of a correlation "
            "is their share of the spread: with fewer than %d cells intervals of "
            "correlations hold the truth in 90 %% of runs and those of plateaus "
            "in 82 to 85 %%, not in 95 %%",
            (int)CELLS_UNLIKE);
    if (!network->data && changes(network) && cells < CELLS_CHANGING)
        return tarry_notes_add(
            notes, (tarry_place){0}, error,
            "in windows in which means change with time, or that nothing settled "
            "before, intervals of correlations hold the truth in 89 %% of runs and "
            "those of plateaus in 81 %% with 100 cells, not in 95 %%; %d cells mend "
            "it",
            (int)CELLS_CHANGING);
    return TARRY_OK;
}

static int autocorrelation_report(const tarry_network *network, const tarry_tally_set *set,
                                  const tarry_tally_kind *kind, tarry_results *results,
                                  tarry_error *error) {
    if (tarry_tally_cells(set) <= 0.0)
        return TARRY_OK;
    report_state reporting = {network, set, kind, results, 0};
    double *sums = (double *)tarry_tally_sums(set, kind); /* views are for reading here */
    double *next = sums + autocorrelation_form(network);
    size_t figure = 0;
    window_view view;
    int code = note_one_cell(&reporting, error);
    if (!code)
        code = note_short(&reporting, error);
    for (uint32_t w = 0; !code && view_next(network, sums, &view, &w, &next); w++)
        code = report_window(&reporting, &view, &figure, error);
    if (!code && reporting.n_caveats > MOST_CAVEATS)
        code = tarry_notes_add(&results->notes, (tarry_place){0}, error,
                               "%zu more caveats of this kind on decay times are not listed",
                               reporting.n_caveats - MOST_CAVEATS);
    return code;
}

const tarry_tally_kind tarry_tally_autocorrelation = {
    .name = "autocorrelation",
    .size = autocorrelation_size,
    .form = autocorrelation_form,
    .scratch = autocorrelation_scratch,
    .add = autocorrelation_add,
    .align = autocorrelation_align,
    .n_figures = autocorrelation_n_figures,
    .figures = autocorrelation_figures,
    .report = autocorrelation_report,
};
