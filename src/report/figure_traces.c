/* SPDX-License-Identifier: GPL-3.0-or-later */

/* A few cells as they are: what is seen of a gene at once (its signals, or the first stage) a panel
 * for each cell, with its active periods; below what changes slowly, all cells in one panel. */
#include "report/figure_parts.h"

#include <math.h>
#include <string.h>

enum {
    MOST_SIGNALS = 2, /* in the panel of a cell */
    MOST_CELLS = 3,
    FIRST_CELL_COLOUR = 2, /* those before are the signals' */
};

static const char *const cell_names[MOST_CELLS] = {"cell 0", "cell 1", "cell 2"};
static const char *const data_names[MOST_CELLS] = {"first cell", "second cell", "third cell"};

static size_t count_cells(const tarry_table *traces) {
    const size_t n = tarry_table_n_rows(traces);
    return n ? (size_t)tarry_table_number(traces, n - 1, 0) + 1 : 0;
}

static void add_line(const tarry_table *traces, size_t cell, const char *channel, const char *name,
                     int colour, tarry_plot *plot) {
    const int column = tarry_table_column(traces, channel);
    tarry_plot_add_series(plot, TARRY_SERIES_TRACE, name, colour);
    for (size_t r = 0; r < tarry_table_n_rows(traces); r++)
        if ((size_t)tarry_table_number(traces, r, 0) == cell)
            tarry_plot_add_row(plot, tarry_table_number(traces, r, 1),
                               tarry_table_number(traces, r, column), NAN, NAN);
}

static void add_active(const tarry_table *periods, const char *gene, size_t cell,
                       tarry_plot *plot) {
    tarry_plot_add_series(plot, TARRY_SERIES_SHADE, "active", -1);
    for (size_t r = 0; r < tarry_table_n_rows(periods); r++) {
        const double from = tarry_table_number(periods, r, 3);
        if ((size_t)tarry_table_number(periods, r, 2) == cell &&
            !strcmp(tarry_table_text(periods, r, 0), gene))
            tarry_plot_add_wide_row(plot, from, tarry_table_number(periods, r, 4) - from, NAN, NAN,
                                    NAN);
    }
    tarry_plot_drop_empty_series(plot);
}

static bool sees_gene(const tarry_network *network, int32_t signal, int32_t gene) {
    const tarry_signal *s = &network->signals[signal];
    for (uint32_t i = s->weights.from; i < s->weights.to; i++)
        if (network->species[network->weights[i].species].gene == gene)
            return true;
    for (uint32_t i = s->ramps.from; i < s->ramps.to; i++)
        if (network->lags[network->ramps[network->signal_ramps[i]].lag].gene == gene)
            return true;
    return false;
}

/* Names of what is drawn for each cell by itself. */
static size_t choose_fast(const tarry_figure_work *work, const tarry_figure_subject *subject,
                          const char *fast[MOST_SIGNALS]) {
    const tarry_network *network = work->network;
    size_t n = 0;
    for (uint32_t c = 0; c < network->n_channels && n < MOST_SIGNALS; c++)
        if (work->shown.channels[c] && network->channels[c].signal != TARRY_NONE &&
            sees_gene(network, network->channels[c].signal, (int32_t)subject->index))
            fast[n++] = network->channels[c].name;
    if (n == 0 && subject->n_channels > 0)
        fast[n++] = network->channels[subject->channels[0]].name;
    return n;
}

static void add_cells(const tarry_figure_work *work, const tarry_figure_subject *subject,
                      size_t n_cells, tarry_plot *plot) {
    const tarry_table *traces = tarry_results_traces(work->results);
    const char *fast[MOST_SIGNALS];
    const size_t n = choose_fast(work, subject, fast);
    for (size_t cell = 0; cell < n_cells && n > 0; cell++) {
        tarry_plot_add_panel(plot, cell_names[cell]);
        if (subject->gene->tells)
            add_active(tarry_results_periods(work->results), subject->gene->name, cell, plot);
        for (size_t i = 0; i < n; i++)
            add_line(traces, cell, fast[i], tarry_figure_short_name(fast[i]), (int)i, plot);
        tarry_figure_mark_steps(work, plot);
    }
}

/* A panel for each channel that is no stage, a line for each cell. */
static void add_slow(const tarry_figure_work *work, const tarry_figure_subject *subject,
                     size_t n_cells, tarry_plot *plot) {
    const tarry_table *traces = tarry_results_traces(work->results);
    for (size_t i = 0; i < subject->n_channels && plot->n_panels < TARRY_PLOT_PANELS; i++) {
        const char *name = work->network->channels[subject->channels[i]].name;
        if (tarry_figure_is_stage(work, subject->channels[i]))
            continue;
        tarry_plot_add_panel(plot, tarry_figure_short_name(name));
        for (size_t cell = 0; cell < n_cells; cell++)
            add_line(traces, cell, name, work->network->data ? data_names[cell] : cell_names[cell],
                     FIRST_CELL_COLOUR + (int)cell, plot);
        tarry_figure_mark_steps(work, plot);
    }
}

static void describe(const tarry_figure_work *work, const tarry_figure_subject *subject,
                     size_t n_cells, tarry_figure_words *words) {
    const tarry_table *traces = tarry_results_traces(work->results);
    const double last = tarry_table_number(traces, tarry_table_n_rows(traces) - 1, 1);
    tarry_text_printf(&words->caption, "The first %zu of %lld cells, as they are: no average.",
                      n_cells, (long long)tarry_results_n_cells(work->results));
    if (subject->gene && subject->gene->tells)
        tarry_text_add_string(&words->caption, " Grey: times at which an allele was active, darker "
                                               "where several were.");
    if (last < work->network->run.until && !work->network->data) {
        tarry_text_add_string(&words->caption, " Shown to ");
        tarry_figure_add_number(&words->caption, last);
        tarry_text_printf(&words->caption, " %s.", work->network->time_unit);
    }
    tarry_text_printf(&words->alternative,
                      "Traces of %zu single cells over time for %s, one panel below another.",
                      n_cells, subject->words);
}

int tarry_figure_traces(tarry_figure_work *work, const tarry_figure_subject *subject,
                        tarry_error *error) {
    const tarry_table *traces = tarry_results_traces(work->results);
    size_t n_cells = traces ? count_cells(traces) : 0;
    n_cells = n_cells < MOST_CELLS ? n_cells : MOST_CELLS;
    const bool data = work->network->data != NULL; /* a cell's signals, and nothing else */
    if (n_cells == 0 || (subject->of_signals && !data) || subject->n_channels == 0)
        return 0;
    tarry_plot plot = {
        .x_label = work->time_label, .y_label = "in one cell", .x_name = "time", .y_name = "value"};
    tarry_figure_words words = {.kind = "traces", .title = "Single cells"};
    if (subject->gene)
        add_cells(work, subject, n_cells, &plot);
    add_slow(work, subject, n_cells, &plot);
    plot.mark_name = plot.n_marks ? "protocol step" : NULL;
    describe(work, subject, n_cells, &words);
    return tarry_figure_finish(work, subject, &plot, &words, error);
}
