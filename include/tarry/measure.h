/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_MEASURE_H
#define TARRY_MEASURE_H

/* Laboratory data, measured by the estimators of a run. docs/data.md describes the files. */

#include "tarry/error.h"
#include "tarry/model.h"
#include "tarry/results.h"

typedef struct tarry_data tarry_data;

/* Read and check a CSV file (at most 8 GiB). `settings` are options of `tarry measure`, by name:
 * "time" (required), "kind", "counted", "mean", "gaps", "background", "from", "to", "every",
 * "lags", "snapshots", with values as on the command line. Every error says file:line:column.
 * *data is the caller's. */
int tarry_data_read(const char *path, const tarry_override *settings, size_t n_settings,
                    tarry_data **data, tarry_error *error);
void tarry_data_free(tarry_data *data); /* NULL is fine */

/* What stands for the data where results are written (tarry_write_run and
 * tarry_write_summary_table); borrowed until the data are freed. */
const tarry_model *tarry_data_model(const tarry_data *data);

typedef struct tarry_measure_options {
    int threads;    /* 0: all cores */
    int64_t traced; /* for figures: traces of the first `traced` cells */
    /* Looked at before each cell; once it is not 0 the measurement is given up (NULL: never). */
    const volatile int *stop;
} tarry_measure_options;

/* Measure. The same bytes for any number of threads. *results is the caller's. TARRY_INTERRUPTED
 * after `stop`: figures of a part of the data would mislead. */
int tarry_measure(const tarry_data *data, const tarry_measure_options *options,
                  tarry_results **results, tarry_error *error);

/* Threads that it takes where `asked` (0: all cores) are asked for: no more than it has work for.
 */
int tarry_measure_n_threads(const tarry_data *data, int asked);

#endif
