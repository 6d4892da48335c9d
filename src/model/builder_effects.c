/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "model/builder.h"

/* Effects in the making: changes come in any order and are brought to the network's order here. */

#include "base/error.h"

#include <limits.h>
#include <stdlib.h>

/* ---- drafts -------------------------------------------------------------------------------------
 */

int tarry_draft_change(tarry_draft *draft, uint32_t species, int64_t amount, tarry_error *error) {
    if (amount < -INT32_MAX || amount > INT32_MAX)
        return tarry_fail(error, TARRY_INPUT, "more than %d molecules change at once", INT32_MAX);
    const tarry_change change = {.species = species, .amount = (int32_t)amount};
    return TARRY_APPEND(&draft->changes, change) == 0 ? 0 : tarry_fail_memory(error, "an effect");
}

int tarry_draft_demand(tarry_draft *draft, uint32_t species, uint32_t amount, tarry_error *error) {
    const tarry_demand demand = {.species = species, .amount = amount};
    return TARRY_APPEND(&draft->demands, demand) == 0 ? 0 : tarry_fail_memory(error, "an effect");
}

int tarry_draft_mark(tarry_draft *draft, uint32_t track, tarry_mark_kind kind, tarry_error *error) {
    const tarry_mark_rule mark = {.track = track, .kind = kind};
    return TARRY_APPEND(&draft->marks, mark) == 0 ? 0 : tarry_fail_memory(error, "an effect");
}

int tarry_draft_schedule(tarry_draft *draft, uint32_t lag, tarry_error *error) {
    return TARRY_APPEND(&draft->schedules, lag) == 0 ? 0 : tarry_fail_memory(error, "an effect");
}

void tarry_draft_release(tarry_draft *draft) {
    free(draft->demands.items);
    free(draft->changes.items);
    free(draft->amounts.items);
    free(draft->marks.items);
    free(draft->schedules.items);
    *draft = (tarry_draft){0};
}

/* ---- order --------------------------------------------------------------------------------------
 */

static int by_species(const void *one, const void *other) {
    const uint32_t a = ((const tarry_change *)one)->species;
    const uint32_t b = ((const tarry_change *)other)->species;
    return (a > b) - (a < b);
}

/* Append the net changes, ascending, each species once and none of amount 0. */
static int keep_changes(tarry_builder *builder, tarry_draft *draft, tarry_error *error) {
    if (draft->changes.n > 1)
        qsort(draft->changes.items, draft->changes.n, sizeof *draft->changes.items, by_species);
    for (size_t i = 0; i < draft->changes.n;) {
        const uint32_t species = draft->changes.items[i].species;
        int64_t sum = 0;
        for (; i < draft->changes.n && draft->changes.items[i].species == species; i++)
            sum += draft->changes.items[i].amount;
        if (sum < -INT32_MAX || sum > INT32_MAX)
            return tarry_fail(error, TARRY_INPUT, "more than %d molecules change at once",
                              INT32_MAX);
        if (sum == 0)
            continue;
        const tarry_change change = {.species = species, .amount = (int32_t)sum};
        if (TARRY_APPEND(&builder->changes, change) != 0)
            return tarry_fail_memory(error, "an effect");
    }
    return 0;
}

/* Demands as they came; each species stands once, since a map of a model names it once. */
static int keep_demands(tarry_builder *builder, const tarry_draft *draft, tarry_error *error) {
    for (size_t i = 0; i < draft->demands.n; i++)
        if (TARRY_APPEND(&builder->demands, draft->demands.items[i]) != 0)
            return tarry_fail_memory(error, "an effect");
    return 0;
}

static int keep_amounts(tarry_builder *builder, const tarry_draft *draft, tarry_error *error) {
    for (size_t i = 0; i < draft->amounts.n; i++)
        if (TARRY_APPEND(&builder->amounts, draft->amounts.items[i]) != 0)
            return tarry_fail_memory(error, "an effect");
    return 0;
}

static int keep_marks(tarry_builder *builder, const tarry_draft *draft, tarry_error *error) {
    for (size_t i = 0; i < draft->marks.n; i++)
        if (TARRY_APPEND(&builder->marks, draft->marks.items[i]) != 0)
            return tarry_fail_memory(error, "an effect");
    return 0;
}

