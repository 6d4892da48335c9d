/* SPDX-License-Identifier: GPL-3.0-or-later */

/* The times of a run. Frames stand at whole multiples of `every`, the last at `until`: that `until`
 * is such a multiple is checked to 1e-9 of it, since 0.1 and its like are no binary fractions, and
 * `every` is then taken to be exactly until / (number of frames - 1). */
#include "model/read_run.h"

#include "base/error.h"
#include "base/number.h"
#include "model/expect.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

enum { DEFAULT_FRAMES = 500 };

static const double MOST_FRAMES = 1e8;
static const double SLACK = 1e-9; /* relative, in what counts as a multiple */

/* A time of the run from the command line or the file; `value` stays as it is where neither gives
 * one. */
static int read_time(tarry_builder *builder, const tarry_run_value *from, const char *what,
                     double *value, tarry_error *error) {
    if (from->node == NULL)
        return 0;
    return tarry_builder_constant_value(builder, from->node, TARRY_TIME, what, value, error);
}

static int fail_time(const tarry_run_value *from, const char *before, double time,
                     const char *after, tarry_error *error) {
    char text[TARRY_NUMBER_SIZE];
    tarry_number_write(time, text);
    return tarry_fail_at(error, TARRY_INPUT, from->node->place, "%s%s%s", before, text, after);
}

/* ---- settle, until, every ----------------------------------------------------------------------
 */

int tarry_read_until(tarry_builder *builder, const tarry_node *run, double *until,
                     tarry_error *error) {
    tarry_run_value from;
    tarry_run_find(builder, run, "until", &from);
    if (from.node == NULL)
        return tarry_fail_at(error, TARRY_INPUT,
                             run->place.line > 0 ? run->place : builder->root->place,
                             "'run' needs 'until', the length of the record, as in run: {until: "
                             "10 h}");
    int code = read_time(builder, &from, "'until'", until, error);
    if (code == 0 && !(*until > 0))
        code = fail_time(&from, "'until' is the length of the record and above 0, not ", *until, "",
                         error);
    return tarry_run_context(&from, code, error);
}

static int read_settle(tarry_builder *builder, const tarry_node *run, tarry_error *error) {
    tarry_run_value from;
    tarry_run_plan *plan = &builder->network->run;
    double settle = 0;
    tarry_run_find(builder, run, "settle", &from);
    plan->settle_auto = from.node != NULL && from.node->kind == TARRY_NODE_SCALAR &&
                        strcmp(from.node->text, "auto") == 0;
    if (plan->settle_auto)
        return 0; /* tarry_settle works it out from the whole network */
    int code = read_time(builder, &from, "'settle'", &settle, error);
    if (code == 0 && settle < 0)
        code = fail_time(&from,
                         "'settle' is the time simulated before the record and not below 0, "
                         "as ",
                         settle, " is", error);
    plan->settle = settle;
    if (code == 0)
        builder->segments.items[0].start = settle > 0 ? -settle : 0;
    return tarry_run_context(&from, code, error);
}

static int fail_every(const tarry_run_value *from, double until, double every, double frames,
                      tarry_error *error) {
    char one[TARRY_NUMBER_SIZE], two[TARRY_NUMBER_SIZE], right[TARRY_NUMBER_SIZE],
        shares[TARRY_NUMBER_SIZE];
    tarry_number_write(until, one);
    tarry_number_write(every, two);
    tarry_number_write(until / frames, right);
    tarry_number_write(frames, shares);
    return tarry_fail_at(error, TARRY_INPUT, from->node->place,
                         "'until' (%s) is no multiple of 'every' (%s); the nearest that fits is "
                         "every: %s, which is until / %s",
                         one, two, right, shares);
}

static int check_every(const tarry_run_value *from, double until, double every, double *frames,
                       tarry_error *error) {
    if (!(every > 0))
        return fail_time(from, "'every' is the time between frames and above 0, not ", every, "",
                         error);
    const double ratio = until / every;
    if (ratio > MOST_FRAMES) {
        char one[TARRY_NUMBER_SIZE], two[TARRY_NUMBER_SIZE], n[TARRY_NUMBER_SIZE];
        tarry_number_write(every, one);
        tarry_number_write(until, two);
        tarry_number_write(floor(ratio) + 1, n);
        return tarry_fail_at(error, TARRY_INPUT, from->node->place,
                             "a frame every %s up to %s makes %s frames; at most 100000000 can "
                             "be recorded, so take a longer 'every'",
                             one, two, n);
    }
    *frames = fmax(round(ratio), 1);
    if (fabs(ratio - *frames) > SLACK * *frames)
        return fail_every(from, until, every, *frames, error);
    return 0;
}

