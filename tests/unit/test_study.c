/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Running cells on many threads, and the report of `tarry check`.
 *
 * That every number of threads gives the same bytes is the promise of include/tarry/run.h. What a
 * run puts together is compared with cells run one by one (tarry_cell_run), added up here. */

#include "faults.h"
#include "results_text.h"
#include "support.h"

#include "base/table.h"
#include "base/text.h"
#include "engine/cell.h"
#include "model/model.h"
#include "tally/results.h"
#include "tarry/tarry.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>

/* Lags of several laws, two alleles, a step, signals, and completions that are skipped. */
static const char busy_model[] =
    "tarry: 1\n"
    "time: min\n"
    "parameters: {k_open: 0.2}\n"
    "genes:\n"
    "  vela:\n"
    "    copies: 2\n"
    "    start: steady\n"
    "    promoter:\n"
    "      shut: {to: {open: k_open}}\n"
    "      open: {to: {shut: 0.5}, initiates: 3}\n"
    "    transcript: {stages: {nascent: {gamma: {mean: 2, sd: 1}}, nuclear: {fixed: 1.5}}, "
    "half_life: 5}\n"
    "species: {pre: 0, mature: 0}\n"
    "reactions:\n"
    "  start: {makes: {pre: 1}, rate: 2, later: [{after: {exponential: {mean: 3}}, uses: {pre: 1}, "
    "makes: {mature: 1}, if_short: skip}]}\n"
    "  rob: {uses: {pre: 1}, rate: 0.3}\n"
    "  end: {uses: {mature: 1}, rate: 0.1}\n"
    "signals:\n"
    "  spot: {of: vela.nascent, ramp: {from: 0.1, to: 0.4}, brightness: 1, noise: 0.3}\n"
    "protocol: [{at: 12, set: {k_open: 0.8}}]\n"
    "run: {cells: 150, settle: 10, until: 20, every: 0.5, snapshots: [0, 7.3, 20], seed: 1}\n";

static tarry_model *read_model(const char *text, const char *cells) {
    const tarry_override override = {"--cells", 0, "cells", cells};
    tarry_model *model = NULL;
    tarry_error error = {0};
    char what[2048];
    tarry_start();
    const int code = tarry_model_read_text(text, strlen(text), "m.yaml", &override, cells ? 1 : 0,
                                           &model, &error);
    ck_assert_msg(code == 0, "%s", tarry_error_text(&error, what, (int)sizeof what));
    return model;
}

static tarry_results *run_model(const tarry_model *model, tarry_run_options options) {
    tarry_results *results = NULL;
    tarry_error error = {0};
    const int code = tarry_run(model, &options, &results, &error);
    ck_assert_msg(code == 0, "%s", error.message);
    return results;
}

/* ---- threads --------------------------------------------------------------------------------- */

START_TEST(test_threads) {
    static const int threads[] = {1, 2, 5, 100};
    tarry_model *model = read_model(busy_model, NULL);
    char *first = NULL;
    for (size_t i = 0; i < 4; i++) {
        tarry_results *results = run_model(model,
                                           (tarry_run_options){.threads = threads[i], .keep = 3});
        char *text = results_text(results);
        if (first)
            ck_assert_msg(strcmp(first, text) == 0, "%d threads differ", threads[i]);
        else
            ck_assert_uint_gt(strlen(text), 10000);
        if (first)
            free(text);
        else
            first = text;
        tarry_results_free(results);
    }
    free(first);
    tarry_model_free(model);
}
END_TEST

/* Counted by one thread at a time, and every cell once. */
typedef struct count {
    volatile int busy;
    int64_t n_done, n_cells;
    bool is_wrong;
    volatile int *stop;
    int64_t stop_after;
} count;

static void count_cells(void *context, int64_t n_done, int64_t n_cells) {
    count *c = context;
    c->is_wrong = c->is_wrong || c->busy || n_done != c->n_done + 1;
    c->busy = 1;
    const struct timespec moment = {0, 20000};
    nanosleep(&moment, NULL);
    c->n_done = n_done;
    c->n_cells = n_cells;
    if (c->stop && n_done >= c->stop_after)
        *c->stop = 1;
    c->busy = 0;
}

