/* SPDX-License-Identifier: GPL-3.0-or-later */

/* How far the mean of the molecules that come one way is from steady a time t after the start.
 *
 * A molecule counted at t was initiated a time X earlier, X being the sum of the independent steps
 * of its path (analysis_flow.h). With lambda(s) the rate of initiation a time s after the start,
 * and none before it,
 *
 *     mean(t) = weight E[lambda(t - X)],     1 - mean(t)/steady = E[h(t - X)],
 *     h(s) = 1 - lambda(s)/lambda(steady) for s >= 0, 1 for s < 0.
 *
 * Steps are taken in any order. Fixed lags shift t. Exponential and Erlang steps join the moves of
 * the promoter in one linear system v' = A v: u' = d (input - u), u(0) = 1, for each stage of rate
 * d; so w(s) = E[h(s - steps so far)] is a row times exp(A s) v(0), exact. What is left is put on a
 * grid, each bin's mass shared between its ends so that its mean is kept, convolved, and w averaged
 * over it: an error of the order of (width of a bin/width of w)^2, some 1e-6. */

#include "model/analysis_flow.h"

#include "base/error.h"
#include "base/matrix.h"

#include <gsl/gsl_blas.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

enum {
    GRID = 1024,
    MOST_STAGES = 24, /* an Erlang step with more goes onto the grid */
    MOST_STEPS = 128  /* stages of all steps */
};

static const double tail = 1e-12; /* of a law that the grid may miss */

/* ---- a path, sorted by how its steps are treated -------------------------------------------- */

typedef struct sorted {
    double shift;
    size_t n_stages;
    double stage_rates[MOST_STEPS];
    bool
        stage_averages[MOST_STEPS]; /* the last of an Erlang step met within: its stages' average */
    size_t stage_spans[MOST_STEPS]; /* how many stages that step has */
    size_t n_grid;
    tarry_flow_step grid[MOST_STEPS];
    bool full;
} sorted;

static void add_stage(sorted *s, double rate) {
    if (s->n_stages == MOST_STEPS) {
        s->full = true;
        return;
    }
    s->stage_rates[s->n_stages] = rate;
    s->stage_averages[s->n_stages] = false;
    s->stage_spans[s->n_stages++] = 1;
}

static void add_erlang(sorted *s, const tarry_law *law, bool whole) {
    const size_t n = (size_t)law->b;
    if (s->n_stages + n > MOST_STEPS) {
        s->full = true;
        return;
    }
    for (size_t i = 0; i < n; i++)
        add_stage(s, law->b / law->a);
    s->stage_averages[s->n_stages - 1] = !whole;
    s->stage_spans[s->n_stages - 1] = n;
}

static void sort_law(sorted *s, const tarry_law *law, tarry_flow_kind kind) {
    const bool whole = kind == TARRY_FLOW_WHOLE;
    if (tarry_law_mean(law) <= 0)
        return;
    if (law->kind == TARRY_LAW_FIXED && whole)
        s->shift += law->a;
    else if (law->kind == TARRY_LAW_EXPONENTIAL)
        add_stage(s, 1 / law->a);
    else if (law->kind == TARRY_LAW_ERLANG && law->b <= MOST_STAGES)
        add_erlang(s, law, whole);
    else if (s->n_grid < MOST_STEPS)
        s->grid[s->n_grid++] = (tarry_flow_step){kind, law, 0};
    else
        s->full = true;
}

static void sort_path(const tarry_flow_path *path, sorted *s) {
    s->shift = 0;
    s->n_stages = s->n_grid = 0;
    s->full = false;
    for (size_t i = 0; i < path->n_steps; i++) {
        const tarry_flow_step *step = &path->steps[i];
        if (step->kind == TARRY_FLOW_DECAY)
            add_stage(s, step->rate);
        else
            sort_law(s, step->law, step->kind);
    }
}

/* ---- promoter and stages as one linear system ----------------------------------------------- */

/* v' = a v; w(s) = row . v(s). */
typedef struct chain {
    size_t n;
    double *memory;
    gsl_matrix a, exponential, room;
    gsl_vector v, next, row;
} chain;

