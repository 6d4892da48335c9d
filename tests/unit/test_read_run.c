/* SPDX-License-Identifier: GPL-3.0-or-later */

/* `run:` and `limits:`. What is right follows from design.md (section 3, Run); times and frames are
 * worked out by hand. */
#include "base/text.h"
#include "model/read_run.h"
#include "reading.h"
#include "support.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

/* The species of the models here, without the rest of the reader of models. */
static int make_species(tarry_builder *builder, tarry_error *error) {
    static const struct {
        const char *name;
        tarry_species_role role;
        int32_t gene;
    } rows[] = {
        {"vela.open", TARRY_SPECIES_STATE, 0},      {"vela.open 1", TARRY_SPECIES_ALLELE, 0},
        {"vela.nascent", TARRY_SPECIES_STAGE, 0},   {"vela.transcript", TARRY_SPECIES_PRODUCT, 0},
        {"clasp", TARRY_SPECIES_PLAIN, TARRY_NONE}, {"pin", TARRY_SPECIES_PLAIN, TARRY_NONE},
    };
    const tarry_gene gene = {.name = "vela"};
    const tarry_signal signal = {.name = "spot"};
    const tarry_place place = {0};
    int code = 0;
    for (uint32_t i = 0; code == 0 && i < sizeof rows / sizeof *rows; i++) {
        const tarry_species row = {
            .name = rows[i].name, .role = rows[i].role, .gene = rows[i].gene};
        ck_assert_int_eq(TARRY_APPEND(&builder->species, row), 0);
        if (row.role != TARRY_SPECIES_ALLELE)
            code = tarry_builder_enter(builder, TARRY_SYMBOL_SPECIES, row.name, i, place, error);
    }
    ck_assert_int_eq(TARRY_APPEND(&builder->genes, gene), 0);
    ck_assert_int_eq(TARRY_APPEND(&builder->signals, signal), 0);
    if (code == 0)
        code = tarry_builder_enter(builder, TARRY_SYMBOL_GENE, "vela", 0, place, error);
    if (code == 0)
        code = tarry_builder_enter(builder, TARRY_SYMBOL_SIGNAL, "spot", 0, place, error);
    return code;
}

static reader *const readers[] = {tarry_read_parameters, make_species, tarry_read_protocol,
                                  tarry_read_run};
enum { N_READERS = sizeof readers / sizeof *readers };

static const tarry_run_plan *read_plan(reading *in, const char *text,
                                       const tarry_override *overrides, size_t n) {
    reading_start(in, text, overrides, n);
    reading_pass(in, readers, N_READERS);
    return &in->model.network.run;
}

static void refused(const char *text, int line, int column, const char *words) {
    reading_refused(text, NULL, 0, readers, N_READERS, TARRY_INPUT, line, column, words);
}

static void refused_option(const char *text, const char *key, const char *value, int line,
                           int column, const char *words) {
    char option[32];
    snprintf(option, sizeof option, "--%s", key);
    const tarry_override given = {option, 0, key, value};
    reading_refused(text, &given, 1, readers, N_READERS, TARRY_INPUT, line, column, words);
}

START_TEST(defaults) {
    reading in;
    const tarry_run_plan *plan = read_plan(&in, "run: {until: 10 h}\n", NULL, 0);
    ck_assert_int_eq(plan->cells, 1000);
    ck_assert_uint_eq(plan->seed, 1);
    ck_assert(plan->settle == 0 && plan->until == 600 && plan->every == 600 / 500.0);
    ck_assert_uint_eq(plan->n_frames, 501);
    ck_assert_uint_eq(plan->n_lags, 126); /* a quarter of 500 steps and lag 0 */
    ck_assert_uint_eq(plan->n_snapshots, 1);
    ck_assert(plan->snapshots[0] == 600);
    ck_assert_uint_eq(plan->n_windows, 1);
    ck_assert_str_eq(plan->windows[0].name, "all");
    ck_assert(plan->windows[0].from == 0 && plan->windows[0].to == 600);
    ck_assert_uint_eq(plan->windows[0].frames.from, 0);
    ck_assert_uint_eq(plan->windows[0].frames.to, 501);
    ck_assert_uint_eq(plan->n_spans, 1);
    ck_assert(plan->bounds[0] == 0 && plan->bounds[1] == 600);
    ck_assert(plan->limit_firings == 1e10 && plan->limit_pending == 1e7);
    ck_assert(plan->limit_memory == 4e9);
    ck_assert(in.builder.segments.items[0].start == 0);
    ck_assert(!signbit(in.builder.segments.items[0].start));
    ck_assert_uint_eq(in.model.notes.n, 0);
    reading_end(&in);
}
END_TEST

