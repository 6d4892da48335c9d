/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "tally/pooled_lags.h"

#include <string.h>

static bool alike(const tarry_lag *one, const tarry_lag *other) {
    return one->gene != TARRY_NONE && one->gene == other->gene &&
           strcmp(one->name, other->name) == 0;
}

/* A gene's lags are neighbours. */
bool tarry_is_like_earlier_lag(const tarry_network *network, uint32_t lag) {
    const tarry_lag *lags = network->lags;
    for (uint32_t i = lag; i-- > 0 && lags[i].gene == lags[lag].gene;)
        if (alike(&lags[i], &lags[lag]))
            return true;
    return false;
}

uint32_t tarry_next_like_lag(const tarry_network *network, uint32_t lag, uint32_t after) {
    const tarry_lag *lags = network->lags;
    for (uint32_t i = after + 1; i < network->n_lags && lags[i].gene == lags[lag].gene; i++)
        if (alike(&lags[i], &lags[lag]))
            return i;
    return network->n_lags;
}
