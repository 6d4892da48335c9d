/* SPDX-License-Identifier: GPL-3.0-or-later */

/* What can be said of a model without simulating it.
 *
 * Conserved sums are worked out by hand (each case says how). Means at a time after the start are
 * compared with closed forms and with quadrature by GSL of M/G/infinity integrals; numbers with a
 * table behind them are from the notes on telegraph genes and delays named at each check. */

#include "support.h"

#include "base/notes.h"
#include "model/analysis.h"
#include "model/model.h"
#include "model/nullspace.h"
#include "tarry/tarry.h"

#include <gsl/gsl_cdf.h>
#include <gsl/gsl_integration.h>
#include <gsl/gsl_randist.h>
#include <math.h>
#include <stdarg.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

/* ---- models ---------------------------------------------------------------------------------- */

static tarry_model *read_model(const char *format, ...) __attribute__((format(printf, 1, 2)));

/* A model from a text after "tarry: 1" and the unit. */
static tarry_model *read_model(const char *format, ...) {
    static const char head[] = "tarry: 1\ntime: min\n";
    char text[4096], what[2048];
    va_list arguments;
    va_start(arguments, format);
    memcpy(text, head, sizeof head);
    vsnprintf(text + sizeof head - 1, sizeof text - sizeof head, format, arguments);
    va_end(arguments);
    tarry_model *model = NULL;
    tarry_error error = {0};
    tarry_start();
    const int code = tarry_model_read_text(text, strlen(text), "m.yaml", NULL, 0, &model, &error);
    ck_assert_msg(code == 0, "%s", tarry_error_text(&error, what, (int)sizeof what));
    return model;
}

/* ---- conserved sums -------------------------------------------------------------------------- */

/* "E + ES = 3" for each sum, in order, parted by "; ". */
static void say_sums(const tarry_model *model, char *out, size_t size) {
    const tarry_network *network = &model->network;
    tarry_arena arena = {0};
    tarry_sums sums;
    tarry_error error = {0};
    size_t n = 0;
    out[0] = '\0';
    ck_assert_int_eq(tarry_analysis_sums(network, &arena, &sums, &error), 0);
    for (uint32_t i = 0; i < sums.n_sums; i++) {
        const tarry_sum *sum = &sums.sums[i];
        n += (size_t)snprintf(out + n, size - n, "%s", i > 0 ? "; " : "");
        for (uint32_t k = 0; k < sum->n_terms; k++) {
            const tarry_sum_term *term = &sum->terms[k];
            const char *name = term->species != TARRY_NONE ? network->species[term->species].name
                                                           : network->lags[term->lag].name;
            n += (size_t)snprintf(out + n, size - n, "%s%lld %s", k > 0 ? " + " : "",
                                  (long long)term->weight, name);
        }
        if (sum->known)
            n += (size_t)snprintf(out + n, size - n, " = %g", sum->value);
        if (isfinite(sum->until))
            n += (size_t)snprintf(out + n, size - n, " until %g", sum->until);
    }
    if (sums.n_large > 0)
        n += (size_t)snprintf(out + n, size - n, " large %u", sums.n_large);
    if (sums.n_overflow > 0)
        snprintf(out + n, size - n, " overflow %u", sums.n_overflow);
    tarry_arena_release(&arena);
}

#define ASSERT_SUMS(expected, ...)                                                                 \
    do {                                                                                           \
        char found_[2048];                                                                         \
        tarry_model *model_ = read_model(__VA_ARGS__);                                             \
        say_sums(model_, found_, sizeof found_);                                                   \
        ck_assert_str_eq(found_, expected);                                                        \
        tarry_model_free(model_);                                                                  \
    } while (0)

/* Enzyme kinetics (Michaelis & Menten 1913, Biochem. Z. 49:333): the enzyme is free or bound, the
 * substrate free, bound or turned into product. */
START_TEST(test_sums_enzyme) {
    ASSERT_SUMS("1 E + 1 ES = 10; 1 S + 1 ES + 1 P = 300",
                "species: {E: 10, S: 300, ES: 0, P: 0}\n"
                "reactions:\n"
                "  bind: {uses: {E: 1, S: 1}, makes: {ES: 1}, rate: 0.01}\n"
                "  split: {uses: {ES: 1}, makes: {E: 1, S: 1}, rate: 1}\n"
                "  turn: {uses: {ES: 1}, makes: {E: 1, P: 1}, rate: 2}\n"
                "run: {until: 10}\n");
}
END_TEST

/* A dimer holds two molecules: x + 2 xx. By hand. */
START_TEST(test_sums_weights) {
    ASSERT_SUMS("1 x + 2 xx = 105", "species: {x: 101, xx: 2}\n"
                                    "reactions:\n"
                                    "  pair: {uses: {x: 2}, makes: {xx: 1}, rate: 0.01}\n"
                                    "  split: {uses: {xx: 1}, makes: {x: 2}, rate: 1}\n"
                                    "run: {until: 10}\n");
    /* 3 a <-> 2 b: a/3 + b/2, in whole numbers 2 a + 3 b */
    ASSERT_SUMS("2 a + 3 b = 12", "species: {a: 6, b: 0}\n"
                                  "reactions:\n"
                                  "  there: {uses: {a: 3}, makes: {b: 2}, rate: 1}\n"
                                  "  back: {uses: {b: 2}, makes: {a: 3}, rate: 1}\n"
                                  "run: {until: 10}\n");
}
END_TEST

/* While a pair is locking it is in no species: sums hold with what is under way. By hand. */
START_TEST(test_sums_under_way) {
    static const char model[] = "species: {clasp: 14, pin: 9, pair: 0, locked: 0}\n"
                                "reactions:\n"
                                "  bind: {uses: {clasp: 1, pin: 1}, makes: {pair: 1}, rate: 0.4}\n"
                                "  lock: {uses: {pair: 1}, rate: 0.1, later: [{after: {fixed: 2}, "
                                "makes: {locked: 1}%s}]}\n"
                                "  undo: {uses: {locked: 1}, makes: {clasp: 1, pin: 1}, rate: 1}\n"
                                "run: {until: 10}\n";
    ASSERT_SUMS("1 clasp + 1 pair + 1 locked + 1 lock.later = 14; "
                "1 pin + 1 pair + 1 locked + 1 lock.later = 9",
                model, "");
    /* Where a completion is lost by chance, only the difference of the two stays. */
    ASSERT_SUMS("1 clasp + -1 pin = 5", model, ", chance: 0.9");
}
END_TEST

