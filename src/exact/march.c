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
 * and the matrices of a promoter pull the diagonal the same way, so pivots stay away from 0. A step
 * is compared with two of half its length on a few systems. */

#include "exact/march.h"

#include "base/error.h"
#include "base/memory.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

enum { NODES = 5, LANES = 8, ORDER = 9, MOST_STEPS = 200000 };

/* ---- nodes ----------------------------------------------------------------------------------- */

typedef struct rule {
    double node[NODES];          /* ascending, the last is 1 */
    double derive[NODES][NODES]; /* D */
    double begin[NODES];         /* -D_i0 */
} rule;

/* Legendre polynomials P_5(x) - P_4(x): 0 at the nodes 2c - 1. */
static double node_function(double x) {
    double before = 1, now = x;
    for (int k = 1; k < NODES; k++) {
        const double next = ((2 * k + 1) * x * now - k * before) / (k + 1);
        before = now;
        now = next;
    }
    return now - before;
}

static double find_node(double low, double high) {
    const bool rises = node_function(low) < 0;
    for (int i = 0; i < 100; i++) {
        const double middle = 0.5 * (low + high);
        if ((node_function(middle) < 0) == rises)
            low = middle;
        else
            high = middle;
    }
    return 0.5 * (low + high);
}

static void find_nodes(rule *r) {
    enum { GRID = 1000 };
    size_t n = 0;
    for (int i = 0; i < GRID - 1 && n < NODES - 1; i++) {
        const double a = 2.0 * i / GRID - 1, b = 2.0 * (i + 1) / GRID - 1;
        if ((node_function(a) < 0) != (node_function(b) < 0))
            r->node[n++] = 0.5 * (1 + find_node(a, b));
    }
    r->node[NODES - 1] = 1;
}

/* Derivatives of Lagrange's polynomials by barycentric weights (Berrut & Trefethen 2004, SIAM Rev.
 * 46:501). */
static void find_rule(rule *r) {
    double x[NODES + 1] = {0}, weight[NODES + 1];
    find_nodes(r);
    for (int i = 0; i < NODES; i++)
        x[i + 1] = r->node[i];
    for (int i = 0; i <= NODES; i++) {
        weight[i] = 1;
        for (int k = 0; k <= NODES; k++)
            if (k != i)
                weight[i] /= x[i] - x[k];
    }
    for (int i = 1; i <= NODES; i++) {
        double sum = 0;
        for (int k = 0; k <= NODES; k++) {
            if (k == i)
                continue;
            const double d = weight[k] / weight[i] / (x[i] - x[k]);
            sum += d;
            if (k == 0)
                r->begin[i - 1] = -d;
            else
                r->derive[i - 1][k - 1] = d;
        }
        r->derive[i - 1][i - 1] = -sum;
    }
}

/* ---- one step of a block --------------------------------------------------------------------- */

typedef double lanes[LANES];

/* The equations of LANES systems: a x = b, complex. */
typedef struct block {
    size_t n;         /* unknowns: NODES * n_states */
    lanes *re, *im;   /* [n][n + 1]; the last column is b, and then x */
    lanes *gre, *gim; /* [NODES] */
} block;

/* row += factor * other, from column `from` on. */
static void add_row(lanes *restrict rre, lanes *restrict rim, lanes *restrict ore,
                    lanes *restrict oim, const double *restrict fre, const double *restrict fim,
                    size_t from, size_t to) {
    for (size_t c = from; c < to; c++)
        for (int l = 0; l < LANES; l++) {
            const double re = ore[c][l], im = oim[c][l];
            rre[c][l] += fre[l] * re - fim[l] * im;
            rim[c][l] += fre[l] * im + fim[l] * re;
        }
}

static void eliminate(block *b) {
    const size_t n = b->n, width = n + 1;
    lanes fre, fim;
    for (size_t k = 0; k < n; k++) {
        lanes *pre = &b->re[k * width], *pim = &b->im[k * width];
        lanes ire, iim; /* minus 1 / pivot */
        for (int l = 0; l < LANES; l++) {
            const double size = pre[k][l] * pre[k][l] + pim[k][l] * pim[k][l];
            ire[l] = -pre[k][l] / size;
            iim[l] = pim[k][l] / size;
        }
        for (size_t i = k + 1; i < n; i++) {
            lanes *rre = &b->re[i * width], *rim = &b->im[i * width];
            for (int l = 0; l < LANES; l++) {
                fre[l] = rre[k][l] * ire[l] - rim[k][l] * iim[l];
                fim[l] = rre[k][l] * iim[l] + rim[k][l] * ire[l];
            }
            add_row(rre, rim, pre, pim, fre, fim, k + 1, width);
        }
    }
}