START_TEST(test_progress) {
    tarry_model *model = read_model(busy_model, NULL);
    count c = {0};
    tarry_results *results = run_model(
        model, (tarry_run_options){.threads = 4, .progress = count_cells, .progress_context = &c});
    ck_assert(!c.is_wrong);
    ck_assert_int_eq(c.n_done, 150);
    ck_assert_int_eq(c.n_cells, 150);
    tarry_results_free(results);
    tarry_model_free(model);
}
END_TEST

/* The lines of a dump that do not say that the run was cut short. */
static void drop_interruption(char *text) {
    char *line = strstr(text, "interrupted: ");
    if (line) {
        char *end = strchr(line, '\n');
        memmove(line, end + 1, strlen(end + 1) + 1);
    }
}

/* A run that is stopped holds the first n cells, and equals a run of n cells. */
START_TEST(test_stop) {
    static const int threads[] = {1, 4};
    tarry_model *model = read_model(busy_model, NULL);
    for (size_t i = 0; i < 2; i++) {
        volatile int stop = 0;
        count c = {.stop = &stop, .stop_after = 70};
        tarry_results *part = run_model(model, (tarry_run_options){.threads = threads[i],
                                                                   .keep = 100,
                                                                   .stop = &stop,
                                                                   .progress = count_cells,
                                                                   .progress_context = &c});
        const int64_t n = tarry_results_n_cells(part);
        ck_assert_int_ge(n, 70);
        ck_assert_int_le(n, 70 + threads[i]);
        ck_assert_int_eq(tarry_results_n_cells_asked(part), 150);
        char cells[32];
        snprintf(cells, sizeof cells, "%lld", (long long)n);
        tarry_model *shorter = read_model(busy_model, cells);
        tarry_results *whole = run_model(shorter, (tarry_run_options){.threads = 1, .keep = 100});
        char *one = results_text(part), *other = results_text(whole);
        ck_assert(strstr(one, "interrupted: the figures rest on the first") != NULL);
        drop_interruption(one);
        ck_assert_msg(strcmp(one, other) == 0, "stopped after %s cells with %d threads", cells,
                      threads[i]);
        free(one);
        free(other);
        tarry_results_free(part);
        tarry_results_free(whole);
        tarry_model_free(shorter);
    }
    tarry_model_free(model);
}
END_TEST

START_TEST(test_stop_at_once) {
    tarry_model *model = read_model(busy_model, NULL);
    volatile int stop = 1;
    const tarry_run_options options = {.threads = 2, .stop = &stop};
    tarry_results *results = (tarry_results *)model;
    tarry_error error = {0};
    ck_assert_int_eq(tarry_run(model, &options, &results, &error), TARRY_INTERRUPTED);
    ck_assert_ptr_null(results);
    tarry_model_free(model);
}
END_TEST

/* ---- against cells run one by one --------------------------------------------------------------
 */

typedef struct alone {
    tarry_engine *engine;
    tarry_cell *cell;
    tarry_record record;
} alone;

static void alone_init(alone *a, const tarry_network *network) {
    tarry_error error = {0};
    *a = (alone){0};
    ck_assert_int_eq(tarry_engine_new(network, "direct", &a->engine, &error), 0);
    ck_assert_int_eq(tarry_cell_new(a->engine, &a->cell, &error), 0);
    ck_assert_int_eq(tarry_record_init(&a->record, network, &error), 0);
}

static void alone_release(alone *a) {
    tarry_record_release(&a->record);
    tarry_cell_free(a->cell);
    tarry_engine_free(a->engine);
}

START_TEST(test_totals) {
    tarry_model *model = read_model(busy_model, NULL);
    const tarry_network *network = &model->network;
    tarry_results *results = run_model(model, (tarry_run_options){.threads = 3});
    alone a;
    double firings = 0, completions = 0, skipped = 0;
    alone_init(&a, network);
    for (int64_t cell = 0; cell < 150; cell++) {
        ck_assert_int_eq(tarry_cell_run(a.cell, cell, &a.record, NULL), 0);
        for (uint32_t i = 0; i < network->n_reactions; i++)
            firings += (double)a.record.firings[i];
        for (uint32_t i = 0; i < network->n_lags; i++) {
            completions += (double)a.record.completions[i];
            skipped += (double)a.record.skipped[i];
        }
    }
    alone_release(&a);
    ck_assert_double_gt(skipped, 0);
    ck_assert_double_eq(tarry_results_firings(results), firings);
    ck_assert_double_eq(tarry_results_completions(results), completions);
    char expected[128];
    snprintf(expected, sizeof expected, "start.later: %.0f completions in 150 cells were skipped",
             skipped);
    bool found = false;
    for (size_t i = 0; i < tarry_results_n_warnings(results); i++)
        found = found || strstr(tarry_results_warning(results, i), expected);
    ck_assert_msg(found, "no '%s'", expected);
    tarry_results_free(results);
    tarry_model_free(model);
}
END_TEST

