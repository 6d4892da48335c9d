/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_TEST_MASTER_H
#define TARRY_TEST_MASTER_H

/* The master equation of a small chain, by GSL: the tests' exact law where there is no closed form.
 */

#include <stddef.h>

typedef struct master_move {
    size_t from, to;
    double rate;
} master_move;

/* Take the probabilities p[0..n) from time 0 to t, by GSL's Runge-Kutta-Prince-Dormand steps with
 * an absolute error of 1e-13 a step; ends the test when GSL fails. */
void master_solve(size_t n, const master_move *moves, size_t n_moves, double *p, double t);

/* The stationary law of an irreducible chain, by GSL's LU decomposition. */
void master_stationary(size_t n, const master_move *moves, size_t n_moves, double *p);

/* Mean, sd and excess kurtosis of `values` under p. */
typedef struct master_moments {
    double mean, sd, kurtosis;
} master_moments;
master_moments master_moments_of(size_t n, const double *p, const double *values);

#endif
