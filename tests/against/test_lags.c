/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Production with a lag: what is on its way and what has arrived, for every kind of delay.
 *
 * Law: an infinite-server queue fed by a Poisson process (common practice; see Josic et al. 2011,
 * PLoS Comput. Biol. 7:e1002264, for its use with delays): the number under way at t is Poisson
 * with mean rate times the integral of the delay's survival function, worked out here with GSL's
 * cdfs and quadrature. */

#include "sample.h"
#include "support.h"

#include <gsl/gsl_cdf.h>
#include <gsl/gsl_integration.h>
#include <gsl/gsl_randist.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>

enum { CELLS = 40000, MOST = 400 };

static void check_poisson(const char *what, const sample_cells *cells, const char *name,
                          size_t snapshot, double mean) {
    if (mean == 0) {
        ck_assert_double_eq(sample_mean(cells, name, snapshot), 0);
        return;
    }
    static double law[MOST];
    for (unsigned n = 0; n < MOST; n++)
        law[n] = gsl_ran_poisson_pdf(n, mean);
    check_counts(what, sample_values(cells, name, snapshot), cells->n_cells, law, MOST);
    check_mean_and_sd(what, cells, name, snapshot, mean, sqrt(mean), 1 / mean);
}

/* Survival functions. */

static double fixed_survival(double x, void *context) {
    (void)context;
    return x < 3 ? 1 : 0;
}

static double exponential_survival(double x, void *context) {
    (void)context;
    return gsl_cdf_exponential_Q(x, 3);
}

static double erlang_survival(double x, void *context) {
    (void)context;
    return gsl_cdf_gamma_Q(x, 4, 0.75);
}

static double gamma_survival(double x, void *context) {
    (void)context;
    return gsl_cdf_gamma_Q(x, 2.25, 3 / 2.25);
}

static double lognormal_survival(double x, void *context) {
    (void)context;
    const double sigma = sqrt(log(1 + 1.0 / 9));
    return gsl_cdf_lognormal_Q(x, log(3) - sigma * sigma / 2, sigma);
}

static double normal_survival(double x, void *context) {
    (void)context;
    return gsl_cdf_gaussian_Q(x - 3, 1.7) / gsl_cdf_gaussian_Q(-3, 1.7);
}

static double uniform_survival(double x, void *context) {
    (void)context;
    return gsl_cdf_flat_Q(x, 1, 5);
}

static double weibull_survival(double x, void *context) {
    (void)context;
    return gsl_cdf_weibull_Q(x, 3, 1.5);
}

static double bins_survival(double x, void *context) {
    (void)context;
    return 0.25 * gsl_cdf_flat_Q(x, 0, 2) + 0.75 * gsl_cdf_flat_Q(x, 2, 6);
}

static double values_survival(double x, void *context) {
    (void)context;
    return (x < 1 ? 0.5 : 0) + (x < 4 ? 0.3 : 0) + (x < 9 ? 0.2 : 0);
}

static double mix_survival(double x, void *context) {
    (void)context;
    return 0.3 * gsl_cdf_exponential_Q(x, 6) + 0.7 * (x < 2 ? 1 : 0);
}

/* Fixed 1, then exponential 2: a shifted exponential. */
static double total_survival(double x, void *context) {
    (void)context;
    return x < 1 ? 1 : gsl_cdf_exponential_Q(x - 1, 2);
}

static const struct {
    const char *delay;
    double (*survival)(double x, void *context);
} kinds[] = {
    {"{fixed: 3}", fixed_survival},
    {"{exponential: {mean: 3}}", exponential_survival},
    {"{erlang: {steps: 4, mean: 3}}", erlang_survival},
    {"{gamma: {mean: 3, sd: 2}}", gamma_survival},
    {"{lognormal: {mean: 3, sd: 1}}", lognormal_survival},
    {"{normal: {mean: 3, sd: 1.7}}", normal_survival},
    {"{uniform: {from: 1, to: 5}}", uniform_survival},
    {"{weibull: {scale: 3, shape: 1.5}}", weibull_survival},
    {"{table: {edges: [0, 2, 6], weights: [1, 3]}}", bins_survival},
    {"{table: {values: [1, 4, 9], weights: [5, 3, 2]}}", values_survival},
    {"{mix: [{share: 0.3, lasts: {exponential: {mean: 6}}}, {share: 0.7, lasts: {fixed: 2}}]}",
     mix_survival},
    {"{total: [{fixed: 1}, {exponential: {mean: 2}}]}", total_survival},
};

