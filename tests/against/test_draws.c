/* SPDX-License-Identifier: GPL-3.0-or-later */

/* What is drawn against GSL (2.7): lags by Kolmogorov and Smirnov's statistic, mean and sd; tables
 * of quantiles against gsl_cdf_*inv in both tails; random numbers of molecules by chi-square.
 *
 * With a million draws a cdf that is off by 0.3 % anywhere, a mean off by 0.5 % of the sd and an sd
 * off by 0.4 to 1.5 % (by kurtosis) are found. */
#include "engine/amount.h"
#include "engine/draw.h"
#include "model/law.h"
#include "sample.h"
#include "support.h"

#include <gsl/gsl_cdf.h>
#include <gsl/gsl_integration.h>
#include <gsl/gsl_math.h>
#include <gsl/gsl_randist.h>
#include <gsl/gsl_statistics_double.h>
#include <math.h>
#include <stdlib.h>

#define N_OF(array) (sizeof(array) / sizeof(array)[0])

enum { N_DRAWS = 1000000 };

/* ---- lags: the law ---- */

/* A law, and its cdf by GSL. */
typedef struct known {
    const char *name;
    tarry_law law;
    double (*lower)(double x, double a, double b);
    double a, b;
} known;

static double exponential_lower(double x, double a, double b) {
    (void)b;
    return gsl_cdf_exponential_P(x, a);
}

/* Mean a and sd b before truncation at 0. */
static double normal_lower(double x, double a, double b) {
    return (gsl_cdf_gaussian_P(x - a, b) - gsl_cdf_gaussian_P(-a, b)) / gsl_cdf_gaussian_Q(-a, b);
}

/* Mean a and sd b of the lag: exp of a normal variable of variance log(1 + (b/a)^2). */
static double lognormal_lower(double x, double a, double b) {
    const double variance = log(1 + b * b / (a * a));
    return gsl_cdf_lognormal_P(x, log(a) - variance / 2, sqrt(variance));
}

static double bins_lower(double x, double a, double b) {
    (void)a;
    (void)b;
    return 0.2 * gsl_cdf_flat_P(x, 0, 1) + 0.1 * gsl_cdf_flat_P(x, 1, 2) +
           0.7 * gsl_cdf_flat_P(x, 2, 6);
}

static double mix_lower(double x, double a, double b) {
    return 0.3 * gsl_cdf_flat_P(x, 0, 1) + 0.7 * gsl_cdf_gamma_P(x, a, b);
}

static double total_lower(double x, double a, double b) {
    return gsl_cdf_gamma_P(fmax(x - 2, 0), a, b);
}

static const double edges[] = {0, 1, 2, 6}, bin_shares[] = {0.2, 0.1, 0.7};
static const double mix_shares[] = {0.3, 0.7};
static const tarry_law mix_parts[] = {{.kind = TARRY_LAW_UNIFORM, .a = 0, .b = 1},
                                      {.kind = TARRY_LAW_GAMMA, .a = 8, .b = 4}};
static const tarry_law total_parts[] = {{.kind = TARRY_LAW_FIXED, .a = 2},
                                        {.kind = TARRY_LAW_EXPONENTIAL, .a = 2},
                                        {.kind = TARRY_LAW_ERLANG, .a = 6, .b = 3}};