START_TEST(test_keep) {
    tarry_model *model = read_model(busy_model, NULL);
    const tarry_network *network = &model->network;
    const uint32_t n_frames = network->run.n_frames;
    tarry_results *results = run_model(model, (tarry_run_options){.threads = 4, .keep = 7});
    const tarry_table *cells = tarry_results_cells(results);
    ck_assert_ptr_nonnull(cells);
    ck_assert_uint_eq(tarry_table_n_rows(cells), 7 * (size_t)n_frames);
    ck_assert_str_eq(tarry_table_column_name(cells, 0), "cell");
    ck_assert_str_eq(tarry_table_column_name(cells, 1), "time");
    const int spot = tarry_table_column(cells, "spot");
    const int nascent = tarry_table_column(cells, "vela.nascent");
    ck_assert_int_ge(spot, 2);
    ck_assert_int_ge(nascent, 2);
    alone a;
    alone_init(&a, network);
    for (int64_t cell = 0; cell < 7; cell++) {
        ck_assert_int_eq(tarry_cell_run(a.cell, cell, &a.record, NULL), 0);
        for (uint32_t frame = 0; frame < n_frames; frame++) {
            const size_t row = (size_t)cell * n_frames + frame;
            ASSERT_FAST(tarry_table_number(cells, row, 0) == (double)cell, "cell in row %zu", row);
            ASSERT_FAST(tarry_table_number(cells, row, 1) == 0.5 * frame, "time in row %zu", row);
            ASSERT_FAST(tarry_table_number(cells, row, spot) ==
                            a.record.frames[(size_t)(spot - 2) * n_frames + frame],
                        "spot in row %zu", row);
            ASSERT_FAST(tarry_table_number(cells, row, nascent) ==
                            a.record.frames[(size_t)(nascent - 2) * n_frames + frame],
                        "nascent in row %zu", row);
        }
    }
    alone_release(&a);
    tarry_results_free(results);
    results = run_model(model, (tarry_run_options){.threads = 2});
    ck_assert_ptr_null(tarry_results_cells(results));
    tarry_results_free(results);
    results = run_model(model, (tarry_run_options){.threads = 2, .keep = 1000});
    ck_assert_uint_eq(tarry_table_n_rows(tarry_results_cells(results)), 150 * (size_t)n_frames);
    tarry_results_free(results);
    tarry_model_free(model);
}
END_TEST

/* A completion that lacks what it uses stops every cell: those that start quick at once, the others
 * after the step at 400 min, which ticks make a long way. The error told is that of the
 * lowest-numbered cell, whichever thread fails first. */
static const char failing_model[] =
    "tarry: 1\n"
    "time: min\n"
    "parameters: {k_rob: 0}\n"
    "genes: {vela: {start: {quick: 0.3, slow: 0.7}, promoter: {quick: {}, slow: {}}}}\n"
    "species: {pre: 0, clock: 0}\n"
    "reactions:\n"
    "  start: {makes: {pre: 1}, rate: 1, later: [{after: {fixed: 1}, uses: {pre: 1}}]}\n"
    "  rob_quick: {uses: {pre: 1}, needs: {vela.quick: 1}, rate: 10}\n"
    "  rob: {uses: {pre: 1}, rate: k_rob}\n"
    "  tick: {makes: {clock: 1}, rate: 300}\n"
    "protocol: [{at: 400, set: {k_rob: 10}}]\n"
    "run: {cells: 400, until: 500, every: 5, seed: 1}\n";

