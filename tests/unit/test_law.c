/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Laws of waiting times against GSL's laws, quadrature by GSL and closed forms.
 *
 * GSL (2.7) is the outside source: gsl_cdf_* and gsl_ran_*_pdf for the families it has, QUADPACK's
 * rules in gsl_integration for moments, integrals and sums. */
#include "model/incomplete_gamma.h"
#include "model/law.h"
#include "support.h"

#include <gsl/gsl_cdf.h>
#include <gsl/gsl_errno.h>
#include <gsl/gsl_integration.h>
#include <gsl/gsl_randist.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

#define N_OF(array) (sizeof(array) / sizeof(array)[0])

static void check_near(const char *what, double x, double value, double truth, double limit) {
    const double error = fabs(value - truth) / fmax(fabs(truth), 1e-290);
    ASSERT_FAST(error <= limit, "%s at %g: %.17g, should be %.17g (relative error %g)", what, x,
                value, truth, error);
}

/* ---- families that GSL has ---- */

/* A law and the same law as GSL has it. */
typedef struct known {
    const char *name;
    tarry_law law;
    double (*lower)(double x, double a, double b);
    double (*upper)(double x, double a, double b);
    double (*density)(double x, double a, double b);
    double a, b;
} known;

static double exponential_lower(double x, double a, double b) {
    (void)b;
    return gsl_cdf_exponential_P(x, a);
}

static double exponential_upper(double x, double a, double b) {
    (void)b;
    return gsl_cdf_exponential_Q(x, a);
}

static double exponential_density(double x, double a, double b) {
    (void)b;
    return gsl_ran_exponential_pdf(x, a);
}

/* The normal law of mean a and sd b, given that it is above 0. */
static double normal_lower(double x, double a, double b) {
    return (gsl_cdf_gaussian_P(x - a, b) - gsl_cdf_gaussian_P(-a, b)) / gsl_cdf_gaussian_Q(-a, b);
}

static double normal_upper(double x, double a, double b) {
    return gsl_cdf_gaussian_Q(x - a, b) / gsl_cdf_gaussian_Q(-a, b);
}

static double normal_density(double x, double a, double b) {
    return gsl_ran_gaussian_pdf(x - a, b) / gsl_cdf_gaussian_Q(-a, b);
}

/* Lognormal of mean and sd m, s: sigma^2 = log(1 + s^2/m^2), zeta = log m - sigma^2/2 (the moments
 * of exp of a normal variable). */
#define LOGNORMAL(m, s)                                                                            \
    {TARRY_LAW_LOGNORMAL, m, s, 0, NULL, NULL, NULL}, gsl_cdf_lognormal_P, gsl_cdf_lognormal_Q,    \
        gsl_ran_lognormal_pdf, 0, 0
#define GAMMA(m, s)                                                                                \
    {TARRY_LAW_GAMMA, m, s, 0, NULL, NULL, NULL}, gsl_cdf_gamma_P, gsl_cdf_gamma_Q,                \
        gsl_ran_gamma_pdf, (m) * (m) / ((s) * (s)), (s) * (s) / (m)

static const known all_known[] = {
    {"exponential",
     {TARRY_LAW_EXPONENTIAL, 3, 0, 0, NULL, NULL, NULL},
     exponential_lower,
     exponential_upper,
     exponential_density,
     3,
     0},
    {"erlang 1",
     {TARRY_LAW_ERLANG, 3, 1, 0, NULL, NULL, NULL},
     gsl_cdf_gamma_P,
     gsl_cdf_gamma_Q,
     gsl_ran_gamma_pdf,
     1,
     3},
    {"erlang 7",
     {TARRY_LAW_ERLANG, 3.5, 7, 0, NULL, NULL, NULL},
     gsl_cdf_gamma_P,
     gsl_cdf_gamma_Q,
     gsl_ran_gamma_pdf,
     7,
     0.5},
    {"gamma 4", GAMMA(8.0, 4.0)},
    {"gamma 2.56", GAMMA(8.0, 5.0)},
    {"gamma 0.25", GAMMA(1.0, 2.0)},
    {"gamma 400", GAMMA(20.0, 1.0)},
    {"lognormal 0.3", LOGNORMAL(25.0, 8.0)},
    {"lognormal 2", LOGNORMAL(1.0, 2.0)},
    {"normal far from 0",
     {TARRY_LAW_NORMAL, 30, 2, 0, NULL, NULL, NULL},
     normal_lower,
     normal_upper,
     normal_density,
     30,
     2},
    {"normal cut at 0",
     {TARRY_LAW_NORMAL, 5, 3, 0, NULL, NULL, NULL},
     normal_lower,
     normal_upper,
     normal_density,
     5,
     3},
    {"uniform",
     {TARRY_LAW_UNIFORM, 2, 5, 0, NULL, NULL, NULL},
     gsl_cdf_flat_P,
     gsl_cdf_flat_Q,
     gsl_ran_flat_pdf,
     2,
     5},
    {"weibull 2.5",
     {TARRY_LAW_WEIBULL, 6, 2.5, 0, NULL, NULL, NULL},
     gsl_cdf_weibull_P,
     gsl_cdf_weibull_Q,
     gsl_ran_weibull_pdf,
     6,
     2.5},
    {"weibull 0.7",
     {TARRY_LAW_WEIBULL, 6, 0.7, 0, NULL, NULL, NULL},
     gsl_cdf_weibull_P,
     gsl_cdf_weibull_Q,
     gsl_ran_weibull_pdf,
     6,
     0.7},
};

static known get_known(size_t i) {
    known k = all_known[i];
    if (k.law.kind == TARRY_LAW_LOGNORMAL) {
        const double variance = log(1 + pow(k.law.b / k.law.a, 2));
        k.a = log(k.law.a) - variance / 2;
        k.b = sqrt(variance);
    }
    return k;
}

