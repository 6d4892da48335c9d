/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "exact/drift.h"

#include "base/error.h"
#include "base/memory.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

enum { NODES = 8, ORDER = 8, MOST_STEPS = 200000, MOST_KEPT = 4096 };

static const double tolerance = 1e-11; /* error of a step of w1, */
static const double second_share =
    0.02; /* and that of w2 counts so much less: its curve is known less well */
static const double most_room = 64e6; /* bytes of steps that are kept */
static const double part = 0.03;

/* ---- one step's equations -------------------------------------------------------------------- */

static size_t unknowns(const tarry_drift *d) {
    return NODES * d->stencil.n_states;
}

static size_t column_from(const tarry_stencil_run *run, size_t least) {
    return run->from * NODES > least ? run->from * NODES : least;
}

/* Without the right-hand side, which stands apart. */
static size_t column_to(const tarry_drift *d, const tarry_stencil_run *run) {
    return run->to * NODES < unknowns(d) ? run->to * NODES : unknowns(d);
}

static void fill(const tarry_drift *d, size_t regime, double length, double *a) {
    const size_t n_states = d->stencil.n_states, n = unknowns(d);
    const tarry_exact_regime *r = &d->gene->regimes[regime];
    memset(a, 0, n * n * sizeof *a);
    for (size_t p = 0; p < n_states; p++)
        for (size_t i = 0; i < NODES; i++) {
            double *row = &a[(p * NODES + i) * n];
            for (size_t k = 0; k < NODES; k++)
                row[p * NODES + k] = d->rule.derive[i][k];
            for (size_t q = 0; q < n_states; q++)
                row[q * NODES + i] -= length *
                                      (r->quiet[p * n_states + q] + r->jump[p * n_states + q]);
        }
}

/* Factors take the place of what they bring to 0, as in an LU decomposition without exchanges. */
static void eliminate(const tarry_drift *d, double *a) {
    const tarry_stencil *s = &d->stencil;
    const size_t n = unknowns(d);
    for (size_t k = 0; k < n; k++) {
        const size_t p = k / NODES;
        for (size_t q = s->row_starts[p]; q < s->row_starts[p + 1]; q++) {
            const size_t first = s->rows[q] * NODES;
            for (size_t i = first > k ? first : k + 1; i < first + NODES; i++) {
                const double factor = a[i * n + k] / a[k * n + k];
                a[i * n + k] = factor;
                for (size_t r = s->run_starts[p]; r < s->run_starts[p + 1]; r++)
                    for (size_t c = column_from(&s->runs[r], k + 1); c < column_to(d, &s->runs[r]);
                         c++)
                        a[i * n + c] -= factor * a[k * n + c];
            }
        }
    }
}

static void solve(const tarry_drift *d, const double *a, double *x) {
    const tarry_stencil *s = &d->stencil;
    const size_t n = unknowns(d);
    for (size_t k = 0; k < n; k++) {
        const size_t p = k / NODES;
        for (size_t q = s->row_starts[p]; q < s->row_starts[p + 1]; q++) {
            const size_t first = s->rows[q] * NODES;
            for (size_t i = first > k ? first : k + 1; i < first + NODES; i++)
                x[i] -= a[i * n + k] * x[k];
        }
    }
    for (size_t k = n; k-- > 0;) {
        const size_t p = k / NODES;
        for (size_t r = s->run_starts[p]; r < s->run_starts[p + 1]; r++)
            for (size_t c = column_from(&s->runs[r], k + 1); c < column_to(d, &s->runs[r]); c++)
                x[k] -= a[k * n + c] * x[c];
        x[k] /= a[k * n + k];
    }
}

/* The eliminated equations of a step; NULL when memory is short. */
static const double *equations(tarry_drift *d, size_t regime, double length) {
    tarry_drift_step *kept = &d->steps[regime % d->n_kept];
    if (kept->factors != NULL && kept->regime == regime && kept->length == length)
        return kept->factors;
    if (kept->factors == NULL)
        kept->factors = tarry_calloc(unknowns(d), unknowns(d) * sizeof *kept->factors);
    if (kept->factors == NULL)
        return NULL;
    kept->regime = regime;
    kept->length = length;
    fill(d, regime, length, kept->factors);
    eliminate(d, kept->factors);
    d->n_eliminated++;
    return kept->factors;
}

