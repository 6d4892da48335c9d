/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "model/read_delays.h"

/* Delays: YAML -> law templates. A template holds expressions; laws are made of it for each segment
 * (law_template.c). Named delays may be made of others in whatever order they are written. */

#include "base/error.h"
#include "base/memory.h"
#include "model/expect.h"
#include "model/like_genes.h"

#include <string.h>

enum {
    MOST_LAWS = 1000, /* elementary laws in one delay */
    DEEPEST = 64,     /* named delays made of named delays */
};

/* A family with two plain parameters (or one). */
typedef struct family_keys {
    const char *word;
    tarry_law_kind kind;
    const char *a; /* key of tarry_law.a */
    tarry_dimension a_due;
    const char *b; /* key of tarry_law.b, or NULL */
    tarry_dimension b_due;
} family_keys;

#define TIME                                                                                       \
    { true, 1, 0 }
#define PURE                                                                                       \
    { true, 0, 0 }

static const family_keys FAMILIES[] = {
    {"exponential", TARRY_LAW_EXPONENTIAL, "mean", TIME, NULL, PURE},
    {"erlang", TARRY_LAW_ERLANG, "mean", TIME, "steps", PURE},
    {"gamma", TARRY_LAW_GAMMA, "mean", TIME, "sd", TIME},
    {"lognormal", TARRY_LAW_LOGNORMAL, "mean", TIME, "sd", TIME},
    {"normal", TARRY_LAW_NORMAL, "mean", TIME, "sd", TIME},
    {"uniform", TARRY_LAW_UNIFORM, "from", TIME, "to", TIME},
    {"weibull", TARRY_LAW_WEIBULL, "scale", TIME, "shape", PURE},
};

static const char *const WORDS[] = {"fixed",     "exponential", "erlang",  "gamma",
                                    "lognormal", "normal",      "uniform", "weibull",
                                    "table",     "mix",         "total"};

enum { N_FAMILIES = sizeof FAMILIES / sizeof *FAMILIES, N_WORDS = sizeof WORDS / sizeof *WORDS };

static int read_law(tarry_builder *builder, const tarry_node *node, int depth,
                    tarry_law_template *law, tarry_error *error);

/* ---- expressions ------------------------------------------------------------------------------
 */

static int read_expression(tarry_builder *builder, const tarry_node *node, tarry_dimension due,
                           const char *what, const tarry_expression **out, tarry_error *error) {
    tarry_expression *expression = tarry_arena_calloc(builder->arena, 1, sizeof *expression);
    if (expression == NULL)
        return tarry_fail_memory(error, "a delay");
    *out = expression;
    return tarry_builder_expression(builder, node, due, what, expression, error);
}

static int read_expressions(tarry_builder *builder, const tarry_node *list, tarry_dimension due,
                            const char *what, const tarry_expression **out, tarry_error *error) {
    int code = tarry_expect_list(list, what, error);
    if (code != 0)
        return code;
    tarry_expression *expressions = tarry_arena_calloc(builder->arena, list->n,
                                                       sizeof *expressions);
    if (expressions == NULL)
        return tarry_fail_memory(error, "a delay");
    for (size_t i = 0; code == 0 && i < list->n; i++)
        code = tarry_builder_expression(builder, list->entries[i].node, due, what, &expressions[i],
                                        error);
    *out = expressions;
    return code;
}

/* ---- families -----------------------------------------------------------------------------------
 */

static int read_family(tarry_builder *builder, const family_keys *family, const tarry_node *node,
                       tarry_law_template *law, tarry_error *error) {
    const char *keys[] = {family->a, family->b};
    int code = tarry_expect_keys(node, family->word, keys, family->b == NULL ? 1 : 2, error);
    const tarry_node *value = NULL;
    law->kind = family->kind;
    if (code == 0)
        code = tarry_expect_value(node, family->word, family->a, &value, error);
    if (code == 0)
        code = read_expression(builder, value, family->a_due, family->a, &law->a, error);
    if (code != 0 || family->b == NULL)
        return code;
    code = tarry_expect_value(node, family->word, family->b, &value, error);
    if (code == 0)
        code = read_expression(builder, value, family->b_due, family->b, &law->b, error);
    return code;
}