/* Places from deep in the lower to deep in the upper tail. */
static size_t list_places(const known *k, double *x) {
    const double tails[] = {1e-60, 1e-30, 1e-12, 1e-6, 1e-3, 0.02, 0.1, 0.25, 0.4};
    size_t n = 0;
    for (size_t i = 0; i < N_OF(tails); i++) {
        x[n++] = tarry_law_quantile(&k->law, tails[i], 1);
        x[n++] = tarry_law_quantile(&k->law, 1, tails[i]);
    }
    x[n++] = tarry_law_quantile(&k->law, 0.5, 0.5);
    return n;
}

START_TEST(tails_are_those_of_gsl) {
    for (size_t i = 0; i < N_OF(all_known); i++) {
        const known k = get_known(i);
        double x[32];
        const size_t n = list_places(&k, x);
        for (size_t j = 0; j < n; j++) {
            /* What is left of a normal law has no GSL function that keeps its digits next to 0. */
            const bool cancels = k.law.kind == TARRY_LAW_NORMAL && x[j] < 0.3 * k.law.a;
            if (!cancels)
                check_near(k.name, x[j], tarry_law_cdf(&k.law, x[j]), k.lower(x[j], k.a, k.b),
                           3e-12);
            check_near(k.name, x[j], tarry_law_survival(&k.law, x[j]), k.upper(x[j], k.a, k.b),
                       3e-12);
            check_near(k.name, x[j], tarry_law_family_of(k.law.kind)->density(&k.law, x[j]),
                       k.density(x[j], k.a, k.b), 1e-11);
        }
        ck_assert_double_eq(tarry_law_cdf(&k.law, 0), 0);
        ck_assert_double_eq(tarry_law_survival(&k.law, 0), 1);
        ck_assert_double_eq(tarry_law_cdf(&k.law, INFINITY), 1);
        ck_assert_double_eq(tarry_law_survival(&k.law, INFINITY), 0);
    }
}
END_TEST

START_TEST(quantiles_undo_the_cdf_of_gsl) {
    const double tails[] = {1e-60, 1e-16, 1e-9, 1e-4, 0.03, 0.2, 0.5};
    for (size_t i = 0; i < N_OF(all_known); i++) {
        const known k = get_known(i);
        for (size_t j = 0; j < N_OF(tails); j++) {
            const double low = tarry_law_quantile(&k.law, tails[j], 1 - tails[j]);
            const double high = tarry_law_quantile(&k.law, 1 - tails[j], tails[j]);
            /* A lag is a double: a shift in its last digit moves p by x times the density. */
            const double grain = 1e-15 * low * k.density(low, k.a, k.b) / tails[j];
            if (k.law.kind != TARRY_LAW_NORMAL || low > 0.3 * k.law.a)
                check_near(k.name, low, k.lower(low, k.a, k.b), tails[j], 3e-12 + grain);
            const double high_grain = 1e-15 * high * k.density(high * (1 - 1e-12), k.a, k.b) /
                                      tails[j];
            check_near(k.name, high, k.upper(high, k.a, k.b), tails[j], 3e-12 + high_grain);
        }
    }
}
END_TEST

/* ---- moments and integrals ---- */

typedef struct moment {
    const known *k;
    double centre;
    int power; /* of x - centre, times the density, over log x; -1: the survival, over x */
} moment;

static double moment_at(double place, void *context) {
    const moment *m = context;
    const double x = m->power < 0 ? place : exp(place);
    if (m->power < 0)
        return m->k->upper(x, m->k->a, m->k->b);
    return x * gsl_pow_int(x - m->centre, m->power) * m->k->density(x, m->k->a, m->k->b);
}

/* The integral from 0 to `to`, ended at quantiles so that no panel is blind. */
static double integrate(moment m, double to) {
    gsl_integration_workspace *space = gsl_integration_workspace_alloc(2000);
    gsl_function f = {moment_at, &m};
    const double ends[] = {1e-9, 1e-3, 0.3, 0.7, 0.999};
    double sum = 0, from = m.power < 0 ? 0 : tarry_law_quantile(&m.k->law, 1e-20, 1);
    for (size_t i = 0; i <= N_OF(ends) + 2; i++) {
        double end = to, value, error;
        if (i < N_OF(ends))
            end = tarry_law_quantile(&m.k->law, ends[i], 1 - ends[i]);
        else if (i < N_OF(ends) + 2)
            end = tarry_law_quantile(&m.k->law, 1, i == N_OF(ends) ? 1e-9 : 1e-20);
        end = fmin(end, to);
        if (!(end > from))
            continue;
        const double low = m.power < 0 ? from : log(from), high = m.power < 0 ? end : log(end);
        gsl_integration_qags(&f, low, high, 0, 1e-12, 2000, space, &value, &error);
        ck_assert(error < 1e-10 * fabs(value) + 1e-20);
        sum += value;
        from = end;
    }
    gsl_integration_workspace_free(space);
    return sum;
}

START_TEST(moments_are_integrals_of_gsls_density) {
    for (size_t i = 0; i < N_OF(all_known); i++) {
        const known k = get_known(i);
        const double end = tarry_law_quantile(&k.law, 1, 1e-40);
        const double mean = integrate((moment){&k, 0, 1}, end);
        check_near(k.name, 1, tarry_law_mean(&k.law), mean, 1e-10);
        check_near(k.name, 2, tarry_law_sd(&k.law), sqrt(integrate((moment){&k, mean, 2}, end)),
                   1e-9);
    }
}
END_TEST

