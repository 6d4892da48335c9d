/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Parameters that differ from cell to cell, against mixtures over their laws. */

#include "sample.h"
#include "support.h"

#include <gsl/gsl_integration.h>
#include <gsl/gsl_randist.h>
#include <gsl/gsl_statistics_double.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

enum { MOST = 400 };

/* ---- rates ----------------------------------------------------------------------------------- */

/* Counts of an immigration and death process are Poisson; with a gamma factor (shape r = 1/cv^2) in
 * the rate they are negative binomial of that shape (Greenwood & Yule 1920, J. R. Stat. Soc.
 * 83:255; from memory), here of mean 12 and r = 4. */
START_TEST(a_gamma_rate_gives_negative_binomial_counts) {
    sample_cells *s = sample_new(
        "tarry: 1\ntime: min\nparameters: {k: {value: 6, varies: {gamma: {cv: 0.5}}}}\n"
        "genes: {vela: {promoter: {on: {initiates: k}}, transcript: {decay: 0.5}}}\n"
        "run: {cells: 20000, settle: 60, until: 10, every: 10, snapshots: [0, 10]}\n",
        20000);
    double p[MOST];
    for (unsigned n = 0; n < MOST; n++)
        p[n] = gsl_ran_negative_binomial_pdf(n, 4.0 / (4 + 12), 4);
    check_counts("counts", sample_values(s, "vela.transcript", 1), s->n_cells, p, MOST);
    /* at both times a cell has its own mean: the covariance is that of the means, 36, and what is
     * left of each cell's Poisson spread, 12 exp(-0.5 10) */
    const double *a = sample_values(s, "vela.transcript", 0);
    const double *b = sample_values(s, "vela.transcript", 1);
    const double covariance = gsl_stats_covariance(a, 1, b, 1, s->n_cells);
    double *products = calloc(s->n_cells, sizeof *products);
    for (size_t i = 0; i < s->n_cells; i++)
        products[i] = (a[i] - 12) * (b[i] - 12);
    const double se = gsl_stats_sd(products, 1, s->n_cells) / sqrt((double)s->n_cells);
    check_z("covariance over time", (covariance - (36 + 12 * exp(-5.0))) / se);
    free(products);
    sample_free(s);
}
END_TEST

/* The variance is the mean of the cells' variances and the variance of their means. Two states with
 * opening a, closing b, decay d and an initiation rate k F, F lognormal of mean 1 and cv c: with K
 * = a
 * + b and q = a/K a cell has mean k F q/d and variance k F q/d + (k F)^2 q (1 - q)/(d (d + K))
 * (Peccoud & Ycart 1995). Switching and decay are the same in all cells, so that E F^2 = 1 + c^2 is
 * all that is needed. */
START_TEST(variances_add_up) {
    const double a = 0.3, b = 0.5, d = 0.4, k = 8, c = 0.6, K = a + b, q = a / K;
    tarry_model *model = NULL;
    tarry_results *results = run_results(
        "tarry: 1\ntime: min\nparameters: {k: {value: 8, varies: {lognormal: {cv: 0.6}}}}\n"
        "genes:\n  vela:\n    start: steady\n    promoter: {shut: {to: {open: 0.3}}, open: {to: "
        "{shut: 0.5}, "
        "initiates: k}}\n    transcript: {decay: 0.4}\n"
        "run: {cells: 20000, settle: 50, until: 400, every: 5, lags: 100, snapshots: [0]}\n",
        &model);
    const tarry_table *means = tarry_results_table(results, TARRY_TABLE_means);
    const double mean = k * q / d;
    const double own = mean + k * k * (1 + c * c) * q * (1 - q) / (d * (d + K));
    const double between = mean * mean * c * c;
    bool seen = false;
    for (size_t i = 0; i < tarry_table_n_rows(means); i++) {
        if (strcmp(tarry_table_text(means, i, 0), "vela.transcript") != 0 ||
            tarry_table_number(means, i, 1) != 200)
            continue;
        seen = true;
        check_z("mean", (tarry_table_number(means, i, 2) - mean) / tarry_table_number(means, i, 4));
        check_z("sd", (tarry_table_number(means, i, 3) - sqrt(own + between)) /
                          tarry_table_number(means, i, 5));
    }
    ck_assert(seen);
    /* long after all else is forgotten the correlation is the share of the spread between cells */
    const tarry_table *curve = tarry_results_table(results, TARRY_TABLE_autocorrelation);
    size_t n = 0;
    for (size_t i = 0; i < tarry_table_n_rows(curve); i++) {
        if (strcmp(tarry_table_text(curve, i, 1), "vela.transcript") != 0 ||
            tarry_table_number(curve, i, 3) < 60)
            continue;
        const double se = (tarry_table_number(curve, i, 8) - tarry_table_number(curve, i, 7)) /
                          3.92;
        check_z("plateau", (tarry_table_number(curve, i, 6) - between / (own + between)) / se);
        n++;
    }
    ck_assert_uint_ge(n, 5);
    tarry_results_free(results);
    tarry_model_free(model);
}
END_TEST

/* ---- starts ---------------------------------------------------------------------------------- */

static double share_open(double factor, void *context) {
    (void)context;
    return 0.5 * 0.4 * factor / (0.4 * factor + 0.6); /* density 1/2 from 0 to 2 */
}

