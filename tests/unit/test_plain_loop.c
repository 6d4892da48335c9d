/* SPDX-License-Identifier: GPL-3.0-or-later */

/* The engine against the plain loop of plain_loop.c, byte by byte over whole records: on the
 * example models, on models made at random and on those that showed a fault once (tests/unit/kept).
 * To be run in the folder that holds models and tests. */
#include "model/model.h"
#include "random_cells.h"
#include "random_model.h"
#include "results_text.h"
#include "same_cells.h"
#include "support.h"
#include "tarry/tarry.h"

#include <glob.h>
#include <stdlib.h>
#include <string.h>

static void check_files(const char *pattern, int64_t n_cells, size_t least) {
    glob_t found;
    ck_assert_int_eq(glob(pattern, 0, NULL, &found), 0);
    ck_assert_uint_ge(found.gl_pathc, least);
    for (size_t i = 0; i < found.gl_pathc; i++) {
        tarry_model *model = NULL;
        tarry_error error;
        char where[SAME_CELLS_TEXT];
        if (tarry_model_read(found.gl_pathv[i], NULL, 0, &model, &error))
            ck_abort_msg("%s: %s", found.gl_pathv[i], error.message);
        const same_cells result = compare_cells(&model->network, n_cells, where);
        ck_assert_msg(result == CELLS_SAME, "%s: %s", found.gl_pathv[i], where);
        tarry_model_free(model);
    }
    globfree(&found);
}

START_TEST(example_models) {
    check_files("models/*.yaml", test_small() ? 1 : 2, 8);
}
END_TEST

START_TEST(models_that_showed_a_fault) {
    check_files("tests/unit/kept/*.yaml", 3, 5);
}
END_TEST

START_TEST(random_models) {
    check_random_models(0, test_small() ? 100 : 700);
}
END_TEST

/* More reactions than are summed in a row: the choice goes down a tree. */
START_TEST(many_reactions) {
    const char *text =
        "tarry: 1\ntime: min\n"
        "genes:\n"
        "  vela:\n"
        "    copies: 23\n"
        "    promoter:\n"
        "      shut: {to: {open: 0.3, primed: \"0.1 * hill(vela.transcript, 20, 2)\"}}\n"
        "      primed: {lasts: {erlang: {mean: 3, steps: 2}}, then: {open: 1}}\n"
        "      open: {to: {shut: 0.5}, initiates: 2}\n"
        "    transcript:\n"
        "      stages: {nascent: {uniform: {from: 1, to: 2}}}\n"
        "      half_life: 3\n"
        "run: {cells: 2, settle: 10, until: 40, every: 1, seed: 1}\n";
    char where[SAME_CELLS_TEXT];
    double n_firings = 0;
    ck_assert_msg(compare_text(text, 2, &n_firings, where) == CELLS_SAME, "%s", where);
    ck_assert(n_firings > 3000);
}
END_TEST

/* What the generator is there for: each of these words stands in one of the models at least. */
START_TEST(random_models_say_everything) {
    static const char *const words[] = {
        "copies",         "start: steady",  "start: s",       "start: {",      "bursts_in",
        "lasts:",         "then:",          "initiates",      "stages",        "half_life",
        "decay",          "lifetime",       "protein",        "fixed",         "exponential",
        "erlang",         "gamma",          "lognormal",      "normal",        "uniform",
        "weibull",        "edges",          "values",         "mix",           "total",
        "uses",           "makes",          "needs",          "later",         "chance",
        "if_short: skip", "if_short: stop", "geometric",      "from: 1",       "poisson",
        "propensity",     "bursts:",        "signals",        "ramp",          "sum:",
        "varies:",        "{cv: ",          "noise",          "background",    "brightness",
        "protocol",       "promoter: s",    "settle",         "snapshots",     "windows",
        "record",         "hill",           "repress",        "no_overtaking", "headway",
        "many: ",         "settle: auto",   "responds_above", "file: ",        "lags: ",
        "memory: ",       "every: 5",       "times: ",        "steps: ",       "ramp:\n      k",
        "clearance",      "lost: ",         "allele: ",       "from: [t0",     "share: 0.1",
        "initiates: yes", "detects: {",     "visible: ["};
    enum { N_WORDS = sizeof words / sizeof words[0] };
    int seen[N_WORDS] = {0};
    for (uint64_t i = 0; i < 300; i++) {
        char *text = random_model(i);
        ck_assert_ptr_nonnull(text);
        for (size_t j = 0; j < N_WORDS; j++)
            seen[j] += strstr(text, words[j]) != NULL;
        free(text);
    }
    for (size_t j = 0; j < N_WORDS; j++)
        ck_assert_msg(seen[j] > 0, "no random model says '%s'", words[j]);
}
END_TEST

