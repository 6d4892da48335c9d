/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Stages that lose molecules on the way, fed by a Poisson process: each molecule's fate is
 * independent of the others', so that what is in the stage, what came out and what was lost are
 * Poisson (common practice: marks on a Poisson process; Kingman 1993, Poisson Processes). Means are
 * worked out by hand for a fixed dwell and by GSL's quadrature for a gamma one. */

#include "sample.h"
#include "support.h"

#include <gsl/gsl_cdf.h>
#include <gsl/gsl_integration.h>
#include <gsl/gsl_randist.h>
#include <math.h>

enum { CELLS = 40000, MOST = 200 };
static const double rate = 4, loss = 0.3, tau = 3;
static const double shape = 2.25, scale = 3 / 2.25; /* gamma with mean 3 and sd 2 */

static void check_poisson(const char *what, const sample_cells *cells, const char *name,
                          size_t snapshot, double mean) {
    static double law[MOST];
    for (unsigned n = 0; n < MOST; n++)
        law[n] = gsl_ran_poisson_pdf(n, mean);
    check_counts(what, sample_values(cells, name, snapshot), cells->n_cells, law, MOST);
    check_mean_and_sd(what, cells, name, snapshot, mean, sqrt(mean), 1 / mean);
}

static double integral(double (*f)(double, void *), void *context, double from, double to) {
    gsl_integration_workspace *workspace = gsl_integration_workspace_alloc(200);
    ck_assert_ptr_nonnull(workspace);
    gsl_function function = {f, context};
    double value, error;
    ck_assert_int_eq(
        gsl_integration_qags(&function, from, to, 1e-10, 1e-9, 200, workspace, &value, &error), 0);
    gsl_integration_workspace_free(workspace);
    return value;
}

/* ---- a fixed dwell ---- */

START_TEST(test_fixed) {
    static const char text[] =
        "tarry: 1\ntime: min\ngenes:\n  vela:\n    promoter: {on: {initiates: 4}}\n"
        "    transcript: {stages: {nuclear: {lasts: 3, lost: 0.3}}, decay: 0.5}\n"
        "run: {until: 30, every: 30, snapshots: [2, 5, 30]}\n";
    static const double times[] = {2, 5, 30};
    sample_cells *cells = sample_new(text, CELLS);
    for (size_t i = 0; i < 3; i++) {
        const double t = times[i], out = fmax(t - tau, 0);
        check_poisson("fixed: in the stage", cells, "vela.nuclear", i,
                      rate * (1 - exp(-loss * fmin(t, tau))) / loss);
        if (out > 0)
            check_poisson("fixed: out of it", cells, "vela.transcript", i,
                          rate * exp(-loss * tau) * (1 - exp(-0.5 * out)) / 0.5);
    }
    sample_free(cells);
}
END_TEST

/* ---- a gamma dwell ---- */

static double survives(double x, void *context) {
    (void)context;
    return gsl_cdf_gamma_Q(x, shape, scale) * exp(-loss * x);
}

/* Those that began t - x before and are out, integrated by parts: each comes at age x. */
static double comes_out(double x, void *t) {
    return gsl_ran_gamma_pdf(x, shape, scale) * exp(-loss * x) * (*(double *)t - x);
}

START_TEST(test_gamma) {
    static const char text[] =
        "tarry: 1\ntime: min\ngenes:\n  vela:\n    promoter: {on: {initiates: 4}}\n"
        "    transcript: {stages: {nuclear: {lasts: {gamma: {mean: 3, sd: 2}}, lost: 0.3}}}\n"
        "run: {until: 12, every: 12, snapshots: [2, 5, 12]}\n";
    static const double times[] = {2, 5, 12};
    sample_cells *cells = sample_new(text, CELLS);
    for (size_t i = 0; i < 3; i++) {
        double t = times[i];
        check_poisson("gamma: in the stage", cells, "vela.nuclear", i,
                      rate * integral(survives, NULL, 0, t));
        check_poisson("gamma: out of it", cells, "vela.transcript", i,
                      rate * integral(comes_out, &t, 0, t));
    }
    sample_free(cells);
}
END_TEST