/* A completion that may be skipped ends the lag and changes nothing else: what is left is that
 * every start makes one pre, and every pre is there or taken. By hand. */
START_TEST(test_sums_skipped) {
    static const char model[] = "species: {seed: 7, pre: 0, done: 0}\n"
                                "reactions:\n"
                                "  start: {uses: {seed: 1}, makes: {pre: 1}, rate: 3, later: "
                                "[{after: {fixed: 2}, uses: {pre: 1}, makes: {done: 1}%s}]}\n"
                                "run: {until: 10}\n";
    ASSERT_SUMS("1 seed + 1 pre + 1 done = 7; 1 seed + 1 done + 1 start.later = 7", model, "");
    ASSERT_SUMS("1 seed + 1 pre + 1 done = 7", model, ", if_short: skip");
}
END_TEST

START_TEST(test_sums_broken) {
    /* Random amounts of b: the sum of b and e is not kept, that of c and g is. */
    ASSERT_SUMS("1 c + 1 g = 5", "species: {b: 2, c: 5, e: 0, g: 0}\n"
                                 "reactions:\n"
                                 "  burst: {makes: {b: {geometric: {mean: 5}}}, rate: 1}\n"
                                 "  fade: {uses: {b: 1}, makes: {e: 1}, rate: 1}\n"
                                 "  turn: {uses: {c: 1}, makes: {g: 1}, rate: 1}\n"
                                 "run: {until: 10}\n");
    /* An amount made from nothing conserves nothing. */
    ASSERT_SUMS("", "species: {a: 4}\n"
                    "reactions: {make: {makes: {a: 1}, rate: 1}, end: {uses: {a: 1}, rate: 1}}\n"
                    "run: {until: 10}\n");
}
END_TEST

/* Each allele is in one state. By hand. */
START_TEST(test_sums_promoter) {
    static const char model[] =
        "genes:\n"
        "  vela:\n"
        "    copies: %d\n"
        "    start: %s\n"
        "    promoter:\n"
        "      shut: {to: {open: 1}}\n"
        "      open: {to: {shut: 1}, initiates: 3}\n"
        "    transcript: {stages: {nascent: {gamma: {mean: 3, sd: 1}}}, half_life: 4}\n"
        "run: {until: 10}\n";
    ASSERT_SUMS("1 vela.shut + 1 vela.open = 1", model, 1, "shut");
    ASSERT_SUMS("1 vela.shut + 1 vela.open = 3", model, 3, "steady");
    /* Without a way back each state's sum hangs on the draw: both are said, neither has a value. */
    ASSERT_SUMS("1 vela.one; 1 vela.two",
                "genes:\n"
                "  vela:\n"
                "    start: {one: 1, two: 1}\n"
                "    promoter: {one: {initiates: 1}, two: {initiates: 2}}\n"
                "    transcript: {half_life: 4}\n"
                "run: {until: 10}\n");
}
END_TEST

START_TEST(test_sums_protocol) {
    ASSERT_SUMS("1 a + 1 b = 4 until 3",
                "species: {a: 4, b: 0}\n"
                "reactions: {turn: {uses: {a: 1}, makes: {b: 1}, rate: 1}}\n"
                "protocol: [{at: 3, set: {b: 9}}]\n"
                "run: {until: 10}\n");
}
END_TEST

/* x0 takes 100 of x1, which takes 100 of x2, ...: the weights 100^k pass 2^63 at k = 10. A group of
 * 201 species is left alone. */
START_TEST(test_sums_limits) {
    static char text[32768];
    size_t n = 0;
    for (int pass = 0; pass < 2; pass++) {
        const int n_species = pass == 0 ? 14 : 201;
        n = (size_t)snprintf(text, sizeof text, "tarry: 1\ntime: min\nspecies:\n");
        for (int i = 0; i < n_species; i++)
            n += (size_t)snprintf(text + n, sizeof text - n, "  x%d: 0\n", i);
        n += (size_t)snprintf(text + n, sizeof text - n, "reactions:\n");
        for (int i = 0; i + 1 < n_species; i++)
            n += (size_t)snprintf(text + n, sizeof text - n,
                                  "  r%d: {uses: {x%d: %d}, makes: {x%d: 1}, rate: 1}\n", i, i,
                                  pass == 0 ? 100 : 1, i + 1);
        n += (size_t)snprintf(text + n, sizeof text - n, "run: {until: 10}\n");
        tarry_model *model = NULL;
        tarry_error error = {0};
        char found[256];
        ck_assert_msg(!tarry_model_read_text(text, n, "m.yaml", NULL, 0, &model, &error), "%s",
                      error.message);
        say_sums(model, found, sizeof found);
        ck_assert_str_eq(found, pass == 0 ? " overflow 1" : " large 1");
        tarry_model_free(model);
    }
}
END_TEST

/* 5 (M/2) - 3 (M/2 - 1) is just over M = 2^63 - 1. */
START_TEST(test_nullspace_overflow) {
    tarry_nullspace space;
    ck_assert_int_eq(tarry_nullspace_init(&space, 2), 0);
    space.row[0] = INT64_MAX / 2;
    space.row[1] = 3;
    ck_assert(tarry_nullspace_take(&space));
    space.row[0] = INT64_MAX / 2 - 1;
    space.row[1] = 5;
    ck_assert(!tarry_nullspace_take(&space));
    tarry_nullspace_release(&space);
}
END_TEST

/* ---- means ----------------------------------------------------------------------------------- */

/* The distance of one product, by name. */
static tarry_distance find_distance(const tarry_model *model, const char *name, double t) {
    static tarry_arena arena; /* reasons outlive the call; a test's process is short */
    tarry_distances d;
    tarry_error error = {0};
    ck_assert_msg(!tarry_analysis_distances(&model->network, t, &arena, &d, &error), "%s",
                  error.message);
    for (size_t i = 0; i < d.n; i++)
        if (strcmp(model->network.species[d.items[i].species].name, name) == 0)
            return d.items[i];
    ck_abort_msg("no distance for %s", name);
}

