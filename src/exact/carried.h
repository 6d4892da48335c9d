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
    /* The integral of g(1 + above, a) - 1 over all ages; infinite where that passes the range of
     * numbers. NULL: above * total. */
    int (*growth)(tarry_exact_carried *carried, double above, double *growth, tarry_error *error);
    tarry_exact_load load;
    double total; /* integral of the mean load over all ages */
    double most;  /* what one transcript carries is not likely to be more */

    size_t n;
    const double *re, *im; /* z - 1, the caller's */
    tarry_curve mean;      /* mean load at an age */
    tarry_curve second;    /* E[load (load - 1)] at an age; where is_plain, E[load^2]; empty: 0 */
    bool is_plain;         /* loads are no counts; there are moments only */
    void *own;             /* of the kind, freed by release */
};

/* Zero-initialise ({0}); release accepts a zeroed or half-built one. `horizon`: the greatest age
 * that is asked for. Errors: TARRY_MEMORY, TARRY_NUMERIC.
 *
 * One molecule while it is in stage `stage` of the chain. */
int tarry_exact_carry_stage(const tarry_exact_chain *chain, size_t stage, double horizon,
                            tarry_exact_carried *carried, tarry_error *error);

/* Proteins made from it while they are in stage `stage` of theirs. */
int tarry_exact_carry_protein(const tarry_exact_gene *gene, size_t stage, double horizon,
                              tarry_exact_carried *carried, tarry_error *error);

/* Proteins made from it that came to stage `stage` of theirs (n: past the last) within the last
 * `stretch`. */
int tarry_exact_carry_arrivals(const tarry_exact_gene *gene, size_t stage, double stretch,
                               double horizon, tarry_exact_carried *carried, tarry_error *error);

/* What a view sees of it; for moments only. */
int tarry_exact_carry_view(const tarry_exact_gene *gene, const tarry_exact_view *view,
                           double horizon, tarry_exact_carried *carried, tarry_error *error);

void tarry_exact_carried_release(tarry_exact_carried *carried);

/* *presence (zeroed): the probability that a molecule begun a ago is in stage `stage` of its chain,
 * for ages below `horizon`. */
int tarry_exact_presence(const tarry_exact_chain *chain, size_t stage, double horizon,
                         tarry_curve *presence, tarry_error *error);

#endif
