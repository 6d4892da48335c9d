/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "exact/measure.h"

#include "exact/delayed.h"
#include "exact/gauss.h"

#include "base/error.h"
#include "base/memory.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

enum { ORDER = TARRY_GAUSS };

static const double negligible = 1e-18;

void tarry_measure_release(tarry_measure *measure) {
    free(measure->at);
    free(measure->weight);
    tarry_curve_release(&measure->density);
    *measure = (tarry_measure){0};
}

/* ---- from laws ------------------------------------------------------------------------------- */

static int keep_values(tarry_measure *m, const double *at, const double *weight, size_t n,
                       tarry_error *error) {
    m->at = tarry_calloc(n, sizeof *m->at);
    m->weight = tarry_calloc(n, sizeof *m->weight);
    if (m->at == NULL || m->weight == NULL)
        return tarry_fail_memory(error, "a delay");
    memcpy(m->at, at, n * sizeof *at);
    memcpy(m->weight, weight, n * sizeof *weight);
    m->n = n;
    return 0;
}

static double density_at(void *context, double x) {
    const tarry_law *law = context;
    return tarry_law_family_of(law->kind)->density(law, x);
}

/* Densities grow as lags shrink: the error allowed is in probability over the law's own length. */
static int follow_density(tarry_measure *m, const tarry_law *law, tarry_error *error) {
    const double end = tarry_law_quantile(law, 1 - negligible, negligible);
    const double tolerance = TARRY_DELAYED_TOLERANCE / tarry_law_mean(law);
    const double ends[] = {law->a, law->b};
    const double *breaks = ends;
    size_t n = law->kind == TARRY_LAW_UNIFORM ? 2 : 0;
    if (law->kind == TARRY_LAW_BINS) {
        breaks = law->points;
        n = law->n + 1;
    }
    tarry_law copy = *law;
    return tarry_curve_init(&m->density, end, breaks, n, tolerance, density_at, &copy, error);
}

typedef struct term_list {
    tarry_curve_term *terms;
    size_t n, capacity;
} term_list;

static int put_term(term_list *s, const tarry_curve *density, double shift, double factor) {
    if (density->n == 0)
        return 0;
    if (tarry_grow((void **)&s->terms, &s->capacity, s->n + 1, sizeof *s->terms) != 0)
        return 1;
    s->terms[s->n++] = (tarry_curve_term){density, shift, factor};
    return 0;
}

static int build_density(const term_list *s, double scale, tarry_curve *out, tarry_error *error) {
    return tarry_curve_sum(s->terms, s->n, INFINITY, TARRY_DELAYED_TOLERANCE / scale, out, error);
}

typedef struct value {
    double at, weight;
} value;

static int compare_values(const void *one, const void *other) {
    const value *a = one, *b = other;
    return (a->at > b->at) - (a->at < b->at);
}

/* Sorted, equal ones put together. */
static int keep_sorted(tarry_measure *m, value *values, size_t n, tarry_error *error) {
    if (n == 0)
        return 0;
    m->at = tarry_calloc(n, sizeof *m->at);
    m->weight = tarry_calloc(n, sizeof *m->weight);
    if (m->at == NULL || m->weight == NULL)
        return tarry_fail_memory(error, "a delay");
    qsort(values, n, sizeof *values, compare_values);
    for (size_t i = 0; i < n; i++) {
        if (m->n > 0 && values[i].at == m->at[m->n - 1])
            m->weight[m->n - 1] += values[i].weight;
        else {
            m->at[m->n] = values[i].at;
            m->weight[m->n++] = values[i].weight;
        }
    }
    return 0;
}

static int mix(tarry_measure *m, const tarry_law *law, tarry_error *error) {
    tarry_measure *parts = tarry_calloc(law->n, sizeof *parts);
    term_list sum = {0};
    size_t n = 0, k = 0;
    int code = parts == NULL ? tarry_fail_memory(error, "a delay") : 0;
    for (size_t i = 0; code == 0 && i < law->n; i++) {
        code = tarry_measure_init(&parts[i], &law->parts[i], error);
        n += parts[i].n;
        if (code == 0 && put_term(&sum, &parts[i].density, 0, law->weights[i]) != 0)
            code = tarry_fail_memory(error, "a delay");
    }
    value *values = tarry_calloc(n, sizeof *values);
    if (code == 0 && values == NULL)
        code = tarry_fail_memory(error, "a delay");
    for (size_t i = 0; code == 0 && i < law->n; i++)
        for (size_t j = 0; j < parts[i].n; j++)
            values[k++] = (value){parts[i].at[j], parts[i].weight[j] * law->weights[i]};
    if (code == 0)
        code = keep_sorted(m, values, n, error);
    if (code == 0)
        code = build_density(&sum, tarry_law_mean(law), &m->density, error);
    for (size_t i = 0; parts != NULL && i < law->n; i++)
        tarry_measure_release(&parts[i]);
    free(parts);
    free(sum.terms);
    free(values);
    return code;
}

/* One after another: values meet values, values move densities, and densities are folded by the
 * part's own law. */
