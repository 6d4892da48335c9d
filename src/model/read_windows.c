/* SPDX-License-Identifier: GPL-3.0-or-later */

/* A window is a stretch of the record for which figures are made. The engine counts in spans, the
 * stretches between neighbouring bounds of windows, so that windows may overlap. Without `windows:`
 * there is one, `all`, or where protocol steps fall within the record `w1`, `w2`, ... between them;
 * a ramp is one window. */
#include "model/read_run.h"

#include "base/error.h"
#include "base/notes.h"
#include "base/number.h"
#include "model/expect.h"

#include <math.h>
#include <stdlib.h>

enum { MOST_BY_DEFAULT = 20 };

/* ---- what is wrong -----------------------------------------------------------------------------
 */

static int fail_window(const tarry_entry *entry, double from, double to, double until,
                       tarry_error *error) {
    char one[TARRY_NUMBER_SIZE], two[TARRY_NUMBER_SIZE], end[TARRY_NUMBER_SIZE];
    tarry_number_write(from, one);
    tarry_number_write(to, two);
    tarry_number_write(until, end);
    return tarry_fail_at(error, TARRY_INPUT, entry->node->place,
                         "the window '%s' runs from %s to %s; it must begin before it ends, and "
                         "lie within the record, from 0 to %s",
                         entry->key, one, two, end);
}

/* ---- windows -----------------------------------------------------------------------------------
 */

static int read_bound(tarry_builder *builder, const tarry_node *node, double *time,
                      tarry_error *error) {
    return tarry_builder_constant_value(builder, node, TARRY_TIME, "a window's bound", time, error);
}

static int read_window(tarry_builder *builder, const tarry_entry *entry, tarry_window *window,
                       tarry_error *error) {
    const double until = builder->network->run.until;
    int code = tarry_builder_check_name(entry->key, entry->place, "a window", error);
    if (code == 0)
        code = tarry_expect_list(entry->node, "a window", error);
    if (code == 0 && entry->node->n != 2)
        code = tarry_fail_at(error, TARRY_INPUT, entry->node->place,
                             "a window is two times, as in %s: [0, 60 min]; here stand %zu",
                             entry->key, entry->node->n);
    if (code == 0)
        code = read_bound(builder, entry->node->entries[0].node, &window->from, error);
    if (code == 0)
        code = read_bound(builder, entry->node->entries[1].node, &window->to, error);
    if (code == 0 && !(window->from >= 0 && window->from < window->to && window->to <= until))
        code = fail_window(entry, window->from, window->to, until, error);
    window->name = entry->key;
    return code;
}

static int read_named(tarry_builder *builder, const tarry_node *map, tarry_window *windows,
                      tarry_error *error) {
    int code = 0;
    for (size_t i = 0; code == 0 && i < map->n; i++)
        code = read_window(builder, &map->entries[i], &windows[i], error);
    return code;
}

/* Where a window of the protocol begins: at a step, at both ends of a ramp. */
static bool parts_windows(const tarry_builder *builder, size_t segment) {
    const tarry_segment *segments = builder->segments.items;
    return segments[segment].moment != TARRY_MOMENT_RAMP_PART && segments[segment].start > 0 &&
           segments[segment].start < builder->network->run.until;
}

static size_t count_default(const tarry_builder *builder) {
    size_t n = 1;
    for (size_t i = 1; i < builder->segments.n; i++)
        n += parts_windows(builder, i);
    return n;
}

/* Windows between the steps of the protocol, or the whole record where there are none or too many.
 * `windows` has room for count_default. */
static int make_default(tarry_builder *builder, const tarry_node *run, tarry_window *windows,
                        uint32_t *n, tarry_error *error) {
    const double until = builder->network->run.until;
    const size_t most = *n;
    double from = 0;
    *n = 1;
    windows[0] = (tarry_window){.name = "all", .from = 0, .to = until};
    if (most > MOST_BY_DEFAULT)
        return tarry_notes_add(&builder->model->notes, run->place, error,
                               "the protocol would part the record into %zu windows; above %d "
                               "there is one, 'all'. Name those you want under 'windows'.",
                               most, (int)MOST_BY_DEFAULT);
    if (most == 1)
        return 0;
    *n = 0;
    for (size_t i = 1; i <= builder->segments.n; i++) {
        const bool last = i == builder->segments.n;
        const double to = last ? until : builder->segments.items[i].start;
        if (!last && !parts_windows(builder, i))
            continue;
        windows[*n] = (tarry_window){.from = from, .to = to};
        windows[*n].name = tarry_arena_format(builder->arena, "w%u", (unsigned)*n + 1);
        if (windows[(*n)++].name == NULL)
            return tarry_fail_memory(error, "the windows");
        from = to;
    }
    return 0;
}

