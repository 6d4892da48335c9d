/* SPDX-License-Identifier: GPL-3.0-or-later */

/* A promoter of three states of which two are active at different rates: sizes and dwells by the
 * matrix laws of a Markov chain (common practice: phase-type laws), worked out with GSL's linear
 * algebra.
 *
 * States: shut (0), low (1), high (2); active A = {low, high}. Entry law alpha; dwell survival
 * alpha exp(Q_AA t) 1; P(size = n) = alpha (M^n) (L - Q_AA)^-1 (-Q_AA 1) with M = (L - Q_AA)^-1 L.
 */

#include "sample.h"
#include "support.h"

#include <gsl/gsl_cdf.h>
#include <gsl/gsl_linalg.h>
#include <math.h>
#include <string.h>

static const char model_text[] =
    "tarry: 1\ntime: min\ngenes:\n  vela:\n    start: steady\n    promoter:\n"
    "      shut: {to: {low: 0.10, high: 0.05}}\n"
    "      low: {to: {high: 0.2, shut: 0.4}, initiates: 1}\n"
    "      high: {to: {low: 0.5, shut: 0.1}, initiates: 6}\n"
    "    transcript: {half_life: 5 min}\n"
    "run: {cells: 4000, until: 120, every: 1, lags: 5}\n";

static const double entry[2] = {2.0 / 3, 1.0 / 3};
static const double q[2][2] = {{-0.6, 0.2}, {0.5, -0.6}};
static const double out[2] = {0.4, 0.1};
static const double initiate[2] = {1, 6};

/* Inverse of (L - Q_AA) by GSL. */
static void invert(double inverse[2][2]) {
    double a[4] = {initiate[0] - q[0][0], -q[0][1], -q[1][0], initiate[1] - q[1][1]}, b[4];
    gsl_matrix_view m = gsl_matrix_view_array(a, 2, 2), r = gsl_matrix_view_array(b, 2, 2);
    gsl_permutation *order = gsl_permutation_alloc(2);
    int sign;
    ck_assert_int_eq(gsl_linalg_LU_decomp(&m.matrix, order, &sign), 0);
    ck_assert_int_eq(gsl_linalg_LU_invert(&m.matrix, order, &r.matrix), 0);
    gsl_permutation_free(order);
    memcpy(inverse, b, sizeof b);
}

static void size_law(double *law, size_t n) {
    double inverse[2][2], state[2] = {entry[0], entry[1]};
    invert(inverse);
    for (size_t k = 0; k < n; k++) {
        double visit[2];
        for (int j = 0; j < 2; j++)
            visit[j] = state[0] * inverse[0][j] + state[1] * inverse[1][j];
        law[k] = visit[0] * out[0] + visit[1] * out[1];
        for (int j = 0; j < 2; j++)
            state[j] = visit[j] * initiate[j];
    }
}

static double survival(double t) {
    double a[4] = {q[0][0] * t, q[0][1] * t, q[1][0] * t, q[1][1] * t}, b[4];
    gsl_matrix_view m = gsl_matrix_view_array(a, 2, 2), e = gsl_matrix_view_array(b, 2, 2);
    ck_assert_int_eq(gsl_linalg_exponential_ss(&m.matrix, &e.matrix, GSL_PREC_DOUBLE), 0);
    return entry[0] * (b[0] + b[1]) + entry[1] * (b[2] + b[3]);
}

static void check_sizes(const tarry_results *results) {
    enum { MOST = 600 };
    static double law[MOST], sizes[200000];
    size_law(law, MOST);
    const tarry_table *table = tarry_results_table(results, TARRY_TABLE_burst_sizes);
    const int size = tarry_table_column(table, "size"),
              bursts = tarry_table_column(table, "bursts");
    size_t n = 0;
    for (size_t row = 0; row < tarry_table_n_rows(table); row++)
        for (double i = 0; i < tarry_table_number(table, row, bursts) && n < 200000; i++)
            sizes[n++] = tarry_table_number(table, row, size);
    ck_assert_uint_gt(n, 30000);
    check_counts("sizes", sizes, n, law, MOST);
    double mean = 0;
    for (size_t k = 0; k < MOST; k++)
        mean += (double)k * law[k];
    check_figure("mean size", burst_figure(results, "vela", "all", "burst_size_mean"), mean);
    /* A geometric law of this mean is far from it: the test tells the two apart. */
    const double silent = burst_figure(results, "vela", "all", "silent_fraction").value;
    ck_assert_double_eq_tol(silent, law[0], 0.02);
    ck_assert_double_gt(fabs(1 / (1 + mean) - law[0]), 0.05);
}

static void check_dwells(const tarry_results *results) {
    const tarry_table *table = tarry_results_table(results, TARRY_TABLE_dwells);
    const int period = tarry_table_column(table, "period"),
              time = tarry_table_column(table, "time");
    const int s = tarry_table_column(table, "survival");
    const int low = tarry_table_column(table, "low"), high = tarry_table_column(table, "high");
    const double limit = gsl_cdf_tdist_Qinv(gsl_cdf_ugaussian_Q(SAMPLE_Z_LIMIT), 63);
    size_t seen = 0;
    for (size_t row = 0; row < tarry_table_n_rows(table); row++) {
        if (strcmp(tarry_table_text(table, row, period), "active") != 0)
            continue;
        const double exact = survival(tarry_table_number(table, row, time));
        if (!(exact > 0.01 && exact < 0.99))
            continue;
        const double se = (log(-log(tarry_table_number(table, row, low))) -
                           log(-log(tarry_table_number(table, row, high)))) /
                          (2 * gsl_cdf_tdist_Pinv(0.975, 63));
        const double t = (log(-log(tarry_table_number(table, row, s))) - log(-log(exact))) / se;
        ck_assert_msg(fabs(t) < limit, "dwell beyond %g: t = %g",
                      tarry_table_number(table, row, time), t);
        seen++;
    }
    ck_assert_uint_gt(seen, 10);
}

START_TEST(test_bursts) {
    tarry_model *model = NULL;
    tarry_results *results = run_results(model_text, &model);
    check_sizes(results);
    check_dwells(results);
    /* Means: active dwell alpha (-Q_AA)^-1 1, inactive 1/0.15, and the frequency from both. */
    const double determinant = q[0][0] * q[1][1] - q[0][1] * q[1][0];
    const double active = (entry[0] * (-q[1][1] + q[0][1]) + entry[1] * (q[1][0] - q[0][0])) /
                          determinant;
    check_figure("active", burst_figure(results, "vela", "all", "active_time_mean"), active);
    check_figure("inactive", burst_figure(results, "vela", "all", "inactive_time_mean"), 1 / 0.15);
    check_figure("frequency", burst_figure(results, "vela", "all", "burst_frequency"),
                 1 / (active + 1 / 0.15));
    tarry_results_free(results);
    tarry_model_free(model);
}
END_TEST

int main(void) {
    const test_entry tests[] = {{"bursts", test_bursts}};
    return run_tests("three_state", tests, sizeof tests / sizeof *tests);
}
