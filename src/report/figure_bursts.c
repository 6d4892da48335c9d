/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Sizes of bursts, with the exact law where there is one, and how long periods last. */
#include "report/figure_parts.h"

#include "exact/bursts.h"

#include <math.h>
#include <string.h>

enum { MOST_WINDOWS = 5 };

static const double size_tail = 0.002;     /* share of bursts that may lie beyond the picture */
static const double least_told = 1e-9;     /* in the shape of a law */
static const double survival_tail = 0.002; /* below this share no more of a curve is shown */

/* ---- sizes ---------------------------------------------------------------------------------- */

/* Bars of one window; returns the number of bursts. *longest: where all but a tail lie below. */
static double add_bars(const tarry_figure_work *work, const tarry_gene *gene, const char *window,
                       double *longest, tarry_plot *plot) {
    const tarry_figure_rows rows = tarry_figure_rows_of(work, TARRY_TABLE_burst_sizes, gene->name);
    double n = 0, below = 0;
    *longest = 0;
    tarry_plot_add_series(plot, TARRY_SERIES_BARS,
                          tarry_results_is_predicted(work->results) ? "exact law" : "simulated", 0);
    for (size_t i = 0; i < rows.n; i++) {
        if (strcmp(tarry_figure_text(&rows, i, "window"), window))
            continue;
        const double size = tarry_figure_number(&rows, i, "size");
        const double width = tarry_figure_number(&rows, i, "width");
        const double share = tarry_figure_number(&rows, i, "probability");
        tarry_plot_add_wide_row(plot, size + 0.5 * (width - 1), width, share,
                                tarry_figure_number(&rows, i, "low"),
                                tarry_figure_number(&rows, i, "high"));
        if (below < 1 - size_tail)
            *longest = size + width;
        below += share;
        n += tarry_figure_number(&rows, i, "bursts");
    }
    tarry_plot_drop_empty_series(plot);
    return n;
}

/* Geometric from 0 on: each size as much rarer than the one before as the first is from 1. */
static bool is_geometric(const tarry_exact_bursts *law) {
    const double ratio = 1 - law->sizes[0];
    for (size_t i = 1; i < law->n_sizes && law->sizes[i] > least_told; i++)
        if (fabs(law->sizes[i] / law->sizes[i - 1] - ratio) > least_told)
            return false;
    return true;
}

/* The law from 0 to `longest`. Sets *name to what the legend calls it where there is one. */
static int add_law(tarry_figure_work *work, uint32_t gene, const tarry_window *window,
                   double longest, tarry_plot *plot, const char **name, tarry_error *error) {
    tarry_exact_gene exact;
    tarry_exact_bursts law;
    const char *why = NULL;
    const tarry_range promoters = work->network->genes[gene].promoters;
    if (promoters.from == promoters.to || work->network->variation)
        return 0;
    int code = tarry_exact_gene_read(&work->flows, work->network->segments, gene, &work->arena,
                                     &exact, error);
    if (!code && !exact.why)
        code = tarry_exact_bursts_read(&exact, window->from, window->to, &work->arena, &law, &why,
                                       error);
    if (code == TARRY_NUMERIC) /* the bars stand without it */
        return 0;
    if (code || exact.why || why)
        return code;
    *name = is_geometric(&law) ? "exact law (geometric)" : "exact law";
    tarry_plot_add_series(plot, TARRY_SERIES_LAW, *name, 0);
    for (size_t i = 0; i < law.n_sizes && (double)i <= longest; i++)
        tarry_plot_add_wide_row(plot, (double)i, 1, law.sizes[i], NAN, NAN);
    return 0;
}

