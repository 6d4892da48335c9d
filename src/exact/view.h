/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_EXACT_VIEW_H
#define TARRY_EXACT_VIEW_H

/* What a channel (a species or a signal) sees of one gene's transcripts: each molecule, while it is
 * in some of its stages, contributes a weight, or a weight that rises with the share of its own
 * dwell that is over. */

#include "exact/curve.h"
#include "exact/gene.h"

typedef struct tarry_exact_glimpse {
    size_t stage; /* of the transcript's chain */
    double weight;
    double from, to; /* weight * clip((f - from)/(to - from), 0, 1); from = to = 0: all of it */
} tarry_exact_glimpse;

typedef struct tarry_exact_view {
    double n_copies; /* alleles that are seen */
    tarry_exact_glimpse *glimpses;
    size_t n;
    bool looks;      /* at some species of the gene */
    const char *why; /* NULL, or why it cannot be worked out (rest of a sentence) */
} tarry_exact_view;

/* What the channel sees of the gene, in `arena`; nothing (n is 0) where it looks elsewhere. 0 or
 * TARRY_MEMORY. */
int tarry_exact_view_read(const tarry_network *network, const tarry_exact_gene *gene,
                          const tarry_channel *channel, tarry_arena *arena, tarry_exact_view *view,
                          tarry_error *error);

/* *mean (zeroed): the mean contribution of a transcript at an age. Errors: TARRY_MEMORY,
 * TARRY_NUMERIC. */
int tarry_exact_view_mean(const tarry_exact_gene *gene, const tarry_exact_view *view,
                          double horizon, tarry_curve *mean, tarry_error *error);

/* *square (zeroed): the mean of the squared contribution at an age. */
int tarry_exact_view_square(const tarry_exact_gene *gene, const tarry_exact_view *view,
                            double horizon, tarry_curve *square, tarry_error *error);

/* *overlap (zeroed), at tau: the integral over all ages a of E[r1(a) r2(a + tau)], r1 and r2 being
 * what one transcript contributes to the two views. Errors: TARRY_MEMORY, TARRY_NUMERIC. */
int tarry_exact_view_overlap(const tarry_exact_gene *gene, const tarry_exact_view *one,
                             const tarry_exact_view *other, double horizon, tarry_curve *overlap,
                             tarry_error *error);

#endif
