/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_RESULTS_H
#define TARRY_RESULTS_H

/* What a run found: named tables (their columns are those of the files), warnings, totals. */

#include <stddef.h>
#include <stdint.h>
#include "tarry/error.h"
#include "tarry/table.h"

typedef struct tarry_results tarry_results;

/* Tables of a run. X(name, columns); a table is written as NAME.csv. */
#define TARRY_RESULT_TABLES(X)                                                                     \
    X(means, "name:text time:number mean:number sd:number mean_se:number sd_se:number "            \
             "fano:number fano_se:number cv2:number cv2_se:number")                                \
    X(distribution, "name:text window:text time:number count:number width:number "                 \
                    "probability:number low:number high:number")                                   \
    X(bursts, "gene:text window:text quantity:text unit:text value:number low:number "             \
              "high:number samples:number")                                                        \
    X(signals, "signal:text window:text quantity:text unit:text value:number low:number "          \
               "high:number samples:number")                                                       \
    X(burst_sizes, "gene:text window:text size:number width:number bursts:number "                 \
                   "probability:number low:number high:number")                                    \
    X(dwells, "gene:text window:text period:text time:number survival:number low:number "          \
              "high:number")                                                                       \
    X(autocorrelation, "window:text first:text second:text lag:number pairs:number "               \
                       "covariance:number correlation:number low:number high:number "              \
                       "per_mean_squared:number pms_low:number pms_high:number")                   \
    X(transit, "name:text delay:text window:text mean_pending:number drawn:number "                \
               "mean_drawn:number sd_drawn:number lost:number")                                    \
    X(lags, "name:text delay:text from:number to:number drawn:number share:number low:number "     \
            "high:number law:number")                                                              \
    X(first, "name:text step:number time:number survival:number low:number high:number")

typedef enum tarry_result_table {
#define TARRY_RESULT_ENUM(name, columns) TARRY_TABLE_##name,
    TARRY_RESULT_TABLES(TARRY_RESULT_ENUM)
#undef TARRY_RESULT_ENUM
        TARRY_N_RESULT_TABLES
} tarry_result_table;

/* One of the tables above; never NULL. */
const tarry_table *tarry_results_table(const tarry_results *results, tarry_result_table which);

/* Traces of the cells that were kept (cell, time, one column a name), or NULL. */
const tarry_table *tarry_results_cells(const tarry_results *results);

/* The run told as data, where tarry_run_options.as_data asked for it, or NULL. */
const tarry_table *tarry_results_data(const tarry_results *results);

/* For figures, where tarry_run_options.traced asked for them, or NULL: traces of the first cells
 * (cell, time, one column a name; of a long record its beginning), and what was active in them
 * (gene, allele, cell, from, to). */
const tarry_table *tarry_results_traces(const tarry_results *results);
const tarry_table *tarry_results_periods(const tarry_results *results);

size_t tarry_results_n_warnings(const tarry_results *results);
const char *tarry_results_warning(const tarry_results *results, size_t i);

int64_t tarry_results_n_cells(const tarry_results *results);       /* finished */
int64_t tarry_results_n_cells_asked(const tarry_results *results); /* equal unless interrupted */
double tarry_results_firings(const tarry_results *results);        /* settling included */
double tarry_results_completions(const tarry_results *results);

/* True of what tarry_predict worked out: there are no cells then, no seed and no sampler. */
int tarry_results_is_predicted(const tarry_results *results);

/* True of what tarry_measure found in data: there is no model then, no seed and no sampler. */
int tarry_results_is_measured(const tarry_results *results);

/* A run beside the exact laws of its model, where tarry_run_options.self_check asked for it
 * (docs/statistics.md, "A run checks itself"). */
typedef struct tarry_self_check {
    size_t n_compared;   /* figures that have an exact law; 0: the rest says nothing */
    double largest;      /* difference between a figure and its law, in standard errors */
    double share_larger; /* of correct runs, how many have one that is larger */
    int alarm;           /* fewer than 1 in 10,000 */
    char *where;         /* which figure; the results' */
} tarry_self_check;

const tarry_self_check *tarry_results_self_check(const tarry_results *results);

/* The laws themselves, as tarry_predict gives them, or NULL. The results'. */
const tarry_results *tarry_results_exact(const tarry_results *results);

void tarry_results_free(tarry_results *results); /* NULL is fine */

#endif