static void assert_mean(const tarry_model *model, const char *name, double t, double expected,
                        double tolerance) {
    const tarry_distance d = find_distance(model, name, t);
    ck_assert_msg(!d.why, "%s: %s", name, d.why ? d.why : "");
    ck_assert_msg(fabs(d.mean - expected) <= tolerance, "%s at %g: %.12g, not %.12g", name, t,
                  d.mean, expected);
}

/* Two-state gene from the shut state, kon 0.5, koff 2, nu 20, decay 1: the mean nu p [1 - e^-t -
 * (e^-t - e^-kt)/(k - 1)] (check values, section 2, set A from OFF; moment equations). The tables
 * have 8 decimals. */
START_TEST(test_means_two_state) {
    static const double table[][2] = {
        {0.5, 0.72047506}, {1, 1.76636372}, {2, 3.11573264}, {5, 3.95509029}, {10, 3.99969733}};
    tarry_model *model = read_model("genes:\n"
                                    "  vela:\n"
                                    "    copies: 3\n"
                                    "    promoter:\n"
                                    "      shut: {to: {open: 0.5}}\n"
                                    "      open: {to: {shut: 2}, initiates: 20}\n"
                                    "    transcript: {decay: 1}\n"
                                    "run: {until: 10}\n");
    for (size_t i = 0; i < 5; i++)
        assert_mean(model, "vela.transcript", table[i][0], 3 * table[i][1], 3 * 6e-9);
    ck_assert_double_eq_tol(find_distance(model, "vela.transcript", 1).steady, 12, 1e-12);
    ck_assert_double_eq_tol(find_distance(model, "vela.transcript", 1).relative, 1.76636372 / 4 - 1,
                            2e-9);
    tarry_model_free(model);
}
END_TEST

static tarry_model *read_always_on(double rate, const char *stages, double decay) {
    return read_model("genes:\n"
                      "  vela:\n"
                      "    promoter: {on: {initiates: %.17g}}\n"
                      "    transcript: {stages: {under_way: %s}, decay: %.17g}\n"
                      "run: {until: 10}\n",
                      rate, stages, decay);
}

/* M/G/infinity with a fixed delay (check values, section 3.2): k = 2, d = 3, decay 0.25. In transit
 * k min(t, d). */
START_TEST(test_means_fixed_lag) {
    static const double table[][2] = {{2, 0}, {5, 3.14775472}, {10, 6.60980845}, {20, 7.88588613}};
    tarry_model *model = read_always_on(2, "{fixed: 3}", 0.25);
    for (size_t i = 0; i < 4; i++) {
        assert_mean(model, "vela.transcript", table[i][0], table[i][1], 6e-9);
        assert_mean(model, "vela.under_way", table[i][0], 2 * fmin(table[i][0], 3), 1e-9);
    }
    tarry_model_free(model);
}
END_TEST

/* How wrong the grid of 1,024 bins may make a mean at t. Sharing a bin's mass between its ends is
 * linear interpolation of what is averaged: at most h^2/8 times its second derivative, decay^2
 * times the steady mean. */
static double grid_error(double t, double steady, double decay) {
    const double h = t / 1024;
    return steady * decay * decay * h * h / 8 + 1e-8;
}

/* The same for a number under way: the average is over a jump, which the grid widens to a triangle:
 * h^2/12 times the slope of the survival, here below 0.7. */
static double grid_jump_error(double t) {
    const double h = t / 1024;
    return 0.7 * h * h / 12 + 1e-8;
}

/* Erlang delays of mean 10, k = 1, decay 0.1 (check values, section 3.4). Fifty steps go onto the
 * grid, the others into the linear system. */
START_TEST(test_means_erlang) {
    static const double times[] = {10, 20, 40};
    static const struct {
        int steps;
        double means[3];
        bool grid;
    } table[] = {{1, {2.64241118, 5.93994150, 9.08421806}, false},
                 {2, {2.05158651, 5.86868339, 9.30427533}, false},
                 {5, {1.42809752, 5.98886032, 9.44110544}, false},
                 {10, {1.06757955, 6.12836771, 9.47471261}, false},
                 {50, {0.51996509, 6.28373007, 9.49705756}, true}};
    for (size_t i = 0; i < 5; i++) {
        char stage[64];
        snprintf(stage, sizeof stage, "{erlang: {steps: %d, mean: 10}}", table[i].steps);
        tarry_model *model = read_always_on(1, stage, 0.1);
        for (size_t k = 0; k < 3; k++)
            assert_mean(model, "vela.transcript", times[k], table[i].means[k],
                        table[i].grid ? grid_error(times[k], 10, 0.1) : 6e-9);
        /* in transit at 20 with 5 steps (section 3.4) */
        if (table[i].steps == 5)
            assert_mean(model, "vela.under_way", 20, 9.91419413, 6e-9);
        tarry_model_free(model);
    }
}
END_TEST

/* Transcript, then protein, each after a fixed delay (check values, section 3.3). */
START_TEST(test_means_protein) {
    static const double table[][3] = {{6, 0.90634623, 0},
                                      {10, 3.16060279, 10.59797304},
                                      {20, 4.75106466, 98.60904712},
                                      {60, 4.99991649, 271.74200638},
                                      {120, 5, 298.59299331}};
    tarry_model *model = read_model("genes:\n"
                                    "  vela:\n"
                                    "    promoter: {on: {initiates: 1}}\n"
                                    "    transcript: {stages: {nascent: {fixed: 5}}, decay: 0.2}\n"
                                    "    protein: {translation: 3, stages: {folding: {fixed: 2}}, "
                                    "decay: 0.05}\n"
                                    "run: {until: 10}\n");
    for (size_t i = 0; i < 5; i++) {
        assert_mean(model, "vela.transcript", table[i][0], table[i][1], 6e-9);
        assert_mean(model, "vela.protein", table[i][0], table[i][2], 6e-9);
    }
    ck_assert_double_eq_tol(find_distance(model, "vela.protein", 1).steady, 300, 1e-10);
    tarry_model_free(model);
}
END_TEST