START_TEST(survival_integrals_are_those_of_gsls_tail) {
    for (size_t i = 0; i < N_OF(all_known); i++) {
        const known k = get_known(i);
        double x[32];
        const size_t n = list_places(&k, x);
        for (size_t j = 0; j < n; j++)
            check_near(k.name, x[j], tarry_law_survival_integral(&k.law, x[j]),
                       integrate((moment){&k, 0, -1}, x[j]), 1e-10);
        ck_assert_double_eq(tarry_law_survival_integral(&k.law, 0), 0);
        check_near(k.name, INFINITY, tarry_law_survival_integral(&k.law, INFINITY),
                   tarry_law_mean(&k.law), 0);
    }
}
END_TEST

START_TEST(remaining_quantiles_undo_the_integral) {
    const double shares[] = {0x1p-53, 1e-9, 0.01, 0.3, 0.5, 0.7, 0.99, 1 - 1e-6};
    for (size_t i = 0; i < N_OF(all_known); i++) {
        const known k = get_known(i);
        for (size_t j = 0; j < N_OF(shares); j++) {
            const double x = tarry_law_remaining_quantile(&k.law, shares[j]);
            check_near(k.name, x, integrate((moment){&k, 0, -1}, x) / tarry_law_mean(&k.law),
                       shares[j], 1e-10);
        }
        /* Next to 1 rounding rules, but the lag stays within what can be met. */
        const double last = tarry_law_remaining_quantile(&k.law, 1 - 0x1p-53);
        ck_assert(last >= tarry_law_remaining_quantile(&k.law, 1 - 1e-12));
        ck_assert(isfinite(last));
        ck_assert(k.upper(last, k.a, k.b) < 1e-7);
    }
}
END_TEST

/* The remaining time of an exponential lag is the lag itself (no memory), of a fixed one uniform.
 */
START_TEST(remaining_times_with_closed_forms) {
    const tarry_law exponential = {.kind = TARRY_LAW_EXPONENTIAL, .a = 4};
    const tarry_law fixed = {.kind = TARRY_LAW_FIXED, .a = 4};
    for (double p = 1e-7; p < 1; p += 0.01) {
        check_near("exponential", p, tarry_law_remaining_quantile(&exponential, p), -4 * log1p(-p),
                   1e-14);
        check_near("fixed", p, tarry_law_remaining_quantile(&fixed, p), 4 * p, 1e-15);
    }
}
END_TEST

/* ---- incomplete gamma at large shapes ---- */

/* Q(a, x) for whole a is the Poisson sum over k < a (DLMF 8.4.10), P(a, x) the rest (8.4.9 and
 * 8.7.1), here in long double from the largest term of the smaller tail outwards. */
static double poisson_tail(double a, double x, bool upper) {
    long double k = upper ? (long double)a - 1 : (long double)a;
    long double term = expl(k * logl((long double)x) - (long double)x - lgammal(k + 1)), sum = 0;
    while (term > sum * 1e-20L && k >= 0) {
        sum += term;
        term *= upper ? k / x : x / (k + 1);
        k += upper ? -1 : 1;
    }
    return (double)sum;
}

START_TEST(incomplete_gamma_is_a_poisson_sum) {
    const double shapes[] = {1, 5, 19, 20, 21, 100, 1000, 3e4, 1e6};
    for (size_t i = 0; i < N_OF(shapes); i++)
        for (double z = -12; z <= 12; z += 0.37) {
            const double a = shapes[i];
            const double x = a * pow(fmax(1 - 1 / (9 * a) + z / (3 * sqrt(a)), 0.01), 3);
            /* lgammal and the long product lose a * log(a) units of 2^-64. */
            const double limit = 3e-13 + a * log(a + 1) * 1e-19;
            if (x < a)
                check_near("P", x, tarry_gamma_lower(a, x), poisson_tail(a, x, false), limit);
            else
                check_near("Q", x, tarry_gamma_upper(a, x), poisson_tail(a, x, true), limit);
        }
}
END_TEST

/* ---- laws without a density, tables ---- */

START_TEST(fixed_lag) {
    const tarry_law law = {.kind = TARRY_LAW_FIXED, .a = 2.5};
    ck_assert_double_eq(tarry_law_mean(&law), 2.5);
    ck_assert_double_eq(tarry_law_sd(&law), 0);
    ck_assert_double_eq(tarry_law_cdf(&law, 2.5), 1);
    ck_assert_double_eq(tarry_law_cdf(&law, nextafter(2.5, 0)), 0);
    ck_assert_double_eq(tarry_law_survival(&law, 2.5), 0);
    ck_assert_double_eq(tarry_law_survival(&law, nextafter(2.5, 0)), 1);
    ck_assert_double_eq(tarry_law_quantile(&law, 0.1, 0.9), 2.5);
    ck_assert_double_eq(tarry_law_survival_integral(&law, 2), 2);
    ck_assert_double_eq(tarry_law_survival_integral(&law, 3), 2.5);
    ck_assert_double_eq(tarry_law_least(&law), 2.5);
    ck_assert_double_eq(tarry_law_most(&law), 2.5);
}
END_TEST