static int add_size_panel(tarry_figure_work *work, const tarry_figure_subject *subject,
                          const tarry_window *window, tarry_plot *plot, tarry_figure_words *words,
                          tarry_error *error) {
    const bool several = work->network->run.n_windows > 1;
    double longest;
    const char *law = NULL;
    tarry_plot_panel *panel = tarry_plot_add_panel(plot, several ? window->name : "");
    if (!panel)
        return 0;
    const double n = add_bars(work, subject->gene, window->name, &longest, plot);
    tarry_plot_drop_empty_panel(plot);
    if (longest <= 0)
        return 0;
    panel->x_from = -0.7;
    panel->x_to = longest;
    const bool predicted = tarry_results_is_predicted(work->results);
    const int code = predicted ? 0
                               : add_law(work, subject->index, window, longest, plot, &law, error);
    const tarry_figure_rows figures = tarry_figure_rows_of(work, TARRY_TABLE_bursts,
                                                           subject->gene->name);
    if (!predicted)
        tarry_text_printf(&words->caption, "%s%s%s%.0f bursts%s.", plot->n_panels > 1 ? " " : "",
                          several ? window->name : "", several ? ": " : "", n,
                          law ? "; the line is the exact law, worked out from the rates" : "");
    tarry_text_printf(&words->alternative, " %s%s size ", several ? window->name : "",
                      several ? ": mean" : "Mean");
    tarry_figure_add_number(&words->alternative,
                            tarry_figure_quantity(&figures, window->name, "burst_size_mean"));
    if (predicted)
        tarry_text_add_string(&words->alternative, ".");
    else
        tarry_text_printf(&words->alternative, " in %.0f bursts.", n);
    return code;
}

int tarry_figure_burst_sizes(tarry_figure_work *work, const tarry_figure_subject *subject,
                             tarry_error *error) {
    tarry_plot plot = {.x_label = "initiations in a burst",
                       .y_label = "probability",
                       .x_name = "size",
                       .y_name = "probability",
                       .own_x = true,
                       .whole_x = true};
    tarry_figure_words words = {.kind = "burst-sizes", .title = "Burst sizes"};
    int code = 0;
    if (!subject->gene)
        return 0;
    tarry_text_printf(&words.alternative, "Bars: sizes of the bursts of %s.", subject->words);
    for (uint32_t w = 0; !code && w < work->network->run.n_windows && w < MOST_WINDOWS; w++)
        code = add_size_panel(work, subject, &work->network->run.windows[w], &plot, &words, error);
    tarry_text_add_string(&words.caption, tarry_results_is_predicted(work->results)
                                              ? "Exact shares of bursts"
                                              : " Upright lines are 95 % intervals point by point");
    tarry_text_add_string(
        &words.caption, "; the largest 2 in 1000 bursts may lie beyond the right end. Sizes above "
                        "1,024 share bins, and bins that nothing fell into are not drawn.");
    const int finished = tarry_figure_finish(work, subject, &plot, &words, error);
    return code ? code : finished;
}

/* ---- dwells --------------------------------------------------------------------------------- */

static void add_curve(const tarry_figure_rows *rows, const char *window, const char *period,
                      const char *name, int colour, double *longest, tarry_plot *plot) {
    tarry_plot_add_series(plot, TARRY_SERIES_LINE, name, colour);
    for (size_t i = 0; i < rows->n; i++) {
        if (strcmp(tarry_figure_text(rows, i, "window"), window) ||
            strcmp(tarry_figure_text(rows, i, "period"), period))
            continue;
        const double time = tarry_figure_number(rows, i, "time");
        const double survival = tarry_figure_number(rows, i, "survival");
        if (survival > survival_tail)
            *longest = fmax(*longest, time);
        tarry_plot_add_row(plot, time, survival, tarry_figure_number(rows, i, "low"),
                           tarry_figure_number(rows, i, "high"));
    }
    tarry_plot_drop_empty_series(plot);
}

