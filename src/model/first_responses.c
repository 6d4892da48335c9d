/* SPDX-License-Identifier: GPL-3.0-or-later */

/* First responses: which steps begin one, what is waited for after each, and marks on the effects
 * that may bring it. Without a protocol there is none of it, and no effect carries a mark.
 *
 * A finished transcript or protein is one that the gene itself makes: what plain reactions or steps
 * add is no response of the gene. */
#include "model/builder.h"

#include "base/error.h"
#include "base/memory.h"
#include "base/notes.h"

#include <math.h>
#include <stdlib.h>

enum { MOST_RESPONSES = 100 };

/* What belongs to whom; TARRY_NONE where nothing does. */
typedef struct first_work {
    tarry_builder *builder;
    int32_t *of_track;    /* [track]: its gene */
    int32_t *of_effect;   /* [effect]: the gene that brings it about */
    int32_t *initiations; /* [gene]: what waits for its initiations */
    int32_t *products;    /* [species]: what waits for one to be finished */
    bool *initiates;      /* [gene]: some effect counts for it */
    bool *recorded;       /* [gene] */
    TARRY_LIST(tarry_mark_rule) marks;
} first_work;

static int32_t *none(size_t n) {
    int32_t *array = tarry_calloc(n, sizeof *array);
    for (size_t i = 0; array != NULL && i < n; i++)
        array[i] = TARRY_NONE;
    return array;
}

static int make_work(first_work *work, tarry_error *error) {
    const tarry_builder *builder = work->builder;
    work->of_track = none(builder->tracks.n);
    work->of_effect = none(builder->effects.n);
    work->initiations = none(builder->genes.n);
    work->products = none(builder->species.n);
    work->initiates = tarry_calloc(builder->genes.n, sizeof *work->initiates);
    work->recorded = tarry_calloc(builder->genes.n, sizeof *work->recorded);
    return work->of_track == NULL || work->of_effect == NULL || work->initiations == NULL ||
                   work->products == NULL || work->initiates == NULL || work->recorded == NULL
               ? tarry_fail_memory(error, "the first responses")
               : 0;
}

static void release_work(first_work *work) {
    free(work->of_track);
    free(work->of_effect);
    free(work->initiations);
    free(work->products);
    free(work->initiates);
    free(work->recorded);
    free(work->marks.items);
}

/* ---- steps ------------------------------------------------------------------------------------
 */

/* The next step from segment `k` on, or the end of the record. */
static double next_step(const tarry_builder *builder, size_t k) {
    const double until = builder->network->run.until;
    for (; k < builder->segments.n; k++)
        if (builder->segments.items[k].moment == TARRY_MOMENT_STEP)
            return fmin(builder->segments.items[k].start, until);
    return until;
}

static int note_most(const tarry_builder *builder, tarry_error *error) {
    return tarry_notes_add(&builder->model->notes, (tarry_place){0}, error,
                           "first responses are told for the first %d steps of the protocol only",
                           (int)MOST_RESPONSES);
}

static int find_responses(tarry_builder *builder, tarry_error *error) {
    for (size_t k = 1; k < builder->segments.n; k++) {
        tarry_segment *segment = &builder->segments.items[k];
        const tarry_response response = {segment->start, next_step(builder, k + 1)};
        if (segment->moment != TARRY_MOMENT_STEP || !(response.from < response.to))
            continue;
        if (builder->responses.n == MOST_RESPONSES)
            return note_most(builder, error);
        segment->response = (int32_t)builder->responses.n;
        if (TARRY_APPEND(&builder->responses, response) != 0)
            return tarry_fail_memory(error, "the first responses");
    }
    return 0;
}

/* ---- what is waited for -----------------------------------------------------------------------
 */

static void find_owners(first_work *work) {
    const tarry_builder *builder = work->builder;
    for (size_t g = 0; g < builder->genes.n; g++) {
        const tarry_gene *gene = &builder->genes.items[g];
        for (uint32_t i = gene->tracks.from; i < gene->tracks.to; i++)
            work->of_track[i] = (int32_t)g;
        work->recorded[g] = gene->promoters.from == gene->promoters.to; /* named bursts */
    }
    for (size_t i = 0; i < builder->marks.n; i++)
        if (builder->marks.items[i].kind == TARRY_MARK_COUNT)
            work->initiates[work->of_track[builder->marks.items[i].track]] = true;
    for (size_t i = 0; i < builder->channels.n; i++) {
        const tarry_channel *channel = &builder->channels.items[i];
        if (!channel->recorded || channel->species == TARRY_NONE)
            continue;
        const int32_t gene = builder->species.items[channel->species].gene;
        if (gene != TARRY_NONE)
            work->recorded[gene] = true;
    }
    for (size_t i = 0; i < builder->reactions.n; i++)
        work->of_effect[builder->reactions.items[i].effect] = builder->reactions.items[i].gene;
    for (size_t i = 0; i < builder->lags.n; i++) {
        const tarry_lag *lag = &builder->lags.items[i];
        for (uint32_t j = lag->outcomes.from; j < lag->outcomes.to; j++)
            work->of_effect[builder->outcomes.items[j].effect] = lag->gene;
    }
}

