/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Names first, so that an expression may read parameters that come later in the file; then what
 * reads what, which gives an order; then, in that order, units and values. What --set gives takes
 * an expression's place after the units of the file are known, so that a value must fit the unit
 * that the file has for it. */
#include "model/builder.h"

#include "base/error.h"
#include "base/memory.h"
#include "model/expect.h"
#include "model/parameter_order.h"
#include "model/variation.h"
#include "tarry/word.h"

#include <stdlib.h>
#include <string.h>

typedef struct parameter_reader {
    tarry_builder *builder;
    const tarry_override **given; /* by parameter: what beats the file, or NULL */
} parameter_reader;

/* ---- what stands in the file ------------------------------------------------------------------
 */

/* The scalar of a parameter, also where it is written as {value: ...}. */
static int find_value(const tarry_entry *entry, const tarry_node **scalar,
                      const tarry_node **varies, tarry_error *error) {
    static const char *const keys[] = {"value", "varies"};
    *scalar = entry->node;
    *varies = NULL;
    if (entry->node->kind == TARRY_NODE_SCALAR)
        return tarry_expect_scalar(entry->node, entry->key, error);
    int code = tarry_expect_keys(entry->node, entry->key, keys, 2, error);
    if (code == 0)
        code = tarry_expect_value(entry->node, entry->key, "value", scalar, error);
    if (code == 0)
        *varies = tarry_node_get(entry->node, "varies");
    return code != 0 ? code : tarry_expect_scalar(*scalar, entry->key, error);
}

static int declare(tarry_builder *builder, const tarry_node *map, tarry_error *error) {
    for (size_t i = 0; i < map->n; i++) {
        const tarry_entry *entry = &map->entries[i];
        const tarry_builder_parameter parameter = {.name = entry->key, .place = entry->place};
        int code = tarry_builder_check_name(entry->key, entry->place, "a parameter", error);
        if (code == 0)
            code = tarry_builder_enter(builder, TARRY_SYMBOL_PARAMETER, entry->key, (uint32_t)i,
                                       entry->place, error);
        if (code != 0)
            return code;
        if (TARRY_APPEND(&builder->parameters, parameter) != 0)
            return tarry_fail_memory(error, "the parameters");
    }
    return 0;
}

static int compile(tarry_builder *builder, uint32_t index, const char *text, tarry_place place,
                   tarry_dimension due, tarry_error *error) {
    tarry_builder_parameter *parameter = &builder->parameters.items[index];
    return tarry_expression_compile(text, place, due, builder->units, &builder->scope,
                                    builder->arena, &parameter->expression, error);
}

static int compile_file(tarry_builder *builder, const tarry_node *map, tarry_error *error) {
    for (size_t i = 0; i < map->n; i++) {
        const tarry_node *scalar = NULL;
        int code = find_value(&map->entries[i], &scalar, &builder->parameters.items[i].varies,
                              error);
        if (code == 0)
            code = compile(builder, (uint32_t)i, scalar->text, scalar->place, TARRY_ANY, error);
        if (code != 0)
            return code;
    }
    return 0;
}

/* ---- what the command line gives --------------------------------------------------------------
 */

static int add_option(tarry_error *error, const tarry_override *given) {
    return tarry_error_context(error, "%s %s=%s", given->option, given->name, given->value);
}

static int fail_unknown(const tarry_builder *builder, const tarry_override *given,
                        tarry_error *error) {
    const char *nearest = tarry_builder_nearest(builder, 1u << TARRY_SYMBOL_PARAMETER, given->name);
    if (nearest != NULL)
        tarry_fail(error, TARRY_INPUT, "the model has no parameter '%s'; did you mean '%s'?",
                   given->name, nearest);
    else if (builder->parameters.n == 0)
        tarry_fail(error, TARRY_INPUT, "the model has no parameters to set");
    else
        tarry_fail(
            error, TARRY_INPUT,
            "the model has no parameter '%s'; only what stands under 'parameters' can be set",
            given->name);
    return add_option(error, given);
}

