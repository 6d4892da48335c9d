/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Transcripts that do not overtake each other on their allele, and keep a headway.
 *
 * With a fixed dwell D and Poisson initiation at rate k, completion i = max(start + D, completion
 * i-1 + h) is Lindley's recursion for the start of service in a queue M/D/1 with service time h,
 * shifted by D: the mean dwell is D + k h^2/(2 (1 - k h)) (Pollaczek and Khinchine's formula;
 * common practice), and the mean number under way k times that (Little 1961, Oper. Res. 9:383). For
 * drawn dwells the recursion is run here on GSL's draws. */

#include "sample.h"
#include "support.h"

#include <gsl/gsl_randist.h>
#include <gsl/gsl_rng.h>
#include <math.h>
#include <stdio.h>
#include <string.h>

enum { CELLS = 20000 };

static void write_model(char text[1024], const char *dwell, const char *headway, const char *run) {
    snprintf(text, 1024,
             "tarry: 1\ntime: min\ngenes:\n  vela:\n    promoter: {on: {initiates: 0.5}}\n"
             "    transcript:\n      stages: {nascent: %s, nuclear: {fixed: 1000}}\n"
             "      no_overtaking: true\n      headway: %s\n      half_life: 1 h\nrun: %s\n",
             dwell, headway, run);
}

START_TEST(test_fixed_dwell) {
    char text[1024];
    write_model(text, "{fixed: 4}", "1 min", "{settle: 60, until: 1, every: 1}");
    sample_cells *cells = sample_new(text, CELLS);
    const double k = 0.5, h = 1;
    check_mean("under way", sample_mean(cells, "vela.nascent", 0),
               k * (4 + k * h * h / (2 * (1 - k * h))), sample_sd(cells, "vela.nascent", 0),
               cells->n_cells);
    sample_free(cells);
}
END_TEST

/* The mean time from start to end by the recursion, and its standard error from 100 batches. */
static double run_recursion(double mean, double sd, double headway, double *se) {
    enum { BATCHES = 100, IN_BATCH = 20000 };
    gsl_rng *rng = gsl_rng_alloc(gsl_rng_mt19937);
    ck_assert_ptr_nonnull(rng);
    gsl_rng_set(rng, 1);
    const double shape = mean * mean / (sd * sd), scale = sd * sd / mean;
    double start = 0, last = -INFINITY, sum = 0, squares = 0;
    for (int batch = 0; batch < BATCHES; batch++) {
        double total = 0;
        for (int i = 0; i < IN_BATCH; i++) {
            start += gsl_ran_exponential(rng, 2);
            last = fmax(start + gsl_ran_gamma(rng, shape, scale), last + headway);
            total += last - start;
        }
        sum += total / IN_BATCH;
        squares += total / IN_BATCH * (total / IN_BATCH);
    }
    gsl_rng_free(rng);
    const double average = sum / BATCHES;
    *se = sqrt((squares / BATCHES - average * average) / (BATCHES - 1));
    return average;
}

static void check_drawn(const char *headway_text, double headway) {
    char text[1024];
    double se;
    const double dwell = run_recursion(8, 4, headway, &se);
    write_model(text, "{gamma: {mean: 8, sd: 4}}", headway_text,
                "{settle: 100, until: 1, every: 1}");
    sample_cells *cells = sample_new(text, CELLS);
    const double own = sample_sd(cells, "vela.nascent", 0) / sqrt((double)cells->n_cells);
    check_z("drawn dwells",
            (sample_mean(cells, "vela.nascent", 0) - 0.5 * dwell) / hypot(own, 0.5 * se));
    /* Without the rule 4 would be under way: the test tells the two apart. */
    ck_assert_double_gt(0.5 * dwell, 4 + 10 * own);
    sample_free(cells);
}

START_TEST(test_drawn_dwells) {
    check_drawn("0", 0);
    check_drawn("0.8", 0.8);
}
END_TEST

/* Arrivals in the next stage, counted at frames: never two within a headway. */
START_TEST(test_headway_is_kept) {
    char text[1024];
    write_model(text, "{gamma: {mean: 8, sd: 4}}", "1 min",
                "{cells: 20, settle: 30, until: 60, every: 0.1}");
    tarry_start();
    tarry_model *model = NULL;
    tarry_results *results = NULL;
    tarry_error error;
    ck_assert_int_eq(
        tarry_model_read_text(text, strlen(text), "order.yaml", NULL, 0, &model, &error), 0);
    const tarry_run_options options = {.keep = 20};
    ck_assert_int_eq(tarry_run(model, &options, &results, &error), 0);
    const tarry_table *table = tarry_results_cells(results);
    const int cell = tarry_table_column(table, "cell");
    const int nuclear = tarry_table_column(table, "vela.nuclear");
    double most = 0;
    for (size_t row = 9; row < tarry_table_n_rows(table); row++) {
        if (tarry_table_number(table, row, cell) != tarry_table_number(table, row - 9, cell))
            continue;
        const double arrived = tarry_table_number(table, row, nuclear) -
                               tarry_table_number(table, row - 9, nuclear);
        ASSERT_FAST(arrived <= 1, "%g arrived within 0.9 min", arrived);
        most = fmax(most, arrived);
    }
    ck_assert_double_eq(most, 1);
    tarry_results_free(results);
    tarry_model_free(model);
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"fixed dwell", test_fixed_dwell},
        {"drawn dwells", test_drawn_dwells},
        {"headway is kept", test_headway_is_kept},
    };
    return run_tests("headway", tests, sizeof tests / sizeof *tests);
}
