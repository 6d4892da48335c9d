/* SPDX-License-Identifier: GPL-3.0-or-later */

/* One number by two routes within the exact laws, each of which has its own mathematics:
 *
 * - moments of a law that comes from inverting its generating function, against the moment formulas
 *   (docs/exact.md), that know nothing of it;
 * - a state that lasts an Erlang time, against the chain of exponential phases that it is (Cox &
 *   Miller 1965, The Theory of Stochastic Processes, section 6.2: method of stages). */

#include "support.h"

#include "base/table.h"
#include "tarry/tarry.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

static tarry_results *predict(const char *text) {
    tarry_model *model = NULL;
    tarry_results *results = NULL;
    tarry_error error = {0};
    char what[1024];
    tarry_start();
    int code = tarry_model_read_text(text, strlen(text), "m.yaml", NULL, 0, &model, &error);
    if (code == 0)
        code = tarry_predict(model, &results, &error);
    ck_assert_msg(code == 0, "%s", tarry_error_text(&error, what, sizeof what));
    tarry_model_free(model);
    return results;
}

/* ---- moments --------------------------------------------------------------------------------- */

/* From none on, after a step, and with copies, losses and two lags, at three times. */
static const char busy[] =
    "tarry: 1\ntime: min\nparameters: {k: 0.1}\ngenes:\n"
    "  vela:\n    copies: 2\n    promoter:\n      shut: {to: {open: k}}\n"
    "      open: {to: {shut: 0.6, far: 0.1}, initiates: 5}\n      far: {to: {open: 0.3}, "
    "initiates: "
    "1}\n"
    "    transcript: {stages: {a: {gamma: {mean: 3, sd: 2}}, b: {lasts: {fixed: 2}, lost: 0.2}}, "
    "decay: 0.4}\n"
    "  lyra:\n    promoter: {on: {initiates: 4}}\n    transcript: {lifetime: {uniform: {from: 1, "
    "to: "
    "6}}}\n"
    "protocol: [{at: 4, set: {k: 0.9}}]\n"
    "run: {settle: 3, until: 12, every: 1, snapshots: [0, 4.5, 12]}\n";

typedef struct law {
    double sum, mean, variance;
} law;

/* Of single counts: bins are one wide below 1,024. */
static law law_of(const tarry_table *table, const char *name, double time) {
    law l = {0};
    double squares = 0;
    for (size_t row = 0; row < tarry_table_n_rows(table); row++) {
        const double count = tarry_table_number(table, row, 3),
                     p = tarry_table_number(table, row, 5);
        if (strcmp(tarry_table_text(table, row, 0), name) != 0 ||
            !(fabs(tarry_table_number(table, row, 2) - time) < 1e-9))
            continue;
        ck_assert_double_eq(tarry_table_number(table, row, 4), 1);
        l.sum += p;
        l.mean += p * count;
        squares += p * count * count;
    }
    l.variance = squares - l.mean * l.mean;
    return l;
}

START_TEST(test_moments) {
    static const char *const names[] = {"vela.a", "vela.b", "vela.transcript", "lyra.transcript"};
    static const double times[] = {0, 4.5, 12};
    tarry_results *results = predict(busy);
    const tarry_table *means = tarry_results_table(results, TARRY_TABLE_means);
    const tarry_table *laws = tarry_results_table(results, TARRY_TABLE_distribution);
    size_t n = 0;
    for (size_t row = 0; row < tarry_table_n_rows(means); row++)
        for (size_t i = 0; i < sizeof names / sizeof *names; i++)
            for (size_t t = 0; t < sizeof times / sizeof *times; t++) {
                if (strcmp(tarry_table_text(means, row, 0), names[i]) != 0 ||
                    !(fabs(tarry_table_number(means, row, 1) - times[t]) < 1e-9))
                    continue;
                const law l = law_of(laws, names[i], times[t]);
                const double mean = tarry_table_number(means, row, 2);
                const double sd = tarry_table_number(means, row, 3);
                ck_assert_double_eq_tol(l.sum, 1, 1e-9);
                ck_assert_msg(fabs(l.mean / mean - 1) < 1e-6,
                              "%s at %g: mean %.12g, of the law %.12g", names[i], times[t], mean,
                              l.mean);
                ck_assert_msg(fabs(l.variance / (sd * sd) - 1) < 1e-6,
                              "%s at %g: variance %.12g, of the law %.12g", names[i], times[t],
                              sd * sd, l.variance);
                n++;
            }
    ck_assert_uint_eq(n, 12);
    tarry_results_free(results);
}
END_TEST

