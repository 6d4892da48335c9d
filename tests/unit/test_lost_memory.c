/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Memory that runs out, anywhere: each allocation of reading, checking, running and writing a model
 * fails once, alone and then with all that follow, those made inside libyaml, jansson, GSL and the
 * C library among them (own_memory.h says how). */

#define _GNU_SOURCE /* for own_memory.h */

#include "base/error.h"
#include "base/file.h"
#include "base/text.h"
#include "cli/talk.h"
#include "own_memory.h"
#include "support.h"
#include "tarry/tarry.h"
#include "whole_program.h"

#include <signal.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

/* ---- failing each in turn -------------------------------------------------------------------- */

/* What a fault strikes. It gives back all that it took, whatever came of it. */
typedef int (*attempt)(void *context, tarry_error *error);

/* Which allocation it was, told where one ends in a crash. */
static char place[160];
static int crash_file = STDERR_FILENO;

static void on_crash(int number) {
    const ssize_t ignored = write(crash_file, place, strlen(place));
    (void)ignored;
    signal(number, SIG_DFL);
    raise(number);
}

/* jansson says of some JSON that it is wrong when memory was short. The sentence is true then, too,
 * and nothing is overwritten. */
static bool is_right(int code, const tarry_error *error) {
    if (code == TARRY_INPUT && strstr(error->message, "cannot be read as that of a run"))
        return true;
    return code == TARRY_MEMORY && (int)error->code == code && strstr(error->message, "memory");
}

/* Fail the n-th allocation of the attempt for each n, alone or with all that follow. Each time an
 * error comes and says so, and no block stays out; at most n_met may be met without harm. Returns
 * how many allocations there are. */
static long fail_each(const char *what, long stride, attempt try, void (*before)(void *),
                      void *context, bool lasting, long n_met) {
    tarry_error error = {0};
    if (before)
        before(context);
    const int usual = try(context, &error); /* what is allocated once and kept comes now */
    ck_assert_msg(!usual, "%s: %s", what, error.message);
    const long step = test_small() ? 7 * stride : stride;
    signal(SIGSEGV, on_crash);
    signal(SIGABRT, on_crash);
    for (long n = 0;; n += step) {
        snprintf(place, sizeof place, "%s, allocation %ld%s\n", what, n, lasting ? " and on" : "");
        error = (tarry_error){0};
        if (before)
            before(context);
        const long out = own_memory_out();
        own_memory_arm(n, lasting);
        const int code = try(context, &error);
        const bool struck = own_memory_disarm();
        const long lost = own_memory_out() - out;
        ASSERT_FAST(lost == 0, "%s%ld blocks were not given back", place, lost);
        if (!struck) {
            ASSERT_FAST(!code, "%swithout a fault: %s", place, error.message);
            return n;
        }
        ASSERT_FAST(code ? is_right(code, &error) : n_met-- > 0, "%scode %d: %s", place, code,
                    error.message);
    }
}

static void fail_all(const char *what, attempt try, void *context, long least) {
    for (int lasting = 0; lasting < 1 + OWN_MEMORY; lasting++)
        ck_assert_int_gt(fail_each(what, 1, try, NULL, context, lasting, 0),
                         OWN_MEMORY ? least : 0);
}

/* ---- reading, checking, running, writing ----------------------------------------------------- */

