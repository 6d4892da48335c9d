/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_EXACT_MEASURE_H
#define TARRY_EXACT_MEASURE_H

/* Laws of waiting times as single values with weights and a density, so that means over them can be
 * taken of any function. */

#include "exact/curve.h"
#include "model/law.h"

typedef struct tarry_measure {
    size_t n;       /* single values, */
    double *at;     /* ascending, */
    double *weight; /* with their probabilities */
    tarry_curve density;
} tarry_measure;

/* Zero-initialise ({0}); release accepts a zeroed or half-built one. Errors: TARRY_MEMORY,
 * TARRY_NUMERIC. */
int tarry_measure_init(tarry_measure *measure, const tarry_law *law, tarry_error *error);
void tarry_measure_release(tarry_measure *measure);

/* The mean of function(D) over D >= least, which is smooth there but for bends at `bends` (n of
 * them, in any order). */
double tarry_measure_mean(const tarry_measure *measure, double least, const double *bends, size_t n,
                          tarry_curve_function *function, void *context);

/* Latest value with a probability worth telling. */
double tarry_measure_most(const tarry_measure *measure);

#endif
