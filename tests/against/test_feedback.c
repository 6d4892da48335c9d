/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Delayed negative feedback: a protein that shuts its own gene off after a lag.
 *
 * Oscillation: Lewis 2003, Curr. Biol. 13:1398, whose abstract predicts a period close to the
 * observed 30 min for his zebrafish genes, set mainly by the transcriptional delay. a = 4.5 and k =
 * 33 per min as quoted from it; b = c = 0.23 per min, p0 = 40 and the delays are from memory. Total
 * delays are 8.8 and 14.8 min, where his rate equations begin to oscillate at 7.5 (worked out for
 * these tests); their periods, integrated at three step sizes, are 32.95 and 49.24 min.
 *
 * Noise without oscillation: linear feedback with a lag, whose second moments close (worked out for
 * these tests). */

#include "sample.h"
#include "support.h"

#include <gsl/gsl_statistics_double.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

/* The lag of the first peak of the correlation after its first trough. */
static double find_period(const tarry_results *results, const char *name) {
    const tarry_table *table = tarry_results_table(results, TARRY_TABLE_autocorrelation);
    const int first = tarry_table_column(table, "first"),
              second = tarry_table_column(table, "second");
    const int lag = tarry_table_column(table, "lag");
    const int correlation = tarry_table_column(table, "correlation");
    double trough = 2, peak = -2, period = NAN;
    for (size_t row = 0; row < tarry_table_n_rows(table); row++) {
        if (strcmp(tarry_table_text(table, row, first), name) != 0 ||
            strcmp(tarry_table_text(table, row, second), name) != 0)
            continue;
        const double c = tarry_table_number(table, row, correlation);
        if (peak == -2 && c <= trough) {
            trough = c;
        } else if (c > peak && trough < 0) {
            peak = c;
            period = tarry_table_number(table, row, lag);
        }
    }
    ck_assert_msg(trough < -0.2, "no oscillation: the lowest correlation is %g", trough);
    ck_assert_msg(peak > 0.2, "no oscillation: the peak is %g", peak);
    return period;
}

static double simulate_period(double transcript_lag, double protein_lag, double lags) {
    char text[1024];
    snprintf(text, sizeof text,
             "tarry: 1\ntime: min\nspecies: {m: 8, p: 160}\nreactions:\n"
             "  transcribe: {propensity: \"33 * repress(p, 40, 2)\", "
             "later: [{after: {fixed: %g}, makes: {m: 1}}]}\n"
             "  translate: {needs: {m: 1}, rate: 4.5, "
             "later: [{after: {fixed: %g}, makes: {p: 1}}]}\n"
             "  m_decay: {uses: {m: 1}, rate: 0.23}\n"
             "  p_decay: {uses: {p: 1}, rate: 0.23}\n"
             "signals: {seen: {sum: {p: 1}}}\n"
             "run: {cells: 64, settle: 200, until: 600, every: 0.5, lags: %g}\n",
             transcript_lag, protein_lag, lags);
    tarry_model *model = NULL;
    tarry_results *results = run_results(text, &model);
    const double period = find_period(results, "seen");
    tarry_results_free(results);
    tarry_model_free(model);
    return period;
}

START_TEST(test_period) {
    const double short_period = simulate_period(7.1, 1.7, 45);
    ck_assert_msg(short_period > 27 && short_period < 36, "period %g, published about 30",
                  short_period);
    const double long_period = simulate_period(12, 2.8, 70);
    ck_assert_msg(fabs(long_period / 49.237 - 1) < 0.05, "period %g, rate equations 49.24",
                  long_period);
}
END_TEST

/* Only the sum of the two lags sets the period (the rate equations can be shifted in time). */
START_TEST(test_only_the_sum_of_lags_counts) {
    const double period = simulate_period(2.8, 12, 70);
    ck_assert_msg(fabs(period / 49.237 - 1) < 0.05, "period %g, rate equations 49.24", period);
}
END_TEST

/* f(x) = 150 - 0.5 x, decay 1: Var = gamma x [1 + (s/w) sinh(w tau)]/[gamma + s cosh(w tau)] with s
 * = 0.5, w = sqrt(gamma^2 - s^2), and 66.67 without a lag. */
START_TEST(test_linear_feedback) {
    static const double lags[] = {0, 1, 3};
    static const double variances[] = {66.666667, 92.078353, 110.955165};
    for (size_t i = 0; i < 3; i++) {
        char text[1024];
        snprintf(
            text, sizeof text,
            "tarry: 1\ntime: min\nspecies: {x: 100}\nreactions:\n"
            "  make: {propensity: 150 - 0.5 * x, later: [{after: {fixed: %g}, makes: {x: 1}}]}\n"
            "  decay: {uses: {x: 1}, rate: 1}\n"
            "run: {settle: 30, until: 1, every: 1}\n",
            lags[i]);
        sample_cells *cells = sample_new(text, 5000);
        check_mean("feedback", sample_mean(cells, "x", 0), 100, sqrt(variances[i]), cells->n_cells);
        const double kurtosis = gsl_stats_kurtosis(sample_values(cells, "x", 0), 1, cells->n_cells);
        check_sd("feedback", sample_sd(cells, "x", 0), sqrt(variances[i]), fmax(kurtosis, 0),
                 cells->n_cells);
        sample_free(cells);
    }
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"period", test_period},
        {"only the sum of lags counts", test_only_the_sum_of_lags_counts},
        {"linear feedback", test_linear_feedback},
    };
    return run_tests("feedback", tests, sizeof tests / sizeof *tests);
}
