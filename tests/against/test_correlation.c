/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Autocorrelations of what a microscope sees, against Campbell's theorem (common practice; for
 * these signals Larson et al. 2011, Science 332:475; Coulon & Larson 2016, Methods Enzymol.
 * 572:159): with Poisson initiation at rate r and a kernel k, C(tau) = r * integral of k(u) k(u +
 * tau). */

#include "sample.h"
#include "support.h"

#include <gsl/gsl_cdf.h>
#include <math.h>
#include <string.h>

/* One lag of a curve out of autocorrelation.csv. */
typedef struct curve_point {
    double covariance, correlation, low, high, per_mean_squared;
} curve_point;

static curve_point find_point(const tarry_results *results, const char *first, const char *second,
                              double lag) {
    const tarry_table *table = tarry_results_table(results, TARRY_TABLE_autocorrelation);
    const int firsts = tarry_table_column(table, "first");
    const int seconds = tarry_table_column(table, "second");
    const int lags = tarry_table_column(table, "lag");
    for (size_t row = 0; row < tarry_table_n_rows(table); row++) {
        if (strcmp(tarry_table_text(table, row, firsts), first) != 0 ||
            strcmp(tarry_table_text(table, row, seconds), second) != 0 ||
            fabs(tarry_table_number(table, row, lags) - lag) > 1e-9)
            continue;
        return (curve_point){
            tarry_table_number(table, row, tarry_table_column(table, "covariance")),
            tarry_table_number(table, row, tarry_table_column(table, "correlation")),
            tarry_table_number(table, row, tarry_table_column(table, "low")),
            tarry_table_number(table, row, tarry_table_column(table, "high")),
            tarry_table_number(table, row, tarry_table_column(table, "per_mean_squared")),
        };
    }
    ck_abort_msg("no lag %g of %s and %s", lag, first, second);
    return (curve_point){0};
}

/* Correlation by its own interval; 63 degrees of freedom. */
static void check_correlation(const char *what, curve_point point, double exact) {
    const double se = (point.high - point.low) / (2 * gsl_cdf_tdist_Pinv(0.975, 63));
    const double limit = gsl_cdf_tdist_Qinv(gsl_cdf_ugaussian_Q(SAMPLE_Z_LIMIT), 63);
    const double t = (point.correlation - exact) / se;
    ck_assert_msg(point.high > point.low, "%s: no interval", what);
    ck_assert_msg(point.high - point.low < 0.2, "%s: too wide to tell", what);
    ck_assert_msg(fabs(t) < limit, "%s: %g (%g to %g), exact %g, t = %g", what, point.correlation,
                  point.low, point.high, exact, t);
}

static const char poisson_gene[] =
    "tarry: 1\ntime: min\ngenes:\n  vela:\n    bursts_in: [on]\n"
    "    promoter: {on: {initiates: 0.5}}\n"
    "    transcript: {stages: {nascent: {fixed: 4 min}}, half_life: 1 min}\n";

static tarry_results *run_with(const char *start, const char *rest, tarry_model **model) {
    char text[2048];
    ck_assert_uint_lt(strlen(start) + strlen(rest), sizeof text);
    strcpy(text, start);
    strcat(text, rest);
    return run_results(text, model);
}

/* Seen for its whole dwell of 4 min a transcript gives a triangle: C = 0.5 (4 - tau), 0 from 4 on;
 * read-out noise stands in lag 0 only and is taken off. */
START_TEST(test_triangle) {
    tarry_model *model = NULL;
    tarry_results *results = run_with(
        poisson_gene,
        "signals: {spot: {sum: {vela.nascent: 1}, background: 3, noise: 0.8}}\n"
        "run: {cells: 2000, settle: 5, until: 60, every: 0.5, lags: 8}\n",
        &model);
    for (int i = 1; i <= 16; i++) {
        const double lag = i * 0.5, exact = lag < 4 ? 1 - lag / 4 : 0;
        check_correlation("triangle", find_point(results, "spot", "spot", lag), exact);
    }
    const curve_point start = find_point(results, "spot", "spot", 1);
    ck_assert_double_eq_tol(start.per_mean_squared, 0.375, 0.02);
    ck_assert_double_eq_tol(start.covariance, 1.5, 0.08);
    tarry_results_free(results);
    tarry_model_free(model);
}
END_TEST