/* The unknowns of the last node alone: the others are not needed. */
static void solve_last(block *b, size_t n_wanted) {
    const size_t n = b->n, width = n + 1;
    for (size_t k = n; k-- > n - n_wanted;) {
        lanes *re = &b->re[k * width], *im = &b->im[k * width];
        for (size_t c = k + 1; c < n; c++) {
            const lanes *xre = &b->re[c * width + n], *xim = &b->im[c * width + n];
            for (int l = 0; l < LANES; l++) {
                re[n][l] -= re[c][l] * (*xre)[l] - im[c][l] * (*xim)[l];
                im[n][l] -= re[c][l] * (*xim)[l] + im[c][l] * (*xre)[l];
            }
        }
        for (int l = 0; l < LANES; l++) {
            const double size = re[k][l] * re[k][l] + im[k][l] * im[k][l];
            const double x = (re[n][l] * re[k][l] + im[n][l] * im[k][l]) / size;
            im[n][l] = (im[n][l] * re[k][l] - re[n][l] * im[k][l]) / size;
            re[n][l] = x;
        }
    }
}

typedef struct stride {
    const rule *rule;
    const double *quiet, *jump;
    double from, step;
} stride;

static void fill(const tarry_march *m, const stride *s, block *b, size_t first, size_t n_lanes) {
    const size_t n_states = m->n_states, width = b->n + 1;
    for (size_t i = 0; i < NODES; i++) {
        for (size_t p = 0; p < n_states; p++) {
            lanes *re = &b->re[(i * n_states + p) * width],
                  *im = &b->im[(i * n_states + p) * width];
            memset(re, 0, width * sizeof *re);
            memset(im, 0, width * sizeof *im);
            for (size_t k = 0; k < NODES; k++)
                for (int l = 0; l < LANES; l++)
                    re[k * n_states + p][l] = s->rule->derive[i][k];
            for (size_t q = 0; q < n_states; q++) {
                const double quiet = s->step * s->quiet[p * n_states + q];
                const double jump = s->step * s->jump[p * n_states + q];
                if (quiet == 0 && jump == 0)
                    continue;
                for (int l = 0; l < LANES; l++) {
                    re[i * n_states + q][l] -= quiet + jump * b->gre[i][l];
                    im[i * n_states + q][l] -= jump * b->gim[i][l];
                }
            }
            for (size_t l = 0; l < n_lanes; l++) {
                re[b->n][l] = s->rule->begin[i] * m->re[(first + l) * n_states + p];
                im[b->n][l] = s->rule->begin[i] * m->im[(first + l) * n_states + p];
            }
        }
    }
}

/* Systems first .. first + n_lanes - 1, n_lanes <= LANES; idle lanes go along with g = 1. */
static void step_block(tarry_march *m, const stride *s, block *b, size_t first, size_t n_lanes) {
    const double inside = s->from + 0.5 * s->step;
    for (size_t i = 0; i < NODES; i++) {
        const double a = s->from + s->step * s->rule->node[i];
        for (int l = 0; l < LANES; l++) {
            b->gre[i][l] = 1;
            b->gim[i][l] = 0;
        }
        m->loads(m->context, a, inside, first, first + n_lanes, b->gre[i], b->gim[i]);
    }
    fill(m, s, b, first, n_lanes);
    eliminate(b);
    solve_last(b, m->n_states);
    for (size_t l = 0; l < n_lanes; l++)
        for (size_t p = 0; p < m->n_states; p++) {
            const size_t row = (NODES - 1) * m->n_states + p;
            m->re[(first + l) * m->n_states + p] = b->re[row * (b->n + 1) + b->n][l];
            m->im[(first + l) * m->n_states + p] = b->im[row * (b->n + 1) + b->n][l];
        }
}

