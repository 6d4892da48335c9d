/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Radau IIA collocation with five nodes, of order 9 and L-stable (Hairer & Wanner 1996, Solving
 * Ordinary Differential Equations II, section IV.5): steps are as long as the solution is smooth,
 * however fast the promoter switches.
 *
 * The polynomial u with u(0) = w at the step's begin and u' = M u at the nodes c_i is found from
 *
 *     sum_k D_ik W_k - step M_i W_i = -D_i0 w,   W_i = u(c_i),
 *
 * D being the derivative matrix of polynomials through 0 and the nodes. Systems are solved side by
 * side, some to a block, by Gaussian elimination without exchanges: D has a positive definite part
 * and the matrices of a promoter pull the diagonal the same way, so pivots stay away from 0.
 *
 * A step's error is judged by the last coefficients of u in Legendre polynomials (radau.h) where
 * that is certain, or else by taking it in two halves as well, on a few systems. */

#include "exact/march.h"

#include "base/error.h"
#include "base/memory.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

enum { NODES = 5, LANES = 8, ORDER = 9, MOST_STEPS = 200000 };

/* Lanes go through wide registers where the processor has them; results are the same to the bit. */
#if defined(__x86_64__) && defined(__gnu_linux__) && !defined(__clang__) &&                        \
    !defined(__SANITIZE_ADDRESS__) && !defined(__SANITIZE_THREAD__)
#define SIMD __attribute__((target_clones("avx512f", "avx2", "default")))
#else
#define SIMD
#endif

/* ---- one step of a block --------------------------------------------------------------------- */

/* Numbers of as many systems (vector extension of gcc and clang). */
typedef double lanes __attribute__((vector_size(LANES * sizeof(double)), aligned(8), may_alias));

/* The equations of LANES systems: a x = b, complex. */
typedef struct block {
    size_t n;         /* unknowns: NODES * n_states */
    lanes *re, *im;   /* [n][n + 1]; the last column is b, and then x */
    lanes *gre, *gim; /* [NODES] */
} block;

/* Columns of a run, those before `least` left out. */
static size_t column_from(const tarry_stencil_run *run, size_t least) {
    return run->from * NODES > least ? run->from * NODES : least;
}

static size_t column_to(const tarry_stencil *s, const tarry_stencil_run *run) {
    return run->to > s->n_states ? s->n_states * NODES + 1 : run->to * NODES;
}

static SIMD void eliminate(const block *b, const tarry_stencil *s) {
    const size_t width = b->n + 1;
    for (size_t k = 0; k < b->n; k++) {
        const size_t p = k / NODES;
        const lanes *pre = &b->re[k * width], *pim = &b->im[k * width];
        const lanes size = pre[k] * pre[k] + pim[k] * pim[k];
        const lanes ire = -pre[k] / size, iim = pim[k] / size; /* minus 1 / pivot */
        for (size_t q = s->row_starts[p]; q < s->row_starts[p + 1]; q++) {
            const size_t first = s->rows[q] * NODES;
            for (size_t i = first > k ? first : k + 1; i < first + NODES; i++) {
                lanes *restrict rre = &b->re[i * width], *restrict rim = &b->im[i * width];
                const lanes fre = rre[k] * ire - rim[k] * iim, fim = rre[k] * iim + rim[k] * ire;
                for (size_t r = s->run_starts[p]; r < s->run_starts[p + 1]; r++) {
                    const size_t to = column_to(s, &s->runs[r]);
                    for (size_t c = column_from(&s->runs[r], k + 1); c < to; c++) {
                        rre[c] += fre * pre[c] - fim * pim[c];
                        rim[c] += fre * pim[c] + fim * pre[c];
                    }
                }
            }
        }
    }
}

/* The unknowns come into the last column. */
static SIMD void substitute(const block *b, const tarry_stencil *s) {
    const size_t n = b->n, width = n + 1;
    for (size_t k = n; k-- > 0;) {
        const size_t p = k / NODES;
        lanes *re = &b->re[k * width], *im = &b->im[k * width], x = re[n], y = im[n];
        for (size_t r = s->run_starts[p]; r < s->run_starts[p + 1]; r++) {
            const size_t to = column_to(s, &s->runs[r]) < n ? column_to(s, &s->runs[r]) : n;
            for (size_t c = column_from(&s->runs[r], k + 1); c < to; c++) {
                const lanes xre = b->re[c * width + n], xim = b->im[c * width + n];
                x -= re[c] * xre - im[c] * xim;
                y -= re[c] * xim + im[c] * xre;
            }
        }
        const lanes size = re[k] * re[k] + im[k] * im[k];
        re[n] = (x * re[k] + y * im[k]) / size;
        im[n] = (y * re[k] - x * im[k]) / size;
    }
}