static int read_every(tarry_builder *builder, const tarry_node *run, tarry_error *error) {
    tarry_run_value from, until;
    tarry_run_plan *plan = &builder->network->run;
    double frames = DEFAULT_FRAMES, every = 0;
    int code = 0;
    tarry_run_find(builder, run, "every", &from);
    tarry_run_find(builder, run, "until", &until);
    if (from.node != NULL) {
        code = read_time(builder, &from, "'every'", &every, error);
        if (code == 0)
            code = check_every(&from, plan->until, every, &frames, error);
        code = tarry_run_context(from.given != NULL ? &from : &until, code, error);
    }
    plan->n_frames = (uint32_t)frames + 1;
    plan->every = plan->until / frames;
    return code;
}

/* ---- lags --------------------------------------------------------------------------------------
 */

static int read_lags(tarry_builder *builder, const tarry_node *run, tarry_error *error) {
    tarry_run_value from;
    tarry_run_plan *plan = &builder->network->run;
    double longest = plan->until / 4;
    tarry_run_find(builder, run, "lags", &from);
    const int code = read_time(builder, &from, "'lags'", &longest, error);
    if (code != 0)
        return code;
    if (!(longest >= 0 && longest <= plan->until))
        return fail_time(&from,
                         "'lags' is the longest lag of the autocorrelation and lies between "
                         "0 and 'until', not at ",
                         longest, "", error);
    plan->n_lags = (uint32_t)floor(longest / plan->every * (1 + SLACK)) + 1;
    if (plan->n_lags > plan->n_frames)
        plan->n_lags = plan->n_frames;
    return 0;
}

/* ---- snapshots ---------------------------------------------------------------------------------
 */

static int ascending(const void *one, const void *other) {
    const double a = *(const double *)one, b = *(const double *)other;
    return (a > b) - (a < b);
}

static int read_snapshot(tarry_builder *builder, const tarry_node *node, double *time,
                         tarry_error *error) {
    const tarry_run_value from = {.node = node};
    const int code = read_time(builder, &from, "a snapshot", time, error);
    const double until = builder->network->run.until;
    if (code != 0 || (*time >= 0 && *time <= until))
        return code;
    char one[TARRY_NUMBER_SIZE], two[TARRY_NUMBER_SIZE];
    tarry_number_write(*time, one);
    tarry_number_write(until, two);
    return tarry_fail_at(error, TARRY_INPUT, node->place,
                         "a snapshot at %s lies outside the record, which runs from 0 to %s", one,
                         two);
}

static int fill_snapshots(tarry_builder *builder, const tarry_node *list, tarry_error *error) {
    tarry_run_plan *plan = &builder->network->run;
    double *times = tarry_arena_calloc(builder->arena, list->n, sizeof *times);
    int code = 0;
    if (times == NULL)
        return tarry_fail_memory(error, "the snapshots");
    for (size_t i = 0; code == 0 && i < list->n; i++)
        code = read_snapshot(builder, list->entries[i].node, &times[i], error);
    if (code != 0)
        return code;
    qsort(times, list->n, sizeof *times, ascending);
    plan->n_snapshots = 0;
    for (size_t i = 0; i < list->n; i++)
        if (i == 0 || times[i] > times[i - 1])
            times[plan->n_snapshots++] = times[i];
    plan->snapshots = times;
    return 0;
}

static int read_snapshots(tarry_builder *builder, const tarry_node *run, tarry_error *error) {
    tarry_run_value from;
    tarry_node list = {0};
    int code = 0;
    tarry_run_find(builder, run, "snapshots", &from);
    if (from.node == NULL) {
        double *end = tarry_arena_calloc(builder->arena, 1, sizeof *end);
        if (end == NULL)
            return tarry_fail_memory(error, "the snapshots");
        *end = builder->network->run.until;
        builder->network->run.n_snapshots = 1;
        builder->network->run.snapshots = end;
        return 0;
    }
    if (from.node->kind == TARRY_NODE_SCALAR) {
        code = tarry_run_split(builder->arena, from.node, &list, error);
    } else {
        code = tarry_expect_list(from.node, "'snapshots'", error);
        list = *from.node;
    }
    if (code == 0 && list.n == 0)
        code = tarry_fail_at(error, TARRY_INPUT, list.place,
                             "'snapshots' names no time; leave it out for one at the end");
    if (code == 0)
        code = fill_snapshots(builder, &list, error);
    return tarry_run_context(&from, code, error);
}

/* ---- all ---------------------------------------------------------------------------------------
 */

int tarry_read_times(tarry_builder *builder, const tarry_node *run, tarry_error *error) {
    int code = tarry_read_until(builder, run, &builder->network->run.until, error);
    if (code == 0)
        code = read_settle(builder, run, error);
    if (code == 0)
        code = read_every(builder, run, error);
    if (code == 0)
        code = read_lags(builder, run, error);
    if (code == 0)
        code = read_snapshots(builder, run, error);
    return code;
}