/* ---- what is seen and told of them ---- */

/* A molecule of age x shines x / tau for as long as it is there: cumulants by Campbell's theorem.
 */
static double shines(double x, void *power) {
    return pow(x / tau, *(int *)power) * exp(-loss * x);
}

START_TEST(test_ramp) {
    static const char text[] =
        "tarry: 1\ntime: min\ngenes:\n  vela:\n    promoter: {on: {initiates: 4}}\n"
        "    transcript: {stages: {nuclear: {lasts: 3, lost: 0.3}}, decay: 0.5}\n"
        "signals: {light: {of: vela.nuclear, ramp: {from: 0, to: 1}}}\n"
        "run: {until: 10, every: 10}\n";
    double cumulants[5];
    for (int power = 1; power <= 4; power++)
        cumulants[power] = rate * integral(shines, &power, 0, tau);
    sample_cells *cells = sample_new(text, CELLS);
    check_mean_and_sd("light", cells, "light", 0, cumulants[1], sqrt(cumulants[2]),
                      cumulants[4] / (cumulants[2] * cumulants[2]));
    sample_free(cells);
}
END_TEST

static double transit(const tarry_results *results, const char *column) {
    const tarry_table *table = tarry_results_table(results, TARRY_TABLE_transit);
    ck_assert_uint_eq(tarry_table_n_rows(table), 1);
    return tarry_table_number(table, 0, tarry_table_column(table, column));
}

START_TEST(test_transit) {
    tarry_model *model = NULL;
    tarry_results *results = run_results(
        "tarry: 1\ntime: min\ngenes:\n  vela:\n    promoter: {on: {initiates: 4}}\n"
        "    transcript: {stages: {nuclear: {lasts: 3, lost: 0.3}}, decay: 0.5}\n"
        "run: {cells: 1000, settle: 10, until: 50, every: 1}\n",
        &model);
    const double begun = rate * 50 * 1000, lost = begun * (1 - exp(-loss * tau));
    check_z("begun", (transit(results, "drawn") - begun) / sqrt(begun));
    check_z("lost", (transit(results, "lost") - lost) / sqrt(lost));
    ck_assert_double_eq_tol(transit(results, "mean_drawn"), tau, 1e-12);
    /* Poisson at each time, with a memory of tau at most: 1000 * 50 / (2 tau) samples at least. */
    const double pending = rate * (1 - exp(-loss * tau)) / loss;
    check_z("under way",
            (transit(results, "mean_pending") - pending) / sqrt(pending * 2 * tau / (1000 * 50)));
    tarry_results_free(results);
    tarry_model_free(model);
}
END_TEST

/* A step that changes the rate: those that entered before keep what they were drawn. */
START_TEST(test_step) {
    static const char text[] =
        "tarry: 1\ntime: min\nparameters: {r: 0}\ngenes:\n  vela:\n"
        "    promoter: {on: {initiates: 4}}\n"
        "    transcript: {stages: {nuclear: {lasts: 3, lost: r}}, decay: 0.5}\n"
        "protocol: [{at: 0, set: {r: 0.3}}, {at: 10, set: {r: 0}}]\n"
        "run: {settle: 10, until: 12, every: 12, snapshots: [2, 9, 11]}\n";
    sample_cells *cells = sample_new(text, CELLS);
    check_poisson("before and after", cells, "vela.nuclear", 0,
                  rate * (1 + (1 - exp(-loss * 2)) / loss));
    check_poisson("after", cells, "vela.nuclear", 1, rate * (1 - exp(-loss * tau)) / loss);
    check_poisson("losses end", cells, "vela.nuclear", 2,
                  rate * (1 + (exp(-loss) - exp(-loss * tau)) / loss));
    sample_free(cells);
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"fixed dwell", test_fixed},  {"gamma dwell", test_gamma}, {"ramp", test_ramp},
        {"in transit", test_transit}, {"step", test_step},
    };
    return run_tests("losses", tests, sizeof tests / sizeof *tests);
}
