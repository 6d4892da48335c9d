/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_EXACT_DRIFT_H
#define TARRY_EXACT_DRIFT_H

/* The first two derivatives of the w of generating.h with respect to what is counted: with m(a) the
 * mean and s(a) the second (factorial) moment of what one transcript carries,
 *
 *     w1' = (quiet + jump) w1 + m jump 1
 *     w2' = (quiet + jump) w2 + 2 m jump w1 + s jump 1,    both 0 at age 0.
 *
 * The matrices do not depend on the age: a step's equations are eliminated once and kept for all
 * steps of that length under that regime. Collocation as in march.c, with eight
 * nodes, of order 15. */

#include "exact/curve.h"
#include "exact/gene.h"
#include "exact/stencil.h"

typedef struct tarry_drift_step {
    size_t regime;
    double length;
    double *factors; /* eliminated, [unknowns][unknowns]; NULL: none yet */
} tarry_drift_step;

typedef struct tarry_drift {
    const tarry_exact_gene *gene;
    const tarry_curve *mean, *second;
    tarry_radau rule;
    tarry_stencil stencil;
    double *rate; /* [n_regimes][n_states]: jump 1 */
    double *room;
    double least[2];         /* sizes of w1 and w2 below which errors do not count */
    tarry_drift_step *steps; /* kept, a regime's at regime % n_kept */
    size_t n_kept;
    unsigned long n_steps, n_eliminated; /* the work done */
} tarry_drift;

/* Where one walk along the ages stands. */
typedef struct tarry_drift_state {
    double *w1, *w2; /* [n_states], the caller's */
    double at;
    double step; /* the next one's length, or 0 */
} tarry_drift_state;

/* The curves stay the caller's. Zero-initialise ({0}). 0 or TARRY_MEMORY. */
int tarry_drift_init(tarry_drift *drift, const tarry_exact_gene *gene, const tarry_curve *mean,
                     const tarry_curve *second, tarry_error *error);
void tarry_drift_release(tarry_drift *drift); /* accepts a zeroed or half-built one */

/* On to age `to` under one regime. Errors: TARRY_MEMORY, TARRY_NUMERIC. */
int tarry_drift_to(tarry_drift *drift, tarry_drift_state *state, size_t regime, double to,
                   tarry_error *error);

#endif