static int read_table(tarry_builder *builder, const tarry_node *node, tarry_law_template *law,
                      tarry_error *error) {
    static const char *const keys[] = {"edges", "values", "weights", "file"};
    int code = tarry_expect_keys(node, "table", keys, 4, error);
    if (code != 0)
        return code;
    const tarry_node *edges = tarry_node_get(node, "edges");
    const tarry_node *values = tarry_node_get(node, "values");
    const tarry_node *weights = tarry_node_get(node, "weights");
    const tarry_node *file = tarry_node_get(node, "file");
    if ((edges != NULL) + (values != NULL) + (file != NULL) != 1 ||
        (weights == NULL) != (file != NULL))
        return tarry_fail_at(error, TARRY_INPUT, node->place,
                             "a table is {edges: [...], weights: [...]}, {values: [...], weights: "
                             "[...]} or {file: lags.csv}");
    if (file != NULL) {
        code = tarry_expect_scalar(file, "file", error);
        return code == 0 ? tarry_read_lag_file(builder, file, law, error) : code;
    }
    law->kind = edges != NULL ? TARRY_LAW_BINS : TARRY_LAW_VALUES;
    const tarry_node *points = edges != NULL ? edges : values;
    code = read_expressions(builder, points, TARRY_TIME, edges != NULL ? "edges" : "values",
                            &law->points, error);
    if (code == 0)
        code = read_expressions(builder, weights, TARRY_PURE, "weights", &law->weights, error);
    if (code != 0)
        return code;
    law->n = weights->n;
    if (law->n == 0)
        return tarry_fail_at(error, TARRY_INPUT, weights->place,
                             "a table needs at least one weight, as in {values: [1 min, "
                             "4 min], weights: [1, 3]}");
    if (points->n != law->n + (edges != NULL))
        return tarry_fail_at(error, TARRY_INPUT, points->place,
                             edges != NULL ? "%zu edges and %zu weights: there is one edge more "
                                             "than weights, since each bin has two"
                                           : "%zu values and %zu weights: each value has a weight",
                             points->n, law->n);
    return 0;
}

/* ---- laws made of laws ------------------------------------------------------------------------
 */

static int make_parts(tarry_builder *builder, const tarry_node *list, const char *what,
                      tarry_law_template **parts, tarry_law_template *law, tarry_error *error) {
    const int code = tarry_expect_list(list, what, error);
    if (code != 0)
        return code;
    if (list->n == 0)
        return tarry_fail_at(error, TARRY_INPUT, list->place,
                             "%s is empty; it needs at least one delay", what);
    *parts = tarry_arena_calloc(builder->arena, list->n, sizeof **parts);
    law->n = list->n;
    law->parts = *parts;
    return *parts == NULL ? tarry_fail_memory(error, "a delay") : 0;
}

static int count_part(tarry_law_template *law, const tarry_law_template *part, tarry_error *error) {
    law->n_laws += part->n_laws;
    return law->n_laws <= MOST_LAWS
               ? 0
               : tarry_fail_at(error, TARRY_INPUT, law->place,
                               "this delay is made of more than %d laws in all", MOST_LAWS);
}