/* ---- against quadrature ---------------------------------------------------------------------- */

typedef struct integrand {
    double t, decay, a, b;
    double (*density)(double x, double a, double b);
    double (*survival)(double x, double a, double b);
} integrand;

/* Arrived x ago, and not decayed since: f(x) (1 - e^(-decay (t - x)))/decay. */
static double arrived(double x, void *context) {
    const integrand *i = context;
    return i->density(x, i->a, i->b) * -expm1(-i->decay * (i->t - x)) / i->decay;
}

static double under_way(double x, void *context) {
    const integrand *i = context;
    return i->survival(x, i->a, i->b);
}

static double integrate(double (*f)(double, void *), const integrand *i) {
    gsl_integration_workspace *room = gsl_integration_workspace_alloc(1000);
    gsl_function function = {f, (void *)i};
    double value = 0, error = 0;
    ck_assert_int_eq(gsl_integration_qag(&function, 0, i->t, 1e-10, 1e-9, 1000, GSL_INTEG_GAUSS61,
                                         room, &value, &error),
                     0);
    gsl_integration_workspace_free(room);
    return value;
}

/* M/G/infinity (check values, section 3.2) with lags that have no closed form here, the integrals
 * by GSL. */
START_TEST(test_means_quadrature) {
    static const struct {
        const char *stage;
        integrand i;
    } cases[] = {
        {"{gamma: {mean: 8, sd: 4}}", {0, 0.1, 4, 2, gsl_ran_gamma_pdf, gsl_cdf_gamma_Q}},
        {"{lognormal: {mean: 1.6487212707001282, sd: 2.1611974158950877}}",
         {0, 0.1, 0, 1, gsl_ran_lognormal_pdf, gsl_cdf_lognormal_Q}},
        {"{weibull: {scale: 5, shape: 2.5}}",
         {0, 0.1, 5, 2.5, gsl_ran_weibull_pdf, gsl_cdf_weibull_Q}},
        {"{uniform: {from: 2, to: 9}}", {0, 0.1, 2, 9, gsl_ran_flat_pdf, gsl_cdf_flat_Q}},
    };
    static const double times[] = {1, 6, 30, 60};
    for (size_t c = 0; c < 4; c++) {
        tarry_model *model = read_always_on(1, cases[c].stage, 0.1);
        for (size_t k = 0; k < 4; k++) {
            integrand i = cases[c].i;
            i.t = times[k];
            assert_mean(model, "vela.transcript", i.t, integrate(arrived, &i),
                        grid_error(i.t, 10, i.decay));
            assert_mean(model, "vela.under_way", i.t, integrate(under_way, &i),
                        grid_jump_error(i.t));
        }
        tarry_model_free(model);
    }
}
END_TEST

/* Two drawn stages and a drawn lifetime: the sum of two gammas of one scale is a gamma, so that the
 * mean is k times the integral of S(stages + lifetime) - S(stages), by GSL. Up to three steps are
 * on the grid. */
typedef struct shapes {
    double before, with, scale;
} shapes;

static double present(double x, void *context) {
    const shapes *s = context;
    return gsl_cdf_gamma_Q(x, s->with, s->scale) - gsl_cdf_gamma_Q(x, s->before, s->scale);
}

static double survives(double x, void *context) {
    const shapes *s = context;
    return gsl_cdf_gamma_Q(x, s->with, s->scale);
}

START_TEST(test_means_two_drawn_stages) {
    tarry_model *model = read_model(
        "genes:\n"
        "  vela:\n"
        "    promoter: {on: {initiates: 3}}\n"
        "    transcript:\n"
        "      stages: {one: {gamma: {mean: 6, sd: 3.4641016151377544}}, two: {gamma: "
        "{mean: 3, sd: 2.4494897427831781}}}\n"
        "      lifetime: {gamma: {mean: 10, sd: 4.4721359549995796}}\n"
        "run: {until: 10}\n");
    static const double times[] = {3, 9, 15, 40};
    static const shapes parts[] = {{0, 3, 2}, {3, 4.5, 2}, {4.5, 9.5, 2}};
    static const char *const names[] = {"vela.one", "vela.two", "vela.transcript"};
    gsl_integration_workspace *room = gsl_integration_workspace_alloc(1000);
    for (size_t k = 0; k < 4; k++)
        for (size_t p = 0; p < 3; p++) {
            gsl_function function = {p > 0 ? present : survives, (void *)&parts[p]};
            double value = 0, error = 0;
            gsl_integration_qag(&function, 0, times[k], 1e-10, 1e-9, 1000, GSL_INTEG_GAUSS61, room,
                                &value, &error);
            assert_mean(model, names[p], times[k], 3 * value, 3 * 3 * grid_jump_error(times[k]));
        }
    gsl_integration_workspace_free(room);
    tarry_model_free(model);
}
END_TEST

/* The same two gammas as one stage: a total is met within one of its parts; and a mix of it with a
 * gamma of shape 5, three to one. */
static double present_mixed(double x, void *context) {
    (void)context;
    return 0.25 * gsl_cdf_gamma_Q(x, 4.5, 2) + 0.75 * gsl_cdf_gamma_Q(x, 5, 2);
}

START_TEST(test_means_total) {
    static const char total[] =
        "{total: [{gamma: {mean: 6, sd: 3.4641016151377544}}, {gamma: {mean: "
        "3, sd: 2.4494897427831781}}]}";
    static const double times[] = {3, 9, 15};
    char mix[512];
    snprintf(mix, sizeof mix,
             "{mix: [{share: 0.25, lasts: %s}, {share: 0.75, lasts: {gamma: {mean: 10, sd: "
             "4.4721359549995796}}}]}",
             total);
    const shapes part = {0, 4.5, 2};
    gsl_integration_workspace *room = gsl_integration_workspace_alloc(1000);
    for (int mixed = 0; mixed < 2; mixed++) {
        tarry_model *model = read_always_on(3, mixed ? mix : total, 0.1);
        for (size_t k = 0; k < 3; k++) {
            gsl_function function = {mixed ? present_mixed : survives, (void *)&part};
            double value = 0, error = 0;
            gsl_integration_qag(&function, 0, times[k], 1e-10, 1e-9, 1000, GSL_INTEG_GAUSS61, room,
                                &value, &error);
            assert_mean(model, "vela.under_way", times[k], 3 * value,
                        3 * 3 * grid_jump_error(times[k]));
        }
        tarry_model_free(model);
    }
    gsl_integration_workspace_free(room);
}
END_TEST