static int add_first(first_work *work, tarry_first first, int32_t *index, tarry_error *error) {
    *index = (int32_t)work->builder->firsts.n;
    return first.name != NULL && TARRY_APPEND(&work->builder->firsts, first) == 0
               ? 0
               : tarry_fail_memory(error, "the first responses");
}

static int add_gene(first_work *work, uint32_t index, tarry_error *error) {
    tarry_builder *builder = work->builder;
    const tarry_gene *gene = &builder->genes.items[index];
    int code = 0;
    if (work->initiates[index]) {
        const tarry_first first = {
            .name = tarry_arena_format(builder->arena, "%s initiation", gene->name),
            .gene = index,
            .species = TARRY_NONE};
        code = add_first(work, first, &work->initiations[index], error);
    }
    for (uint32_t i = gene->products.from; code == 0 && i < gene->products.to; i++) {
        const uint32_t species = builder->products.items[i];
        const tarry_first first = {.name = builder->species.items[species].name,
                                   .gene = index,
                                   .species = (int32_t)species,
                                   .before = {gene->products.from, i}};
        if (builder->species.items[species].role == TARRY_SPECIES_PRODUCT)
            code = add_first(work, first, &work->products[species], error);
    }
    return code;
}

/* ---- marks ------------------------------------------------------------------------------------
 */

static int add_mark(first_work *work, int32_t first, tarry_error *error) {
    const tarry_mark_rule mark = {.track = (uint32_t)first, .kind = TARRY_MARK_FIRST};
    if (first == TARRY_NONE)
        return 0;
    return TARRY_APPEND(&work->marks, mark) == 0 ? 0 : tarry_fail_memory(error, "the marks");
}

/* The marks that the effect has, then its own of this kind. */
static int mark_effect(first_work *work, uint32_t index, tarry_error *error) {
    const tarry_builder *builder = work->builder;
    tarry_effect *effect = &builder->effects.items[index];
    const tarry_range before = effect->marks;
    int code = 0;
    effect->marks.from = (uint32_t)work->marks.n;
    for (uint32_t i = before.from; code == 0 && i < before.to; i++)
        if (TARRY_APPEND(&work->marks, builder->marks.items[i]) != 0)
            code = tarry_fail_memory(error, "the marks");
    for (uint32_t i = before.from; code == 0 && i < before.to; i++) {
        const tarry_mark_rule *rule = &builder->marks.items[i];
        if (rule->kind == TARRY_MARK_COUNT)
            code = add_mark(work, work->initiations[work->of_track[rule->track]], error);
    }
    for (uint32_t i = effect->changes.from; code == 0 && i < effect->changes.to; i++) {
        const tarry_change *change = &builder->changes.items[i];
        const int32_t gene = builder->species.items[change->species].gene;
        if (change->amount > 0 && gene != TARRY_NONE && gene == work->of_effect[index])
            code = add_mark(work, work->products[change->species], error);
    }
    effect->marks.to = (uint32_t)work->marks.n;
    return code;
}

static int mark_all(first_work *work, tarry_error *error) {
    tarry_builder *builder = work->builder;
    int code = make_work(work, error);
    if (code == 0)
        find_owners(work);
    for (uint32_t g = 0; code == 0 && g < builder->genes.n; g++)
        if (work->recorded[g])
            code = add_gene(work, g, error);
    for (uint32_t i = 0; code == 0 && builder->firsts.n > 0 && i < builder->effects.n; i++)
        code = mark_effect(work, i, error);
    if (code == 0 && builder->firsts.n > 0) {
        free(builder->marks.items);
        builder->marks.items = work->marks.items;
        builder->marks.n = work->marks.n;
        builder->marks.capacity = work->marks.capacity;
        work->marks.items = NULL;
    }
    return code;
}

/* A level that nothing can come of. */
static int note_levels(const tarry_builder *builder, tarry_error *error) {
    int code = 0;
    for (size_t i = 0; code == 0 && i < builder->channels.n; i++) {
        const tarry_channel *channel = &builder->channels.items[i];
        if (channel->signal == TARRY_NONE)
            continue;
        const tarry_signal *signal = &builder->signals.items[channel->signal];
        if (isnan(signal->responds_above))
            continue;
        if (builder->responses.n == 0)
            code = tarry_notes_add(&builder->model->notes, signal->place, error,
                                   "'responds_above' of '%s' says nothing here: no step of a "
                                   "protocol is there to respond to",
                                   signal->name);
        else if (!channel->recorded)
            code = tarry_notes_add(&builder->model->notes, signal->place, error,
                                   "'%s' is not recorded, so when it is first above its level is "
                                   "not told; name it under 'record'",
                                   signal->name);
    }
    return code;
}

int tarry_mark_firsts(tarry_builder *builder, tarry_error *error) {
    first_work work = {.builder = builder};
    int code = find_responses(builder, error);
    if (code == 0 && builder->responses.n > 0)
        code = mark_all(&work, error);
    if (code == 0)
        code = note_levels(builder, error);
    release_work(&work);
    return code;
}