/* Worked by hand: bins [0,1) 0.2, [1,2) 0, [2,6) 0.8. */
START_TEST(bins_by_hand) {
    const double edges[] = {0, 1, 2, 6}, shares[] = {0.2, 0, 0.8};
    const tarry_law law = {.kind = TARRY_LAW_BINS, .n = 3, .points = edges, .weights = shares};
    check_near("mean", 0, tarry_law_mean(&law), 0.2 * 0.5 + 0.8 * 4, 1e-15);
    /* E x^2 = 0.2 / 3 + 0.8 (6^3 - 2^3) / 12 */
    check_near("sd", 0, tarry_law_sd(&law), sqrt(0.2 / 3 + 0.8 * 208 / 12 - 3.3 * 3.3), 1e-14);
    check_near("cdf", 0.5, tarry_law_cdf(&law, 0.5), 0.1, 1e-15);
    check_near("cdf", 1.5, tarry_law_cdf(&law, 1.5), 0.2, 1e-15);
    check_near("cdf", 3, tarry_law_cdf(&law, 3), 0.4, 1e-15);
    check_near("survival", 1.5, tarry_law_survival(&law, 1.5), 0.8, 1e-15);
    check_near("survival", 5, tarry_law_survival(&law, 5), 0.2, 1e-15);
    check_near("quantile", 0.1, tarry_law_quantile(&law, 0.1, 0.9), 0.5, 1e-15);
    check_near("quantile", 0.4, tarry_law_quantile(&law, 0.4, 0.6), 3, 1e-15);
    check_near("quantile", 0.8, tarry_law_quantile(&law, 0.8, 0.2), 5, 1e-15);
    /* Area under S: 0.9 over [0,1], 0.8 over [1,2], then 0.8 (1 - s/4) over s. */
    check_near("integral", 0.5, tarry_law_survival_integral(&law, 0.5), 0.5 - 0.2 * 0.125, 1e-15);
    check_near("integral", 4, tarry_law_survival_integral(&law, 4), 0.9 + 0.8 + 0.8 * 1.5, 1e-15);
    check_near("remaining", 2.9, tarry_law_remaining_quantile(&law, 2.9 / 3.3), 4, 1e-14);
    ck_assert_double_eq(tarry_law_least(&law), 0);
    ck_assert_double_eq(tarry_law_most(&law), 6);
}
END_TEST

/* Worked by hand: 1 with 0.25, 2 with 0, 4 with 0.75. */
START_TEST(values_by_hand) {
    const double points[] = {1, 2, 4}, shares[] = {0.25, 0, 0.75};
    const tarry_law law = {.kind = TARRY_LAW_VALUES, .n = 3, .points = points, .weights = shares};
    check_near("mean", 0, tarry_law_mean(&law), 3.25, 1e-15);
    check_near("sd", 0, tarry_law_sd(&law), sqrt(0.25 + 12 - 3.25 * 3.25), 1e-14);
    ck_assert_double_eq(tarry_law_cdf(&law, 0.99), 0);
    ck_assert_double_eq(tarry_law_cdf(&law, 1), 0.25);
    ck_assert_double_eq(tarry_law_cdf(&law, 3.99), 0.25);
    ck_assert_double_eq(tarry_law_cdf(&law, 4), 1);
    ck_assert_double_eq(tarry_law_survival(&law, 1), 0.75);
    ck_assert_double_eq(tarry_law_survival(&law, 4), 0);
    ck_assert_double_eq(tarry_law_quantile(&law, 0.25, 0.75), 1);
    ck_assert_double_eq(tarry_law_quantile(&law, 0.26, 0.74), 4);
    ck_assert_double_eq(tarry_law_quantile(&law, 0.9, 0.1), 4);
    const double turned[] = {0.75, 0, 0.25};
    const tarry_law other = {.kind = TARRY_LAW_VALUES, .n = 3, .points = points, .weights = turned};
    ck_assert_double_eq(tarry_law_quantile(&other, 0.75, 0.25), 1);
    ck_assert_double_eq(tarry_law_quantile(&other, 0.76, 0.24), 4);
    check_near("integral", 2, tarry_law_survival_integral(&law, 2), 1.75, 1e-15);
    check_near("remaining", 0.5, tarry_law_remaining_quantile(&law, 0.5), 1 + 0.625 / 0.75, 1e-15);
}
END_TEST

/* Nothing in the first and last bins or values: they are as if they were not there. */
START_TEST(empty_ends) {
    const double edges[] = {0, 1, 2, 4, 7}, shares[] = {0, 0.5, 0.5, 0};
    const tarry_law bins = {.kind = TARRY_LAW_BINS, .n = 4, .points = edges, .weights = shares};
    ck_assert_double_eq(tarry_law_least(&bins), 1);
    ck_assert_double_eq(tarry_law_most(&bins), 4);
    ck_assert_double_eq(tarry_law_quantile(&bins, 0, 1), 1);
    ck_assert_double_eq(tarry_law_quantile(&bins, 1, 0), 4);
    check_near("quantile", 0.75, tarry_law_quantile(&bins, 0.75, 0.25), 3, 1e-15);
    ck_assert_double_eq(tarry_law_cdf(&bins, 0.5), 0);
    ck_assert_double_eq(tarry_law_cdf(&bins, 5), 1);
    ck_assert_double_eq(tarry_law_cdf(&bins, 9), 1);
    ck_assert_double_eq(tarry_law_survival(&bins, 0.5), 1);
    ck_assert_double_eq(tarry_law_survival(&bins, -1), 1);
    ck_assert_double_eq(tarry_law_survival(&bins, 5), 0);
    check_near("integral", 9, tarry_law_survival_integral(&bins, 9), 0.5 * 1.5 + 0.5 * 3, 1e-15);

    const double points[] = {1, 2, 4, 7};
    const tarry_law values = {
        .kind = TARRY_LAW_VALUES, .n = 4, .points = points, .weights = shares};
    ck_assert_double_eq(tarry_law_least(&values), 2);
    ck_assert_double_eq(tarry_law_most(&values), 4);
    ck_assert_double_eq(tarry_law_quantile(&values, 0, 1), 2);
    ck_assert_double_eq(tarry_law_quantile(&values, 1, 0), 4);
    ck_assert_double_eq(tarry_law_cdf(&values, 1.5), 0);
    ck_assert_double_eq(tarry_law_survival(&values, 0.5), 1);
    ck_assert_double_eq(tarry_law_survival(&values, 5), 0);
    ck_assert_double_eq(tarry_law_survival(&values, 8), 0);
    const double last[] = {0, 0, 0, 1}, first[] = {1, 0, 0, 0};
    const tarry_law high = {.kind = TARRY_LAW_VALUES, .n = 4, .points = points, .weights = last};
    const tarry_law low = {.kind = TARRY_LAW_BINS, .n = 4, .points = edges, .weights = first};
    ck_assert_double_eq(tarry_law_least(&high), 7);
    ck_assert_double_eq(tarry_law_most(&low), 1);
}
END_TEST