/* ---- starts, and what cannot be worked out ----------------------------------------------------
 */

/* From a steady promoter only lags and decay are left: mean (1 - e^(-decay t)) for a gene without
 * stages, whatever its moves; for a state that lasts the share of time is mean dwell over the sum
 * of mean dwells (renewal theory, common practice). */
START_TEST(test_means_steady_start) {
    tarry_model *model = read_model("genes:\n"
                                    "  vela:\n"
                                    "    start: steady\n"
                                    "    promoter:\n"
                                    "      shut: {lasts: {gamma: {mean: 6, sd: 2}}, then: open}\n"
                                    "      open: {to: {shut: 0.5}, initiates: 4}\n"
                                    "    transcript: {decay: 0.3}\n"
                                    "run: {until: 10}\n");
    ck_assert_double_eq_tol(find_distance(model, "vela.transcript", 4).steady, 4 * (2.0 / 8) / 0.3,
                            1e-12);
    assert_mean(model, "vela.transcript", 4, 4 * (2.0 / 8) / 0.3 * -expm1(-0.3 * 4), 1e-12);
    tarry_model_free(model);
}
END_TEST

static void assert_why(const tarry_model *model, const char *name, const char *words) {
    const tarry_distance d = find_distance(model, name, 4);
    if (!words) {
        ck_assert_msg(!d.why, "%s: %s", name, d.why ? d.why : "");
        return;
    }
    ck_assert_msg(d.why && strstr(d.why, words), "%s: '%s' has no '%s'", name,
                  d.why ? d.why : "(worked out)", words);
    ck_assert(isnan(d.mean) && isnan(d.steady) && isnan(d.relative));
}

START_TEST(test_means_refused) {
    static const char gene[] = "species: {lure: 5}\n"
                               "genes:\n"
                               "  vela:\n"
                               "    start: %s\n"
                               "    promoter:\n"
                               "      shut: {%s}\n"
                               "      open: {to: {shut: 0.5}, initiates: %s}\n"
                               "    transcript: {%s}\n"
                               "    protein: {translation: %s, half_life: 10}\n"
                               "reactions: {use: {uses: {%s: 2}, rate: 1}}\n"
                               "run: {until: 10}\n";
    static const struct {
        const char *parts[6];
        const char *transcript, *protein;
    } cases[] = {
        {{"shut", "to: {open: 1}", "3", "half_life: 2", "1", "lure"}, NULL, NULL},
        {{"shut", "lasts: {fixed: 3}, then: open", "3", "half_life: 2", "1", "lure"},
         "lasts a drawn time",
         "lasts a drawn time"},
        {{"shut", "to: {open: 1}", "0.1 * lure", "half_life: 2", "1", "lure"},
         "reads counts",
         "reads counts"},
        {{"shut", "to: {open: 0.1 * vela.protein}", "3", "half_life: 2", "1", "lure"},
         "reads counts",
         "reads counts"},
        {{"shut", "to: {open: 1}", "3", "half_life: 2", "0.1 * lure", "lure"},
         NULL,
         "reads counts"},
        {{"shut", "to: {open: 1}", "3", "half_life: 2", "1", "vela.protein"},
         NULL,
         "'use' changes it"},
        {{"shut", "to: {open: 1}", "3", "half_life: 2", "1", "vela.transcript"},
         "'use' changes it",
         "made from 'vela.transcript'"},
        {{"shut", "to: {open: 1}", "3", "decay: 0", "1", "lure"},
         "nothing removes it",
         "made from 'vela.transcript'"},
        {{"shut", "to: {open: 1}", "0", "half_life: 2", "1", "lure"},
         "never initiated",
         "never initiated"},
    };
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        const char *const *p = cases[i].parts;
        tarry_model *model = read_model(gene, p[0], p[1], p[2], p[3], p[4], p[5]);
        assert_why(model, "vela.transcript", cases[i].transcript);
        assert_why(model, "vela.protein", cases[i].protein);
        tarry_model_free(model);
    }
}
END_TEST

/* What plain reactions do to a gene's products. One that only takes a molecule away, at a rate of
 * its own, is one more decay: of 3 min the gene is open 2 and initiates 3 times in each, so that
 * 2/(decay + 1) are there. Others change the mean in ways that are not worked out. */