static const known all_known[] = {
    {"exponential", {.kind = TARRY_LAW_EXPONENTIAL, .a = 3}, exponential_lower, 3, 0},
    {"erlang 3", {.kind = TARRY_LAW_ERLANG, .a = 6, .b = 3}, gsl_cdf_gamma_P, 3, 2},
    {"gamma 4", {.kind = TARRY_LAW_GAMMA, .a = 8, .b = 4}, gsl_cdf_gamma_P, 4, 2},
    {"gamma 0.25", {.kind = TARRY_LAW_GAMMA, .a = 1, .b = 2}, gsl_cdf_gamma_P, 0.25, 4},
    {"gamma 400", {.kind = TARRY_LAW_GAMMA, .a = 20, .b = 1}, gsl_cdf_gamma_P, 400, 0.05},
    {"lognormal", {.kind = TARRY_LAW_LOGNORMAL, .a = 25, .b = 8}, lognormal_lower, 25, 8},
    {"normal", {.kind = TARRY_LAW_NORMAL, .a = 30, .b = 3}, normal_lower, 30, 3},
    {"cut normal", {.kind = TARRY_LAW_NORMAL, .a = 5, .b = 3}, normal_lower, 5, 3},
    {"uniform", {.kind = TARRY_LAW_UNIFORM, .a = 2, .b = 5}, gsl_cdf_flat_P, 2, 5},
    {"weibull 2", {.kind = TARRY_LAW_WEIBULL, .a = 6, .b = 2}, gsl_cdf_weibull_P, 6, 2},
    {"weibull 0.7", {.kind = TARRY_LAW_WEIBULL, .a = 6, .b = 0.7}, gsl_cdf_weibull_P, 6, 0.7},
    {"bins",
     {.kind = TARRY_LAW_BINS, .n = 3, .points = edges, .weights = bin_shares},
     bins_lower,
     0,
     0},
    {"mix",
     {.kind = TARRY_LAW_MIX, .n = 2, .weights = mix_shares, .parts = mix_parts},
     mix_lower,
     4,
     2},
    {"total", {.kind = TARRY_LAW_TOTAL, .n = 3, .parts = total_parts}, total_lower, 4, 2},
};

static double known_lower(double x, void *context) {
    const known *k = context;
    return k->lower(x, k->a, k->b);
}

typedef struct moment {
    const known *k;
    int power;
} moment;

/* E x^n is the integral of n x^(n-1) (1 - cdf). */
static double moment_at(double x, void *context) {
    const moment *m = context;
    return m->power * gsl_pow_int(x, m->power - 1) * (1 - m->k->lower(x, m->k->a, m->k->b));
}

static double moment_of(const known *k, int power) {
    gsl_integration_workspace *space = gsl_integration_workspace_alloc(1000);
    moment m = {k, power};
    gsl_function f = {moment_at, &m};
    const double scale = tarry_law_mean(&k->law) + tarry_law_sd(&k->law);
    double sum = 0;
    for (int i = 0; i < 200; i++) { /* to 100 such scales, where nothing is left */
        double value, error;
        gsl_integration_qags(&f, 0.5 * i * scale, 0.5 * (i + 1) * scale, 1e-12, 1e-10, 1000, space,
                             &value, &error);
        sum += value;
    }
    gsl_integration_workspace_free(space);
    return sum;
}

static void check_moments(const known *k, const double *draws, size_t n) {
    const double m1 = moment_of(k, 1), m2 = moment_of(k, 2), m3 = moment_of(k, 3),
                 m4 = moment_of(k, 4);
    const double variance = m2 - m1 * m1;
    const double fourth = m4 - 4 * m1 * m3 + 6 * m1 * m1 * m2 - 3 * gsl_pow_4(m1);
    check_mean(k->name, gsl_stats_mean(draws, 1, n), m1, sqrt(variance), n);
    check_sd(k->name, gsl_stats_sd(draws, 1, n), sqrt(variance), fourth / (variance * variance) - 3,
             n);
}

static const tarry_drawer *add(tarry_drawer_set *set, const tarry_law *law) {
    const tarry_drawer *drawer = NULL;
    tarry_error error;
    if (tarry_law_check(law, &error) || tarry_drawer_set_add(set, law, &drawer, &error))
        ck_abort_msg("%s", error.message);
    return drawer;
}

START_TEST(lags_follow_their_laws) {
    const size_t n = sample_size(N_DRAWS);
    double *draws = malloc(n * sizeof *draws);
    tarry_drawer_set *set;
    ck_assert_ptr_nonnull(draws);
    ck_assert_int_eq(tarry_drawer_set_new(&set, NULL), TARRY_OK);
    for (size_t i = 0; i < N_OF(all_known); i++) {
        known k = all_known[i];
        const tarry_drawer *drawer = add(set, &k.law);
        tarry_stream stream;
        tarry_stream_init(&stream, 1, i, TARRY_STREAM_EVENTS);
        for (size_t j = 0; j < n; j++)
            draws[j] = tarry_draw(drawer, &stream);
        check_continuous(k.name, draws, n, known_lower, &k);
        check_moments(&k, draws, n);
    }
    tarry_drawer_set_free(set);
    free(draws);
}
END_TEST

