/* SPDX-License-Identifier: GPL-3.0-or-later */

/* The mean of f(a - D) over a lag D: a shift where D is fixed, a sum over values and mixes, one
 * part after another for a total, and else an integral over the density by Gauss-Legendre
 * quadrature.
 *
 * Panels of that integral lie between quantiles of D, so that the density is smooth on each, and
 * between two of neighbouring size, so that a power at 0 does no harm. A panel is cut where f(a -
 * u) changes its piece. */

#include "exact/delayed.h"

#include "exact/gauss.h"

#include "base/error.h"
#include "base/memory.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

enum { ORDER = TARRY_GAUSS };

static const double negligible = 1e-18; /* probabilities below this are left out */
static const double widest = 4;         /* most ratio of a panel's ends */

/* ---- panels of a density --------------------------------------------------------------------- */

typedef struct panel {
    double from, to;
    double at[ORDER], weight[ORDER]; /* of f(a - at) */
} panel;

typedef struct quadrature {
    const tarry_law *law;
    double loss;
    panel *panels;
    size_t n, capacity;
    double *edges; /* where the density or its slope may jump */
    size_t n_edges;
    const tarry_curve *f;
    tarry_error *error;
} quadrature;

static double weight_at(const quadrature *q, double u) {
    return tarry_law_family_of(q->law->kind)->density(q->law, u) * exp(-q->loss * u);
}

static int add_panel(quadrature *q, double from, double to) {
    if (!(to > from))
        return 0;
    if (tarry_grow((void **)&q->panels, &q->capacity, q->n + 1, sizeof *q->panels) != 0)
        return tarry_fail_memory(q->error, "panels of a delay");
    panel *p = &q->panels[q->n++];
    *p = (panel){.from = from, .to = to};
    for (int i = 0; i < ORDER; i++) {
        p->at[i] = from + 0.5 * (to - from) * (1 + tarry_gauss_node[i]);
        p->weight[i] = 0.5 * (to - from) * tarry_gauss_weight[i] * weight_at(q, p->at[i]);
    }
    return 0;
}

/* Panels from `from` to `to`, each less than `widest` times as far from 0 at its end. */
static int add_panels(quadrature *q, double from, double to) {
    int code = 0;
    while (code == 0 && from > 0 && to > widest * from) {
        code = add_panel(q, from, widest * from);
        from *= widest;
    }
    return code == 0 ? add_panel(q, from, to) : code;
}

static int add_between_quantiles(quadrature *q) {
    static const double tails[] = {1e-18, 1e-15, 1e-12, 1e-9, 1e-7, 1e-5, 1e-4, 1e-3,
                                   5e-3,  0.02,  0.06,  0.12, 0.2,  0.3,  0.4,  0.5};
    enum { N = sizeof tails / sizeof *tails };
    double before = tarry_law_quantile(q->law, tails[0], 1 - tails[0]);
    int code = 0;
    for (int i = 1; code == 0 && i < 2 * N - 1; i++) {
        const double tail = i < N ? tails[i] : tails[2 * N - 2 - i];
        const double next = i < N ? tarry_law_quantile(q->law, tail, 1 - tail)
                                  : tarry_law_quantile(q->law, 1 - tail, tail);
        code = add_panels(q, before, next);
        before = next;
    }
    return code;
}

static int add_edges(quadrature *q, const double *edges, size_t n) {
    q->edges = tarry_calloc(n, sizeof *q->edges);
    if (q->edges == NULL)
        return tarry_fail_memory(q->error, "panels of a delay");
    memcpy(q->edges, edges, n * sizeof *edges);
    q->n_edges = n;
    return 0;
}

static int cut_into_panels(quadrature *q) {
    const tarry_law *law = q->law;
    const double zero = 0, ends[] = {law->a, law->b};
    int code = 0;
    if (law->kind == TARRY_LAW_UNIFORM) {
        code = add_edges(q, ends, 2);
        return code == 0 ? add_panels(q, law->a, law->b) : code;
    }
    if (law->kind == TARRY_LAW_BINS) {
        code = add_edges(q, law->points, law->n + 1);
        for (size_t i = 0; code == 0 && i < law->n; i++)
            if (law->weights[i] > 0)
                code = add_panels(q, law->points[i], law->points[i + 1]);
        return code;
    }
    code = add_edges(q, &zero, 1);
    return code == 0 ? add_between_quantiles(q) : code;
}

static void release(quadrature *q) {
    free(q->panels);
    free(q->edges);
}

/* ---- the integral ---------------------------------------------------------------------------- */

/* From `from` to `to`, over which f(a - u) is one piece. */
static double integrate_part(const quadrature *q, double a, double from, double to) {
    double sum = 0;
    const double half = 0.5 * (to - from);
    for (int i = 0; i < ORDER; i++) {
        const double u = from + half * (1 + tarry_gauss_node[i]);
        sum += tarry_gauss_weight[i] * weight_at(q, u) * tarry_curve_value(q->f, a - u, a - u);
    }
    return half * sum;
}

