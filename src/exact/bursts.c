/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "exact/bursts.h"

#include "exact/chain.h"

#include "base/error.h"
#include "base/matrix.h"
#include "base/memory.h"

#include <gsl/gsl_math.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

static const double left_out = 1e-12; /* probability of sizes beyond those kept */

typedef struct finder {
    const tarry_exact_gene *gene;
    const tarry_exact_regime *regime;
    size_t n;           /* states */
    double *mean_state; /* [n] mean probability over the window */
    tarry_arena *arena;
    tarry_exact_bursts *out;
    tarry_error *error;
} finder;

static int no_memory(const finder *f) {
    return tarry_fail_memory(f->error, "the bursts of a gene");
}

static double rate(const finder *f, size_t i, size_t j) {
    return f->regime->quiet[i * f->n + j] + f->regime->jump[i * f->n + j];
}

/* ---- linear equations ------------------------------------------------------------------------ */

/* x (-moves) = b, in place of b; or (-moves) x = b where `columns`. */
static int solve(size_t n, const double *moves, bool columns, double *b, tarry_error *error) {
    gsl_matrix *a = tarry_matrix_new(n, n);
    int code = 0;
    if (a == NULL)
        code = tarry_fail_memory(error, "the bursts of a gene");
    for (size_t i = 0; code == 0 && i < n; i++)
        for (size_t j = 0; j < n; j++)
            gsl_matrix_set(a, columns ? i : j, columns ? j : i, -moves[i * n + j]);
    if (code == 0 && tarry_matrix_solve(a, b))
        code = tarry_fail(error, TARRY_NUMERIC, "a promoter's periods cannot be solved");
    gsl_matrix_free(a);
    return code;
}

/* Mean and sd from the moments entry (-moves)^-1 1 and 2 entry (-moves)^-2 1. */
static int find_moments(const finder *f, tarry_exact_dwell *d) {
    double *x = tarry_arena_calloc(f->arena, d->n, sizeof *x);
    double first = 0, second = 0;
    if (x == NULL)
        return no_memory(f);
    memcpy(x, d->entry, d->n * sizeof *x);
    int code = solve(d->n, d->moves, false, x, f->error);
    for (size_t i = 0; code == 0 && i < d->n; i++)
        first += x[i];
    if (code == 0)
        code = solve(d->n, d->moves, false, x, f->error);
    for (size_t i = 0; code == 0 && i < d->n; i++)
        second += 2 * x[i];
    d->mean = first;
    d->sd = sqrt(fmax(second - first * first, 0));
    return code;
}

/* ---- the window ------------------------------------------------------------------------------ */

/* The mean over the window of the states' probabilities: the integral of p exp(Q s) from the
 * exponential of ((Q, 1), (0, 0)) (Van Loan 1978, IEEE Trans. Autom. Control 23:395). */
static int average_states(finder *f, double from, double to) {
    const size_t n = f->n;
    const double length = to - from;
    gsl_matrix *a = tarry_matrix_new(2 * n, 2 * n), *e = tarry_matrix_new(2 * n, 2 * n);
    gsl_matrix *work = tarry_matrix_new(2 * n, 2 * n);
    double *p = tarry_arena_calloc(f->arena, n, sizeof *p);
    f->mean_state = tarry_arena_calloc(f->arena, n, sizeof *f->mean_state);
    int code = !a || !e || !work || !p || !f->mean_state
                   ? no_memory(f)
                   : tarry_exact_states(f->gene, from, p, f->error);
    for (size_t i = 0; code == 0 && i < n; i++) {
        for (size_t j = 0; j < n; j++)
            gsl_matrix_set(a, i, j, length * rate(f, i, j));
        gsl_matrix_set(a, i, n + i, 1);
    }
    if (code == 0 && tarry_matrix_exponential(a, 1, e, work))
        code = tarry_fail(f->error, TARRY_NUMERIC, "the exponential of a generator failed");
    for (size_t j = 0; code == 0 && j < n; j++)
        for (size_t i = 0; i < n; i++)
            f->mean_state[j] += p[i] * gsl_matrix_get(e, i, n + j);
    gsl_matrix_free(a);
    gsl_matrix_free(e);
    gsl_matrix_free(work);
    return code;
}

