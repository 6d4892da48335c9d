/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Birth, death, immigration and dimerisation: mean and sd over time.
 *
 * Source of models and acceptance rule: Evans, Gillespie & Wilkinson 2008, Bioinformatics 24:285,
 * and the published tables that belong to it. Closed forms: Bailey 1964, The Elements of Stochastic
 * Processes (from memory), confirmed here against the published values or the master equation by
 * GSL. */

#include "master.h"
#include "sample.h"
#include "support.h"

#include <check.h>
#include <gsl/gsl_randist.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>

enum { CELLS = 20000 };

static sample_cells *simulate(const char *reactions, const char *start, double until) {
    char text[1024];
    snprintf(text, sizeof text,
             "tarry: 1\ntime: s\nspecies: %s\nreactions:\n%s"
             "run: {until: %g s, every: %g s, snapshots: [%g, %g], record: []}\n",
             start, reactions, until, until, until / 2, until);
    return sample_new(text, CELLS);
}

/* Published: mean and sd at t = 25 and 50 for X0 = 100, rates 0.1 and 0.11, and 1 and 1.1. The
 * excess kurtosis of a linear birth-death process follows from its cumulants (worked out for these
 * tests). */
START_TEST(test_birth_death) {
    static const struct {
        double birth, death, mean[2], sd[2], kurtosis[2];
    } cases[] = {
        {0.1, 0.11, {77.880078, 60.653066}, {19.020180, 22.386772}, {0.178437, 0.406906}},
        {1, 1.1, {8.208500, 0.673795}, {12.578903, 3.748913}, {7.032459, 92.727995}},
    };
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        char reactions[256];
        snprintf(reactions, sizeof reactions,
                 "  birth: {uses: {x: 1}, makes: {x: 2}, rate: %g}\n"
                 "  death: {uses: {x: 1}, rate: %g}\n",
                 cases[i].birth, cases[i].death);
        sample_cells *cells = simulate(reactions, "{x: 100}", 50);
        for (size_t t = 0; t < 2; t++)
            check_mean_and_sd("birth-death", cells, "x", t, cases[i].mean[t], cases[i].sd[t],
                              cases[i].kurtosis[t]);
        sample_free(cells);
    }
}
END_TEST

/* Extinct by t: [mu (1 - e)/(mu - lambda e)]^X0 with e = exp((lambda - mu) t). */
START_TEST(test_extinction) {
    sample_cells *cells = simulate("  birth: {uses: {x: 1}, makes: {x: 2}, rate: 1}\n"
                                   "  death: {uses: {x: 1}, rate: 1.1}\n",
                                   "{x: 100}", 50);
    for (size_t t = 0; t < 2; t++) {
        const double e = exp(-0.1 * (t == 0 ? 25 : 50));
        const double p = pow(1.1 * (1 - e) / (1.1 - e), 100);
        const double *x = sample_values(cells, "x", t);
        double extinct = 0;
        for (size_t i = 0; i < cells->n_cells; i++)
            extinct += x[i] == 0;
        check_mean("extinct share", extinct / (double)cells->n_cells, p, sqrt(p * (1 - p)),
                   cells->n_cells);
    }
    sample_free(cells);
}
END_TEST

/* From 0 the count is Poisson with mean alpha (1 - exp(-mu t))/mu; published for alpha = 1. */
START_TEST(test_immigration_death) {
    static const double alphas[] = {1, 10};
    for (size_t i = 0; i < 2; i++) {
        char reactions[256];
        snprintf(reactions, sizeof reactions,
                 "  come: {makes: {x: 1}, rate: %g}\n  go: {uses: {x: 1}, rate: 0.1}\n", alphas[i]);
        sample_cells *cells = simulate(reactions, "{x: 0}", 50);
        for (size_t t = 0; t < 2; t++) {
            const double mean = alphas[i] * (1 - exp(-0.1 * (t == 0 ? 25 : 50))) / 0.1;
            check_mean_and_sd("immigration-death", cells, "x", t, mean, sqrt(mean), 1 / mean);
            double law[200];
            for (unsigned k = 0; k < 200; k++)
                law[k] = gsl_ran_poisson_pdf(k, mean);
            check_counts("immigration-death", sample_values(cells, "x", t), cells->n_cells, law,
                         200);
        }
        sample_free(cells);
    }
}
END_TEST

