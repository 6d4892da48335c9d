/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "model/protocol_steps.h"

/* An entry is read once, with times relative to its own clock, and placed as often as it happens;
 * so a repeat comes out as the same steps that it would give when written out. */

#include "base/error.h"
#include "base/memory.h"
#include "base/number.h"
#include "model/expect.h"

#include <stdio.h>
#include <stdlib.h>

enum { MOST_PARTS = 10000, MOST_REPEATS = 1000000, MOST_STEPS = 100000, CLOCK_TEXT = 80 };

typedef struct step_reader {
    tarry_builder *builder;
    double until;
    tarry_protocol_steps *steps;
} step_reader;

/* One entry: a step at `from`, or a ramp. */
typedef struct step_entry {
    double from, to;
    const tarry_node *from_node, *to_node;
    const tarry_node *set;
    const tarry_node *ramp;
    uint32_t n_parts;
    int line;
} step_entry;

/* When an entry happens: its clock's 0 on the recorded clock. */
typedef struct step_clock {
    double zero;
    uint32_t repeat; /* from 1; 0: not repeated */
} step_clock;

/* ---- reading one entry ------------------------------------------------------------------------
 */

static bool has_any(const tarry_node *map, const char *const *keys, size_t n) {
    for (size_t i = 0; i < n; i++)
        if (tarry_node_get(map, keys[i]) != NULL)
            return true;
    return false;
}

static int read_time(const step_reader *in, const tarry_node *item, const char *what,
                     const char *key, const tarry_node **node, double *time, tarry_error *error) {
    const int code = tarry_expect_value(item, what, key, node, error);
    return code != 0 ? code
                     : tarry_builder_constant_value(in->builder, *node, TARRY_TIME,
                                                    "the time of a step", time, error);
}

static int read_settings(const tarry_node *item, const char *what, const char *key,
                         const char *example, const tarry_node **settings, tarry_error *error) {
    char quoted[16];
    int code = tarry_expect_value(item, what, key, settings, error);
    snprintf(quoted, sizeof quoted, "'%s'", key);
    if (code == 0)
        code = tarry_expect_map(*settings, quoted, error);
    if (code == 0 && (*settings)->n == 0)
        code = tarry_fail_at(error, TARRY_INPUT, (*settings)->place, "'%s' is empty; name what %s",
                             key, example);
    return code;
}

static int read_ramp(const step_reader *in, const tarry_node *item, step_entry *entry,
                     tarry_error *error) {
    static const char *const keys[] = {"from", "to", "ramp", "steps"};
    const tarry_node *steps = NULL;
    double n = 0;
    int code = tarry_expect_keys(item, "a ramp of the protocol", keys, 4, error);
    if (code == 0)
        code = read_settings(item, "a ramp of the protocol", "ramp",
                             "the ramp changes, as in ramp: {k_open: 0.4}", &entry->ramp, error);
    if (code == 0)
        code = read_time(in, item, "a ramp of the protocol", "from", &entry->from_node,
                         &entry->from, error);
    if (code == 0)
        code = read_time(in, item, "a ramp of the protocol", "to", &entry->to_node, &entry->to,
                         error);
    if (code == 0 && !(entry->to > entry->from))
        code = tarry_fail_at(error, TARRY_INPUT, entry->to_node->place,
                             "a ramp must end after it begins: 'to' must be later than 'from'");
    if (code == 0)
        code = tarry_expect_value(item, "a ramp of the protocol", "steps", &steps, error);
    if (code == 0)
        code = tarry_expect_count(steps, "'steps'", 1, MOST_PARTS, &n, error);
    entry->n_parts = (uint32_t)n;
    return code;
}

static int read_set(const step_reader *in, const tarry_node *item, step_entry *entry,
                    tarry_error *error) {
    static const char *const keys[] = {"at", "set"};
    static const char what[] = "a step of the protocol";
    int code = tarry_expect_keys(item, what, keys, 2, error);
    if (code == 0)
        code = read_time(in, item, what, "at", &entry->from_node, &entry->from, error);
    if (code == 0)
        code = read_settings(item, what, "set", "the step sets, as in set: {k_open: 0.4}",
                             &entry->set, error);
    entry->to = entry->from;
    entry->to_node = entry->from_node;
    return code;
}