/* The first of the curve's bounds above x. */
static size_t bound_above(const tarry_curve *f, double x) {
    size_t low = 0, high = f->n + 1;
    while (low < high) {
        const size_t middle = low + (high - low) / 2;
        if (f->bounds[middle] > x)
            high = middle;
        else
            low = middle + 1;
    }
    return low;
}

static double integrate_panel(const quadrature *q, const panel *p, double a) {
    const tarry_curve *f = q->f;
    double sum = 0, to = p->to;
    size_t next = bound_above(f, a - p->to);
    if (next > f->n || f->bounds[next] >= a - p->from) { /* one piece, or beyond the end */
        for (int i = 0; i < ORDER; i++)
            sum += p->weight[i] * tarry_curve_value(f, a - p->at[i], a - p->at[i]);
        return sum;
    }
    for (; next <= f->n && f->bounds[next] < a - p->from; next++) {
        const double cut = a - f->bounds[next];
        sum += integrate_part(q, a, cut, to);
        to = cut;
    }
    return sum + integrate_part(q, a, p->from, to);
}

static double integrate(void *context, double a) {
    const quadrature *q = context;
    double sum = 0;
    for (size_t i = 0; i < q->n && q->panels[i].from < a; i++)
        if (a - q->panels[i].to < tarry_curve_end(q->f))
            sum += integrate_panel(q, &q->panels[i], a);
    return sum;
}

static void release_all(tarry_curve *curves, size_t n) {
    for (size_t i = 0; curves != NULL && i < n; i++)
        tarry_curve_release(&curves[i]);
    free(curves);
}

/* ---- one law --------------------------------------------------------------------------------- */

static int by_fixed(const tarry_law *law, double loss, const tarry_curve *f, double horizon,
                    tarry_curve *out, tarry_error *error) {
    const tarry_curve_term term = {f, law->a, exp(-loss * law->a)};
    return tarry_curve_sum(&term, 1, horizon, TARRY_DELAYED_TOLERANCE, out, error);
}

static int by_values(const tarry_law *law, double loss, const tarry_curve *f, double horizon,
                     tarry_curve *out, tarry_error *error) {
    tarry_curve_term *terms = tarry_calloc(law->n, sizeof *terms);
    if (terms == NULL)
        return tarry_fail_memory(error, "a function of age");
    for (size_t i = 0; i < law->n; i++)
        terms[i] = (tarry_curve_term){f, law->points[i],
                                      law->weights[i] * exp(-loss * law->points[i])};
    const int code = tarry_curve_sum(terms, law->n, horizon, TARRY_DELAYED_TOLERANCE, out, error);
    free(terms);
    return code;
}

static int by_mix(const tarry_law *law, double loss, const tarry_curve *f, double horizon,
                  tarry_curve *out, tarry_error *error) {
    tarry_curve *parts = tarry_calloc(law->n, sizeof *parts);
    tarry_curve_term *terms = tarry_calloc(law->n, sizeof *terms);
    int code = 0;
    if (parts == NULL || terms == NULL)
        code = tarry_fail_memory(error, "a function of age");
    for (size_t i = 0; code == 0 && i < law->n; i++) {
        terms[i] = (tarry_curve_term){&parts[i], 0, law->weights[i]};
        code = tarry_delayed_by(&law->parts[i], loss, f, horizon, &parts[i], error);
    }
    if (code == 0)
        code = tarry_curve_sum(terms, law->n, horizon, TARRY_DELAYED_TOLERANCE, out, error);
    release_all(parts, law->n);
    free(terms);
    return code;
}

static int by_total(const tarry_law *law, double loss, const tarry_curve *f, double horizon,
                    tarry_curve *out, tarry_error *error) {
    tarry_curve before = {0};
    int code = tarry_delayed_by(&law->parts[0], loss, f, horizon, out, error);
    for (size_t i = 1; code == 0 && i < law->n; i++) {
        before = *out;
        *out = (tarry_curve){0};
        code = tarry_delayed_by(&law->parts[i], loss, &before, horizon, out, error);
        tarry_curve_release(&before);
    }
    return code;
}

/* Where the integral may bend: an edge of the density past a break of f. */
static double *bends(const quadrature *q, size_t *n) {
    double *breaks = tarry_calloc(q->n_edges * q->f->n_breaks, sizeof *breaks);
    *n = 0;
    for (size_t i = 0; breaks != NULL && i < q->n_edges; i++)
        for (size_t j = 0; j < q->f->n_breaks; j++)
            breaks[(*n)++] = q->edges[i] + q->f->breaks[j];
    return breaks;
}

