/* SPDX-License-Identifier: GPL-3.0-or-later */

/* `limits:`, which keep a slip in a model from filling the machine. */
#include "model/read_run.h"

#include "base/error.h"
#include "base/number.h"
#include "model/expect.h"

#include <string.h>

static const double DEFAULT_FIRINGS = 1e10, DEFAULT_PENDING = 1e7, DEFAULT_MEMORY = 4e9;

/* Sizes are decimal (IEC 80000-13 keeps kB for 1000 bytes). */
static const struct {
    const char *unit;
    double bytes;
} sizes[] = {{"kB", 1e3}, {"MB", 1e6}, {"GB", 1e9}, {"TB", 1e12}};

/* A number of things, which may be written as 1e10. */
static int read_number(tarry_builder *builder, const tarry_node *map, const char *key,
                       double *value, tarry_error *error) {
    const tarry_node *node = tarry_node_get(map, key);
    if (node == NULL)
        return 0;
    const int code = tarry_builder_constant_value(builder, node, TARRY_PURE, key, value, error);
    if (code != 0 || *value >= 1)
        return code;
    return tarry_fail_at(error, TARRY_INPUT, node->place,
                         "the limit '%s' is a number of 1 or more, as in %s: 1e6", key, key);
}

static int read_memory(const tarry_node *map, double *bytes, tarry_error *error) {
    const tarry_node *node = tarry_node_get(map, "memory");
    if (node == NULL)
        return 0;
    const int code = tarry_expect_scalar(node, "'memory'", error);
    if (code != 0)
        return code;
    const size_t length = tarry_number_prefix(node->text, strlen(node->text));
    const char *unit = node->text + length + strspn(node->text + length, " ");
    double number = 0;
    const bool good = tarry_number_read(node->text, length, &number) == TARRY_NUMBER_OK;
    for (size_t i = 0; good && number > 0 && i < sizeof sizes / sizeof *sizes; i++) {
        if (strcmp(unit, sizes[i].unit) != 0)
            continue;
        *bytes = number * sizes[i].bytes;
        return 0;
    }
    return tarry_fail_at(error, TARRY_INPUT, node->place,
                         "'memory' is a size in kB, MB, GB or TB, as in memory: 4 GB, not '%s'",
                         node->text);
}

int tarry_read_limits(tarry_builder *builder, tarry_error *error) {
    static const char *const keys[] = {"firings", "pending", "memory"};
    static const tarry_node none = {.kind = TARRY_NODE_MAP};
    tarry_run_plan *plan = &builder->network->run;
    const tarry_node *map = tarry_node_get(builder->root, "limits");
    if (map == NULL)
        map = &none;
    plan->limit_firings = DEFAULT_FIRINGS;
    plan->limit_pending = DEFAULT_PENDING;
    plan->limit_memory = DEFAULT_MEMORY;
    int code = tarry_expect_keys(map, "'limits'", keys, sizeof keys / sizeof *keys, error);
    if (code == 0)
        code = read_number(builder, map, "firings", &plan->limit_firings, error);
    if (code == 0)
        code = read_number(builder, map, "pending", &plan->limit_pending, error);
    if (code == 0)
        code = read_memory(map, &plan->limit_memory, error);
    return code;
}
