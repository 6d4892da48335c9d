/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "model/builder.h"

/* What depends on the whole model: values in each segment, which reactions an effect touches, which
 * lags a signal sees. Then the lists move into the model's arena and become the network. */

#include "base/error.h"
#include "base/memory.h"
#include "model/segment_values.h"
#include "model/steady.h"
#include "model/variation.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

/* ---- values in each segment ---------------------------------------------------------------------
 */

/* Say at which step a value is wrong; before any step nothing need be said. */
static int in_segment(const tarry_builder *builder, size_t segment, int code, tarry_error *error) {
    if (code == 0 || segment == 0)
        return code;
    return tarry_error_context(error, "after the step '%s'", builder->segments.items[segment].text);
}

/* Numbers that are built into the network must not change at a step. */
static int check_constants(const tarry_builder *builder, const tarry_segment *segment,
                           tarry_error *error) {
    for (size_t i = 0; i < builder->constants.n; i++) {
        const tarry_builder_constant *constant = &builder->constants.items[i];
        const double before = tarry_expression_value(&constant->expression, builder->values, NULL);
        const double now = tarry_expression_value(&constant->expression, segment->parameters, NULL);
        if (before != now)
            return tarry_fail_at(error, TARRY_INPUT, constant->expression.place,
                                 "%s, '%s', would change at a step of the protocol, which is not "
                                 "possible here; use a parameter that no step sets",
                                 constant->what, constant->expression.text);
    }
    return 0;
}

static tarry_value_sources sources_of(const tarry_builder *builder,
                                      const tarry_law_template *laws) {
    return (tarry_value_sources){.rates = builder->rates.items,
                                 .n_rates = builder->rates.n,
                                 .means = builder->means.items,
                                 .n_means = builder->means.n,
                                 .formulas = builder->formulas.items,
                                 .n_formulas = builder->formulas.n,
                                 .laws = laws,
                                 .n_laws = builder->delays.n};
}

static int fill_segments(tarry_builder *builder, const tarry_law_template *laws,
                         tarry_error *error) {
    const tarry_value_sources sources = sources_of(builder, laws);
    for (size_t i = 0; i < builder->segments.n; i++) {
        tarry_segment *segment = &builder->segments.items[i];
        int code = tarry_segment_fill(&sources, builder->arena, segment, error);
        if (code == 0 && i > 0)
            code = check_constants(builder, segment, error);
        if (code != 0)
            return in_segment(builder, i, code, error);
    }
    return 0;
}

/* ---- dependents ---------------------------------------------------------------------------------
 */

/* Call `visit` for each species that the propensity of a reaction reads; a species may come twice.
 */
static void visit_read(const tarry_builder *builder, const tarry_reaction *reaction,
                       void (*visit)(void *context, uint32_t species), void *context) {
    for (uint32_t i = reaction->factors.from; i < reaction->factors.to; i++)
        visit(context, builder->factors.items[i].species);
    if (reaction->kind != TARRY_RATE_EXPRESSION && reaction->kind != TARRY_RATE_PROPENSITY)
        return;
    const tarry_expression *formula = &builder->formulas.items[reaction->rate];
    for (uint32_t i = 0; i < formula->n_species; i++)
        visit(context, formula->species[i]);
}

typedef struct dependents_work {
    uint32_t *start; /* by species: rows, then where the next one goes */
    uint32_t *rows;  /* NULL while counting */
    int64_t *last;   /* by species: the reaction entered last */
    int64_t reaction;
} dependents_work;

static void count_or_enter(void *context, uint32_t species) {
    dependents_work *work = context;
    if (work->last[species] == work->reaction)
        return;
    work->last[species] = work->reaction;
    if (work->rows == NULL)
        work->start[species + 1]++;
    else
        work->rows[work->start[species]++] = (uint32_t)work->reaction;
}

static void visit_all(const tarry_builder *builder, dependents_work *work) {
    for (size_t i = 0; i < builder->species.n; i++)
        work->last[i] = -1;
    for (size_t i = 0; i < builder->reactions.n; i++) {
        work->reaction = (int64_t)i;
        visit_read(builder, &builder->reactions.items[i], count_or_enter, work);
    }
}