static void chain_release(chain *c) {
    free(c->memory);
}

/* Room for the matrices and vectors, all 0. */
static int chain_allocate(chain *c) {
    const size_t n = c->n, square = n * n;
    double *at = c->memory = tarry_calloc(3 * square + 3 * n, sizeof *at);
    if (!at)
        return 1;
    c->a = gsl_matrix_view_array(at, n, n).matrix;
    c->exponential = gsl_matrix_view_array(at + square, n, n).matrix;
    c->room = gsl_matrix_view_array(at + 2 * square, n, n).matrix;
    c->v = gsl_vector_view_array(at + 3 * square, n).vector;
    c->next = gsl_vector_view_array(at + 3 * square + n, n).vector;
    c->row = gsl_vector_view_array(at + 3 * square + 2 * n, n).vector;
    return 0;
}

/* The promoter, where it is not steady: v begins with the chances of its states. */
static void chain_add_promoter(chain *c, const tarry_flow *flow, double rate) {
    for (size_t i = 0; i < flow->n_states; i++) {
        for (size_t k = 0; k < flow->n_states; k++) {
            *gsl_matrix_ptr(&c->a, k, i) += flow->moves[i * flow->n_states + k];
            *gsl_matrix_ptr(&c->a, i, i) -= flow->moves[i * flow->n_states + k];
        }
        gsl_vector_set(&c->v, i, flow->start[i]);
        gsl_vector_set(&c->row, i, 1 - flow->initiation[i] / rate);
    }
}

static int chain_init(chain *c, const tarry_flow *flow, const sorted *s, double rate) {
    const size_t n_states = flow->steady ? 0 : flow->n_states;
    c->n = n_states + s->n_stages;
    if (c->n == 0)
        return 0;
    if (chain_allocate(c))
        return 1;
    if (n_states > 0)
        chain_add_promoter(c, flow, rate);
    for (size_t i = 0; i < s->n_stages; i++) {
        const size_t at = n_states + i;
        for (size_t k = 0; k < at; k++)
            gsl_matrix_set(&c->a, at, k, s->stage_rates[i] * gsl_vector_get(&c->row, k));
        gsl_matrix_set(&c->a, at, at, -s->stage_rates[i]);
        gsl_vector_set(&c->v, at, 1);
        gsl_vector_set_zero(&c->row);
        const size_t span = s->stage_averages[i] ? s->stage_spans[i] : 1;
        for (size_t k = 0; k < span; k++)
            gsl_vector_set(&c->row, at - k, 1 / (double)span);
    }
    return 0;
}

/* exp(a time) into `exponential`. */
static int chain_exponential(chain *c, double time) {
    return c->n == 0 ? 0 : tarry_matrix_exponential(&c->a, time, &c->exponential, &c->room);
}

static int chain_step(chain *c) {
    if (c->n == 0)
        return 0;
    const int status = gsl_blas_dgemv(CblasNoTrans, 1, &c->exponential, &c->v, 0, &c->next);
    gsl_vector_memcpy(&c->v, &c->next);
    return status;
}

static double chain_value(const chain *c) {
    double value = 0;
    for (size_t i = 0; i < c->n; i++)
        value += gsl_vector_get(&c->row, i) * gsl_vector_get(&c->v, i);
    return value;
}

/* ---- steps on a grid ------------------------------------------------------------------------ */

/* The length beyond which the step has next to no mass. */
static double step_most(const tarry_flow_step *step) {
    const double most = tarry_law_most(step->law);
    double x = isfinite(most) ? most : tarry_law_quantile(step->law, 1 - tail, tail);
    const double mean = tarry_law_mean(step->law);
    while (step->kind == TARRY_FLOW_REMAINING && x < most && x < 1e6 * mean &&
           mean - tarry_law_survival_integral(step->law, x) > tail * mean)
        x *= 1.25;
    return fmin(x, most);
}

/* Masses of the step at 0, h, ..., GRID h: each bin's mass is put onto its ends so that its mean is
 * kept. Within a bin the survival of a lag that is met is taken as straight. */