START_TEST(test_means_changed) {
    static const char gene[] = "species: {lure: 5}\n"
                               "genes:\n"
                               "  vela:\n"
                               "    start: steady\n"
                               "    promoter:\n"
                               "      shut: {to: {open: 1}}\n"
                               "      open: {to: {shut: 0.5}, initiates: 3}\n"
                               "    transcript: {stages: {n: {fixed: 1}}, decay: 1}\n"
                               "    protein: {translation: 2, decay: 0.5}\n"
                               "reactions: {use: {%s}}\n"
                               "run: {until: 10}\n";
    static const struct {
        const char *reaction, *transcript, *protein;
    } cases[] = {
        {"uses: {vela.transcript: 1}, rate: 1", NULL, NULL},
        {"uses: {vela.transcript: 1}, makes: {lure: 1}, rate: 1", "'use' changes it",
         "made from 'vela.transcript'"},
        {"uses: {vela.transcript: 1}, rate: 1, later: [{after: 1, makes: {lure: 1}}]",
         "'use' changes it", "made from 'vela.transcript'"},
        {"uses: {vela.transcript: 1}, propensity: 2 * vela.transcript", "'use' changes it",
         "made from 'vela.transcript'"},
        {"uses: {vela.transcript: 1}, rate: 0.1 * lure", "reads counts",
         "made from 'vela.transcript'"},
        {"uses: {vela.transcript: 1}, needs: {lure: 1}, rate: 1", "'use' changes it",
         "made from 'vela.transcript'"},
        {"makes: {vela.transcript: 1}, rate: 1", "'use' changes it", "made from 'vela.transcript'"},
        {"makes: {vela.transcript: {geometric: {mean: 2}}}, rate: 1", "'use' changes it",
         "made from 'vela.transcript'"},
        {"makes: {lure: 1}, rate: 1, later: [{after: 1, makes: {vela.transcript: 1}}]",
         "changes it", "made from 'vela.transcript'"},
        {"makes: {lure: 1}, rate: 1, later: [{after: 1, uses: {vela.transcript: 1}, if_short: "
         "skip}]",
         "changes it", "made from 'vela.transcript'"},
        {"needs: {vela.transcript: 1}, makes: {vela.protein: 1}, rate: 1", NULL,
         "\'use\' changes it"},
        {"needs: {vela.transcript: 2}, makes: {vela.protein: 1}, rate: 1", NULL,
         "'use' changes it"},
        {"needs: {lure: 1}, makes: {vela.protein: 1}, rate: 1", NULL, "'use' changes it"},
        {"uses: {vela.transcript: 1}, makes: {vela.protein: 1}, rate: 1", "'use' changes it",
         "'use' changes it"},
        {"needs: {vela.transcript: 1}, makes: {vela.protein: 1}, rate: 0.1 * lure", NULL,
         "'use' changes it"},
    };
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        tarry_model *model = read_model(gene, cases[i].reaction);
        assert_why(model, "vela.transcript", cases[i].transcript);
        assert_why(model, "vela.protein", cases[i].protein);
        if (i == 0)
            assert_mean(model, "vela.transcript", 40, 2.0 / 2, 1e-9);
        tarry_model_free(model);
    }
}
END_TEST

/* A gene that follows one like it shares its figures; one that differs in any single thing has its
 * own, which are those that it has where it stands alone. */
START_TEST(test_means_neighbours) {
    static const struct {
        const char *gene, *promoter, *transcript;
    } genes[] = {
        {"", "shut: {to: {open: 0.5}}, open: {to: {shut: 2}, initiates: 6}",
         "stages: {n: {gamma: {mean: 2, sd: 1}}}, decay: 0.3"},
        {"", "shut: {to: {open: 0.5}}, open: {to: {shut: 2}, initiates: 7}",
         "stages: {n: {gamma: {mean: 2, sd: 1}}}, decay: 0.3"},
        {"", "shut: {to: {open: 0.5}}, open: {to: {shut: 2.5}, initiates: 6}",
         "stages: {n: {gamma: {mean: 2, sd: 1}}}, decay: 0.3"},
        {"copies: 2, ", "shut: {to: {open: 0.5}}, open: {to: {shut: 2}, initiates: 6}",
         "stages: {n: {gamma: {mean: 2, sd: 1}}}, decay: 0.3"},
        {"start: open, ", "shut: {to: {open: 0.5}}, open: {to: {shut: 2}, initiates: 6}",
         "stages: {n: {gamma: {mean: 2, sd: 1}}}, decay: 0.3"},
        {"start: steady, ", "shut: {to: {open: 0.5}}, open: {to: {shut: 2}, initiates: 6}",
         "stages: {n: {gamma: {mean: 2, sd: 1}}}, decay: 0.3"},
        {"", "shut: {to: {open: 0.5}}, open: {to: {shut: {rate: 2, initiates: yes}}, initiates: 6}",
         "stages: {n: {gamma: {mean: 2, sd: 1}}}, decay: 0.3"},
        {"",
         "shut: {to: {open: 0.5}}, open: {to: {shut: 2, far: 1}, initiates: 6}, far: {to: {open: "
         "1}}",
         "stages: {n: {gamma: {mean: 2, sd: 1}}}, decay: 0.3"},
        {"", "shut: {to: {open: 0.5}}, open: {to: {shut: 2}, initiates: 6}",
         "stages: {n: {gamma: {mean: 2, sd: 1.5}}}, decay: 0.3"},
        {"", "shut: {to: {open: 0.5}}, open: {to: {shut: 2}, initiates: 6}",
         "stages: {n: {fixed: 2}}, decay: 0.3"},
        {"", "shut: {to: {open: 0.5}}, open: {to: {shut: 2}, initiates: 6}",
         "stages: {n: {exponential: {mean: 2}}}, decay: 0.3"},
        {"", "shut: {to: {open: 0.5}}, open: {to: {shut: 2}, initiates: 6}",
         "stages: {n: {gamma: {mean: 2, sd: 1}}}, decay: 0.4"},
        {"", "shut: {to: {open: 0.5}}, open: {to: {shut: 2}, initiates: 6}",
         "stages: {n: {gamma: {mean: 2, sd: 1}}}, lifetime: {fixed: 3}"},
        {"", "shut: {to: {open: 0.5}}, open: {to: {shut: 2}, initiates: 6}", "decay: 0.3"},
        {"", "shut: {to: {open: 0.5}}, open: {to: {shut: 2}, initiates: 6}",
         "stages: {n: {lasts: {gamma: {mean: 2, sd: 1}}, lost: 0.1}}, decay: 0.3"},
    };
    enum { N = sizeof genes / sizeof *genes };
    static const char one[] = "  %s: {%spromoter: {%s}, transcript: {%s}}\n";
    char both[1024];
    snprintf(both, sizeof both, "genes:\n%s%srun: {until: 10}\n", one, one);
    for (size_t i = 0; i < N; i++) {
        tarry_model *alone = read_model(
            "genes:\n  vela: {%spromoter: {%s}, transcript: {%s}}\nrun: {until: 10}\n",
            genes[i].gene, genes[i].promoter, genes[i].transcript);
        const tarry_distance own = find_distance(alone, "vela.transcript", 4);
        for (size_t before = 0; before < N; before++) {
            tarry_model *model = read_model(
                both, "lyra", genes[before].gene, genes[before].promoter, genes[before].transcript,
                "vela", genes[i].gene, genes[i].promoter, genes[i].transcript);
            const tarry_distance d = find_distance(model, "vela.transcript", 4);
            ck_assert_int_eq(d.why == NULL, own.why == NULL);
            ck_assert_msg(d.why || (d.mean == own.mean && d.steady == own.steady),
                          "gene %zu after %zu: %.12g, alone %.12g", i, before, d.mean, own.mean);
            tarry_model_free(model);
        }
        tarry_model_free(alone);
    }
}
END_TEST