static void add_exact_curve(const tarry_figure_rows *rows, const char *window, const char *period,
                            tarry_plot *plot) {
    tarry_figure_add_exact_series(plot);
    for (size_t i = 0; i < rows->n; i++)
        if (!strcmp(tarry_figure_text(rows, i, "window"), window) &&
            !strcmp(tarry_figure_text(rows, i, "period"), period))
            tarry_plot_add_wide_row(plot, tarry_figure_number(rows, i, "time"), 1,
                                    tarry_figure_number(rows, i, "survival"), NAN, NAN);
    tarry_plot_drop_empty_series(plot);
}

/* Curves of one gene, or of one signal with thresholds. */
static void add_dwell_panel(const tarry_figure_work *work, const char *name, const char *title,
                            const char *period, tarry_plot *plot) {
    const tarry_run_plan *run = &work->network->run;
    const tarry_figure_rows rows = tarry_figure_rows_of(work, TARRY_TABLE_dwells, name);
    double longest = 0;
    tarry_plot_panel *panel = tarry_plot_add_panel(plot, title);
    if (!panel)
        return;
    for (uint32_t w = 0; w < run->n_windows && w < MOST_WINDOWS; w++)
        add_curve(&rows, run->windows[w].name, period,
                  run->n_windows > 1 ? run->windows[w].name : "", (int)w, &longest, plot);
    const tarry_figure_rows exact = tarry_figure_exact_rows_of(work, TARRY_TABLE_dwells, name);
    for (uint32_t w = 0; w < run->n_windows && w < MOST_WINDOWS; w++)
        add_exact_curve(&exact, run->windows[w].name, period, plot);
    panel->log_y = true;
    panel->y_foot = survival_tail;
    panel->x_from = 0;
    panel->x_to = longest > 0 ? longest : NAN;
    tarry_plot_drop_empty_panel(plot);
}

/* Two panels for each signal with thresholds. */
static void add_visible_panels(tarry_figure_work *work, const tarry_figure_subject *subject,
                               tarry_plot *plot) {
    static const char *const periods[] = {"visible", "dark"};
    for (size_t i = 0; i < subject->n_channels; i++) {
        const tarry_channel *channel = &work->network->channels[subject->channels[i]];
        for (int p = 0; p < 2 && channel->thresholds && plot->n_panels < TARRY_PLOT_PANELS; p++) {
            const char *title = tarry_arena_format(&work->arena, "%s, %s", channel->name,
                                                   periods[p]);
            plot->failed = plot->failed || !title;
            if (title)
                add_dwell_panel(work, channel->name, title, periods[p], plot);
        }
    }
}

int tarry_figure_dwells(tarry_figure_work *work, const tarry_figure_subject *subject,
                        tarry_error *error) {
    static const char *const periods[] = {"active", "inactive"};
    tarry_figure_words words = {.kind = "dwells", .title = "How long periods last"};
    tarry_plot plot = {.x_label = work->length_label,
                       .y_label = "share that lasts longer",
                       .x_name = "time",
                       .y_name = "survival",
                       .own_x = true};
    for (int i = 0; i < 2 && subject->gene; i++)
        add_dwell_panel(work, subject->gene->name, periods[i], periods[i], &plot);
    if (subject->of_signals)
        add_visible_panels(work, subject, &plot);
    tarry_text_printf(&words.caption,
                      "Share of %s that last longer than a time (Kaplan-Meier), on a logarithmic "
                      "axis: a straight line where they end at a constant rate.",
                      subject->gene ? "active and of inactive periods"
                                    : "visible and of dark periods of those that are long enough "
                                      "to count");
    if (!subject->gene)
        tarry_text_add_string(&words.caption, " Visible is not active: a signal rises and falls "
                                              "slowly, alleles overlap, and short gaps close.");
    tarry_figure_add_band_words(work, &words.caption);
    tarry_text_printf(&words.alternative,
                      "Falling curves: how many of the %s periods of %s last longer than a time.",
                      subject->gene ? "active and inactive" : "visible and dark", subject->words);
    return tarry_figure_finish(work, subject, &plot, &words, error);
}
