/* SPDX-License-Identifier: GPL-3.0-or-later */

/* lags.csv: how long drawn lags are, against laws of GSL and the numbers of transit.csv. */

#include "support.h"
#include "tarry/tarry.h"

#include <gsl/gsl_cdf.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

/* Three kinds of lags: by a gamma law throughout, by one that a step changes, and a state that
 * lasts, of two alleles. `short` is 3 min or nothing at once. */
static const char model_text[] =
    "tarry: 1\n"
    "time: min\n"
    "parameters: {slow: 4, few: 5}\n"
    "species: {a: 0, b: 0, c: 0}\n"
    "genes:\n"
    "  vela:\n"
    "    copies: 2\n"
    "    promoter:\n"
    "      shut: {lasts: {uniform: {from: 1, to: 3}}, then: {open: 1}}\n"
    "      open: {to: {shut: 1}, initiates: 1}\n"
    "    transcript: {half_life: 5}\n"
    "reactions:\n"
    "  one: {rate: few, later: [{after: {gamma: {mean: 3, sd: 1}}, makes: {a: 1}}]}\n"
    "  two: {rate: 5, later: [{after: {exponential: {mean: slow}}, makes: {b: 1}}]}\n"
    "  three: {rate: 5, later: [{after: {table: {values: [0, 3], weights: [1, 3]}}, makes: {c: "
    "1}}]}\n"
    "protocol:\n"
    "  - {at: 25, set: {slow: 1}}\n"
    "run: {cells: 200, settle: 5, until: 50, every: 1, seed: 1}\n";

static tarry_results *run(void) {
    const tarry_run_options options = {.threads = 1};
    tarry_model *model;
    tarry_results *results;
    tarry_error error = {0};
    tarry_start();
    ck_assert_msg(
        !tarry_model_read_text(model_text, strlen(model_text), "m.yaml", NULL, 0, &model, &error),
        "%s", error.message);
    ck_assert_msg(!tarry_run(model, &options, &results, &error), "%s", error.message);
    tarry_model_free(model);
    return results;
}

enum { NAME, DELAY, FROM, TO, DRAWN, SHARE, LOW, HIGH, LAW };

/* Rows of one lag, in order. */
static size_t rows_of(const tarry_table *table, const char *name, size_t *rows) {
    size_t n = 0;
    for (size_t r = 0; r < tarry_table_n_rows(table); r++)
        if (!strcmp(tarry_table_text(table, r, NAME), name))
            rows[n++] = r;
    ck_assert_uint_gt(n, 0);
    return n;
}

/* Lags drawn in all windows, by transit.csv. */
static double begun(const tarry_results *results, const char *name) {
    const tarry_table *table = tarry_results_table(results, TARRY_TABLE_transit);
    double sum = 0;
    for (size_t r = 0; r < tarry_table_n_rows(table); r++)
        if (!strcmp(tarry_table_text(table, r, 0), name))
            sum += tarry_table_number(table, r, tarry_table_column(table, "drawn"));
    return sum;
}

/* Each lag is in one bin, bins are an eighth of a doubling and follow one another, shares are those
 * of what was drawn, with intervals about them. */
START_TEST(bins) {
    tarry_results *results = run();
    static const char *const names[] = {"one.later", "two.later", "three.later", "vela.shut"};
    const tarry_table *table = tarry_results_table(results, TARRY_TABLE_lags);
    size_t *rows = calloc(tarry_table_n_rows(table), sizeof *rows);
    for (size_t i = 0; i < sizeof names / sizeof *names; i++) {
        const size_t n = rows_of(table, names[i], rows);
        const double all = begun(results, names[i]);
        double drawn = 0, end = 0;
        for (size_t j = 0; j < n; j++) {
            const double from = tarry_table_number(table, rows[j], FROM);
            const double to = tarry_table_number(table, rows[j], TO);
            const double share = tarry_table_number(table, rows[j], SHARE);
            ck_assert_double_ge(from, end);
            ck_assert(from == 0 || to - from == exp2(floor(log2(from))) / 8);
            ck_assert_double_eq(share, tarry_table_number(table, rows[j], DRAWN) / all);
            ck_assert_double_le(tarry_table_number(table, rows[j], LOW), share);
            ck_assert_double_ge(tarry_table_number(table, rows[j], HIGH), share);
            drawn += tarry_table_number(table, rows[j], DRAWN);
            end = to;
        }
        ck_assert_double_eq(drawn, all);
    }
    free(rows);
    tarry_results_free(results);
}
END_TEST

/* The law's shares are differences of GSL's distribution functions. What was drawn follows them: a
 * chi-square of a bin each (those that expect 5 or more, as is common practice) beyond which chance
 * goes once in a million; a gamma law 2 % off would add 9 * 0.02^2 * 50000 = 180 to it. */
START_TEST(laws) {
    tarry_results *results = run();
    const tarry_table *table = tarry_results_table(results, TARRY_TABLE_lags);
    size_t *rows = calloc(tarry_table_n_rows(table), sizeof *rows);
    for (int which = 0; which < 2; which++) {
        const size_t n = rows_of(table, which ? "vela.shut" : "one.later", rows);
        const double all = begun(results, which ? "vela.shut" : "one.later");
        double square = 0, n_bins = 0;
        for (size_t j = 0; j < n; j++) {
            const double from = tarry_table_number(table, rows[j], FROM);
            const double to = tarry_table_number(table, rows[j], TO);
            const double law = tarry_table_number(table, rows[j], LAW);
            const double known = which ? gsl_cdf_flat_P(to, 1, 3) - gsl_cdf_flat_P(from, 1, 3)
                                       : gsl_cdf_gamma_P(to, 9, 1.0 / 3) -
                                             gsl_cdf_gamma_P(from, 9, 1.0 / 3);
            ck_assert_double_eq_tol(law, known, 1e-12);
            if (law * all < 5)
                continue;
            square += pow(tarry_table_number(table, rows[j], DRAWN) - law * all, 2) / (law * all);
            n_bins++;
        }
        ck_assert_double_gt(n_bins, 10);
        ck_assert_double_lt(square, gsl_cdf_chisq_Qinv(1e-6, n_bins));
    }
    free(rows);
    tarry_results_free(results);
}
END_TEST

/* Single values are in the bin that begins with them. A law that the step changes is not told. */
START_TEST(single_values_and_steps) {
    tarry_results *results = run();
    const tarry_table *table = tarry_results_table(results, TARRY_TABLE_lags);
    size_t *rows = calloc(tarry_table_n_rows(table), sizeof *rows);
    ck_assert_uint_eq(rows_of(table, "three.later", rows), 2);
    ck_assert_double_eq(tarry_table_number(table, rows[0], FROM), 0);
    ck_assert_double_eq(tarry_table_number(table, rows[0], LAW), 0.25);
    ck_assert_double_eq(tarry_table_number(table, rows[1], FROM), 3);
    ck_assert_double_eq(tarry_table_number(table, rows[1], LAW), 0.75);
    const size_t n = rows_of(table, "two.later", rows);
    for (size_t j = 0; j < n; j++)
        ck_assert(isnan(tarry_table_number(table, rows[j], LAW)));
    free(rows);
    tarry_results_free(results);
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"bins", bins},
        {"laws", laws},
        {"single values and steps", single_values_and_steps},
    };
    return run_tests("tally lags", tests, sizeof tests / sizeof *tests);
}
