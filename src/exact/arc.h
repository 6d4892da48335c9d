/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_EXACT_ARC_H
#define TARRY_EXACT_ARC_H

/* The upper half of a circle by few points. A generating function of large counts changes fast near
 * the real axis only, so its angles are parted into stretches, each half as long as the one before,
 * with Chebyshev nodes in each; the many points of a Fourier transform are read from the
 * polynomials through them (Trefethen 2013, Approximation Theory and Approximation Practice,
 * chapter 5; from memory). */

#include <stddef.h>
#include "tarry/error.h"

enum { TARRY_ARC_NODES = 32 };

typedef struct tarry_arc {
    double *bounds; /* [n_panels + 1], from 0 to pi */
    size_t n_panels, capacity;
} tarry_arc;

/* For counts up to `most` that spread by `spread` or more, to be transformed with `length` points.
 * `fineness`: 1, or more for more panels. Zero-initialise ({0}). 0 or TARRY_MEMORY. */
int tarry_arc_init(tarry_arc *arc, double most, double spread, size_t length, double fineness,
                   tarry_error *error);
void tarry_arc_release(tarry_arc *arc); /* accepts a zeroed or half-built one */

size_t tarry_arc_n(const tarry_arc *arc);
double tarry_arc_angle(const tarry_arc *arc, size_t i);

/* Put values at angles 2 pi k / length, k = 0 .. length / 2, into re and im, from those at the
 * nodes. *rest: the largest last coefficients of any panel's polynomials. */
void tarry_arc_spread(const tarry_arc *arc, const double *node_re, const double *node_im,
                      size_t length, double *re, double *im, double *rest);

#endif