START_TEST(mix_is_a_weighted_sum) {
    const tarry_law parts[] = {{.kind = TARRY_LAW_FIXED, .a = 2},
                               {.kind = TARRY_LAW_EXPONENTIAL, .a = 3}};
    const double shares[] = {0.3, 0.7};
    const tarry_law law = {.kind = TARRY_LAW_MIX, .n = 2, .weights = shares, .parts = parts};
    check_near("mean", 0, tarry_law_mean(&law), 2.7, 1e-15);
    /* E x^2 = 0.3 * 4 + 0.7 * 2 * 9 */
    check_near("sd", 0, tarry_law_sd(&law), sqrt(13.8 - 2.7 * 2.7), 1e-14);
    for (double x = 0.05; x < 60; x *= 1.3) {
        const double p = 0.3 * (x >= 2) + 0.7 * gsl_cdf_exponential_P(x, 3);
        const double q = 0.3 * (x < 2) + 0.7 * gsl_cdf_exponential_Q(x, 3);
        check_near("cdf", x, tarry_law_cdf(&law, x), p, 1e-15);
        check_near("survival", x, tarry_law_survival(&law, x), q, 1e-15);
        check_near("quantile", x, tarry_law_quantile(&law, p, q), x, 1e-13);
        check_near("integral", x, tarry_law_survival_integral(&law, x),
                   0.3 * fmin(x, 2) + 0.7 * 3 * gsl_cdf_exponential_P(x, 3), 1e-14);
    }
    /* The jump at 2: from 0.34 to 0.64. */
    check_near("quantile", 0.5, tarry_law_quantile(&law, 0.5, 0.5), 2, 1e-15);
    ck_assert_double_eq(tarry_law_least(&law), 0);
    ck_assert(isinf(tarry_law_most(&law)));
}
END_TEST

/* ---- totals ---- */

static tarry_law total_of(const tarry_law *parts, size_t n) {
    return (tarry_law){.kind = TARRY_LAW_TOTAL, .n = n, .parts = parts};
}

/* cdf, survival and moments of `law` against a cdf and a survival given at x. */
static void check_total(const char *what, const tarry_law *law, double x, double p, double q) {
    check_near(what, x, tarry_law_cdf(law, x), p, 1e-9);
    check_near(what, x, tarry_law_survival(law, x), q, 1e-9);
}

/* Waiting times of one rate add up to a gamma law; a fixed part shifts it. */
START_TEST(total_of_gammas_is_gamma) {
    const tarry_law parts[] = {{.kind = TARRY_LAW_EXPONENTIAL, .a = 2},
                               {.kind = TARRY_LAW_FIXED, .a = 1},
                               {.kind = TARRY_LAW_ERLANG, .a = 6, .b = 3},
                               {.kind = TARRY_LAW_FIXED, .a = 0.5},
                               {.kind = TARRY_LAW_GAMMA, .a = 1, .b = 1.4142135623730951}};
    const tarry_law law = total_of(parts, 5);
    check_near("mean", 0, tarry_law_mean(&law), 10.5, 1e-15);
    check_near("sd", 0, tarry_law_sd(&law), sqrt(4 + 12 + 2), 1e-15);
    for (double x = 1.6; x < 100; x *= 1.2) {
        check_total("gammas", &law, x, gsl_cdf_gamma_P(x - 1.5, 4.5, 2),
                    gsl_cdf_gamma_Q(x - 1.5, 4.5, 2));
        check_near("quantile", x,
                   tarry_law_quantile(&law, tarry_law_cdf(&law, x), tarry_law_survival(&law, x)), x,
                   1e-11);
    }
    ck_assert_double_eq(tarry_law_cdf(&law, 1.5), 0);
    ck_assert_double_eq(tarry_law_survival(&law, 1.4), 1);
    ck_assert_double_eq(tarry_law_survival_integral(&law, 1.25), 1.25);
    ck_assert_double_eq(tarry_law_least(&law), 1.5);
}
END_TEST

/* Three exponential steps of means m_i: P(T > x) = sum m_i^2 exp(-x/m_i) / product (m_i - m_j)
 * (partial fractions of the Laplace transform). */
START_TEST(total_of_exponentials_by_partial_fractions) {
    const double m[] = {1, 3, 7};
    const tarry_law parts[] = {{.kind = TARRY_LAW_EXPONENTIAL, .a = 1},
                               {.kind = TARRY_LAW_EXPONENTIAL, .a = 3},
                               {.kind = TARRY_LAW_EXPONENTIAL, .a = 7}};
    const tarry_law law = total_of(parts, 3);
    for (double x = 1; x < 300; x *= 1.3) {
        double q = 0, rest = 0;
        for (int i = 0; i < 3; i++) {
            const double weight = m[i] * m[i] / ((m[i] - m[(i + 1) % 3]) * (m[i] - m[(i + 2) % 3]));
            q += weight * exp(-x / m[i]);
            rest += weight * m[i] * exp(-x / m[i]);
        }
        check_total("exponentials", &law, x, 1 - q, q);
        check_near("integral", x, tarry_law_survival_integral(&law, x), 11 - rest, 1e-10);
    }
}
END_TEST