/* Between them they have every part of the format that allocates on a way of its own. */
static const char *const models[] = {
    "tarry: 1\n"
    "title: All that a gene can have\n"
    "time: min\n"
    "parameters:\n"
    "  k_open: 0.4\n"
    "  length: 4.2 kb\n"
    "  speed: 1.8 kb/min\n"
    "delays:\n"
    "  elongation: {fixed: length / speed}\n"
    "  export: {exponential: {mean: 8 min}}\n"
    "  folding: {uniform: {from: 2 min, to: 8 min}}\n"
    "  measured: {table: {file: lags.csv}}\n"
    "  either: {mix: [{share: 0.3, lasts: export}, {share: 0.7, lasts: 3}]}\n"
    "  both: {total: [elongation, {uniform: {from: 1, to: 2}}]}\n"
    "genes:\n"
    "  vela:\n"
    "    copies: 2\n"
    "    start: steady\n"
    "    promoter:\n"
    "      shut: {to: {open: k_open}}\n"
    "      open: {to: {shut: 0.8 /min}, initiates: 0.1 /s}\n"
    "    transcript: {stages: {nascent: elongation, nuclear: {lasts: export, lost: 0.03}}, "
    "half_life: 5}\n"
    "    protein: {translation: 0.3, stages: {immature: folding}, half_life: 20}\n"
    "  lyra:\n"
    "    many: 2\n"
    "    clearance: 0.1\n"
    "    promoter:\n"
    "      shut: {lasts: both, then: {open: 1}}\n"
    "      open: {to: {shut: \"repress(lyra.transcript, 4, 2)\"}, initiates: 3}\n"
    "    transcript: {stages: {nascent: elongation, held: either, last: measured}, "
    "no_overtaking: true, headway: 0.1, lifetime: {exponential: {mean: 4}}}\n"
    "signals:\n"
    "  spot: {of: vela.nascent, allele: 1, ramp: {from: 0.1, to: 0.4}, noise: 0.3, "
    "responds_above: 5}\n"
    "  total: {sum: {vela.nuclear: 1, vela.transcript: 1}, background: 2, noise: 0.5}\n"
    "protocol:\n"
    "  - {at: 4 min, set: {k_open: 0.8}}\n"
    "  - {from: 6 min, to: 8 min, ramp: {k_open: 0.4}, steps: 3}\n"
    "run: {cells: 2, settle: auto, until: 12, every: 1, lags: 4, snapshots: [0, 3, 12], record: "
    "[vela, lyra_1, spot, total], windows: {before: [0, 4], after: [8, 12]}}\n",

    "tarry: 1\n"
    "time: s\n"
    "parameters: {pull: 2, push: pull * 3}\n"
    "species: {clasp: 14, pin: 9, pair: 0, mature: 0}\n"
    "reactions:\n"
    "  bind: {uses: {clasp: 1, pin: 1}, makes: {pair: 1}, rate: push / 10}\n"
    "  split: {uses: {pair: 1}, makes: {clasp: 1, pin: 1}, rate: 1.5}\n"
    "  start: {rate: 3, later: [{after: {exponential: {mean: 2}}, chance: 0.5, makes: {mature: "
    "1}}]}\n"
    "  shots: {makes: {mature: {geometric: {mean: 5}}}, rate: 0.1}\n"
    "  more: {makes: {mature: {table: {values: [0, 2], weights: [1, 1]}}}, rate: 0.1}\n"
    "  doom: {needs: {mature: 1}, rate: 0.5, later: [{after: 1, uses: {mature: 1}, if_short: "
    "skip}]}\n"
    "  odd: {uses: {clasp: 1}, propensity: 0.2 * clasp / (1 + clasp)}\n"
    "bursts: {times: {opens: [bind], closes: [split], counts: [start]}}\n"
    "limits: {firings: 100000, memory: 1 GB}\n"
    "run: {cells: 3, until: 8, every: 1}\n",

    /* Laws that are drawn from tables, which take long to make: two are enough. */
    "tarry: 1\n"
    "time: min\n"

    "species: {a: 0}\n"
    "reactions:\n"
    "  one: {rate: 1, later: [{after: {lognormal: {mean: 5, sd: 3}}, makes: {a: 1}}]}\n"
    "  two: {rate: 1, later: [{after: {total: [{erlang: {steps: 3, mean: 2}}, {exponential: "
    "{mean: 1}}]}, makes: {a: 1}}]}\n"
    "run: {cells: 1, until: 2, every: 1}\n",

    /* Something for every file, and no more: writing takes an allocation a figure. */
    "tarry: 1\n"
    "time: min\n"
    "parameters: {pace: 3}\n"
    "genes:\n"
    "  vela:\n"
    "    promoter: {shut: {to: {open: 1}}, open: {to: {shut: 1}, initiates: pace}}\n"
    "    transcript: {stages: {nascent: 0.5}, half_life: 5}\n"
    "signals: {spot: {of: vela.nascent, ramp: {from: 0, to: 0}, responds_above: 1}}\n"
    "protocol: [{at: 1, set: {vela.promoter: open}}]\n"
    "run: {cells: 2, until: 2, every: 1, record: [vela.nascent, spot], windows: {all: [0, 2]}}\n",
};