static int read_entry(const step_reader *in, const tarry_node *item, step_entry *entry,
                      tarry_error *error) {
    static const char *const ramp[] = {"ramp", "steps", "to"};
    *entry = (step_entry){.line = item->place.line};
    return has_any(item, ramp, 3) ? read_ramp(in, item, entry, error)
                                  : read_set(in, item, entry, error);
}

/* ---- placing it in time -----------------------------------------------------------------------
 */

static int fail_outside(const step_reader *in, const tarry_node *node, double at,
                        const step_clock *clock, tarry_error *error) {
    char one[TARRY_NUMBER_SIZE], two[TARRY_NUMBER_SIZE], which[CLOCK_TEXT] = "";
    tarry_number_write(at, one);
    tarry_number_write(in->until, two);
    if (clock->repeat > 0)
        snprintf(which, sizeof which, " (repeat %u)", (unsigned)clock->repeat);
    return tarry_fail_at(error, TARRY_INPUT, node->place,
                         "a step at %s%s lies outside the record, which runs from 0 to %s "
                         "('until')",
                         one, which, two);
}

static int add_step(step_reader *in, tarry_protocol_step step, const tarry_node *node,
                    tarry_error *error) {
    if (in->steps->n >= MOST_STEPS)
        return tarry_fail_at(error, TARRY_INPUT, node->place,
                             "the protocol comes to more than %d steps; take fewer repeats or "
                             "fewer steps a ramp",
                             MOST_STEPS);
    step.number = in->steps->n;
    return TARRY_APPEND(in->steps, step) == 0 ? 0 : tarry_fail_memory(error, "the protocol");
}

static int place_ramp(step_reader *in, const step_entry *entry, const step_clock *clock,
                      tarry_error *error) {
    tarry_arena *arena = in->builder->arena;
    tarry_protocol_ramp *ramp = tarry_arena_calloc(arena, 1, sizeof *ramp);
    double *lines = tarry_arena_calloc(arena, 2 * entry->ramp->n, sizeof *lines);
    if (ramp == NULL || lines == NULL)
        return tarry_fail_memory(error, "the protocol");
    const double from = clock->zero + entry->from, to = clock->zero + entry->to;
    *ramp = (tarry_protocol_ramp){.values = entry->ramp,
                                  .n = entry->n_parts,
                                  .until = to,
                                  .first = lines,
                                  .last = lines + entry->ramp->n};
    int code = 0;
    for (uint32_t part = 0; code == 0 && part <= ramp->n; part++) {
        tarry_protocol_step step = {.ramp = ramp, .part = part, .line = entry->line};
        step.at = part == ramp->n ? to : from + (to - from) * part / ramp->n;
        code = add_step(in, step, entry->from_node, error);
    }
    return code;
}

static int place_entry(step_reader *in, const step_entry *entry, const step_clock *clock,
                       tarry_error *error) {
    const double from = clock->zero + entry->from, to = clock->zero + entry->to;
    if (!(from >= 0 && from <= in->until))
        return fail_outside(in, entry->from_node, from, clock, error);
    if (!(to <= in->until))
        return fail_outside(in, entry->to_node, to, clock, error);
    if (entry->ramp != NULL)
        return place_ramp(in, entry, clock, error);
    return add_step(in, (tarry_protocol_step){.at = from, .set = entry->set, .line = entry->line},
                    entry->from_node, error);
}

/* ---- repeats ----------------------------------------------------------------------------------
 */

typedef struct repeat_plan {
    double first; /* start of the first */
    double every;
    uint32_t times;
    const tarry_node *list;
} repeat_plan;