/* Integral of the survival function from 0 to t; the laws jump at whole numbers only. */
static double integral(double (*survival)(double, void *), double t) {
    gsl_integration_workspace *workspace = gsl_integration_workspace_alloc(200);
    ck_assert_ptr_nonnull(workspace);
    gsl_function f = {survival, NULL};
    double sum = 0;
    for (double from = 0; from < t; from += 1) {
        double part, error;
        ck_assert_int_eq(gsl_integration_qags(&f, from, fmin(from + 1, t), 1e-10, 1e-9, 200,
                                              workspace, &part, &error),
                         0);
        sum += part;
    }
    gsl_integration_workspace_free(workspace);
    return sum;
}

START_TEST(test_in_transit) {
    static const double times[] = {1.5, 4, 12};
    for (size_t k = 0; k < sizeof kinds / sizeof *kinds; k++) {
        char text[1024];
        snprintf(text, sizeof text,
                 "tarry: 1\n"
                 "time: min\n"
                 "species: {pre: 0, mature: 0}\n"
                 "reactions:\n"
                 "  start: {makes: {pre: 1}, rate: 2, later: [{after: %s, uses: {pre: 1}, "
                 "makes: {mature: 1}}]}\n"
                 "run: {until: 12, every: 12, snapshots: [1.5, 4, 12]}\n",
                 kinds[k].delay);
        sample_cells *cells = sample_new(text, CELLS / 2);
        for (size_t t = 0; t < 3; t++) {
            const double mean = 2 * integral(kinds[k].survival, times[t]);
            check_poisson(kinds[k].delay, cells, "pre", t, mean);
            check_poisson(kinds[k].delay, cells, "mature", t, 2 * times[t] - mean);
        }
        sample_free(cells);
    }
}
END_TEST

/* Rate 2, lag 3, decay 0.25: Poisson with mean k (1 - exp(-d (t - lag)))/d after the lag. */
START_TEST(test_lag_and_decay) {
    sample_cells *cells = sample_new(
        "tarry: 1\ntime: min\nspecies: {mature: 0}\nreactions:\n"
        "  start: {rate: 2, later: [{after: {fixed: 3 min}, makes: {mature: 1}}]}\n"
        "  decay: {uses: {mature: 1}, rate: 0.25}\n"
        "run: {until: 20, every: 20, snapshots: [2, 5, 10, 20]}\n",
        CELLS);
    static const double t[] = {2, 5, 10, 20};
    for (size_t i = 0; i < 4; i++)
        check_poisson("lag and decay", cells, "mature", i,
                      t[i] < 3 ? 0 : 2 / 0.25 * (1 - exp(-0.25 * (t[i] - 3))));
    sample_free(cells);
}
END_TEST

/* An Erlang lag of n steps and a chain of n exponential steps: the product is Poisson with the same
 * mean, known for rate 1, mean delay 10, decay 0.1 (an explicit chain of rate equations gives the
 * same digits). */
START_TEST(test_erlang_is_a_chain) {
    static const double mean[] = {1.42809752, 5.98886032, 9.44110544};
    const char *const lag =
        "tarry: 1\ntime: min\nspecies: {x: 0}\nreactions:\n"
        "  start: {rate: 1, later: [{after: {erlang: {steps: 5, mean: 10}}, makes: {x: 1}}]}\n"
        "  decay: {uses: {x: 1}, rate: 0.1}\n"
        "run: {until: 40, every: 40, snapshots: [10, 20, 40]}\n";
    const char *const chain =
        "tarry: 1\ntime: min\nspecies: {p: 0, q: 0, r: 0, u: 0, v: 0, x: 0}\nreactions:\n"
        "  start: {makes: {p: 1}, rate: 1}\n"
        "  one: {uses: {p: 1}, makes: {q: 1}, rate: 0.5}\n"
        "  two: {uses: {q: 1}, makes: {r: 1}, rate: 0.5}\n"
        "  three: {uses: {r: 1}, makes: {u: 1}, rate: 0.5}\n"
        "  four: {uses: {u: 1}, makes: {v: 1}, rate: 0.5}\n"
        "  five: {uses: {v: 1}, makes: {x: 1}, rate: 0.5}\n"
        "  decay: {uses: {x: 1}, rate: 0.1}\n"
        "run: {until: 40, every: 40, snapshots: [10, 20, 40]}\n";
    sample_cells *lagged = sample_new(lag, CELLS), *chained = sample_new(chain, CELLS);
    for (size_t i = 0; i < 3; i++) {
        check_poisson("Erlang lag", lagged, "x", i, mean[i]);
        check_poisson("chain", chained, "x", i, mean[i]);
    }
    sample_free(lagged);
    sample_free(chained);
}
END_TEST

/* At 10 min a lag of 6 becomes one of 2; those under way keep theirs, so later ones overtake them.
 * Arrivals are a Poisson process: 2 per min of those begun by t - 6 before the step and by t - 2
 * after it. */