/* ---- steps ----------------------------------------------------------------------------------- */

/* What is left of the polynomials of all states, over their largest value; times the same, or that
 * of the fastest decay (radau.h). What is less than `least` is nothing beside what is to come. */
static double judge(const tarry_drift *d, const double *begin, const double *x, double decay,
                    double least) {
    double size = least, rest = 0, values[NODES + 1];
    for (size_t p = 0; p < d->stencil.n_states; p++) {
        values[0] = begin[p];
        memcpy(values + 1, x + p * NODES, NODES * sizeof *x);
        for (size_t i = 0; i <= NODES; i++)
            size = fmax(size, fabs(values[i]));
        const double left = tarry_radau_rest(&d->rule, values);
        rest = left <= rest ? rest : left; /* not a number counts as large */
    }
    return size > 0 ? rest / size * fmax(rest / size, decay) : 0;
}

static double fastest_rate(const tarry_drift *d, size_t regime) {
    const tarry_exact_regime *r = &d->gene->regimes[regime];
    const size_t n = d->stencil.n_states;
    double most = 0;
    for (size_t p = 0; p < n; p++)
        most = fmax(most, fabs(r->quiet[p * n + p] + r->jump[p * n + p]));
    return most;
}

/* Both w at all nodes into x1, x2. */
static void step(tarry_drift *d, const tarry_drift_state *s, size_t regime, double length,
                 const double *factors, double *x1, double *x2) {
    const size_t n_states = d->stencil.n_states;
    const double *jump = d->gene->regimes[regime].jump, *rate = &d->rate[regime * n_states];
    double mean[NODES], second[NODES];
    for (size_t i = 0; i < NODES; i++) {
        const double a = s->at + length * d->rule.node[i], inside = s->at + 0.5 * length;
        mean[i] = length * tarry_curve_value(d->mean, a, inside);
        second[i] = length * tarry_curve_value(d->second, a, inside);
        for (size_t p = 0; p < n_states; p++)
            x1[p * NODES + i] = d->rule.begin[i] * s->w1[p] + mean[i] * rate[p];
    }
    solve(d, factors, x1);
    for (size_t p = 0; p < n_states; p++)
        for (size_t i = 0; i < NODES; i++) {
            double sum = 0;
            for (size_t q = 0; q < n_states && rate[p] != 0; q++)
                sum += jump[p * n_states + q] * x1[q * NODES + i];
            x2[p * NODES + i] = d->rule.begin[i] * s->w2[p] + 2 * mean[i] * sum +
                                second[i] * rate[p];
        }
    solve(d, factors, x2);
    d->n_steps++;
}

/* The end of [at, to] halved until it is no longer than `most`: few lengths, to be kept. */
static double choose_length(double whole, double most) {
    double length = whole;
    while (length > most * (1 + 1e-9))
        length *= 0.5;
    return length;
}

/* On to `to` without a break between. */
static int go_on(tarry_drift *d, tarry_drift_state *s, size_t regime, double to,
                 tarry_error *error) {
    const size_t n_states = d->stencil.n_states;
    double *x1 = d->room, *x2 = x1 + unknowns(d);
    const double fastest = fastest_rate(d, regime);
    for (int k = 0; s->at < to; k++) {
        const double length = choose_length(to - s->at, s->step > 0 ? s->step : INFINITY);
        const double *factors = equations(d, regime, length);
        if (factors == NULL)
            return tarry_fail_memory(error, "moments of a count");
        step(d, s, regime, length, factors, x1, x2);
        const double decay = tarry_radau_rest_of_decay(&d->rule, length * fastest);
        const double off = fmax(judge(d, s->w1, x1, decay, d->least[0]),
                                second_share * judge(d, s->w2, x2, decay, d->least[1]));
        const double change = 0.9 * pow(tolerance / fmax(off, 1e-40), 1.0 / ORDER);
        if (k >= MOST_STEPS || (off != off && length < 1e-12 * to))
            return tarry_fail(error, TARRY_NUMERIC, "moments of a count take too many steps");
        if (!(off <= tolerance) && length > 1e-13 * to) {
            s->step = length * (off == off ? fmin(fmax(change, 0.1), 0.5) : 0.1);
            continue;
        }
        for (size_t p = 0; p < n_states; p++) {
            s->w1[p] = x1[p * NODES + NODES - 1];
            s->w2[p] = x2[p * NODES + NODES - 1];
        }
        s->at = length >= to - s->at ? to : s->at + length;
        s->step = fmax(s->at < to ? 0 : s->step, length * fmin(change, 5));
    }
    return 0;
}

