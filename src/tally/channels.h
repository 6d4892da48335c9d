/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_TALLY_CHANNELS_H
#define TARRY_TALLY_CHANNELS_H

/* Questions about the names that are recorded. */

#include "model/network.h"

/* Recorded channels: the rows of a record's frames. */
static inline uint32_t tarry_channels_recorded(const tarry_network *network) {
    uint32_t n = 0;
    for (uint32_t i = 0; i < network->n_channels; i++)
        n += network->channels[i].recorded;
    return n;
}

/* Does it hold real numbers, not counts? */
static inline bool tarry_channel_is_real(const tarry_channel *channel) {
    return channel->species == TARRY_NONE;
}

/* Is it a stage, transcript or protein of a gene? */
static inline bool tarry_channel_is_product(const tarry_network *network,
                                            const tarry_channel *channel) {
    if (channel->species == TARRY_NONE)
        return false;
    const tarry_species *species = &network->species[channel->species];
    return species->gene != TARRY_NONE &&
           (species->role == TARRY_SPECIES_STAGE || species->role == TARRY_SPECIES_PRODUCT);
}

#endif
