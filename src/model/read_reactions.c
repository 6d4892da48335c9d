/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "model/read_reactions.h"

/* Plain reactions: what is used and needed at initiation, what is made, and what happens later. An
 * entry of `later` is a lag with an effect of its own, which may schedule more. */

#include "base/error.h"
#include "base/memory.h"
#include "base/notes.h"
#include "model/expect.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

static const double MOST_USED = 100;  /* at initiation: the ways are a product of so many terms */
static const double MOST_LATER = 1e6; /* at completion */
static const double MOST_COUNT = 9007199254740992.0; /* 2^53: beyond it counts are not exact */

/* A completion of a reaction takes this species. */
typedef struct completion_use {
    uint32_t species;
    uint32_t reaction;
    tarry_place place;
} completion_use;

typedef struct reaction_work {
    tarry_builder *builder;
    const char *name;
    uint32_t n_later;   /* entries of `later` met in this reaction */
    tarry_counts known; /* species that it uses, needs or has made on the way here */
    TARRY_LIST(completion_use) uses;
} reaction_work;

/* ---- drafts -------------------------------------------------------------------------------------
 */

static int add_known(reaction_work *work, const tarry_counts *counts, tarry_error *error) {
    for (size_t i = 0; i < counts->n; i++)
        if (TARRY_APPEND(&work->known, counts->items[i]) != 0)
            return tarry_fail_memory(error, "a reaction");
    return 0;
}

static int draft_losses(tarry_draft *draft, const tarry_counts *uses, bool demanded,
                        tarry_error *error) {
    int code = 0;
    for (size_t i = 0; code == 0 && i < uses->n; i++) {
        const tarry_count *use = &uses->items[i];
        code = tarry_draft_change(draft, use->species, -(int64_t)use->amount, error);
        if (code == 0 && demanded)
            code = tarry_draft_demand(draft, use->species, use->amount, error);
    }
    return code;
}

/* ---- later --------------------------------------------------------------------------------------
 */

static int read_later(reaction_work *work, const tarry_node *map, tarry_draft *draft,
                      tarry_error *error);

/* A completion should take what its own initiation left for it. */
static int note_stranger(reaction_work *work, const tarry_count *use, tarry_error *error) {
    for (size_t i = 0; i < work->known.n; i++)
        if (work->known.items[i].species == use->species)
            return 0;
    return tarry_notes_add(
        &work->builder->model->notes, use->place, error,
        "a completion of '%s' uses '%s', which the reaction neither uses, needs "
        "nor makes: whether there is one by then is left to chance. If it should "
        "be, name it under 'needs', or say 'if_short: skip'.",
        work->name, work->builder->species.items[use->species].name);
}

static int read_later_uses(reaction_work *work, const tarry_node *map, tarry_draft *draft,
                           tarry_error *error) {
    tarry_counts uses = {0};
    int code = tarry_read_counts(work->builder, map, "uses", true, MOST_LATER, &uses, error);
    if (code == 0)
        code = draft_losses(draft, &uses, true, error);
    for (size_t i = 0; code == 0 && i < uses.n; i++) {
        const completion_use use = {.species = uses.items[i].species,
                                    .reaction = (uint32_t)work->builder->reactions.n,
                                    .place = uses.items[i].place};
        code = note_stranger(work, &uses.items[i], error);
        if (code == 0 && TARRY_APPEND(&work->uses, use) != 0)
            code = tarry_fail_memory(error, "a reaction");
    }
    free(uses.items);
    return code;
}

static int read_if_short(const tarry_node *map, bool *skip, tarry_error *error) {
    const tarry_node *node = tarry_node_get(map, "if_short");
    *skip = false;
    if (node == NULL)
        return 0;
    const int code = tarry_expect_scalar(node, "'if_short'", error);
    if (code != 0)
        return code;
    *skip = strcmp(node->text, "skip") == 0;
    if (!*skip && strcmp(node->text, "stop") != 0)
        return tarry_fail_at(error, TARRY_INPUT, node->place,
                             "'if_short' must be stop or skip, not '%s'", node->text);
    return 0;
}

