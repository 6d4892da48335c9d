/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Read-out noise with a part that goes with the signal, on counts whose law is known.
 *
 * Transcripts that come at a rate and decay one by one, from none on, are Poisson at every time
 * (common practice: immigration and death), and their correlation falls as exp(-d lag). What is
 * read is s + sqrt(f^2 + (q s)^2) z with z standard normal: its moments follow by summing over the
 * Poisson law, with GSL's probabilities. */

#include "sample.h"
#include "support.h"

#include <gsl/gsl_randist.h>
#include <math.h>
#include <stdio.h>

enum { CELLS = 40000, MOST = 200 };
static const double rate = 6, decay = 0.5, background = 3, fixed = 0.5, share = 0.2, brightness = 2;

#define GENE                                                                                       \
    "tarry: 1\ntime: min\ngenes:\n"                                                                \
    "  vela: {promoter: {on: {initiates: 6}}, transcript: {decay: 0.5}}\n"                         \
    "signals: {light: {sum: {vela.transcript: 2}, background: 3, noise: {fixed: 0.5, share: "      \
    "0.2}}}\n"

static double count_at(double t) {
    return rate / decay * (1 - exp(-decay * t));
}

START_TEST(test_moments) {
    static const double times[] = {0.5, 2, 20};
    sample_cells *cells = sample_new(GENE "run: {until: 20, every: 20, snapshots: [0.5, 2, 20]}\n",
                                     CELLS);
    for (size_t i = 0; i < 3; i++) {
        const double m = count_at(times[i]), mean = background + brightness * m;
        double second = 0, fourth = 0;
        for (unsigned n = 0; n < MOST; n++) {
            const double p = gsl_ran_poisson_pdf(n, m), s = background + brightness * n;
            const double d = (s - mean) * (s - mean), v = fixed * fixed + share * share * s * s;
            second += p * (d + v);
            fourth += p * (d * d + 6 * d * v + 3 * v * v);
        }
        check_mean_and_sd("light", cells, "light", i, mean, sqrt(second),
                          fourth / (second * second) - 3);
    }
    sample_free(cells);
}
END_TEST

/* What is left of the variance with the noise off: the count's, for a record that is steady and for
 * one that is not, over the mean squared with the background off. */
static void check_amplitude(const char *run, double settle, double until) {
    char text[1000];
    snprintf(text, sizeof text, "%s%s", GENE, run);
    double mean = 0;
    const int n_frames = (int)(until / 0.5) + 1;
    for (int i = 0; i < n_frames; i++)
        mean += count_at(settle + i * 0.5) / n_frames;
    tarry_model *model = NULL;
    tarry_results *results = run_results(text, &model);
    check_figure(run, signal_figure(results, "light", "all", "amplitude"), 1 / mean);
    if (settle > 0) {
        /* On the way down to 1/e lies a straight line between two frames; at lag 2 = 1/d, a frame.
         */
        const double decay_time = signal_figure(results, "light", "all", "decay_time").value;
        ck_assert_double_eq_tol(decay_time, 2, 0.1);
    }
    tarry_results_free(results);
    tarry_model_free(model);
}

START_TEST(test_amplitude) {
    check_amplitude("run: {cells: 4000, settle: 40, until: 100, every: 0.5, lags: 30}\n", 40, 100);
    check_amplitude("run: {cells: 40000, until: 4, every: 0.5, lags: 2}\n", 0, 4);
}
END_TEST

int main(void) {
    const test_entry tests[] = {{"moments", test_moments}, {"amplitude", test_amplitude}};
    return run_tests("noise", tests, sizeof tests / sizeof *tests);
}
