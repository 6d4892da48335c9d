/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_EXACT_RADAU_H
#define TARRY_EXACT_RADAU_H

/* Collocation at the nodes of Radau IIA (Hairer & Wanner 1996, Solving Ordinary Differential
 * Equations II, section IV.5), L-stable: the polynomial u of degree n with u(0) given and a
 * differential equation fulfilled at n nodes. */

#include <stddef.h>

enum { TARRY_RADAU_MOST = 16 };

typedef struct tarry_radau {
    size_t n;
    double node[TARRY_RADAU_MOST]; /* ascending, the last is 1 */
    double derive[TARRY_RADAU_MOST]
                 [TARRY_RADAU_MOST];     /* u'(node i) = sum of derive[i][k] u(node k) */
    double begin[TARRY_RADAU_MOST];      /*   less begin[i] u(0) */
    double weight[TARRY_RADAU_MOST + 1]; /* barycentric, of 0 and the nodes: u from its values */
    double scale[2]; /* 1 / leading coefficient of the shifted Legendre polynomials n - 1, n */
} tarry_radau;

/* n from 2 to TARRY_RADAU_MOST. */
void tarry_radau_find(tarry_radau *radau, size_t n);

/* By how much u, from its values at 0 and the nodes, is not known within the step: its last
 * Legendre coefficient c, or a tenth of the one before where that is larger. */
double tarry_radau_rest(const tarry_radau *radau, const double *values);

/* The same of exp(-x t), t from 0 to 1, or some more: n! x^n / (2n)!, at most 1. At a step's end
 * the error is of the size of the rest of the solution times the rest of what carries a fault on to
 * the end, exp(-x t) with x the step times the fastest rate: for exp itself (n - 1)! n! x^2n /
 * ((2n - 1)! (2n)!) (Hairer & Wanner, section IV.3). */
double tarry_radau_rest_of_decay(const tarry_radau *radau, double x);

#endif
