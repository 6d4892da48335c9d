/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "exact/covariance.h"

#include "exact/chain.h"
#include "exact/delayed.h"
#include "exact/fold.h"

#include "base/error.h"
#include "base/matrix.h"
#include "base/memory.h"

#include <math.h>
#include <stdlib.h>

static const double steady = 1e-9;    /* most difference of a state's probability, */
static const double forgotten = 1e-7; /* and of a contribution left out, as a share of all */

/* ---- the promoter ---------------------------------------------------------------------------- */

/* The age beyond which next to nothing of a contribution lies. */
double tarry_exact_memory(const tarry_curve *contribution) {
    const double all = tarry_curve_integral(contribution, INFINITY);
    double low = 0, high = tarry_curve_end(contribution);
    for (int i = 0; i < 40; i++) {
        const double middle = 0.5 * (low + high);
        if (fabs(all - tarry_curve_integral(contribution, middle)) > forgotten * fabs(all))
            low = middle;
        else
            high = middle;
    }
    return high;
}

/* One regime all along, and the same probabilities at both ends: the chain's law then stays. */
static int check_steady(const tarry_exact_gene *gene, double from, double to, double *p,
                        const char **why, tarry_error *error) {
    const size_t regime = tarry_exact_regime_before(gene, to);
    double *later = tarry_calloc(gene->n_states, sizeof *later);
    const double begin = fmax(from, gene->regimes[0].from);
    int code = later == NULL ? tarry_fail_memory(error, "the states of a promoter") : 0;
    if (code == 0 && regime > 0 && gene->regimes[regime].from > begin)
        *why = "the protocol steps within the window or shortly before it";
    if (code == 0 && from < gene->regimes[0].from * (1 + 1e-9) - 1e-9)
        *why = "the time to settle is shorter than its molecules remember";
    if (code == 0)
        code = tarry_exact_states(gene, begin, p, error);
    if (code == 0)
        code = tarry_exact_states(gene, to, later, error);
    for (size_t i = 0; code == 0 && i < gene->n_states; i++)
        if (fabs(p[i] - later[i]) > steady && *why == NULL)
            *why = "its promoter is not in the steady state";
    free(later);
    return code;
}

typedef struct pulse_work {
    size_t n;
    gsl_matrix *generator, *exponential, *room;
    double *before; /* pi jump */
    double *after;  /* jump 1 */
    double square;  /* mean rate squared */
    int failed;
} pulse_work;

static void release_pulse(pulse_work *w) {
    gsl_matrix_free(w->generator);
    gsl_matrix_free(w->room);
    gsl_matrix_free(w->exponential);
}

static double pulse_at(void *context, double h) {
    pulse_work *w = context;
    double sum = 0;
    if (tarry_matrix_exponential(w->generator, h, w->exponential, w->room))
        return NAN;
    for (size_t i = 0; i < w->n; i++)
        for (size_t j = 0; j < w->n; j++)
            sum += w->before[i] * gsl_matrix_get(w->exponential, i, j) * w->after[j];
    return sum - w->square;
}

static int start_pulse(const tarry_exact_gene *gene, size_t regime, const double *p,
                       tarry_arena *arena, pulse_work *w, double *rate, tarry_error *error) {
    const size_t n = gene->n_states;
    const double *jump = gene->regimes[regime].jump;
    *w = (pulse_work){.n = n,
                      .generator = tarry_matrix_new(n, n),
                      .room = tarry_matrix_new(n, n),
                      .exponential = tarry_matrix_new(n, n),
                      .before = tarry_arena_calloc(arena, n, sizeof(double)),
                      .after = tarry_arena_calloc(arena, n, sizeof(double))};
    if (!w->generator || !w->room || !w->exponential || !w->before || !w->after)
        return tarry_fail_memory(error, "the initiations of a promoter");
    tarry_exact_generator(gene, regime, w->generator->data);
    *rate = 0;
    for (size_t i = 0; i < n; i++)
        for (size_t j = 0; j < n; j++) {
            w->before[j] += p[i] * jump[i * n + j];
            w->after[i] += jump[i * n + j];
            *rate += p[i] * jump[i * n + j];
        }
    w->square = *rate * *rate;
    return 0;
}