/* A list of values: their counts. */
START_TEST(values_come_with_their_shares) {
    const double values[] = {0, 1, 3, 7}, shares[] = {0.5, 0.2, 0.05, 0.25};
    const double probabilities[] = {0.5, 0.2, 0, 0.05, 0, 0, 0, 0.25};
    const tarry_law law = {.kind = TARRY_LAW_VALUES, .n = 4, .points = values, .weights = shares};
    const size_t n = sample_size(N_DRAWS);
    double *draws = malloc(n * sizeof *draws);
    tarry_drawer_set *set;
    tarry_stream stream;
    ck_assert_ptr_nonnull(draws);
    ck_assert_int_eq(tarry_drawer_set_new(&set, NULL), TARRY_OK);
    const tarry_drawer *drawer = add(set, &law);
    tarry_stream_init(&stream, 1, 100, TARRY_STREAM_EVENTS);
    for (size_t j = 0; j < n; j++)
        draws[j] = tarry_draw(drawer, &stream);
    check_counts("values", draws, n, probabilities, 8);
    tarry_drawer_set_free(set);
    free(draws);
}
END_TEST

/* ---- what is left of a lag ---- */

/* The share of the time that is over by x: the integral of the survival over the mean. */

static double fixed_left(double x, double a, double b) {
    (void)b;
    return gsl_cdf_flat_P(x, 0, a);
}

/* x Q(a, x/b) + a b P(a + 1, x/b), by parts. */
static double gamma_left(double x, double a, double b) {
    return (x * gsl_cdf_gamma_Q(x, a, b) + a * b * gsl_cdf_gamma_P(x, a + 1, b)) / (a * b);
}

/* 30 % uniform on [0, 1) and 70 % gamma, each by its share of the mean. */
static double mix_left(double x, double a, double b) {
    const double in = fmin(x, 1), uniform = 0.3 * (in - in * in / 2);
    return (uniform + 0.7 * a * b * gamma_left(x, a, b)) / (0.3 * 0.5 + 0.7 * a * b);
}

/* 2, and then a gamma lag. */
static double total_left(double x, double a, double b) {
    return (fmin(x, 2) + a * b * gamma_left(fmax(x - 2, 0), a, b)) / (2 + a * b);
}

/* Values 1 and 3, one half each. */
static double values_left(double x, double a, double b) {
    (void)a;
    (void)b;
    return (0.5 * fmin(x, 1) + 0.5 * fmin(x, 3)) / 2;
}

static const double two_values[] = {1, 3}, two_shares[] = {0.5, 0.5};

static const known all_left[] = {
    {"exponential", {.kind = TARRY_LAW_EXPONENTIAL, .a = 3}, exponential_lower, 3, 0},
    {"fixed", {.kind = TARRY_LAW_FIXED, .a = 3}, fixed_left, 3, 0},
    {"gamma 4", {.kind = TARRY_LAW_GAMMA, .a = 8, .b = 4}, gamma_left, 4, 2},
    {"values",
     {.kind = TARRY_LAW_VALUES, .n = 2, .points = two_values, .weights = two_shares},
     values_left,
     0,
     0},
    {"mix",
     {.kind = TARRY_LAW_MIX, .n = 2, .weights = mix_shares, .parts = mix_parts},
     mix_left,
     4,
     2},
    {"total", {.kind = TARRY_LAW_TOTAL, .n = 3, .parts = total_parts}, total_left, 4, 2},
};

START_TEST(what_is_left_of_lags) {
    const size_t n = sample_size(N_DRAWS / 4);
    double *draws = malloc(n * sizeof *draws);
    tarry_drawer_set *set;
    ck_assert_ptr_nonnull(draws);
    ck_assert_int_eq(tarry_drawer_set_new(&set, NULL), TARRY_OK);
    for (size_t i = 0; i < N_OF(all_left); i++) {
        known k = all_left[i];
        const tarry_drawer *drawer = add(set, &k.law);
        tarry_stream stream;
        tarry_stream_init(&stream, 1, 700 + i, TARRY_STREAM_START);
        for (size_t j = 0; j < n; j++)
            draws[j] = tarry_draw_remaining(drawer, &stream);
        check_continuous(k.name, draws, n, known_lower, &k);
    }
    tarry_drawer_set_free(set);
    free(draws);
}
END_TEST

