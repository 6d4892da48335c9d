/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_EXACT_CHAIN_H
#define TARRY_EXACT_CHAIN_H

/* The promoter's chain by itself: where it is at a time. */

#include "exact/gene.h"

/* Fill the probabilities with which the regimes begin, from `start`. Errors: TARRY_MEMORY,
 * TARRY_NUMERIC. */
int tarry_exact_begin_regimes(tarry_exact_gene *gene, tarry_error *error);

/* p[n_states]: probabilities at `time`, not before the first regime begins. Errors: TARRY_MEMORY,
 * TARRY_NUMERIC. */
int tarry_exact_states(const tarry_exact_gene *gene, double time, double *p, tarry_error *error);

/* The newest regime that has been in force for some time at `time`, or 0. */
size_t tarry_exact_regime_before(const tarry_exact_gene *gene, double time);

/* Most initiations per unit of time on all copies, in any state under any regime. */
double tarry_exact_highest_rate(const tarry_exact_gene *gene);

#endif