/* ---- phases ---------------------------------------------------------------------------------- */

#define REST                                                                                       \
    "    transcript: {stages: {n: {lognormal: {mean: 2, sd: 1}}}, decay: 0.5}\n"                   \
    "signals: {spot: {of: vela.n, ramp: {from: 0.1, to: 0.6}}}\n"                                  \
    "run: {settle: 60, until: 20, every: 1, snapshots: [20], lags: 10}\n"

static const char lasting[] =
    "tarry: 1\ntime: min\ngenes:\n  vela:\n    promoter:\n"
    "      shut: {lasts: {erlang: {steps: 3, mean: 6}}, then: {open: 1}}\n"
    "      open: {to: {shut: 0.7}, initiates: 4}\n" REST;
static const char chain[] = "tarry: 1\ntime: min\ngenes:\n  vela:\n    promoter:\n"
                            "      shut: {to: {second: 0.5}}\n      second: {to: {third: 0.5}}\n"
                            "      third: {to: {open: 0.5}}\n"
                            "      open: {to: {shut: 0.7}, initiates: 4}\n" REST;

/* Rows of both that are alike in their first columns, by the number in `column`; but for the state
 * that is one in the first model and three in the other. */
static void same(const tarry_results *one, const tarry_results *other, tarry_result_table which,
                 int n_keys, const char *column, size_t least) {
    const tarry_table *a = tarry_results_table(one, which), *b = tarry_results_table(other, which);
    const int value = tarry_table_column(a, column);
    size_t n = 0;
    for (size_t i = 0; i < tarry_table_n_rows(a); i++)
        for (size_t k = 0; k < tarry_table_n_rows(b); k++) {
            bool alike = true;
            for (int j = 0; j < n_keys; j++) {
                const double x = tarry_table_number(a, i, j), y = tarry_table_number(b, k, j);
                alike = alike && !strcmp(tarry_table_text(a, i, j), tarry_table_text(b, k, j)) &&
                        (fabs(x - y) < 1e-9 || (isnan(x) && isnan(y)));
            }
            if (!alike || isnan(tarry_table_number(a, i, value)) ||
                !strcmp(tarry_table_text(a, i, 0), "vela.shut"))
                continue;
            const double x = tarry_table_number(a, i, value), y = tarry_table_number(b, k, value);
            ck_assert_msg(fabs(x - y) < 1e-6 * fabs(x) + 1e-12,
                          "%s.csv, %s row %zu: %.12g and %.12g", tarry_table_name(a), column, i, x,
                          y);
            n++;
        }
    ck_assert_msg(n >= least, "%s.csv: %zu rows", tarry_table_name(a), n);
}

START_TEST(test_phases) {
    tarry_results *one = predict(lasting), *other = predict(chain);
    same(one, other, TARRY_TABLE_means, 2, "mean", 80);
    same(one, other, TARRY_TABLE_means, 2, "sd", 80);
    same(one, other, TARRY_TABLE_distribution, 5, "probability", 40);
    same(one, other, TARRY_TABLE_autocorrelation, 4, "correlation", 20);
    same(one, other, TARRY_TABLE_autocorrelation, 4, "per_mean_squared", 20);
    same(one, other, TARRY_TABLE_bursts, 3, "value", 15);
    same(one, other, TARRY_TABLE_burst_sizes, 4, "probability", 20);
    tarry_results_free(one);
    tarry_results_free(other);
}
END_TEST

int main(void) {
    const test_entry tests[] = {{"moments", test_moments}, {"phases", test_phases}};
    return run_tests("exact routes", tests, sizeof tests / sizeof *tests);
}