static int read_chance(reaction_work *work, const tarry_node *map, double *chance,
                       tarry_error *error) {
    const tarry_node *node = tarry_node_get(map, "chance");
    *chance = 1;
    if (node == NULL)
        return 0;
    const int code = tarry_builder_constant_value(work->builder, node, TARRY_PURE, "'chance'",
                                                  chance, error);
    if (code == 0 && !(*chance >= 0 && *chance <= 1))
        return tarry_fail_number(error, node->place, "'chance' must lie between 0 and 1; it is ",
                                 *chance, "");
    return code;
}

/* The lag of an entry: "bind.later", then "bind.later.2" and so on. */
static int make_lag(reaction_work *work, const tarry_node *map, uint32_t *index,
                    tarry_error *error) {
    tarry_builder *builder = work->builder;
    const tarry_node *after = NULL;
    tarry_lag lag = {
        .stage = TARRY_NONE, .promoter = TARRY_NONE, .gene = TARRY_NONE, .place = map->place};
    int code = tarry_expect_value(map, "an entry of 'later'", "after", &after, error);
    if (code == 0)
        code = tarry_builder_delay_index(builder, after, &lag.delay, error);
    if (code != 0)
        return code;
    work->n_later++;
    lag.name = work->n_later == 1
                   ? tarry_arena_format(builder->arena, "%s.later", work->name)
                   : tarry_arena_format(builder->arena, "%s.later.%u", work->name, work->n_later);
    if (lag.name == NULL)
        return tarry_fail_memory(error, "a reaction");
    return tarry_builder_lag(builder, lag, index, error);
}

/* What happens at one completion, with what it schedules in turn. */
static int read_completion(reaction_work *work, const tarry_node *map, tarry_draft *draft,
                           tarry_error *error) {
    const size_t n_known = work->known.n;
    tarry_counts made = {0};
    int code = read_later_uses(work, map, draft, error);
    if (code == 0)
        code = read_if_short(map, &draft->skip_short, error);
    if (code == 0)
        code = tarry_read_makes(work->builder, map, draft, &made, error);
    if (code == 0)
        code = add_known(work, &made, error);
    if (code == 0)
        code = read_later(work, map, draft, error);
    work->known.n = n_known;
    free(made.items);
    return code;
}

static int read_entry(reaction_work *work, const tarry_node *map, tarry_draft *parent,
                      tarry_error *error) {
    static const char *const keys[] = {"after", "uses", "makes", "chance", "if_short", "later"};
    tarry_draft draft = {0};
    double chance = 1;
    uint32_t lag = 0, effect = 0;
    int code = tarry_expect_keys(map, "an entry of 'later'", keys, 6, error);
    if (code == 0)
        code = make_lag(work, map, &lag, error);
    if (code == 0)
        code = read_chance(work, map, &chance, error);
    if (code == 0)
        code = read_completion(work, map, &draft, error);
    if (code == 0)
        code = tarry_builder_effect(work->builder, &draft, &effect, error);
    if (code == 0)
        code = tarry_builder_outcome(work->builder, lag, chance, effect, error);
    if (code == 0)
        code = tarry_draft_schedule(parent, lag, error);
    tarry_draft_release(&draft);
    return code;
}

static int read_later(reaction_work *work, const tarry_node *map, tarry_draft *draft,
                      tarry_error *error) {
    const tarry_node *later = tarry_node_get(map, "later");
    if (later == NULL)
        return 0;
    int code = tarry_expect_list(later, "'later'", error);
    for (size_t i = 0; code == 0 && i < later->n; i++)
        code = read_entry(work, later->entries[i].node, draft, error);
    return code;
}

/* ---- rates and factors --------------------------------------------------------------------------
 */

static int by_species(const void *one, const void *other) {
    const uint32_t a = ((const tarry_factor *)one)->species;
    const uint32_t b = ((const tarry_factor *)other)->species;
    return (a > b) - (a < b);
}

