/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Delayed degradation in its two readings: molecules that are gone at once when their removal
 * begins (consuming), and molecules that stay until it ends (non-consuming), which differ by a
 * factor in the variance (Bratsun et al. 2005, PNAS 102:14593; Barrio et al. 2006, PLoS Comput.
 * Biol. 2:e117, for the models; variances by the closed second moments of linear rates, worked out
 * for these tests: K'(T) = -B K(T) - C K(T - tau)). */

#include "sample.h"
#include "support.h"

#include <gsl/gsl_randist.h>
#include <gsl/gsl_statistics_double.h>
#include <math.h>
#include <stdio.h>

static void check_variance(const char *what, const sample_cells *cells, const char *name,
                           size_t snapshot, double exact) {
    const double *x = sample_values(cells, name, snapshot);
    const double kurtosis = gsl_stats_kurtosis(x, 1, cells->n_cells);
    check_sd(what, sample_sd(cells, name, snapshot), sqrt(exact), fmax(kurtosis, 0),
             cells->n_cells);
}

/* Covariance between two snapshots; its standard error for nearly Gaussian pairs is
 * sqrt((V^2 + K^2)/n). */
static void check_covariance(const char *what, const sample_cells *cells, const char *name,
                             size_t later, double variance, double exact) {
    const double k = gsl_stats_covariance(sample_values(cells, name, 0), 1,
                                          sample_values(cells, name, later), 1, cells->n_cells);
    const double se = sqrt((variance * variance + exact * exact) / (double)cells->n_cells);
    check_z(what, (k - exact) / se);
}

typedef struct decay_case {
    double make, decay, doom, lag, settle;
    size_t n_cells;
    double mean, variance, half, full; /* covariance at lag / 2 and lag */
} decay_case;

static sample_cells *simulate(const decay_case *c, const char *doom) {
    char text[1024];
    snprintf(text, sizeof text,
             "tarry: 1\ntime: min\nspecies: {x: %g, going: 0}\nreactions:\n"
             "  make: {makes: {x: 1}, rate: %g}\n"
             "  decay: {uses: {x: 1}, rate: %g}\n"
             "  doom: %s\n"
             "run: {settle: %g, until: %g, every: %g, snapshots: [0, %g, %g]}\n",
             round(c->mean), c->make, c->decay, doom, c->settle, c->lag, c->lag, c->lag / 2,
             c->lag);
    return sample_new(text, c->n_cells);
}

/* With omega = sqrt(C^2 - B^2): Var = A (1 + C/omega sin omega tau)/(B + C cos omega tau), or its
 * hyperbolic and linear forms; A/(B + C) the mean. */
START_TEST(test_non_consuming) {
    static const decay_case cases[] = {
        {100, 1, 0.5, 2, 30, 10000, 66.666667, 105.017638, 33.945759, -10.035275},
        {100, 0.05, 0.1, 10, 200, 1500, 666.666667, 1637.486918, 1001.835408, 181.256541},
        {50, 0.5, 0.5, 2, 40, 10000, 50, 100, 50, 0},
    };
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        const decay_case *c = &cases[i];
        char doom[256];
        snprintf(doom, sizeof doom,
                 "{needs: {x: 1}, rate: %g, later: [{after: {fixed: %g}, uses: {x: 1}, "
                 "if_short: skip}]}",
                 c->doom, c->lag);
        sample_cells *cells = simulate(c, doom);
        for (size_t t = 0; t < 3; t++) {
            check_mean("non-consuming", sample_mean(cells, "x", t), c->mean, sqrt(c->variance),
                       cells->n_cells);
            check_variance("non-consuming", cells, "x", t, c->variance);
        }
        check_covariance("half a lag later", cells, "x", 1, c->variance, c->half);
        check_covariance("a lag later", cells, "x", 2, c->variance, c->full);
        sample_free(cells);
    }
}
END_TEST

/* The same rates, consuming: x and what is going are independent Poisson numbers with means A/(B +
 * C) and C A tau/(B + C) (an infinite-server queue; Lafuerza & Toral 2011, Phys. Rev. E 84:051121).
 */
START_TEST(test_consuming) {
    const decay_case c = {100, 0.05, 0.1, 10, 100, 3000, 666.666667, 666.666667, 0, 0};
    sample_cells *cells = simulate(
        &c, "{uses: {x: 1}, makes: {going: 1}, rate: 0.1, later: [{after: {fixed: 10}, "
            "uses: {going: 1}}]}");
    static const char *const names[] = {"x", "going"};
    for (size_t i = 0; i < 2; i++)
        check_mean_and_sd("consuming", cells, names[i], 2, c.mean, sqrt(c.mean), 1 / c.mean);
    const double *x = sample_values(cells, "x", 2), *going = sample_values(cells, "going", 2);
    const double covariance = gsl_stats_covariance(x, 1, going, 1, cells->n_cells);
    check_z("independent", covariance / (c.mean / sqrt((double)cells->n_cells)));
    sample_free(cells);
}
END_TEST

/* A -> B with rate 0.1 and a lag of 5 from 100 molecules. Consuming: each molecule is still A with
 * chance exp(-0.1 t), B with chance 1 - exp(-0.1 (t - 5)). Non-consuming: means by the method of
 * steps, before any removal lacks its molecule. */
START_TEST(test_conversion) {
    static const double t[] = {4, 7.5, 10, 12.5};
    const char *const run = "run: {until: 12.5, every: 12.5, snapshots: [4, 7.5, 10, 12.5]}\n";
    char text[1024];
    snprintf(text, sizeof text,
             "tarry: 1\ntime: min\nspecies: {a: 100, b: 0}\nreactions:\n"
             "  turn: {uses: {a: 1}, rate: 0.1, later: [{after: {fixed: 5}, makes: {b: 1}}]}\n%s",
             run);
    sample_cells *cells = sample_new(text, 20000);
    for (size_t i = 0; i < 4; i++) {
        static double law[101];
        const double still = exp(-0.1 * t[i]), arrived = t[i] < 5 ? 0 : 1 - exp(-0.1 * (t[i] - 5));
        for (unsigned n = 0; n <= 100; n++)
            law[n] = gsl_ran_binomial_pdf(n, still, 100);
        check_counts("consuming A", sample_values(cells, "a", i), cells->n_cells, law, 101);
        check_mean("consuming B", sample_mean(cells, "b", i), 100 * arrived,
                   sqrt(100 * arrived * (1 - arrived)), cells->n_cells);
    }
    sample_free(cells);
    snprintf(text, sizeof text,
             "tarry: 1\ntime: min\nspecies: {a: 100, b: 0}\nreactions:\n"
             "  turn: {needs: {a: 1}, rate: 0.1, later: [{after: {fixed: 5}, uses: {a: 1}, "
             "makes: {b: 1}, if_short: skip}]}\n%s",
             run);
    cells = sample_new(text, 20000);
    static const double mean[] = {100, 75, 50, 28.125};
    ck_assert_double_eq(sample_mean(cells, "a", 0), 100);
    for (size_t i = 1; i < 4; i++) {
        check_mean("non-consuming A", sample_mean(cells, "a", i), mean[i], sample_sd(cells, "a", i),
                   cells->n_cells);
        check_mean("non-consuming B", sample_mean(cells, "b", i), 100 - mean[i],
                   sample_sd(cells, "b", i), cells->n_cells);
    }
    sample_free(cells);
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"non-consuming", test_non_consuming},
        {"consuming", test_consuming},
        {"conversion", test_conversion},
    };
    return run_tests("delayed_decay", tests, sizeof tests / sizeof *tests);
}