/* A rise over the first quarter of the dwell, then a plateau: mean 1.75, C(0) = 5/3, and so on. */
START_TEST(test_ramp_and_plateau) {
    tarry_model *model = NULL;
    tarry_results *results = run_with(
        poisson_gene,
        "signals: {spot: {of: vela.nascent, ramp: {from: 0, to: 0.25}}}\n"
        "run: {cells: 2000, settle: 5, until: 60, every: 0.25, lags: 4}\n",
        &model);
    static const double lag[] = {0.25, 0.5, 1, 2, 3, 3.5, 4};
    static const double c[] = {1.58984375, 1.48958333, 1.25, 0.75, 0.25, 0.0625, 0};
    for (size_t i = 0; i < sizeof lag / sizeof *lag; i++)
        check_correlation("ramp", find_point(results, "spot", "spot", lag[i]), c[i] / 1.66666667);
    const sample_figure mean = signal_figure(results, "spot", "all", "signal_mean");
    check_figure("mean of the signal", mean, 1.75);
    tarry_results_free(results);
    tarry_model_free(model);
}
END_TEST

/* A is seen on the whole dwell, B from 1.5 min on: cov(A(t), B(t + tau)) is 0.5 times the overlap,
 * flat from 0 to 1.5. */
START_TEST(test_two_colours) {
    tarry_model *model = NULL;
    tarry_results *results = run_with(
        poisson_gene,
        "signals:\n  a: {sum: {vela.nascent: 1}}\n"
        "  b: {of: vela.nascent, ramp: {from: 0.375, to: 0.375}}\n"
        "run: {cells: 2000, settle: 5, until: 60, every: 0.5, lags: 4}\n",
        &model);
    static const double lag[] = {-1.5, -1, 0, 0.5, 1, 1.5, 2, 3, 4};
    static const double c[] = {0.5, 0.75, 1.25, 1.25, 1.25, 1.25, 1.0, 0.5, 0};
    /* Variances: 0.5 x 4 and 0.5 x 2.5. */
    for (size_t i = 0; i < sizeof lag / sizeof *lag; i++)
        check_correlation("two colours", find_point(results, "a", "b", lag[i]),
                          c[i] / sqrt(2.0 * 1.25));
    tarry_results_free(results);
    tarry_model_free(model);
}
END_TEST

/* open 0.1, shut 0.3, initiates 2 per min, dwell 4 min: C = r p (T - tau)+ + r^2 p (1 - p) H(tau),
 * worked out in closed form and confirmed by simulation written for it. */
START_TEST(test_two_state_gene) {
    tarry_model *model = NULL;
    tarry_results *results = run_results(
        "tarry: 1\ntime: min\ngenes:\n  vela:\n    start: steady\n    promoter:\n"
        "      shut: {to: {open: 0.1}}\n      open: {to: {shut: 0.3}, initiates: 2}\n"
        "    transcript: {stages: {nascent: {fixed: 4 min}}, decay: 1}\n"
        "signals: {spot: {sum: {vela.nascent: 1}, noise: 0.5}}\n"
        "run: {cells: 4000, settle: 60, until: 120, every: 1, lags: 12}\n",
        &model);
    static const double lag[] = {1, 2, 4, 6, 10};
    static const double rho[] = {0.89432428, 0.71644974, 0.31370687, 0.14095759, 0.02845885};
    for (size_t i = 0; i < sizeof lag / sizeof *lag; i++)
        check_correlation("two states", find_point(results, "spot", "spot", lag[i]), rho[i]);
    check_figure("mean of the signal", signal_figure(results, "spot", "all", "signal_mean"), 2);
    tarry_results_free(results);
    tarry_model_free(model);
}
END_TEST

/* Transcripts of a two-state gene with exponential lifetimes: C(0) = 22.28571429, 17.41823665 at
 * 0.5, 11.68242646 at 1, 4.58370622 at 2, 0.63090001 at 4 (lifetimes of transcripts as the unit).
 */
START_TEST(test_transcripts) {
    tarry_model *model = NULL;
    tarry_results *results = run_results(
        "tarry: 1\ntime: min\ngenes:\n  vela:\n    start: steady\n    promoter:\n"
        "      shut: {to: {open: 0.5}}\n      open: {to: {shut: 2}, initiates: 20}\n"
        "    transcript: {decay: 1}\n"
        "run: {cells: 3000, settle: 20, until: 60, every: 0.5, lags: 5}\n",
        &model);
    static const double lag[] = {0.5, 1, 2, 4};
    static const double c[] = {17.41823665, 11.68242646, 4.58370622, 0.63090001};
    for (size_t i = 0; i < sizeof lag / sizeof *lag; i++)
        check_correlation("transcripts",
                          find_point(results, "vela.transcript", "vela.transcript", lag[i]),
                          c[i] / 22.28571429);
    tarry_results_free(results);
    tarry_model_free(model);
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"triangle", test_triangle},       {"ramp and plateau", test_ramp_and_plateau},
        {"two colours", test_two_colours}, {"two-state gene", test_two_state_gene},
        {"transcripts", test_transcripts},
    };
    return run_tests("correlation", tests, sizeof tests / sizeof *tests);
}
