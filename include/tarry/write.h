/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_WRITE_H
#define TARRY_WRITE_H

/* Results as files and as text. */

#include <stdbool.h>
#include "tarry/error.h"
#include "tarry/model.h"
#include "tarry/results.h"
#include "tarry/run.h"

/* X(NAME, word) */
#define TARRY_FIGURE_FORMATS(X)                                                                    \
    X(SVG, "svg")                                                                                  \
    X(PDF, "pdf")                                                                                  \
    X(PNG, "png")                                                                                  \
    X(NONE, "none")

typedef enum tarry_figure_format {
#define TARRY_FIGURE_ENUM(name, word) TARRY_FIGURE_##name,
    TARRY_FIGURE_FORMATS(TARRY_FIGURE_ENUM)
#undef TARRY_FIGURE_ENUM
} tarry_figure_format;

/* Which figures are drawn, and how. Where gnuplot cannot be had or fails, `warn` is told once and
 * the rest of the run's files are written all the same. */
typedef struct tarry_figure_options {
    tarry_figure_format format;
    const char *const *genes; /* genes and named bursts to be shown; none: the first few */
    size_t n_genes;
    const char *gnuplot; /* the program; NULL or "": `gnuplot`, by PATH */
    double seconds;      /* most that drawing may take; 0: 60 */
    /* Drawing is given up once it is not 0 (NULL: never; not looked at where it is set before). */
    const volatile int *stop;
    void (*warn)(void *context, const char *sentence); /* may be NULL */
    void *warn_context;
} tarry_figure_options;

/* What summary.json and run.json say about how the results came about. */
typedef struct tarry_provenance {
    const char *sampler;
    const tarry_override *overrides; /* as given on the command line */
    size_t n_overrides;
    long long keep;
    tarry_data_form as_data;
    double seconds;
    int threads;
    bool partial;                        /* interrupted */
    const tarry_figure_options *figures; /* NULL: none are drawn */
} tarry_provenance;

/* Refuse a folder that exists and is not empty (TARRY_INPUT), unless `overwrite`; to be asked
 * before simulating. Creates nothing. */
int tarry_write_check(const char *folder, bool overwrite, tarry_error *error);

/* Write every file of a run into `folder` (made where missing). With `overwrite` the old
 * summary.json goes first, then the files that it named are replaced, and those that this run does
 * not write are removed. summary.json comes last. */
int tarry_write_run(const char *folder, bool overwrite, const tarry_model *model,
                    const tarry_results *results, const tarry_provenance *provenance,
                    tarry_error *error);

/* The table per gene as NUL-ended text of at most `width` columns, to be freed with free(). */
int tarry_write_summary_table(const tarry_model *model, const tarry_results *results, int width,
                              char **text, tarry_error *error);

#endif
