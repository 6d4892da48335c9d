/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_REPORT_FIGURE_H
#define TARRY_REPORT_FIGURE_H

/* Figures of a run: each a script for gnuplot and its data, and once drawn the picture.
 *
 * Making a figure takes results and gives texts; drawing writes these into the run's folder and has
 * gnuplot go over them. Whoever wants pictures in a page takes `svg` of each figure. */

#include <stdbool.h>
#include <stddef.h>
#include "tarry/error.h"
#include "tarry/model.h"
#include "tarry/results.h"
#include "tarry/write.h"

typedef struct tarry_figure {
    char *stem;         /* "gene-vela-burst-sizes": letters, digits, `_`, `.` and `-`; unique */
    char *title;        /* "Burst sizes" */
    char *caption;      /* whole sentences: what is shown, of how many, what its band means */
    char *alternative;  /* the same for those who cannot see it, with its main numbers */
    const char *gene;   /* the model's; NULL: not of one gene */
    const char *signal; /* the model's; NULL: not of one signal */
    const char *window; /* the model's; NULL: of the whole record */
    char *script;       /* what STEM.gp holds */
    char *page_script; /* what makes STEM.page.svg for a page where the script makes no SVG, or NULL
                        */
    char *data;        /* what STEM.csv holds */
    char *svg;         /* the <svg> element for a page: ids begin with the stem, black is
                          currentColor, no background; NULL where it could not be drawn */
    int width, height; /* of the picture, in 1/96 inch */
} tarry_figure;

typedef struct tarry_figure_list {
    size_t n;
    tarry_figure *items; /* genes in the model's order, then signals */
    size_t capacity;
    char *left_out; /* a sentence on the genes and signals that have no figures, or NULL */
} tarry_figure_list;

/* Zero-initialise the list ({0}). Release accepts a half-built one. */
void tarry_figure_list_release(tarry_figure_list *list);

/* Make every figure that the results hold something for; nothing is drawn yet. */
int tarry_figures_make(const tarry_model *model, const tarry_results *results,
                       const tarry_figure_options *options, tarry_figure_list *list,
                       tarry_error *error);

#endif
