/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Right at the edges: where records, counts, rates and windows are as small or as large as they
 * come. Exact laws are those of Poisson processes and Markov chains (common practice). */

#include "sample.h"
#include "support.h"

#include <gsl/gsl_randist.h>
#include <math.h>
#include <string.h>

#define HEAD "tarry: 1\ntime: min\n"

static double number(const tarry_table *table, size_t row, const char *column) {
    return tarry_table_number(table, row, tarry_table_column(table, column));
}

/* Rows of a table whose first text column is `name`. */
static size_t count_rows(const tarry_table *table, const char *name) {
    size_t n = 0;
    for (size_t row = 0; row < tarry_table_n_rows(table); row++)
        n += strcmp(tarry_table_text(table, row, 0), name) == 0;
    return n;
}

/* From 10^9 molecules on, 10 more are made each minute: Poisson about 10^9, of which no digit may
 * get lost. */
START_TEST(test_counts_of_a_billion) {
    tarry_model *model = NULL;
    tarry_results *results = run_results(
        HEAD "species: {x: 1000000000}\nreactions: {make: {makes: {x: 1}, rate: 10}}\n"
             "run: {cells: 2000, until: 10, every: 5, snapshots: [10]}\n",
        &model);
    const tarry_table *means = tarry_results_table(results, TARRY_TABLE_means);
    ck_assert_uint_eq(count_rows(means, "x"), 3);
    for (size_t row = 1; row < 3; row++) {
        const double made = 10 * number(means, row, "time");
        check_mean("mean", number(means, row, "mean") - 1e9, made, sqrt(made), 2000);
        check_sd("sd", number(means, row, "sd"), sqrt(made), 1 / made, 2000);
    }
    ck_assert_double_eq(number(means, 0, "mean"), 1e9);
    ck_assert_double_eq(number(means, 0, "sd"), 0);
    tarry_results_free(results);
    tarry_model_free(model);
}
END_TEST

/* One molecule flips 10^6 times while another waits for its one chance, a billion times rarer each.
 */
START_TEST(test_rates_a_billion_apart) {
    sample_cells *cells = sample_new(HEAD "species: {a: 1, b: 0, c: 400}\nreactions:\n"
                                          "  there: {uses: {a: 1}, makes: {b: 1}, rate: 100000}\n"
                                          "  back: {uses: {b: 1}, makes: {a: 1}, rate: 300000}\n"
                                          "  rare: {uses: {c: 1}, rate: 0.0003}\n"
                                          "run: {until: 1, every: 1}\nlimits: {firings: 1e9}\n",
                                     400);
    const double n = (double)cells->n_cells;
    check_mean("b", sample_mean(cells, "b", 0), 0.25, sqrt(0.1875), cells->n_cells);
    const double left = 400 * exp(-0.0003);
    check_z("c", (sample_mean(cells, "c", 0) - left) / sqrt(400 * 0.0003 / n));
    sample_free(cells);
}
END_TEST

/* Twelve states in a ring, left at different rates: each holds a share in proportion to its mean
 * dwell. */
START_TEST(test_twelve_states) {
    sample_cells *cells = sample_new(
        HEAD "genes:\n  vela:\n    start: steady\n    promoter:\n"
             "      s1: {to: {s2: 1}}\n      s2: {to: {s3: 2}}\n      s3: {to: {s4: 3}}\n"
             "      s4: {to: {s5: 4}}\n      s5: {to: {s6: 5}}\n      s6: {to: {s7: 6}}\n"
             "      s7: {to: {s8: 1}}\n      s8: {to: {s9: 2}}\n      s9: {to: {s10: 3}}\n"
             "      s10: {to: {s11: 4}}\n      s11: {to: {s12: 5}}\n"
             "      s12: {to: {s1: 6}, initiates: 2}\n"
             "    transcript: {half_life: 3}\n"
             "run: {until: 7, every: 1, snapshots: [0, 7]}\n",
        20000);
    const double total = 2 * (1 + 0.5 + 1.0 / 3 + 0.25 + 0.2 + 1.0 / 6);
    static const char *const names[] = {"vela.s1", "vela.s6", "vela.s7", "vela.s12"};
    static const double dwell[] = {1, 1.0 / 6, 1, 1.0 / 6};
    for (size_t i = 0; i < 4; i++)
        for (size_t t = 0; t < 2; t++) {
            const double p = dwell[i] / total;
            check_mean(names[i], sample_mean(cells, names[i], t), p, sqrt(p * (1 - p)),
                       cells->n_cells);
        }
    sample_free(cells);
}
END_TEST

/* A step at time 0 holds from the first frame on; one at the end of the record still shows in the
 * last. */