/* Two uniform lags: the triangle. Three on [0,1): Irwin and Hall's law, 1 - 3/4 at 1.5 by symmetry,
 * x^3/6 below 1 (Johnson, Kotz & Balakrishnan, Continuous Univariate Distributions, 26.9; from
 * memory). */
START_TEST(total_of_uniforms) {
    const tarry_law two[] = {{.kind = TARRY_LAW_UNIFORM, .a = 1, .b = 2},
                             {.kind = TARRY_LAW_UNIFORM, .a = 2, .b = 3}};
    const tarry_law triangle = total_of(two, 2);
    for (double s = 0.05; s < 1; s += 0.1) {
        check_total("triangle", &triangle, 3 + s, s * s / 2, 1 - s * s / 2);
        check_total("triangle", &triangle, 5 - s, 1 - s * s / 2, s * s / 2);
    }
    const tarry_law unit = {.kind = TARRY_LAW_UNIFORM, .a = 0, .b = 1};
    const tarry_law three[] = {unit, unit, unit};
    const tarry_law hall = total_of(three, 3);
    for (double x = 0.05; x < 1; x += 0.1)
        check_total("Irwin-Hall", &hall, x, x * x * x / 6, 1 - x * x * x / 6);
    check_total("Irwin-Hall", &hall, 1.5, 0.5, 0.5);
}
END_TEST

/* Normal lags far from 0 add up to a normal one. */
START_TEST(total_of_normals_is_normal) {
    const tarry_law parts[] = {{.kind = TARRY_LAW_NORMAL, .a = 60, .b = 3},
                               {.kind = TARRY_LAW_NORMAL, .a = 80, .b = 4}};
    const tarry_law law = total_of(parts, 2);
    for (double z = -6; z <= 6; z += 0.7)
        check_total("normals", &law, 140 + 5 * z, gsl_cdf_ugaussian_P(z), gsl_cdf_ugaussian_Q(z));
}
END_TEST

typedef struct convolution {
    const tarry_law *one, *other;
    double x;
} convolution;

/* In the place of the first part's share p: free of its density's infinities. */
static double convolution_at(double p, void *context) {
    const convolution *c = context;
    return tarry_law_survival(c->other, c->x - tarry_law_quantile(c->one, p, 1 - p));
}

/* The survival of a sum, as the mean of S(x - X) over the share of X, by QUADPACK. */
static double convolve_by_gsl(const tarry_law *one, const tarry_law *other, double x) {
    gsl_integration_workspace *space = gsl_integration_workspace_alloc(4000);
    convolution c = {one, other, x};
    gsl_function f = {convolution_at, &c};
    double ends[4] = {0, fmin(tarry_law_cdf(one, x - tarry_law_most(other)), 1),
                      tarry_law_cdf(one, x), 1};
    double sum = 0;
    for (int i = 0; i < 3; i++) {
        double value = 0, error = 0;
        if (ends[i + 1] > ends[i])
            gsl_integration_qags(&f, ends[i], ends[i + 1], 1e-12, 1e-11, 4000, space, &value,
                                 &error);
        ck_assert(error < 1e-9);
        sum += value;
    }
    gsl_integration_workspace_free(space);
    return sum;
}

START_TEST(total_of_unlike_laws) {
    const double edges[] = {0, 1, 3, 4}, shares[] = {0.5, 0.2, 0.3};
    const tarry_law laws[] = {
        {.kind = TARRY_LAW_LOGNORMAL, .a = 3, .b = 2},
        {.kind = TARRY_LAW_GAMMA, .a = 2, .b = 3},
        {.kind = TARRY_LAW_WEIBULL, .a = 4, .b = 0.6},
        {.kind = TARRY_LAW_NORMAL, .a = 5, .b = 2},
        {.kind = TARRY_LAW_UNIFORM, .a = 1, .b = 4},
        {.kind = TARRY_LAW_BINS, .n = 3, .points = edges, .weights = shares},
        {.kind = TARRY_LAW_EXPONENTIAL, .a = 0.01},
    };
    for (size_t i = 0; i < N_OF(laws); i++)
        for (size_t j = 0; j < N_OF(laws); j++) {
            if (i == j)
                continue;
            const tarry_law parts[] = {{.kind = TARRY_LAW_FIXED, .a = 1.25}, laws[i], laws[j]};
            const tarry_law law = total_of(parts, 3);
            const double mean = tarry_law_mean(&law);
            for (double x = 1.25 + 0.3 * mean; x < 3 * mean; x *= 1.9) {
                const double q = convolve_by_gsl(&laws[i], &laws[j], x - 1.25);
                ASSERT_FAST(fabs(tarry_law_survival(&law, x) - q) < 1e-8,
                            "laws %zu and %zu at %g: %.12g, should be %.12g", i, j, x,
                            tarry_law_survival(&law, x), q);
                ASSERT_FAST(fabs(tarry_law_cdf(&law, x) + q - 1) < 1e-8, "laws %zu and %zu", i, j);
            }
            check_near("integral", 0, tarry_law_survival_integral(&law, 1e4 * mean), mean, 1e-6);
            const double left = tarry_law_remaining_quantile(&law, 0.4);
            check_near("remaining", left, tarry_law_survival_integral(&law, left), 0.4 * mean,
                       1e-9);
        }
}
END_TEST

/* More bins than panels, every other one empty, and an exponential lag of mean m after them: a bin
 * [a, b) below x gives (b - a) - m (exp(-(x-b)/m) - exp(-(x-a)/m)), over its width. */
