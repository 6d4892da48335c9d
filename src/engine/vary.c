/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "engine/vary.h"

#include "base/error.h"
#include "base/memory.h"

#include <stdlib.h>

int tarry_vary_prepare(tarry_engine *engine, tarry_error *error) {
    const tarry_variation *variation = engine->network->variation;
    if (!variation)
        return TARRY_OK;
    engine->factors = tarry_calloc(variation->n, sizeof *engine->factors);
    if (!engine->factors)
        return tarry_fail_memory(error, "the parameters of cells");
    int code = TARRY_OK;
    for (uint32_t i = 0; !code && i < variation->n; i++)
        code = tarry_drawer_set_add(engine->drawer_set, &variation->varied[i].law,
                                    &engine->factors[i], error);
    return code;
}

int tarry_vary_new(const tarry_engine *base, tarry_vary **out, tarry_error *error) {
    const tarry_network *network = base->network;
    const size_t n_drawers = (size_t)network->n_segments * network->n_delays;
    tarry_vary *vary = tarry_calloc(1, sizeof *vary);
    if (!vary)
        return tarry_fail_memory(error, "the parameters of a cell");
    vary->base = base;
    vary->engine = *base;
    vary->engine.propensities = (tarry_propensities){0};
    vary->engine.drawers = tarry_calloc(n_drawers, sizeof *vary->engine.drawers);
    vary->engine.fixed = tarry_calloc(n_drawers, sizeof *vary->engine.fixed);
    int code = vary->engine.drawers && vary->engine.fixed
                   ? tarry_cell_network_init(&vary->own, network, error)
                   : tarry_fail_memory(error, "the parameters of a cell");
    vary->engine.network = &vary->own.network;
    if (!code)
        code = tarry_propensities_init(&vary->engine.propensities, &vary->own.network, error);
    if (!code)
        code = tarry_drawer_set_new_from(base->drawer_set, &vary->set, error);
    if (code)
        tarry_vary_free(vary);
    else
        *out = vary;
    return code;
}

void tarry_vary_free(tarry_vary *vary) {
    if (!vary)
        return;
    tarry_propensities_release(&vary->engine.propensities);
    free(vary->engine.drawers);
    free(vary->engine.fixed);
    tarry_drawer_set_free(vary->set);
    tarry_cell_network_release(&vary->own);
    free(vary);
}

/* Laws that are those of all cells keep their drawers. */
static int make_drawers(tarry_vary *vary, tarry_error *error) {
    const tarry_network *common = vary->base->network, *own = &vary->own.network;
    for (uint32_t s = 0; s < common->n_segments; s++)
        for (uint32_t d = 0; d < common->n_delays; d++) {
            const size_t at = (size_t)s * common->n_delays + d;
            const tarry_law *law = &own->segments[s].laws[d];
            vary->engine.drawers[at] = vary->base->drawers[at];
            if (!tarry_law_same(law, &common->segments[s].laws[d])) {
                const int code = tarry_drawer_set_add(vary->set, law, &vary->engine.drawers[at],
                                                      error);
                if (code)
                    return code;
            }
            vary->engine.fixed[at] = tarry_drawer_fixed(vary->engine.drawers[at]);
        }
    return TARRY_OK;
}

int tarry_vary_set(tarry_vary *vary, int64_t number, tarry_error *error) {
    const tarry_network *common = vary->base->network;
    tarry_stream stream;
    tarry_stream_init(&stream, common->run.seed, (uint64_t)number, TARRY_STREAM_PARAMETERS);
    for (uint32_t i = 0; i < common->variation->n; i++)
        vary->own.factors[i] = tarry_draw(vary->base->factors[i], &stream);
    int code = tarry_cell_network_set(&vary->own, number, error);
    if (code)
        return code;
    tarry_propensities_fill(&vary->engine.propensities, &vary->own.network);
    tarry_drawer_set_clear(vary->set);
    return make_drawers(vary, error);
}
