/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Exact laws of counts against closed forms and against the master equation by other means.
 *
 * Every probability above 1e-12 must agree to a relative 1e-6. */

#include "kummer.h"
#include "master.h"
#include "support.h"

#include "exact/counts.h"
#include "exact/moments.h"
#include "model/model.h"
#include "tarry/tarry.h"

#include <gsl/gsl_cdf.h>
#include <gsl/gsl_integration.h>
#include <gsl/gsl_randist.h>
#include <math.h>
#include <stdarg.h>
#include <stdint.h>
#include <stdio.h>
#include <string.h>

static const double least = 1e-12, relative = 1e-6;

/* ---- models -------------------------------------------------------------------------------- */

typedef struct subject {
    tarry_model *model;
    tarry_flow_index index;
    tarry_arena arena;
    tarry_exact_gene gene;
} subject;

static subject read_gene(const char *format, ...) __attribute__((format(printf, 1, 2)));

/* The first gene of a model, given from `genes:` on without its end. */
static subject read_gene(const char *format, ...) {
    static const char head[] = "tarry: 1\ntime: min\n", tail[] = "run: {until: 10, every: 1}\n";
    char text[4096], what[2048];
    va_list arguments;
    subject s = {0};
    tarry_error error = {0};
    va_start(arguments, format);
    memcpy(text, head, sizeof head);
    size_t n = sizeof head - 1;
    n += (size_t)vsnprintf(text + n, sizeof text - n, format, arguments);
    va_end(arguments);
    if (strstr(text, "run:") == NULL)
        snprintf(text + n, sizeof text - n, "%s", tail);
    tarry_start();
    const int code = tarry_model_read_text(text, strlen(text), "m.yaml", NULL, 0, &s.model, &error);
    ck_assert_msg(code == 0, "%s", tarry_error_text(&error, what, (int)sizeof what));
    ck_assert_int_eq(tarry_flow_index_init(&s.index, &s.model->network, &error), 0);
    ck_assert_int_eq(
        tarry_exact_gene_read(&s.index, s.model->network.segments, 0, &s.arena, &s.gene, &error),
        0);
    return s;
}

static void release(subject *s) {
    tarry_flow_index_release(&s->index);
    tarry_arena_release(&s->arena);
    tarry_model_free(s->model);
}

/* The laws of a stage of the transcript (or of the transcript) at some times. */
static void find(const subject *s, size_t stage, const double *times, size_t n_times,
                 tarry_exact_counts *counts) {
    char what[2048];
    tarry_error error = {0};
    tarry_exact_carried carried = {0};
    ck_assert_msg(s->gene.why == NULL, "%s", s->gene.why);
    ck_assert_uint_lt(stage, s->gene.transcript.n);
    ck_assert_ptr_null(s->gene.transcript.stages[stage].why);
    memset(counts, 0, n_times * sizeof *counts);
    int code = tarry_exact_carry_stage(&s->gene.transcript, stage, 1e5, &carried, &error);
    if (code == 0)
        code = tarry_exact_counts_at(&s->gene, &carried, times, n_times, TARRY_COUNTS_MOST, counts,
                                     &error);
    ck_assert_msg(code == 0, "%s", tarry_error_text(&error, what, (int)sizeof what));
    tarry_exact_carried_release(&carried);
}

static void find_moments(const subject *s, size_t stage, const double *times, size_t n_times,
                         tarry_exact_moments *moments) {
    char what[2048];
    tarry_error error = {0};
    tarry_exact_carried carried = {0};
    int code = tarry_exact_carry_stage(&s->gene.transcript, stage, 1e5, &carried, &error);
    if (code == 0)
        code = tarry_exact_moments_at(&s->gene, &carried, times, n_times, moments, &error);
    ck_assert_msg(code == 0, "%s", tarry_error_text(&error, what, (int)sizeof what));
    tarry_exact_carried_release(&carried);
}

