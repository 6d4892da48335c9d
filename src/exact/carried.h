/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_EXACT_CARRIED_H
#define TARRY_EXACT_CARRIED_H

/* What is counted of a transcript, as a generating function of its age: itself while it is in some
 * stage (carried_stage.c), or the proteins made from it. */

#include "exact/curve.h"
#include "exact/generating.h"
#include "exact/view.h"

typedef struct tarry_exact_carried tarry_exact_carried;

struct tarry_exact_carried {
    /* Get ready for these z ([n] each, of z - 1): from then on `load` gives g(z_j, a). */
    int (*prepare)(tarry_exact_carried *carried, size_t n, const double *re, const double *im,
                   tarry_error *error);
    void (*release)(tarry_exact_carried *carried);
    tarry_exact_load load;
    double total; /* integral of the mean load over all ages */
    const tarry_curve
        *second; /* E[load (load - 1)] at an age; NULL: 0. Where is_plain, E[load^2] */

    size_t n;
    const double *re, *im; /* z - 1, the caller's */
    tarry_curve mean;      /* mean load at an age */
    bool is_plain;         /* E[exp(s load)] near s = 0 stands for E[z^load], s for z - 1 */
    void *own;             /* of the kind, freed by release */
};

/* Zero-initialise ({0}); release accepts a zeroed or half-built one. `horizon`: the greatest age
 * that is asked for. Errors: TARRY_MEMORY, TARRY_NUMERIC.
 *
 * One molecule while it is in stage `stage` of the chain. */
int tarry_exact_carry_stage(const tarry_exact_chain *chain, size_t stage, double horizon,
                            tarry_exact_carried *carried, tarry_error *error);

/* What a view sees of it; for moments only. */
int tarry_exact_carry_view(const tarry_exact_gene *gene, const tarry_exact_view *view,
                           double horizon, tarry_exact_carried *carried, tarry_error *error);

void tarry_exact_carried_release(tarry_exact_carried *carried);

/* *presence (zeroed): the probability that a molecule begun a ago is in stage `stage` of its chain,
 * for ages below `horizon`. */
int tarry_exact_presence(const tarry_exact_chain *chain, size_t stage, double horizon,
                         tarry_curve *presence, tarry_error *error);

#endif