/* Followed until next to nothing is left; not at all where there is nothing from the start. */
static int follow_pulse(pulse_work *w, double horizon, tarry_curve *pulse, tarry_error *error) {
    const double least = 1e-14 * w->square;
    double fastest = 0;
    for (size_t i = 0; i < w->n; i++)
        fastest = fmax(fastest, -gsl_matrix_get(w->generator, i, i));
    if (!(w->square > 0) || !(fastest > 0))
        return 0;
    double most = 0, end = 1e-3 / fastest;
    for (int i = 0; i < 8; i++)
        most = fmax(most, fabs(pulse_at(w, end * i)));
    int quiet = 0;
    for (; quiet < 3 && end < horizon; end *= 1.5) {
        const double value = fabs(pulse_at(w, end));
        most = fmax(most, value);
        quiet = value <= least ? quiet + 1 : 0;
    }
    if (most <= 10 * least)
        return 0;
    return tarry_curve_init(pulse, fmin(end, horizon), NULL, 0, TARRY_DELAYED_TOLERANCE * most,
                            pulse_at, w, error);
}

/* ---- contributions --------------------------------------------------------------------------- */

static int find_contributions(const tarry_exact_gene *gene, const tarry_exact_view *one,
                              const tarry_exact_view *other, double horizon,
                              tarry_exact_covariance *c, tarry_error *error) {
    int code = tarry_exact_view_mean(gene, one, horizon, &c->contribution[0], error);
    if (code == 0)
        code = tarry_exact_view_mean(gene, other, horizon, &c->contribution[1], error);
    if (code == 0)
        code = tarry_exact_view_overlap(gene, one, other, horizon, &c->overlap[0], error);
    if (code == 0)
        code = tarry_exact_view_overlap(gene, other, one, horizon, &c->overlap[1], error);
    if (code == 0)
        code = tarry_fold_along(&c->contribution[0], &c->contribution[1], horizon, &c->joint[0],
                                error);
    if (code == 0)
        code = tarry_fold_along(&c->contribution[1], &c->contribution[0], horizon, &c->joint[1],
                                error);
    return code;
}

/* ---- the whole ------------------------------------------------------------------------------- */

void tarry_exact_covariance_release(tarry_exact_covariance *c) {
    for (int i = 0; i < 2; i++) {
        tarry_curve_release(&c->contribution[i]);
        tarry_curve_release(&c->overlap[i]);
        tarry_curve_release(&c->joint[i]);
    }
    tarry_curve_release(&c->pulse);
}

static const char *refuse(const tarry_exact_view *one, const tarry_exact_view *other) {
    if (one->why != NULL || other->why != NULL)
        return one->why != NULL ? one->why : other->why;
    return one->n_copies != other->n_copies ? "one signal sees one allele and the other sees all"
                                            : NULL;
}

int tarry_exact_covariance_init(const tarry_exact_gene *gene, const tarry_exact_view *one,
                                const tarry_exact_view *other, double from, double to,
                                double horizon, tarry_arena *arena, tarry_exact_covariance *c,
                                const char **why, tarry_error *error) {
    pulse_work w = {0};
    *why = refuse(one, other);
    if (*why != NULL)
        return 0;
    double *p = tarry_arena_calloc(arena, gene->n_states, sizeof *p);
    if (p == NULL)
        return tarry_fail_memory(error, "the covariance of signals");
    int code = find_contributions(gene, one, other, horizon, c, error);
    const double memory = fmax(tarry_exact_memory(&c->contribution[0]),
                               tarry_exact_memory(&c->contribution[1]));
    if (code == 0)
        code = check_steady(gene, from - memory, to, p, why, error);
    if (code == 0 && *why == NULL)
        code = start_pulse(gene, tarry_exact_regime_before(gene, to), p, arena, &w, &c->initiations,
                           error);
    if (code == 0 && *why == NULL)
        code = follow_pulse(&w, horizon, &c->pulse, error);
    release_pulse(&w);
    c->n_copies = one->n_copies;
    for (int i = 0; i < 2; i++)
        c->mean[i] = c->n_copies * c->initiations *
                     tarry_curve_integral(&c->contribution[i], INFINITY);
    return code;
}

double tarry_exact_covariance_at(const tarry_exact_covariance *c, double lag) {
    const int first = lag < 0; /* the other way round then */
    const double tau = fabs(lag), inside = tau > 0 ? tau : 1e-300;
    const tarry_two_sided seen = {&c->joint[first], &c->joint[!first]};
    const tarry_two_sided begun = {&c->pulse, &c->pulse};
    return c->n_copies * (c->initiations * tarry_curve_value(&c->overlap[first], tau, inside) +
                          tarry_fold_two_sided(&seen, &begun, tau));
}
