/* SPDX-License-Identifier: GPL-3.0-or-later */

/* The two-state gene: transcripts by the Kummer-function law (Peccoud & Ycart 1995, Theor. Popul.
 * Biol. 48:222), its burst limit, and what its bursts look like (common practice: competing
 * exponential times make sizes geometric from 0). */

#include "kummer.h"
#include "sample.h"
#include "support.h"

#include <gsl/gsl_randist.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

enum { CELLS = 40000, MOST = 800 };

static void write_model(char text[1024], two_state_rates r, const char *start, const char *run) {
    snprintf(text, 1024,
             "tarry: 1\n"
             "time: min\n"
             "genes:\n"
             "  vela:\n"
             "    start: %s\n"
             "    promoter:\n"
             "      shut: {to: {open: %g}}\n"
             "      open: {to: {shut: %g}, initiates: %g}\n"
             "    transcript: {decay: 1}\n"
             "run: %s\n",
             start, r.open, r.shut, r.initiate, run);
}

/* Values for these rates to ten digits, found by solving the master equation directly. */
START_TEST(test_kummer_law) {
    static const struct {
        two_state_rates rates;
        double mean, fano;
        unsigned n[4];
        double p[4];
    } cases[] = {
        {{0.5, 2, 20},
         4,
         5.571428571,
         {0, 1, 5, 20},
         {0.2898183086, 0.1374779157, 0.05303482428, 0.00287942447}},
        {{0.3, 0.3, 40},
         20,
         13.5,
         {0, 1, 5, 40},
         {0.1654908551, 0.05056329875, 0.01933990754, 0.02106588363}},
        {{2, 1, 10},
         6.666666667,
         1.833333333,
         {0, 1, 5, 20},
         {0.01999001202, 0.03988922417, 0.1043830295, 2.938532152e-4}},
    };
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        char text[1024];
        static double law[MOST];
        for (unsigned n = 0; n < 200; n++)
            law[n] = kummer_law(cases[i].rates, n);
        for (size_t j = 0; j < 4; j++)
            ck_assert_double_eq_tol(law[cases[i].n[j]], cases[i].p[j], 1e-9 * cases[i].p[j]);
        write_model(text, cases[i].rates, "steady",
                    "{settle: 30, until: 10, every: 10, snapshots: [0, 10], record: []}");
        sample_cells *cells = sample_new(text, CELLS);
        for (size_t t = 0; t < 2; t++) {
            check_counts("transcripts", sample_values(cells, "vela.transcript", t), cells->n_cells,
                         law, 200);
            check_mean("transcripts", sample_mean(cells, "vela.transcript", t), cases[i].mean,
                       sqrt(cases[i].mean * cases[i].fano), cells->n_cells);
        }
        sample_free(cells);
    }
}
END_TEST

/* Short active periods: the negative binomial with r = open and b = initiate/shut lies 0.2 % (total
 * variation) from the exact law at these rates, too little for this sample to tell. */
START_TEST(test_burst_limit) {
    const two_state_rates r = {0.5, 50, 500};
    char text[1024];
    write_model(text, r, "steady",
                "{settle: 30, until: 10, every: 10, snapshots: [10], record: []}");
    static double law[MOST], limit[MOST];
    double distance = 0;
    for (unsigned n = 0; n < MOST; n++) {
        law[n] = n < 400 ? kummer_law(r, n) : 0;
        limit[n] = gsl_ran_negative_binomial_pdf(n, 1 / (1 + r.initiate / r.shut), r.open);
        distance += fabs(law[n] - limit[n]) / 2;
    }
    ck_assert_double_eq_tol(distance, 0.002060, 1e-6);
    sample_cells *cells = sample_new(text, CELLS / 2);
    const double *values = sample_values(cells, "vela.transcript", 0);
    check_counts("exact law", values, cells->n_cells, law, 400);
    check_counts("burst limit", values, cells->n_cells / 10, limit, 400);
    sample_free(cells);
}
END_TEST

/* From shut and empty: mean nu p (1 - e^-t - (e^-t - e^-kt)/(k - 1)); variances by moment
 * equations. */
START_TEST(test_induction) {
    const two_state_rates r = {0.5, 2, 20};
    static const double t[] = {0.5, 1, 2, 5},
                        variance[] = {3.61729876, 10.93795987, 19.41553742, 22.23344836};
    char text[1024];
    write_model(text, r, "shut", "{until: 5, every: 5, snapshots: [0.5, 1, 2, 5], record: []}");
    sample_cells *cells = sample_new(text, CELLS);
    const double k = r.open + r.shut, p = r.open / k;
    for (size_t i = 0; i < 4; i++) {
        const double mean = r.initiate * p *
                            (1 - exp(-t[i]) - (exp(-t[i]) - exp(-k * t[i])) / (k - 1));
        check_mean("induction", sample_mean(cells, "vela.transcript", i), mean, sqrt(variance[i]),
                   cells->n_cells);
        check_mean("promoter", sample_mean(cells, "vela.open", i), p * (1 - exp(-k * t[i])),
                   sqrt(p * (1 - p)), cells->n_cells);
    }
    sample_free(cells);
}
END_TEST