/* Counted, then placed: each row ascends since reactions are taken in order. */
static int find_dependents(tarry_builder *builder, tarry_error *error) {
    const size_t n = builder->species.n;
    dependents_work work = {.start = tarry_arena_calloc(builder->arena, n + 2, sizeof(uint32_t)),
                            .last = tarry_calloc(n, sizeof(int64_t))};
    int code = work.start == NULL || work.last == NULL ? tarry_fail_memory(error, "the dependents")
                                                       : 0;
    if (code == 0) {
        work.start++; /* shifted by one, so that placing leaves each row's start behind */
        visit_all(builder, &work);
        for (size_t i = 0; i < n; i++)
            work.start[i + 1] += work.start[i];
        work.rows = tarry_arena_calloc(builder->arena, work.start[n], sizeof *work.rows);
        if (work.rows == NULL)
            code = tarry_fail_memory(error, "the dependents");
    }
    if (code == 0) {
        visit_all(builder, &work);
        builder->network->dependent_start = work.start - 1;
        builder->network->dependents = work.rows;
    }
    free(work.last);
    return code;
}

/* ---- affected reactions -------------------------------------------------------------------------
 */

typedef struct affected_work {
    TARRY_LIST(uint32_t) rows; /* of all effects */
    uint32_t *last;            /* by reaction: the effect that touched it last, plus 1 */
} affected_work;

static int by_value(const void *one, const void *other) {
    const uint32_t a = *(const uint32_t *)one;
    const uint32_t b = *(const uint32_t *)other;
    return (a > b) - (a < b);
}

static int touch(const tarry_network *network, affected_work *work, uint32_t species,
                 uint32_t effect, tarry_error *error) {
    for (uint32_t i = network->dependent_start[species]; i < network->dependent_start[species + 1];
         i++) {
        const uint32_t reaction = network->dependents[i];
        if (work->last[reaction] == effect + 1)
            continue;
        work->last[reaction] = effect + 1;
        if (TARRY_APPEND(&work->rows, reaction) != 0)
            return tarry_fail_memory(error, "the affected reactions");
    }
    return 0;
}

static int fill_affected(tarry_builder *builder, affected_work *work, uint32_t index,
                         tarry_error *error) {
    tarry_effect *effect = &builder->effects.items[index];
    effect->affected.from = (uint32_t)work->rows.n;
    int code = 0;
    for (uint32_t i = effect->changes.from; code == 0 && i < effect->changes.to; i++)
        code = touch(builder->network, work, builder->changes.items[i].species, index, error);
    for (uint32_t i = effect->amounts.from; code == 0 && i < effect->amounts.to; i++)
        code = touch(builder->network, work, builder->amounts.items[i].species, index, error);
    effect->affected.to = (uint32_t)work->rows.n;
    const size_t n = effect->affected.to - effect->affected.from;
    if (n > 1)
        qsort(work->rows.items + effect->affected.from, n, sizeof *work->rows.items, by_value);
    return code;
}

/* ---- moving into the arena ----------------------------------------------------------------------
 */

static const void *keep(tarry_builder *builder, const void *items, size_t n, size_t size,
                        int *failed) {
    void *kept = tarry_arena_calloc(builder->arena, n, size);
    if (kept == NULL)
        *failed = 1;
    else if (n > 0)
        memcpy(kept, items, n * size);
    return kept;
}

/* Copy a list of the builder into the arena. */
#define KEEP(list) keep(builder, (list).items, (list).n, sizeof *(list).items, &failed)

static int find_affected(tarry_builder *builder, tarry_error *error) {
    affected_work work = {.last = tarry_calloc(builder->reactions.n, sizeof(uint32_t))};
    int code = work.last == NULL ? tarry_fail_memory(error, "the affected reactions") : 0;
    for (uint32_t i = 0; code == 0 && i < builder->effects.n; i++)
        code = fill_affected(builder, &work, i, error);
    int failed = 0;
    if (code == 0) {
        builder->network->affected = KEEP(work.rows);
        code = failed ? tarry_fail_memory(error, "the affected reactions") : 0;
    }
    free(work.rows.items);
    free(work.last);
    return code;
}

/* ---- ramps --------------------------------------------------------------------------------------
 */

/* Ramps lie in order of signals, so that theirs is the row itself; by lag they are counted and
 * placed. */
