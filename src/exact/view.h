/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_EXACT_VIEW_H
#define TARRY_EXACT_VIEW_H

/* What a channel (a species or a signal) sees of one gene: of each transcript in some of its
 * stages, and of each protein made from it in some of the protein's. */

#include "exact/glimpse.h"

typedef struct tarry_exact_view {
    double n_copies; /* alleles that are seen */
    tarry_exact_glimpses transcript, protein;
    bool looks;      /* at some species of the gene */
    const char *why; /* NULL, or why it cannot be worked out (rest of a sentence) */
} tarry_exact_view;

/* What the channel sees of the gene, in `arena`; nothing where it looks elsewhere. 0 or
 * TARRY_MEMORY. */
int tarry_exact_view_read(const tarry_network *network, const tarry_exact_gene *gene,
                          const tarry_channel *channel, tarry_arena *arena, tarry_exact_view *view,
                          tarry_error *error);

/* It sees something of the gene's molecules. */
bool tarry_exact_view_sees(const tarry_exact_view *view);

/* *mean (zeroed): the mean contribution of a transcript of an age, with the proteins made from it.
 * Errors: TARRY_MEMORY, TARRY_NUMERIC. */
int tarry_exact_view_mean(const tarry_exact_gene *gene, const tarry_exact_view *view,
                          double horizon, tarry_curve *mean, tarry_error *error);

/* k, as a way to look at a transcript: each stage with its rate of translation. rates->list is the
 * caller's to free. TARRY_MEMORY. */
int tarry_exact_translations(const tarry_exact_gene *gene, tarry_exact_glimpses *rates,
                             tarry_error *error);

/* *overlap (zeroed), at tau: the integral over all ages a of E[r1(a) r2(a + tau)], r1 and r2 being
 * what one transcript and its proteins contribute to the two views. Errors: TARRY_MEMORY,
 * TARRY_NUMERIC.
 *
 * Given where the transcript is at which age, proteins begin as a Poisson process of rate k(u). So
 * with p1, p2 what a protein is seen as at its own age, this is what the transcript alone is seen
 * as, and k seen through p1 and p2, and what is seen twice of one protein (Campbell's theorem;
 * Daley & Vere-Jones 2003, An Introduction to the Theory of Point Processes, chapter 6; from
 * memory). */
int tarry_exact_view_overlap(const tarry_exact_gene *gene, const tarry_exact_view *one,
                             const tarry_exact_view *other, double horizon, tarry_curve *overlap,
                             tarry_error *error);

#endif
