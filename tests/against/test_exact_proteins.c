/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Exact laws of proteins against compound Poisson laws in closed form, and moments against
 * formulas. Every probability above 1e-12 must agree to a relative 1e-6. */

#include "subject.h"
#include "support.h"

#include "exact/counts.h"
#include "exact/covariance.h"
#include "exact/first.h"
#include "exact/moments.h"

#include <gsl/gsl_integration.h>
#include <gsl/gsl_randist.h>
#include <gsl/gsl_sf_gamma.h>
#include <math.h>
#include <stdlib.h>

static const double least = 1e-12, relative = 1e-6;

static tarry_exact_counts law_of(const subject *s, size_t stage, double time) {
    char what[2048];
    tarry_error error = {0};
    tarry_exact_carried carried = {0};
    tarry_exact_counts counts = {0};
    const double horizon = s->model->network.run.settle + s->model->network.run.until;
    ck_assert_uint_lt(stage, s->gene.protein.n);
    ck_assert_msg(s->gene.protein.stages[stage].why == NULL, "%s",
                  s->gene.protein.stages[stage].why);
    int code = tarry_exact_carry_protein(&s->gene, stage, horizon, &carried, &error);
    if (code == 0)
        code = tarry_exact_counts_at(&s->gene, &carried, &time, 1, TARRY_COUNTS_MOST, &counts,
                                     &error);
    ck_assert_msg(code == 0, "%s", tarry_error_text(&error, what, (int)sizeof what));
    tarry_exact_carried_release(&carried);
    return counts;
}

/* ---- laws ------------------------------------------------------------------------------------ */

/* Of an active gene each transcript brings its proteins independent of all others: with rate *
 * (integral over its ages of P(it has j there)) = jumps[j], n P(n) = sum of j jumps[j] P(n - j),
 * and P(0) = exp(- sum of jumps[1..]) (compound Poisson; Panjer 1981, ASTIN Bull. 12:22). */
static void compare(const tarry_exact_counts *counts, const double *jumps, size_t n_jumps,
                    double sum, size_t n_least) {
    double *p = calloc(counts->n, sizeof *p);
    size_t n_compared = 0;
    ck_assert_ptr_nonnull(p);
    p[0] = exp(-sum);
    for (size_t n = 0; n < counts->n; n++) {
        for (size_t j = 1; j <= n && j < n_jumps; j++)
            p[n] += (double)j * jumps[j] * p[n - j] / (double)n;
        if (p[n] < least)
            continue;
        n_compared++;
        ck_assert_msg(fabs(counts->p[n] - p[n]) < relative * p[n],
                      "P(%zu) is %.17g, not %.17g (%.2g)", n, counts->p[n], p[n],
                      counts->p[n] / p[n] - 1);
    }
    ck_assert_uint_ge(n_compared, n_least);
    free(p);
}

/* The integral from 0 to x of the Poisson probability of j with mean k a (incomplete gamma
 * function). */
static double integrated_poisson(unsigned j, double k, double x) {
    return gsl_sf_gamma_inc_P(j + 1, k * x) / k;
}

/* Transcripts live 4 min, proteins 5: a transcript of age a has Poisson proteins of mean k times
 * the overlap of its life with the last 5 min. */
START_TEST(fixed_lives) {
    enum { JUMPS = 200 };
    const double rate = 1.5, k = 3, T = 4, L = 5;
    subject s = subject_read(
        "genes: {vela: {promoter: {on: {initiates: 1.5}}, transcript: {lifetime: {fixed: 4}}, "
        "protein: {translation: 3, lifetime: {fixed: 5}}}}\nrun: {until: 20, every: 1}\n");
    double jumps[JUMPS] = {0}, sum = 0;
    for (unsigned j = 1; j < JUMPS; j++) {
        jumps[j] = rate *
                   (2 * integrated_poisson(j, k, T) + (L - T) * gsl_ran_poisson_pdf(j, k * T));
        sum += jumps[j];
    }
    tarry_exact_counts counts = law_of(&s, 0, 15);
    compare(&counts, jumps, JUMPS, sum, 150);
    tarry_exact_counts_release(&counts);
    subject_release(&s);
}
END_TEST

typedef struct early {
    unsigned j;
    double k, d, lag;
} early;

/* A transcript with an exponential life that begins `lag` after its initiation has made j proteins
 * by age a: it was gone after j of them, or is still there. */
static double made_by(double age, void *context) {
    const early *e = context;
    const double a = age - e->lag, both = e->k + e->d, q = e->k / both;
    if (a <= 0)
        return 0;
    return pow(q, e->j) * (1 - q) * gsl_sf_gamma_inc_P(e->j + 1, both * a) +
           exp(-e->d * a) * gsl_ran_poisson_pdf(e->j, e->k * a);
}

