/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Signals of one allele: each is that of a gene with one copy, and they know nothing of each other.
 *
 * open 0.1, shut 0.3, initiates 2 per min, dwell 4 min: mean 2, variance 9.51777986, correlations
 * as in test_correlation.c (Campbell's theorem). */

#include "sample.h"
#include "support.h"

#include <gsl/gsl_statistics_double.h>
#include <math.h>

static const char model[] =
    "tarry: 1\ntime: min\ngenes:\n  vela:\n    copies: 2\n    start: steady\n    promoter:\n"
    "      shut: {to: {open: 0.1}}\n      open: {to: {shut: 0.3}, initiates: 2}\n"
    "    transcript: {stages: {nascent: {fixed: 4 min}}, decay: 1}\n"
    "signals:\n"
    "  one: {of: vela.nascent, allele: 1}\n"
    "  other: {sum: {vela.nascent: 3}, allele: 2, background: 5}\n"
    "  late: {of: vela.nascent, allele: 2, ramp: {from: 0.375, to: 0.375}}\n"
    "  both: {of: vela.nascent, ramp: {from: 0, to: 0}}\n"
    "run: {settle: 60, until: 10, every: 1}\n";

START_TEST(test_alleles) {
    sample_cells *cells = sample_new(model, 20000);
    const size_t n = cells->n_cells;
    const double sd = sqrt(9.51777986);
    /* Excess kurtosis of the number under way, 2.2: from its law by the generating function
     * (confirmed by the sample itself within 10 %). */
    check_mean_and_sd("one", cells, "one", 0, 2, sd, 2.5);
    check_mean_and_sd("other", cells, "other", 0, 11, 3 * sd, 2.5);
    check_mean("late", sample_mean(cells, "late", 0), 2 * 2.5 / 4, sample_sd(cells, "late", 0), n);
    check_mean_and_sd("both", cells, "both", 0, 4, sqrt(2) * sd, 1.25);
    const double covariance = gsl_stats_covariance(sample_values(cells, "one", 0), 1,
                                                   sample_values(cells, "other", 0), 1, n);
    check_z("independent", covariance / (3 * sd * sd / sqrt((double)n)));
    const double *one = sample_values(cells, "one", 0), *other = sample_values(cells, "other", 0);
    const double *both = sample_values(cells, "both", 0);
    const double *count = sample_values(cells, "vela.nascent", 0);
    for (size_t i = 0; i < n; i++) {
        ASSERT_FAST(both[i] == count[i], "both %g, under way %g", both[i], count[i]);
        ASSERT_FAST(one[i] + (other[i] - 5) / 3 == count[i], "alleles do not add up");
    }
    sample_free(cells);
}
END_TEST

/* Kept in order each allele has a lag of its own: a signal without `allele` still sees all of them.
 */
START_TEST(test_all_alleles_in_order) {
    sample_cells *cells = sample_new("tarry: 1\ntime: min\ngenes:\n  vela:\n    copies: 3\n"
                                     "    promoter: {on: {initiates: 0.5}}\n"
                                     "    transcript: {stages: {nascent: {gamma: {mean: 4, sd: "
                                     "1}}}, no_overtaking: true, decay: 1}\n"
                                     "signals: {spot: {of: vela.nascent, ramp: {from: 0, to: 0}}}\n"
                                     "run: {settle: 60, until: 10, every: 1}\n",
                                     2000);
    const double *spot = sample_values(cells, "spot", 0);
    const double *count = sample_values(cells, "vela.nascent", 0);
    double sum = 0;
    for (size_t i = 0; i < cells->n_cells; i++) {
        ASSERT_FAST(spot[i] == count[i], "spot %g, under way %g", spot[i], count[i]);
        sum += spot[i];
    }
    ck_assert_double_gt(sum, 0);
    sample_free(cells);
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"alleles", test_alleles},
        {"all alleles in order", test_all_alleles_in_order},
    };
    return run_tests("allele", tests, sizeof tests / sizeof *tests);
}