START_TEST(what_is_given) {
    reading in;
    const tarry_run_plan *plan = read_plan(
        &in,
        "parameters: {day: 1 d}\n"
        "run: {cells: 12, settle: 2 * day, until: 1 h, every: 0.1 min, seed: 9223372036854775807,\n"
        "  snapshots: [60 min, 0, 1800 s, 0 min], lags: 6 min}\n"
        "limits: {firings: 1e6, pending: 50, memory: 1.5 MB}\n",
        NULL, 0);
    ck_assert_int_eq(plan->cells, 12);
    ck_assert_uint_eq(plan->seed, UINT64_C(9223372036854775807));
    ck_assert(plan->settle == 2880 && plan->until == 60);
    ck_assert_uint_eq(plan->n_frames, 601);
    ck_assert(plan->every == 60.0 / 600);
    ck_assert_uint_eq(plan->n_lags, 61);
    ck_assert_uint_eq(plan->n_snapshots, 3);
    ck_assert(plan->snapshots[0] == 0 && plan->snapshots[1] == 30 && plan->snapshots[2] == 60);
    ck_assert(plan->limit_firings == 1e6 && plan->limit_pending == 50);
    ck_assert(plan->limit_memory == 1.5e6);
    ck_assert(in.builder.segments.items[0].start == -2880);
    reading_end(&in);
}
END_TEST

/* 0.3 / 0.1 is 2.9999999999999996 in binary: three steps all the same. */
START_TEST(multiples_that_are_not_binary) {
    reading in;
    const tarry_run_plan *plan = read_plan(&in, "run: {until: 0.3, every: 0.1}\n", NULL, 0);
    ck_assert_uint_eq(plan->n_frames, 4);
    ck_assert(plan->every == 0.3 / 3);
    reading_end(&in);
    plan = read_plan(&in, "run: {until: 1, every: 0.1, lags: 0.3}\n", NULL, 0);
    ck_assert_uint_eq(plan->n_lags, 4);
    reading_end(&in);
}
END_TEST

START_TEST(the_command_line_beats_the_file) {
    const tarry_override given[] = {
        {"--cells", 0, "cells", "7"},       {"--until", 0, "until", "2 h"},
        {"--every", 0, "every", "30 s"},    {"--seed", 0, "seed", "0"},
        {"--settle", 0, "settle", "3 * k"}, {"--snapshots", 0, "snapshots", "2h, max(5, 4) ,0"},
        {"--set", 1, "k", "4 min"},
    };
    reading in;
    const tarry_run_plan *plan = read_plan(
        &in, "parameters: {k: 1 min}\nrun: {cells: none, until: [], every: 7}\n", given, 7);
    ck_assert_int_eq(plan->cells, 7);
    ck_assert_uint_eq(plan->seed, 0);
    ck_assert(plan->until == 120 && plan->every == 0.5 && plan->settle == 12);
    ck_assert_uint_eq(plan->n_snapshots, 3);
    ck_assert(plan->snapshots[1] == 5 && plan->snapshots[2] == 120);
    reading_end(&in);
    plan = read_plan(&in, "parameters: {k: 1}\n", given, 7);
    ck_assert(plan->until == 120);
    reading_end(&in);
}
END_TEST

START_TEST(wrong_times) {
    refused("run: {every: 1}\n", 1, 6, "'run' needs 'until', the length of the record");
    refused("parameters: {}\n", 1, 1, "'run' needs 'until', the length of the record");
    refused("run: {untill: 1}\n", 1, 7, "'run' has no key 'untill'; did you mean 'until'?");
    refused("run: 5\n", 1, 6, "'run' must be a map");
    refused("run: {until: 0}\n", 1, 14, "above 0, not 0");
    refused("run: {until: -3 h}\n", 1, 14, "above 0, not -180");
    refused("run: {until: 3 kb}\n", 1, 14, "is a length where a time is due");
    refused("run: {until: 1/0}\n", 1, 14, "no finite number");
    refused("run: {until: 10, settle: -1}\n", 1, 26, "not below 0, as -1 is");
    refused("run: {until: 10, every: 0}\n", 1, 25, "above 0, not 0");
    refused("run: {until: 10, every: 0.7}\n", 1, 25,
            "'until' (10) is no multiple of 'every' (0.7); the nearest that fits is every: "
            "0.7142857142857143, which is until / 14");
    refused("run: {until: 10, every: 25}\n", 1, 25, "the nearest that fits is every: 10");
    refused("run: {until: 10, every: 1e-14}\n", 1, 25,
            "makes 1000000000000001 frames; at most 100000000 can be recorded");
    refused("run: {until: 10, lags: 11}\n", 1, 24, "between 0 and 'until', not at 11");
    refused("run: {until: 10, lags: -1}\n", 1, 24, "between 0 and 'until', not at -1");
    refused("run: {until: 10, snapshots: []}\n", 1, 29, "'snapshots' names no time");
    refused("run: {until: 10, snapshots: [0, 11]}\n", 1, 33,
            "a snapshot at 11 lies outside the record, which runs from 0 to 10");
    refused("run: {until: 10, snapshots: [-1]}\n", 1, 30, "a snapshot at -1 lies outside");
    refused("run: {until: 10, snapshots: {a: 1}}\n", 1, 29, "'snapshots' must be a list");
}
END_TEST