typedef struct stride {
    const double *quiet, *jump;
    double from, step;
} stride;

/* Row i of state p. */
static SIMD void fill_row(const tarry_march *m, const stride *s, const block *b, size_t p,
                          size_t i) {
    const size_t n_states = m->n_states, row = (p * NODES + i) * (b->n + 1);
    for (size_t q = 0; q < n_states; q++) {
        if (!m->stencil.meets[p * n_states + q])
            continue;
        lanes *re = &b->re[row + q * NODES], *im = &b->im[row + q * NODES];
        const double quiet = s->step * s->quiet[p * n_states + q];
        const double jump = s->step * s->jump[p * n_states + q];
        for (size_t k = 0; k < NODES; k++) {
            re[k] = (lanes){0} + (q == p ? m->rule.derive[i][k] : 0);
            im[k] = (lanes){0};
        }
        re[i] -= quiet + jump * b->gre[i];
        im[i] -= jump * b->gim[i];
    }
}

/* Idle lanes have no right-hand side, and so no solution but 0. */
static void fill(const tarry_march *m, const stride *s, const block *b, size_t first,
                 size_t n_lanes) {
    for (size_t p = 0; p < m->n_states; p++) {
        lanes re = {0}, im = {0};
        for (size_t l = 0; l < n_lanes; l++) {
            re[l] = m->re[(first + l) * m->n_states + p];
            im[l] = m->im[(first + l) * m->n_states + p];
        }
        for (size_t i = 0; i < NODES; i++) {
            const size_t last = (p * NODES + i) * (b->n + 1) + b->n;
            fill_row(m, s, b, p, i);
            b->re[last] = m->rule.begin[i] * re;
            b->im[last] = m->rule.begin[i] * im;
        }
    }
}

/* g of systems from <= j < to at the nodes of a step. */
static void look_up(const tarry_march *m, const stride *s, size_t from, size_t to) {
    const double inside = s->from + 0.5 * s->step;
    for (size_t i = 0; i < NODES; i++)
        m->loads(m->context, s->from + s->step * m->rule.node[i], inside, from, to,
                 m->gre + i * m->n + from, m->gim + i * m->n + from);
}

/* Systems first .. first + n_lanes - 1, n_lanes <= LANES. */
static void step_block(tarry_march *m, const stride *s, const block *b, size_t first,
                       size_t n_lanes) {
    for (size_t i = 0; i < NODES; i++) {
        b->gre[i] = (lanes){0} + 1;
        b->gim[i] = (lanes){0};
        for (size_t l = 0; l < n_lanes; l++) {
            b->gre[i][l] = m->gre[i * m->n + first + l];
            b->gim[i][l] = m->gim[i * m->n + first + l];
        }
    }
    fill(m, s, b, first, n_lanes);
    eliminate(b, &m->stencil);
    substitute(b, &m->stencil);
    m->n_solved++;
    for (size_t l = 0; l < n_lanes; l++)
        for (size_t p = 0; p < m->n_states; p++) {
            const size_t row = p * NODES + NODES - 1;
            m->re[(first + l) * m->n_states + p] = b->re[row * (b->n + 1) + b->n][l];
            m->im[(first + l) * m->n_states + p] = b->im[row * (b->n + 1) + b->n][l];
        }
}

static block make_block(const tarry_march *m) {
    const size_t n = NODES * m->n_states;
    lanes *room = (lanes *)(void *)m->scratch;
    return (block){.n = n,
                   .re = room,
                   .im = room + n * (n + 1),
                   .gre = room + 2 * n * (n + 1),
                   .gim = room + 2 * n * (n + 1) + NODES};
}

static void step_from(tarry_march *m, const stride *s, size_t from) {
    const block b = make_block(m);
    look_up(m, s, from, m->n);
    for (size_t j = from; j < m->n; j += LANES)
        step_block(m, s, &b, j, m->n - j < LANES ? m->n - j : LANES);
}