/* One factor for each species used or needed, ascending, in the arena. */
static int make_factors(tarry_builder *builder, const tarry_counts *uses, const tarry_counts *needs,
                        tarry_factor **factors, size_t *n, tarry_error *error) {
    *n = uses->n;
    *factors = tarry_arena_calloc(builder->arena, uses->n + needs->n, sizeof **factors);
    if (*factors == NULL)
        return tarry_fail_memory(error, "a reaction");
    for (size_t i = 0; i < uses->n; i++)
        (*factors)[i] = (tarry_factor){.species = uses->items[i].species,
                                       .used = uses->items[i].amount};
    for (size_t i = 0; i < needs->n; i++) {
        size_t j = 0;
        while (j < *n && (*factors)[j].species != needs->items[i].species)
            j++;
        (*factors)[j].species = needs->items[i].species;
        (*factors)[j].needed = needs->items[i].amount;
        *n += j == *n;
    }
    qsort(*factors, *n, sizeof **factors, by_species);
    return 0;
}

static int read_rate(reaction_work *work, const tarry_entry *entry, tarry_reaction *reaction,
                     bool *formula, tarry_error *error) {
    const tarry_node *rate = tarry_node_get(entry->node, "rate");
    const tarry_node *propensity = tarry_node_get(entry->node, "propensity");
    if ((rate == NULL) == (propensity == NULL))
        return tarry_fail_at(error, TARRY_INPUT, entry->place,
                             "the reaction '%s' needs either 'rate' (per combination of what it "
                             "uses and needs) or 'propensity' (the whole of it)%s",
                             entry->key, rate == NULL ? "" : ", not both");
    if (rate != NULL)
        return tarry_builder_rate(work->builder, rate, false, entry->key, formula, &reaction->rate,
                                  error);
    reaction->kind = TARRY_RATE_PROPENSITY;
    *formula = true;
    return tarry_builder_formula(work->builder, propensity, entry->key, &reaction->rate, error);
}

/* ---- one reaction -------------------------------------------------------------------------------
 */

static int build(reaction_work *work, const tarry_entry *entry, const tarry_counts *uses,
                 const tarry_counts *needs, tarry_draft *draft, tarry_error *error) {
    tarry_builder *builder = work->builder;
    tarry_reaction reaction = {
        .name = entry->key, .gene = TARRY_NONE, .allele = TARRY_NONE, .place = entry->place};
    tarry_factor *factors = NULL;
    size_t n_factors = 0;
    bool formula = false;
    int code = make_factors(builder, uses, needs, &factors, &n_factors, error);
    if (code == 0)
        code = read_rate(work, entry, &reaction, &formula, error);
    if (code == 0)
        code = tarry_builder_effect(builder, draft, &reaction.effect, error);
    if (code == 0)
        code = tarry_builder_enter(builder, TARRY_SYMBOL_REACTION, entry->key,
                                   (uint32_t)builder->reactions.n, entry->place, error);
    if (code == 0)
        code = tarry_builder_reaction(builder, reaction, formula, factors, n_factors, error);
    return code;
}

static int read_reaction(reaction_work *work, const tarry_entry *entry, tarry_error *error) {
    static const char *const keys[] = {"uses", "makes", "needs", "rate", "propensity", "later"};
    tarry_counts uses = {0}, needs = {0}, made = {0};
    tarry_draft draft = {0};
    work->name = entry->key;
    work->n_later = 0;
    work->known.n = 0;
    int code = tarry_builder_check_name(entry->key, entry->place, "a reaction", error);
    if (code == 0)
        code = tarry_expect_keys(entry->node, entry->key, keys, 6, error);
    if (code == 0)
        code = tarry_read_counts(work->builder, entry->node, "uses", true, MOST_USED, &uses, error);
    if (code == 0)
        code = tarry_read_counts(work->builder, entry->node, "needs", false, MOST_USED, &needs,
                                 error);
    if (code == 0)
        code = draft_losses(&draft, &uses, false, error);
    if (code == 0)
        code = tarry_read_makes(work->builder, entry->node, &draft, &made, error);
    if (code == 0)
        code = add_known(work, &uses, error);
    if (code == 0)
        code = add_known(work, &needs, error);
    if (code == 0)
        code = add_known(work, &made, error);
    if (code == 0)
        code = read_later(work, entry->node, &draft, error);
    if (code == 0)
        code = build(work, entry, &uses, &needs, &draft, error);
    tarry_draft_release(&draft);
    free(uses.items);
    free(needs.items);
    free(made.items);
    return code;
}

/* ---- molecules are anonymous --------------------------------------------------------------------
 */

