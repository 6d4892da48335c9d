/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "model/builder.h"

/* Lists and names of the builder, and drafts of effects. Names are found by uthash, so that a model
 * with ten thousand genes is read in one pass. */

#include "base/error.h"
#include "base/memory.h"
#include "base/text.h"
#include "model/like_genes.h"

#include <stdlib.h>
#include <string.h>

#define HASH_NONFATAL_OOM 1
#define uthash_nonfatal_oom(element) ((void)(element))
#include <uthash.h>

enum { LONGEST_NAME = 100, LONGEST_OWN = 3 * LONGEST_NAME };

struct tarry_symbol {
    const char *name;
    tarry_symbol_kind kind;
    uint32_t index;
    tarry_place place;
    UT_hash_handle hh;
};

typedef struct kind_words {
    const char *one; /* "a parameter" */
    const char *bare;
    tarry_symbol_space space;
} kind_words;

static const kind_words KINDS[TARRY_N_SYMBOL_KINDS] = {
    [TARRY_SYMBOL_PARAMETER] = {"a parameter", "parameter", TARRY_SPACE_VALUES},
    [TARRY_SYMBOL_SPECIES] = {"a species", "species", TARRY_SPACE_VALUES},
    [TARRY_SYMBOL_SIGNAL] = {"a signal", "signal", TARRY_SPACE_VALUES},
    [TARRY_SYMBOL_GENE] = {"a gene", "gene", TARRY_SPACE_VALUES},
    [TARRY_SYMBOL_LIKE_GENES] = {"many like genes", "name of like genes", TARRY_SPACE_VALUES},
    [TARRY_SYMBOL_BURSTS] = {"a name of bursts", "name of bursts", TARRY_SPACE_BURSTS},
    [TARRY_SYMBOL_DELAY] = {"a delay", "delay", TARRY_SPACE_DELAYS},
    [TARRY_SYMBOL_REACTION] = {"a reaction", "reaction", TARRY_SPACE_REACTIONS},
};

/* ---- lists --------------------------------------------------------------------------------------
 */

void *tarry_list_room(void *items, size_t n, size_t *capacity, size_t size) {
    if (n < *capacity)
        return items;
    void *moved = items;
    return tarry_grow(&moved, capacity, n + 1, size) == 0 ? moved : NULL;
}

/* ---- finding ------------------------------------------------------------------------------------
 */

static const tarry_symbol *find_symbol(const tarry_builder *builder, tarry_symbol_space space,
                                       const char *name, size_t n) {
    tarry_symbol *symbol = NULL;
    HASH_FIND(hh, builder->symbols[space], name, n, symbol);
    return symbol;
}

static tarry_name_kind find_value(void *context, const char *name, size_t n, uint32_t *index,
                                  tarry_dimension *dimension) {
    const tarry_builder *builder = context;
    const tarry_symbol *symbol = find_symbol(builder, TARRY_SPACE_VALUES, name, n);
    char own[LONGEST_OWN];
    if (symbol == NULL && tarry_like_own(builder, name, n, own, sizeof own))
        symbol = find_symbol(builder, TARRY_SPACE_VALUES, own, strlen(own));
    if (symbol == NULL)
        return TARRY_NAME_UNKNOWN;
    *index = symbol->index;
    if (symbol->kind == TARRY_SYMBOL_SPECIES)
        return TARRY_NAME_SPECIES;
    if (symbol->kind != TARRY_SYMBOL_PARAMETER)
        return TARRY_NAME_UNKNOWN;
    *dimension = builder->parameters.items[symbol->index].dimension;
    return TARRY_NAME_PARAMETER;
}

/* Words for a name that find_value does not know: a common name out of its place. */
static int fail_value(void *context, const char *name, tarry_place place, tarry_error *error) {
    const tarry_like_genes *like = tarry_like_find(context, name, strlen(name));
    return like != NULL ? tarry_like_fail(like, name, place, error) : 0;
}

int32_t tarry_builder_find(const tarry_builder *builder, tarry_symbol_kind kind, const char *name) {
    const tarry_symbol *symbol = find_symbol(builder, KINDS[kind].space, name, strlen(name));
    return symbol != NULL && symbol->kind == kind ? (int32_t)symbol->index : TARRY_NONE;
}