/* ---- steps ----------------------------------------------------------------------------------- */

/* Probes are saved in slots: [slot][n_probes][n_states], real parts and imaginary parts. */
static void save(tarry_march *m, size_t slot) {
    const size_t n = m->n_probes * m->n_states;
    memcpy(m->saved + 2 * slot * n, m->re, n * sizeof *m->re);
    memcpy(m->saved + (2 * slot + 1) * n, m->im, n * sizeof *m->im);
}

static void restore(tarry_march *m, size_t slot) {
    const size_t n = m->n_probes * m->n_states;
    memcpy(m->re, m->saved + 2 * slot * n, n * sizeof *m->re);
    memcpy(m->im, m->saved + (2 * slot + 1) * n, n * sizeof *m->im);
}

/* The largest value of a system on the step, and what its polynomials leave. */
static void judge_lane(const tarry_march *m, const block *b, size_t system, size_t lane,
                       double *size, double *rest) {
    const size_t n = m->n_probes * m->n_states;
    double re[NODES + 1], im[NODES + 1];
    *size = *rest = 0;
    for (size_t p = 0; p < m->n_states; p++) {
        re[0] = m->saved[system * m->n_states + p];
        im[0] = m->saved[n + system * m->n_states + p];
        for (size_t i = 0; i < NODES; i++) {
            const size_t last = (p * NODES + i) * (b->n + 1) + b->n;
            re[i + 1] = b->re[last][lane];
            im[i + 1] = b->im[last][lane];
        }
        for (size_t i = 0; i <= NODES; i++)
            *size = fmax(*size, fabs(re[i]) + fabs(im[i]));
        const double left = tarry_radau_rest(&m->rule, re) + tarry_radau_rest(&m->rule, im);
        *rest = left <= *rest ? *rest : left; /* not a number counts as large */
    }
}

/* What the largest error over the first probe's size is by all likelihood, and by all means. */
typedef struct guess {
    double low, high;
} guess;

/* Take the probes on from where slot 0 has them. */
static guess step_probes(tarry_march *m, const stride *s, double fastest) {
    const block b = make_block(m);
    const double decay = tarry_radau_rest_of_decay(&m->rule, s->step * fastest);
    double first = 0;
    guess most = {0, 0};
    look_up(m, s, 0, m->n_probes);
    for (size_t j = 0; j < m->n_probes; j += LANES) {
        const size_t n = m->n_probes - j < LANES ? m->n_probes - j : LANES;
        step_block(m, s, &b, j, n);
        for (size_t l = 0; l < n; l++) {
            double size, rest;
            judge_lane(m, &b, j + l, l, &size, &rest);
            if (j + l == 0)
                first = size;
            const double own = rest < size ? rest / size : 1;
            const double low = rest * own / first, high = rest * fmax(own, decay) / first;
            most.low = low <= most.low ? most.low : low;
            most.high = high <= most.high ? most.high : high;
        }
    }
    return most;
}

/* The largest difference between the probes and those in slot 1, over the largest of the first. */
static double difference(const tarry_march *m) {
    const size_t n = m->n_probes * m->n_states;
    const double *re = m->saved + 2 * n, *im = re + n;
    double most = 0, size = 0;
    for (size_t i = 0; i < n; i++) {
        const double off = hypot(m->re[i] - re[i], m->im[i] - im[i]);
        most = off <= most ? most : off;
        if (i < m->n_states)
            size = fmax(size, hypot(m->re[i], m->im[i]));
    }
    return most / size;
}

static void step_half(tarry_march *m, const stride *s, double from) {
    const block b = make_block(m);
    const stride half = {s->quiet, s->jump, from, 0.5 * s->step};
    look_up(m, &half, 0, m->n_probes);
    for (size_t j = 0; j < m->n_probes; j += LANES)
        step_block(m, &half, &b, j, m->n_probes - j < LANES ? m->n_probes - j : LANES);
}

/* The error of a step of the probes, which they have taken in the end. Where the guess leaves it in
 * doubt, they take it in two halves as well. */