START_TEST(test_means_two_ends) {
    tarry_model *model = read_model("genes:\n"
                                    "  vela:\n"
                                    "    promoter:\n"
                                    "      fork: {to: {low: 1, high: 1}}\n"
                                    "      low: {initiates: 1}\n"
                                    "      high: {initiates: 9}\n"
                                    "    transcript: {half_life: 2}\n"
                                    "run: {until: 10}\n");
    assert_why(model, "vela.transcript", "different states for ever");
    tarry_model_free(model);
}
END_TEST

/* 1 - mean/steady is e^(-decay t) for a gene that is always on: 0.1 % are left at log(1000)/decay.
 */
START_TEST(test_settle) {
    static const double decays[] = {0.05, 0.040625, 0.3};
    for (size_t i = 0; i < 3; i++) {
        tarry_model *model = read_model("genes:\n"
                                        "  vela:\n"
                                        "    promoter: {on: {initiates: 1}}\n"
                                        "    transcript: {decay: %.17g}\n"
                                        "run: {until: 10}\n",
                                        decays[i]);
        double settle = 0;
        size_t n_unknown = 9;
        tarry_error error = {0};
        ck_assert_int_eq(tarry_analysis_settle(&model->network, 1e-3, &settle, &n_unknown, &error),
                         0);
        ck_assert_double_ge(settle, log(1000) / decays[i]);
        ck_assert_double_le(settle, 1.011 * log(1000) / decays[i]);
        ck_assert_uint_eq(n_unknown, 0);
        tarry_model_free(model);
    }
}
END_TEST

/* ---- slips ------------------------------------------------------------------------------------
 */

/* All notes of a model as one text. */
static void say_slips(const tarry_model *model, char *out, size_t size) {
    tarry_notes notes = {0};
    tarry_error error = {0};
    size_t n = 0;
    out[0] = '\0';
    ck_assert_int_eq(tarry_analysis_slips(&model->network, &notes, &error), 0);
    for (size_t i = 0; i < notes.n; i++)
        n += (size_t)snprintf(out + n, size - n, "%s\n", notes.lines[i]);
    tarry_notes_release(&notes);
}

#define ASSERT_SLIP(words, ...)                                                                    \
    do {                                                                                           \
        static char found_[8192];                                                                  \
        tarry_model *model_ = read_model(__VA_ARGS__);                                             \
        say_slips(model_, found_, sizeof found_);                                                  \
        if (*(words))                                                                              \
            ck_assert_msg(strstr(found_, (words)), "no '%s' in:\n%s", (words), found_);            \
        else                                                                                       \
            ck_assert_str_eq(found_, "");                                                          \
        tarry_model_free(model_);                                                                  \
    } while (0)

START_TEST(test_slips_reach) {
    static const char model[] = "species: {a: %d, b: 0, c: 0}\n"
                                "reactions:\n"
                                "  turn: {uses: {a: 2}, makes: {b: 1}, rate: %s}\n"
                                "  late: {uses: {b: 1}, rate: 1, later: [{after: {fixed: 1}, "
                                "makes: {c: 1}}]}\n"
                                "  end: {uses: {c: 1}, rate: 1}\n"
                                "run: {until: 10}\n";
    ASSERT_SLIP("", model, 2, "1");
    ASSERT_SLIP("'turn' can never fire: there is never enough 'a'", model, 1, "1");
    ASSERT_SLIP("'turn' can never fire: its rate is 0 throughout", model, 2, "0");
    ASSERT_SLIP("'end' can never fire: there is never enough 'c'", model, 1, "1");
    ASSERT_SLIP("nothing makes 'a', and it starts at 0", model, 0, "1");
    /* set by the protocol */
    ASSERT_SLIP("", "species: {a: 0}\nreactions: {end: {uses: {a: 1}, rate: 1}}\n"
                    "protocol: [{at: 3, set: {a: 9}}]\nrun: {until: 10}\n");
    ASSERT_SLIP("no promoter is ever in the state 'vela.open'",
                "genes:\n"
                "  vela:\n"
                "    bursts_in: [open]\n"
                "    promoter: {shut: {initiates: 1}, open: {to: {shut: 1}, initiates: 1}}\n"
                "    transcript: {half_life: 2}\n"
                "run: {until: 10}\n");
}
END_TEST

START_TEST(test_slips_many) {
    static char text[8192];
    size_t n = (size_t)snprintf(text, sizeof text, "species: {a: 0}\nreactions:\n");
    for (int i = 0; i < 25; i++)
        n += (size_t)snprintf(text + n, sizeof text - n, "  r%d: {uses: {a: 1}, rate: 1}\n", i);
    snprintf(text + n, sizeof text - n, "run: {until: 10}\n");
    char *found = calloc(1, 16384);
    char *whole = calloc(1, 16384);
    ck_assert(found && whole);
    tarry_model *model = NULL;
    tarry_error error = {0};
    snprintf(whole, 16384, "tarry: 1\ntime: min\n%s", text);
    ck_assert_int_eq(tarry_model_read_text(whole, strlen(whole), "m.yaml", NULL, 0, &model, &error),
                     0);
    say_slips(model, found, 16384);
    ck_assert(strstr(found, "and 15 more reactions that can never fire") != NULL);
    tarry_model_free(model);
    free(found);
    free(whole);
}
END_TEST

START_TEST(test_slips_negative) {
    static const char model[] = "species: {a: 3}\n"
                                "reactions: {odd: {uses: {a: 1}, %s: \"%s\"}}\n"
                                "run: {until: 10}\n";
    ASSERT_SLIP("the rate of 'odd' (5 - a) would be -1 with 'a' = 6", model, "rate", "5 - a");
    ASSERT_SLIP("the propensity of 'odd' (5 - a) would be", model, "propensity", "5 - a");
    ASSERT_SLIP("", model, "rate", "max(0, 5 - a)");
    ASSERT_SLIP("", model, "rate", "1 - a / (1 + a)");
    /* what is used is there: a - 1 is not negative where a reaction takes place */
    ASSERT_SLIP("", model, "rate", "a - 1");
}
END_TEST

