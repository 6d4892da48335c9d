/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Reading `varies`, and the network of one cell. Values by hand. */

#include "support.h"

#include "model/model.h"
#include "model/variation.h"
#include "tarry/tarry.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

/* ---- models ---------------------------------------------------------------------------------- */

static const char body[] =
    "genes: {vela: {start: steady, promoter: {shut: {to: {open: a}}, open: {to: {shut: 1}, "
    "initiates: k}}, transcript: {stages: {n: {fixed: lag}}, decay: 0.5}}}\n"
    "run: {until: 10, every: 1, settle: 5}\n";

static int read_model(const char *parameters, const char *rest, tarry_model **model,
                      tarry_error *error) {
    char text[4096];
    snprintf(text, sizeof text, "tarry: 1\ntime: min\n%s%s", parameters, rest);
    tarry_start();
    return tarry_model_read_text(text, strlen(text), "m.yaml", NULL, 0, model, error);
}

static tarry_model *good(const char *parameters, const char *rest) {
    tarry_model *model = NULL;
    tarry_error error = {0};
    const int code = read_model(parameters, rest, &model, &error);
    ck_assert_msg(code == 0, "%d:%d: %s", error.line, error.column, error.message);
    return model;
}

static void refused(const char *parameters, const char *rest, int line, int column,
                    const char *words) {
    tarry_model *model = NULL;
    tarry_error error = {0};
    ck_assert_int_eq(read_model(parameters, rest, &model, &error), TARRY_INPUT);
    ck_assert_msg(strstr(error.message, words) != NULL, "%s", error.message);
    ck_assert_msg(error.line == line && error.column == column, "%d:%d: %s", error.line,
                  error.column, error.message);
}

/* ---- laws ------------------------------------------------------------------------------------ */

START_TEST(laws_have_mean_1_and_the_cv) {
    static const struct {
        const char *law;
        double cv;
    } laws[] = {{"gamma: {cv: 0.5}", 0.5},
                {"lognormal: {cv: 1.5}", 1.5},
                {"uniform: {cv: 0.3}", 0.3},
                {"weibull: {cv: 0.4}", 0.4},
                {"weibull: {cv: 2.5}", 2.5},
                {"erlang: {cv: 0.5}", 0.5},
                {"exponential: {cv: 1}", 1},
                {"exponential: {mean: 7}", 1},
                {"gamma: {mean: 4 min, sd: 1 min}", 0.25},
                {"table: {values: [1, 3], weights: [1, 1]}", 0.5},
                {"uniform: {from: 1, to: 3}", 0.28867513459481287},
                {"total: [1, {exponential: {mean: 1}}]", 0.5}};
    for (size_t i = 0; i < sizeof laws / sizeof *laws; i++) {
        char parameters[256];
        snprintf(parameters, sizeof parameters,
                 "parameters: {k: {value: 6, varies: {%s}}, a: 1, lag: 2}\n", laws[i].law);
        tarry_model *model = good(parameters, body);
        const tarry_variation *variation = model->network.variation;
        ck_assert_ptr_nonnull(variation);
        ck_assert_uint_eq(variation->n, 1);
        ck_assert_uint_eq(variation->varied[0].parameter, 0);
        ck_assert_double_eq_tol(tarry_law_mean(&variation->varied[0].law), 1, 1e-12);
        ck_assert_double_eq_tol(tarry_law_sd(&variation->varied[0].law), laws[i].cv, 1e-9);
        tarry_model_free(model);
    }
    tarry_model *model = good("parameters: {k: 6, a: 1, lag: 2}\n", body);
    ck_assert_ptr_null(model->network.variation);
    tarry_model_free(model);
    /* cut off at 0 the mean stays 1 */
    model = good("parameters: {k: {value: 6, varies: {normal: {cv: 0.5}}}, a: 1, lag: 2}\n", body);
    ck_assert_double_eq_tol(tarry_law_mean(&model->network.variation->varied[0].law), 1, 1e-12);
    tarry_model_free(model);
}
END_TEST

START_TEST(wrong_laws) {
    static const struct {
        const char *law;
        int column;
        const char *words;
    } cases[] = {
        {"gamma: {cv: 0}", 49, "'cv' must be above 0, not 0"},
        {"uniform: {cv: 0.6}", 51, "has a cv of 0.577"},
        {"erlang: {cv: 0.6}", 50, "use gamma for any other"},
        {"exponential: {cv: 2}", 55, "an exponential factor has cv 1, not 2"},
        {"fixed: 3", 36, "this factor is the same in all cells"},
        {"table: {cv: 3}", 49, "has no 'cv' to choose"},
        {"gamma: {cv: 0.3, mean: 2}", 45, "gamma has no key 'cv'"},
        {"normal: {cv: 3}", 36, "below 0"},
    };
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        char parameters[256];
        snprintf(parameters, sizeof parameters,
                 "parameters: {k: {value: 6, varies: {%s}}, a: 1, lag: 2}\n", cases[i].law);
        refused(parameters, body, 3, cases[i].column, cases[i].words);
    }
    refused("parameters: {k: {varies: {gamma: {cv: 0.3}}}, a: 1, lag: 2}\n", body, 3, 17,
            "k needs 'value'");
    refused("parameters: {k: {value: 6, varies: 0.3}, a: 1, lag: 2}\n", body, 3, 36,
            "'varies' takes one law");
}
END_TEST

/* ---- where it cannot be ---------------------------------------------------------------------- */

