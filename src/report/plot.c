/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "report/plot.h"

#include "base/memory.h"

#include <math.h>
#include <stdlib.h>

void tarry_plot_release(tarry_plot *plot) {
    free(plot->panels);
    free(plot->series);
    free(plot->rows);
    free(plot->marks);
    *plot = (tarry_plot){0};
}

/* Room for one more element; false where memory is short. */
static bool grow(tarry_plot *plot, void **array, size_t *capacity, size_t n, size_t size) {
    if (!plot->failed && tarry_grow(array, capacity, n + 1, size))
        plot->failed = true;
    return !plot->failed;
}

tarry_plot_panel *tarry_plot_add_panel(tarry_plot *plot, const char *title) {
    if (!grow(plot, (void **)&plot->panels, &plot->panels_capacity, plot->n_panels,
              sizeof *plot->panels))
        return NULL;
    tarry_plot_panel *panel = &plot->panels[plot->n_panels++];
    *panel = (tarry_plot_panel){.title = title,
                                .x_from = NAN,
                                .x_to = NAN,
                                .first_series = plot->n_series,
                                .first_mark = plot->n_marks};
    return panel;
}

void tarry_plot_add_series(tarry_plot *plot, tarry_series_kind kind, const char *name, int colour) {
    if (!grow(plot, (void **)&plot->series, &plot->series_capacity, plot->n_series,
              sizeof *plot->series))
        return;
    plot->series[plot->n_series++] = (tarry_plot_series){
        .kind = kind, .name = name, .colour = colour, .first_row = plot->n_rows};
    plot->panels[plot->n_panels - 1].n_series++;
}

void tarry_plot_add_wide_row(tarry_plot *plot, double x, double width, double y, double low,
                             double high) {
    if (!grow(plot, (void **)&plot->rows, &plot->rows_capacity, plot->n_rows, sizeof *plot->rows))
        return;
    plot->rows[plot->n_rows++] = (tarry_plot_row){x, width, y, low, high};
    plot->series[plot->n_series - 1].n_rows++;
}

void tarry_plot_add_row(tarry_plot *plot, double x, double y, double low, double high) {
    tarry_plot_add_wide_row(plot, x, NAN, y, low, high);
}

void tarry_plot_add_mark(tarry_plot *plot, double at, bool level, int colour) {
    if (!isfinite(at) || !grow(plot, (void **)&plot->marks, &plot->marks_capacity, plot->n_marks,
                               sizeof *plot->marks))
        return;
    plot->marks[plot->n_marks++] = (tarry_plot_mark){at, level, colour};
    plot->panels[plot->n_panels - 1].n_marks++;
}

void tarry_plot_drop_empty_series(tarry_plot *plot) {
    if (plot->failed || plot->n_series == 0 || plot->series[plot->n_series - 1].n_rows > 0)
        return;
    plot->n_series--;
    plot->panels[plot->n_panels - 1].n_series--;
}

void tarry_plot_drop_empty_panel(tarry_plot *plot) {
    if (plot->failed || plot->n_panels == 0 || plot->panels[plot->n_panels - 1].n_series > 0)
        return;
    plot->n_panels--;
    plot->n_marks = plot->panels[plot->n_panels].first_mark;
}

void tarry_plot_drop_zeros(tarry_plot *plot) {
    const tarry_plot_panel *panel = &plot->panels[plot->n_panels - 1];
    size_t n = panel->n_series ? plot->series[panel->first_series].first_row : plot->n_rows;
    for (size_t s = panel->first_series; s < plot->n_series; s++) {
        tarry_plot_series *series = &plot->series[s];
        const size_t from = series->first_row, to = from + series->n_rows;
        series->first_row = n;
        for (size_t r = from; r < to; r++)
            if (plot->rows[r].y > 0)
                plot->rows[n++] = plot->rows[r];
        series->n_rows = n - series->first_row;
    }
    plot->n_rows = n;
}
