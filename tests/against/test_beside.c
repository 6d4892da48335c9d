/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Exact laws beside data. The laws themselves are held against others elsewhere (test_predict.c,
 * test_exact_*.c); here, that they stand beside the right figures.
 *
 * A gene that is always on, transcripts that decay one by one (immigration and death, common
 * practice): Poisson with mean k/d from a steady start, autocovariance k/d exp(-d lag), so that
 * each value is known by hand. */

#include "measured.h"
#include "support.h"

#include "base/table.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

static const double rate = 6, decay = 0.5, noise = 0.7;

static const char model[] = "tarry: 1\ntime: min\nparameters: {k: 6}\ngenes:\n"
                            "  vela: {promoter: {on: {initiates: k}}, transcript: {decay: 0.5}}\n"
                            "signals: {light: {of: vela.transcript, noise: 0.7, background: 2}}\n"
                            "run: {settle: 60, until: 7}\n";

static const char *model_path(void) {
    static char path[1024];
    snprintf(path, sizeof path, "%s", test_path("beside.yaml"));
    FILE *file = fopen(path, "w");
    ck_assert_ptr_nonnull(file);
    ck_assert_int_ge(fputs(model, file), 0);
    ck_assert_int_eq(fclose(file), 0);
    return path;
}

/* Any values will do: only where the laws stand is asked. */
static void write_film(tarry_text *text, size_t n_cells, double start, double every, int n_frames) {
    tarry_text_add_string(text, "cell,time,light\n");
    for (size_t cell = 0; cell < n_cells; cell++)
        for (int frame = 0; frame < n_frames; frame++) {
            const double value = 14 + 5 * sin(17.0 * (double)cell + 3.0 * frame);
            measured_row(text, cell, start + frame * every, &value, 1);
        }
}

static double find(const tarry_table *table, const char *name, int text, double key, int number,
                   const char *column) {
    for (size_t row = 0; row < tarry_table_n_rows(table); row++)
        if (!strcmp(tarry_table_text(table, row, text), name) &&
            fabs(tarry_table_number(table, row, number) - key) < 1e-9)
            return tarry_table_number(table, row, tarry_table_column(table, column));
    return NAN;
}

START_TEST(test_film) {
    const char *const options[] = {"--time", "min", "--beside", model_path(), "--lags", "3", NULL};
    tarry_text text = {0};
    measured m;
    write_film(&text, 30, 2, 0.5, 21);
    measured_pass(&m, text.data, options);
    const tarry_results *exact = tarry_results_exact(m.results);
    ck_assert_ptr_nonnull(exact);
    const tarry_table *means = tarry_results_table(exact, TARRY_TABLE_means);
    const tarry_table *curves = tarry_results_table(exact, TARRY_TABLE_autocorrelation);
    const double mean = rate / decay;
    ck_assert_double_eq_tol(find(means, "light", 0, 2, 1, "mean"), mean + 2, 1e-9);
    ck_assert_double_eq_tol(find(means, "light", 0, 12, 1, "mean"), mean + 2, 1e-9);
    ck_assert_double_eq_tol(find(means, "light", 0, 7.5, 1, "sd"), sqrt(mean + noise * noise),
                            1e-9);
    const double e = exp(-decay * 0.5);
    const double level = mean * (4 * e + e * e - 2 * e * e * e) / 3; /* the line put back */
    for (int lag = 1; lag <= 6; lag++)
        ck_assert_double_eq_tol(find(curves, "light", 1, 0.5 * lag, 3, "correlation"),
                                mean * exp(-decay * 0.5 * lag) / level, 1e-8);
    ck_assert_double_eq_tol(find(curves, "light", 1, 0, 3, "covariance"), mean + noise * noise,
                            1e-8);
    ck_assert(isnan(find(curves, "light", 1, 3.5, 3, "correlation")));
    measured_release(&m);
    tarry_text_release(&text);
}
END_TEST

/* Means with errors of their own, at times that are no frames. */
START_TEST(test_means) {
    const char *const options[] = {"--time", "min", "--beside", model_path(), NULL};
    measured m;
    measured_pass(&m, "time,light,light_se\n0,13,1\n0.7,14,1\n1.9,15,1\n", options);
    const tarry_table *means = tarry_results_table(tarry_results_exact(m.results),
                                                   TARRY_TABLE_means);
    ck_assert_double_eq_tol(find(means, "light", 0, 0.7, 1, "mean"), rate / decay + 2, 1e-9);
    ck_assert_uint_eq(tarry_results_self_check(m.results)->n_compared, 0);
    measured_release(&m);
}
END_TEST

/* How far the data are off is told in standard errors of the data: of counts whose mean and its
 * error are those of a sample (mean 12.5, sd 2.5 over 64 cells, where the law has 12). */
START_TEST(test_counts) {
    const char *const options[] = {"--time", "min", "--beside", model_path(), NULL};
    tarry_text text = {0};
    measured m;
    tarry_text_add_string(&text, "time,vela.transcript\n");
    for (int cell = 0; cell < 64; cell++)
        tarry_text_printf(&text, "5,%d\n", cell % 2 ? 15 : 10);
    measured_pass(&m, text.data, options);
    const tarry_self_check *check = tarry_results_self_check(m.results);
    const double t = (log(12.5) - log(12)) / (2.5 / sqrt(63) / 12.5);
    ck_assert_uint_ge(check->n_compared, 1);
    ck_assert_double_ge(check->largest, 0.95 * t);
    ck_assert_msg(strstr(check->where, "exact value") != NULL, "%s", check->where);
    measured_release(&m);
    tarry_text_release(&text);
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"film", test_film}, {"means", test_means}, {"counts", test_counts}};
    return run_tests("beside", tests, sizeof tests / sizeof *tests);
}
