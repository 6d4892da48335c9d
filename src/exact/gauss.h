/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_EXACT_GAUSS_H
#define TARRY_EXACT_GAUSS_H

/* Gauss-Legendre quadrature with 16 nodes on [-1, 1] (Abramowitz & Stegun 1964, table 25.4; digits
 * by GSL 2.7, a test compares them). */

enum { TARRY_GAUSS = 16 };

extern const double tarry_gauss_node[TARRY_GAUSS];
extern const double tarry_gauss_weight[TARRY_GAUSS];

#endif