START_TEST(test_steps_at_both_ends) {
    tarry_model *model = NULL;
    tarry_results *results = run_results(
        HEAD "parameters: {k: 0}\nspecies: {x: 0, y: 5}\n"
             "reactions: {make: {makes: {x: 1}, rate: k}}\n"
             "protocol: [{at: 0, set: {k: 3, y: 7}}, {at: 10, set: {y: 9}}]\n"
             "run: {cells: 1000, settle: 10, until: 10, every: 5, snapshots: [0, 10]}\n",
        &model);
    const tarry_table *means = tarry_results_table(results, TARRY_TABLE_means);
    static const double y[] = {7, 7, 9};
    ck_assert_uint_eq(count_rows(means, "y"), 3);
    for (size_t row = 0, i = 0; row < tarry_table_n_rows(means); row++)
        if (strcmp(tarry_table_text(means, row, 0), "y") == 0)
            ck_assert_double_eq(number(means, row, "mean"), y[i++]);
    ck_assert_double_eq(number(means, 0, "mean"), 0);
    check_mean("made", number(means, 2, "mean"), 30, sqrt(30), 1000);
    tarry_results_free(results);
    tarry_model_free(model);
}
END_TEST

/* Windows of one frame, 5 cells in 64 groups: figures and intervals are there, and right. */
START_TEST(test_one_frame_and_five_cells) {
    tarry_model *model = NULL;
    tarry_results *results = run_results(HEAD
                                         "genes:\n  vela:\n    promoter: {on: {initiates: 50}}\n"
                                         "    transcript: {decay: 1}\n"
                                         "run: {cells: 5, settle: 30, until: 10, every: 1, "
                                         "windows: {one: [3.5, 4.5], last: [9.5, 10]}}\n",
                                         &model);
    static const char *const windows[] = {"one", "last"};
    for (size_t i = 0; i < 2; i++) {
        const sample_figure mean = burst_figure(results, "vela", windows[i], "transcript_mean");
        ck_assert_double_eq(mean.samples, 5);
        ck_assert_msg(mean.low < mean.value && mean.value < mean.high, "no interval");
        /* 5 x Poisson(50): sd of the mean 3.2. */
        ck_assert_double_le(fabs(mean.value - 50), 5 * sqrt(50.0 / 5));
    }
    tarry_results_free(results);
    tarry_model_free(model);
}
END_TEST

/* A lag longer than settling and record together: everything is on its way, nothing arrives. */
START_TEST(test_lag_longer_than_the_record) {
    sample_cells *cells = sample_new(HEAD
                                     "genes:\n  vela:\n    promoter: {on: {initiates: 2}}\n"
                                     "    transcript: {stages: {nascent: {fixed: 400}}, decay: 1}\n"
                                     "run: {settle: 20, until: 10, every: 1}\n",
                                     5000);
    static double law[200];
    for (unsigned n = 0; n < 200; n++)
        law[n] = gsl_ran_poisson_pdf(n, 60);
    check_counts("under way", sample_values(cells, "vela.nascent", 0), cells->n_cells, law, 200);
    ck_assert_double_eq(sample_mean(cells, "vela.transcript", 0), 0);
    sample_free(cells);
}
END_TEST

/* No burst at all and one cell: a table without a wrong number in it. */
START_TEST(test_no_bursts) {
    tarry_model *model = NULL;
    tarry_results *results = run_results(
        HEAD "genes:\n  vela:\n    promoter:\n      shut: {to: {open: 1e-12}}\n"
             "      open: {to: {shut: 1}, initiates: 1}\n    transcript: {decay: 1}\n"
             "run: {cells: 1, until: 10, every: 10}\n",
        &model);
    ck_assert_double_eq(burst_figure(results, "vela", "all", "burst_frequency").value, 0);
    ck_assert_double_eq(burst_figure(results, "vela", "all", "initiation_rate").value, 0);
    ck_assert_double_eq(burst_figure(results, "vela", "all", "active_fraction").value, 0);
    ck_assert(isnan(burst_figure(results, "vela", "all", "burst_size_mean").value));
    ck_assert(isnan(burst_figure(results, "vela", "all", "interval_mean").value));
    ck_assert_uint_eq(tarry_table_n_rows(tarry_results_table(results, TARRY_TABLE_burst_sizes)), 0);
    tarry_results_free(results);
    tarry_model_free(model);
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"counts of a billion", test_counts_of_a_billion},
        {"rates a billion apart", test_rates_a_billion_apart},
        {"twelve states", test_twelve_states},
        {"steps at both ends", test_steps_at_both_ends},
        {"one frame and five cells", test_one_frame_and_five_cells},
        {"lag longer than the record", test_lag_longer_than_the_record},
        {"no bursts", test_no_bursts},
    };
    return run_tests("edges", tests, sizeof tests / sizeof *tests);
}