START_TEST(wrong_numbers) {
    refused("run: {until: 1, cells: 0}\n", 1, 24, "a whole number from 1 to");
    refused("run: {until: 1, cells: 2.5}\n", 1, 24, "not '2.5'");
    refused("run: {until: 1, cells: 1e3}\n", 1, 24, "not '1e3'");
    refused("run: {until: 1, seed: -1}\n", 1, 23, "a whole number from 0 to");
    refused("run: {until: 1, seed: 9223372036854775808}\n", 1, 23, "a whole number from 0 to");
    refused("run: {until: 1}\nlimits: {firing: 1}\n", 2, 10, "did you mean 'firings'?");
    refused("run: {until: 1}\nlimits: {firings: 0}\n", 2, 19, "a number of 1 or more");
    refused("run: {until: 1}\nlimits: {pending: 0.5}\n", 2, 19, "a number of 1 or more");
    refused("run: {until: 1}\nlimits: {memory: 4}\n", 2, 18, "a size in kB, MB, GB or TB");
    refused("run: {until: 1}\nlimits: {memory: 4 gb}\n", 2, 18, "not '4 gb'");
    refused("run: {until: 1}\nlimits: {memory: -4 GB}\n", 2, 18, "not '-4 GB'");
    refused("run: {until: 1}\nlimits: {memory: GB}\n", 2, 18, "not 'GB'");
}
END_TEST

START_TEST(wrong_options) {
    const char *text = "run: {until: 10, every: 0.5}\n";
    refused_option(text, "cells", "0", 0, 0, "--cells 0: 'cells' must be a whole number from 1");
    refused_option(text, "seed", "x", 0, 0, "--seed x: 'seed' must be a whole number");
    refused_option(text, "until", "5 kb", 0, 0, "--until 5 kb: '5 kb' is a length");
    refused_option(text, "until", "0", 0, 0, "--until 0: 'until' is the length");
    refused_option(text, "until", "10.3", 1, 25, "--until 10.3: 'until' (10.3) is no multiple");
    refused_option(text, "every", "0.7", 0, 0, "--every 0.7: 'until' (10) is no multiple");
    refused_option(text, "settle", "-1", 0, 0, "--settle -1: 'settle' is the time");
    refused_option(text, "snapshots", "0,20", 0, 0, "--snapshots 0,20: a snapshot at 20 lies");
    refused_option(text, "snapshots", "0,,2", 0, 0, "--snapshots 0,,2: a snapshot has no value");
    refused_option(text, "every", "5 nM", 0, 0, "stochastic constants in counts");
}
END_TEST

static void check_window(const tarry_window *window, const char *name, double from, double to,
                         uint32_t first_span, uint32_t end_span, uint32_t first_frame,
                         uint32_t end_frame) {
    ck_assert_str_eq(window->name, name);
    ck_assert(window->from == from && window->to == to);
    ck_assert_uint_eq(window->spans.from, first_span);
    ck_assert_uint_eq(window->spans.to, end_span);
    ck_assert_uint_eq(window->frames.from, first_frame);
    ck_assert_uint_eq(window->frames.to, end_frame);
}