static int place_ramps(tarry_builder *builder, tarry_error *error) {
    const size_t n = builder->ramps.n;
    uint32_t *by_signal = tarry_arena_calloc(builder->arena, n, sizeof *by_signal);
    uint32_t *by_lag = tarry_arena_calloc(builder->arena, n, sizeof *by_lag);
    if (by_signal == NULL || by_lag == NULL)
        return tarry_fail_memory(error, "the ramps");
    for (size_t i = 0, k = 0; i < builder->signals.n; i++) {
        tarry_range *range = &builder->signals.items[i].ramps;
        range->from = (uint32_t)k;
        for (; k < n && builder->ramps.items[k].signal == i; k++)
            by_signal[k] = (uint32_t)k;
        range->to = (uint32_t)k;
    }
    for (size_t i = 0; i < n; i++)
        builder->lags.items[builder->ramps.items[i].lag].ramps.to++;
    uint32_t next = 0;
    for (size_t i = 0; i < builder->lags.n; i++) {
        tarry_range *range = &builder->lags.items[i].ramps;
        range->from = next;
        next += range->to;
        range->to = range->from;
    }
    for (size_t i = 0; i < n; i++)
        by_lag[builder->lags.items[builder->ramps.items[i].lag].ramps.to++] = (uint32_t)i;
    builder->network->signal_ramps = by_signal;
    builder->network->lag_ramps = by_lag;
    return 0;
}

/* ---- the network --------------------------------------------------------------------------------
 */

static int keep_names(tarry_builder *builder, tarry_error *error) {
    const size_t n = builder->parameters.n;
    const char **names = tarry_arena_calloc(builder->arena, n, sizeof *names);
    if (names == NULL)
        return tarry_fail_memory(error, "the parameters");
    for (size_t i = 0; i < n; i++)
        names[i] = builder->parameters.items[i].name;
    builder->network->parameter_names = names;
    builder->network->n_parameters = (uint32_t)n;
    return 0;
}

static int keep_lists(tarry_builder *builder, tarry_error *error) {
    tarry_network *network = builder->network;
    int failed = 0;
    network->species = KEEP(builder->species);
    network->reactions = KEEP(builder->reactions);
    network->effects = KEEP(builder->effects);
    network->lags = KEEP(builder->lags);
    network->changes = KEEP(builder->changes);
    network->demands = KEEP(builder->demands);
    network->amounts = KEEP(builder->amounts);
    network->marks = KEEP(builder->marks);
    network->schedules = KEEP(builder->schedules);
    network->outcomes = KEEP(builder->outcomes);
    network->factors = KEEP(builder->factors);
    network->promoters = KEEP(builder->promoters);
    network->states = KEEP(builder->states);
    network->tracks = KEEP(builder->tracks);
    network->genes = KEEP(builder->genes);
    network->products = KEEP(builder->products);
    network->signals = KEEP(builder->signals);
    network->weights = KEEP(builder->weights);
    network->ramps = KEEP(builder->ramps);
    network->segments = KEEP(builder->segments);
    network->settings = KEEP(builder->settings);
    network->responses = KEEP(builder->responses);
    network->firsts = KEEP(builder->firsts);
    network->channels = KEEP(builder->channels);
    return failed ? tarry_fail_memory(error, "the network") : 0;
}

static void count_lists(tarry_builder *builder) {
    tarry_network *network = builder->network;
    network->arena = builder->arena;
    network->n_species = (uint32_t)builder->species.n;
    network->n_reactions = (uint32_t)builder->reactions.n;
    network->n_effects = (uint32_t)builder->effects.n;
    network->n_lags = (uint32_t)builder->lags.n;
    network->n_promoters = (uint32_t)builder->promoters.n;
    network->n_tracks = (uint32_t)builder->tracks.n;
    network->n_genes = (uint32_t)builder->genes.n;
    network->n_signals = (uint32_t)builder->signals.n;
    for (size_t i = 0; i < builder->signals.n; i++)
        network->gaps = network->gaps || !isnan(builder->signals.items[i].detects_above);
    network->n_ramps = (uint32_t)builder->ramps.n;
    network->n_rates = (uint32_t)builder->rates.n;
    network->n_means = (uint32_t)builder->means.n;
    network->n_formulas = (uint32_t)builder->formulas.n;
    network->n_delays = (uint32_t)builder->delays.n;
    network->n_segments = (uint32_t)builder->segments.n;
    network->n_channels = (uint32_t)builder->channels.n;
    network->n_responses = (uint32_t)builder->responses.n;
    network->n_firsts = (uint32_t)builder->firsts.n;
}