/* ---- periods --------------------------------------------------------------------------------- */

/* The states that are (not) active, in order. Returns how many. */
static size_t gather(const finder *f, bool active, size_t *states) {
    size_t n = 0;
    for (size_t i = 0; i < f->n; i++)
        if (f->gene->active[i] == active)
            states[n++] = i;
    return n;
}

/* Periods in the states `in`, entered from `out`. *flow: entries per unit of time. */
static int find_dwell(const finder *f, const size_t *in, size_t n_in, const size_t *out,
                      size_t n_out, tarry_exact_dwell *d, double *flow) {
    d->n = n_in;
    d->entry = tarry_arena_calloc(f->arena, n_in, sizeof *d->entry);
    d->moves = tarry_arena_calloc(f->arena, n_in, n_in * sizeof *d->moves);
    *flow = 0;
    if (d->entry == NULL || d->moves == NULL)
        return no_memory(f);
    for (size_t j = 0; j < n_in; j++) {
        for (size_t i = 0; i < n_out; i++)
            d->entry[j] += f->mean_state[out[i]] * rate(f, out[i], in[j]);
        for (size_t k = 0; k < n_in; k++)
            d->moves[j * n_in + k] = rate(f, in[j], in[k]);
        *flow += d->entry[j];
    }
    for (size_t j = 0; j<n_in && * flow> 0; j++)
        d->entry[j] /= *flow;
    return 0;
}

/* From an opening to the next: active, then inactive; the next opening ends it. */
static int find_interval(const finder *f, const size_t *on, size_t n_on) {
    tarry_exact_dwell *d = &f->out->interval;
    d->n = f->n;
    d->entry = tarry_arena_calloc(f->arena, f->n, sizeof *d->entry);
    d->moves = tarry_arena_calloc(f->arena, f->n, f->n * sizeof *d->moves);
    if (d->entry == NULL || d->moves == NULL)
        return no_memory(f);
    for (size_t i = 0; i < n_on; i++)
        d->entry[on[i]] = f->out->active.entry[i];
    for (size_t i = 0; i < f->n; i++)
        for (size_t j = 0; j < f->n; j++)
            if (f->gene->active[i] || !f->gene->active[j])
                d->moves[i * f->n + j] = rate(f, i, j);
    return find_moments(f, d);
}

/* ---- sizes ----------------------------------------------------------------------------------- */

/* What a step of the recurrence needs: with B = (-quiet_AA)^-1, P(n) = entry (B jump_AA)^n B out_0
 * + entry (B jump_AA)^(n-1) B out_1, where out_0 leaves without an initiation and out_1 with one.
 */
typedef struct size_steps {
    size_t n;
    double *quiet;  /* [n][n] */
    double *jump;   /* [n][n] */
    double *out[2]; /* [n] */
    double *visits; /* [n] entry (B jump)^k B */
} size_steps;

static int make_steps(const finder *f, const size_t *on, size_t n, size_steps *s) {
    s->n = n;
    s->quiet = tarry_arena_calloc(f->arena, n, n * sizeof(double));
    s->jump = tarry_arena_calloc(f->arena, n, n * sizeof(double));
    s->out[0] = tarry_arena_calloc(f->arena, n, sizeof(double));
    s->out[1] = tarry_arena_calloc(f->arena, n, sizeof(double));
    s->visits = tarry_arena_calloc(f->arena, n, sizeof(double));
    if (!s->quiet || !s->jump || !s->out[0] || !s->out[1] || !s->visits)
        return no_memory(f);
    for (size_t i = 0; i < n; i++) {
        for (size_t j = 0; j < n; j++) {
            s->quiet[i * n + j] = f->regime->quiet[on[i] * f->n + on[j]];
            s->jump[i * n + j] = f->regime->jump[on[i] * f->n + on[j]];
        }
        for (size_t j = 0; j < f->n; j++)
            if (!f->gene->active[j]) {
                s->out[0][i] += f->regime->quiet[on[i] * f->n + j];
                s->out[1][i] += f->regime->jump[on[i] * f->n + j];
            }
    }
    return 0;
}

