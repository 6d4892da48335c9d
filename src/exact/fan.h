/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_EXACT_FAN_H
#define TARRY_EXACT_FAN_H

/* Many complex functions of age that differ in a parameter only, as polynomials on the same pieces
 * through the same nodes, so that what comes out depends on the parameter as smoothly as the
 * functions do. All are 0 beyond the last piece. */

#include <stdbool.h>
#include "exact/radau.h"
#include "tarry/error.h"

enum { TARRY_FAN_NODES = TARRY_RADAU_MOST + 1 }; /* the piece's begin, and Radau's */

typedef struct tarry_fan {
    size_t n; /* functions */
    size_t n_pieces;
    double *bounds;  /* [n_pieces + 1], ascending from 0 */
    double *re, *im; /* [n_pieces][TARRY_FAN_NODES][n] */
    size_t bounds_capacity, re_capacity, im_capacity;
    tarry_radau rule;
    double tests[3]
                [TARRY_RADAU_MOST]; /* the last Legendre coefficients, from values at the nodes */
} tarry_fan;

/* No piece yet. Zero-initialise ({0}); release accepts that, and then it can be begun again. */
void tarry_fan_begin(tarry_fan *fan, size_t n);
void tarry_fan_release(tarry_fan *fan);

double tarry_fan_end(const tarry_fan *fan);

/* Make room for one more piece, up to `to`. *re, *im: its values, [TARRY_FAN_NODES][n], for the
 * caller to fill. 0 or TARRY_MEMORY. */
int tarry_fan_add(tarry_fan *fan, double to, double **re, double **im, tarry_error *error);

/* What is left of a function at the nodes (without the begin) in its last Legendre coefficients:
 * where that is small, the polynomial is as good. */
double tarry_fan_rest(const tarry_fan *fan, const double *values, size_t stride);

/* Where a value is found: sums over the nodes of a piece. */
typedef struct tarry_fan_place {
    bool beyond; /* all are 0 */
    size_t piece;
    double weight[TARRY_FAN_NODES];
} tarry_fan_place;

/* At x, seen from `inside` where x is a bound. */
void tarry_fan_find(const tarry_fan *fan, double x, double inside, tarry_fan_place *place);

/* The values of functions from <= j < to; re and im begin at j = from. */
void tarry_fan_put(const tarry_fan *fan, const tarry_fan_place *place, size_t from, size_t to,
                   double *re, double *im);

/* The integral of the real part of function j over all ages. */
double tarry_fan_integral(const tarry_fan *fan, size_t j);

#endif