static int read_mix(tarry_builder *builder, const tarry_node *node, int depth,
                    tarry_law_template *law, tarry_error *error) {
    static const char *const keys[] = {"share", "lasts"};
    tarry_law_template *parts = NULL;
    int code = make_parts(builder, node, "mix", &parts, law, error);
    if (code != 0)
        return code;
    law->kind = TARRY_LAW_MIX;
    tarry_expression *shares = tarry_arena_calloc(builder->arena, node->n, sizeof *shares);
    if (shares == NULL)
        return tarry_fail_memory(error, "a delay");
    law->weights = shares;
    for (size_t i = 0; code == 0 && i < node->n; i++) {
        const tarry_node *item = node->entries[i].node;
        const tarry_node *share = NULL, *lasts = NULL;
        code = tarry_expect_keys(item, "a part of a mix", keys, 2, error);
        if (code == 0)
            code = tarry_expect_value(item, "a part of a mix", "share", &share, error);
        if (code == 0)
            code = tarry_expect_value(item, "a part of a mix", "lasts", &lasts, error);
        if (code == 0)
            code = tarry_builder_expression(builder, share, TARRY_PURE, "share", &shares[i], error);
        if (code == 0)
            code = read_law(builder, lasts, depth, &parts[i], error);
        if (code == 0)
            code = count_part(law, &parts[i], error);
    }
    return code;
}

static int read_total(tarry_builder *builder, const tarry_node *node, int depth,
                      tarry_law_template *law, tarry_error *error) {
    tarry_law_template *parts = NULL;
    int code = make_parts(builder, node, "total", &parts, law, error);
    law->kind = TARRY_LAW_TOTAL;
    for (size_t i = 0; code == 0 && i < node->n; i++) {
        code = read_law(builder, node->entries[i].node, depth, &parts[i], error);
        if (code == 0)
            code = count_part(law, &parts[i], error);
    }
    return code;
}

/* ---- one delay --------------------------------------------------------------------------------
 */

/* A delay written in place: one word with its parameters. */
static int read_law_map(tarry_builder *builder, const tarry_node *node, int depth,
                        tarry_law_template *law, tarry_error *error) {
    int code = tarry_expect_keys(node, "a delay", WORDS, N_WORDS, error);
    if (code != 0)
        return code;
    if (node->n != 1)
        return tarry_fail_at(error, TARRY_INPUT, node->place,
                             "a delay is one law, as {gamma: {mean: 8 min, sd: 4 min}}; here stand "
                             "%zu",
                             node->n);
    const char *word = node->entries[0].key;
    const tarry_node *value = node->entries[0].node;
    for (size_t i = 0; i < N_FAMILIES; i++)
        if (strcmp(word, FAMILIES[i].word) == 0)
            return read_family(builder, &FAMILIES[i], value, law, error);
    if (strcmp(word, "table") == 0)
        return read_table(builder, value, law, error);
    if (strcmp(word, "mix") == 0)
        return read_mix(builder, value, depth, law, error);
    if (strcmp(word, "total") == 0)
        return read_total(builder, value, depth, law, error);
    law->kind = TARRY_LAW_FIXED;
    return read_expression(builder, value, TARRY_TIME, "fixed", &law->a, error);
}

/* Read named delay `index` unless it has been read. */
static int read_named(tarry_builder *builder, uint32_t index, int depth, tarry_place place,
                      tarry_error *error) {
    tarry_builder_delay *delay = &builder->delays.items[index];
    if (delay->state == TARRY_DELAY_READ)
        return 0;
    if (delay->state == TARRY_DELAY_READING)
        return tarry_fail_at(error, TARRY_INPUT, place,
                             "the delay '%s' is made of itself; a delay may hold others only",
                             delay->name);
    if (depth > DEEPEST)
        return tarry_fail_at(error, TARRY_INPUT, place,
                             "delays are made of one another more than %d deep", DEEPEST);
    delay->state = TARRY_DELAY_READING;
    const int code = read_law(builder, delay->node, depth + 1, &delay->law, error);
    delay->state = TARRY_DELAY_READ;
    return code;
}

static bool is_bare_name(const char *text) {
    const size_t n = strspn(text,
                            "abcdefghijklmnopqrstuvwxyzABCDEFGHIJKLMNOPQRSTUVWXYZ0123456789_");
    return text[n] == '\0' && strchr("0123456789", text[0]) == NULL;
}

