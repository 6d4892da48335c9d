/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Autocorrelations, a panel for each name and a curve for each window, and cross-correlations of
 * signals. */
#include "report/figure_parts.h"

#include <math.h>
#include <string.h>

enum { MOST_WINDOWS = 5 };

static bool is_in(const tarry_figure_rows *rows, size_t i, const char *window, const char *second) {
    return !strcmp(tarry_figure_text(rows, i, "window"), window) &&
           !strcmp(tarry_figure_text(rows, i, "second"), second);
}

static void add_curve(const tarry_figure_rows *rows, const char *window, const char *second,
                      const char *name, int colour, tarry_plot *plot) {
    tarry_plot_add_series(plot, TARRY_SERIES_LINE, name, colour);
    for (size_t i = 0; i < rows->n; i++)
        if (is_in(rows, i, window, second))
            tarry_plot_add_row(plot, tarry_figure_number(rows, i, "lag"),
                               tarry_figure_number(rows, i, "correlation"),
                               tarry_figure_number(rows, i, "low"),
                               tarry_figure_number(rows, i, "high"));
    tarry_plot_drop_empty_series(plot);
}

/* The exact laws of all windows. */
static void add_exact_curves(const tarry_figure_work *work, const char *first, const char *second,
                             tarry_plot *plot) {
    const tarry_run_plan *run = &work->network->run;
    const tarry_figure_rows rows = tarry_figure_exact_rows_of(work, TARRY_TABLE_autocorrelation,
                                                              first);
    for (uint32_t w = 0; w < run->n_windows && w < MOST_WINDOWS; w++) {
        tarry_figure_add_exact_series(plot);
        for (size_t i = 0; i < rows.n; i++)
            if (is_in(&rows, i, run->windows[w].name, second))
                tarry_plot_add_wide_row(plot, tarry_figure_number(&rows, i, "lag"), 1,
                                        tarry_figure_number(&rows, i, "correlation"), NAN, NAN);
        tarry_plot_drop_empty_series(plot);
    }
}

/* Plateau and decay time of a signal; of a product the decay time alone is told. */
static void add_marks(const tarry_figure_work *work, const tarry_channel *channel,
                      const char *window, int colour, tarry_plot *plot) {
    if (channel->signal != TARRY_NONE) {
        const tarry_figure_rows rows = tarry_figure_rows_of(work, TARRY_TABLE_signals,
                                                            channel->name);
        tarry_plot_add_mark(plot, tarry_figure_quantity(&rows, window, "plateau"), true, colour);
        tarry_plot_add_mark(plot, tarry_figure_quantity(&rows, window, "decay_time"), false,
                            colour);
        return;
    }
    const int32_t gene = work->network->species[channel->species].gene;
    char quantity[256];
    const char *product = tarry_figure_short_name(channel->name);
    if (gene == TARRY_NONE || strlen(product) + sizeof "_decay_time" > sizeof quantity)
        return;
    strcpy(quantity, product);
    strcat(quantity, "_decay_time");
    const tarry_figure_rows rows = tarry_figure_rows_of(work, TARRY_TABLE_bursts,
                                                        work->network->genes[gene].name);
    tarry_plot_add_mark(plot, tarry_figure_quantity(&rows, window, quantity), false, colour);
}

static void add_panel(const tarry_figure_work *work, const tarry_channel *channel,
                      tarry_plot *plot) {
    const tarry_run_plan *run = &work->network->run;
    const tarry_figure_rows rows = tarry_figure_rows_of(work, TARRY_TABLE_autocorrelation,
                                                        channel->name);
    if (!tarry_plot_add_panel(plot, tarry_figure_short_name(channel->name)))
        return;
    for (uint32_t w = 0; w < run->n_windows && w < MOST_WINDOWS; w++) {
        const char *window = run->windows[w].name;
        add_curve(&rows, window, channel->name, run->n_windows > 1 ? window : "", (int)w, plot);
        add_marks(work, channel, window, (int)w, plot);
    }
    add_exact_curves(work, channel->name, channel->name, plot);
    tarry_plot_drop_empty_panel(plot);
}

int tarry_figure_autocorrelation(tarry_figure_work *work, const tarry_figure_subject *subject,
                                 tarry_error *error) {
    tarry_plot plot = {.x_label = work->lag_label,
                       .y_label = "autocorrelation",
                       .x_name = "lag",
                       .y_name = "correlation"};
    tarry_figure_words words = {.kind = "autocorrelation", .title = "Autocorrelation"};
    for (size_t i = 0; i < subject->n_channels && plot.n_panels < TARRY_PLOT_PANELS; i++)
        add_panel(work, &work->network->channels[subject->channels[i]], &plot);
    tarry_text_printf(
        &words.caption,
        "How alike a value is to the one a lag earlier. Dotted and upright: the decay "
        "time%s, where the curve first falls to its plateau and 1/e of the way above.",
        subject->of_signals ? "; dotted and level: the plateau" : "");
    tarry_figure_add_band_words(work, &words.caption);
    tarry_text_printf(&words.alternative, "Autocorrelations of %s against the lag, a panel each.",
                      subject->words);
    return tarry_figure_finish(work, subject, &plot, &words, error);
}

/* ---- pairs ---------------------------------------------------------------------------------- */

static void add_pair(tarry_figure_work *work, const tarry_figure_subject *subject, size_t i,
                     size_t j, tarry_plot *plot) {
    const tarry_run_plan *run = &work->network->run;
    const char *first = work->network->channels[subject->channels[i]].name;
    const char *second = work->network->channels[subject->channels[j]].name;
    const tarry_figure_rows rows = tarry_figure_rows_of(work, TARRY_TABLE_autocorrelation, first);
    const char *title = tarry_arena_format(&work->arena, "%s, then %s", first, second);
    plot->failed = plot->failed || !title;
    if (!title || !tarry_plot_add_panel(plot, title))
        return;
    tarry_plot_add_mark(plot, 0, false, -1);
    for (uint32_t w = 0; w < run->n_windows && w < MOST_WINDOWS; w++)
        add_curve(&rows, run->windows[w].name, second,
                  run->n_windows > 1 ? run->windows[w].name : "", (int)w, plot);
    add_exact_curves(work, first, second, plot);
    tarry_plot_drop_empty_panel(plot);
}

int tarry_figure_cross_correlation(tarry_figure_work *work, const tarry_figure_subject *subject,
                                   tarry_error *error) {
    tarry_plot plot = {.x_label = work->lag_label,
                       .y_label = "cross-correlation",
                       .x_name = "lag",
                       .y_name = "correlation"};
    tarry_figure_words words = {.kind = "cross-correlation", .title = "Cross-correlation"};
    if (!subject->of_signals)
        return 0;
    for (size_t i = 0; i < subject->n_channels; i++)
        for (size_t j = i + 1; j < subject->n_channels && plot.n_panels < TARRY_PLOT_PANELS; j++)
            add_pair(work, subject, i, j, &plot);
    tarry_text_add_string(&words.caption,
                          "How alike the second signal is to the first one a lag earlier: a peak "
                          "right of 0 means that the second comes later.");
    tarry_figure_add_band_words(work, &words.caption);
    tarry_text_add_string(&words.alternative, "Cross-correlations of pairs of signals against the "
                                              "lag, a panel each.");
    return tarry_figure_finish(work, subject, &plot, &words, error);
}