enum { N_MODELS = sizeof models / sizeof *models };

typedef struct source {
    const char *path;
    tarry_model *model;
    tarry_results *results;
    char folder[512];
    bool overwrite;     /* an earlier run in the same folder, rather than a new one */
    tarry_text summary; /* summary.json as first written */
} source;

static int read_it(void *context, tarry_error *error) {
    source *from = context;
    tarry_model *model = NULL;
    const int code = tarry_model_read(from->path, NULL, 0, &model, error);
    tarry_model_free(model);
    return code;
}

static int check_it(void *context, tarry_error *error) {
    const source *from = context;
    char *report = NULL;
    const int code = tarry_check(from->model, &report, error);
    free(report);
    return code;
}

static int run_it(void *context, tarry_error *error) {
    const source *from = context;
    const tarry_run_options options = {.threads = 1, .keep = 2};
    tarry_results *results = NULL;
    const int code = tarry_run(from->model, &options, &results, error);
    tarry_results_free(results);
    return code;
}

static int compare_it(void *context, tarry_error *error) {
    const source *from = context;
    const tarry_run_options options = {.threads = 1, .self_check = true};
    tarry_results *results = NULL;
    const int code = tarry_run(from->model, &options, &results, error);
    if (!code)
        ck_assert_uint_gt(tarry_results_self_check(results)->n_compared, 0);
    tarry_results_free(results);
    return code;
}

/* Where a fault did no harm, the results are those that come without it. */
static int compare_summary(source *from, tarry_error *error) {
    tarry_text now = {0};
    char path[600];
    snprintf(path, sizeof path, "%s/summary.json", from->folder);
    int code = tarry_file_read(path, 1 << 20, &now, error);
    if (!code && !from->summary.data)
        tarry_text_add(&from->summary, now.data, now.size);
    if (!code &&
        (now.size != from->summary.size || memcmp(now.data, from->summary.data, now.size) != 0))
        code = tarry_fail(error, TARRY_RUN, "summary.json is another");
    tarry_text_release(&now);
    return code;
}

static int n_folders; /* new folders used so far */

static int write_run(const source *from, tarry_error *error) {
    const tarry_provenance provenance = {.sampler = "direct", .threads = 1};
    return tarry_write_run(from->folder, from->overwrite, from->model, from->results, &provenance,
                           error);
}

/* A new folder where the last one has been used, or one with results. */
static void prepare(void *context) {
    source *from = context;
    tarry_error error = {0};
    if (from->overwrite)
        ck_assert_msg(!write_run(from, &error), "%s", error.message);
    else
        snprintf(from->folder, sizeof from->folder, "%s/out%d", test_folder(), n_folders);
}

static int write_it(void *context, tarry_error *error) {
    source *from = context;
    int code = write_run(from, error);
    n_folders += !code;
    if (!code)
        code = compare_summary(from, error);
    return code;
}

static int predict_it(void *context, tarry_error *error) {
    const source *from = context;
    tarry_results *results = NULL;
    const int code = tarry_predict(from->model, &results, error);
    tarry_results_free(results);
    return code;
}

static int tell_it(void *context, tarry_error *error) {
    const source *from = context;
    char *table = NULL;
    const int code = tarry_write_summary_table(from->model, from->results, 80, &table, error);
    free(table);
    return code;
}

static void put_file(const char *path, const char *text) {
    FILE *file = fopen(path, "w");
    ck_assert_ptr_nonnull(file);
    ck_assert_int_ne(fputs(text, file), EOF);
    ck_assert_int_eq(fclose(file), 0);
}