static void step_masses(const tarry_flow_step *step, double h, double *mass) {
    const bool whole = step->kind == TARRY_FLOW_WHOLE;
    const double mean = tarry_law_mean(step->law);
    double survival = tarry_law_survival(step->law, 0);
    double integral = 0;
    memset(mass, 0, (GRID + 2) * sizeof *mass);
    mass[0] = whole ? 1 - survival : 0;
    for (size_t k = 0; k <= GRID; k++) {
        const double x = (double)(k + 1) * h;
        const double survival_after = tarry_law_survival(step->law, x);
        const double integral_after = tarry_law_survival_integral(step->law, x);
        const double area = (integral_after - integral) / h;
        const double drop = survival - survival_after;
        const double bin = whole ? drop : area * h / mean;
        const double moment = whole ? area - survival_after : (area / 2 - drop / 12) * h / mean;
        mass[k] += bin - moment;
        mass[k + 1] += moment;
        survival = survival_after;
        integral = integral_after;
    }
}

static void convolve(const double *one, const double *other, double *out) {
    for (size_t k = 0; k <= GRID; k++) {
        double sum = 0;
        for (size_t j = 0; j <= k; j++)
            sum += one[j] * other[k - j];
        out[k] = sum;
    }
}

/* Masses of all grid steps together; `room` holds 3 (GRID + 2). Returns the array with the result.
 */
static const double *grid_masses(const sorted *s, double h, double *room) {
    double *all = room, *one = room + (GRID + 2), *next = room + 2 * (size_t)(GRID + 2);
    step_masses(&s->grid[0], h, all);
    for (size_t i = 1; i < s->n_grid; i++) {
        step_masses(&s->grid[i], h, one);
        convolve(all, one, next);
        double *swap = all;
        all = next;
        next = swap;
    }
    return all;
}

/* E[w(t - grid steps)]. */
static int average_over_grid(chain *c, const sorted *s, double t, double *room, double *out) {
    double most = 0;
    for (size_t i = 0; i < s->n_grid; i++)
        most += step_most(&s->grid[i]);
    const bool whole = most >= t;
    const double h = (whole ? t : most) / GRID;
    const double *mass = grid_masses(s, h, room);
    int status = chain_exponential(c, whole ? 0 : t - most);
    if (!status)
        status = chain_step(c);
    if (!status)
        status = chain_exponential(c, h);
    double sum = 0, total = 0;
    for (size_t k = GRID + 1; k-- > 0 && !status;) {
        const double w = chain_value(c);
        /* at the start itself w jumps from 1 */
        sum += mass[k] * (whole && k == GRID ? (1 + w) / 2 : w);
        total += mass[k];
        status = chain_step(c);
    }
    *out = sum + fmax(0, 1 - total);
    return status;
}

/* ---- the whole ------------------------------------------------------------------------------ */

int tarry_flow_deficit(const tarry_flow *flow, const tarry_flow_path *path, double rate, double t,
                       double *deficit, bool *too_long, tarry_error *error) {
    sorted *s = tarry_calloc(1, sizeof *s);
    double *room = tarry_calloc(3, (GRID + 2) * sizeof *room);
    chain c = {0};
    int status = 0;
    *deficit = 1;
    int code = s && room ? 0 : tarry_fail_memory(error, "the steps to a mean");
    if (!code) {
        sort_path(path, s);
        t -= s->shift;
        *too_long = s->full;
        if (chain_init(&c, flow, s, rate))
            code = tarry_fail_memory(error, "the steps to a mean");
    }
    if (!code && t >= 0 && !s->full) {
        if (s->n_grid > 0 && t > 0) {
            status = average_over_grid(&c, s, t, room, deficit);
        } else if (s->n_grid == 0) {
            status = chain_exponential(&c, t);
            status = status ? status : chain_step(&c);
            *deficit = chain_value(&c);
        }
    }
    chain_release(&c);
    free(room);
    free(s);
    if (!code && (status || !isfinite(*deficit)))
        code = tarry_fail(error, TARRY_NUMERIC, "the mean at the start of the record failed");
    return code;
}