static int read_repeat(const step_reader *in, const tarry_node *item, repeat_plan *plan,
                       tarry_error *error) {
    static const char *const keys[] = {"from", "every", "times", "do"};
    static const char what[] = "a repeat of the protocol";
    const tarry_node *from = NULL, *every = NULL, *times = NULL;
    double n = 0;
    int code = tarry_expect_keys(item, what, keys, 4, error);
    if (code == 0)
        code = read_time(in, item, what, "every", &every, &plan->every, error);
    if (code == 0 && !(plan->every > 0))
        code = tarry_fail_number(error, every->place,
                                 "'every' is the time from one repeat to the next and above 0, "
                                 "not ",
                                 plan->every, "");
    if (code == 0 && tarry_node_get(item, "from") != NULL)
        code = read_time(in, item, what, "from", &from, &plan->first, error);
    if (code == 0)
        code = tarry_expect_value(item, what, "times", &times, error);
    if (code == 0)
        code = tarry_expect_count(times, "'times'", 1, MOST_REPEATS, &n, error);
    plan->times = (uint32_t)n;
    if (code == 0)
        code = tarry_expect_value(item, what, "do", &plan->list, error);
    if (code == 0)
        code = tarry_expect_list(plan->list, "'do'", error);
    if (code == 0 && plan->list->n == 0)
        code = tarry_fail_at(error, TARRY_INPUT, plan->list->place,
                             "'do' is empty; list the steps of a repeat, as in do: [{at: 0, set: "
                             "{k_open: 0.4}}]");
    return code;
}

static bool is_repeat(const tarry_node *item) {
    static const char *const repeat[] = {"every", "times", "do"};
    return has_any(item, repeat, 3);
}

static int read_repeated(const step_reader *in, const tarry_node *item, step_entry *entry,
                         tarry_error *error) {
    const int code = tarry_expect_map(item, "a step under 'do'", error);
    if (code != 0)
        return code;
    if (is_repeat(item))
        return tarry_fail_at(error, TARRY_INPUT, item->place,
                             "a repeat cannot stand in another one; write the inner one out, or "
                             "give each its own entry with 'from'");
    return read_entry(in, item, entry, error);
}

static int place_repeat(step_reader *in, const tarry_node *item, tarry_error *error) {
    repeat_plan plan = {0};
    int code = read_repeat(in, item, &plan, error);
    if (code != 0)
        return code;
    step_entry *entries = tarry_calloc(plan.list->n, sizeof *entries);
    if (entries == NULL)
        return tarry_fail_memory(error, "the protocol");
    for (size_t i = 0; code == 0 && i < plan.list->n; i++)
        code = read_repeated(in, plan.list->entries[i].node, &entries[i], error);
    for (uint32_t r = 0; code == 0 && r < plan.times; r++) {
        const step_clock clock = {.zero = plan.first + r * plan.every, .repeat = r + 1};
        for (size_t i = 0; code == 0 && i < plan.list->n; i++)
            code = place_entry(in, &entries[i], &clock, error);
    }
    free(entries);
    return code;
}

/* ---- all --------------------------------------------------------------------------------------
 */

static int place_item(step_reader *in, const tarry_node *item, tarry_error *error) {
    static const char *const keys[] = {"at",    "set",   "from",  "to", "ramp",
                                       "steps", "every", "times", "do"};
    const step_clock recorded = {0};
    step_entry entry;
    int code = tarry_expect_keys(item, "a step of the protocol", keys, 9, error);
    if (code != 0)
        return code;
    if (is_repeat(item))
        return place_repeat(in, item, error);
    code = read_entry(in, item, &entry, error);
    return code == 0 ? place_entry(in, &entry, &recorded, error) : code;
}

/* A ramp's end comes first, so that what begins there finds its last value. */
static int by_time(const void *one, const void *other) {
    const tarry_protocol_step *a = one, *b = other;
    const bool a_ends = a->ramp != NULL && a->part == a->ramp->n;
    const bool b_ends = b->ramp != NULL && b->part == b->ramp->n;
    if (a->at != b->at)
        return a->at < b->at ? -1 : 1;
    if (a_ends != b_ends)
        return a_ends ? -1 : 1;
    return (a->number > b->number) - (a->number < b->number);
}

int tarry_read_protocol_steps(tarry_builder *builder, const tarry_node *list, double until,
                              tarry_protocol_steps *steps, tarry_error *error) {
    step_reader in = {.builder = builder, .until = until, .steps = steps};
    int code = 0;
    for (size_t i = 0; code == 0 && i < list->n; i++)
        code = place_item(&in, list->entries[i].node, error);
    if (code == 0 && steps->n > 0)
        qsort(steps->items, steps->n, sizeof *steps->items, by_time);
    return code;
}