START_TEST(windows_between_steps) {
    reading in;
    const tarry_run_plan *plan = read_plan(&in,
                                           "parameters: {k: 1}\n"
                                           "protocol:\n"
                                           "- {at: 60, set: {k: 2}}\n"
                                           "- {at: 0, set: {k: 3}}\n"
                                           "- {at: 25.5, set: {k: 3}}\n"
                                           "- {at: 100, set: {k: 3}}\n"
                                           "run: {until: 100, every: 1}\n",
                                           NULL, 0);
    ck_assert_uint_eq(plan->n_windows, 3);
    check_window(&plan->windows[0], "w1", 0, 25.5, 0, 1, 0, 26);
    check_window(&plan->windows[1], "w2", 25.5, 60, 1, 2, 26, 60);
    check_window(&plan->windows[2], "w3", 60, 100, 2, 3, 60, 101);
    ck_assert_uint_eq(plan->n_spans, 3);
    reading_end(&in);
    plan = read_plan(&in, "parameters: {k: 1}\nprotocol: [{at: 0, set: {k: 2}}]\nrun: {until: 9}\n",
                     NULL, 0);
    ck_assert_uint_eq(plan->n_windows, 1);
    check_window(&plan->windows[0], "all", 0, 9, 0, 1, 0, 501);
    reading_end(&in);
}
END_TEST

/* A ramp is one window; a row of steps that would give too many gives one. */
START_TEST(windows_of_ramps_and_repeats) {
    reading in;
    const tarry_run_plan *plan = read_plan(
        &in,
        "parameters: {k: 1}\n"
        "protocol: [{from: 10, to: 60, ramp: {k: 2}, steps: 50}]\n"
        "run: {until: 100, every: 1}\n",
        NULL, 0);
    ck_assert_uint_eq(plan->n_windows, 3);
    check_window(&plan->windows[0], "w1", 0, 10, 0, 1, 0, 10);
    check_window(&plan->windows[1], "w2", 10, 60, 1, 2, 10, 60);
    check_window(&plan->windows[2], "w3", 60, 100, 2, 3, 60, 101);
    reading_end(&in);
    static const char repeats[] = "parameters: {k: 1}\n"
                                  "protocol: [{every: 1, times: %d, do: [{at: 0, set: {k: 2}}]}]\n"
                                  "run: {until: 100, every: 1}\n";
    char text[256];
    snprintf(text, sizeof text, repeats, 20); /* the first at 0, where a window begins anyway */
    plan = read_plan(&in, text, NULL, 0);
    ck_assert_uint_eq(plan->n_windows, 20);
    ck_assert_uint_eq(in.model.notes.n, 0);
    reading_end(&in);
    snprintf(text, sizeof text, repeats, 21);
    plan = read_plan(&in, text, NULL, 0);
    ck_assert_uint_eq(plan->n_windows, 1);
    check_window(&plan->windows[0], "all", 0, 100, 0, 1, 0, 101);
    ck_assert_uint_eq(in.model.notes.n, 1);
    ck_assert_ptr_nonnull(
        strstr(in.model.notes.lines[0], "into 21 windows; above 20 there is one"));
    reading_end(&in);
}
END_TEST

START_TEST(named_windows) {
    reading in;
    const tarry_run_plan *plan = read_plan(
        &in,
        "run:\n"
        "  until: 100\n"
        "  every: 10\n"
        "  windows: {late: [50, 95], early: [0, 50], most: [10, 95], tail: [95, 100]}\n",
        NULL, 0);
    ck_assert_uint_eq(plan->n_windows, 4);
    ck_assert_uint_eq(plan->n_spans, 4); /* 0 10 50 95 100 */
    check_window(&plan->windows[0], "late", 50, 95, 2, 3, 5, 10);
    check_window(&plan->windows[1], "early", 0, 50, 0, 2, 0, 5); /* frame 5 is late's */
    check_window(&plan->windows[2], "most", 10, 95, 1, 3, 1, 10);
    check_window(&plan->windows[3], "tail", 95, 100, 3, 4, 10, 11);
    reading_end(&in);
    /* Frames at multiples of a fraction that is not binary: frame 3 is at 0.30000000000000004. */
    plan = read_plan(&in, "run: {until: 1, every: 0.1, windows: {a: [0, 0.3], b: [0.5, 0.9]}}\n",
                     NULL, 0);
    check_window(&plan->windows[0], "a", 0, 0.3, 0, 1, 0, 3);
    check_window(&plan->windows[1], "b", 0.5, 0.9, 2, 3, 5, 10);
    reading_end(&in);
}
END_TEST

START_TEST(wrong_windows) {
    refused("run: {until: 9, windows: {}}\n", 1, 26, "'windows' names no window");
    refused("run: {until: 9, windows: [1]}\n", 1, 26, "'windows' must be a map");
    refused("run: {until: 9, windows: {a: 3}}\n", 1, 30, "a window must be a list");
    refused("run: {until: 9, windows: {a: [3]}}\n", 1, 30, "a window is two times");
    refused("run: {until: 9, windows: {a b: [3, 4]}}\n", 1, 27, "cannot name a window");
    refused("run: {until: 9, windows: {a: [4, 3]}}\n", 1, 30,
            "the window 'a' runs from 4 to 3; it must begin before it ends");
    refused("run: {until: 9, windows: {a: [4, 4]}}\n", 1, 30, "must begin before it ends");
    refused("run: {until: 9, windows: {a: [-1, 4]}}\n", 1, 30, "runs from -1 to 4");
    refused("run: {until: 9, windows: {a: [4, 10]}}\n", 1, 30, "within the record, from 0 to 9");
    refused("run: {until: 9, windows: {a: [4, 5 kb]}}\n", 1, 34, "is a length where a time is due");
}
END_TEST

