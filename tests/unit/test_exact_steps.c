/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Steps of integration: what is said of their errors, and how much work they are. Counts of work
 * depend on no clock; their bounds are twice what was counted when they were set. */

#include "base/matrix.h"
#include "exact/drift.h"
#include "exact/march.h"
#include "support.h"

#include <gsl/gsl_math.h>
#include <gsl/gsl_sf_bessel.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

/* ---- rests ----------------------------------------------------------------------------------- */

/* exp(-x t) on [0, 1] has the Legendre coefficients (2n + 1) exp(-x/2) i_n(x/2), but for signs
 * (Abramowitz & Stegun 1964, 10.2.36). */
static double coefficient(int n, double x) {
    gsl_sf_result r;
    ck_assert_int_eq(gsl_sf_bessel_il_scaled_e(n, 0.5 * x, &r), 0);
    return (2 * n + 1) * r.val;
}

START_TEST(rests_are_legendre_coefficients) {
    for (size_t n = 4; n <= 12; n += 4)
        for (double x = 0.05; x < 3; x *= 3) {
            tarry_radau rule;
            double values[TARRY_RADAU_MOST + 1] = {1};
            tarry_radau_find(&rule, n);
            for (size_t i = 0; i < n; i++)
                values[i + 1] = exp(-x * rule.node[i]);
            const double last = coefficient((int)n, x), before = coefficient((int)n - 1, x);
            const double rest = tarry_radau_rest(&rule, values);
            ck_assert_double_ge(rest + 1e-14, fmax(0.9 * last, 0.08 * before));
            ck_assert_double_le(rest, fmax(1.3 * last, 0.12 * before) + 1e-14);
            ck_assert_double_ge(tarry_radau_rest_of_decay(&rule, x), last);
            ck_assert_double_le(tarry_radau_rest_of_decay(&rule, x), last * exp(0.6 * x));
        }
}
END_TEST

/* ---- stencils -------------------------------------------------------------------------------- */

static size_t entries(const tarry_stencil *s) {
    size_t sum = 0;
    for (size_t p = 0; p < s->n_states; p++)
        for (size_t r = s->run_starts[p]; r < s->run_starts[p + 1]; r++)
            sum += s->runs[r].to - s->runs[r].from;
    return sum;
}

/* A ring of phases, each left for the next: the last row fills up, and nothing else. */
START_TEST(a_ring_of_phases_is_eliminated_along_itself) {
    enum { N = 60 };
    double *quiet = calloc(N * N, sizeof *quiet), *jump = calloc(N * N, sizeof *jump);
    tarry_stencil s = {0};
    tarry_error error = {0};
    ck_assert_ptr_nonnull(quiet);
    ck_assert_ptr_nonnull(jump);
    for (size_t p = 0; p < N; p++)
        quiet[p * N + (p + 1) % N] = 1;
    ck_assert_int_eq(tarry_stencil_init(&s, N, &error), 0);
    tarry_stencil_cover(&s, quiet, jump);
    ck_assert_uint_eq(s.row_starts[N], N + N - 1); /* each pivot, and the last row */
    ck_assert_uint_eq(entries(&s), 3 * N - 1);     /* itself, the next and the right-hand side */
    jump[5 * N + 2] = 1;
    tarry_stencil_cover(&s, quiet, jump); /* meets 2, 3, 4 on the way */
    ck_assert_uint_eq(s.row_starts[N], N + N - 1 + 3);
    tarry_stencil_release(&s);
    free(quiet);
    free(jump);
}
END_TEST

/* ---- many systems ---------------------------------------------------------------------------- */

enum { SYSTEMS = 264 };

static void put_loads(void *context, double a, double inside, size_t from, size_t to, double *re,
                      double *im) {
    (void)context;
    (void)inside;
    for (size_t j = from; j < to; j++) {
        const double angle = M_PI * (double)j / SYSTEMS, left = exp(-a / 29);
        re[j - from] = 1 + (cos(angle) - 1) * left;
        im[j - from] = sin(angle) * left;
    }
}

static const double two_quiet[] = {-0.05, 0.05, 0.1, -0.1 - 25}, two_jump[] = {0, 0, 0, 25};

/* What ten times of 512 counts take, 25 initiations a minute. */
START_TEST(half_a_thousand_counts_are_little_work) {
    tarry_march m = {0};
    tarry_error error = {0};
    ck_assert_int_eq(tarry_march_init(&m, 2, SYSTEMS, 6, 1e-11, put_loads, NULL, &error), 0);
    for (int i = 1; i <= 10; i++)
        ck_assert_int_eq(tarry_march_to(&m, two_quiet, two_jump, 10.0 * i, &error), 0);
    ck_assert_uint_le(m.n_solved, 5700);
    tarry_march_release(&m);
}
END_TEST

