/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Paths in elementary steps.
 *
 * A lag made of X1, then X2, ... that is met at a random moment of the steady state is met within
 * part i with probability mean(Xi)/sum of means; its age then is that of part i, and the parts
 * before it are over: they were drawn from their own laws (renewal theory, common practice). A mix
 * of lags is met within part i with probability share times mean(Xi), made to add up to 1. */

#include "model/analysis_flow.h"

#include <string.h>

enum { MOST_PATHS = 64 }; /* of one product */

typedef struct splitter {
    tarry_flow_product *product;
    tarry_arena *arena;
    tarry_flow_step done[TARRY_FLOW_STEPS];
    bool short_of_memory;
} splitter;

/* What is still to be split. */
typedef struct rest {
    tarry_flow_step steps[TARRY_FLOW_STEPS];
    size_t n;
} rest;

static void split(splitter *s, size_t n_done, const rest *todo, double weight);

static bool has_total(const tarry_law *law) {
    if (law->kind == TARRY_LAW_TOTAL)
        return true;
    for (size_t i = 0; i < law->n && law->kind == TARRY_LAW_MIX; i++)
        if (has_total(&law->parts[i]))
            return true;
    return false;
}

static void keep(splitter *s, size_t n, double weight) {
    tarry_flow_product *p = s->product;
    if (p->n_paths == MOST_PATHS) {
        p->why = "it is made in too many ways";
        return;
    }
    tarry_flow_step *steps = tarry_arena_calloc(s->arena, n, sizeof *steps);
    if (!steps || tarry_arena_grow(s->arena, (void **)&p->paths, &p->paths_capacity, p->n_paths + 1,
                                   sizeof *p->paths)) {
        s->short_of_memory = true;
        return;
    }
    memcpy(steps, s->done, n * sizeof *steps);
    p->paths[p->n_paths++] = (tarry_flow_path){steps, n, weight};
}

/* The first step of `todo` gives way to some parts of its law: those before `last` as a whole, and
 * `last` as `kind`. */
static void replace(splitter *s, size_t n_done, const rest *todo, const tarry_law *first,
                    size_t n_before, const tarry_law *last, tarry_flow_kind kind, double weight) {
    rest next = {.n = n_before + todo->n};
    if (n_done + next.n > TARRY_FLOW_STEPS) {
        s->product->why = "it is made in too many steps";
        return;
    }
    for (size_t i = 0; i < n_before; i++)
        next.steps[i] = (tarry_flow_step){TARRY_FLOW_WHOLE, &first[i], 0};
    next.steps[n_before] = (tarry_flow_step){kind, last, 0};
    memcpy(next.steps + n_before + 1, todo->steps + 1, (todo->n - 1) * sizeof *todo->steps);
    split(s, n_done, &next, weight);
}

static void split_total(splitter *s, size_t n_done, const rest *todo, double weight) {
    const tarry_law *law = todo->steps[0].law;
    const double mean = tarry_law_mean(law);
    if (todo->steps[0].kind == TARRY_FLOW_WHOLE) {
        replace(s, n_done, todo, law->parts, law->n - 1, &law->parts[law->n - 1], TARRY_FLOW_WHOLE,
                weight);
        return;
    }
    for (size_t i = 0; i < law->n; i++) {
        const double share = tarry_law_mean(&law->parts[i]) / mean;
        if (share > 0)
            replace(s, n_done, todo, law->parts, i, &law->parts[i], TARRY_FLOW_REMAINING,
                    weight * share);
    }
}

static void split_mix(splitter *s, size_t n_done, const rest *todo, double weight) {
    const tarry_flow_step step = todo->steps[0];
    const double mean = tarry_law_mean(step.law);
    for (size_t i = 0; i < step.law->n; i++) {
        double share = step.law->weights[i];
        if (step.kind == TARRY_FLOW_REMAINING)
            share *= tarry_law_mean(&step.law->parts[i]) / mean;
        if (share > 0)
            replace(s, n_done, todo, NULL, 0, &step.law->parts[i], step.kind, weight * share);
    }
}

/* Steps 0 .. n_done - 1 are elementary already. */
static void split(splitter *s, size_t n_done, const rest *todo, double weight) {
    const tarry_flow_step *step = todo->steps;
    if (s->short_of_memory || s->product->why)
        return;
    if (todo->n == 0)
        keep(s, n_done, weight);
    else if (step->law && step->law->kind == TARRY_LAW_TOTAL)
        split_total(s, n_done, todo, weight);
    else if (step->law && has_total(step->law))
        split_mix(s, n_done, todo, weight);
    else {
        rest next = {.n = todo->n - 1};
        memcpy(next.steps, todo->steps + 1, next.n * sizeof *next.steps);
        s->done[n_done] = *step;
        split(s, n_done + 1, &next, weight);
    }
}

int tarry_flow_add_path(tarry_flow_product *product, const tarry_flow_step *steps, size_t n_steps,
                        double weight, tarry_arena *arena) {
    splitter s = {.product = product, .arena = arena};
    rest todo = {.n = n_steps};
    if (n_steps > TARRY_FLOW_STEPS) {
        product->why = "it is made in too many steps";
        return 0;
    }
    memcpy(todo.steps, steps, n_steps * sizeof *steps);
    split(&s, 0, &todo, weight);
    return s.short_of_memory;
}