static const char *put_model(size_t which) {
    const char *path = test_path("model.yaml");
    put_file(test_path("lags.csv"), "from,to,weight\n0,1,2\n1,3 min,5\n");
    put_file(path, models[which]);
    tarry_start();
    return path;
}

static void set_up(source *from, size_t which) {
    tarry_error error = {0};
    from->path = put_model(which);
    snprintf(from->folder, sizeof from->folder, "%s/out", test_folder());
    ck_assert_msg(!tarry_model_read(from->path, NULL, 0, &from->model, &error), "%s",
                  error.message);
}

START_TEST(reading) {
    for (size_t i = 0; i < N_MODELS; i++) {
        source from = {.path = put_model(i)};
        fail_all("reading", read_it, &from, 200);
    }
}
END_TEST

START_TEST(checking) {
    for (size_t i = 0; i < N_MODELS; i++) {
        source from = {0};
        set_up(&from, i);
        fail_all("checking", check_it, &from, 100);
        tarry_model_free(from.model);
    }
}
END_TEST

/* Working one out takes long, so that a part of the allocations must do. */
static const struct {
    const char *text;
    long stride;
} predictable[] = {
    {"tarry: 1\n"
     "time: min\n"
     "genes:\n"
     "  vela:\n"
     "    start: steady\n"
     "    promoter: {shut: {to: {open: 1}}, open: {to: {shut: 1}, initiates: 1}}\n"
     "    transcript: {stages: {nascent: 0.5}, half_life: 0.2}\n"
     "signals: {spot: {of: vela.nascent, ramp: {from: 0, to: 1}}}\n"
     "run: {settle: 15, until: 1, every: 1, lags: 1, cells: 1}\n",
     8},
    {"tarry: 1\n"
     "time: min\n"
     "parameters: {k: 1}\n"
     "genes:\n"
     "  vela:\n"
     "    promoter: {shut: {lasts: {erlang: {steps: 2, mean: 3}}, then: {open: 1}}, open: {to: "
     "{shut: k}, initiates: 2}}\n"
     "    transcript: {stages: {nascent: 0.5}, half_life: 5}\n"
     "protocol: [{at: 1, set: {k: 2}}]\n"
     "run: {until: 2, every: 1, lags: 1, cells: 1}\n",
     300},
};

START_TEST(predicting) {
    for (size_t i = 0; i < sizeof predictable / sizeof *predictable; i++) {
        source from = {.path = test_path("model.yaml")};
        tarry_error error = {0};
        put_file(from.path, predictable[i].text);
        tarry_start();
        ck_assert_int_eq(tarry_model_read(from.path, NULL, 0, &from.model, &error), 0);
        for (int lasting = 0; lasting < 1 + OWN_MEMORY; lasting++)
            ck_assert_int_gt(
                fail_each("predicting", predictable[i].stride, predict_it, NULL, &from, lasting, 0),
                OWN_MEMORY ? 1000 : 0);
        tarry_model_free(from.model);
    }
}
END_TEST

/* A run that is compared with its laws. */
START_TEST(comparing) {
    source from = {.path = test_path("model.yaml")};
    const tarry_override cells = {"--cells", 0, "cells", "100"};
    tarry_error error = {0};
    put_file(from.path, predictable[0].text);
    tarry_start();
    ck_assert_int_eq(tarry_model_read(from.path, &cells, 1, &from.model, &error), 0);
    for (int lasting = 0; lasting < 1 + OWN_MEMORY; lasting++)
        ck_assert_int_gt(fail_each("comparing", 40, compare_it, NULL, &from, lasting, 0),
                         OWN_MEMORY ? 1000 : 0);
    tarry_model_free(from.model);
}
END_TEST

START_TEST(running) {
    for (size_t i = 0; i < N_MODELS; i++) {
        source from = {0};
        set_up(&from, i);
        fail_all("running", run_it, &from, 100);
        tarry_model_free(from.model);
    }
}
END_TEST