static double product(const double *x, const double *y, size_t n) {
    double sum = 0;
    for (size_t i = 0; i < n; i++)
        sum += x[i] * y[i];
    return sum;
}

/* The inverse of -quiet, to be used many times. */
static int invert(const finder *f, const size_steps *s, double **inverse) {
    const size_t n = s->n;
    *inverse = tarry_arena_calloc(f->arena, n, n * sizeof **inverse);
    int code = *inverse == NULL ? no_memory(f) : 0;
    for (size_t i = 0; code == 0 && i < n; i++) { /* row i solves x (-quiet) = e_i */
        (*inverse)[i * n + i] = 1;
        code = solve(n, s->quiet, false, &(*inverse)[i * n], f->error);
    }
    return code;
}

static void apply(const double *x, const double *matrix, size_t n, double *out) {
    for (size_t j = 0; j < n; j++) {
        out[j] = 0;
        for (size_t i = 0; i < n; i++)
            out[j] += x[i] * matrix[i * n + j];
    }
}

/* E[N] = entry (-Q_AA)^-1 jump 1 and E[N (N - 1)] = 2 entry (-Q_AA)^-1 jump_AA (-Q_AA)^-1 jump 1.
 */
static int find_size_moments(const finder *f, const size_steps *s) {
    const tarry_exact_dwell *active = &f->out->active;
    const size_t n = s->n;
    double *x = tarry_arena_calloc(f->arena, n, sizeof *x);
    double *y = tarry_arena_calloc(f->arena, n, sizeof *y);
    double mean = 0, pairs = 0;
    if (x == NULL || y == NULL)
        return no_memory(f);
    memcpy(x, active->entry, n * sizeof *x);
    int code = solve(n, active->moves, false, x, f->error);
    apply(x, s->jump, n, y);
    if (code == 0)
        code = solve(n, active->moves, false, y, f->error);
    for (size_t i = 0; code == 0 && i < n; i++) {
        double all = s->out[1][i];
        for (size_t j = 0; j < n; j++)
            all += s->jump[i * n + j];
        mean += x[i] * all;
        pairs += 2 * y[i] * all;
    }
    f->out->size_mean = mean;
    f->out->size_sd = sqrt(fmax(pairs + mean - mean * mean, 0));
    return code;
}

static int find_sizes(const finder *f, const size_t *on, size_t n_on) {
    tarry_exact_bursts *b = f->out;
    size_steps s = {0};
    double *inverse = NULL, left = 1, kept = 0;
    double *next = tarry_arena_calloc(f->arena, n_on, sizeof *next);
    size_t capacity = 0;
    int code = make_steps(f, on, n_on, &s);
    if (code == 0)
        code = next == NULL ? no_memory(f) : invert(f, &s, &inverse);
    if (code == 0)
        apply(b->active.entry, inverse, n_on, s.visits);
    for (; code == 0 && left > left_out && b->n_sizes < TARRY_BURSTS_MOST_SIZES; b->n_sizes++) {
        if (tarry_arena_grow(f->arena, (void **)&b->sizes, &capacity, b->n_sizes + 1,
                             sizeof *b->sizes) != 0)
            return no_memory(f);
        const double p = kept + product(s.visits, s.out[0], n_on);
        kept = product(s.visits, s.out[1], n_on);
        b->sizes[b->n_sizes] = p;
        left -= p;
        apply(s.visits, s.jump, n_on, next);
        apply(next, inverse, n_on, s.visits);
    }
    b->silent_fraction = code == 0 ? b->sizes[0] : 0;
    return code == 0 ? find_size_moments(f, &s) : code;
}

