/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Means over time with their bands: what a gene makes, signals, and what is on its way. */
#include "report/figure_parts.h"

#include "tally/jackknife.h"
#include "tally/tally.h"

#include <math.h>
#include <string.h>

/* Mean and its interval: plain, Student's t with a group less than there are. */
static void add_means(const tarry_figure_work *work, const char *name, tarry_plot *plot) {
    const int64_t n_cells = tarry_results_n_cells(work->results);
    const tarry_data_plan *data = work->network->data;
    const int64_t n = data ? data->n_resampled : n_cells;
    const tarry_jackknife jackknife = tarry_jackknife_of(n < TARRY_GROUPS ? (size_t)n
                                                                          : TARRY_GROUPS);
    const tarry_figure_rows rows = tarry_figure_rows_of(work, TARRY_TABLE_means, name);
    tarry_plot_add_series(plot, TARRY_SERIES_LINE, "", 0);
    for (size_t i = 0; i < rows.n; i++) {
        const double mean = tarry_figure_number(&rows, i, "mean");
        const double half = jackknife.t * tarry_figure_number(&rows, i, "mean_se");
        tarry_plot_add_row(plot, tarry_figure_number(&rows, i, "time"), mean, mean - half,
                           mean + half);
    }
    tarry_plot_drop_empty_series(plot);
}

static void add_exact_means(const tarry_figure_work *work, const char *name, tarry_plot *plot) {
    const tarry_figure_rows rows = tarry_figure_exact_rows_of(work, TARRY_TABLE_means, name);
    tarry_figure_add_exact_series(plot);
    for (size_t i = 0; i < rows.n; i++)
        tarry_plot_add_wide_row(plot, tarry_figure_number(&rows, i, "time"), 1,
                                tarry_figure_number(&rows, i, "mean"), NAN, NAN);
    tarry_plot_drop_empty_series(plot);
}

static void describe_panel(const tarry_figure_work *work, const char *name, tarry_text *text) {
    const tarry_figure_rows rows = tarry_figure_rows_of(work, TARRY_TABLE_means, name);
    if (rows.n == 0)
        return;
    tarry_text_printf(text, " %s goes from ", tarry_figure_short_name(name));
    tarry_figure_add_number(text, tarry_figure_number(&rows, 0, "mean"));
    tarry_text_add_string(text, " to ");
    tarry_figure_add_number(text, tarry_figure_number(&rows, rows.n - 1, "mean"));
    tarry_text_add_string(text, ".");
}

static int make(tarry_figure_work *work, const tarry_figure_subject *subject, bool stages,
                tarry_figure_words *words, tarry_error *error) {
    tarry_plot plot = {.x_label = work->time_label,
                       .y_label = subject->of_signals ? "mean signal" : "mean in a cell",
                       .x_name = "time",
                       .y_name = "mean"};
    for (size_t i = 0; i < subject->n_channels && plot.n_panels < TARRY_PLOT_PANELS; i++) {
        const char *name = work->network->channels[subject->channels[i]].name;
        if (tarry_figure_is_stage(work, subject->channels[i]) != stages)
            continue;
        tarry_plot_panel *panel = tarry_plot_add_panel(&plot, tarry_figure_short_name(name));
        if (!panel)
            break;
        panel->x_from = work->network->data ? work->network->data->start : 0;
        panel->x_to = work->network->run.until;
        add_means(work, name, &plot);
        add_exact_means(work, name, &plot);
        tarry_figure_mark_steps(work, &plot);
        tarry_plot_drop_empty_panel(&plot);
        describe_panel(work, name, &words->alternative);
    }
    plot.mark_name = plot.n_marks ? "protocol step" : NULL;
    tarry_figure_add_band_words(work, &words->caption);
    return tarry_figure_finish(work, subject, &plot, words, error);
}

int tarry_figure_time_course(tarry_figure_work *work, const tarry_figure_subject *subject,
                             tarry_error *error) {
    tarry_figure_words words = {.kind = "time-course", .title = "Means over time"};
    tarry_text_add_string(&words.caption, subject->of_signals
                                              ? "Mean signal over cells."
                                              : "Mean number of molecules in a cell.");
    tarry_text_printf(&words.alternative, "Means over time for %s.", subject->words);
    return make(work, subject, false, &words, error);
}

int tarry_figure_transit(tarry_figure_work *work, const tarry_figure_subject *subject,
                         tarry_error *error) {
    tarry_figure_words words = {.kind = "in-transit", .title = "On their way over time"};
    tarry_text_add_string(&words.caption,
                          "Mean number of molecules in a cell that are in each stage: begun, and "
                          "not yet through.");
    tarry_text_printf(&words.alternative, "Means over time of the stages of %s.", subject->words);
    return make(work, subject, true, &words, error);
}