START_TEST(what_all_cells_share) {
    static const char head[] =
        "parameters: {k: {value: 6, varies: {gamma: {cv: 0.3}}}, j: 2 * k, a: 1, lag: "
        "2}\n";
    static const char genes[] =
        "genes: {vela: {promoter: {on: {initiates: k}}, transcript: {stages: {n: 1}, decay: 1}}}\n";
    static const char run[] = "run: {until: 10, every: 1}\n";
    char rest[1024];
    snprintf(rest, sizeof rest, "%ssignals: {spot: {of: vela.n, brightness: j}}\n%s", genes, run);
    refused(head, rest, 5, 42, "'j', would differ from cell to cell, since 'k' varies");
    snprintf(rest, sizeof rest, "%srun: {until: 2 * k}\n", genes);
    refused(head, rest, 5, 14, "since 'k' varies");
    snprintf(rest, sizeof rest, "%sspecies: {x: j}\n%s", genes, run);
    refused(head, rest, 5, 14, "since 'k' varies");
    snprintf(rest, sizeof rest, "%sprotocol: [{at: 1, set: {a: 2 * k}}]\n%s", genes, run);
    refused(head, rest, 5, 29, "since 'k' varies");
    snprintf(rest, sizeof rest, "%sprotocol: [{from: 1, to: 2, ramp: {j: 3}, steps: 4}]\n%s", genes,
             run);
    refused(head, rest, 5, 36, "a ramp would begin elsewhere in each");
    snprintf(rest, sizeof rest, "%sprotocol: [{at: 1, set: {k: 2 * k}}]\n%s", genes, run);
    tarry_model_free(good(head, rest));
}
END_TEST

/* ---- one cell -------------------------------------------------------------------------------- */

START_TEST(the_network_of_a_cell) {
    tarry_model *model = good(
        "parameters:\n  a: {value: 0.5, varies: {gamma: {cv: 0.5}}}\n  k: 3 * a\n"
        "  lag: {value: 2, varies: {uniform: {cv: 0.1}}}\n",
        "genes: {vela: {start: steady, promoter: {shut: {to: {open: a}}, open: {to: {shut: 1}, "
        "initiates: "
        "k}}, transcript: {stages: {n: {fixed: 2 * lag}}, decay: 0.5}}}\n"
        "protocol: [{at: 4, set: {a: 2}}, {at: 5, set: {k: 7}}]\nrun: {until: 10, every: 1, "
        "settle: 5}\n");
    const tarry_network *network = &model->network;
    tarry_cell_network cell;
    tarry_error error = {0};
    ck_assert_int_eq(tarry_cell_network_init(&cell, network, &error), 0);
    for (int round = 0; round < 2; round++) { /* a second cell forgets the first */
        cell.factors[0] = round == 0 ? 3 : 0.5;
        cell.factors[1] = round == 0 ? 0.5 : 1;
        ck_assert_int_eq(tarry_cell_network_set(&cell, 3, &error), 0);
        const double a = 0.5 * cell.factors[0], later = 2 * cell.factors[0];
        const tarry_segment *s = cell.network.segments;
        ck_assert_double_eq(s[0].parameters[0], a);
        ck_assert_double_eq(s[0].parameters[1], 3 * a);
        ck_assert_double_eq(s[1].parameters[0], later);
        ck_assert_double_eq(s[1].parameters[1], 3 * later);
        ck_assert_double_eq(s[2].parameters[0], later);
        ck_assert_double_eq(s[2].parameters[1], 7);
        ck_assert_double_eq(s[0].laws[network->lags[0].delay].a, 4 * cell.factors[1]);
        ck_assert_double_eq_tol(cell.network.promoters[0].start[0], 1 / (1 + a), 1e-15);
        ck_assert_double_eq(cell.network.promoters[0].start[1], 1);
    }
    ck_assert_double_eq(network->segments[0].parameters[0], 0.5);
    tarry_cell_network_release(&cell);
    tarry_model_free(model);
}
END_TEST

START_TEST(a_cell_that_cannot_be) {
    tarry_model *model = good(
        "parameters: {k: 6, a: 1, x: {value: 1, varies: {exponential: {cv: 1}}}, lag: 2 - "
        "x}\n",
        body);
    tarry_cell_network cell;
    tarry_error error = {0};
    ck_assert_int_eq(tarry_cell_network_init(&cell, &model->network, &error), 0);
    cell.factors[0] = 2.5;
    ck_assert_int_eq(tarry_cell_network_set(&cell, 41, &error), TARRY_RUN);
    ck_assert_msg(strstr(error.message,
                         "cell 41 (x = 2.5): a fixed delay needs a length of 0 or more, "
                         "not -0.5") != NULL,
                  "%s", error.message);
    ck_assert_int_gt(error.line, 0);
    cell.factors[0] = 1.5;
    ck_assert_int_eq(tarry_cell_network_set(&cell, 42, &error), 0);
    tarry_cell_network_release(&cell);
    const tarry_run_options options = {.threads = 2};
    tarry_results *results = NULL;
    ck_assert_int_eq(tarry_run(model, &options, &results, &error), TARRY_RUN);
    ck_assert_ptr_nonnull(strstr(error.message, "(x = "));
    tarry_model_free(model);
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"laws have mean 1 and the cv", laws_have_mean_1_and_the_cv},
        {"wrong laws", wrong_laws},
        {"what all cells share", what_all_cells_share},
        {"the network of a cell", the_network_of_a_cell},
        {"a cell that cannot be", a_cell_that_cannot_be},
    };
    return run_tests("varied", tests, sizeof tests / sizeof *tests);
}