/* Alleles switch on their own: means and variances add up. */
START_TEST(test_copies) {
    sample_cells *cells = sample_new("tarry: 1\ntime: min\ngenes:\n  vela:\n    copies: 2\n"
                                     "    start: steady\n    promoter:\n"
                                     "      shut: {to: {open: 0.5}}\n"
                                     "      open: {to: {shut: 2}, initiates: 20}\n"
                                     "    transcript: {decay: 1}\n"
                                     "run: {settle: 30, until: 1, every: 1}\n",
                                     CELLS);
    static double one[200], both[400];
    for (unsigned n = 0; n < 200; n++)
        one[n] = kummer_law((two_state_rates){0.5, 2, 20}, n);
    for (size_t i = 0; i < 200; i++)
        for (size_t j = 0; j < 200; j++)
            both[i + j] += one[i] * one[j];
    check_counts("two alleles", sample_values(cells, "vela.transcript", 0), cells->n_cells, both,
                 400);
    sample_free(cells);
}
END_TEST

/* Sizes of bursts out of burst_sizes.csv, written out one by one. */
static size_t list_sizes(const tarry_results *results, double *sizes, size_t most) {
    const tarry_table *table = tarry_results_table(results, TARRY_TABLE_burst_sizes);
    const int size = tarry_table_column(table, "size"), width = tarry_table_column(table, "width");
    const int bursts = tarry_table_column(table, "bursts");
    size_t n = 0;
    for (size_t row = 0; row < tarry_table_n_rows(table); row++) {
        ck_assert_double_eq(tarry_table_number(table, row, width), 1);
        for (double i = 0; i < tarry_table_number(table, row, bursts) && n < most; i++)
            sizes[n++] = tarry_table_number(table, row, size);
    }
    return n;
}

/* open 0.1, shut 0.3, initiate 2 per min: mean size 20/3, 13 % silent, 0.075 bursts per min,
 * product rate 0.5, interval 40/3 min. */
START_TEST(test_bursts) {
    char text[1024];
    write_model(text, (two_state_rates){0.1, 0.3, 2}, "steady",
                "{cells: 4000, until: 100, every: 1, lags: 10}");
    tarry_model *model = NULL;
    tarry_results *results = run_results(text, &model);
    static const struct {
        const char *quantity;
        double exact;
    } figures[] = {
        {"burst_frequency", 0.075},      {"burst_size_mean", 20.0 / 3},
        {"burst_size_sd", 7.149204},     {"silent_fraction", 3.0 / 23},
        {"loud_frequency", 0.065217391}, {"loud_size_mean", 23.0 / 3},
        {"active_time_mean", 10.0 / 3},  {"inactive_time_mean", 10},
        {"interval_mean", 40.0 / 3},     {"interval_sd", 10.540926},
        {"active_fraction", 0.25},       {"initiation_rate", 0.5},
    };
    for (size_t i = 0; i < sizeof figures / sizeof *figures; i++)
        check_figure(figures[i].quantity, burst_figure(results, "vela", "all", figures[i].quantity),
                     figures[i].exact);
    static double sizes[60000], law[200];
    const size_t n = list_sizes(results, sizes, 60000);
    ck_assert_uint_gt(n, 20000);
    for (unsigned k = 0; k < 200; k++)
        law[k] = gsl_ran_geometric_pdf(k + 1, 0.3 / 2.3);
    check_counts("burst sizes", sizes, n, law, 200);
    tarry_results_free(results);
    tarry_model_free(model);
}
END_TEST

/* Dwells are exponential: the Kaplan-Meier curve over exp(-rate t), by its own band. */
START_TEST(test_dwells) {
    char text[1024];
    write_model(text, (two_state_rates){0.1, 0.3, 2}, "steady",
                "{cells: 4000, until: 100, every: 1, lags: 10}");
    tarry_model *model = NULL;
    tarry_results *results = run_results(text, &model);
    const tarry_table *table = tarry_results_table(results, TARRY_TABLE_dwells);
    const int period = tarry_table_column(table, "period"),
              time = tarry_table_column(table, "time");
    const int survival = tarry_table_column(table, "survival");
    const int low = tarry_table_column(table, "low"), high = tarry_table_column(table, "high");
    size_t seen[2] = {0};
    for (size_t row = 0; row < tarry_table_n_rows(table); row++) {
        const int active = strcmp(tarry_table_text(table, row, period), "active") == 0;
        const double s = tarry_table_number(table, row, survival);
        const double exact = exp(-(active ? 0.3 : 0.1) * tarry_table_number(table, row, time));
        if (!(exact > 0.01 && exact < 0.99))
            continue;
        /* Half the width of the 95 % band on the scale log(-log S), over 1.998. */
        const double se = (log(-log(tarry_table_number(table, row, low))) -
                           log(-log(tarry_table_number(table, row, high)))) /
                          (2 * 1.998);
        check_z("dwell curve", (log(-log(s)) - log(-log(exact))) / se);
        seen[active]++;
    }
    ck_assert_uint_gt(seen[0], 10);
    ck_assert_uint_gt(seen[1], 10);
    tarry_results_free(results);
    tarry_model_free(model);
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"Kummer-function law", test_kummer_law},
        {"burst limit", test_burst_limit},
        {"induction", test_induction},
        {"copies", test_copies},
        {"bursts", test_bursts},
        {"dwells", test_dwells},
    };
    return run_tests("two_state", tests, sizeof tests / sizeof *tests);
}