/* ---- lags: the tables ---- */

/* A law with GSL's functions of its shape in standard units. */
typedef struct shape {
    const char *name;
    tarry_law law;
    double (*lower)(double x, double a, double b);
    double (*upper)(double x, double a, double b);
    double (*lower_inverse)(double p, double a, double b);
    double (*upper_inverse)(double q, double a, double b);
    double (*density)(double x, double a, double b);
    double a, b;
} shape;

/* Mean a and sd b before truncation; in the lower tail, where cdfs cancel, from the mean value
 * theorem: the area is p bell(0) x to a relative error of x a / b^2. */
static double normal_lower_inverse(double p, double a, double b) {
    const double area = p * gsl_cdf_gaussian_Q(-a, b);
    const double below = gsl_cdf_gaussian_P(-a, b);
    if (area < 1e-11 * below)
        return area / gsl_ran_gaussian_pdf(-a, b);
    return a + gsl_cdf_gaussian_Pinv(below + area, b);
}

static double normal_upper_inverse(double q, double a, double b) {
    return a + gsl_cdf_gaussian_Qinv(q * gsl_cdf_gaussian_Q(-a, b), b);
}

/* GSL's inverse, whose own accuracy is not taken for granted: bettered by Newton's steps with GSL's
 * cdf until that says that it is right. */
static double truth(const shape *s, double p, double q) {
    if (s->law.kind == TARRY_LAW_NORMAL)
        return p < q ? normal_lower_inverse(p, s->a, s->b) : normal_upper_inverse(q, s->a, s->b);
    double x = p < q ? s->lower_inverse(p, s->a, s->b) : s->upper_inverse(q, s->a, s->b);
    for (int i = 0; i < 20; i++) {
        const double miss = p < q ? s->lower(x, s->a, s->b) - p : q - s->upper(x, s->a, s->b);
        const double step = miss / s->density(x, s->a, s->b);
        if (fabs(step) < 1e-11 * x)
            return x;
        x -= step;
    }
    ck_abort_msg("%s: GSL's quantile of %g does not agree with its cdf", s->name, p);
    return NAN;
}

/* Places in every octave of both tails, the ends of octaves and the outermost numbers among them.
 */
static void check_table(const shape *s) {
    tarry_drawer_set *set;
    tarry_stream stream;
    ck_assert_int_eq(tarry_drawer_set_new(&set, NULL), TARRY_OK);
    const tarry_drawer *drawer = add(set, &s->law);
    tarry_stream_init(&stream, 1, 200, TARRY_STREAM_EVENTS);
    const int n_places = test_small() ? 4 : 40;
    for (int octave = 0; octave < 52; octave++)
        for (int i = 0; i < n_places; i++)
            for (int side = 0; side < 2; side++) {
                uint64_t k = octave == 0 ? 0 : UINT64_C(1) << (octave - 1); /* of 2^52 */
                if (i == 1)
                    k = octave == 0 ? 0 : 2 * k - 1;
                if (i > 1)
                    k += tarry_stream_next(&stream) % (k > 0 ? k : 1);
                const uint64_t bits = side == 0 ? k << 12 : ~(k << 12);
                const double u = tarry_unit(bits);
                const double x = truth(s, u, 1 - u);
                const double scale = fmax(x, 1e-6 * tarry_law_mean(&s->law));
                const double error = (tarry_draw_at(drawer, bits) - x) / scale;
                ASSERT_FAST(fabs(error) < 1e-9, "%s at %.17g of side %d: error %g", s->name, u,
                            side, error);
            }
    tarry_drawer_set_free(set);
}

#define GAMMA(name, kind, a, b, shape, scale)                                                      \
    {                                                                                              \
        name, {kind, a, b, 0, NULL, NULL, NULL}, gsl_cdf_gamma_P, gsl_cdf_gamma_Q,                 \
            gsl_cdf_gamma_Pinv, gsl_cdf_gamma_Qinv, gsl_ran_gamma_pdf, shape, scale                \
    }

