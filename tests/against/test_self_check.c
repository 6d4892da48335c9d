/* SPDX-License-Identifier: GPL-3.0-or-later */

/* A run beside its exact laws: the share of correct runs that are farther off against Student's law
 * as GSL has it, how often it cries wolf, and whether it hears one. */

#include "support.h"

#include "base/random.h"
#include "study/self_check.h"
#include "tarry/tarry.h"

#include <gsl/gsl_cdf.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

static void all_is_well(int code, const tarry_error *error) {
    char words[1024];
    ck_assert_msg(code == 0, "%s", tarry_error_text(error, words, sizeof words));
}

/* ---- against Student's law ------------------------------------------------------------------- */

static double normal(tarry_stream *stream) {
    return gsl_cdf_ugaussian_Pinv(tarry_unit(tarry_stream_next(stream)));
}

/* Results of 64 groups that hold n figures, each a normal mean with value t standard errors. */
static tarry_results *make_figures(int n, double t, tarry_results *exact) {
    tarry_results *results;
    tarry_error error = {0};
    tarry_stream stream;
    tarry_stream_init(&stream, 1, 0, TARRY_STREAM_EVENTS);
    all_is_well(tarry_results_new(&results, &error), &error);
    results->ledger = calloc(1, sizeof *results->ledger);
    results->n_cells = 64;
    for (int i = 0; i < n; i++) {
        double moves[64], mean = 0, sum = 0, value = 0.1 * t;
        char name[32];
        snprintf(name, sizeof name, "figure %d", i);
        for (int g = 0; g < 64; g++)
            mean += (moves[g] = normal(&stream)) / 64;
        for (int g = 0; g < 64; g++)
            sum += pow(moves[g] - mean, 2);
        for (int g = 0; g < 64; g++)
            moves[g] = value + (moves[g] - mean) * 0.1 / sqrt(sum * 63 / 64);
        const tarry_jackknife jackknife = tarry_jackknife_of(64);
        const tarry_estimate estimate = tarry_jackknife_estimate(&jackknife, value, moves,
                                                                 TARRY_SCALE_PLAIN);
        all_is_well(tarry_table_add(results->tables[TARRY_TABLE_bursts], &error, "vela", "all",
                                    name, "1", value, NAN, NAN, 64.0),
                    &error);
        all_is_well(tarry_results_keep(results, TARRY_LEDGER_bursts_value, &estimate, &error),
                    &error);
        all_is_well(tarry_table_add(exact->tables[TARRY_TABLE_bursts], &error, "vela", "all", name,
                                    "1", 0.0, NAN, NAN, NAN),
                    &error);
    }
    return results;
}

/* Of n independent figures one is farther off than t in 1 - (1 - p)^n of runs, p = P(|T| > t). */
static void check_share(int n, double t, double tolerance) {
    tarry_results *exact;
    tarry_error error = {0};
    all_is_well(tarry_results_new(&exact, &error), &error);
    tarry_results *results = make_figures(n, t, exact);
    all_is_well(tarry_self_check_compare(results, exact, tarry_results_n_cells(results), &error),
                &error);
    const tarry_self_check *check = tarry_results_self_check(results);
    const double p = 2 * gsl_cdf_tdist_Q(t, 63), expected = -expm1(n * log1p(-p));
    ck_assert_uint_eq(check->n_compared, (size_t)n);
    ck_assert_double_eq_tol(check->largest, t, 1e-9);
    ck_assert_msg(fabs(check->share_larger / expected - 1) < tolerance,
                  "%d figures, t = %g: %g, and Student's law has %g", n, t, check->share_larger,
                  expected);
    tarry_results_free(results);
    tarry_results_free(exact);
}

START_TEST(student) {
    /* 50 draws that are larger tell a share to 14 %: four standard errors and what signs of 64
     * values differ from the law of normal ones */
    check_share(1, 0.5, 0.6);
    check_share(1, 2.0, 0.6);
    check_share(1, 3.0, 0.6);
    check_share(40, 2.0, 0.6);
    check_share(40, 3.5, 0.6);
}
END_TEST