/* Batches of b: mean and sd published for b = 5; the others by the closed form. */
START_TEST(test_batches) {
    static const struct {
        int batch;
        double death, kurtosis;
    } cases[] = {{5, 0.2, 0.200006}, {10, 0.4, 0.4}, {100, 4, 4}};
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        char reactions[256];
        snprintf(reactions, sizeof reactions,
                 "  come: {makes: {x: %d}, rate: 1}\n  go: {uses: {x: 1}, rate: %g}\n",
                 cases[i].batch, cases[i].death);
        sample_cells *cells = simulate(reactions, "{x: 0}", 50);
        const double b = cases[i].batch, d = cases[i].death, t = 50;
        const double mean = b * (1 - exp(-d * t)) / d;
        const double variance = mean + b * (b - 1) * (1 - exp(-2 * d * t)) / (2 * d);
        check_mean_and_sd("batches", cells, "x", 1, mean, sqrt(variance), cases[i].kurtosis);
        sample_free(cells);
    }
    /* The published table's values at t = 25 for b = 5. */
    sample_cells *cells = simulate(
        "  come: {makes: {x: 5}, rate: 1}\n  go: {uses: {x: 1}, rate: 0.2}\n", "{x: 0}", 50);
    check_mean_and_sd("published batches", cells, "x", 0, 24.831551, 8.650392, 0.2);
    check_mean_and_sd("published batches", cells, "x", 1, 24.998865, 8.660189, 0.2);
    sample_free(cells);
}
END_TEST

/* 2 P -> P2 with k1 P (P - 1)/2 and back with k2 P2. The published means and sds, and the law of
 * the master equation: a program that counts P^2/2 or P (P - 1) ways is found out. */
START_TEST(test_dimerisation) {
    static const double mean[] = {34.887453, 28.542298}, sd[] = {4.964691, 4.789331};
    enum { PAIRS = 50 };
    master_move moves[2 * PAIRS];
    double p[PAIRS + 1] = {1}, free_count[PAIRS + 1], law[101] = {0};
    for (size_t m = 0; m <= PAIRS; m++)
        free_count[m] = 100 - 2.0 * (double)m;
    for (size_t m = 0; m < PAIRS; m++) {
        const double x = free_count[m];
        moves[2 * m] = (master_move){m, m + 1, 0.001 * x * (x - 1) / 2};
        moves[2 * m + 1] = (master_move){m + 1, m, 0.01 * (double)(m + 1)};
    }
    sample_cells *cells = simulate("  bind: {uses: {x: 2}, makes: {xx: 1}, rate: 0.001}\n"
                                   "  split: {uses: {xx: 1}, makes: {x: 2}, rate: 0.01}\n",
                                   "{x: 100, xx: 0}", 50);
    for (size_t t = 0; t < 2; t++) {
        master_solve(PAIRS + 1, moves, 2 * PAIRS, p, 25);
        const master_moments exact = master_moments_of(PAIRS + 1, p, free_count);
        /* The published figures carry six decimals. */
        ck_assert_double_eq_tol(exact.mean, mean[t], 1e-6);
        ck_assert_double_eq_tol(exact.sd, sd[t], 1e-6);
        check_mean_and_sd("dimerisation", cells, "x", t, mean[t], sd[t], exact.kurtosis);
        check_mean_and_sd("dimerisation", cells, "xx", t, (100 - mean[t]) / 2, sd[t] / 2,
                          exact.kurtosis);
        for (size_t m = 0; m <= PAIRS; m++)
            law[m] = p[m];
        check_counts("dimerisation", sample_values(cells, "xx", t), cells->n_cells, law, PAIRS + 1);
    }
    sample_free(cells);
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"birth and death", test_birth_death},   {"extinction", test_extinction},
        {"immigration", test_immigration_death}, {"batches", test_batches},
        {"dimerisation", test_dimerisation},
    };
    return run_tests("linear", tests, sizeof tests / sizeof *tests);
}