static int by_density(const tarry_law *law, double loss, const tarry_curve *f, double horizon,
                      tarry_curve *out, tarry_error *error) {
    quadrature q = {.law = law, .loss = loss, .f = f, .error = error};
    int code = cut_into_panels(&q);
    if (code == 0 && q.n > 0) {
        const double end = fmin(horizon, q.panels[q.n - 1].to + tarry_curve_end(f));
        size_t n = 0;
        double *breaks = bends(&q, &n);
        code = breaks == NULL ? tarry_fail_memory(error, "a function of age")
                              : tarry_curve_init(out, end, breaks, n, TARRY_DELAYED_TOLERANCE,
                                                 integrate, &q, error);
        free(breaks);
    }
    release(&q);
    return code;
}

int tarry_delayed_by(const tarry_law *law, double loss, const tarry_curve *f, double horizon,
                     tarry_curve *out, tarry_error *error) {
    if (f->n == 0)
        return 0;
    switch (law->kind) {
    case TARRY_LAW_FIXED:
        return by_fixed(law, loss, f, horizon, out, error);
    case TARRY_LAW_VALUES:
        return by_values(law, loss, f, horizon, out, error);
    case TARRY_LAW_MIX:
        return by_mix(law, loss, f, horizon, out, error);
    case TARRY_LAW_TOTAL:
        return by_total(law, loss, f, horizon, out, error);
    default:
        return by_density(law, loss, f, horizon, out, error);
    }
}

/* ---- dwells ---------------------------------------------------------------------------------- */

typedef struct dwell {
    const tarry_law *law; /* or NULL: without end */
    double loss;
} dwell;

static double survive(void *context, double a) {
    const dwell *d = context;
    return exp(-d->loss * a) * (d->law != NULL ? tarry_law_survival(d->law, a) : 1);
}

/* The age from which on next to nothing is left. */
static double dwell_end(const tarry_law *law, double loss, double horizon) {
    double end = loss > 0 ? fmin(horizon, -log(negligible) / loss) : horizon;
    if (law != NULL)
        end = fmin(end, tarry_law_quantile(law, 1 - negligible, negligible));
    return end;
}

static int dwell_by_survival(const tarry_law *law, double loss, double horizon, tarry_curve *out,
                             tarry_error *error) {
    dwell d = {law, loss};
    const double end = dwell_end(law, loss, horizon);
    const double pair[] = {law != NULL ? law->a : 0, law != NULL ? law->b : 0};
    const double *breaks = pair;
    size_t n = 0;
    if (law != NULL && (law->kind == TARRY_LAW_BINS || law->kind == TARRY_LAW_VALUES)) {
        breaks = law->points;
        n = law->kind == TARRY_LAW_BINS ? law->n + 1 : law->n;
    } else if (law != NULL && law->kind == TARRY_LAW_UNIFORM) {
        n = 2;
    }
    if (!(end > 0))
        return 0;
    return tarry_curve_init(out, end, breaks, n, TARRY_DELAYED_TOLERANCE, survive, &d, error);
}

/* In some part of a mix, or in the part of a total that follows those before. */
static int dwell_in_parts(const tarry_law *law, double loss, double horizon, tarry_curve *out,
                          tarry_error *error) {
    const tarry_law ahead = {.kind = TARRY_LAW_TOTAL, .parts = law->parts};
    tarry_curve *parts = tarry_calloc(law->n, sizeof *parts);
    tarry_curve_term *terms = tarry_calloc(law->n, sizeof *terms);
    int code = 0;
    if (parts == NULL || terms == NULL)
        code = tarry_fail_memory(error, "a function of age");
    for (size_t i = 0; code == 0 && i < law->n; i++) {
        terms[i] = (tarry_curve_term){&parts[i], 0,
                                      law->kind == TARRY_LAW_MIX ? law->weights[i] : 1};
        code = tarry_delayed_dwell(&law->parts[i], loss, horizon, &parts[i], error);
        if (code != 0 || law->kind == TARRY_LAW_MIX || i == 0)
            continue;
        tarry_curve alone = parts[i];
        tarry_law before = ahead;
        before.n = i;
        parts[i] = (tarry_curve){0};
        code = tarry_delayed_by(&before, loss, &alone, horizon, &parts[i], error);
        tarry_curve_release(&alone);
    }
    if (code == 0)
        code = tarry_curve_sum(terms, law->n, horizon, TARRY_DELAYED_TOLERANCE, out, error);
    release_all(parts, law->n);
    free(terms);
    return code;
}

int tarry_delayed_dwell(const tarry_law *law, double loss, double horizon, tarry_curve *out,
                        tarry_error *error) {
    if (law != NULL && (law->kind == TARRY_LAW_MIX || law->kind == TARRY_LAW_TOTAL))
        return dwell_in_parts(law, loss, horizon, out, error);
    return dwell_by_survival(law, loss, horizon, out, error);
}