const char *tarry_builder_nearest(const tarry_builder *builder, unsigned kinds, const char *name) {
    const char *nearest[TARRY_N_SYMBOL_KINDS];
    size_t n = 0;
    for (int kind = 0; kind < TARRY_N_SYMBOL_KINDS; kind++) {
        if ((kinds & (1u << kind)) == 0)
            continue;
        const char *found = tarry_nearest_word(name, builder->names[kind].items,
                                               builder->names[kind].n);
        if (found != NULL)
            nearest[n++] = found;
    }
    return tarry_nearest_word(name, nearest, n);
}

int tarry_builder_need(const tarry_builder *builder, tarry_symbol_kind kind, const char *name,
                       tarry_place place, uint32_t *index, tarry_error *error) {
    const int32_t found = tarry_builder_find(builder, kind, name);
    if (found != TARRY_NONE) {
        *index = (uint32_t)found;
        return 0;
    }
    const tarry_like_genes *like = tarry_like_find(builder, name, strlen(name));
    if (like != NULL)
        return tarry_like_fail(like, name, place, error);
    const char *nearest = tarry_builder_nearest(builder, 1u << kind, name);
    if (nearest != NULL)
        return tarry_fail_at(error, TARRY_INPUT, place, "no %s is called '%s'; did you mean '%s'?",
                             KINDS[kind].bare, name, nearest);
    const tarry_symbol *other = find_symbol(builder, KINDS[kind].space, name, strlen(name));
    if (other != NULL)
        return tarry_fail_at(error, TARRY_INPUT, place, "'%s' is %s; here %s is due", name,
                             KINDS[other->kind].one, KINDS[kind].one);
    return tarry_fail_at(error, TARRY_INPUT, place, "no %s is called '%s'", KINDS[kind].bare, name);
}

int32_t tarry_builder_state(const tarry_builder *builder, uint32_t gene, const char *state) {
    const tarry_range promoters = builder->genes.items[gene].promoters;
    if (promoters.from == promoters.to)
        return TARRY_NONE;
    const tarry_range states = builder->promoters.items[promoters.from].states;
    for (uint32_t i = states.from; i < states.to; i++)
        if (strcmp(builder->states.items[i].name, state) == 0)
            return (int32_t)(i - states.from);
    return TARRY_NONE;
}

/* ---- making -------------------------------------------------------------------------------------
 */

static bool is_letter(char c) {
    return (c >= 'a' && c <= 'z') || (c >= 'A' && c <= 'Z');
}

static bool is_in_name(char c) {
    return is_letter(c) || (c >= '0' && c <= '9') || c == '_';
}

int tarry_builder_check_name(const char *name, tarry_place place, const char *what,
                             tarry_error *error) {
    size_t n = 0;
    while (is_in_name(name[n]))
        n++;
    if (n == 0 || name[n] != '\0' || !is_letter(name[0]))
        return tarry_fail_at(error, TARRY_INPUT, place,
                             "'%s' cannot name %s: a name is made of letters, digits and "
                             "underscores, and begins with a letter",
                             name, what);
    if (n > LONGEST_NAME)
        return tarry_fail_at(error, TARRY_INPUT, place,
                             "this name of %s has %zu letters; the longest may have %d", what, n,
                             LONGEST_NAME);
    if (tarry_expression_is_reserved(name, n))
        return tarry_fail_at(error, TARRY_INPUT, place,
                             "'%s' is a unit or a function and cannot name %s; choose another "
                             "name",
                             name, what);
    return 0;
}

static int fail_taken(const tarry_symbol *taken, tarry_symbol_kind kind, tarry_place place,
                      tarry_error *error) {
    return tarry_fail_at(error, TARRY_INPUT, place,
                         "'%s' would name %s here, but it names %s already (line %d); choose "
                         "another name",
                         taken->name, KINDS[kind].one, KINDS[taken->kind].one, taken->place.line);
}