START_TEST(gamma_tables_hold_gsls_quantiles) {
    const shape shapes[] = {
        GAMMA("gamma 4", TARRY_LAW_GAMMA, 8, 4, 4, 2),
        GAMMA("gamma 2.56", TARRY_LAW_GAMMA, 8, 5, 2.56, 3.125),
        GAMMA("gamma 0.25", TARRY_LAW_GAMMA, 1, 2, 0.25, 4),
        GAMMA("erlang 1", TARRY_LAW_ERLANG, 3, 1, 1, 3),
        GAMMA("erlang 12", TARRY_LAW_ERLANG, 6, 12, 12, 0.5),
        GAMMA("gamma 400", TARRY_LAW_GAMMA, 20, 1, 400, 0.05),
    };
    for (size_t i = 0; i < N_OF(shapes); i++)
        check_table(&shapes[i]);
}
END_TEST

START_TEST(lognormal_tables_hold_gsls_quantiles) {
    const double ratios[] = {0.01, 0.32, 1, 4};
    for (size_t i = 0; i < N_OF(ratios); i++) {
        const double variance = log(1 + ratios[i] * ratios[i]);
        const shape s = {"lognormal",
                         {TARRY_LAW_LOGNORMAL, 25, 25 * ratios[i], 0, NULL, NULL, NULL},
                         gsl_cdf_lognormal_P,
                         gsl_cdf_lognormal_Q,
                         gsl_cdf_lognormal_Pinv,
                         gsl_cdf_lognormal_Qinv,
                         gsl_ran_lognormal_pdf,
                         log(25) - variance / 2,
                         sqrt(variance)};
        check_table(&s);
    }
}
END_TEST

START_TEST(normal_tables_hold_gsls_quantiles) {
    const double sds[] = {0.5, 3, 12, 18};
    for (size_t i = 0; i < N_OF(sds); i++) {
        const shape s = {.name = "normal",
                         .law = {.kind = TARRY_LAW_NORMAL, .a = 30, .b = sds[i]},
                         .a = 30,
                         .b = sds[i]};
        check_table(&s);
    }
}
END_TEST

/* ---- random numbers of molecules ---- */

static void draw_amounts(const tarry_amount *amount, double mean, uint64_t number, double *out,
                         size_t n) {
    tarry_stream stream;
    tarry_stream_init(&stream, 1, number, TARRY_STREAM_EVENTS);
    for (size_t i = 0; i < n; i++)
        out[i] = tarry_amount_draw(amount, mean, tarry_stream_next(&stream));
}

START_TEST(geometric_amounts) {
    enum { MOST = 2000 };
    const double means[] = {0.02, 0.7, 5, 60};
    const size_t n = sample_size(N_DRAWS);
    double *draws = malloc(n * sizeof *draws), probabilities[MOST];
    ck_assert_ptr_nonnull(draws);
    for (uint32_t least = 0; least < 2; least++)
        for (size_t i = 0; i < N_OF(means); i++) {
            const tarry_amount amount = {.kind = TARRY_AMOUNT_GEOMETRIC, .least = least};
            /* GSL counts trials up to the first success, from 1. */
            const double success = 1 / (1 + means[i]);
            for (unsigned k = 0; k < MOST; k++)
                probabilities[k] = k < least ? 0 : gsl_ran_geometric_pdf(k - least + 1, success);
            draw_amounts(&amount, means[i] + least, 300 + 10 * least + i, draws, n);
            check_counts("geometric", draws, n, probabilities, MOST);
            check_mean("geometric", gsl_stats_mean(draws, 1, n), means[i] + least,
                       sqrt(means[i] * (1 + means[i])), n);
        }
    const tarry_amount one = {.kind = TARRY_AMOUNT_GEOMETRIC, .least = 1};
    ck_assert_double_eq(tarry_amount_draw(&one, 1, 0), 1);
    ck_assert_double_eq(tarry_amount_draw(&one, 1, UINT64_MAX), 1);
    free(draws);
}
END_TEST