/* Each cell starts in its own steady state: P(open) = E[a F/(a F + b)] at all times. */
START_TEST(steady_starts_are_each_cells_own) {
    sample_cells *s = sample_new(
        "tarry: 1\ntime: min\nparameters: {a: {value: 0.4, varies: {uniform: {from: 0, to: 2}}}}\n"
        "genes: {vela: {start: steady, promoter: {shut: {to: {open: a}}, open: {to: {shut: "
        "0.6}}}}}\n"
        "run: {cells: 20000, until: 10, every: 10, snapshots: [0, 1, 10]}\n",
        20000);
    gsl_integration_workspace *w = gsl_integration_workspace_alloc(100);
    gsl_function f = {share_open, NULL};
    double share, off;
    ck_assert_int_eq(
        gsl_integration_qag(&f, 0, 2, 1e-12, 1e-10, 100, GSL_INTEG_GAUSS31, w, &share, &off), 0);
    for (size_t t = 0; t < 3; t++)
        check_mean("open", sample_mean(s, "vela.open", t), share, sqrt(share * (1 - share)),
                   s->n_cells);
    gsl_integration_workspace_free(w);
    sample_free(s);
}
END_TEST

/* ---- lags ------------------------------------------------------------------------------------ */

typedef struct mixture {
    unsigned n;
} mixture;

static double poisson_part(double factor, void *context) {
    return gsl_ran_poisson_pdf(((const mixture *)context)->n, 10 * factor) / 1.2; /* 0.4 to 1.6 */
}

/* Molecules in transit are Poisson with mean rate * mean lag, whatever the law of the lag is
 * (M/G/infinity): with a factor of the mean lag, uniform from 0.4 to 1.6, a mixture of those. Fixed
 * lags, lags that are scaled as a whole, and lags whose shape differs, which are solved for. */
START_TEST(lags_of_unlike_cells) {
    static const char *const lags[] = {"{fixed: lag}", "{gamma: {mean: lag, sd: 0.5 * lag}}",
                                       "{gamma: {mean: lag, sd: 1}}",
                                       "{lognormal: {mean: lag, sd: 1}}"};
    gsl_integration_workspace *w = gsl_integration_workspace_alloc(100);
    double p[MOST], off;
    for (unsigned n = 0; n < MOST; n++) {
        mixture m = {n};
        gsl_function f = {poisson_part, &m};
        ck_assert_int_eq(
            gsl_integration_qag(&f, 0.4, 1.6, 1e-14, 1e-9, 100, GSL_INTEG_GAUSS31, w, &p[n], &off),
            0);
    }
    for (size_t i = 0; i < sizeof lags / sizeof *lags; i++) {
        char text[1024];
        snprintf(
            text, sizeof text,
            "tarry: 1\ntime: min\nparameters: {lag: {value: 2 min, varies: {uniform: {from: 0.4, "
            "to: 1.6}}}}\ngenes: {vela: {promoter: {on: {initiates: 5}}, transcript: {stages: "
            "{n: %s}, decay: 1}}}\nrun: {cells: 20000, settle: 15, until: 10, every: 10}\n",
            lags[i]);
        sample_cells *s = sample_new(text, i < 2 ? 20000 : 2000);
        check_counts(lags[i], sample_values(s, "vela.n", 0), s->n_cells, p, MOST);
        sample_free(s);
    }
    gsl_integration_workspace_free(w);
}
END_TEST

/* ---- steps ----------------------------------------------------------------------------------- */

/* A step moves the centre and each cell keeps its factor: the mean counts before and long after it
 * are 20 F and 60 F, so that their covariance is 20 * 60 * cv^2. */
START_TEST(a_step_keeps_the_factor) {
    sample_cells *s = sample_new(
        "tarry: 1\ntime: min\nparameters: {k: {value: 10, varies: {weibull: {cv: 0.4}}}}\n"
        "genes: {vela: {promoter: {on: {initiates: k}}, transcript: {decay: 0.5}}}\n"
        "protocol: [{at: 1, set: {k: 3 * k}}]\n"
        "run: {cells: 20000, settle: 60, until: 60, every: 1, snapshots: [0, 60]}\n",
        20000);
    const double *a = sample_values(s, "vela.transcript", 0);
    const double *b = sample_values(s, "vela.transcript", 1);
    double *products = calloc(s->n_cells, sizeof *products);
    for (size_t i = 0; i < s->n_cells; i++)
        products[i] = (a[i] - 20) * (b[i] - 60);
    const double se = gsl_stats_sd(products, 1, s->n_cells) / sqrt((double)s->n_cells);
    check_mean("before", sample_mean(s, "vela.transcript", 0), 20, sqrt(20 + 64), s->n_cells);
    check_mean("after", sample_mean(s, "vela.transcript", 1), 60, sqrt(60 + 576), s->n_cells);
    check_z("covariance", (gsl_stats_covariance(a, 1, b, 1, s->n_cells) - 20 * 60 * 0.16) / se);
    free(products);
    sample_free(s);
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"a gamma rate gives negative binomial counts",
         a_gamma_rate_gives_negative_binomial_counts},
        {"variances add up", variances_add_up},
        {"steady starts are each cell's own", steady_starts_are_each_cells_own},
        {"lags of unlike cells", lags_of_unlike_cells},
        {"a step keeps the factor", a_step_keeps_the_factor},
    };
    return run_tests("varied", tests, sizeof tests / sizeof *tests);
}