static bool says_protein(const char *text, void *context) {
    (void)context;
    return strstr(text, "protein:") != NULL && strstr(text, "genes:") != NULL;
}

START_TEST(shrinking_keeps_what_shows_the_fault) {
    const char *text = "tarry: 1\ngenes:\n  a:\n    promoter:\n      s: {}\n    transcript:\n"
                       "      decay: 1\n    protein:\n      decay: 2\n  b:\n    promoter: x\n"
                       "run:\n  until: 3\n";
    char *small = shrink_model(text, says_protein, NULL);
    ck_assert_str_eq(small, "genes:\n  a:\n    protein:\n");
    free(small);
}
END_TEST

/* ---- threads ----------------------------------------------------------------------------------
 */

/* Runs the model with 1, 2 and 5 threads; false where it is refused or stops, alike for all. */
static bool check_threads(tarry_model *model, const char *what) {
    static const int threads[] = {1, 2, 5};
    char *first = NULL;
    for (size_t i = 0; i < 3; i++) {
        const tarry_run_options options = {.threads = threads[i], .keep = 2};
        tarry_results *results = NULL;
        tarry_error error;
        char *text = NULL;
        if (tarry_run(model, &options, &results, &error))
            text = strdup(error.message);
        else
            text = results_text(results);
        ck_assert_ptr_nonnull(text);
        ck_assert_msg(!first || strcmp(first, text) == 0, "%s: %d threads differ", what,
                      threads[i]);
        tarry_results_free(results);
        if (first)
            free(text);
        else
            first = text;
    }
    const bool ran = strstr(first, " firings, ") != NULL;
    free(first);
    return ran;
}

static const tarry_override few_cells[] = {{"--cells", 0, "cells", "6"}};

START_TEST(example_models_on_threads) {
    glob_t found;
    ck_assert_int_eq(glob("models/*.yaml", 0, NULL, &found), 0);
    for (size_t i = 0; i < found.gl_pathc; i++) {
        tarry_model *model = NULL;
        ck_assert_int_eq(tarry_model_read(found.gl_pathv[i], few_cells, 1, &model, NULL), 0);
        ck_assert_msg(check_threads(model, found.gl_pathv[i]), "%s does not run",
                      found.gl_pathv[i]);
        tarry_model_free(model);
    }
    ck_assert_uint_ge(found.gl_pathc, 8);
    globfree(&found);
}
END_TEST

START_TEST(random_models_on_threads) {
    const uint64_t n = test_small() ? 10 : 60;
    uint64_t n_run = 0;
    for (uint64_t i = 0; i < n; i++) {
        tarry_model *model = NULL;
        char *text = random_model(i);
        ck_assert_ptr_nonnull(text);
        if (tarry_model_read_text(text, strlen(text), "random.yaml", few_cells, 1, &model, NULL) ==
            0)
            n_run += check_threads(model, text);
        tarry_model_free(model);
        free(text);
    }
    ck_assert_uint_ge(n_run, n / 2);
}
END_TEST

int main(void) {
    tarry_start();
    const test_entry tests[] = {
        {"example models", example_models},
        {"models that showed a fault", models_that_showed_a_fault},
        {"random models", random_models},
        {"example models on threads", example_models_on_threads},
        {"random models on threads", random_models_on_threads},
        {"many reactions", many_reactions},
        {"random models say everything", random_models_say_everything},
        {"shrinking", shrinking_keeps_what_shows_the_fault},
    };
    return run_tests("engine and plain loop", tests, sizeof tests / sizeof tests[0]);
}
