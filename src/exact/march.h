/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_EXACT_MARCH_H
#define TARRY_EXACT_MARCH_H

/* Many small linear systems with one right-hand side but for a factor, taken along together:
 *
 *     dw_j/da = (quiet + jump g_j(a)) w_j,   j = 0 .. n-1
 *
 * with real matrices and complex g_j. All systems take the same steps, which are found with the
 * first few of them, so that what comes out depends on each g_j as smoothly as the true solution
 * does. */

#include "exact/stencil.h"
#include "tarry/error.h"

/* Put g_j(a) of systems from <= j < to into re[j - from] and im[j - from]. Where g jumps at a, the
 * side of `inside` is meant. */
typedef void tarry_march_loads(void *context, double a, double inside, size_t from, size_t to,
                               double *re, double *im);

typedef struct tarry_march {
    size_t n_states, n;
    size_t n_probes; /* systems by which steps are found; the first is the largest of all */
    double tolerance;
    tarry_march_loads *loads;
    void *context;

    double *re, *im; /* [n][n_states]: the w_j, 1 at the beginning */
    double at;       /* the age that they have come to */
    double step;     /* the next step's length, or 0 */
    tarry_radau rule;
    tarry_stencil stencil;
    double *gre, *gim; /* [nodes][n]: g at a step's nodes */
    double *scratch;
    double *saved;          /* the probes, before a step */
    unsigned long n_solved; /* blocks of systems so far: the work done */
} tarry_march;

/* All w_j are 1 at age 0. `tolerance`: error of a step over the largest of the first system. Zero-
 * initialise ({0}). 0 or TARRY_MEMORY. */
int tarry_march_init(tarry_march *march, size_t n_states, size_t n, size_t n_probes,
                     double tolerance, tarry_march_loads *loads, void *context, tarry_error *error);
void tarry_march_release(tarry_march *march); /* accepts a zeroed or half-built one */

/* Take all systems on to age `to` under these matrices ([n_states][n_states]). g is smooth on the
 * way. TARRY_NUMERIC where steps become too short. */
int tarry_march_to(tarry_march *march, const double *quiet, const double *jump, double to,
                   tarry_error *error);

/* The same systems at the same age. 0 or TARRY_MEMORY. */
int tarry_march_copy(const tarry_march *march, tarry_march *out, tarry_error *error);

#endif
