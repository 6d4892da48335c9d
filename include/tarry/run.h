/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_RUN_H
#define TARRY_RUN_H

/* Simulating a model: all cells, on all cores, into results. */

#include <stdbool.h>
#include <stdint.h>
#include "tarry/error.h"
#include "tarry/model.h"
#include "tarry/results.h"

/* A run told as data, in a form that tarry_measure reads. X(NAME, word) */
#define TARRY_DATA_FORMS(X)                                                                        \
    X(NONE, "none")                                                                                \
    X(TRACES, "traces") /* signals of all cells, frame by frame */                                 \
    X(COUNTS, "counts") /* molecules in fixed cells, each at one of the snapshots */               \
    X(MEANS, "means")   /* of signals over cells, with standard errors */

typedef enum tarry_data_form {
#define TARRY_DATA_FORM_ENUM(name, word) TARRY_DATA_FORM_##name,
    TARRY_DATA_FORMS(TARRY_DATA_FORM_ENUM)
#undef TARRY_DATA_FORM_ENUM
} tarry_data_form;

/* "traces" and the like; and the form of that name, or -1. */
const char *tarry_data_form_name(tarry_data_form form);
int tarry_data_form_of(const char *name);

typedef struct tarry_run_options {
    int threads;             /* 0: all cores */
    const char *sampler;     /* NULL: "direct" */
    int64_t keep;            /* traces of the first `keep` cells go into the results */
    tarry_data_form as_data; /* tarry_results_data */
    int64_t traced; /* for figures: traces and active periods of the first `traced` cells, */
    const char *const *genes; /* of these genes and named bursts (none: of the first few) */
    size_t n_genes;
    bool self_check; /* work out exact laws too and compare (tarry_results_self_check) */
    /* Looked at before each new cell; once it is not 0 no new cell starts (may be set by a signal
     * handler or another thread; NULL: never). */
    const volatile int *stop;
    /* Called by one thread at a time after each finished cell (may be NULL). */
    void (*progress)(void *context, int64_t n_done, int64_t n_cells);
    void *progress_context;
} tarry_run_options;

/* Simulate. Cells 0 .. n-1 are always whole: after `stop` the results hold the n cells that were
 * finished (n may be 0: then TARRY_INTERRUPTED is returned and *results is NULL). Where cells fail
 * the error is that of the lowest-numbered one. The same bytes for any number of threads. */
int tarry_run(const tarry_model *model, const tarry_run_options *options, tarry_results **results,
              tarry_error *error);

/* Threads that tarry_run takes for this model where `asked` (0: all cores) are asked for: no more
 * than there are cells. */
int tarry_run_n_threads(const tarry_model *model, int asked);

#endif
