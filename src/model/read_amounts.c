/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "model/read_reactions.h"

/* Numbers of molecules used and made, whole or random. */

#include "base/error.h"
#include "base/memory.h"
#include "model/expect.h"

#include <math.h>
#include <string.h>

static const double MOST_MADE = 1e6;
static const double MOST_VALUE = 1e9; /* in a table of amounts */

/* ---- whole numbers ------------------------------------------------------------------------------
 */

/* Promoter states and stages belong to their gene; others may only look at them. */
static int check_changeable(const tarry_builder *builder, uint32_t species, const char *key,
                            tarry_place place, tarry_error *error) {
    const tarry_species *about = &builder->species.items[species];
    if (about->role == TARRY_SPECIES_PLAIN || about->role == TARRY_SPECIES_PRODUCT)
        return 0;
    return tarry_fail_at(error, TARRY_INPUT, place,
                         "'%s' cannot stand under '%s': %s change by their gene alone; a reaction "
                         "may read them under 'needs' or in its rate",
                         about->name, key,
                         about->role == TARRY_SPECIES_STAGE ? "stages" : "promoter states");
}

static int read_species(tarry_builder *builder, const tarry_entry *entry, const char *key,
                        bool changes, uint32_t *species, tarry_error *error) {
    int code = tarry_builder_need(builder, TARRY_SYMBOL_SPECIES, entry->key, entry->place, species,
                                  error);
    if (code == 0 && changes)
        code = check_changeable(builder, *species, key, entry->place, error);
    return code;
}

int tarry_read_counts(tarry_builder *builder, const tarry_node *map, const char *key, bool changes,
                      double most, tarry_counts *counts, tarry_error *error) {
    const tarry_node *node = tarry_node_get(map, key);
    if (node == NULL)
        return 0;
    int code = tarry_expect_map(node, key, error);
    for (size_t i = 0; code == 0 && i < node->n; i++) {
        const tarry_entry *entry = &node->entries[i];
        tarry_count count = {.place = entry->place};
        double amount = 0;
        code = read_species(builder, entry, key, changes, &count.species, error);
        if (code == 0)
            code = tarry_expect_count(entry->node, "a number of molecules", 1, most, &amount,
                                      error);
        count.amount = (uint32_t)amount;
        if (code == 0 && TARRY_APPEND(counts, count) != 0)
            code = tarry_fail_memory(error, "a reaction");
    }
    return code;
}

/* ---- random numbers -----------------------------------------------------------------------------
 */

static int read_mean(tarry_builder *builder, const tarry_node *node, const char *word,
                     tarry_amount *amount, tarry_error *error) {
    const tarry_node *mean = NULL;
    const int code = tarry_expect_value(node, word, "mean", &mean, error);
    if (code != 0)
        return code;
    return tarry_builder_mean(builder, mean, amount->least,
                              builder->species.items[amount->species].name, &amount->mean, error);
}

static int read_geometric(tarry_builder *builder, const tarry_node *node, tarry_amount *amount,
                          tarry_error *error) {
    static const char *const keys[] = {"mean", "from"};
    double least = 0;
    int code = tarry_expect_keys(node, "geometric", keys, 2, error);
    const tarry_node *from = code == 0 ? tarry_node_get(node, "from") : NULL;
    if (from != NULL)
        code = tarry_expect_count(from, "'from'", 0, 1, &least, error);
    amount->kind = TARRY_AMOUNT_GEOMETRIC;
    amount->least = (uint32_t)least;
    return code == 0 ? read_mean(builder, node, "geometric", amount, error) : code;
}

static int read_poisson(tarry_builder *builder, const tarry_node *node, tarry_amount *amount,
                        tarry_error *error) {
    static const char *const keys[] = {"mean"};
    amount->kind = TARRY_AMOUNT_POISSON;
    const int code = tarry_expect_keys(node, "poisson", keys, 1, error);
    return code == 0 ? read_mean(builder, node, "poisson", amount, error) : code;
}

/* Read a list of constants into the arena. */
static int read_numbers(tarry_builder *builder, const tarry_node *map, const char *key,
                        double **numbers, size_t *n, tarry_error *error) {
    const tarry_node *list = NULL;
    int code = tarry_expect_value(map, "table", key, &list, error);
    if (code == 0)
        code = tarry_expect_list(list, key, error);
    if (code != 0)
        return code;
    *n = list->n;
    *numbers = tarry_arena_calloc(builder->arena, list->n, sizeof **numbers);
    if (*numbers == NULL)
        return tarry_fail_memory(error, "a table of amounts");
    for (size_t i = 0; code == 0 && i < list->n; i++)
        code = tarry_builder_constant_value(builder, list->entries[i].node, TARRY_PURE, key,
                                            &(*numbers)[i], error);
    return code;
}