START_TEST(test_slips_waits) {
    static const char model[] = "parameters: {wait: %s}\n"
                                "delays: {pause: {fixed: wait}}\n"
                                "species: {a: 9, b: 0}\n"
                                "reactions: {turn: {uses: {a: 1}, rate: 1, later: [{after: pause, "
                                "makes: {b: 1}}]}}\n"
                                "protocol: [{at: 5, set: {wait: %s}}]\n"
                                "run: {until: 10}\n";
    ASSERT_SLIP("", model, "3", "3");
    ASSERT_SLIP("the delay 'pause' of 'turn.later' is 11 min long on average, longer than the "
                "record of 10 min",
                model, "11", "11");
    ASSERT_SLIP("the step at 5 min changes the delay 'pause'", model, "3", "4");
}
END_TEST

/* ---- bounds -----------------------------------------------------------------------------------
 */

/* By hand; counts are 0 or more. */
START_TEST(test_range) {
    static const struct {
        const char *formula;
        double low, high;
    } cases[] = {{"a", 0, HUGE_VAL},
                 {"2 * a + 1", 1, HUGE_VAL},
                 {"3 - a", -HUGE_VAL, 3},
                 {"max(0, 3 - a)", 0, 3},
                 {"min(a, 7)", 0, 7},
                 {"exp(-a)", 0, 1},
                 {"2 / (1 + a)", 0, 2},
                 {"hill(a, 3, 2)", 0, 1},
                 {"4 * repress(a, 3, 2)", 0, 4},
                 {"(a - 2)^2", 0, HUGE_VAL},
                 {"(2 - a)^3", -HUGE_VAL, 8},
                 {"sqrt(a)", 0, HUGE_VAL},
                 {"log(1 + a)", 0, HUGE_VAL},
                 {"log(a)", -HUGE_VAL, HUGE_VAL},
                 {"min(a, 0) * log(a)", 0, 0},
                 {"1 / a", 0, HUGE_VAL},
                 {"1 / (a - 2)", -HUGE_VAL, HUGE_VAL},
                 {"1 / (-1 - a)", -1, 0},
                 {"1 / (0 - a)", -HUGE_VAL, 0},
                 {"2^a", 0, HUGE_VAL},
                 {"(1 + a)^(-2)", 0, 1},
                 {"(2 - a)^0.5", -HUGE_VAL, HUGE_VAL},
                 {"(2 - a)^a", -HUGE_VAL, HUGE_VAL},
                 {"(2 - a)^(-2)", 0, HUGE_VAL},
                 {"(2 - a)^(-1)", -HUGE_VAL, HUGE_VAL},
                 {"(-3 - a)^2", 9, HUGE_VAL},
                 {"(-3 - a)^3", -HUGE_VAL, -27},
                 {"log(3 - a)", -HUGE_VAL, 1.0986122886681098},
                 {"log(0 - a)", -HUGE_VAL, HUGE_VAL},
                 {"sqrt(4 - a)", 0, 2},
                 {"hill(a - 5, 3, 2)", -HUGE_VAL, HUGE_VAL},
                 {"hill(3, a - 1, 2)", -HUGE_VAL, HUGE_VAL},
                 {"hill(3, 1 + a, 2)", 0, 1},
                 {"hill(a, 3, 1.5)", 0, 1},
                 {"repress(3, a, a)", 0, 1},
                 {"max(a - 5, 2)", 2, HUGE_VAL},
                 {"min(3 - a, a)", -HUGE_VAL, 3},
                 {"a * (a - 4)", -HUGE_VAL, HUGE_VAL},
                 {"a / 4 - 1", -1, HUGE_VAL},
                 {"(1 + a) / (2 + a)", 0, HUGE_VAL}, /* wider than the truth: a counts as two */
                 {"exp(a) * -2", -HUGE_VAL, -2}};
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        tarry_model *model = read_model("species: {a: 3}\n"
                                        "reactions: {odd: {propensity: \"%s\"}}\n"
                                        "run: {until: 10}\n",
                                        cases[i].formula);
        const tarry_interval found = tarry_analysis_range(&model->network.segments[0].formulas[0],
                                                          NULL);
        ck_assert_msg(fabs(found.low - cases[i].low) < 1e-12 || found.low == cases[i].low,
                      "%s: low %g", cases[i].formula, found.low);
        ck_assert_msg(fabs(found.high - cases[i].high) < 1e-12 || found.high == cases[i].high,
                      "%s: high %g", cases[i].formula, found.high);
        tarry_model_free(model);
    }
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"sums: enzyme", test_sums_enzyme},
        {"sums: weights", test_sums_weights},
        {"sums: under way", test_sums_under_way},
        {"sums: skipped", test_sums_skipped},
        {"sums: broken", test_sums_broken},
        {"sums: promoter", test_sums_promoter},
        {"sums: protocol", test_sums_protocol},
        {"sums: limits", test_sums_limits},
        {"null space: overflow", test_nullspace_overflow},
        {"means: two-state gene", test_means_two_state},
        {"means: fixed lag", test_means_fixed_lag},
        {"means: Erlang lags", test_means_erlang},
        {"means: protein", test_means_protein},
        {"means: quadrature", test_means_quadrature},
        {"means: two drawn stages", test_means_two_drawn_stages},
        {"means: totals and mixes", test_means_total},
        {"means: steady start", test_means_steady_start},
        {"means: refused", test_means_refused},
        {"means: changed", test_means_changed},
        {"means: neighbours", test_means_neighbours},
        {"means: two ends", test_means_two_ends},
        {"settle", test_settle},
        {"slips: reach", test_slips_reach},
        {"slips: many", test_slips_many},
        {"slips: negative rates", test_slips_negative},
        {"slips: waits", test_slips_waits},
        {"range", test_range},
    };
    return run_tests("analysis", tests, sizeof tests / sizeof *tests);
}