/* Proteins from the start of the record, none of which is gone yet. The first 2 min of a transcript
 * are a stage without translation. */
START_TEST(exponential_lives_of_transcripts) {
    enum { JUMPS = 400 };
    const double rate = 0.8, time = 12;
    subject s = subject_read(
        "genes: {vela: {promoter: {on: {initiates: 0.8}}, transcript: {stages: {nascent: {fixed: "
        "2}}, decay: 0.5}, protein: {translation: 4, lifetime: {fixed: 30}}}}\nrun: {until: 20, "
        "every: 1}\n");
    gsl_integration_workspace *w = gsl_integration_workspace_alloc(1000);
    double jumps[JUMPS] = {0}, sum = 0, off;
    for (unsigned j = 1; j < JUMPS; j++) {
        early e = {j, 4, 0.5, 2};
        gsl_function f = {made_by, &e};
        ck_assert_int_eq(
            gsl_integration_qag(&f, 2, time, 0, 1e-11, 1000, GSL_INTEG_GAUSS61, w, &jumps[j], &off),
            0);
        jumps[j] *= rate;
        sum += jumps[j];
    }
    tarry_exact_counts counts = law_of(&s, 0, time);
    compare(&counts, jumps, JUMPS, sum, 150);
    tarry_exact_counts_release(&counts);
    gsl_integration_workspace_free(w);
    subject_release(&s);
}
END_TEST

/* ---- moments --------------------------------------------------------------------------------- */

/* Two-state gene, exponential lives: var/mean - 1 = k/(d + e) (1 + k_on-off part), the three-step
 * cascade (Paulsson 2005, Phys. Life Rev. 2:157; from memory): with rates a, b, K = a + b, p = a/K,
 * initiation m, decay d, translation k, protein decay e,
 * var = mean + mean k/(d + e) + mean^2 (1 - p)/p d e (d + e + K)/((d + e) (d + K) (e + K)). */
START_TEST(a_cascade) {
    const double a = 0.2, b = 0.7, m = 6, d = 0.15, k = 2, e = 0.05, K = a + b, p = a / K;
    const double mean = m * p / d * k / e;
    const double variance = mean + mean * k / (d + e) +
                            mean * mean * (1 - p) / p * d * e * (d + e + K) /
                                ((d + e) * (d + K) * (e + K));
    subject s = subject_read(
        "genes: {vela: {start: steady, copies: 2, promoter: {shut: {to: {open: 0.2}}, open: {to: "
        "{shut: 0.7}, initiates: 6}}, transcript: {decay: 0.15}, protein: {translation: 2, decay: "
        "0.05}}}\nrun: {until: 10, every: 1, settle: 900}\n");
    tarry_exact_carried proteins = {0}, seen = {0};
    tarry_exact_view view = subject_view(&s, "vela.protein");
    tarry_exact_moments x, y;
    tarry_error error = {0};
    const double time = 5;
    ck_assert_int_eq(tarry_exact_carry_protein(&s.gene, 0, 910, &proteins, &error), 0);
    ck_assert_int_eq(tarry_exact_carry_view(&s.gene, &view, 910, &seen, &error), 0);
    ck_assert_int_eq(tarry_exact_moments_at(&s.gene, &proteins, &time, 1, &x, &error), 0);
    ck_assert_int_eq(tarry_exact_moments_at(&s.gene, &seen, &time, 1, &y, &error), 0);
    ck_assert_double_eq_tol(x.mean, 2 * mean, 1e-8 * mean);
    ck_assert_double_eq_tol(y.mean, 2 * mean, 1e-8 * mean);
    ck_assert_double_eq_tol(x.variance, 2 * variance, 1e-7 * variance);
    ck_assert_double_eq_tol(y.variance, 2 * variance, 1e-7 * variance);
    tarry_exact_carried_release(&proteins);
    tarry_exact_carried_release(&seen);
    subject_release(&s);
}
END_TEST

/* With lags and losses of all sorts: mean and variance by the derivatives of the generating
 * function, by its law, and by the covariance of what is seen twice, at lag 0. */