START_TEST(test_lag_shortened_by_a_step) {
    sample_cells *cells = sample_new(
        "tarry: 1\ntime: min\nparameters: {lag: 6 min}\nspecies: {pre: 0, x: 0}\nreactions:\n"
        "  start: {makes: {pre: 1}, rate: 2, later: [{after: {fixed: lag}, uses: {pre: 1}, "
        "makes: {x: 1}}]}\n"
        "protocol: [{at: 10 min, set: {lag: 2 min}}]\n"
        "run: {until: 18, every: 18, snapshots: [9, 11, 13, 17]}\n",
        CELLS);
    static const double arrived[] = {6, 10, 16, 30};
    static const double under_way[] = {12, 12, 10, 4};
    for (size_t i = 0; i < 4; i++) {
        check_poisson("arrived", cells, "x", i, arrived[i]);
        check_poisson("under way", cells, "pre", i, under_way[i]);
    }
    sample_free(cells);
}
END_TEST

/* Transcripts with a lag of 5, then proteins with one of 2: mean and variance by the generating
 * function of a Poisson cluster process, confirmed by moment equations. */
START_TEST(test_two_lags_in_a_row) {
    sample_cells *cells = sample_new(
        "tarry: 1\ntime: min\ngenes:\n  vela:\n"
        "    promoter: {open: {initiates: 1}}\n"
        "    transcript: {stages: {nascent: {fixed: 5}}, decay: 0.2}\n"
        "    protein: {translation: 3, stages: {immature: {fixed: 2}}, decay: 0.05}\n"
        "run: {until: 60, every: 60, snapshots: [6, 10, 20, 60]}\n",
        CELLS / 2);
    static const double transcripts[] = {0.90634623, 3.16060279, 4.75106466, 4.99991649};
    static const double proteins[] = {0, 10.59797304, 98.60904712, 271.74200638};
    for (size_t i = 0; i < 4; i++) {
        check_poisson("transcripts", cells, "vela.transcript", i, transcripts[i]);
        if (i == 0)
            ck_assert_double_eq(sample_mean(cells, "vela.protein", i), 0);
        else
            check_mean("proteins", sample_mean(cells, "vela.protein", i), proteins[i],
                       sample_sd(cells, "vela.protein", i), cells->n_cells);
    }
    /* The excess kurtosis is small and positive; 0.5 bounds it. */
    check_sd("proteins at 20", sample_sd(cells, "vela.protein", 2), sqrt(1392.919543), 0.5,
             cells->n_cells);
    check_sd("proteins at 60", sample_sd(cells, "vela.protein", 3), sqrt(3812.274468), 0.5,
             cells->n_cells);
    sample_free(cells);
}
END_TEST

/* A fixed lag leaves the stationary law of a bursting gene as it is (F = 5.571429); a random one
 * smooths it: F by the spectrum of the switching, integrated by quadrature. */
START_TEST(test_random_lags_smooth) {
    static const struct {
        const char *lag;
        double fano;
    } cases[] = {
        {"{fixed: 2}", 5.571428571},
        {"{exponential: {mean: 2}}", 3.03174603},
        {"{erlang: {steps: 4, mean: 2}}", 3.70484319},
        {"{erlang: {steps: 50, mean: 2}}", 5.09512927},
    };
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        char text[1024];
        snprintf(text, sizeof text,
                 "tarry: 1\ntime: min\ngenes:\n  vela:\n    start: steady\n    promoter:\n"
                 "      shut: {to: {open: 0.5}}\n      open: {to: {shut: 2}, initiates: 20}\n"
                 "    transcript: {stages: {nascent: %s}, decay: 1}\n"
                 "run: {settle: 40, until: 1, every: 1}\n",
                 cases[i].lag);
        sample_cells *cells = sample_new(text, CELLS);
        check_mean(cases[i].lag, sample_mean(cells, "vela.transcript", 0), 4,
                   sqrt(4 * cases[i].fano), cells->n_cells);
        /* Excess kurtosis of the stationary law without a lag, 3.3; smoothing lowers it. */
        check_sd(cases[i].lag, sample_sd(cells, "vela.transcript", 0), sqrt(4 * cases[i].fano), 3.3,
                 cells->n_cells);
        sample_free(cells);
    }
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"in transit", test_in_transit},
        {"lag and decay", test_lag_and_decay},
        {"Erlang and chain", test_erlang_is_a_chain},
        {"a lag shortened", test_lag_shortened_by_a_step},
        {"two lags in a row", test_two_lags_in_a_row},
        {"random lags smooth", test_random_lags_smooth},
    };
    return run_tests("lags", tests, sizeof tests / sizeof *tests);
}