/* The first cell that fails when cells run one by one. */
static void find_failure(const tarry_network *network, tarry_error *first) {
    alone a;
    alone_init(&a, network);
    int64_t cell = 0;
    while (cell < 400 && !tarry_cell_run(a.cell, cell, &a.record, first))
        cell++;
    ck_assert_int_lt(cell, 400);
    ck_assert_ptr_nonnull(strstr(first->message, "cell 0, time 40")); /* it starts slow */
    alone_release(&a);
}

START_TEST(test_failing_cells) {
    tarry_model *model = read_model(failing_model, NULL);
    tarry_error first = {0};
    find_failure(&model->network, &first);
    for (int i = 0; i < 20; i++) {
        const tarry_run_options options = {.threads = 1 + i % 10};
        tarry_results *results = NULL;
        tarry_error error = {0};
        ck_assert_int_eq(tarry_run(model, &options, &results, &error), TARRY_RUN);
        ck_assert_ptr_null(results);
        ck_assert_str_eq(error.message, first.message);
        ck_assert_int_eq(error.line, first.line);
    }
    tarry_model_free(model);
}
END_TEST

/* ---- what is refused ---------------------------------------------------------------------------
 */

static int run_code(const char *text, tarry_run_options options, tarry_error *error) {
    tarry_model *model = read_model(text, NULL);
    tarry_results *results = NULL;
    *error = (tarry_error){0};
    const int code = tarry_run(model, &options, &results, error);
    tarry_results_free(results);
    tarry_model_free(model);
    return code;
}

START_TEST(test_refused) {
    tarry_error error;
    ck_assert_int_eq(run_code(busy_model, (tarry_run_options){.threads = -1}, &error), TARRY_INPUT);
    ck_assert_int_eq(run_code(busy_model, (tarry_run_options){.keep = -1}, &error), TARRY_INPUT);
    ck_assert_int_eq(run_code(busy_model, (tarry_run_options){.sampler = "tea leaves"}, &error),
                     TARRY_INPUT);
    static const char tight[] = "tarry: 1\n"
                                "time: min\n"
                                "species: {a: 0}\n"
                                "reactions: {make: {makes: {a: 1}, rate: 1}}\n"
                                "limits: {memory: 1 MB}\n"
                                "run: {cells: 100, until: 10000, every: 0.1}\n";
    ck_assert_int_eq(run_code(tight, (tarry_run_options){.threads = 1}, &error), TARRY_LIMIT);
    ck_assert_msg(strstr(error.message, "the limit is 1 MB") && strstr(error.message, "run: every"),
                  "%s", error.message);
}
END_TEST

/* Every allocation of a run fails once: an error each time, and nothing is lost (seen under
 * sanitizers). */
START_TEST(test_memory_faults) {
    static const char text[] = "tarry: 1\n"
                               "time: min\n"
                               "genes:\n"
                               "  vela:\n"
                               "    promoter: {shut: {to: {open: 1}}, open: {to: {shut: 1}, "
                               "initiates: 2}}\n"
                               "    transcript: {stages: {nascent: {fixed: 1}}, half_life: 2}\n"
                               "run: {cells: 3, until: 4, every: 2}\n";
    tarry_model *model = read_model(text, NULL);
    long n = 0;
    for (;; n++) {
        tarry_results *results = NULL;
        char *report = NULL;
        tarry_error error = {0};
        const tarry_run_options options = {.threads = 1, .keep = 1};
        faults_arm(FAULT_MEMORY, n, 0);
        int code = tarry_run(model, &options, &results, &error);
        if (!code)
            code = tarry_check(model, &report, &error);
        const bool struck = faults_struck();
        faults_clear();
        tarry_results_free(results);
        free(report);
        if (!struck)
            break;
        ck_assert_msg(code == TARRY_MEMORY, "call %ld: %d %s", n, code, error.message);
    }
    ck_assert_int_gt(n, 50);
    tarry_model_free(model);
}
END_TEST

/* ---- the report of check -----------------------------------------------------------------------
 */

static char *check_text(const char *text) {
    tarry_model *model = read_model(text, NULL);
    char *report = NULL;
    tarry_error error = {0};
    ck_assert_msg(!tarry_check(model, &report, &error), "%s", error.message);
    tarry_model_free(model);
    return report;
}

