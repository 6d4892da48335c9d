/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_EXACT_CURVE_H
#define TARRY_EXACT_CURVE_H

/* A function of age as pieces of Chebyshev series, for what is dear to work out and looked up
 * often. It is 0 before age 0 and from `end` on; between its breaks it is smooth. */

#include <stddef.h>
#include "tarry/error.h"

enum { TARRY_CURVE_NODES = 16 };

typedef struct tarry_curve {
    size_t n;             /* pieces; 0: the function is 0 everywhere */
    double *bounds;       /* [n + 1] ascending, the first is 0 */
    double *coefficients; /* [n][TARRY_CURVE_NODES] */
    size_t n_breaks;      /* where the function or its slope may jump, */
    double *breaks;       /* ascending, the first is 0, the last bounds[n] */
} tarry_curve;

/* The value at x, never asked for at a break. */
typedef double tarry_curve_function(void *context, double x);

/* Follow `function` from 0 to `end` > 0, piece by piece, until each piece is within `tolerance`
 * (absolute). `breaks`: in any order; those outside (0, end) are left out. Zero-initialise ({0}).
 * Errors: TARRY_MEMORY; TARRY_NUMERIC where a value is not finite or the pieces become too many.
 */
int tarry_curve_init(tarry_curve *curve, double end, const double *breaks, size_t n_breaks,
                     double tolerance, tarry_curve_function *function, void *context,
                     tarry_error *error);
void tarry_curve_release(tarry_curve *curve); /* accepts a zeroed or half-built one */

/* The age from which on the function is 0. */
double tarry_curve_end(const tarry_curve *curve);

/* The value at x, seen from `inside`: where the function jumps at x, the value on that side. */
double tarry_curve_value(const tarry_curve *curve, double x, double inside);

/* The integral from 0 to x. */
double tarry_curve_integral(const tarry_curve *curve, double x);

/* factor * curve(x - shift). */
typedef struct tarry_curve_term {
    const tarry_curve *curve;
    double shift, factor;
} tarry_curve_term;

/* *out (zeroed): the sum of the terms, for x below `end`. */
int tarry_curve_sum(const tarry_curve_term *terms, size_t n, double end, double tolerance,
                    tarry_curve *out, tarry_error *error);

/* The integral from `from` to `to` of one(x) other(shift + sign x), sign being 1 or -1. */
double tarry_curve_product(const tarry_curve *one, const tarry_curve *other, double shift, int sign,
                           double from, double to);

#endif