/* Each P(n) against `expected(context, n)`, as far as that is above 1e-12; at least `n_least`. */
static void compare(const tarry_exact_counts *counts, double (*expected)(const void *, unsigned),
                    const void *context, unsigned n_least) {
    unsigned n_compared = 0;
    for (unsigned n = 0; n < counts->n; n++) {
        const double p = expected(context, n);
        if (p < least)
            continue;
        n_compared++;
        ck_assert_msg(fabs(counts->p[n] - p) < relative * p, "P(%u) is %.17g, not %.17g (%.2g)", n,
                      counts->p[n], p, counts->p[n] / p - 1);
    }
    ck_assert_msg(n_compared >= n_least, "%u counts only", n_compared);
}

/* ---- two states ---------------------------------------------------------------------------- */

static double by_kummer(const void *context, unsigned n) {
    return kummer_law(*(const two_state_rates *)context, n);
}

static void check_two_states(const two_state_rates *r) {
    subject s = read_gene(
        "genes:\n  vela:\n    start: steady\n    promoter:\n"
        "      shut: {to: {open: %g}}\n      open: {to: {shut: %g}, initiates: %g}\n"
        "    transcript: {decay: 1}\nrun: {until: 10, every: 1, settle: 200}\n",
        r->open, r->shut, r->initiate);
    const double time = 5;
    tarry_exact_counts counts;
    find(&s, 0, &time, 1, &counts);
    compare(&counts, by_kummer, r, 20);
    tarry_exact_counts_release(&counts);
    release(&s);
}

START_TEST(two_states_follow_kummers_function) {
    static const two_state_rates sets[] = {
        {0.5, 2, 20}, {0.3, 0.3, 40}, {0.5, 50, 500}, {2, 1, 10}};
    for (size_t i = 0; i < sizeof sets / sizeof *sets; i++)
        check_two_states(&sets[i]);
}
END_TEST

/* ---- always active: Poisson ------------------------------------------------------------------ */

static double by_poisson(const void *context, unsigned n) {
    const double mean = *(const double *)context;
    return mean > 0 ? gsl_ran_poisson_pdf(n, mean) : n == 0;
}

/* An always active gene from empty: the count at t is Poisson with mean rate * integral from 0 to t
 * of P(begun u ago and there now) (M/G/infinity; common practice). */
typedef struct always {
    const char *stages; /* of the transcript, with its decay */
    size_t stage;
    double (*present)(double u);
} always;

static double fixed_then_decay(double u) {
    return u < 3 ? 0 : exp(-0.25 * (u - 3));
}

static double in_fixed(double u) {
    return u < 3;
}

static double in_gamma(double u) { /* mean 4, sd 2: shape 4, scale 1 */
    return gsl_cdf_gamma_Q(u, 4, 1);
}

static double in_second(double u) { /* two exponential stages of means 2 and 5 */
    return (exp(-u / 5) - exp(-u / 2)) * (1 / 2.0) / (1 / 2.0 - 1 / 5.0);
}

static double in_lossy(double u) { /* a fixed stage of 3 with a loss of 0.2, then decay 0.25 */
    return u < 3 ? 0 : exp(-0.6 - 0.25 * (u - 3));
}

static double in_uniform_life(double u) { /* after a fixed 1, a lifetime between 2 and 6 */
    const double x = u - 1;
    return x < 0 ? 0 : x < 2 ? 1 : x < 6 ? (6 - x) / 4 : 0;
}

static double in_values(double u) { /* a table of 1, 2 and 5 with shares 0.5, 0.3 and 0.2 */
    return u < 1 ? 1 : u < 2 ? 0.5 : u < 5 ? 0.2 : 0;
}

static double in_mix(double u) { /* fixed 2 (share 0.3) or exponential 4 (0.7) */
    return 0.3 * (u < 2) + 0.7 * exp(-u / 4);
}

static double call_present(double u, void *context) {
    return ((const always *)context)->present(u);
}

static double integrate_present(const always *a, double t) {
    static const double cuts[] = {0, 1, 2, 3, 5, 7, 8, 10, 14, 20, 30};
    gsl_integration_workspace *w = gsl_integration_workspace_alloc(1000);
    gsl_function f = {call_present, (void *)(uintptr_t)a};
    double sum = 0, part, off;
    for (size_t i = 0; i + 1 < sizeof cuts / sizeof *cuts && cuts[i] < t; i++) {
        ck_assert_int_eq(gsl_integration_qag(&f, cuts[i], fmin(cuts[i + 1], t), 1e-13, 1e-12, 1000,
                                             GSL_INTEG_GAUSS31, w, &part, &off),
                         0);
        sum += part;
    }
    gsl_integration_workspace_free(w);
    return sum;
}