static void step_all(tarry_march *m, const stride *s, size_t from, size_t to) {
    const size_t n = NODES * m->n_states;
    lanes *room = (lanes *)(void *)m->scratch;
    block b = {.n = n,
               .re = room,
               .im = room + n * (n + 1),
               .gre = room + 2 * n * (n + 1),
               .gim = room + 2 * n * (n + 1) + NODES};
    for (size_t j = from; j < to; j += LANES)
        step_block(m, s, &b, j, to - j < LANES ? to - j : LANES);
}

/* ---- steps ----------------------------------------------------------------------------------- */

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

/* The largest difference between the probes and those saved, over the largest of the first one. */
static double difference(const tarry_march *m, size_t slot) {
    const size_t n = m->n_probes * m->n_states;
    const double *re = m->saved + 2 * slot * n, *im = re + n;
    double most = 0, size = 0;
    for (size_t i = 0; i < n; i++) {
        most = fmax(most, hypot(m->re[i] - re[i], m->im[i] - im[i]));
        if (i < m->n_states)
            size = fmax(size, hypot(m->re[i], m->im[i]));
    }
    return most / size;
}

/* The error of a step of the probes, which are left as they were. */
static double try_step(tarry_march *m, const stride *s) {
    stride half = *s;
    save(m, 0);
    step_all(m, s, 0, m->n_probes);
    save(m, 1);
    restore(m, 0);
    half.step *= 0.5;
    step_all(m, &half, 0, m->n_probes);
    half.from += half.step;
    step_all(m, &half, 0, m->n_probes);
    const double error = difference(m, 1);
    restore(m, 0);
    return error;
}

int tarry_march_to(tarry_march *m, const double *quiet, const double *jump, double to,
                   tarry_error *error) {
    rule r;
    const double begin = m->at;
    if (!(to > begin))
        return 0;
    find_rule(&r);
    if (!(m->step > 0))
        m->step = to - begin;
    for (int i = 0; m->at < to; i++) {
        const bool last = m->at + m->step >= to * (1 - 1e-13);
        const stride s = {&r, quiet, jump, m->at, last ? to - m->at : m->step};
        const double off = try_step(m, &s);
        const double change = 0.9 * pow(m->tolerance / fmax(off, 1e-300), 1.0 / ORDER);
        if (i >= MOST_STEPS || (off != off && s.step < 1e-12 * to))
            return tarry_fail(error, TARRY_NUMERIC,
                              "the equations of a promoter take too many steps");
        if (off <= m->tolerance || s.step < 1e-13 * to) {
            step_all(m, &s, 0, m->n);
            m->at = last ? to : m->at + s.step;
            m->step = fmax(last ? m->step : 0, s.step * fmin(change, 5));
        } else {
            m->step = s.step * (off == off ? fmax(fmin(change, 0.7), 0.1) : 0.1);
        }
    }
    return 0;
}

/* ---- making ---------------------------------------------------------------------------------- */

static int fail_memory(tarry_error *error) {
    return tarry_fail_memory(error, "the equations of a promoter");
}

static bool make_room(tarry_march *m) {
    const size_t n = NODES * m->n_states;
    m->re = tarry_calloc(m->n, m->n_states * sizeof *m->re);
    m->im = tarry_calloc(m->n, m->n_states * sizeof *m->im);
    m->scratch = tarry_calloc(2 * n * (n + 1) + 2 * (size_t)NODES, sizeof(lanes));
    m->saved = tarry_calloc(4 * m->n_probes, m->n_states * sizeof *m->saved);
    if (m->re && m->im && m->scratch && m->saved)
        return true;
    tarry_march_release(m);
    return false;
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
    if (!make_room(march))
        return fail_memory(error);
    for (size_t i = 0; i < n * n_states; i++)
        march->re[i] = 1;
    return 0;
}

int tarry_march_copy(const tarry_march *march, tarry_march *out, tarry_error *error) {
    *out = *march;
    if (!make_room(out))
        return fail_memory(error);
    memcpy(out->re, march->re, march->n * march->n_states * sizeof *out->re);
    memcpy(out->im, march->im, march->n * march->n_states * sizeof *out->im);
    return 0;
}

void tarry_march_release(tarry_march *march) {
    free(march->re);
    free(march->im);
    free(march->scratch);
    free(march->saved);
    march->re = march->im = march->scratch = march->saved = NULL;
}