/* ---- the whole ------------------------------------------------------------------------------- */

static void find_rates(const finder *f) {
    double inside = 0, outside = 0;
    for (size_t i = 0; i < f->n; i++) {
        if (f->gene->active[i])
            f->out->active_fraction += f->mean_state[i];
        for (size_t j = 0; j < f->n; j++)
            *(f->gene->active[i] ? &inside : &outside) += f->mean_state[i] *
                                                          f->regime->jump[i * f->n + j];
    }
    f->out->initiation_rate = inside + outside;
    f->out->outside_fraction = inside + outside > 0 ? outside / (inside + outside) : NAN;
}

static const char *refusal(const tarry_exact_gene *gene, double from, double to) {
    const size_t regime = tarry_exact_regime_before(gene, to);
    bool some[2] = {false, false};
    for (size_t i = 0; i < gene->n_states; i++)
        some[gene->active[i]] = true;
    if (!some[0] || !some[1])
        return "bursts cannot be told where all states are active, or none";
    if (gene->regimes[regime].from > from && regime > 0)
        return "the protocol steps within the window";
    if (regime + 1 < gene->n_regimes)
        return "periods that begin in the window may last until the protocol steps";
    return NULL;
}

int tarry_exact_bursts_read(const tarry_exact_gene *gene, double from, double to,
                            tarry_arena *arena, tarry_exact_bursts *bursts, const char **why,
                            tarry_error *error) {
    finder f = {.gene = gene,
                .regime = &gene->regimes[tarry_exact_regime_before(gene, to)],
                .n = gene->n_states,
                .arena = arena,
                .out = bursts,
                .error = error};
    size_t *on = tarry_arena_calloc(arena, f.n, sizeof *on);
    size_t *off = tarry_arena_calloc(arena, f.n, sizeof *off);
    double closings = 0;
    *bursts = (tarry_exact_bursts){0};
    *why = refusal(gene, from, to);
    if (*why != NULL)
        return 0;
    int code = on == NULL || off == NULL ? no_memory(&f) : average_states(&f, from, to);
    if (code != 0)
        return code;
    const size_t n_on = gather(&f, true, on), n_off = gather(&f, false, off);
    find_rates(&f);
    code = find_dwell(&f, on, n_on, off, n_off, &bursts->active, &bursts->frequency);
    if (code == 0)
        code = find_dwell(&f, off, n_off, on, n_on, &bursts->inactive, &closings);
    if (code == 0 && !(bursts->frequency > 0 && closings > 0))
        *why = "no period ever begins and ends";
    if (code == 0 && *why == NULL)
        code = find_moments(&f, &bursts->active);
    if (code == 0 && *why == NULL)
        code = find_moments(&f, &bursts->inactive);
    if (code == 0 && *why == NULL)
        code = find_interval(&f, on, n_on);
    if (code == 0 && *why == NULL)
        code = find_sizes(&f, on, n_on);
    return code;
}

int tarry_exact_dwell_survival(const tarry_exact_dwell *dwell, double t, double *survival,
                               tarry_error *error) {
    const size_t n = dwell->n;
    gsl_matrix *a = tarry_matrix_new(n, n), *e = tarry_matrix_new(n, n);
    gsl_matrix *work = tarry_matrix_new(n, n);
    int code = a == NULL || e == NULL || work == NULL ? tarry_fail_memory(error, "a dwell") : 0;
    *survival = 0;
    for (size_t i = 0; code == 0 && i < n * n; i++)
        a->data[i] = dwell->moves[i] * t;
    if (code == 0 && tarry_matrix_exponential(a, 1, e, work))
        code = tarry_fail(error, TARRY_NUMERIC, "the exponential of a generator failed");
    for (size_t i = 0; code == 0 && i < n; i++)
        for (size_t j = 0; j < n; j++)
            *survival += dwell->entry[i] * gsl_matrix_get(e, i, j);
    gsl_matrix_free(a);
    gsl_matrix_free(e);
    gsl_matrix_free(work);
    return code;
}