/* A word that is neither a delay nor a parameter is most likely a slip in a delay's name. */
static int check_scalar(const tarry_builder *builder, const tarry_node *node, tarry_error *error) {
    const int code = tarry_expect_scalar(node, "a delay", error);
    if (code != 0)
        return code;
    if (!is_bare_name(node->text) ||
        tarry_builder_find(builder, TARRY_SYMBOL_PARAMETER, node->text) != TARRY_NONE)
        return 0;
    const char *nearest = tarry_builder_nearest(
        builder, 1u << TARRY_SYMBOL_DELAY | 1u << TARRY_SYMBOL_PARAMETER, node->text);
    if (nearest != NULL)
        return tarry_fail_at(error, TARRY_INPUT, node->place,
                             "no delay is called '%s'; did you mean '%s'?", node->text, nearest);
    return tarry_fail_at(error, TARRY_INPUT, node->place,
                         "no delay is called '%s'; a delay is a name from 'delays', a time such as "
                         "6 min, or a law such as {gamma: {mean: 8 min, sd: 4 min}}",
                         node->text);
}

static int read_law(tarry_builder *builder, const tarry_node *node, int depth,
                    tarry_law_template *law, tarry_error *error) {
    law->place = node->place;
    law->n_laws = 1;
    if (node->kind != TARRY_NODE_SCALAR)
        return read_law_map(builder, node, depth, law, error);
    const int32_t named = tarry_builder_find(builder, TARRY_SYMBOL_DELAY, node->text);
    if (named != TARRY_NONE) {
        const int code = read_named(builder, (uint32_t)named, depth, node->place, error);
        *law = builder->delays.items[named].law;
        return code;
    }
    const int code = check_scalar(builder, node, error);
    if (code != 0)
        return code;
    law->kind = TARRY_LAW_FIXED;
    return read_expression(builder, node, TARRY_TIME, "a fixed delay", &law->a, error);
}

int tarry_read_law(tarry_builder *builder, const tarry_node *node, tarry_law_template *law,
                   tarry_error *error) {
    return read_law(builder, node, 0, law, error);
}

/* The word that stands for a delay without a name. */
static const char *law_word(const tarry_node *node) {
    return node->kind == TARRY_NODE_MAP ? node->entries[0].key : "fixed";
}

int tarry_builder_delay_index(tarry_builder *builder, const tarry_node *node, uint32_t *index,
                              tarry_error *error) {
    if (node->kind == TARRY_NODE_SCALAR) {
        const int32_t named = tarry_builder_find(builder, TARRY_SYMBOL_DELAY, node->text);
        if (named != TARRY_NONE) {
            *index = (uint32_t)named;
            return 0;
        }
    }
    if (tarry_like_shared(builder, node, index))
        return 0;
    tarry_builder_delay delay = {.state = TARRY_DELAY_READ, .node = node};
    const int code = read_law(builder, node, 0, &delay.law, error);
    if (code != 0)
        return code;
    delay.name = law_word(node);
    *index = (uint32_t)builder->delays.n;
    if (TARRY_APPEND(&builder->delays, delay) != 0)
        return tarry_fail_memory(error, "a delay");
    return tarry_like_share(builder, node, *index, error);
}

int tarry_read_delays(tarry_builder *builder, tarry_error *error) {
    const tarry_node *map = tarry_node_get(builder->root, "delays");
    if (map == NULL)
        return 0;
    int code = tarry_expect_map(map, "'delays'", error);
    for (size_t i = 0; code == 0 && i < map->n; i++) {
        const tarry_entry *entry = &map->entries[i];
        const tarry_builder_delay delay = {.name = entry->key, .node = entry->node};
        code = tarry_builder_check_name(entry->key, entry->place, "a delay", error);
        if (code == 0)
            code = tarry_builder_enter(builder, TARRY_SYMBOL_DELAY, entry->key, (uint32_t)i,
                                       entry->place, error);
        if (code == 0 && TARRY_APPEND(&builder->delays, delay) != 0)
            code = tarry_fail_memory(error, "a delay");
    }
    for (uint32_t i = 0; code == 0 && i < map->n; i++)
        code = read_named(builder, i, 0, map->entries[i].place, error);
    return code;
}