START_TEST(total_of_many_bins) {
    enum { N = 601 };
    double edges[N + 1], shares[N];
    for (int i = 0; i <= N; i++)
        edges[i] = 0.1 * i;
    for (int i = 0; i < N; i++)
        shares[i] = i % 2 == 0 ? 1.0 / 301 : 0;
    const double m = 0.3;
    const tarry_law parts[] = {{.kind = TARRY_LAW_BINS, .n = N, .points = edges, .weights = shares},
                               {.kind = TARRY_LAW_EXPONENTIAL, .a = m}};
    const tarry_law law = total_of(parts, 2);
    for (double x = 0.15; x < 62; x += 7.13) {
        double p = 0;
        for (int i = 0; i < N && edges[i] < x; i++) {
            const double a = edges[i], b = fmin(edges[i + 1], x);
            p += shares[i] / 0.1 * (b - a - m * (exp((b - x) / m) - exp((a - x) / m)));
        }
        check_total("bins", &law, x, p, 1 - p);
    }
}
END_TEST

/* A mix and a list of values split into cases. */
START_TEST(total_with_cases) {
    const double points[] = {1, 4}, shares[] = {0.4, 0.6}, halves[] = {0.5, 0.5};
    const tarry_law mixed[] = {{.kind = TARRY_LAW_FIXED, .a = 2},
                               {.kind = TARRY_LAW_EXPONENTIAL, .a = 5}};
    const tarry_law parts[] = {
        {.kind = TARRY_LAW_VALUES, .n = 2, .points = points, .weights = shares},
        {.kind = TARRY_LAW_FIXED, .a = 0.5},
        {.kind = TARRY_LAW_MIX, .n = 2, .weights = halves, .parts = mixed},
        {.kind = TARRY_LAW_EXPONENTIAL, .a = 5}};
    const tarry_law law = total_of(parts, 4);
    for (double x = 3.6; x < 90; x *= 1.4) {
        double p = 0;
        for (int i = 0; i < 2; i++)
            p += shares[i] * 0.5 *
                 (gsl_cdf_gamma_P(fmax(x - points[i] - 0.5, 0), 2, 5) +
                  gsl_cdf_exponential_P(fmax(x - points[i] - 2.5, 0), 5));
        check_near("cases", x, tarry_law_cdf(&law, x), p, 1e-12);
        check_near("cases", x, tarry_law_survival(&law, x), 1 - p, 1e-9);
    }
    ck_assert_double_eq(tarry_law_least(&law), 1.5);
}
END_TEST

/* ---- checks ---- */

typedef struct wrong {
    tarry_law law;
    const char *message;
} wrong;

static void check_refused(const tarry_law *law, const char *message) {
    tarry_error error = {0};
    ck_assert_int_eq(tarry_law_check(law, &error), TARRY_INPUT);
    ck_assert_str_eq(error.message, message);
    ck_assert_int_eq(error.line, 0);
}

START_TEST(wrong_laws_are_refused) {
    const double rising[] = {0, 1, 2}, falling[] = {0, 2, 1}, below[] = {-1, 1, 2};
    const double shares[] = {0.5, 0.5}, short_of[] = {0.5, 0.4}, minus[] = {1.5, -0.5};
    const tarry_law bad[] = {{.kind = TARRY_LAW_FIXED, .a = 1},
                             {.kind = TARRY_LAW_EXPONENTIAL, .a = 0}};
    const wrong all[] = {
        {{.kind = TARRY_LAW_FIXED, .a = -1}, "a fixed delay needs a length of 0 or more, not -1"},
        {{.kind = TARRY_LAW_FIXED, .a = NAN}, "a fixed delay needs a length of 0 or more, not nan"},
        {{.kind = TARRY_LAW_EXPONENTIAL, .a = 0},
         "an exponential delay needs a mean above 0, not 0"},
        {{.kind = TARRY_LAW_ERLANG, .a = -2, .b = 3},
         "an erlang delay needs a mean above 0, not -2"},
        {{.kind = TARRY_LAW_ERLANG, .a = 2, .b = 2.5},
         "an erlang delay needs a whole number of steps from 1 to 100000000, not 2.5"},
        {{.kind = TARRY_LAW_GAMMA, .a = -3, .b = 1}, "a gamma delay needs a mean above 0, not -3"},
        {{.kind = TARRY_LAW_GAMMA, .a = 3, .b = 0}, "a gamma delay needs an sd above 0, not 0"},
        {{.kind = TARRY_LAW_GAMMA, .a = 3, .b = 1e-5},
         "a gamma delay whose sd is under a ten-thousandth of its mean is as good as fixed: write "
         "`fixed`"},
        {{.kind = TARRY_LAW_LOGNORMAL, .a = INFINITY, .b = 1},
         "a lognormal delay needs a mean above 0, not inf"},
        {{.kind = TARRY_LAW_LOGNORMAL, .a = 1, .b = 200},
         "a lognormal delay needs an sd of at most 100 times its mean, not 200"},
        {{.kind = TARRY_LAW_NORMAL, .a = 3, .b = 2},
         "6.7 % of this normal delay lies below 0, and at most 5 % may: use a smaller sd, or a "
         "gamma or lognormal delay"},
        {{.kind = TARRY_LAW_UNIFORM, .a = -1, .b = 2},
         "a uniform delay needs a `from` of 0 or more, not -1"},
        {{.kind = TARRY_LAW_UNIFORM, .a = 2, .b = 2},
         "a uniform delay needs a `to` above its `from`, not 2"},
        {{.kind = TARRY_LAW_WEIBULL, .a = 0, .b = 2},
         "a weibull delay needs a scale above 0, not 0"},
        {{.kind = TARRY_LAW_WEIBULL, .a = 1, .b = 0},
         "a weibull delay needs a shape from 0.1 to 1000, not 0"},
        {{.kind = TARRY_LAW_BINS, .n = 2, .points = falling, .weights = shares},
         "a table delay needs edges that rise, but 1 follows 2"},
        {{.kind = TARRY_LAW_BINS, .n = 2, .points = below, .weights = shares},
         "a table delay needs edges of 0 or more, not -1"},
        {{.kind = TARRY_LAW_BINS, .n = 2, .points = rising, .weights = short_of},
         "the shares of a table delay sum to 0.9, not to 1"},
        {{.kind = TARRY_LAW_VALUES, .n = 2, .points = rising, .weights = minus},
         "a table delay needs shares of 0 or more, not -0.5"},
        {{.kind = TARRY_LAW_VALUES, .n = 0, .points = rising, .weights = shares},
         "a table delay needs at least one entry"},
        {{.kind = TARRY_LAW_MIX, .n = 2, .weights = short_of, .parts = bad},
         "the shares of a mix delay sum to 0.9, not to 1"},
        {{.kind = TARRY_LAW_MIX, .n = 2, .weights = shares, .parts = bad},
         "an exponential delay needs a mean above 0, not 0"},
        {{.kind = TARRY_LAW_TOTAL, .n = 2, .parts = bad},
         "an exponential delay needs a mean above 0, not 0"},
        {{.kind = TARRY_LAW_TOTAL, .n = 0}, "a total delay needs at least one part"},
    };
    for (size_t i = 0; i < N_OF(all); i++)
        check_refused(&all[i].law, all[i].message);
    for (size_t i = 0; i < N_OF(all_known); i++)
        ck_assert_int_eq(tarry_law_check(&all_known[i].law, NULL), TARRY_OK);
}
END_TEST

