/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Allocations that fail once each, over many models. Where memory runs out for real a block of an
 * arena ends, at one allocation in a hundred; here it ends at every one, and so does the heap. The
 * models are the examples, models made at random, which say every key between them, and those that
 * tests/cli has refused: what happens is then the usual refusal, or that memory is short. A stride
 * leaves out what would take long; it begins elsewhere in each model. To be run in the folder that
 * holds tests. */

#include "base/file.h"
#include "base/text.h"
#include "faults.h"
#include "model/model.h"
#include "random_model.h"
#include "support.h"
#include "tarry/tarry.h"

#include <glob.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

/* What a fault strikes: reads the text, or, where `more` is given, only what that makes of the
 * model. */
typedef struct subject {
    const char *name; /* of the file */
    const char *text;
    fault kind;
    int (*more)(const tarry_model *model, tarry_error *error);
} subject;

static int check_it(const tarry_model *model, tarry_error *error) {
    char *report = NULL;
    const int code = tarry_check(model, &report, error);
    free(report);
    return code;
}

static int run_it(const tarry_model *model, tarry_error *error) {
    const tarry_run_options options = {.threads = 1};
    tarry_results *results = NULL;
    const int code = tarry_run(model, &options, &results, error);
    tarry_results_free(results);
    return code;
}

static int try(const subject *it, long n, tarry_error *error) {
    tarry_model *model = NULL;
    if (!it->more)
        faults_arm(it->kind, n, 0);
    int code = tarry_model_read_text(it->text, strlen(it->text), it->name, NULL, 0, &model, error);
    if (!code && it->more) {
        faults_arm(it->kind, n, 0);
        code = it->more(model, error);
    }
    faults_clear();
    tarry_model_free(model);
    return code;
}

/* Fail allocations first, first + step ...; returns how many there are. */
static long fail_each(const subject *it, long first, long step) {
    tarry_error usual = {0};
    const int usual_code = try(it, -1, &usual);
    if (it->more && usual_code == TARRY_INPUT)
        return 0;
    for (long n = first;; n += step) {
        tarry_error error = {0};
        const int code = try(it, n, &error);
        if (!faults_struck()) {
            ASSERT_FAST(code == usual_code, "%s: %s", it->name, error.message);
            return n;
        }
        ASSERT_FAST(code == TARRY_MEMORY ? strstr(error.message, "memory") != NULL
                                         : code != 0 && code == usual_code &&
                                               strcmp(error.message, usual.message) == 0,
                    "%s, allocation %ld: code %d: %s", it->name, n, code, error.message);
    }
}

static long fail_all(const char *name, const char *text, long stride, size_t number) {
    const fault kinds[] = {FAULT_ARENA, FAULT_MEMORY};
    const long step = test_small() ? 7 * stride : stride;
    const long first = (long)number % step;
    long n = 0;
    for (int i = 0; i < 2; i++) {
        const subject reading = {name, text, kinds[i], NULL};
        const subject checking = {name, text, kinds[i], check_it};
        n += fail_each(&reading, first, step) + fail_each(&checking, first, step);
    }
    return n;
}

/* The texts of all files of a pattern; a case's model is what stands in it after its title. */
static long fail_files(const char *pattern, const char *title, size_t n_least, long stride) {
    glob_t found;
    size_t n_files = 0;
    long n = 0;
    ck_assert_int_eq(glob(pattern, 0, NULL, &found), 0);
    for (size_t i = 0; i < found.gl_pathc; i++) {
        tarry_text text = {0};
        tarry_error error = {0};
        ck_assert_msg(!tarry_file_read(found.gl_pathv[i], 1 << 20, &text, &error), "%s",
                      error.message);
        char *model = title ? strstr(text.data, title) : text.data;
        char *end = title && model ? strstr(model + strlen(title), "\n--- ") : NULL;
        if (end)
            end[1] = '\0';
        if (model) {
            n += fail_all(found.gl_pathv[i], title ? model + strlen(title) : model, stride, i);
            n_files++;
        }
        tarry_text_release(&text);
    }
    globfree(&found);
    ck_assert_uint_ge(n_files, n_least);
    return n;
}

START_TEST(examples) {
    ck_assert_int_gt(fail_files("models/*.yaml", NULL, 8, 20), 1000);
    ck_assert_int_gt(fail_files("tests/unit/kept/*.yaml", NULL, 5, 5), 500);
}
END_TEST

START_TEST(refused) {
    ck_assert_int_gt(fail_files("tests/cli/*.case", "--- model.yaml\n", 60, 3), 5000);
}
END_TEST

START_TEST(made_at_random) {
    long n = 0;
    for (uint64_t i = 1; i <= 60; i++) {
        char *text = random_model(i);
        n += fail_all("random.yaml", text, 4, i);
        free(text);
    }
    ck_assert_int_gt(n, 5000);
}
END_TEST

/* Cells that are unlike each other have parameters, starts, lags and tables of their own. */
START_TEST(running) {
    static const char text[] =
        "tarry: 1\n"
        "time: min\n"
        "parameters:\n"
        "  k: {value: 2, varies: {lognormal: {cv: 0.3}}}\n"
        "  lag: {value: 3, varies: {gamma: {cv: 0.2}}}\n"
        "genes:\n"
        "  vela:\n"
        "    start: steady\n"
        "    promoter: {shut: {to: {open: k}}, open: {to: {shut: 1}, initiates: 20}}\n"
        "    transcript: {stages: {nascent: lag, held: {exponential: {mean: lag}}}, decay: k}\n"
        "species: {a: 0}\n"
        "reactions: {one: {rate: k, later: [{after: {gamma: {mean: lag, sd: 1}}, makes: {a: "
        "1}}]}}\n"
        "protocol: [{at: 5, set: {lag: 6}}]\n"
        "run: {cells: 2, until: 10, every: 1}\n";
    const subject run = {"m.yaml", text, FAULT_MEMORY, run_it};
    ck_assert_int_gt(fail_each(&run, 0, test_small() ? 7 : 3), 100);
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"examples", examples},
        {"refused", refused},
        {"made at random", made_at_random},
        {"running", running},
    };
    tarry_start();
    return run_tests("short memory", tests, sizeof tests / sizeof *tests);
}
