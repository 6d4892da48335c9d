/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Molecules that do not overtake each other, against the laws of two queues. */

#include "master.h"
#include "sample.h"
#include "support.h"

#include <gsl/gsl_integration.h>
#include <gsl/gsl_randist.h>
#include <math.h>
#include <stdio.h>

enum { CELLS = 40000, MOST = 80 };

/* ---- drawn dwells without headway ---- */

static const double rate = 2, mean_dwell = 1.5;

/* The stage holds the oldest molecule whose own dwell is not over, and all that began after it,
 * finished or not. Molecules begin as a Poisson process, so with survival S the oldest has age a
 * with density k S(a) exp(-k integral of S from a on), and those after it are Poisson(k a), as
 * follows from independent thinning (Kingman 1993, Poisson Processes). */
static double oldest_and_others(double a, void *n) {
    const double survival = exp(-a / mean_dwell);
    return rate * survival * exp(-rate * mean_dwell * survival) *
           gsl_ran_poisson_pdf(*(unsigned *)n - 1, rate * a);
}

static void stage_law(double *law) {
    gsl_integration_workspace *workspace = gsl_integration_workspace_alloc(500);
    ck_assert_ptr_nonnull(workspace);
    law[0] = exp(-rate * mean_dwell);
    for (unsigned n = 1; n < MOST; n++) {
        double error;
        gsl_function f = {oldest_and_others, &n};
        ck_assert_int_eq(
            gsl_integration_qags(&f, 0, 60, 1e-12, 1e-9, 500, workspace, &law[n], &error), 0);
    }
    gsl_integration_workspace_free(workspace);
}

START_TEST(test_order) {
    static const char text[] =
        "tarry: 1\ntime: min\ngenes:\n  vela:\n    promoter: {on: {initiates: 2}}\n"
        "    transcript:\n      stages: {nascent: {exponential: {mean: 1.5}}}\n"
        "      no_overtaking: true\n      decay: 0.5\n"
        "run: {settle: 40, until: 1, every: 1}\n";
    double law[MOST], counts[MOST];
    stage_law(law);
    for (unsigned n = 0; n < MOST; n++)
        counts[n] = n;
    const master_moments exact = master_moments_of(MOST, law, counts);
    ck_assert_double_gt(exact.mean, 1.2 * rate * mean_dwell); /* the test tells the two apart */
    sample_cells *cells = sample_new(text, CELLS);
    check_counts("in order", sample_values(cells, "vela.nascent", 0), cells->n_cells, law, MOST);
    check_mean_and_sd("in order", cells, "vela.nascent", 0, exact.mean, exact.sd, exact.kurtosis);
    sample_free(cells);
}
END_TEST

/* ---- headway ---- */

/* With a fixed dwell, what a molecule waits beyond it is the wait in the queue M/D/1 whose service
 * takes the headway h: w = max(0, w before + h - time since the one before), k h^2/(2 (1 - k h)) on
 * average (Pollaczek and Khinchine's formula; Khinchine 1932, Mat. Sb. 39:73). By Little's law the
 * stage holds k times the dwell and the wait. Each allele queues by itself. */
static void check_headway(const char *what, const char *copies, double alleles) {
    char text[1000];
    snprintf(text, sizeof text,
             "tarry: 1\ntime: min\ngenes:\n  vela:\n    copies: %s\n"
             "    promoter: {on: {initiates: 1.5}}\n"
             "    transcript: {stages: {nascent: 3}, no_overtaking: true, headway: 0.5, decay: 1}\n"
             "run: {cells: 2000, settle: 60, until: 60, every: 0.5}\n",
             copies);
    tarry_model *model = NULL;
    tarry_results *results = run_results(text, &model);
    const double k = 1.5, h = 0.5, wait = k * h * h / (2 * (1 - k * h));
    check_figure(what, burst_figure(results, "vela", "all", "nascent_mean"),
                 alleles * k * (3 + wait));
    const tarry_table *transit = tarry_results_table(results, TARRY_TABLE_transit);
    ck_assert_uint_eq(tarry_table_n_rows(transit), 1);
    const int mean = tarry_table_column(transit, "mean_drawn");
    ck_assert_double_eq_tol(tarry_table_number(transit, 0, mean), 3, 1e-12);
    tarry_results_free(results);
    tarry_model_free(model);
}

START_TEST(test_headway) {
    check_headway("one allele", "1", 1);
    check_headway("three alleles", "3", 3);
}
END_TEST

/* Nothing is removed, so the count of transcripts tells completions: within less than a headway it
 * rises by one at most on each allele, however the dwells were drawn. */
START_TEST(test_spacing) {
    static const char text[] =
        "tarry: 1\ntime: min\ngenes:\n  vela:\n    copies: 2\n    promoter: {on: {initiates: "
        "1.9}}\n"
        "    transcript: {stages: {nascent: {gamma: {mean: 3, sd: 2}}}, no_overtaking: true,\n"
        "      headway: 0.5}\n"
        "run: {until: 30, every: 30, snapshots: [29, 29.499, 30]}\n";
    sample_cells *cells = sample_new(text, CELLS / 4);
    const double *from = sample_values(cells, "vela.transcript", 0);
    const double *to = sample_values(cells, "vela.transcript", 1);
    double n[4] = {0};
    for (size_t i = 0; i < cells->n_cells; i++) {
        ASSERT_FAST(to[i] - from[i] <= 2,
                    "cell %zu: %g completions within a headway of two alleles", i, to[i] - from[i]);
        n[(int)(to[i] - from[i])]++;
    }
    ck_assert(n[2] > 0.5 * (double)cells->n_cells); /* it binds */
    sample_free(cells);
}
END_TEST

/* ---- the light of a stretched dwell ---- */

/* A step at half the dwell: for each molecule half the time in the stage is bright, the stretched
 * one. So the light is half the count on average. */
static void check_light(const char *copies, double alleles) {
    char text[1000];
    snprintf(text, sizeof text,
             "tarry: 1\ntime: min\ngenes:\n  vela:\n    copies: %s\n"
             "    promoter: {on: {initiates: 1.5}}\n"
             "    transcript: {stages: {nascent: 3}, no_overtaking: true, headway: 0.5, decay: 1}\n"
             "signals: {light: {of: vela.nascent, ramp: {from: 0.5, to: 0.5}}}\n"
             "run: {cells: 2000, settle: 60, until: 60, every: 0.5}\n",
             copies);
    tarry_model *model = NULL;
    tarry_results *results = run_results(text, &model);
    const double wait = 1.5 * 0.5 * 0.5 / (2 * (1 - 0.75));
    check_figure("light", signal_figure(results, "light", "all", "signal_mean"),
                 alleles * 1.5 * (3 + wait) / 2);
    tarry_results_free(results);
    tarry_model_free(model);
}

START_TEST(test_ramp) {
    check_light("1", 1);
    check_light("3", 3);
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"order", test_order},
        {"headway", test_headway},
        {"spacing", test_spacing},
        {"ramp", test_ramp},
    };
    return run_tests("order", tests, sizeof tests / sizeof *tests);
}
