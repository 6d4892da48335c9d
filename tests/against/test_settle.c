/* SPDX-License-Identifier: GPL-3.0-or-later */

/* `settle: auto`: the time after which each mean is within 0.1 % of its steady value, against the
 * closed forms of the means of linear systems started without molecules, whose roots GSL finds. */

#include "model/model.h"
#include "support.h"

#include <gsl/gsl_errno.h>
#include <gsl/gsl_roots.h>
#include <math.h>
#include <stdio.h>
#include <string.h>

static double settle_of(const char *genes) {
    char text[2048];
    tarry_model *model = NULL;
    tarry_error error = {0};
    snprintf(text, sizeof text, "tarry: 1\ntime: min\ngenes:\n%srun: {until: 7, settle: auto}\n",
             genes);
    const int code = tarry_model_read_text(text, strlen(text), "m.yaml", NULL, 0, &model, &error);
    ck_assert_msg(code == 0, "%s", error.message);
    const double settle = model->network.run.settle;
    ck_assert(model->network.run.settle_auto);
    ck_assert(model->network.segments[0].start == -settle);
    tarry_model_free(model);
    return settle;
}

/* Not before the exact time; after it by 1 % of the search and one unit in the third digit. */
static void check_time(const char *what, double settle, double exact) {
    ck_assert_msg(settle >= exact * (1 - 1e-9) && settle <= exact * 1.0201, "%s: %g, exact %g",
                  what, settle, exact);
}

/* Rates of a chain of exponential stages: a, then b. */
typedef struct chain {
    double a, b;
} chain;

/* 1 - mean / steady mean of what comes after two exponential stages (rates a and b, the last one
 * being the molecule's own decay): the survival of their sum (Ross 2014, Introduction to
 * Probability Models, 11th ed., section 5.2.4, from memory), less the tolerance. */
static double two_stages(double t, void *context) {
    const chain *c = context;
    return (c->b * exp(-c->a * t) - c->a * exp(-c->b * t)) / (c->b - c->a) - 0.001;
}

static double root_of(double (*function)(double, void *), void *context) {
    gsl_root_fsolver *solver = gsl_root_fsolver_alloc(gsl_root_fsolver_brent);
    gsl_function f = {function, context};
    ck_assert_ptr_nonnull(solver);
    ck_assert_int_eq(gsl_root_fsolver_set(solver, &f, 1e-3, 1e6), GSL_SUCCESS);
    for (int i = 0; i < 200; i++)
        ck_assert_int_eq(gsl_root_fsolver_iterate(solver), GSL_SUCCESS);
    const double root = gsl_root_fsolver_root(solver);
    gsl_root_fsolver_free(solver);
    return root;
}

/* Mean nu / d (1 - exp(-d t)), and with a promoter that starts steady p times that. */
START_TEST(test_decay) {
    check_time("always on",
               settle_of("  vela: {promoter: {open: {initiates: 6}}, transcript: {decay: 0.05}}\n"),
               log(1000) / 0.05);
    check_time("steady start",
               settle_of("  vela: {start: steady, copies: 2, promoter: {shut: {to: {open: 0.04}}, "
                         "open: {to: {shut: 0.35}, initiates: 6}}, transcript: {half_life: 30}}\n"),
               log(1000) * 30 / log(2));
}
END_TEST

/* Two states, started shut: the share that is open comes up with rate s = k_open + k_shut, so a
 * transcript's mean lacks what two stages s and d lack. */
START_TEST(test_two_states) {
    chain rates = {.a = 0.06, .b = 0.05};
    check_time("started shut",
               settle_of("  vela: {promoter: {shut: {to: {open: 0.02}}, open: {to: {shut: 0.04}, "
                         "initiates: 6}}, transcript: {decay: 0.05}}\n"),
               root_of(two_stages, &rates));
}
END_TEST

/* Proteins of transcripts, after a fixed stage: the mean is that of two stages, so much later. The
 * slowest of several genes counts. */
START_TEST(test_protein) {
    chain rates = {.a = 0.2, .b = 0.01};
    check_time("protein",
               settle_of("  vela: {promoter: {open: {initiates: 6}}, transcript: {decay: 0.2}, "
                         "protein: {translation: 3, stages: {folding: 60 min}, decay: 0.01}}\n"
                         "  lyra: {promoter: {open: {initiates: 6}}, transcript: {decay: 0.1}}\n"),
               60 + root_of(two_stages, &rates));
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"decay", test_decay}, {"two_states", test_two_states}, {"protein", test_protein}};
    return run_tests("settle", tests, sizeof tests / sizeof *tests);
}