static int find_given(parameter_reader *in, tarry_error *error) {
    const tarry_builder *builder = in->builder;
    for (size_t i = 0; i < builder->n_overrides; i++) {
        const tarry_override *given = &builder->overrides[i];
        if (!given->is_parameter)
            continue;
        const int32_t index = tarry_builder_find(builder, TARRY_SYMBOL_PARAMETER, given->name);
        if (index == TARRY_NONE)
            return fail_unknown(builder, given, error);
        in->given[index] = given;
    }
    return 0;
}

/* The expressions that are given take the place of the file's. */
static int replace_given(parameter_reader *in, tarry_error *error) {
    for (uint32_t i = 0; i < in->builder->parameters.n; i++) {
        const tarry_override *given = in->given[i];
        if (given == NULL)
            continue;
        const int code = compile(in->builder, i, given->value, (tarry_place){0},
                                 in->builder->parameters.items[i].dimension, error);
        if (code != 0)
            return add_option(error, given);
    }
    return 0;
}

/* ---- units ------------------------------------------------------------------------------------
 */

/* Compile again, now that the units of all that the expression reads are known. */
static int set_unit(void *context, uint32_t index, tarry_error *error) {
    const parameter_reader *in = context;
    tarry_builder_parameter *parameter = &in->builder->parameters.items[index];
    const tarry_dimension due = parameter->dimension;
    if (parameter->expression.n_parameters > 0) {
        const tarry_expression first = parameter->expression;
        const int code = compile(in->builder, index, first.text, first.place, due, error);
        if (code != 0)
            return in->given[index] == NULL ? code : add_option(error, in->given[index]);
    }
    if (!due.known)
        parameter->dimension = parameter->expression.dimension;
    return 0;
}

static int read_map(parameter_reader *in, const tarry_node *map, tarry_error *error) {
    tarry_builder *builder = in->builder;
    int code = declare(builder, map, error);
    if (code == 0)
        code = compile_file(builder, map, error);
    if (code == 0)
        code = find_given(in, error);
    if (code == 0)
        code = tarry_parameter_order(builder, builder->order, set_unit, in, error);
    if (code == 0)
        code = replace_given(in, error);
    if (code == 0)
        code = tarry_parameter_order(builder, builder->order, set_unit, in, error);
    return code;
}

/* Those that vary, and those that are made of them. */
static void find_varied(tarry_builder *builder) {
    for (size_t i = 0; i < builder->parameters.n; i++) {
        tarry_builder_parameter *parameter = &builder->parameters.items[builder->order[i]];
        parameter->root = parameter->varies != NULL
                              ? parameter->name
                              : tarry_varied_name(builder, &parameter->expression);
    }
}

/* ---- all --------------------------------------------------------------------------------------
 */

int tarry_read_parameters(tarry_builder *builder, tarry_error *error) {
    static const tarry_node none = {.kind = TARRY_NODE_MAP};
    const tarry_node *map = tarry_node_get(builder->root, "parameters");
    if (map == NULL)
        map = &none;
    int code = tarry_expect_map(map, "'parameters'", error);
    if (code != 0)
        return code;
    parameter_reader in = {.builder = builder};
    bool *fixed = tarry_calloc(map->n, sizeof *fixed);
    in.given = tarry_calloc(map->n, sizeof *in.given);
    builder->order = tarry_arena_calloc(builder->arena, map->n, sizeof *builder->order);
    builder->values = tarry_arena_calloc(builder->arena, map->n, sizeof *builder->values);
    if (fixed == NULL || in.given == NULL || builder->order == NULL || builder->values == NULL)
        code = tarry_fail_memory(error, "the parameters");
    if (code == 0)
        code = read_map(&in, map, error);
    if (code == 0) {
        find_varied(builder);
        code = tarry_parameter_values(builder, fixed, builder->values, error);
    }
    free(fixed);
    free(in.given);
    return code;
}