START_TEST(an_active_genes_counts_are_poisson) {
    static const always cases[] = {
        {"{stages: {nascent: {fixed: 3}}, decay: 0.25}", 1, fixed_then_decay},
        {"{stages: {nascent: {fixed: 3}}, decay: 0.25}", 0, in_fixed},
        {"{stages: {nascent: {gamma: {mean: 4, sd: 2}}}, decay: 0.25}", 0, in_gamma},
        {"{stages: {a: {exponential: {mean: 2}}, b: {exponential: {mean: 5}}}, decay: 1}", 1,
         in_second},
        {"{stages: {a: {lasts: {fixed: 3}, lost: 0.2}}, decay: 0.25}", 1, in_lossy},
        {"{stages: {a: {fixed: 1}}, lifetime: {uniform: {from: 2, to: 6}}}", 1, in_uniform_life},
        {"{stages: {a: {table: {values: [1, 2, 5], weights: [5, 3, 2]}}}, decay: 1}", 0, in_values},
        {"{stages: {a: {mix: [{share: 0.3, lasts: {fixed: 2}}, {share: 0.7, lasts: {exponential: "
         "{mean: 4}}}]}}, decay: 1}",
         0, in_mix},
    };
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        subject s = read_gene("genes:\n  vela: {promoter: {on: {initiates: 7}}, transcript: %s}\n",
                              cases[i].stages);
        static const double times[] = {0.5, 2.5, 4, 10};
        enum { N = sizeof times / sizeof *times };
        tarry_exact_counts counts[N];
        tarry_exact_moments moments[N];
        find(&s, cases[i].stage, times, N, counts);
        find_moments(&s, cases[i].stage, times, N, moments);
        for (int t = 0; t < N; t++) {
            const double mean = 7 * integrate_present(&cases[i], times[t]);
            compare(&counts[t], by_poisson, &mean, 1);
            ck_assert_double_eq_tol(moments[t].mean, mean, 1e-8 * (1 + mean));
            ck_assert_double_eq_tol(moments[t].variance, mean, 1e-7 * (1 + mean));
            tarry_exact_counts_release(&counts[t]);
        }
        release(&s);
    }
}
END_TEST

/* ---- from the shut state --------------------------------------------------------------------- */

/* Check-values: two states with rates 0.5, 2 and 20 from shut and empty, decay 1; mean and variance
 * by the moment equations. */
START_TEST(an_induction_follows_the_moment_equations) {
    static const double times[] = {0.5, 1, 2, 5, 10};
    static const double mean[] = {0.72047506, 1.76636372, 3.11573264, 3.95509029, 3.99969733};
    static const double variance[] = {3.61729876, 10.93795987, 19.41553742, 22.23344836,
                                      22.28541126};
    enum { N = sizeof times / sizeof *times };
    /* once by a start, once by a protocol's step from a gene that is shut for good */
    static const char *const models[] = {
        "genes: {vela: {promoter: {shut: {to: {open: 0.5}}, open: {to: {shut: 2}, initiates: 20}}, "
        "transcript: {decay: 1}}}\n",
        "parameters: {k: 0}\n"
        "genes: {vela: {promoter: {shut: {to: {open: k}}, open: {to: {shut: 2}, initiates: 20}}, "
        "transcript: {decay: 1}}}\nprotocol: [{at: 0, set: {k: 0.5}}]\n"
        "run: {until: 10, every: 1, settle: 30}\n"};
    for (size_t m = 0; m < 2; m++) {
        subject s = read_gene("%s", models[m]);
        tarry_exact_counts counts[N];
        tarry_exact_moments moments[N];
        find(&s, 0, times, N, counts);
        find_moments(&s, 0, times, N, moments);
        for (int t = 0; t < N; t++) {
            double first = 0, second = 0;
            for (size_t n = 0; n < counts[t].n; n++) {
                first += (double)n * counts[t].p[n];
                second += (double)n * (double)n * counts[t].p[n];
            }
            ck_assert_double_eq_tol(first, mean[t], 6e-9);
            ck_assert_double_eq_tol(second - first * first, variance[t], 6e-9);
            ck_assert_double_eq_tol(moments[t].mean, mean[t], 6e-9);
            ck_assert_double_eq_tol(moments[t].variance, variance[t], 2e-8);
            tarry_exact_counts_release(&counts[t]);
        }
        release(&s);
    }
}
END_TEST

