/* SPDX-License-Identifier: GPL-3.0-or-later */

/* `run:` as a whole: its keys, what the command line gives in their place, cells and seed. */
#include "model/read_run.h"

#include "base/error.h"
#include "base/number.h"
#include "model/expect.h"

#include <stdint.h>
#include <string.h>

enum { DEFAULT_CELLS = 1000, DEFAULT_SEED = 1 };

static const double MOST_CELLS = 1e12;

static const char *const RUN_KEYS[] = {"cells", "settle", "until",   "every",  "snapshots",
                                       "lags",  "seed",   "windows", "record", "visible"};

/* ---- values -----------------------------------------------------------------------------------
 */

void tarry_run_find(const tarry_builder *builder, const tarry_node *run, const char *key,
                    tarry_run_value *value) {
    memset(value, 0, sizeof *value);
    value->node = tarry_node_get(run, key);
    for (size_t i = 0; i < builder->n_overrides; i++) {
        const tarry_override *given = &builder->overrides[i];
        if (given->is_parameter || strcmp(given->name, key) != 0)
            continue;
        value->given = given;
        value->given_node.kind = TARRY_NODE_SCALAR;
        value->given_node.text = given->value;
        value->node = &value->given_node;
    }
}

int tarry_run_context(const tarry_run_value *value, int code, tarry_error *error) {
    if (code != 0 && value->given != NULL)
        tarry_error_context(error, "%s %s", value->given->option, value->given->value);
    return code;
}

int tarry_run_map(const tarry_builder *builder, const tarry_node **run, tarry_error *error) {
    static const tarry_node none = {.kind = TARRY_NODE_MAP};
    *run = tarry_node_get(builder->root, "run");
    if (*run == NULL)
        *run = &none;
    return tarry_expect_keys(*run, "'run'", RUN_KEYS, sizeof RUN_KEYS / sizeof *RUN_KEYS, error);
}

int tarry_run_split(tarry_arena *arena, const tarry_node *scalar, tarry_node *list,
                    tarry_error *error) {
    const size_t most = strlen(scalar->text) + 1;
    tarry_entry *entries = tarry_arena_calloc(arena, most, sizeof *entries);
    tarry_node *nodes = tarry_arena_calloc(arena, most, sizeof *nodes);
    if (entries == NULL || nodes == NULL)
        return tarry_fail_memory(error, "a value of the run");
    int depth = 0;
    *list = (tarry_node){.kind = TARRY_NODE_LIST, .place = scalar->place, .entries = entries};
    const char *from = scalar->text;
    for (const char *at = from;; at++) {
        depth += (*at == '(') - (*at == ')');
        if (*at != '\0' && (*at != ',' || depth > 0))
            continue;
        nodes[list->n] = (tarry_node){.kind = TARRY_NODE_SCALAR, .place = scalar->place};
        nodes[list->n].text = tarry_arena_text(arena, from, (size_t)(at - from));
        if (nodes[list->n].text == NULL)
            return tarry_fail_memory(error, "a value of the run");
        entries[list->n] = (tarry_entry){NULL, scalar->place, &nodes[list->n]};
        list->n++;
        from = at + 1;
        if (*at == '\0')
            return 0;
    }
}

/* ---- cells and seed ----------------------------------------------------------------------------
 */

static int read_cells(tarry_builder *builder, const tarry_node *run, tarry_error *error) {
    tarry_run_value value;
    double cells = DEFAULT_CELLS;
    int code = 0;
    tarry_run_find(builder, run, "cells", &value);
    if (value.node != NULL)
        code = tarry_expect_count(value.node, "'cells'", 1, MOST_CELLS, &cells, error);
    builder->network->run.cells = (int64_t)cells;
    return tarry_run_context(&value, code, error);
}

static int read_seed(tarry_builder *builder, const tarry_node *run, tarry_error *error) {
    tarry_run_value value;
    int64_t seed = DEFAULT_SEED;
    int code = 0;
    tarry_run_find(builder, run, "seed", &value);
    if (value.node != NULL) {
        code = tarry_expect_scalar(value.node, "'seed'", error);
        const char *text = value.node->text;
        if (code == 0 &&
            (tarry_integer_read(text, strlen(text), &seed) != TARRY_NUMBER_OK || seed < 0))
            code = tarry_fail_at(error, TARRY_INPUT, value.node->place,
                                 "'seed' must be a whole number from 0 to 9223372036854775807, not "
                                 "'%s'",
                                 text);
    }
    builder->network->run.seed = (uint64_t)seed;
    return tarry_run_context(&value, code, error);
}

int tarry_read_run(tarry_builder *builder, tarry_error *error) {
    const tarry_node *run = NULL;
    int code = tarry_run_map(builder, &run, error);
    if (code == 0)
        code = read_cells(builder, run, error);
    if (code == 0)
        code = read_seed(builder, run, error);
    if (code == 0)
        code = tarry_read_times(builder, run, error);
    if (code == 0)
        code = tarry_read_windows(builder, run, error);
    if (code == 0)
        code = tarry_read_record(builder, run, error);
    if (code == 0)
        code = tarry_read_visible(builder, run, error);
    if (code == 0)
        code = tarry_read_limits(builder, error);
    return code;
}