/* The report has a line that holds these words in order, parted by any blanks. */
static bool has_line(const char *report, const char *words) {
    for (const char *line = report; line && *line; line = strchr(line, '\n')) {
        const char *at = line + (*line == '\n');
        const char *end = strchr(at, '\n');
        const char *word = words;
        while (*word && at < end) {
            while (*at == ' ')
                at++;
            while (*word == ' ')
                word++;
            if (*at != *word)
                break;
            while (*at == *word && *at != ' ' && *at != '\n' && *word) {
                at++;
                word++;
            }
        }
        if (!*word)
            return true;
        line = line + (*line == '\n');
    }
    return false;
}

static void assert_lines(const char *report, const char *const *lines, size_t n) {
    for (size_t i = 0; i < n; i++)
        ck_assert_msg(has_line(report, lines[i]), "no line '%s' in\n%s", lines[i], report);
}

START_TEST(test_check_gene) {
    char *report = check_text(busy_model);
    static const char *const lines[] = {
        "vela 2 copies starts steady: shut 0.714286, open 0.285714 bursts in open",
        "vela.open 0.571429 on average",
        "vela.nascent 0",
        ("vela.shut>open vela.shut -> vela.open rate 0.2 /min, from 12 min on 0.8 (each of 2 "
         "alleles)"),
        "vela.initiation vela.open -> vela.open + vela.nascent rate 3 /min (each of 2 alleles)",
        "vela.transcript decay vela.transcript -> nothing rate 0.138629 /min",
        "start nothing -> pre rate 2 /min starts start.later",
        "vela.nascent after gamma vela.nascent -> vela.nuclear",
        "start.later after exponential pre -> mature skipped where short",
        "gamma gamma 2 1",
        "fixed fixed 1.5 0 length 1.5",
        "vela.shut + vela.open = 2",
        "at 12 min k_open = 0.8",
        "cells 150, seed 1",
        "window w1 0 to 12 min",
    };
    assert_lines(report, lines, sizeof lines / sizeof *lines);
    free(report);
}
END_TEST

START_TEST(test_check_reactions) {
    char *report = check_text(
        "tarry: 1\n"
        "time: h\n"
        "delays: {slow: {normal: {mean: 2, sd: 1.2}}}\n"
        "species: {a: 5, b: 0, c: 3}\n"
        "reactions:\n"
        "  pair: {uses: {a: 2}, needs: {c: 1}, makes: {b: 1}, rate: 0.5}\n"
        "  shots: {makes: {a: {geometric: {mean: 5}}}, rate: 0.1}\n"
        "  odd: {uses: {b: 1}, propensity: 0.2 * b / (1 + b)}\n"
        "  wait: {uses: {b: 1}, rate: 1, later: [{after: slow, chance: 0.9, makes: {a: 2}}]}\n"
        "run: {until: 10}\n");
    static const char *const lines[] = {
        "pair 2 a + c -> c + b rate 0.5 /h",
        "shots nothing -> (geometric, mean 5) a rate 0.1 /h",
        "odd b -> nothing propensity 0.2 * b / (1 + b)",
        "wait.later after slow nothing -> 2 a probability 0.9",
        /* normal truncated at 0, z = 2/1.2, r = phi(z)/Phi(z) = 0.104474: mean 2 + 1.2 r, variance
         * 1.44 (1 - z r - r^2) (Johnson, Kotz & Balakrishnan 1994, from memory) */
        "slow normal 2.12536 1.08331",
        "c = 3",
    };
    assert_lines(report, lines, sizeof lines / sizeof *lines);
    ck_assert_ptr_nonnull(strstr(report, "before truncation at 0: mean 2, sd 1.2"));
    free(report);
}
END_TEST

/* Always on, decay 0.05: e^-0.5 = 61 % are missing after 10 min, 0.1 % after log(1000)/0.05 = 138.2
 * min, 0.4 % (no warning) after 110.4 min. */