/* ---- by the master equation ------------------------------------------------------------------ */

/* A promoter of three states, the last of which initiates and then leaves by the initiation itself
 * (a paused polymerase that is released), counted up to `most` transcripts. */
enum { STATES = 3, MOST = 80 };

static size_t place(size_t state, size_t n) {
    return state * (MOST + 1) + n;
}

static size_t add_move(master_move *moves, size_t n, size_t from, size_t to, double rate) {
    moves[n] = (master_move){from, to, rate};
    return n + 1;
}

static double by_array(const void *context, unsigned n) {
    return n <= MOST ? ((const double *)context)[n] : 0;
}

START_TEST(moves_that_initiate_follow_the_master_equation) {
    static master_move moves[8 * STATES * (MOST + 1)];
    static double p[STATES * (MOST + 1)];
    double marginal[MOST + 1] = {0};
    size_t n_moves = 0;
    for (size_t n = 0; n <= MOST; n++) {
        n_moves = add_move(moves, n_moves, place(0, n), place(1, n), 0.3);
        n_moves = add_move(moves, n_moves, place(1, n), place(0, n), 0.2);
        n_moves = add_move(moves, n_moves, place(1, n), place(2, n), 2.5);
        if (n < MOST) {
            n_moves = add_move(moves, n_moves, place(2, n), place(1, n + 1), 6);
            n_moves = add_move(moves, n_moves, place(1, n), place(1, n + 1), 0.7);
        }
        for (size_t s = 0; s < STATES && n > 0; s++)
            n_moves = add_move(moves, n_moves, place(s, n), place(s, n - 1), 0.1 * (double)n);
    }
    p[place(0, 0)] = 1;
    master_solve(STATES * (MOST + 1), moves, n_moves, p, 7);
    for (size_t s = 0; s < STATES; s++)
        for (size_t n = 0; n <= MOST; n++)
            marginal[n] += p[place(s, n)];
    subject s = read_gene("genes:\n  vela:\n    promoter:\n      idle: {to: {ready: 0.3}}\n"
                          "      ready: {to: {idle: 0.2, paused: 2.5}, initiates: 0.7}\n"
                          "      paused: {to: {ready: {rate: 6, initiates: yes}}}\n"
                          "    transcript: {decay: 0.1}\n");
    const double time = 7;
    tarry_exact_counts counts;
    find(&s, 0, &time, 1, &counts);
    unsigned n_compared = 0;
    for (unsigned n = 0; n < counts.n; n++, n_compared++)
        ck_assert_double_eq_tol(counts.p[n], by_array(marginal, n), 1e-11);
    ck_assert_uint_gt(n_compared, 30);
    tarry_exact_counts_release(&counts);
    release(&s);
}
END_TEST

/* GI/M/infinity (Takacs 1962, Introduction to the Theory of Queues): initiations apart by an
 * exponential time and an Erlang clearance, transcripts that decay at rate d; with phi the
 * transform of the time between initiations at d, E[N] = rate/d and E[N (N - 1)] = E[N] phi/(1 -
 * phi). */
START_TEST(a_clearance_follows_takacs) {
    const double k = 4, clearance = 0.5, d = 0.3;
    subject s = read_gene("genes:\n  vela:\n    clearance: {erlang: {steps: 3, mean: 0.5}}\n"
                          "    promoter: {on: {initiates: 4}}\n    transcript: {decay: 0.3}\n"
                          "run: {until: 10, every: 1, settle: 200}\n");
    const double time = 0;
    tarry_exact_moments moments;
    find_moments(&s, 0, &time, 1, &moments);
    const double mean = 1 / (1 / k + clearance) / d;
    const double phi = k / (k + d) * pow(6 / (6 + d), 3);
    ck_assert_double_eq_tol(moments.mean, mean, 1e-9 * mean);
    ck_assert_double_eq_tol(moments.variance, mean * phi / (1 - phi) + mean - mean * mean, 1e-8);
    release(&s);
}
END_TEST