static double try_step(tarry_march *m, const stride *s, double fastest) {
    save(m, 0);
    const guess g = step_probes(m, s, fastest);
    if (g.high <= m->tolerance || !(g.low <= m->tolerance))
        return g.low;
    save(m, 1);
    restore(m, 0);
    step_half(m, s, s->from);
    step_half(m, s, s->from + 0.5 * s->step);
    const double off = difference(m);
    restore(m, 1);
    return off;
}

static double fastest_rate(const tarry_march *m, const double *quiet, const double *jump) {
    const size_t n = m->n_states;
    double most = 0;
    for (size_t p = 0; p < n; p++) {
        double sum = fabs(quiet[p * n + p]);
        for (size_t q = 0; q < n; q++)
            sum += jump[p * n + q];
        most = fmax(most, sum);
    }
    return most;
}

int tarry_march_to(tarry_march *m, const double *quiet, const double *jump, double to,
                   tarry_error *error) {
    if (!(to > m->at))
        return 0;
    const double fastest = fastest_rate(m, quiet, jump);
    if (!(m->step > 0))
        m->step = to - m->at;
    tarry_stencil_cover(&m->stencil, quiet, jump);
    for (int i = 0; m->at < to; i++) {
        const bool last = m->at + m->step >= to * (1 - 1e-13);
        const stride s = {quiet, jump, m->at, last ? to - m->at : m->step};
        const double off = try_step(m, &s, fastest);
        const double change = 0.9 * pow(m->tolerance / fmax(off, 1e-300), 1.0 / ORDER);
        if (i >= MOST_STEPS || (off != off && s.step < 1e-12 * to))
            return tarry_fail(error, TARRY_NUMERIC,
                              "the equations of a promoter take too many steps");
        if (off <= m->tolerance || s.step < 1e-13 * to) {
            step_from(m, &s, m->n_probes);
            m->at = last ? to : m->at + s.step;
            m->step = fmax(last ? m->step : 0, s.step * fmin(change, 5));
        } else {
            restore(m, 0);
            m->step = s.step * (off == off ? fmax(fmin(change, 0.7), 0.1) : 0.1);
        }
    }
    return 0;
}

/* ---- making ---------------------------------------------------------------------------------- */

static int make_room(tarry_march *m, tarry_error *error) {
    const size_t n = NODES * m->n_states;
    m->stencil = (tarry_stencil){0};
    m->gre = tarry_calloc(m->n, sizeof(double[2 * NODES]));
    m->gim = m->gre != NULL ? m->gre + m->n * NODES : NULL;
    m->re = tarry_calloc(m->n, m->n_states * sizeof *m->re);
    m->im = tarry_calloc(m->n, m->n_states * sizeof *m->im);
    m->scratch = tarry_calloc(2 * (n * (n + 1) + NODES), sizeof(lanes));
    m->saved = tarry_calloc(4 * m->n_probes, m->n_states * sizeof *m->saved);
    if (m->gre && m->re && m->im && m->scratch && m->saved &&
        tarry_stencil_init(&m->stencil, m->n_states, error) == 0)
        return 0;
    tarry_march_release(m);
    tarry_fail_memory(error, "the equations of a promoter");
    return TARRY_MEMORY;
}

int tarry_march_init(tarry_march *march, size_t n_states, size_t n, size_t n_probes,
                     double tolerance, tarry_march_loads *loads, void *context,
                     tarry_error *error) {
    *march = (tarry_march){.n_states = n_states,
                           .n = n,
                           .n_probes = n_probes < n ? n_probes : n,
                           .tolerance = tolerance,
                           .loads = loads,
                           .context = context};
    tarry_radau_find(&march->rule, NODES);
    const int code = make_room(march, error);
    for (size_t i = 0; code == 0 && i < n * n_states; i++)
        march->re[i] = 1;
    return code;
}

int tarry_march_copy(const tarry_march *march, tarry_march *out, tarry_error *error) {
    *out = *march;
    const int code = make_room(out, error);
    if (code == 0) {
        memcpy(out->re, march->re, march->n * march->n_states * sizeof *out->re);
        memcpy(out->im, march->im, march->n * march->n_states * sizeof *out->im);
    }
    return code;
}

void tarry_march_release(tarry_march *march) {
    free(march->gre);
    free(march->re);
    free(march->im);
    free(march->scratch);
    free(march->saved);
    tarry_stencil_release(&march->stencil);
    march->gre = march->re = march->im = march->scratch = march->saved = NULL;
}
