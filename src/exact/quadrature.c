/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "exact/quadrature.h"

#include "exact/gauss.h"
#include "exact/measure.h"

#include "base/error.h"
#include "base/memory.h"

#include <math.h>
#include <stdlib.h>

enum { MOST = TARRY_QUADRATURE_MOST, BEYOND = 4 };

/* The law as many values with weights, and two orthonormal polynomials at each. */
typedef struct grid {
    size_t n;
    double *at, *weight, *now, *before;
} grid;

/* Of the polynomials: x p_k = beta[k] p_(k-1) + alpha[k] p_k + beta[k + 1] p_(k+1). */
typedef struct recurrence {
    size_t n;
    double alpha[MOST], beta[MOST + 1];
} recurrence;

static void release(grid *g) {
    free(g->at);
    free(g->weight);
    free(g->now);
    free(g->before);
}

/* The density by itself keeps its digits in the tails, where few points reach; curves do not. */
static double density_at(const tarry_law *law, const tarry_measure *m, double x) {
    double (*density)(const tarry_law *, double) = tarry_law_family_of(law->kind)->density;
    return density != NULL ? density(law, x) : fmax(tarry_curve_value(&m->density, x, x), 0);
}

static void add_panel(const tarry_law *law, const tarry_measure *m, double from, double to,
                      grid *g) {
    const double half = 0.5 * (to - from);
    for (int i = 0; i < TARRY_GAUSS; i++) {
        g->at[g->n] = from + half * (1 + tarry_gauss_node[i]);
        g->weight[g->n] = half * tarry_gauss_weight[i] * density_at(law, m, g->at[g->n]);
        g->n++;
    }
}

static int make_grid(const tarry_law *law, const tarry_measure *m, grid *g, tarry_error *error) {
    const size_t n = m->n + (m->density.n + BEYOND) * TARRY_GAUSS;
    g->at = tarry_calloc(n, sizeof *g->at);
    g->weight = tarry_calloc(n, sizeof *g->weight);
    g->now = tarry_calloc(n, sizeof *g->now);
    g->before = tarry_calloc(n, sizeof *g->before);
    if (g->at == NULL || g->weight == NULL || g->now == NULL || g->before == NULL)
        return tarry_fail_memory(error, "an average over cells");
    for (size_t i = 0; i < m->n; i++) {
        g->at[g->n] = m->at[i];
        g->weight[g->n++] = m->weight[i];
    }
    for (size_t k = 0; k < m->density.n; k++)
        add_panel(law, m, m->density.bounds[k], m->density.bounds[k + 1], g);
    const double end = tarry_curve_end(&m->density);
    for (int k = 0; k < BEYOND && m->density.n > 0; k++) /* what the curve leaves out */
        add_panel(law, m, end * (1 + 0.25 * k), end * (1.25 + 0.25 * k), g);
    return 0;
}

/* The mean of x^power p_now^2, over the sum of weights. */
static double mean_of(const grid *g, int power) {
    double sum = 0, all = 0;
    for (size_t i = 0; i < g->n; i++) {
        sum += g->weight[i] * (power > 0 ? g->at[i] : 1) * g->now[i] * g->now[i];
        all += g->weight[i];
    }
    return sum / all;
}

static void find_recurrence(grid *g, size_t n, recurrence *r) {
    double scale = 0;
    for (size_t i = 0; i < g->n; i++) {
        g->now[i] = 1;
        g->before[i] = 0;
    }
    for (r->n = 0; r->n < n;) {
        const size_t k = r->n++;
        r->alpha[k] = mean_of(g, 1);
        scale = fmax(scale, fabs(r->alpha[k]));
        for (size_t i = 0; i < g->n; i++) {
            const double next = (g->at[i] - r->alpha[k]) * g->now[i] - r->beta[k] * g->before[i];
            g->before[i] = g->now[i];
            g->now[i] = next;
        }
        r->beta[k + 1] = sqrt(mean_of(g, 0));
        if (!(r->beta[k + 1] > 1e-9 * scale)) /* the law has no more values */
            return;
        for (size_t i = 0; i < g->n; i++)
            g->now[i] /= r->beta[k + 1];
    }
}

/* Eigenvalues of the Jacobi matrix below x (Sturm sequence). */
static size_t n_below(const recurrence *r, double x) {
    double pivot = 1;
    size_t n = 0;
    for (size_t k = 0; k < r->n; k++) {
        pivot = r->alpha[k] - x - (k > 0 ? r->beta[k] * r->beta[k] / pivot : 0);
        if (pivot == 0)
            pivot = 1e-300;
        n += pivot < 0;
    }
    return n;
}

static double find_point(const recurrence *r, size_t i, double low, double high) {
    for (int k = 0; k < 120; k++) {
        const double middle = 0.5 * (low + high);
        if (n_below(r, middle) > i)
            high = middle;
        else
            low = middle;
    }
    return 0.5 * (low + high);
}

/* 1 / the sum of squares of all polynomials there. */
static double weight_at(const recurrence *r, double x) {
    double before = 0, now = 1, sum = 0;
    for (size_t k = 0; k < r->n; k++) {
        sum += now * now;
        const double next = ((x - r->alpha[k]) * now - r->beta[k] * before) / r->beta[k + 1];
        before = now;
        now = next;
    }
    return 1 / sum;
}

int tarry_quadrature_find(const tarry_law *law, size_t n, tarry_quadrature *q, tarry_error *error) {
    tarry_measure measure = {0};
    grid g = {0};
    recurrence r = {0};
    int code = tarry_measure_init(&measure, law, error);
    if (code == 0)
        code = make_grid(law, &measure, &g, error);
    if (code == 0) {
        double low = INFINITY, high = -INFINITY;
        find_recurrence(&g, n < MOST ? n : MOST, &r);
        for (size_t i = 0; i < g.n; i++) {
            low = fmin(low, g.at[i]);
            high = fmax(high, g.at[i]);
        }
        q->n = r.n;
        for (size_t i = 0; i < r.n; i++) {
            q->at[i] = find_point(&r, i, low - 1e-9, high + 1e-9);
            q->weight[i] = weight_at(&r, q->at[i]);
        }
    }
    release(&g);
    tarry_measure_release(&measure);
    return code;
}
