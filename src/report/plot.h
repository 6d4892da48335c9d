/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_REPORT_PLOT_H
#define TARRY_REPORT_PLOT_H

/* A figure while it is being put together: panels one above another, series in them, rows in these.
 * It is written as two texts, a script for gnuplot and a CSV that the script reads.
 *
 * Everything is added to what was added last: a series to the last panel, a row to the last series.
 * Names are borrowed until the plot is written. Failed allocations are remembered in `failed`. */

#include <stdbool.h>
#include <stddef.h>
#include "base/text.h"
#include "tarry/write.h"

enum {
    TARRY_PLOT_WIDTH = 322, /* 85 mm, a column of a journal, in 1/96 inch */
    TARRY_PLOT_COLOURS = 5, /* that can be told apart; beyond them lines are broken */
    TARRY_PLOT_SERIES = 6,  /* curves in one panel that can still be read */
    TARRY_PLOT_PANELS = 6,  /* panels on one page */
};

typedef enum tarry_series_kind {
    TARRY_SERIES_LINE,    /* a line with a band from low to high where there are such */
    TARRY_SERIES_TRACE,   /* a thin line, all of whose points are drawn */
    TARRY_SERIES_BARS,    /* bars of this width about x, y and its ends divided by the width */
    TARRY_SERIES_DENSITY, /* the same as a line with a band */
    TARRY_SERIES_LAW,     /* a thin dark line, y divided by the width: known without simulating */
    TARRY_SERIES_SHADE,   /* [x, x + width) over the panel's whole height, behind the others */
} tarry_series_kind;

typedef struct tarry_plot_row {
    double x, width, y, low, high; /* NaN: none */
} tarry_plot_row;

typedef struct tarry_plot_series {
    tarry_series_kind kind;
    const char *name;
    int colour; /* 0 .. */
    size_t first_row, n_rows;
} tarry_plot_series;

/* A thin line across a panel: upright at x, or level at y. */
typedef struct tarry_plot_mark {
    double at;
    bool level;
    int colour; /* of the series that it belongs to, or -1: grey */
} tarry_plot_mark;

typedef struct tarry_plot_panel {
    const char *title; /* "" for none */
    bool log_y;
    double x_from, x_to; /* NaN: from the rows */
    double y_foot;       /* of a logarithmic axis: nothing below it is shown */
    size_t first_series, n_series;
    size_t first_mark, n_marks;
} tarry_plot_panel;

typedef struct tarry_plot {
    const char *heading; /* of the script: one line on what is shown */
    const char *title;   /* the model's */
    const char *x_label, *y_label;
    const char *x_name, *y_name; /* columns of the CSV */
    const char *mark_name;       /* of upright grey marks, for the legend; NULL: unnamed */
    bool own_x;                  /* each panel has an x axis of its own */
    bool whole_x;                /* x are whole numbers */
    bool failed;
    tarry_plot_panel *panels;
    tarry_plot_series *series;
    tarry_plot_row *rows;
    tarry_plot_mark *marks;
    size_t n_panels, n_series, n_rows, n_marks;
    size_t panels_capacity, series_capacity, rows_capacity, marks_capacity;
} tarry_plot;

/* Zero-initialise. */
void tarry_plot_release(tarry_plot *plot);

tarry_plot_panel *tarry_plot_add_panel(tarry_plot *plot, const char *title); /* NULL: failed */
void tarry_plot_add_series(tarry_plot *plot, tarry_series_kind kind, const char *name, int colour);
void tarry_plot_add_row(tarry_plot *plot, double x, double y, double low, double high);
void tarry_plot_add_wide_row(tarry_plot *plot, double x, double width, double y, double low,
                             double high);
void tarry_plot_add_mark(tarry_plot *plot, double at, bool level, int colour);

/* Take the last series, or the last panel, away again where nothing is in it. */
void tarry_plot_drop_empty_series(tarry_plot *plot);
void tarry_plot_drop_empty_panel(tarry_plot *plot);

/* Take rows with y = 0 out of the last panel. */
void tarry_plot_drop_zeros(tarry_plot *plot);

/* Height of the picture in 1/96 inch. */
int tarry_plot_height(const tarry_plot *plot);

/* Append STEM.csv to `data`. */
void tarry_plot_write_data(const tarry_plot *plot, tarry_text *data);

/* Append to `script` what makes `output` in this format from STEM.csv, which lies beside it. */
void tarry_plot_write_script(const tarry_plot *plot, const char *stem, const char *output,
                             tarry_figure_format format, tarry_text *script);

/* Append `string` as gnuplot reads it, and nothing in it is carried out: in single quotes, those in
 * it as apostrophes (U+2019; gnuplot 5.4 misreads some runs of doubled quotes), control characters
 * as blanks. */
void tarry_plot_quote(tarry_text *text, const char *string);

#endif
