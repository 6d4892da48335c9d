/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_REPORT_FIGURE_PARTS_H
#define TARRY_REPORT_FIGURE_PARTS_H

/* What the files that make figures share: what a figure is of, rows of the tables by name, words.
 */

#include "model/analysis_flow.h"
#include "model/model.h"
#include "model/shown_genes.h"
#include "report/figure.h"
#include "report/groups.h"
#include "report/plot.h"

/* Tables that figures are made of, with the column by which their rows are looked up. */
#define TARRY_FIGURE_TABLES(X)                                                                     \
    X(means, "name")                                                                               \
    X(distribution, "name")                                                                        \
    X(bursts, "gene")                                                                              \
    X(signals, "signal")                                                                           \
    X(burst_sizes, "gene")                                                                         \
    X(dwells, "gene")                                                                              \
    X(autocorrelation, "first")                                                                    \
    X(lags, "name")                                                                                \
    X(first, "name")

/* What figures are made from. */
typedef struct tarry_figure_work {
    const tarry_network *network;
    const tarry_results *results;
    tarry_figure_format format;
    tarry_arena arena; /* labels and names, until all are written */
    const char *time_label, *lag_label, *length_label, *since_label;
    tarry_shown shown;
    tarry_flow_index flows; /* for exact laws */
    tarry_groups groups[TARRY_N_RESULT_TABLES];
    tarry_groups exact_groups[TARRY_N_RESULT_TABLES]; /* of the exact laws, where there are such */
    tarry_figure_list *list;
} tarry_figure_work;

/* What one set of figures is of: a gene, the signals, or species of no gene. */
typedef struct tarry_figure_subject {
    const char *prefix;     /* of stems: "gene-vela", "signals", "species" */
    const char *words;      /* "vela", "the signals", "the species" */
    const tarry_gene *gene; /* or NULL */
    uint32_t index;         /* of the gene */
    bool of_signals;
    const char *signal; /* the only one, or NULL */
    const uint32_t *channels;
    size_t n_channels;
} tarry_figure_subject;

/* Rows of a table that have this name. */
typedef struct tarry_figure_rows {
    const tarry_table *table;
    const size_t *rows;
    size_t n;
} tarry_figure_rows;

tarry_figure_rows tarry_figure_rows_of(const tarry_figure_work *work, tarry_result_table table,
                                       const char *name);
/* The same of the exact laws beside a run: none where there are no laws. */
tarry_figure_rows tarry_figure_exact_rows_of(const tarry_figure_work *work,
                                             tarry_result_table table, const char *name);

/* Begin the line of an exact law in the last panel; the legend names it once, and
 * tarry_figure_finish says in the caption what it is. */
void tarry_figure_add_exact_series(tarry_plot *plot);

double tarry_figure_number(const tarry_figure_rows *rows, size_t i, const char *column);
const char *tarry_figure_text(const tarry_figure_rows *rows, size_t i, const char *column);

/* The value of a quantity in `bursts` or `signals` in a window, or NaN. */
double tarry_figure_quantity(const tarry_figure_rows *rows, const char *window,
                             const char *quantity);

/* "nascent" of "vela.nascent". */
const char *tarry_figure_short_name(const char *name);

/* True for stages: products on their way. */
bool tarry_figure_is_stage(const tarry_figure_work *work, uint32_t channel);

/* Append a number to four digits. */
void tarry_figure_add_number(tarry_text *text, double value);

/* Mark the steps of the protocol in the last panel. Returns how many there are. */
size_t tarry_figure_mark_steps(const tarry_figure_work *work, tarry_plot *plot);

/* "Over 1000 cells; bands are 95 % intervals point by point (a whole curve leaves them more
 * often)."
 */
void tarry_figure_add_band_words(const tarry_figure_work *work, tarry_text *caption);

/* What a figure says in words; freed by tarry_figure_finish. */
typedef struct tarry_figure_words {
    const char *kind;  /* ending of the stem: "burst-sizes" */
    const char *title; /* "Burst sizes" */
    tarry_text caption, alternative;
} tarry_figure_words;

/* Write the plot's texts and put the figure into the list, unless the plot has no panel. Plot and
 * words are released either way. */
int tarry_figure_finish(tarry_figure_work *work, const tarry_figure_subject *subject,
                        tarry_plot *plot, tarry_figure_words *words, tarry_error *error);

/* Figures, each in a file with others of its kind. They add nothing where there is nothing. */
#define TARRY_FIGURE_MAKERS(X)                                                                     \
    X(traces)                                                                                      \
    X(time_course)                                                                                 \
    X(transit)                                                                                     \
    X(burst_sizes)                                                                                 \
    X(dwells)                                                                                      \
    X(counts)                                                                                      \
    X(autocorrelation)                                                                             \
    X(cross_correlation)                                                                           \
    X(lags)                                                                                        \
    X(first)

#define TARRY_FIGURE_DECLARE(name)                                                                 \
    int tarry_figure_##name(tarry_figure_work *work, const tarry_figure_subject *subject,          \
                            tarry_error *error);
TARRY_FIGURE_MAKERS(TARRY_FIGURE_DECLARE)
#undef TARRY_FIGURE_DECLARE

#endif