static void put_nothing(void *context, double a, double inside, size_t from, size_t to, double *re,
                        double *im) {
    (void)context;
    (void)a;
    (void)inside;
    memset(re, 0, (to - from) * sizeof *re);
    memset(im, 0, (to - from) * sizeof *im);
}

/* Without any z left the equations are those of a matrix exponential, one regime after the other.
 * What is left of the fast way out of the active state is little in each, and must come out right
 * all the same. */
START_TEST(steps_follow_matrix_exponentials) {
    gsl_matrix *a = tarry_matrix_new(2, 2), *e = tarry_matrix_new(2, 2),
               *room = tarry_matrix_new(2, 2);
    tarry_march m = {0};
    tarry_error error = {0};
    double w[2] = {1, 1};
    ck_assert(a != NULL && e != NULL && room != NULL);
    ck_assert_int_eq(tarry_march_init(&m, 2, 1, 1, 1e-11, put_nothing, NULL, &error), 0);
    for (int i = 1; i <= 40; i++) {
        const double open = 0.31 - 0.0075 * i;
        const double quiet[] = {-open, open, 0.35, -4.35};
        ck_assert_int_eq(tarry_march_to(&m, quiet, two_jump, i, &error), 0);
        memcpy(a->data, quiet, sizeof quiet);
        ck_assert_int_eq(tarry_matrix_exponential(a, 1, e, room), 0);
        const double first = w[0], second = w[1];
        w[0] = e->data[0] * first + e->data[1] * second;
        w[1] = e->data[2] * first + e->data[3] * second;
        for (int p = 0; p < 2; p++)
            ck_assert_double_eq_tol(m.re[p], w[p], 1e-9 * w[p]);
    }
    ck_assert_uint_le(m.n_solved, 1000);
    tarry_march_release(&m);
    gsl_matrix_free(a);
    gsl_matrix_free(e);
    gsl_matrix_free(room);
}
END_TEST

/* ---- moments under a protocol ---------------------------------------------------------------- */

enum { REGIMES = 150, FRAMES = 300 };

static double decay(void *context, double x) {
    (void)context;
    return exp(-x / 20);
}

/* Each frame meets each regime before it, but a regime's equations are eliminated a few times. */
START_TEST(equations_under_a_protocol_are_kept) {
    tarry_exact_regime regimes[REGIMES];
    double quiet[REGIMES][4], jump[4] = {0, 0, 0, 4}, w[4];
    tarry_exact_gene gene = {.n_states = 2, .regimes = regimes, .n_regimes = REGIMES};
    tarry_curve mean = {0}, nothing = {0};
    tarry_drift d = {0};
    tarry_error error = {0};
    for (int k = 0; k < REGIMES; k++) {
        const double open = 0.01 + 0.002 * k;
        memcpy(quiet[k], (double[]){-open, open, 0.35, -4.35}, sizeof quiet[k]);
        regimes[k] = (tarry_exact_regime){.from = k, .quiet = quiet[k], .jump = jump};
    }
    ck_assert_int_eq(tarry_curve_init(&mean, 700, NULL, 0, 1e-12, decay, NULL, &error), 0);
    ck_assert_int_eq(tarry_drift_init(&d, &gene, &mean, &nothing, &error), 0);
    for (int f = 1; f <= FRAMES; f++) {
        const double time = 0.5 * f;
        tarry_drift_state s = {.w1 = w, .w2 = w + 2};
        memset(w, 0, sizeof w);
        for (int k = REGIMES - 1; k >= 0; k--)
            if (regimes[k].from < time)
                ck_assert_int_eq(tarry_drift_to(&d, &s, (size_t)k, time - k, &error), 0);
    }
    ck_assert_uint_gt(d.n_steps, FRAMES * REGIMES / 2);
    ck_assert_uint_le(d.n_steps, 2 * FRAMES * REGIMES);
    ck_assert_uint_le(d.n_eliminated, 2 * FRAMES);
    tarry_drift_release(&d);
    tarry_curve_release(&mean);
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"rests are Legendre coefficients", rests_are_legendre_coefficients},
        {"a ring of phases is eliminated along itself",
         a_ring_of_phases_is_eliminated_along_itself},
        {"half a thousand counts are little work", half_a_thousand_counts_are_little_work},
        {"steps follow matrix exponentials", steps_follow_matrix_exponentials},
        {"equations under a protocol are kept", equations_under_a_protocol_are_kept},
    };
    return run_tests("exact steps", tests, sizeof tests / sizeof *tests);
}