static int follow_on(tarry_measure *m, const tarry_measure *before, const tarry_measure *part,
                     double scale, tarry_error *error) {
    term_list sum = {0};
    int code = 0;
    value *values = tarry_calloc(before->n * part->n, sizeof *values);
    if (values == NULL)
        return tarry_fail_memory(error, "a delay");
    for (size_t i = 0; i < before->n; i++)
        for (size_t j = 0; j < part->n; j++)
            values[i * part->n + j] = (value){before->at[i] + part->at[j],
                                              before->weight[i] * part->weight[j]};
    code = keep_sorted(m, values, before->n * part->n, error);
    free(values);
    for (size_t i = 0; code == 0 && i < before->n; i++)
        if (put_term(&sum, &part->density, before->at[i], before->weight[i]) != 0)
            code = tarry_fail_memory(error, "a delay");
    for (size_t j = 0; code == 0 && j < part->n; j++)
        if (put_term(&sum, &before->density, part->at[j], part->weight[j]) != 0)
            code = tarry_fail_memory(error, "a delay");
    if (code == 0)
        code = build_density(&sum, scale, &m->density, error);
    free(sum.terms);
    return code;
}

typedef struct folded {
    const tarry_curve *one, *other, *rest;
} folded;

static double fold_at(void *context, double x) {
    const folded *f = context;
    return tarry_curve_product(f->one, f->other, x, -1, 0, x) + tarry_curve_value(f->rest, x, x);
}

/* Two densities one after another, added to what stands. */
static int fold(tarry_measure *m, const tarry_curve *one, const tarry_curve *other, double scale,
                tarry_error *error) {
    if (one->n == 0 || other->n == 0)
        return 0;
    tarry_curve rest = m->density;
    const size_t n = one->n_breaks * other->n_breaks + rest.n_breaks;
    double *breaks = tarry_calloc(n, sizeof *breaks);
    folded f = {one, other, &rest};
    size_t k = 0;
    m->density = (tarry_curve){0};
    int code = breaks == NULL ? tarry_fail_memory(error, "a delay") : 0;
    for (size_t i = 0; code == 0 && i < one->n_breaks; i++)
        for (size_t j = 0; j < other->n_breaks; j++)
            breaks[k++] = one->breaks[i] + other->breaks[j];
    for (size_t i = 0; code == 0 && i < rest.n_breaks; i++)
        breaks[k++] = rest.breaks[i];
    if (code == 0)
        code = tarry_curve_init(
            &m->density,
            fmax(tarry_curve_end(one) + tarry_curve_end(other), tarry_curve_end(&rest)), breaks, n,
            TARRY_DELAYED_TOLERANCE / scale, fold_at, &f, error);
    free(breaks);
    tarry_curve_release(&rest);
    return code;
}

static int total(tarry_measure *m, const tarry_law *law, tarry_error *error) {
    const double scale = tarry_law_mean(law);
    int code = tarry_measure_init(m, &law->parts[0], error);
    for (size_t i = 1; code == 0 && i < law->n; i++) {
        tarry_measure before = *m, part = {0};
        *m = (tarry_measure){0};
        code = tarry_measure_init(&part, &law->parts[i], error);
        if (code == 0)
            code = follow_on(m, &before, &part, scale, error);
        if (code == 0)
            code = fold(m, &before.density, &part.density, scale, error);
        tarry_measure_release(&before);
        tarry_measure_release(&part);
    }
    return code;
}

int tarry_measure_init(tarry_measure *measure, const tarry_law *law, tarry_error *error) {
    static const double one = 1;
    switch (law->kind) {
    case TARRY_LAW_FIXED:
        return keep_values(measure, &law->a, &one, 1, error);
    case TARRY_LAW_VALUES:
        return keep_values(measure, law->points, law->weights, law->n, error);
    case TARRY_LAW_MIX:
        return mix(measure, law, error);
    case TARRY_LAW_TOTAL:
        return total(measure, law, error);
    default:
        return follow_density(measure, law, error);
    }
}

/* ---- integrals ------------------------------------------------------------------------------- */

/* Over one stretch on which everything is smooth. */
static double integrate(const tarry_curve *weight, double from, double to,
                        tarry_curve_function *function, void *context) {
    const double half = 0.5 * (to - from), middle = 0.5 * (from + to);
    double sum = 0;
    for (int i = 0; i < ORDER; i++) {
        const double x = middle + half * tarry_gauss_node[i];
        sum += tarry_gauss_weight[i] * tarry_curve_value(weight, x, x) * function(context, x);
    }
    return half * sum;
}

/* The nearest of the bends after x, or `to`. */
static double next_bend(double x, double to, const double *bends, size_t n) {
    for (size_t i = 0; i < n; i++)
        if (bends[i] > x && bends[i] < to)
            to = bends[i];
    return to;
}

double tarry_measure_mean(const tarry_measure *measure, double least, const double *bends, size_t n,
                          tarry_curve_function *function, void *context) {
    const tarry_curve *density = &measure->density;
    double sum = 0;
    for (size_t i = 0; i < measure->n; i++)
        if (measure->at[i] >= least)
            sum += measure->weight[i] * function(context, measure->at[i]);
    for (size_t i = 0; i < density->n; i++) {
        double x = fmax(density->bounds[i], least);
        while (x < density->bounds[i + 1]) {
            const double to = next_bend(x, density->bounds[i + 1], bends, n);
            sum += integrate(density, x, to, function, context);
            x = to;
        }
    }
    return sum;
}

double tarry_measure_most(const tarry_measure *measure) {
    const double last = measure->n > 0 ? measure->at[measure->n - 1] : 0;
    return fmax(last, tarry_curve_end(&measure->density));
}