static void check_channel(const reading *in, size_t i, const char *name, bool recorded,
                          bool correlates) {
    const tarry_channel *channel = &in->builder.channels.items[i];
    ck_assert_str_eq(channel->name, name);
    ck_assert_int_eq(channel->recorded, recorded);
    ck_assert_int_eq(channel->correlates, correlates);
}

START_TEST(what_is_recorded) {
    reading in;
    read_plan(&in, "run: {until: 1}\n", NULL, 0);
    ck_assert_uint_eq(in.builder.channels.n, 6); /* the allele's own state is hidden */
    check_channel(&in, 0, "vela.open", true, false);
    check_channel(&in, 1, "vela.nascent", true, true);
    check_channel(&in, 2, "vela.transcript", true, true);
    check_channel(&in, 3, "clasp", true, false);
    check_channel(&in, 5, "spot", true, true);
    ck_assert_int_eq(in.builder.channels.items[5].signal, 0);
    ck_assert_int_eq(in.builder.channels.items[5].species, TARRY_NONE);
    ck_assert_int_eq(in.builder.channels.items[1].species, 2);
    reading_end(&in);
    read_plan(&in, "run: {until: 1, record: [pin, vela]}\n", NULL, 0);
    check_channel(&in, 0, "vela.open", true, false);
    check_channel(&in, 1, "vela.nascent", true, true);
    check_channel(&in, 3, "clasp", false, false);
    check_channel(&in, 4, "pin", true, false);
    check_channel(&in, 5, "spot", false, false);
    reading_end(&in);
    read_plan(&in, "run: {until: 1, record: [spot, vela.transcript]}\n", NULL, 0);
    check_channel(&in, 0, "vela.open", false, false);
    check_channel(&in, 2, "vela.transcript", true, true);
    check_channel(&in, 5, "spot", true, true);
    reading_end(&in);
    refused("run: {until: 1, record: [vela.nasent]}\n", 1, 26, "did you mean 'vela.nascent'?");
    refused("run: {until: 1, record: [zzzzzz]}\n", 1, 26, "only those can be recorded");
    refused("run: {until: 1, record: clasp}\n", 1, 25, "'record' must be a list");
}
END_TEST

static int make_many(tarry_builder *builder, tarry_error *error) {
    int code = 0;
    for (uint32_t i = 0; code == 0 && i < 195; i++) {
        const tarry_species row = {.name = tarry_arena_format(builder->arena, "x%u", i),
                                   .gene = TARRY_NONE};
        ck_assert_int_eq(TARRY_APPEND(&builder->species, row), 0);
    }
    return code != 0 ? code : make_species(builder, error);
}

START_TEST(more_than_200_names) {
    reader *const with_many[] = {tarry_read_parameters, make_many, tarry_read_protocol,
                                 tarry_read_run};
    reading in;
    reading_start(&in, "run: {until: 1}\n", NULL, 0);
    reading_pass(&in, with_many, 4);
    ck_assert_uint_eq(in.builder.channels.n, 201);
    for (size_t i = 0; i < 201; i++)
        ck_assert(!in.builder.channels.items[i].recorded);
    ck_assert_uint_eq(in.model.notes.n, 1);
    ck_assert(strstr(in.model.notes.lines[0], "There are 201 names") != NULL);
    reading_end(&in);
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"defaults", defaults},
        {"what_is_given", what_is_given},
        {"multiples_that_are_not_binary", multiples_that_are_not_binary},
        {"the_command_line_beats_the_file", the_command_line_beats_the_file},
        {"wrong_times", wrong_times},
        {"wrong_numbers", wrong_numbers},
        {"wrong_options", wrong_options},
        {"windows_between_steps", windows_between_steps},
        {"windows_of_ramps_and_repeats", windows_of_ramps_and_repeats},
        {"named_windows", named_windows},
        {"wrong_windows", wrong_windows},
        {"what_is_recorded", what_is_recorded},
        {"more_than_200_names", more_than_200_names},
    };
    return run_tests("read_run", tests, sizeof tests / sizeof *tests);
}