/* A state that lasts an Erlang time is a row of states with exponential dwells: the same law. */
START_TEST(an_erlang_state_is_a_row_of_phases) {
    subject one = read_gene(
        "genes:\n  vela:\n    start: steady\n    promoter:\n"
        "      shut: {lasts: {erlang: {steps: 3, mean: 6}}, then: {open: 1}}\n"
        "      open: {to: {shut: 1.5}, initiates: 5}\n    transcript: {decay: 0.4}\n");
    subject other = read_gene(
        "genes:\n  vela:\n    start: steady\n    promoter:\n      a: {to: {b: 0.5}}\n"
        "      b: {to: {c: 0.5}}\n      c: {to: {open: 0.5}}\n"
        "      open: {to: {a: 1.5}, initiates: 5}\n    transcript: {decay: 0.4}\n");
    const double times[] = {1, 8};
    tarry_exact_counts a[2], b[2];
    find(&one, 0, times, 2, a);
    find(&other, 0, times, 2, b);
    for (int t = 0; t < 2; t++) {
        ck_assert_uint_eq(a[t].n, b[t].n);
        for (size_t n = 0; n < a[t].n; n++)
            ck_assert_double_eq_tol(a[t].p[n], b[t].p[n], 1e-12);
        tarry_exact_counts_release(&a[t]);
        tarry_exact_counts_release(&b[t]);
    }
    release(&one);
    release(&other);
}
END_TEST

/* ---- what is refused ---------------------------------------------------------------------------
 */

START_TEST(what_is_not_covered_says_why) {
    static const struct {
        const char *gene, *why;
    } cases[] = {
        {"promoter: {a: {lasts: {fixed: 2}, then: {b: 1}}, b: {to: {a: 1}, initiates: 1}}, "
         "transcript: {decay: 1}",
         "the state 'a' lasts a time that is no sum or mix of exponential times"},
        {"clearance: {gamma: {mean: 2, sd: 1}}, promoter: {on: {initiates: 1}}, transcript: "
         "{decay: "
         "1}",
         "'vela.clearance' lasts a time that is no sum or mix of exponential times"},
        {"promoter: {a: {to: {b: \"repress(vela.transcript, 3, 2)\"}}, b: {to: {a: 1}, initiates: "
         "1}}, transcript: {decay: 1}",
         "the rate of 'vela.a>b' reads counts of species"},
    };
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        subject s = read_gene("genes: {vela: {%s}}\n", cases[i].gene);
        ck_assert_ptr_nonnull(s.gene.why);
        ck_assert_str_eq(s.gene.why, cases[i].why);
        release(&s);
    }
    subject s = read_gene("genes: {vela: {promoter: {on: {initiates: 1}}, transcript: {stages: {a: "
                          "{exponential: {mean: 2}}}, no_overtaking: true, decay: 1}}}\n");
    ck_assert_ptr_null(s.gene.why);
    ck_assert_str_eq(s.gene.transcript.stages[0].why, "its molecules keep in order");
    ck_assert_str_eq(s.gene.transcript.stages[1].why, "its molecules keep in order");
    release(&s);
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"two states follow Kummer's function", two_states_follow_kummers_function},
        {"an active gene's counts are Poisson", an_active_genes_counts_are_poisson},
        {"an induction follows the moment equations", an_induction_follows_the_moment_equations},
        {"moves that initiate follow the master equation",
         moves_that_initiate_follow_the_master_equation},
        {"a clearance follows Takacs", a_clearance_follows_takacs},
        {"an Erlang state is a row of phases", an_erlang_state_is_a_row_of_phases},
        {"what is not covered says why", what_is_not_covered_says_why},
    };
    return run_tests("exact counts", tests, sizeof tests / sizeof *tests);
}