typedef struct removers {
    int32_t first, second; /* two different reactions that remove a species when they fire */
} removers;

static void find_removers(const tarry_builder *builder, removers *out) {
    for (size_t i = 0; i < builder->species.n; i++)
        out[i] = (removers){TARRY_NONE, TARRY_NONE};
    for (size_t i = 0; i < builder->reactions.n; i++) {
        const tarry_range changes =
            builder->effects.items[builder->reactions.items[i].effect].changes;
        for (uint32_t j = changes.from; j < changes.to; j++) {
            const tarry_change *change = &builder->changes.items[j];
            removers *of = &out[change->species];
            if (change->amount >= 0)
                continue;
            if (of->first == TARRY_NONE)
                of->first = (int32_t)i;
            else if (of->second == TARRY_NONE)
                of->second = (int32_t)i;
        }
    }
}

static int note_removed(const reaction_work *work, const removers *all, tarry_error *error) {
    const tarry_builder *builder = work->builder;
    int code = 0;
    for (size_t i = 0; code == 0 && i < work->uses.n; i++) {
        const completion_use *use = &work->uses.items[i];
        const removers *of = &all[use->species];
        const int32_t other = of->first == (int32_t)use->reaction ? of->second : of->first;
        if (other == TARRY_NONE)
            continue;
        code = tarry_notes_add(
            &builder->model->notes, use->place, error,
            "'%s' waits for a completion of '%s' and is also removed by '%s'. "
            "Molecules are anonymous: the completion takes any that is left, and "
            "may find none.",
            builder->species.items[use->species].name, builder->reactions.items[use->reaction].name,
            builder->reactions.items[other].name);
    }
    for (size_t i = 0; code == 0 && i < builder->species.n; i++) {
        const tarry_species *species = &builder->species.items[i];
        if (species->role != TARRY_SPECIES_PRODUCT || builder->stage_lags.items[i] == TARRY_NONE ||
            all[i].first == TARRY_NONE)
            continue;
        code = tarry_notes_add(&builder->model->notes, species->place, error,
                               "'%s' has a lifetime and is also removed by '%s'. Molecules are "
                               "anonymous: the end of a lifetime takes any that is left, and stops "
                               "the run where there is none.",
                               species->name, builder->reactions.items[all[i].first].name);
    }
    return code;
}

static int note_anonymous(const reaction_work *work, tarry_error *error) {
    removers *all = tarry_calloc(work->builder->species.n, sizeof *all);
    if (all == NULL)
        return tarry_fail_memory(error, "the reactions");
    find_removers(work->builder, all);
    const int code = note_removed(work, all, error);
    free(all);
    return code;
}

/* ---- all ----------------------------------------------------------------------------------------
 */

static int read_starts(tarry_builder *builder, tarry_error *error) {
    const tarry_node *map = tarry_node_get(builder->root, "species");
    int code = 0;
    for (size_t i = 0; map != NULL && code == 0 && i < map->n; i++) {
        const tarry_entry *entry = &map->entries[i];
        const int32_t index = tarry_builder_find(builder, TARRY_SYMBOL_SPECIES, entry->key);
        double start = 0;
        code = tarry_builder_constant_value(builder, entry->node, TARRY_PURE,
                                            "the count of a species at the start", &start, error);
        if (code == 0 && !(start >= 0 && start <= MOST_COUNT && start == floor(start)))
            code = tarry_fail_number(error, entry->node->place,
                                     "a count at the start must be a whole number from 0 to 2^53, "
                                     "not ",
                                     start, "");
        builder->species.items[index].start = start;
    }
    return code;
}

int tarry_read_reactions(tarry_builder *builder, tarry_error *error) {
    const tarry_node *map = tarry_node_get(builder->root, "reactions");
    reaction_work work = {.builder = builder};
    int code = read_starts(builder, error);
    if (code == 0 && map != NULL)
        code = tarry_expect_map(map, "'reactions'", error);
    for (size_t i = 0; map != NULL && code == 0 && i < map->n; i++)
        code = read_reaction(&work, &map->entries[i], error);
    if (code == 0)
        code = note_anonymous(&work, error);
    free(work.known.items);
    free(work.uses.items);
    return code;
}