static int check_table(const double *values, const double *weights, size_t n, tarry_place place,
                       tarry_error *error) {
    double sum = 0;
    for (size_t i = 0; i < n; i++) {
        if (!(values[i] >= 0 && values[i] <= MOST_VALUE) || values[i] != floor(values[i]))
            return tarry_fail_number(
                error, place, "the values of an amount are whole numbers from 0 to 1e9, not ",
                values[i], "");
        if (i > 0 && !(values[i] > values[i - 1]))
            return tarry_fail_number(error, place, "the values of an amount must ascend; ",
                                     values[i], " does not");
        if (!(weights[i] >= 0))
            return tarry_fail_number(error, place, "a weight must be 0 or more, not ", weights[i],
                                     "");
        sum += weights[i];
    }
    if (!(sum > 0))
        return tarry_fail_at(error, TARRY_INPUT, place, "at least one weight must be above 0");
    return 0;
}

static int read_table(tarry_builder *builder, const tarry_node *node, tarry_amount *amount,
                      tarry_error *error) {
    static const char *const keys[] = {"values", "weights"};
    double *values = NULL, *weights = NULL;
    size_t n_values = 0, n_weights = 0;
    int code = tarry_expect_keys(node, "table", keys, 2, error);
    if (code == 0)
        code = read_numbers(builder, node, "values", &values, &n_values, error);
    if (code == 0)
        code = read_numbers(builder, node, "weights", &weights, &n_weights, error);
    if (code != 0)
        return code;
    if (n_values != n_weights || n_values == 0)
        return tarry_fail_at(error, TARRY_INPUT, node->place,
                             "%zu values and %zu weights: each value has a weight", n_values,
                             n_weights);
    code = check_table(values, weights, n_values, node->place, error);
    if (code != 0)
        return code;
    tarry_cumulate(weights, n_values);
    amount->kind = TARRY_AMOUNT_TABLE;
    amount->n = (uint32_t)n_values;
    amount->values = values;
    amount->cumulative = weights;
    return 0;
}

static int read_random(tarry_builder *builder, const tarry_node *node, tarry_amount *amount,
                       tarry_error *error) {
    static const char *const words[] = {"geometric", "poisson", "table"};
    const int code = tarry_expect_keys(node, "a random amount", words, 3, error);
    if (code != 0)
        return code;
    if (node->n != 1)
        return tarry_fail_at(error, TARRY_INPUT, node->place,
                             "a random amount is one law, as {geometric: {mean: 5}}");
    const char *word = node->entries[0].key;
    const tarry_node *value = node->entries[0].node;
    if (strcmp(word, "geometric") == 0)
        return read_geometric(builder, value, amount, error);
    if (strcmp(word, "poisson") == 0)
        return read_poisson(builder, value, amount, error);
    return read_table(builder, value, amount, error);
}

static int make_random(tarry_builder *builder, const tarry_entry *entry, uint32_t species,
                       tarry_draft *draft, tarry_error *error) {
    tarry_amount amount = {.species = species};
    if (builder->stage_lags.items[species] != TARRY_NONE)
        return tarry_fail_at(error, TARRY_INPUT, entry->place,
                             "'%s' has a lifetime, so that a random number of it cannot be made; "
                             "give it 'half_life', or make a whole number",
                             entry->key);
    const int code = read_random(builder, entry->node, &amount, error);
    if (code != 0)
        return code;
    return TARRY_APPEND(&draft->amounts, amount) == 0 ? 0 : tarry_fail_memory(error, "a reaction");
}

int tarry_read_makes(tarry_builder *builder, const tarry_node *map, tarry_draft *draft,
                     tarry_counts *made, tarry_error *error) {
    const tarry_node *node = tarry_node_get(map, "makes");
    if (node == NULL)
        return 0;
    int code = tarry_expect_map(node, "makes", error);
    for (size_t i = 0; code == 0 && i < node->n; i++) {
        const tarry_entry *entry = &node->entries[i];
        tarry_count count = {.place = entry->place};
        double amount = 0;
        code = read_species(builder, entry, "makes", true, &count.species, error);
        if (code == 0 && entry->node->kind == TARRY_NODE_MAP) {
            code = make_random(builder, entry, count.species, draft, error);
        } else if (code == 0) {
            code = tarry_expect_count(entry->node, "a number of molecules", 1, MOST_MADE, &amount,
                                      error);
            count.amount = (uint32_t)amount;
            if (code == 0)
                code = tarry_draft_make(draft, builder, count.species, count.amount, error);
        }
        if (code == 0 && TARRY_APPEND(made, count) != 0)
            code = tarry_fail_memory(error, "a reaction");
    }
    return code;
}