/* The first break of the curve above x, or `to`. */
static double break_after(const tarry_curve *curve, double x, double to) {
    size_t low = 0, high = curve->n_breaks;
    const size_t n = high;
    while (low < high) {
        const size_t middle = low + (high - low) / 2;
        if (curve->breaks[middle] > x)
            high = middle;
        else
            low = middle + 1;
    }
    return low < n ? fmin(curve->breaks[low], to) : to;
}

int tarry_drift_to(tarry_drift *d, tarry_drift_state *s, size_t regime, double to,
                   tarry_error *error) {
    int code = 0;
    while (code == 0 && s->at < to) {
        const double next = fmin(break_after(d->mean, s->at, to),
                                 break_after(d->second, s->at, to));
        code = go_on(d, s, regime, next, error);
    }
    return code;
}

/* ---- making ---------------------------------------------------------------------------------- */

static void cover_all(tarry_drift *d) {
    const tarry_exact_gene *gene = d->gene;
    const size_t n = gene->n_states;
    for (size_t k = 0; k < gene->n_regimes; k++) {
        tarry_stencil_cover(&d->stencil, gene->regimes[k].quiet, gene->regimes[k].jump);
        for (size_t i = 0; i < n * n; i++)
            d->rate[k * n + i / n] += gene->regimes[k].jump[i];
    }
}

/* A part of the w that an age without end would bring: curves are not known to all digits where
 * they are next to nothing, and need not be. */
static void find_least(tarry_drift *d) {
    const size_t n = d->gene->n_regimes * d->stencil.n_states;
    double fastest = 0;
    for (size_t i = 0; i < n; i++)
        fastest = fmax(fastest, d->rate[i]);
    const double first = fastest * fabs(tarry_curve_integral(d->mean, INFINITY));
    const double own = fastest * fabs(tarry_curve_integral(d->second, INFINITY));
    d->least[0] = part * first;
    d->least[1] = part * (first * first + own);
}

int tarry_drift_init(tarry_drift *d, const tarry_exact_gene *gene, const tarry_curve *mean,
                     const tarry_curve *second, tarry_error *error) {
    const size_t n = NODES * gene->n_states;
    const double kept = floor(most_room / ((double)n * (double)n * sizeof(double)));
    *d = (tarry_drift){.gene = gene, .mean = mean, .second = second};
    tarry_radau_find(&d->rule, NODES);
    d->n_kept = (size_t)fmax(1, fmin(kept, fmin((double)gene->n_regimes, MOST_KEPT)));
    d->steps = tarry_calloc(d->n_kept, sizeof *d->steps);
    d->rate = tarry_calloc(gene->n_regimes, gene->n_states * sizeof *d->rate);
    d->room = tarry_calloc(2 * n, sizeof *d->room);
    if (d->steps == NULL || d->rate == NULL || d->room == NULL)
        return tarry_fail_memory(error, "moments of a count");
    const int code = tarry_stencil_init(&d->stencil, gene->n_states, error);
    if (code == 0)
        cover_all(d);
    if (code == 0)
        find_least(d);
    return code;
}

void tarry_drift_release(tarry_drift *d) {
    for (size_t i = 0; d->steps != NULL && i < d->n_kept; i++)
        free(d->steps[i].factors);
    free(d->steps);
    free(d->rate);
    free(d->room);
    tarry_stencil_release(&d->stencil);
    *d = (tarry_drift){0};
}