START_TEST(three_routes_to_one_variance) {
    subject s = subject_read(
        "genes:\n  vela:\n    start: steady\n    promoter:\n"
        "      shut: {to: {open: 0.4}}\n      open: {to: {shut: 0.6}, initiates: 1.5}\n"
        "    transcript:\n      stages: {a: {lasts: {gamma: {mean: 3, sd: 1.5}}, lost: 0.05}}\n"
        "      lifetime: {uniform: {from: 3, to: 9}}\n"
        "    protein:\n      translation: 0.8\n"
        "      stages: {b: {lasts: {exponential: {mean: 2}}, lost: 0.1}, c: {fixed: 3}}\n"
        "      decay: 0.2\nrun: {until: 10, every: 1, settle: 300}\n");
    static const char *const names[] = {"vela.b", "vela.c", "vela.protein"};
    for (size_t i = 0; i < 3; i++) {
        const tarry_exact_view view = subject_view(&s, names[i]);
        tarry_exact_carried carried = {0};
        tarry_exact_covariance c = {0};
        tarry_exact_moments m;
        tarry_error error = {0};
        const char *why = NULL;
        const double time = 5;
        double first = 0, second = 0;
        ck_assert_int_eq(tarry_exact_carry_view(&s.gene, &view, 310, &carried, &error), 0);
        ck_assert_int_eq(tarry_exact_moments_at(&s.gene, &carried, &time, 1, &m, &error), 0);
        ck_assert_int_eq(tarry_exact_covariance_init(&s.gene, &view, &view, 0, 10, 310, &s.arena,
                                                     &c, &why, &error),
                         0);
        ck_assert_msg(why == NULL, "%s", why);
        tarry_exact_counts counts = law_of(&s, i, time);
        for (size_t n = 0; n < counts.n; n++) {
            first += (double)n * counts.p[n];
            second += (double)n * (double)n * counts.p[n];
        }
        ck_assert_double_eq_tol(c.mean[0], m.mean, 1e-8 * m.mean);
        ck_assert_double_eq_tol(first, m.mean, 1e-6 * m.mean);
        ck_assert_double_eq_tol(tarry_exact_covariance_at(&c, 0), m.variance, 1e-6 * m.variance);
        ck_assert_double_eq_tol(second - first * first, m.variance, 1e-6 * m.variance);
        tarry_exact_counts_release(&counts);
        tarry_exact_carried_release(&carried);
        tarry_exact_covariance_release(&c);
    }
    subject_release(&s);
}
END_TEST

/* ---- first protein --------------------------------------------------------------------------- */

typedef struct none {
    double rate, k, d, t;
} none;

/* 1 - P(a transcript of age a has made none), of an exponential life. */
static double some(double a, void *context) {
    const none *n = context;
    const double both = n->k + n->d;
    return 1 - (n->d + n->k * exp(-both * a)) / both;
}

/* From an empty start no protein is begun by t with exp(-rate * integral of what has made some);
 * a fixed maturation moves it. */
START_TEST(the_first_protein) {
    const double times[] = {0, 1, 3, 6, 10};
    subject s = subject_read(
        "genes: {vela: {promoter: {on: {initiates: 0.3}}, transcript: {decay: 0.4}, protein: "
        "{translation: 0.5, stages: {dark: {fixed: 2}}, decay: 0.1}}}\nrun: {until: 20, every: "
        "1}\n");
    gsl_integration_workspace *w = gsl_integration_workspace_alloc(1000);
    tarry_error error = {0};
    double begun[5], there[5];
    ck_assert_int_eq(tarry_exact_no_protein_yet(&s.gene, 0, 0, times, 5, 20, begun, &error), 0);
    ck_assert_int_eq(tarry_exact_no_protein_yet(&s.gene, 1, 0, times, 5, 20, there, &error), 0);
    for (int i = 0; i < 5; i++) {
        none n = {0.3, 0.5, 0.4, times[i]};
        gsl_function f = {some, &n};
        double sum = 0, later = 0, off;
        gsl_integration_qag(&f, 0, times[i], 0, 1e-11, 1000, GSL_INTEG_GAUSS61, w, &sum, &off);
        gsl_integration_qag(&f, 0, fmax(times[i] - 2, 0), 0, 1e-11, 1000, GSL_INTEG_GAUSS61, w,
                            &later, &off);
        ck_assert_double_eq_tol(begun[i], exp(-0.3 * sum), 1e-8);
        ck_assert_double_eq_tol(there[i], exp(-0.3 * later), 1e-8);
    }
    gsl_integration_workspace_free(w);
    subject_release(&s);
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"fixed lives", fixed_lives},
        {"exponential lives of transcripts", exponential_lives_of_transcripts},
        {"a cascade", a_cascade},
        {"three routes to one variance", three_routes_to_one_variance},
        {"the first protein", the_first_protein},
    };
    return run_tests("exact proteins", tests, sizeof tests / sizeof *tests);
}