START_TEST(test_check_steady) {
    static const char model[] = "tarry: 1\n"
                                "time: min\n"
                                "genes:\n"
                                "  vela:\n"
                                "    promoter: {on: {initiates: 2}, off: {to: {on: 1}}}\n"
                                "    transcript: {decay: 0.05}\n"
                                "run: {settle: %s, until: 10}\n";
    char text[512];
    snprintf(text, sizeof text, model, "10");
    char *report = check_text(text);
    ck_assert(has_line(report, "vela.transcript 40 15.7388 -61 %"));
    ck_assert_ptr_nonnull(strstr(
        report, "when the record begins the mean of 'vela.transcript' is 61 % below its steady"));
    const char *remedy = strstr(report, "settle for some ");
    ck_assert_ptr_nonnull(remedy);
    const double settle = strtod(remedy + strlen("settle for some "), NULL);
    ck_assert_double_ge(settle, log(1000) / 0.05);
    ck_assert_double_le(settle, 1.15 * log(1000) / 0.05);
    free(report);
    snprintf(text, sizeof text, model, "110.4");
    report = check_text(text);
    ck_assert_ptr_null(strstr(report, "when the record begins the"));
    free(report);
}
END_TEST

/* Lists are cut and say so, and the report of 10,000 genes, no two of which are alike, takes less
 * than 2 s of processor time. */
START_TEST(test_check_many) {
    const int n_genes = test_small() ? 300 : 10000;
    tarry_text text = {0};
    tarry_text_add_string(&text, "tarry: 1\ntime: min\ngenes:\n");
    for (int i = 0; i < n_genes; i++)
        tarry_text_printf(&text,
                          "  g%d:\n"
                          "    promoter: {shut: {to: {open: 0.%03d}}, open: {to: {shut: 1}, "
                          "initiates: 2}}\n"
                          "    transcript: {stages: {nascent: {gamma: {mean: %d, sd: 1}}}, "
                          "half_life: 20}\n",
                          i, 1 + i % 900, 2 + i % 7);
    tarry_text_add_string(&text, "run: {until: 100, cells: 10}\n");
    tarry_model *model = read_model(text.data, NULL);
    char *report = NULL;
    tarry_error error = {0};
    const clock_t before = clock();
    ck_assert_msg(!tarry_check(model, &report, &error), "%s", error.message);
    const double seconds = (double)(clock() - before) / CLOCKS_PER_SEC;
    char expected[64];
    snprintf(expected, sizeof expected, "... and %d more genes", n_genes - 40);
    ck_assert_msg(strstr(report, expected), "no '%s'", expected);
    ck_assert_uint_lt(strlen(report), 60000);
    if (!test_small())
        ck_assert_msg(seconds < 2, "%g s", seconds);
    free(report);
    tarry_model_free(model);
    tarry_text_release(&text);
}
END_TEST

/* ---- rows of files -----------------------------------------------------------------------------
 */

/* What `tarry check` says of a file's rows is what a run writes. */
static void check_rows(const char *report, const tarry_results *results, const char *file,
                       tarry_result_table table) {
    const char *line = strstr(report, file);
    ck_assert_msg(line, "no %s", file);
    const size_t said = (size_t)strtoull(line + strlen(file), NULL, 10);
    const size_t rows = tarry_table_n_rows(tarry_results_table(results, table));
    ck_assert_msg(said == rows, "%s: %zu rows, check says %zu", file, rows, said);
    ck_assert_uint_gt(rows, 0);
}

START_TEST(test_rows) {
    tarry_model *model = read_model(busy_model, "3");
    tarry_results *results = run_model(model, (tarry_run_options){.threads = 1});
    tarry_error error;
    char *report = NULL;
    ck_assert_int_eq(tarry_check(model, &report, &error), 0);
    check_rows(report, results, "means.csv", TARRY_TABLE_means);
    check_rows(report, results, "bursts.csv", TARRY_TABLE_bursts);
    check_rows(report, results, "signals.csv", TARRY_TABLE_signals);
    check_rows(report, results, "transit.csv", TARRY_TABLE_transit);
    free(report);
    tarry_results_free(results);
    tarry_model_free(model);
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"threads", test_threads},
        {"rows", test_rows},
        {"progress", test_progress},
        {"stop", test_stop},
        {"stop at once", test_stop_at_once},
        {"totals", test_totals},
        {"keep", test_keep},
        {"failing cells", test_failing_cells},
        {"refused", test_refused},
        {"memory faults", test_memory_faults},
        {"check: gene", test_check_gene},
        {"check: reactions", test_check_reactions},
        {"check: steady", test_check_steady},
        {"check: many", test_check_many},
    };
    return run_tests("study", tests, sizeof tests / sizeof *tests);
}
