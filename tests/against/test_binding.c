/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Reversible binding of 10 + 10 molecules: the exact law of the number of pairs.
 *
 * By detailed balance P(m) is proportional to K^m / (m! ((10 - m)!)^2) (common practice); with K =
 * 2 its mean is 8.216, where the rate equation K (10 - m)^2 = m gives 8 pairs and 2 of each free.
 */

#include "master.h"
#include "sample.h"
#include "support.h"

#include <gsl/gsl_sf_gamma.h>
#include <math.h>

enum { MOST = 10, CELLS = 40000 };

static const char model[] = "tarry: 1\n"
                            "time: s\n"
                            "species: {clasp: 10, pin: 10, pair: 0}\n"
                            "reactions:\n"
                            "  bind: {uses: {clasp: 1, pin: 1}, makes: {pair: 1}, rate: 2}\n"
                            "  split: {uses: {pair: 1}, makes: {clasp: 1, pin: 1}, rate: 1}\n"
                            "run: {until: 6, every: 6, snapshots: [0.01, 0.1, 6]}\n";

static void stationary_law(double k, double *law) {
    double sum = 0;
    for (unsigned m = 0; m <= MOST; m++) {
        law[m] = exp(m * log(k) - gsl_sf_lnfact(m) - 2 * gsl_sf_lnfact(MOST - m));
        sum += law[m];
    }
    for (unsigned m = 0; m <= MOST; m++)
        law[m] /= sum;
}

static void list_counts(double *pairs) {
    for (int m = 0; m <= MOST; m++)
        pairs[m] = m;
}

START_TEST(test_stationary) {
    double law[MOST + 1], pairs[MOST + 1];
    list_counts(pairs);
    stationary_law(2, law);
    const master_moments exact = master_moments_of(MOST + 1, law, pairs);
    ck_assert_double_eq_tol(exact.mean, 8.21639775007, 1e-10);
    sample_cells *cells = sample_new(model, CELLS);
    check_counts("pairs", sample_values(cells, "pair", 2), cells->n_cells, law, MOST + 1);
    check_mean_and_sd("pairs", cells, "pair", 2, exact.mean, exact.sd, exact.kurtosis);
    check_mean_and_sd("free", cells, "clasp", 2, MOST - exact.mean, exact.sd, exact.kurtosis);
    const double off = sample_mean(cells, "pair", 2) - 8;
    ck_assert_msg(off > 5 * exact.sd / sqrt((double)cells->n_cells),
                  "the mean does not differ from the rate equation's 8");
    sample_free(cells);
}
END_TEST

/* On the way there, by the master equation: 1.671278 (1.091077) at 0.01, 6.544169 (1.110146) at
 * 0.1. */
START_TEST(test_transient) {
    master_move moves[2 * MOST];
    for (size_t m = 0; m < MOST; m++) {
        const double free_each = (double)(MOST - m);
        moves[2 * m] = (master_move){m, m + 1, 2 * free_each * free_each};
        moves[2 * m + 1] = (master_move){m + 1, m, (double)(m + 1)};
    }
    double p[MOST + 1] = {1}, pairs[MOST + 1];
    list_counts(pairs);
    sample_cells *cells = sample_new(model, CELLS);
    static const double wait[] = {0.01, 0.09}, mean[] = {1.671278, 6.544169},
                        sd[] = {1.091077, 1.110146};
    for (size_t t = 0; t < 2; t++) {
        master_solve(MOST + 1, moves, 2 * MOST, p, wait[t]);
        const master_moments exact = master_moments_of(MOST + 1, p, pairs);
        ck_assert_double_eq_tol(exact.mean, mean[t], 1e-6);
        ck_assert_double_eq_tol(exact.sd, sd[t], 1e-6);
        check_mean_and_sd("pairs", cells, "pair", t, mean[t], sd[t], exact.kurtosis);
        check_counts("pairs", sample_values(cells, "pair", t), cells->n_cells, p, MOST + 1);
    }
    sample_free(cells);
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"stationary law", test_stationary},
        {"on the way", test_transient},
    };
    return run_tests("binding", tests, sizeof tests / sizeof *tests);
}
