/* SPDX-License-Identifier: GPL-3.0-or-later */

/* What can ever happen: a least fixed point. What is there at the start or set by the protocol is
 * at hand; a reaction whose reactants can be there and whose rate is not 0 throughout fires; what
 * it and the lags it starts make is there. Amounts are told apart only for what nothing makes. */

#include "model/analysis.h"

#include "base/error.h"

#include <stdlib.h>

typedef struct search {
    const tarry_network *network;
    tarry_reach *reach;
    uint32_t *queue; /* reactions to look at again */
    size_t n_queue, queue_capacity;
    uint32_t *lags; /* lags that have begun, to be ended */
    size_t n_lags, lags_capacity;
    bool short_of_memory;
} search;

void tarry_reach_release(tarry_reach *reach) {
    free(reach->made);
    free(reach->at_hand);
    free(reach->fires);
    free(reach->runs);
    *reach = (tarry_reach){0};
}

bool tarry_reach_has(const tarry_reach *reach, uint32_t species, double n) {
    return reach->made[species] || reach->at_hand[species] >= n;
}

static void push(search *s, uint32_t **list, size_t *n, size_t *capacity, uint32_t item) {
    if (tarry_grow((void **)list, capacity, *n + 1, sizeof **list))
        s->short_of_memory = true;
    else
        (*list)[(*n)++] = item;
}

/* A species can be made: what reads it is looked at again. */
static void make(search *s, uint32_t species) {
    const tarry_network *network = s->network;
    if (s->reach->made[species])
        return;
    s->reach->made[species] = true;
    for (uint32_t i = network->dependent_start[species]; i < network->dependent_start[species + 1];
         i++)
        push(s, &s->queue, &s->n_queue, &s->queue_capacity, network->dependents[i]);
}

static void happen(search *s, uint32_t index) {
    const tarry_network *network = s->network;
    const tarry_effect *effect = &network->effects[index];
    for (uint32_t i = effect->changes.from; i < effect->changes.to; i++)
        if (network->changes[i].amount > 0)
            make(s, network->changes[i].species);
    for (uint32_t i = effect->amounts.from; i < effect->amounts.to; i++)
        make(s, network->amounts[i].species);
    for (uint32_t i = effect->schedules.from; i < effect->schedules.to; i++) {
        const uint32_t lag = network->schedules[i];
        if (!s->reach->runs[lag])
            push(s, &s->lags, &s->n_lags, &s->lags_capacity, lag);
        s->reach->runs[lag] = true;
    }
}

/* Its rate is above 0 at some time; of a formula that is taken for granted. */
static bool has_rate(const tarry_network *network, const tarry_reaction *reaction) {
    if (reaction->kind == TARRY_RATE_EXPRESSION || reaction->kind == TARRY_RATE_PROPENSITY)
        return true;
    for (uint32_t k = 0; k < network->n_segments; k++)
        if (network->segments[k].rates[reaction->rate] > 0)
            return true;
    return false;
}

static bool has_reactants(const search *s, const tarry_reaction *reaction) {
    if (reaction->kind == TARRY_RATE_LINEAR && !tarry_reach_has(s->reach, reaction->species, 1))
        return false;
    for (uint32_t i = reaction->factors.from; i < reaction->factors.to; i++) {
        const tarry_factor *factor = &s->network->factors[i];
        if (!tarry_reach_has(s->reach, factor->species, (double)factor->used + factor->needed))
            return false;
    }
    return true;
}

static void look_at(search *s, uint32_t index) {
    const tarry_reaction *reaction = &s->network->reactions[index];
    if (s->reach->fires[index] || !has_rate(s->network, reaction) || !has_reactants(s, reaction))
        return;
    s->reach->fires[index] = true;
    happen(s, reaction->effect);
}

static void end_lag(search *s, uint32_t index) {
    const tarry_range outcomes = s->network->lags[index].outcomes;
    for (uint32_t i = outcomes.from; i < outcomes.to; i++)
        happen(s, s->network->outcomes[i].effect);
    if (s->network->lags[index].may_be_lost)
        happen(s, s->network->lags[index].loss_effect);
}

/* A promoter may be in this state: at the start, or moved there by the protocol. */
static void enter_state(search *s, const tarry_promoter_state *state) {
    s->reach->at_hand[state->species] = 1;
    if (state->sum != state->species)
        s->reach->at_hand[state->sum] += 1;
    if (state->lag != TARRY_NONE && !s->reach->runs[state->lag]) {
        s->reach->runs[state->lag] = true;
        push(s, &s->lags, &s->n_lags, &s->lags_capacity, (uint32_t)state->lag);
    }
}

static void start(search *s) {
    const tarry_network *network = s->network;
    for (uint32_t i = 0; i < network->n_species; i++)
        s->reach->at_hand[i] = network->species[i].start;
    for (uint32_t p = 0; p < network->n_promoters; p++) {
        const tarry_promoter *promoter = &network->promoters[p];
        double before = 0;
        for (uint32_t i = promoter->states.from; i < promoter->states.to; i++) {
            const double cumulative = promoter->start[i - promoter->states.from];
            if (cumulative > before)
                enter_state(s, &network->states[i]);
            before = cumulative;
        }
    }
    for (uint32_t k = 0; k < network->n_segments; k++) {
        const tarry_range settings = network->segments[k].settings;
        for (uint32_t i = settings.from; i < settings.to; i++) {
            const tarry_setting *setting = &network->settings[i];
            if (setting->species == TARRY_NONE)
                enter_state(s, &network->states[network->promoters[setting->promoter].states.from +
                                                setting->state]);
            else if (setting->value > s->reach->at_hand[setting->species])
                s->reach->at_hand[setting->species] = setting->value;
        }
    }
}

int tarry_analysis_reach(const tarry_network *network, tarry_reach *reach, tarry_error *error) {
    search s = {.network = network, .reach = reach};
    *reach = (tarry_reach){.made = tarry_calloc(network->n_species, sizeof(bool)),
                           .at_hand = tarry_calloc(network->n_species, sizeof(double)),
                           .fires = tarry_calloc(network->n_reactions, sizeof(bool)),
                           .runs = tarry_calloc(network->n_lags, sizeof(bool))};
    s.short_of_memory = !reach->made || !reach->at_hand || !reach->fires || !reach->runs;
    if (!s.short_of_memory)
        start(&s);
    for (uint32_t i = 0; i < network->n_reactions && !s.short_of_memory; i++)
        look_at(&s, i);
    while (!s.short_of_memory && (s.n_queue > 0 || s.n_lags > 0)) {
        if (s.n_lags > 0)
            end_lag(&s, s.lags[--s.n_lags]);
        else
            look_at(&s, s.queue[--s.n_queue]);
    }
    free(s.queue);
    free(s.lags);
    if (!s.short_of_memory)
        return 0;
    tarry_reach_release(reach);
    return tarry_fail_memory(error, "what can happen");
}