/* ---- spans and frames --------------------------------------------------------------------------
 */

static int ascending(const void *one, const void *other) {
    const double a = *(const double *)one, b = *(const double *)other;
    return (a > b) - (a < b);
}

static uint32_t find_bound(const double *bounds, uint32_t n, double time) {
    uint32_t low = 0, high = n;
    while (low < high) {
        const uint32_t middle = low + (high - low) / 2;
        if (bounds[middle] < time)
            low = middle + 1;
        else
            high = middle;
    }
    return low;
}

static int make_spans(tarry_builder *builder, tarry_window *windows, uint32_t n_windows,
                      tarry_error *error) {
    tarry_run_plan *plan = &builder->network->run;
    const size_t most = 2 * (size_t)n_windows + 2;
    double *bounds = tarry_arena_calloc(builder->arena, most, sizeof *bounds);
    if (bounds == NULL)
        return tarry_fail_memory(error, "the windows");
    for (uint32_t i = 0; i < n_windows; i++) {
        bounds[2 * (size_t)i] = windows[i].from;
        bounds[2 * (size_t)i + 1] = windows[i].to;
    }
    bounds[most - 2] = 0;
    bounds[most - 1] = plan->until;
    qsort(bounds, most, sizeof *bounds, ascending);
    uint32_t n = 0;
    for (size_t i = 0; i < most; i++)
        if (i == 0 || bounds[i] > bounds[i - 1])
            bounds[n++] = bounds[i];
    plan->bounds = bounds;
    plan->n_spans = n - 1;
    for (uint32_t i = 0; i < n_windows; i++)
        windows[i].spans = (tarry_range){find_bound(bounds, n, windows[i].from),
                                         find_bound(bounds, n, windows[i].to)};
    return 0;
}

/* The time of a frame, as the engine has it. */
static double frame_time(const tarry_run_plan *plan, uint32_t frame) {
    return frame + 1 == plan->n_frames ? plan->until : frame * plan->every;
}

/* The first frame at or after `time`, or after it where `beyond`. */
static uint32_t find_frame(const tarry_run_plan *plan, double time, bool beyond) {
    uint32_t frame = (uint32_t)fmin(floor(time / plan->every), plan->n_frames);
    while (frame > 0 &&
           (beyond ? frame_time(plan, frame - 1) > time : frame_time(plan, frame - 1) >= time))
        frame--;
    while (frame < plan->n_frames &&
           (beyond ? frame_time(plan, frame) <= time : frame_time(plan, frame) < time))
        frame++;
    return frame;
}

static int by_start(const void *one, const void *other) {
    const tarry_window *a = one, *b = other;
    return ascending(&a->from, &b->from);
}

/* A frame at the end of a window belongs to the window that follows there, where one does. */
static int give_frames(const tarry_run_plan *plan, tarry_arena *arena, tarry_window *windows,
                       uint32_t n, tarry_error *error) {
    tarry_window *sorted = tarry_arena_calloc(arena, n, sizeof *sorted);
    if (sorted == NULL)
        return tarry_fail_memory(error, "the windows");
    for (uint32_t i = 0; i < n; i++)
        sorted[i] = windows[i];
    qsort(sorted, n, sizeof *sorted, by_start);
    for (uint32_t i = 0; i < n; i++) {
        const tarry_window key = {.from = windows[i].to};
        const bool followed = bsearch(&key, sorted, n, sizeof *sorted, by_start) != NULL;
        windows[i].frames.from = find_frame(plan, windows[i].from, false);
        windows[i].frames.to = find_frame(plan, windows[i].to, !followed);
    }
    return 0;
}

/* ---- all ---------------------------------------------------------------------------------------
 */

int tarry_read_windows(tarry_builder *builder, const tarry_node *run, tarry_error *error) {
    tarry_run_plan *plan = &builder->network->run;
    const tarry_node *map = tarry_node_get(run, "windows");
    int code = map != NULL ? tarry_expect_map(map, "'windows'", error) : 0;
    if (code == 0 && map != NULL && map->n == 0)
        code = tarry_fail_at(error, TARRY_INPUT, map->place,
                             "'windows' names no window; leave it out for the whole record");
    if (code != 0)
        return code;
    uint32_t n = map != NULL ? (uint32_t)map->n : (uint32_t)count_default(builder);
    tarry_window *windows = tarry_arena_calloc(builder->arena, n, sizeof *windows);
    if (windows == NULL)
        return tarry_fail_memory(error, "the windows");
    code = map != NULL ? read_named(builder, map, windows, error)
                       : make_default(builder, run, windows, &n, error);
    if (code == 0)
        code = make_spans(builder, windows, n, error);
    if (code == 0)
        code = give_frames(plan, builder->arena, windows, n, error);
    plan->windows = windows;
    plan->n_windows = n;
    return code;
}
