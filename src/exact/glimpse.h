/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_EXACT_GLIMPSE_H
#define TARRY_EXACT_GLIMPSE_H

/* What is seen of one molecule on its way through the stages of its chain: while it is in some of
 * them it contributes a weight, or a weight that rises with the share of its dwell there that is
 * over. Curves are zeroed before; nothing seen leaves them empty. Errors: TARRY_MEMORY,
 * TARRY_NUMERIC. */

#include "exact/curve.h"
#include "exact/gene.h"

typedef struct tarry_exact_glimpse {
    size_t stage; /* of the chain */
    double weight;
    double from, to; /* weight * clip((f - from)/(to - from), 0, 1); from = to = 0: all of it */
} tarry_exact_glimpse;

typedef struct tarry_exact_glimpses {
    tarry_exact_glimpse *list;
    size_t n;
} tarry_exact_glimpses;

/* The mean contribution at an age, and the mean of its square. */
int tarry_exact_glimpses_mean(const tarry_exact_chain *chain, const tarry_exact_glimpses *glimpses,
                              double horizon, tarry_curve *mean, tarry_error *error);
int tarry_exact_glimpses_square(const tarry_exact_chain *chain,
                                const tarry_exact_glimpses *glimpses, double horizon,
                                tarry_curve *square, tarry_error *error);

/* The same of the glimpses in one stage alone, by the time since the molecule came into it. */
int tarry_exact_glimpses_within(const tarry_exact_chain *chain, size_t stage,
                                const tarry_exact_glimpses *glimpses, double horizon,
                                tarry_curve *mean, tarry_curve *square, tarry_error *error);

/* At tau: the integral over all ages a of E[r1(a) r2(a + tau)]. */
int tarry_exact_glimpses_overlap(const tarry_exact_chain *chain, const tarry_exact_glimpses *one,
                                 const tarry_exact_glimpses *other, double horizon,
                                 tarry_curve *overlap, tarry_error *error);

#endif
