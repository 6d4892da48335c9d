#ifndef TARRY_ENGINE_PROPENSITY_H
#define TARRY_ENGINE_PROPENSITY_H

/* Propensities from counts: the network's reactions packed for the hot loop. Const once built. */

#include "model/network.h"

typedef struct tarry_propensities {
    const tarry_network *network;
    uint32_t n_reactions;
    struct tarry_packed_reaction *reactions;
    double *rates; /* [segment][reaction]; unused for the kinds with a formula */
} tarry_propensities;

int tarry_propensities_init(tarry_propensities *propensities, const tarry_network *network,
                            tarry_error *error);
void tarry_propensities_release(tarry_propensities *propensities);

#endif
