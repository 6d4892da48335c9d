/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_EXACT_QUADRATURE_H
#define TARRY_EXACT_QUADRATURE_H

/* Means over a random number by few of its values: Gauss quadrature for the law itself, exact for
 * polynomials of degree 2n - 1. */

#include "model/law.h"

enum { TARRY_QUADRATURE_MOST = 32 };

typedef struct tarry_quadrature {
    size_t n;
    double at[TARRY_QUADRATURE_MOST]; /* ascending */
    double weight[TARRY_QUADRATURE_MOST];
} tarry_quadrature;

/* `n` points, or fewer where the law has fewer values. Recurrence by Stieltjes' procedure on a fine
 * grid; points are the eigenvalues of its Jacobi matrix, by bisection (Gautschi 2004, Orthogonal
 * Polynomials, sections 2.2 and 3.1; from memory). Errors: TARRY_MEMORY, TARRY_NUMERIC. */
int tarry_quadrature_find(const tarry_law *law, size_t n, tarry_quadrature *quadrature,
                          tarry_error *error);

#endif