static void fail_writing(size_t which, bool overwrite) {
    const tarry_run_options options = {.threads = 1, .keep = 2};
    tarry_error error = {0};
    source from = {.overwrite = overwrite};
    set_up(&from, which);
    ck_assert_msg(!tarry_run(from.model, &options, &from.results, &error), "%s", error.message);
    for (int lasting = 0; lasting < 1 + OWN_MEMORY; lasting++)
        ck_assert_int_gt(
            fail_each("writing", 1, write_it, prepare, &from, lasting, overwrite ? 21 : 0), 20);
    fail_all("the table", tell_it, &from, 5);
    tarry_text_release(&from.summary);
    tarry_results_free(from.results);
    tarry_model_free(from.model);
}

/* In reading an earlier summary.json, jansson loses the end of a text where it finds no memory for
 * it, and says nothing (21 times here). That can only hide the name of a file, which is refused
 * then. */
START_TEST(writing) {
    for (size_t i = 1; i < N_MODELS; i++)
        fail_writing(i, false);
}
END_TEST

START_TEST(overwriting) {
    fail_writing(2, true);
}
END_TEST

/* ---- the program ----------------------------------------------------------------------------- */

/* `tarry` with these words: its exit status, and its last words as the error. */
static int call_it(void *context, tarry_error *error) {
    const int status = program_call(context, error->message, sizeof error->message);
    error->code = status == TARRY_EXIT_FAILED ? TARRY_MEMORY : TARRY_INPUT;
    return status ? (int)error->code : 0;
}

/* Each time there are the results of an earlier run to be replaced. */
static void complete(void *context) {
    tarry_error error = {0};
    ck_assert_msg(!call_it(context, &error), "%s", error.message);
}

/* Two threads, of which one does without the other where there is no room for it: up to four
 * allocations are for that and for the buffers of standard output, which may be missing. */
START_TEST(program) {
    static char overwrite[] = "--overwrite", out[] = "--out", set[] = "--set", pace[] = "pace=2";
    static char keep[] = "--keep=1", threads[] = "--threads=2", run[] = "run", check[] = "check";
    char *model = (char *)put_model(3), *folder = (char *)test_path("out");
    static char figures[] = "--figures=none";
    char *run_words[] = {run,     model, overwrite, out,     folder, keep,
                         threads, set,   pace,      figures, NULL};
    char *check_words[] = {check, model, set, pace, NULL};
    crash_file = program_listen();
    ck_assert_int_gt(fail_each("check", 1, call_it, NULL, check_words, false, 1),
                     OWN_MEMORY ? 400 : 0);
    ck_assert_int_gt(fail_each("run", 9, call_it, complete, run_words, false, 6),
                     OWN_MEMORY ? 1000 : 0);
    if (OWN_MEMORY)
        ck_assert_int_gt(fail_each("run", 9, call_it, complete, run_words, true, 0), 1000);
}
END_TEST

/* With a program in the place of gnuplot that does nothing: figures are made, and missed. */
START_TEST(figures) {
    static char overwrite[] = "--overwrite", out[] = "--out", run[] = "run", one[] = "--threads=1";
    for (size_t i = 0; i < N_MODELS; i += 2) {
        char *words[] = {run, (char *)put_model(i), overwrite, out, (char *)test_path("out"), one,
                         NULL};
        crash_file = program_listen();
        ck_assert_int_eq(setenv("GNUPLOT", "/bin/true", 1), 0);
        ck_assert_int_gt(fail_each("figures", 101, call_it, complete, words, false, 6),
                         OWN_MEMORY ? 500 : 0);
    }
}
END_TEST

/* Making and removing so many files takes long where they go to a disk. */
static void use_memory_for_files(void) {
    static const char files[] = "/dev/shm";
    if (!access(files, W_OK | X_OK) && !getenv("TMPDIR"))
        setenv("TMPDIR", files, 1);
}

int main(void) {
    use_memory_for_files();
    const test_entry tests[] = {
        {"reading", reading},         {"predicting", predicting}, {"checking", checking},
        {"running", running},         {"comparing", comparing},   {"writing", writing},
        {"overwriting", overwriting}, {"program", program},       {"figures", figures},
    };
    return run_tests("lost memory", tests, sizeof tests / sizeof *tests);
}