START_TEST(poisson_amounts) {
    enum { MOST = 1500 };
    const double means[] = {0.02, 0.7, 5, 29.5, 30.5, 200, 1000};
    const size_t n = sample_size(N_DRAWS);
    double *draws = malloc(n * sizeof *draws), probabilities[MOST];
    const tarry_amount amount = {.kind = TARRY_AMOUNT_POISSON};
    ck_assert_ptr_nonnull(draws);
    for (size_t i = 0; i < N_OF(means); i++) {
        for (unsigned k = 0; k < MOST; k++)
            probabilities[k] = gsl_ran_poisson_pdf(k, means[i]);
        draw_amounts(&amount, means[i], 400 + i, draws, n);
        check_counts("poisson", draws, n, probabilities, MOST);
        check_mean("poisson", gsl_stats_mean(draws, 1, n), means[i], sqrt(means[i]), n);
    }
    ck_assert_double_eq(tarry_amount_draw(&amount, 0, 0), 0);
    ck_assert_double_eq(tarry_amount_draw(&amount, 0, UINT64_MAX), 0);
    free(draws);
}
END_TEST

/* P(X <= n), or P(X > n), as the sum of its terms in long double from the largest on. */
static double poisson_tail(double n, double mean, bool upper) {
    long double k = upper ? (long double)n + 1 : (long double)n, sum = 0;
    long double term = expl(k * logl((long double)mean) - (long double)mean - lgammal(k + 1));
    while (k >= 0 && term > sum * 1e-20L) {
        sum += term;
        k += upper ? 1 : -1;
        term *= upper ? mean / k : (k + 1) / mean;
    }
    return (double)sum;
}

/* The draw at u is the n with P(X < n) <= u < P(X <= n), in both tails and for large means, where
 * GSL's cdf fails. lgammal leaves mean * log(mean) units of 2^-64. */
START_TEST(poisson_amounts_are_exact_quantiles) {
    const double means[] = {0.002, 5, 40, 1e3, 1e6, 1e9};
    const tarry_amount amount = {.kind = TARRY_AMOUNT_POISSON};
    tarry_stream stream;
    tarry_stream_init(&stream, 1, 500, TARRY_STREAM_EVENTS);
    for (size_t i = 0; i < N_OF(means); i++)
        for (int j = 0; j < (means[i] > 1e8 ? 60 : 600); j++) {
            const double m = means[i], blur = 1e-13 + m * log(m) * 1e-18;
            const uint64_t random = tarry_stream_next(&stream) >> (j % 2 ? j % 50 : 0);
            const uint64_t bits = j % 4 < 2 ? random : ~random;
            const double u = tarry_unit(bits), n = tarry_amount_draw(&amount, m, bits);
            if (u < 0.5) {
                ASSERT_FAST(poisson_tail(n - 1, m, false) <= u * (1 + blur), "above u = %g", u);
                ASSERT_FAST(poisson_tail(n, m, false) > u * (1 - blur), "below u = %g", u);
            } else {
                const double v = 1 - u;
                ASSERT_FAST(poisson_tail(n - 1, m, true) >= v * (1 - blur), "above v = %g", v);
                ASSERT_FAST(poisson_tail(n, m, true) < v * (1 + blur), "below v = %g", v);
            }
        }
}
END_TEST

START_TEST(table_amounts) {
    const double values[] = {0, 2, 5}, cumulative[] = {0.3, 0.4, 1};
    const double probabilities[] = {0.3, 0, 0.1, 0, 0, 0.6};
    const tarry_amount amount = {
        .kind = TARRY_AMOUNT_TABLE, .n = 3, .values = values, .cumulative = cumulative};
    const size_t n = sample_size(N_DRAWS);
    double *draws = malloc(n * sizeof *draws);
    ck_assert_ptr_nonnull(draws);
    draw_amounts(&amount, 0, 600, draws, n);
    check_counts("table", draws, n, probabilities, 6);
    free(draws);
}
END_TEST

int main(void) {
    tarry_start();
    const test_entry tests[] = {
        {"lags follow their laws", lags_follow_their_laws},
        {"values come with their shares", values_come_with_their_shares},
        {"what is left of lags", what_is_left_of_lags},
        {"gamma tables", gamma_tables_hold_gsls_quantiles},
        {"lognormal tables", lognormal_tables_hold_gsls_quantiles},
        {"normal tables", normal_tables_hold_gsls_quantiles},
        {"geometric amounts", geometric_amounts},
        {"Poisson amounts", poisson_amounts},
        {"Poisson quantiles", poisson_amounts_are_exact_quantiles},
        {"table amounts", table_amounts},
    };
    return run_tests("draws", tests, N_OF(tests));
}
