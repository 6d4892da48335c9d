/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Setting an engine up: the network packed for the hot loop, and a drawer for every delay. */

#include "engine/cell_state.h"
#include "engine/vary.h"

#include "base/error.h"
#include "base/memory.h"

#include <stdlib.h>

static void pack_effects(tarry_engine *engine) {
    const tarry_network *network = engine->network;
    for (uint32_t i = 0; i < network->n_effects; i++) {
        const tarry_effect *effect = &network->effects[i];
        engine->effects[i] = (tarry_packed_effect){
            .changes = network->changes + effect->changes.from,
            .affected = network->affected + effect->affected.from,
            .schedules = network->schedules + effect->schedules.from,
            .marks = network->marks + effect->marks.from,
            .n_changes = effect->changes.to - effect->changes.from,
            .n_affected = effect->affected.to - effect->affected.from,
            .n_schedules = effect->schedules.to - effect->schedules.from,
            .n_marks = effect->marks.to - effect->marks.from,
            .whole = effect,
            .is_rare = effect->demands.to > effect->demands.from ||
                       effect->amounts.to > effect->amounts.from,
        };
    }
    for (uint32_t r = 0; r < network->n_reactions; r++)
        engine->reaction_effects[r] = network->reactions[r].effect;
}

static void pack_lags(tarry_engine *engine) {
    const tarry_network *network = engine->network;
    for (uint32_t i = 0; i < network->n_lags; i++) {
        const tarry_lag *lag = &network->lags[i];
        const tarry_outcome *outcomes = network->outcomes + lag->outcomes.from;
        const uint32_t n = lag->outcomes.to - lag->outcomes.from;
        engine->lags[i] = (tarry_packed_lag){
            .delay = lag->delay,
            .outcomes = outcomes,
            .n_outcomes = n,
            .is_certain = n == 1 && outcomes[0].cumulative >= 1,
            .effect = n > 0 ? outcomes[0].effect : 0,
            .is_rare = lag->may_be_lost || lag->in_order,
            .n_ramps = lag->ramps.to - lag->ramps.from,
            .ramps = network->lag_ramps + lag->ramps.from,
        };
    }
}

static int make_drawers(tarry_engine *engine, tarry_error *error) {
    const tarry_network *network = engine->network;
    for (uint32_t s = 0; s < network->n_segments; s++) {
        for (uint32_t d = 0; d < network->n_delays; d++) {
            const size_t at = (size_t)s * network->n_delays + d;
            const int code = tarry_drawer_set_add(engine->drawer_set, &network->segments[s].laws[d],
                                                  &engine->drawers[at], error);
            if (code)
                return code;
            engine->fixed[at] = tarry_drawer_fixed(engine->drawers[at]);
        }
    }
    return TARRY_OK;
}

static void list_times(tarry_engine *engine) {
    const tarry_run_plan *run = &engine->network->run;
    for (uint32_t i = 0; i < run->n_frames; i++)
        engine->frame_times[i] = i + 1 < run->n_frames ? i * run->every : run->until;
    uint32_t n = 0;
    for (uint32_t i = 0; i < engine->network->n_channels; i++)
        if (engine->network->channels[i].recorded)
            engine->recorded[n++] = i;
}

static int allocate(tarry_engine *engine, tarry_error *error) {
    const tarry_network *network = engine->network;
    const size_t n_drawers = (size_t)network->n_segments * network->n_delays;
    engine->effects = tarry_calloc(network->n_effects, sizeof *engine->effects);
    engine->reaction_effects = tarry_calloc(network->n_reactions, sizeof(uint32_t));
    engine->lags = tarry_calloc(network->n_lags, sizeof *engine->lags);
    engine->drawers = tarry_calloc(n_drawers, sizeof *engine->drawers);
    engine->fixed = tarry_calloc(n_drawers, sizeof *engine->fixed);
    engine->frame_times = tarry_calloc(network->run.n_frames, sizeof *engine->frame_times);
    engine->recorded = tarry_calloc(network->n_channels, sizeof *engine->recorded);
    if (!engine->effects || !engine->reaction_effects || !engine->lags || !engine->drawers ||
        !engine->fixed || !engine->frame_times || !engine->recorded)
        return tarry_fail_memory(error, "the engine");
    return TARRY_OK;
}

int tarry_engine_new(const tarry_network *network, const char *sampler, tarry_engine **out,
                     tarry_error *error) {
    const tarry_sampler *found = NULL;
    int code = tarry_sampler_find(sampler, &found, error);
    if (code)
        return code;
    tarry_engine *engine = tarry_calloc(1, sizeof *engine);
    if (!engine)
        return tarry_fail_memory(error, "the engine");
    engine->network = network;
    engine->sampler = found;
    if ((code = allocate(engine, error)) ||
        (code = tarry_propensities_init(&engine->propensities, network, error)) ||
        (code = tarry_drawer_set_new(&engine->drawer_set, error)) ||
        (code = make_drawers(engine, error)) || (code = tarry_vary_prepare(engine, error))) {
        tarry_engine_free(engine);
        return code;
    }
    pack_effects(engine);
    pack_lags(engine);
    list_times(engine);
    *out = engine;
    return TARRY_OK;
}

void tarry_engine_free(tarry_engine *engine) {
    if (!engine)
        return;
    tarry_propensities_release(&engine->propensities);
    tarry_drawer_set_free(engine->drawer_set);
    free(engine->effects);
    free(engine->reaction_effects);
    free(engine->lags);
    free(engine->drawers);
    free(engine->fixed);
    free(engine->factors);
    free(engine->frame_times);
    free(engine->recorded);
    free(engine);
}