/* ---- parameters that differ from cell to cell ---------------------------------------------------
 */

/* The templates of all delays, in a row. */
static int keep_laws(tarry_builder *builder, const tarry_law_template **out, tarry_error *error) {
    tarry_law_template *laws = tarry_arena_calloc(builder->arena, builder->delays.n, sizeof *laws);
    for (size_t i = 0; laws != NULL && i < builder->delays.n; i++)
        laws[i] = builder->delays.items[i].law;
    *out = laws;
    return laws != NULL ? 0 : tarry_fail_memory(error, "the delays");
}

static int read_factors(tarry_builder *builder, tarry_varied *varied, tarry_error *error) {
    int code = 0;
    for (uint32_t i = 0, n = 0; code == 0 && i < builder->parameters.n; i++) {
        const tarry_builder_parameter *parameter = &builder->parameters.items[i];
        if (parameter->varies == NULL)
            continue;
        varied[n] = (tarry_varied){.parameter = i, .place = parameter->varies->place};
        code = tarry_read_factor(builder, parameter, &varied[n++].law, error);
    }
    return code;
}

/* What a cell's values are worked out from, where some parameter varies. */
static int keep_variation(tarry_builder *builder, const tarry_law_template *laws,
                          tarry_error *error) {
    const size_t n = builder->parameters.n;
    size_t n_varied = 0;
    int failed = 0;
    for (size_t i = 0; i < n; i++)
        n_varied += builder->parameters.items[i].varies != NULL;
    if (n_varied == 0)
        return 0;
    tarry_variation *variation = tarry_arena_calloc(builder->arena, 1, sizeof *variation);
    tarry_varied *varied = tarry_arena_calloc(builder->arena, n_varied, sizeof *varied);
    tarry_expression *parameters = tarry_arena_calloc(builder->arena, n, sizeof *parameters);
    if (variation == NULL || varied == NULL || parameters == NULL)
        return tarry_fail_memory(error, "the parameters");
    for (size_t i = 0; i < n; i++)
        parameters[i] = builder->parameters.items[i].expression;
    *variation = (tarry_variation){.n = (uint32_t)n_varied,
                                   .varied = varied,
                                   .parameters = parameters,
                                   .order = builder->order,
                                   .sources = sources_of(builder, laws),
                                   .n_moves = builder->moves.n};
    variation->sources.rates = KEEP(builder->rates);
    variation->sources.means = KEEP(builder->means);
    variation->sources.formulas = KEEP(builder->formulas);
    variation->moves = KEEP(builder->moves);
    builder->network->variation = variation;
    return failed ? tarry_fail_memory(error, "the parameters")
                  : read_factors(builder, varied, error);
}

static int find_starts(tarry_builder *builder, tarry_error *error) {
    const tarry_steady_source source = {.genes = builder->genes.items,
                                        .n_genes = builder->genes.n,
                                        .promoters = builder->promoters.items,
                                        .states = builder->states.items,
                                        .lags = builder->lags.items,
                                        .moves = builder->moves.items,
                                        .n_moves = builder->moves.n,
                                        .segments = builder->segments.items,
                                        .n_segments = builder->segments.n,
                                        .arena = builder->arena};
    return tarry_steady_starts(&source, error);
}

int tarry_finish(tarry_builder *builder, tarry_error *error) {
    const tarry_law_template *laws = NULL;
    int code = keep_laws(builder, &laws, error);
    if (code == 0)
        code = fill_segments(builder, laws, error);
    if (code == 0)
        code = find_starts(builder, error);
    if (code == 0)
        code = find_dependents(builder, error);
    if (code == 0)
        code = find_affected(builder, error);
    if (code == 0)
        code = place_ramps(builder, error);
    if (code == 0)
        code = tarry_mark_firsts(builder, error);
    if (code == 0)
        code = keep_names(builder, error);
    if (code == 0)
        code = keep_lists(builder, error);
    if (code == 0)
        code = keep_variation(builder, laws, error);
    if (code == 0)
        count_lists(builder);
    return code;
}