/* A symbol that makes `name` impossible for this kind, or NULL. */
static const tarry_symbol *taken_by(const tarry_builder *builder, tarry_symbol_kind kind,
                                    const char *name) {
    const size_t n = strlen(name);
    const tarry_symbol *same = find_symbol(builder, KINDS[kind].space, name, n);
    if (same != NULL)
        return same;
    const tarry_symbol *value = find_symbol(builder, TARRY_SPACE_VALUES, name, n);
    if (value == NULL)
        return NULL;
    const bool clashes = (kind == TARRY_SYMBOL_DELAY && value->kind == TARRY_SYMBOL_PARAMETER) ||
                         (kind == TARRY_SYMBOL_BURSTS && (value->kind == TARRY_SYMBOL_GENE ||
                                                          value->kind == TARRY_SYMBOL_LIKE_GENES));
    return clashes ? value : NULL;
}

int tarry_builder_enter(tarry_builder *builder, tarry_symbol_kind kind, const char *name,
                        uint32_t index, tarry_place place, tarry_error *error) {
    const tarry_symbol *taken = taken_by(builder, kind, name);
    if (taken != NULL)
        return fail_taken(taken, kind, place, error);
    tarry_symbol *symbol = tarry_arena_calloc(builder->arena, 1, sizeof *symbol);
    if (symbol == NULL)
        return tarry_fail_memory(error, "a name");
    symbol->name = name;
    symbol->kind = kind;
    symbol->index = index;
    symbol->place = place;
    HASH_ADD_KEYPTR(hh, builder->symbols[KINDS[kind].space], name, strlen(name), symbol);
    if (symbol->hh.tbl == NULL || TARRY_APPEND(&builder->names[kind], name) != 0)
        return tarry_fail_memory(error, "a name");
    if (kind != TARRY_SYMBOL_PARAMETER && kind != TARRY_SYMBOL_SPECIES)
        return 0;
    if (TARRY_APPEND(&builder->candidates, name) != 0)
        return tarry_fail_memory(error, "a name");
    builder->scope.candidates = builder->candidates.items;
    builder->scope.n_candidates = builder->candidates.n;
    return 0;
}

/* ---- set up and release -------------------------------------------------------------------------
 */

void tarry_builder_init(tarry_builder *builder, tarry_model *model, const tarry_node *root,
                        tarry_units units) {
    memset(builder, 0, sizeof *builder);
    builder->model = model;
    builder->arena = &model->arena;
    builder->network = &model->network;
    builder->root = root;
    builder->units = units;
    builder->scope.context = builder;
    builder->scope.find = find_value;
    builder->scope.fail = fail_value;
}

void tarry_builder_release(tarry_builder *builder) {
    for (int space = 0; space < TARRY_N_SYMBOL_SPACES; space++)
        HASH_CLEAR(hh, builder->symbols[space]);
    for (int kind = 0; kind < TARRY_N_SYMBOL_KINDS; kind++)
        free(builder->names[kind].items);
    free(builder->candidates.items);
    free(builder->parameters.items);
    free(builder->rates.items);
    free(builder->means.items);
    free(builder->formulas.items);
    free(builder->delays.items);
    free(builder->constants.items);
    free(builder->species.items);
    free(builder->stage_lags.items);
    free(builder->reactions.items);
    free(builder->effects.items);
    free(builder->lags.items);
    free(builder->changes.items);
    free(builder->demands.items);
    free(builder->amounts.items);
    free(builder->marks.items);
    free(builder->responses.items);
    free(builder->firsts.items);
    free(builder->schedules.items);
    free(builder->outcomes.items);
    free(builder->factors.items);
    free(builder->promoters.items);
    free(builder->states.items);
    free(builder->moves.items);
    free(builder->tracks.items);
    free(builder->genes.items);
    free(builder->gene_entries.items);
    free(builder->like_genes.items);
    tarry_like_release(builder);
    free(builder->gene_species.items);
    free(builder->products.items);
    free(builder->signals.items);
    free(builder->weights.items);
    free(builder->ramps.items);
    free(builder->segments.items);
    free(builder->settings.items);
    free(builder->channels.items);
    memset(builder, 0, sizeof *builder);
}