START_TEST(long_totals_are_refused) {
    tarry_law parts[33];
    for (size_t i = 0; i < N_OF(parts); i++)
        parts[i] = (tarry_law){.kind = TARRY_LAW_FIXED, .a = 1};
    tarry_law law = total_of(parts, 33);
    check_refused(&law, "a total delay can have 32 parts at most, not 33");
    law = total_of(parts, 32);
    ck_assert_int_eq(tarry_law_check(&law, NULL), TARRY_OK);
}
END_TEST

START_TEST(below_zero_is_the_normal_tail) {
    const tarry_law law = {.kind = TARRY_LAW_NORMAL, .a = 4, .b = 2};
    check_near("below zero", 0, tarry_law_below_zero(&law), gsl_cdf_gaussian_P(-4, 2), 1e-15);
    ck_assert_double_eq(tarry_law_below_zero(&all_known[0].law), 0);
}
END_TEST

START_TEST(same_laws_are_found_out) {
    for (size_t i = 0; i < N_OF(all_known); i++)
        for (size_t j = 0; j < N_OF(all_known); j++)
            ck_assert_int_eq(tarry_law_same(&all_known[i].law, &all_known[j].law), i == j);
    const double a[] = {1, 2, 3}, b[] = {1, 2, 4}, w[] = {0.5, 0.5}, v[] = {0.4, 0.6};
    const tarry_law base = {.kind = TARRY_LAW_BINS, .n = 2, .points = a, .weights = w};
    tarry_law other = base;
    ck_assert(tarry_law_same(&base, &other));
    other.points = b;
    ck_assert(!tarry_law_same(&base, &other));
    other = base;
    other.weights = v;
    ck_assert(!tarry_law_same(&base, &other));
    const tarry_law ab[] = {all_known[0].law, all_known[3].law};
    const tarry_law ba[] = {all_known[3].law, all_known[0].law};
    const tarry_law total_ab = total_of(ab, 2), total_ba = total_of(ba, 2);
    ck_assert(tarry_law_same(&total_ab, &total_ab));
    ck_assert(!tarry_law_same(&total_ab, &total_ba)); /* other numbers go to other parts */
    const tarry_law mix_w = {.kind = TARRY_LAW_MIX, .n = 2, .weights = w, .parts = ab};
    const tarry_law mix_v = {.kind = TARRY_LAW_MIX, .n = 2, .weights = v, .parts = ab};
    ck_assert(tarry_law_same(&mix_w, &mix_w));
    ck_assert(!tarry_law_same(&mix_w, &mix_v));
}
END_TEST

int main(void) {
    gsl_set_error_handler_off();
    const test_entry tests[] = {
        {"tails are those of GSL", tails_are_those_of_gsl},
        {"quantiles undo the cdf of GSL", quantiles_undo_the_cdf_of_gsl},
        {"moments are integrals of GSL's density", moments_are_integrals_of_gsls_density},
        {"survival integrals", survival_integrals_are_those_of_gsls_tail},
        {"remaining quantiles undo the integral", remaining_quantiles_undo_the_integral},
        {"remaining times with closed forms", remaining_times_with_closed_forms},
        {"incomplete gamma is a Poisson sum", incomplete_gamma_is_a_poisson_sum},
        {"fixed lag", fixed_lag},
        {"bins by hand", bins_by_hand},
        {"values by hand", values_by_hand},
        {"empty ends", empty_ends},
        {"mix is a weighted sum", mix_is_a_weighted_sum},
        {"total of gammas", total_of_gammas_is_gamma},
        {"total of exponentials", total_of_exponentials_by_partial_fractions},
        {"total of uniforms", total_of_uniforms},
        {"total of normals", total_of_normals_is_normal},
        {"total of unlike laws", total_of_unlike_laws},
        {"total of many bins", total_of_many_bins},
        {"total with cases", total_with_cases},
        {"wrong laws are refused", wrong_laws_are_refused},
        {"long totals are refused", long_totals_are_refused},
        {"below zero", below_zero_is_the_normal_tail},
        {"same laws", same_laws_are_found_out},
    };
    return run_tests("laws", tests, N_OF(tests));
}
