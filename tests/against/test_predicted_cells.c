/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Averages over cells whose parameters differ: their points against GSL's, and what they give
 * against a law in closed form. */

#include "support.h"

#include "exact/quadrature.h"
#include "tarry/tarry.h"

#include <gsl/gsl_integration.h>
#include <gsl/gsl_randist.h>
#include <math.h>
#include <string.h>

/* A gamma law of shape a and mean 1: Gauss-Laguerre points with weight x^(a - 1) exp(-x), over a.
 */
START_TEST(points_of_a_gamma_law) {
    const double shape = 1 / (0.4 * 0.4);
    const tarry_law law = {.kind = TARRY_LAW_GAMMA, .a = 1, .b = 0.4};
    tarry_quadrature q;
    tarry_error error = {0};
    for (size_t n = 1; n <= 16; n += 5) {
        gsl_integration_fixed_workspace *w = gsl_integration_fixed_alloc(
            gsl_integration_fixed_laguerre, n, 0, 1, shape - 1, 0);
        ck_assert_int_eq(tarry_quadrature_find(&law, n, &q, &error), 0);
        ck_assert_uint_eq(q.n, n);
        for (size_t i = 0; i < n; i++) {
            const double at = gsl_integration_fixed_nodes(w)[i] / shape;
            const double weight = gsl_integration_fixed_weights(w)[i] / tgamma(shape);
            ck_assert_double_eq_tol(q.at[i], at, 1e-7);
            ck_assert_double_eq_tol(q.weight[i], weight, 1e-9);
        }
        gsl_integration_fixed_free(w);
    }
}
END_TEST

/* Initiations at a rate that differs by a gamma law, each transcript there for a while: counts are
 * Poisson in a cell and negative binomial over all (common practice). */
START_TEST(poisson_cells_make_a_negative_binomial) {
    static const char text[] =
        "tarry: 1\ntime: min\nparameters: {k: {value: 6, varies: {gamma: {cv: 0.5}}}}\n"
        "genes: {vela: {promoter: {on: {initiates: k}}, transcript: {stages: {n: {gamma: {mean: 2, "
        "sd: 1}}}, decay: 0.5}}}\nrun: {cells: 2, settle: 100, until: 1, every: 1, snapshots: "
        "[1]}\n";
    tarry_model *model = NULL;
    tarry_results *exact = NULL;
    tarry_error error = {0};
    char what[1024];
    size_t n_compared = 0;
    tarry_start();
    int code = tarry_model_read_text(text, strlen(text), "m.yaml", NULL, 0, &model, &error);
    if (code == 0)
        code = tarry_predict(model, &exact, &error);
    ck_assert_msg(code == 0, "%s", tarry_error_text(&error, what, sizeof what));
    const tarry_table *table = tarry_results_table(exact, TARRY_TABLE_distribution);
    for (size_t row = 0; row < tarry_table_n_rows(table); row++) {
        const char *name = tarry_table_text(table, row, 0);
        const double start = tarry_table_number(table, row, tarry_table_column(table, "count"));
        const double width = tarry_table_number(table, row, tarry_table_column(table, "width"));
        const double p = tarry_table_number(table, row, tarry_table_column(table, "probability"));
        double expected = 0;
        if (strcmp(name, "vela.transcript") != 0)
            continue;
        for (unsigned k = 0; k < width; k++)
            expected += gsl_ran_negative_binomial_pdf((unsigned)start + k, 1 / (1 + 12 / 4.0), 4);
        if (expected < 1e-7)
            continue;
        n_compared++;
        ck_assert_msg(fabs(p - expected) < 1e-6 * expected, "P(%g) is %.12g, not %.12g", start, p,
                      expected);
    }
    ck_assert_uint_ge(n_compared, 30);
    tarry_results_free(exact);
    tarry_model_free(model);
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"points of a gamma law", points_of_a_gamma_law},
        {"Poisson cells make a negative binomial", poisson_cells_make_a_negative_binomial},
    };
    return run_tests("predicted cells", tests, sizeof tests / sizeof *tests);
}
