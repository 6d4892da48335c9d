/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "engine/propensity.h"

#include "base/error.h"
#include "base/memory.h"

#include <stdbool.h>
#include <stdlib.h>

static bool has_formula(uint32_t kind) {
    return kind == TARRY_RATE_EXPRESSION || kind == TARRY_RATE_PROPENSITY;
}

void tarry_propensities_fill(tarry_propensities *propensities, const tarry_network *network) {
    propensities->network = network;
    const uint32_t n = network->n_reactions;
    for (uint32_t r = 0; r < n; r++) {
        const tarry_reaction *reaction = &network->reactions[r];
        propensities->reactions[r] = (tarry_packed_reaction){
            .kind = (uint32_t)reaction->kind,
            .species = reaction->species,
            .formula = has_formula((uint32_t)reaction->kind) ? reaction->rate : 0,
            .n_factors = reaction->factors.to - reaction->factors.from,
            .factors = network->factors + reaction->factors.from,
        };
        if (has_formula((uint32_t)reaction->kind))
            continue;
        for (uint32_t s = 0; s < network->n_segments; s++)
            propensities->rates[(size_t)s * n + r] = network->segments[s].rates[reaction->rate];
    }
}

int tarry_propensities_init(tarry_propensities *propensities, const tarry_network *network,
                            tarry_error *error) {
    const size_t n = network->n_reactions;
    *propensities = (tarry_propensities){
        .n_reactions = network->n_reactions,
        .reactions = tarry_calloc(n, sizeof(tarry_packed_reaction)),
        .rates = tarry_calloc(n * network->n_segments, sizeof(double)),
    };
    if (!propensities->reactions || !propensities->rates) {
        tarry_propensities_release(propensities);
        return tarry_fail_memory(error, "the propensities");
    }
    tarry_propensities_fill(propensities, network);
    return TARRY_OK;
}

void tarry_propensities_release(tarry_propensities *propensities) {
    free(propensities->reactions);
    free(propensities->rates);
    *propensities = (tarry_propensities){0};
}

/* C(x, n), 0 where x < n; exact as long as the products are. */
static double choose(double x, uint32_t n) {
    if (x < n)
        return 0;
    double ways = 1;
    for (uint32_t j = 0; j < n; j++)
        ways *= (x - j) / (j + 1.0);
    return ways;
}

static double ways_of(const tarry_packed_reaction *packed, const double *counts) {
    double ways = 1;
    for (uint32_t i = 0; i < packed->n_factors; i++) {
        const tarry_factor factor = packed->factors[i];
        const double x = counts[factor.species];
        ways *= choose(x, factor.used) * choose(x - factor.used, factor.needed);
    }
    return ways;
}

static bool lacks(const tarry_packed_reaction *packed, const double *counts) {
    for (uint32_t i = 0; i < packed->n_factors; i++) {
        const tarry_factor factor = packed->factors[i];
        if (counts[factor.species] < (double)factor.used + factor.needed)
            return true;
    }
    return false;
}

double tarry_propensity_general(const tarry_propensities *propensities, const double *rates,
                                uint32_t segment, uint32_t reaction, const double *counts) {
    const tarry_packed_reaction *packed = &propensities->reactions[reaction];
    if (packed->kind == TARRY_RATE_WAYS)
        return rates[reaction] * ways_of(packed, counts);
    const tarry_expression *formula =
        &propensities->network->segments[segment].formulas[packed->formula];
    if (packed->kind == TARRY_RATE_PROPENSITY)
        return lacks(packed, counts) ? 0 : tarry_expression_value(formula, NULL, counts);
    const double ways = ways_of(packed, counts);
    /* A formula may be undefined (0/0) where nothing can react anyway. */
    return ways > 0 ? tarry_expression_value(formula, NULL, counts) * ways : 0;
}
