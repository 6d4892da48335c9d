/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Signals of which only what is above a level is found, on noise alone: normal frames that are
 * independent of each other. What is found of them has a truncated normal law, whose mean and
 * variance are from memory (found also in Johnson, Kotz & Balakrishnan 1994, Continuous Univariate
 * Distributions 1, chapter 13), with GSL's density and tail. */

#include "agree.h"
#include "base/table.h"
#include "sample.h"
#include "support.h"

#include <gsl/gsl_cdf.h>
#include <gsl/gsl_randist.h>
#include <math.h>
#include <string.h>

static const double mean = 2, sd = 1.5, level = 2.9;

#define MODEL                                                                                      \
    "tarry: 1\ntime: min\nspecies: {pin: 0}\nreactions: {fade: {uses: {pin: 1}, rate: 1}}\n"       \
    "signals:\n"                                                                                   \
    "  found: {of: pin, background: 2, noise: 1.5, detects: {above: 2.9}}\n"                       \
    "  tracked: {of: pin, background: 2, noise: 1.5, detects: {above: 2.9, from_first: yes}}\n"    \
    "run: {cells: 4000, settle: 1, until: 40, every: 1, snapshots: [0, 0.5, 4, 7.25]}\n"

/* Of frames that are above the level. */
typedef struct truncated {
    double chance, mean, sd;
} truncated;

static truncated above_level(void) {
    const double a = (level - mean) / sd, chance = gsl_cdf_ugaussian_Q(a);
    const double ratio = gsl_ran_ugaussian_pdf(a) / chance;
    return (truncated){chance, mean + sd * ratio, sd * sqrt(1 + a * ratio - ratio * ratio)};
}

static tarry_results *results_of_model(tarry_model **model) {
    return run_results(MODEL, model);
}

START_TEST(test_found) {
    tarry_model *model = NULL;
    tarry_results *results = results_of_model(&model);
    const truncated law = above_level();
    check_figure("mean", signal_figure(results, "found", "all", "signal_mean"), law.mean);
    check_figure("sd", signal_figure(results, "found", "all", "signal_sd"), law.sd);
    tarry_results_free(results);
    tarry_model_free(model);
}
END_TEST

/* After so many frames at which it might have been found: with chance 1 - miss it was found before,
 * and all values are there; else it must be above now. A time between two frames is none. */
static double tracked_mean(const truncated *law, double time) {
    const double frames = ceil(time), miss = pow(1 - law->chance, frames);
    const double now = time < frames ? 0 : miss * law->chance;
    return ((1 - miss) * mean + now * law->mean) / (1 - miss + now);
}

START_TEST(test_tracked) {
    tarry_model *model = NULL;
    tarry_results *results = results_of_model(&model);
    const tarry_table *means = tarry_results_table(results, TARRY_TABLE_means);
    const truncated law = above_level();
    size_t n = 0;
    for (size_t row = 0; row < tarry_table_n_rows(means); row++) {
        const double time = tarry_table_number(means, row, 1);
        const double exact = tracked_mean(&law, time);
        if (strcmp(tarry_table_text(means, row, 0), "tracked") != 0)
            continue;
        const double z = (tarry_table_number(means, row, tarry_table_column(means, "mean")) -
                          exact) /
                         tarry_table_number(means, row, tarry_table_column(means, "mean_se"));
        ck_assert_msg(fabs(z) < 5, "time %g: Z = %g", time, z);
        n++;
    }
    ck_assert_uint_eq(n, 41 + 2);
    tarry_results_free(results);
    tarry_model_free(model);
}
END_TEST

/* Frames that are there, told by the pairs at lag 0 over both kinds of film. */
static double pairs_at_zero(const tarry_results *results, const char *name) {
    const tarry_table *table = tarry_results_table(results, TARRY_TABLE_autocorrelation);
    const int pairs = tarry_table_column(table, "pairs"), lag = tarry_table_column(table, "lag");
    for (size_t row = 0; row < tarry_table_n_rows(table); row++)
        if (!strcmp(tarry_table_text(table, row, 1), name) &&
            !strcmp(tarry_table_text(table, row, 2), name) &&
            !(fabs(tarry_table_number(table, row, lag)) > 0))
            return tarry_table_number(table, row, pairs);
    return NAN;
}

/* Binomial, and F less a geometric number cut off at F frames (its moments summed). */
START_TEST(test_frames) {
    enum { CELLS = 4000, FRAMES = 41 };
    tarry_model *model = NULL;
    tarry_results *results = results_of_model(&model);
    const double p = above_level().chance;
    double first = 0, second = 0;
    for (int frame = 0; frame < FRAMES; frame++) {
        const double chance = pow(1 - p, frame) * p, there = FRAMES - frame;
        first += chance * there;
        second += chance * there * there;
    }
    const double found = (pairs_at_zero(results, "found") - CELLS * FRAMES * p) /
                         sqrt(CELLS * FRAMES * p * (1 - p));
    const double tracked = (pairs_at_zero(results, "tracked") - CELLS * first) /
                           sqrt(CELLS * (second - first * first));
    ck_assert_msg(fabs(found) < 5, "Z = %g", found);
    ck_assert_msg(fabs(tracked) < 5, "Z = %g", tracked);
    tarry_results_free(results);
    tarry_model_free(model);
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"found", test_found}, {"tracked", test_tracked}, {"frames", test_frames}};
    return run_tests("detects", tests, sizeof tests / sizeof *tests);
}