START_TEST(alarm) {
    tarry_results *exact;
    tarry_error error = {0};
    static const struct {
        double t;
        int alarm;
    } cases[] = {{3.4, 0}, {4.0, 0}, {4.8, 1}, {8, 1}}; /* P(|T| > t): 1e-3, 2e-4, 1e-5, 4e-11 */
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        all_is_well(tarry_results_new(&exact, &error), &error);
        tarry_results *results = make_figures(1, cases[i].t, exact);
        all_is_well(
            tarry_self_check_compare(results, exact, tarry_results_n_cells(results), &error),
            &error);
        ck_assert_msg(tarry_results_self_check(results)->alarm == cases[i].alarm, "t = %g: %g",
                      cases[i].t, tarry_results_self_check(results)->share_larger);
        tarry_results_free(results);
        tarry_results_free(exact);
    }
}
END_TEST

/* ---- runs ------------------------------------------------------------------------------------ */

static const char text[] =
    "tarry: 1\ntime: min\nparameters: {lag: 3, k_open: 0.2}\n"
    "genes:\n  vela:\n    start: steady\n    promoter:\n      shut: {to: {open: k_open}}\n"
    "      open: {to: {shut: 0.5}, initiates: 3}\n"
    "    transcript: {stages: {nascent: {fixed: lag}}, decay: 0.2}\n"
    "signals: {spot: {of: vela.nascent, ramp: {from: 0.2, to: 0.5}}}\n"
    "run: {cells: 200, settle: 60, until: 60, every: 2, snapshots: [0, 60], lags: 20}\n";

static tarry_model *read_model(const char *name, const char *value, int seed) {
    char number[16];
    snprintf(number, sizeof number, "%d", seed);
    const tarry_override overrides[] = {{"--seed", 0, "seed", number}, {"--set", 1, name, value}};
    tarry_model *model;
    tarry_error error = {0};
    all_is_well(tarry_model_read_text(text, strlen(text), "m.yaml", overrides, 2, &model, &error),
                &error);
    return model;
}

static tarry_results *run(const tarry_model *model) {
    const tarry_run_options options = {.self_check = true};
    tarry_results *results;
    tarry_error error = {0};
    all_is_well(tarry_run(model, &options, &results, &error), &error);
    return results;
}

/* Of correct runs one in twenty is told as one of the twentieth that is farthest off, and so on. */
START_TEST(correct_runs) {
    const int n = test_small() ? 20 : 100;
    int below_20th = 0, below_half = 0;
    for (int seed = 1; seed <= n; seed++) {
        tarry_model *model = read_model("lag", "3", seed);
        tarry_results *results = run(model);
        const tarry_self_check *check = tarry_results_self_check(results);
        ck_assert_uint_gt(check->n_compared, 150);
        ck_assert_int_eq(check->alarm, 0);
        below_20th += check->share_larger <= 0.05;
        below_half += check->share_larger <= 0.5;
        tarry_results_free(results);
        tarry_model_free(model);
    }
    /* four standard deviations of binomial counts */
    ck_assert_msg(below_20th <= 0.05 * n + 4 * sqrt(n * 0.05 * 0.95), "%d of %d", below_20th, n);
    ck_assert_msg(fabs(below_half - 0.5 * n) <= 4 * sqrt(n * 0.25), "%d of %d", below_half, n);
}
END_TEST

/* A run beside the laws of a model that differs a little. */
static double share_against(const char *name, const char *run_value, const char *exact_value) {
    tarry_model *model = read_model(name, run_value, 1), *other = read_model(name, exact_value, 1);
    tarry_results *results = run(model), *exact;
    tarry_error error = {0};
    all_is_well(tarry_predict(other, &exact, &error), &error);
    free(results->self_check.where);
    memset(&results->self_check, 0, sizeof results->self_check);
    all_is_well(tarry_self_check_compare(results, exact, tarry_results_n_cells(results), &error),
                &error);
    const double share = tarry_results_self_check(results)->share_larger;
    tarry_results_free(results);
    tarry_results_free(exact);
    tarry_model_free(model);
    tarry_model_free(other);
    return share;
}

START_TEST(wrong_runs) {
    ck_assert_double_gt(share_against("lag", "3", "3"), 1e-3);
    ck_assert_double_le(share_against("lag", "3.6", "3"), 1e-4);
    ck_assert_double_le(share_against("k_open", "0.25", "0.2"), 1e-4);
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"Student's law", student},
        {"alarm", alarm},
        {"correct runs", correct_runs},
        {"wrong runs", wrong_runs},
    };
    tarry_start();
    return run_tests("self-check", tests, sizeof tests / sizeof *tests);
}