static int keep_schedules(tarry_builder *builder, const tarry_draft *draft, tarry_error *error) {
    for (size_t i = 0; i < draft->schedules.n; i++)
        if (TARRY_APPEND(&builder->schedules, draft->schedules.items[i]) != 0)
            return tarry_fail_memory(error, "an effect");
    return 0;
}

int tarry_builder_effect(tarry_builder *builder, tarry_draft *draft, uint32_t *index,
                         tarry_error *error) {
    tarry_effect effect = {.skip_short = draft->skip_short};
    effect.demands.from = (uint32_t)builder->demands.n;
    effect.changes.from = (uint32_t)builder->changes.n;
    effect.amounts.from = (uint32_t)builder->amounts.n;
    effect.marks.from = (uint32_t)builder->marks.n;
    effect.schedules.from = (uint32_t)builder->schedules.n;
    int code = keep_changes(builder, draft, error);
    if (code == 0)
        code = keep_demands(builder, draft, error);
    if (code == 0)
        code = keep_amounts(builder, draft, error);
    if (code == 0)
        code = keep_marks(builder, draft, error);
    if (code == 0)
        code = keep_schedules(builder, draft, error);
    if (code != 0)
        return code;
    effect.demands.to = (uint32_t)builder->demands.n;
    effect.changes.to = (uint32_t)builder->changes.n;
    effect.amounts.to = (uint32_t)builder->amounts.n;
    effect.marks.to = (uint32_t)builder->marks.n;
    effect.schedules.to = (uint32_t)builder->schedules.n;
    *index = (uint32_t)builder->effects.n;
    return TARRY_APPEND(&builder->effects, effect) == 0 ? 0 : tarry_fail_memory(error, "an effect");
}

/* ---- lags and reactions -------------------------------------------------------------------------
 */

int tarry_draft_make(tarry_draft *draft, const tarry_builder *builder, uint32_t species,
                     uint32_t amount, tarry_error *error) {
    int code = tarry_draft_change(draft, species, amount, error);
    const int32_t lag = builder->stage_lags.items[species];
    for (uint32_t i = 0; code == 0 && lag != TARRY_NONE && i < amount; i++)
        code = tarry_draft_schedule(draft, (uint32_t)lag, error);
    return code;
}

int tarry_builder_lag(tarry_builder *builder, tarry_lag lag, uint32_t *index, tarry_error *error) {
    *index = (uint32_t)builder->lags.n;
    lag.delay_name = builder->delays.items[lag.delay].name;
    if (TARRY_APPEND(&builder->lags, lag) != 0)
        return tarry_fail_memory(error, "a lag");
    if (lag.stage != TARRY_NONE)
        builder->stage_lags.items[lag.stage] = (int32_t)*index;
    return 0;
}

int tarry_builder_outcome(tarry_builder *builder, uint32_t lag, double chance, uint32_t effect,
                          tarry_error *error) {
    const tarry_outcome outcome = {.cumulative = chance, .effect = effect};
    tarry_range *range = &builder->lags.items[lag].outcomes;
    range->from = (uint32_t)builder->outcomes.n;
    range->to = range->from + 1;
    return TARRY_APPEND(&builder->outcomes, outcome) == 0 ? 0 : tarry_fail_memory(error, "a lag");
}

static tarry_rate_kind rate_kind(bool formula, const tarry_factor *factors, size_t n_factors) {
    if (formula)
        return TARRY_RATE_EXPRESSION;
    if (n_factors == 0)
        return TARRY_RATE_CONSTANT;
    return n_factors == 1 && factors[0].used + factors[0].needed == 1 ? TARRY_RATE_LINEAR
                                                                      : TARRY_RATE_WAYS;
}

int tarry_builder_reaction(tarry_builder *builder, tarry_reaction reaction, bool formula,
                           const tarry_factor *factors, size_t n_factors, tarry_error *error) {
    if (reaction.kind != TARRY_RATE_PROPENSITY)
        reaction.kind = rate_kind(formula, factors, n_factors);
    if (reaction.kind == TARRY_RATE_LINEAR)
        reaction.species = factors[0].species;
    reaction.factors.from = (uint32_t)builder->factors.n;
    for (size_t i = 0; i < n_factors; i++)
        if (TARRY_APPEND(&builder->factors, factors[i]) != 0)
            return tarry_fail_memory(error, "a reaction");
    reaction.factors.to = (uint32_t)builder->factors.n;
    return TARRY_APPEND(&builder->reactions, reaction) == 0
               ? 0
               : tarry_fail_memory(error, "a reaction");
}
