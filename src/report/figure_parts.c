/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "report/figure_parts.h"

#include "base/error.h"
#include "base/number.h"
#include "report/repeat.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

static tarry_figure_rows rows_of(const tarry_table *table, const tarry_groups *groups,
                                 const char *name) {
    tarry_figure_rows rows = {table, NULL, 0};
    for (size_t g = 0; g < groups->n; g++) {
        if (strcmp(groups->names[g], name))
            continue;
        rows.rows = groups->rows + groups->starts[g];
        rows.n = groups->starts[g + 1] - groups->starts[g];
    }
    return rows;
}

tarry_figure_rows tarry_figure_rows_of(const tarry_figure_work *work, tarry_result_table which,
                                       const char *name) {
    return rows_of(tarry_results_table(work->results, which), &work->groups[which], name);
}

tarry_figure_rows tarry_figure_exact_rows_of(const tarry_figure_work *work,
                                             tarry_result_table which, const char *name) {
    const tarry_results *exact = tarry_results_exact(work->results);
    if (!exact)
        return (tarry_figure_rows){0};
    return rows_of(tarry_results_table(exact, which), &work->exact_groups[which], name);
}

static const char exact_name[] = "exact law";

void tarry_figure_add_exact_series(tarry_plot *plot) {
    bool named = false;
    for (size_t s = 0; s < plot->n_series; s++)
        named = named || plot->series[s].name == exact_name;
    tarry_plot_add_series(plot, TARRY_SERIES_LAW, named ? "" : exact_name, 0);
}

static bool has_exact_series(const tarry_plot *plot) {
    for (size_t s = 0; s < plot->n_series; s++)
        if (plot->series[s].name == exact_name)
            return true;
    return false;
}

double tarry_figure_number(const tarry_figure_rows *rows, size_t i, const char *column) {
    return tarry_table_number(rows->table, rows->rows[i], tarry_table_column(rows->table, column));
}

const char *tarry_figure_text(const tarry_figure_rows *rows, size_t i, const char *column) {
    return tarry_table_text(rows->table, rows->rows[i], tarry_table_column(rows->table, column));
}

double tarry_figure_quantity(const tarry_figure_rows *rows, const char *window,
                             const char *quantity) {
    for (size_t i = 0; i < rows->n; i++)
        if (!strcmp(tarry_figure_text(rows, i, "quantity"), quantity) &&
            !strcmp(tarry_figure_text(rows, i, "window"), window))
            return tarry_figure_number(rows, i, "value");
    return NAN;
}

const char *tarry_figure_short_name(const char *name) {
    const char *dot = strrchr(name, '.');
    return dot ? dot + 1 : name;
}

bool tarry_figure_is_stage(const tarry_figure_work *work, uint32_t channel) {
    const int32_t species = work->network->channels[channel].species;
    return species != TARRY_NONE && work->network->species[species].role == TARRY_SPECIES_STAGE;
}

void tarry_figure_add_number(tarry_text *text, double value) {
    char number[TARRY_NUMBER_SIZE];
    tarry_number_write_rounded(value, 4, number);
    tarry_text_add_string(text, isfinite(value) ? number : "unknown");
}

size_t tarry_figure_mark_steps(const tarry_figure_work *work, tarry_plot *plot) {
    const tarry_network *network = work->network;
    size_t n = 0;
    for (uint32_t s = 1; s < network->n_segments; s++) {
        const tarry_segment *segment = &network->segments[s];
        if (segment->moment == TARRY_MOMENT_RAMP_PART || segment->start < 0)
            continue;
        tarry_plot_add_mark(plot, segment->start, false, -1);
        n++;
    }
    return n;
}

void tarry_figure_add_band_words(const tarry_figure_work *work, tarry_text *caption) {
    const long long n = (long long)tarry_results_n_cells(work->results);
    if (tarry_results_is_predicted(work->results))
        tarry_text_add_string(caption, " Exact values: there are no intervals.");
    else if (n < 2)
        tarry_text_add_string(caption, " One cell: there are no intervals.");
    else
        tarry_text_printf(caption, " %lld cells; bands are 95 %% intervals point by point.", n);
}

/* ---- into the list -------------------------------------------------------------------------- */

/* The text's bytes, now the caller's. */
static char *take(tarry_text *text) {
    char *data = text->data;
    *text = (tarry_text){0};
    return data;
}

static int write_texts(const tarry_figure_work *work, tarry_plot *plot, tarry_figure *figure,
                       tarry_error *error) {
    static const char *const endings[] = {"svg", "pdf", "png", "svg"};
    tarry_text script = {0}, page = {0}, data = {0}, output = {0};
    tarry_text_printf(&output, "%s.%s", figure->stem, endings[work->format]);
    if (!output.failed)
        tarry_plot_write_script(plot, figure->stem, output.data, work->format, &script);
    tarry_plot_write_data(plot, &data);
    if (work->format != TARRY_FIGURE_SVG && !output.failed) {
        output.size = 0;
        tarry_text_printf(&output, "%s.page.svg", figure->stem);
        tarry_plot_write_script(plot, figure->stem, output.data, TARRY_FIGURE_SVG, &page);
    }
    const bool failed = output.failed || script.failed || page.failed || data.failed;
    figure->script = take(&script);
    figure->page_script = take(&page);
    figure->data = take(&data);
    figure->width = TARRY_PLOT_WIDTH;
    figure->height = tarry_plot_height(plot);
    tarry_text_release(&output);
    return failed ? tarry_fail_memory(error, "a figure") : 0;
}

static int append(tarry_figure_work *work, const tarry_figure_subject *subject, tarry_plot *plot,
                  tarry_figure_words *words, tarry_error *error) {
    tarry_figure_list *list = work->list;
    tarry_text stem = {0}, title = {0};
    if (tarry_grow((void **)&list->items, &list->capacity, list->n + 1, sizeof *list->items))
        return tarry_fail_memory(error, "a figure");
    tarry_figure *figure = &list->items[list->n++];
    *figure = (tarry_figure){.gene = subject->gene ? subject->gene->name : NULL,
                             .signal = subject->signal};
    tarry_text_printf(&stem, "%s-%s", subject->prefix, words->kind);
    tarry_text_add_string(&title, words->title);
    const bool failed = stem.failed || title.failed || words->caption.failed ||
                        words->alternative.failed;
    figure->stem = take(&stem);
    figure->title = take(&title);
    figure->caption = take(&words->caption);
    figure->alternative = take(&words->alternative);
    return failed ? tarry_fail_memory(error, "a figure") : write_texts(work, plot, figure, error);
}

int tarry_figure_finish(tarry_figure_work *work, const tarry_figure_subject *subject,
                        tarry_plot *plot, tarry_figure_words *words, tarry_error *error) {
    const tarry_model *beside = work->network->data ? work->network->data->beside : NULL;
    tarry_text heading = {0};
    int code = 0;
    tarry_text_printf(&heading, "%s of %s", words->title, subject->words);
    if (plot->failed || heading.failed)
        code = tarry_fail_memory(error, "a figure");
    plot->heading = heading.data;
    plot->title = work->network->title;
    if (has_exact_series(plot))
        tarry_text_printf(&words->caption,
                          " The thin dark line is the exact law%s%s, worked out from the rates "
                          "without simulation.",
                          beside ? " of " : "", beside ? tarry_repeat_file(beside) : "");
    if (!code && plot->n_panels > 0)
        code = append(work, subject, plot, words, error);
    tarry_plot_release(plot);
    tarry_text_release(&heading);
    tarry_text_release(&words->caption);
    tarry_text_release(&words->alternative);
    return code;
}
