/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_TEST_AGREE_H
#define TARRY_TEST_AGREE_H

/* Two results held against each other, row by row: Z = (one - other) / standard error. */

#include <stddef.h>
#include "tarry/tarry.h"

/* How far a table's figures are apart. */
typedef struct agree_score {
    size_t n;
    double sum, most; /* of Z^2; the largest |Z| */
    char where[128];
} agree_score;

/* The standard error of a row, or 0 where there is none to be trusted. */
typedef double agree_error(const tarry_table *table, size_t row);
agree_error agree_interval, agree_mean_error, agree_sd_error;

/* The figures of a run, as below. */
typedef enum agree_kind {
    AGREE_MEANS,
    AGREE_SDS,
    AGREE_DISTRIBUTION,
    AGREE_BURSTS,
    AGREE_SIGNALS,
    AGREE_SIZES,
    AGREE_DWELLS,
    AGREE_CORRELATION,
    AGREE_FIRST,
    AGREE_KINDS
} agree_kind;

/* What is compared: rows of `table` that are alike in the columns `keys` (NULL ends them), by
 * `value`, where that is above `least` in the first results. */
typedef struct agree_figure {
    tarry_result_table table;
    const char *const *keys;
    const char *value;
    agree_error *error;
    double least;
} agree_figure;

extern const agree_figure agree_figures[AGREE_KINDS];

/* `from` and `to` (may be NULL): the text `from` of the first results is `to` in the others (a
 * window). Errors of the others count too where they have some. */
agree_score agree_compare(const tarry_results *one, const tarry_results *other,
                          const agree_figure *figure, const char *from, const char *to);

/* At least n figures, the largest |Z| below 6 (a chance of 1e-7 for each of some thousand figures
 * by Student's t with 63 degrees of freedom), and the mean square of hundreds of them below 4: they
 * make up no more than some ten independent ones. */
void agree_hold(const agree_score *score, const char *what, size_t n_least);

#endif
