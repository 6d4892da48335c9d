/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_ENGINE_PROPENSITY_H
#define TARRY_ENGINE_PROPENSITY_H

/* Propensities from counts: the network's reactions packed for the hot loop. Const once built.
 * Mass action counts the ways to choose the molecules (Gillespie 1976, J. Comput. Phys. 22:403). */

#include "model/network.h"

typedef struct tarry_packed_reaction {
    uint32_t kind;    /* tarry_rate_kind */
    uint32_t species; /* for LINEAR */
    uint32_t formula; /* for EXPRESSION and PROPENSITY */
    uint32_t n_factors;
    const tarry_factor *factors;
} tarry_packed_reaction;

typedef struct tarry_propensities {
    const tarry_network *network;
    uint32_t n_reactions;
    tarry_packed_reaction *reactions;
    double *rates; /* [segment][reaction]; 0 for the kinds with a formula */
} tarry_propensities;

int tarry_propensities_init(tarry_propensities *propensities, const tarry_network *network,
                            tarry_error *error);
/* Pack anew, for a network of the same shape with other values. */
void tarry_propensities_fill(tarry_propensities *propensities, const tarry_network *network);

void tarry_propensities_release(tarry_propensities *propensities);

/* The kinds beyond LINEAR and CONSTANT, out of line. */
double tarry_propensity_general(const tarry_propensities *propensities, const double *rates,
                                uint32_t segment, uint32_t reaction, const double *counts);

/* Propensity of one reaction; `rates` is the row of `segment`. */
static inline double tarry_propensity(const tarry_propensities *propensities, const double *rates,
                                      uint32_t segment, uint32_t reaction, const double *counts) {
    const tarry_packed_reaction *packed = &propensities->reactions[reaction];
    if (packed->kind == TARRY_RATE_LINEAR)
        return rates[reaction] * counts[packed->species];
    if (packed->kind == TARRY_RATE_CONSTANT)
        return rates[reaction];
    return tarry_propensity_general(propensities, rates, segment, reaction, counts);
}

#endif
