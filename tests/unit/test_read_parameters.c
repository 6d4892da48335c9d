/* SPDX-License-Identifier: GPL-3.0-or-later */

/* `parameters:` and --set. Values are worked out by hand; units of time are those of the SI
 * brochure (BIPM, 9th edition, table 8). */
#include "base/text.h"
#include "reading.h"
#include "support.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

static reader *const readers[] = {tarry_read_parameters};

static void refused_set(const char *text, const char *name, const char *value, int line, int column,
                        const char *words) {
    const tarry_override given = {"--set", 1, name, value};
    reading_refused(text, &given, 1, readers, 1, TARRY_INPUT, line, column, words);
}

static void refused(const char *text, int line, int column, const char *words) {
    reading_refused(text, NULL, 0, readers, 1, TARRY_INPUT, line, column, words);
}

START_TEST(values) {
    reading in;
    reading_start(&in,
                  "parameters:\n"
                  "  dwell: length / speed + pause\n" /* before what it reads */
                  "  pause: {value: 30 s}\n"
                  "  length: 4.2 kb\n"
                  "  speed: 1.8 kb/min\n"
                  "  k: log(2) / dwell\n"
                  "  bare: 3\n",
                  NULL, 0);
    reading_pass(&in, readers, 1);
    const double dwell = 4200.0 / 1800.0 + 0.5;
    ck_assert(reading_parameter(&in, "dwell") == dwell);
    ck_assert(reading_parameter(&in, "pause") == 0.5);
    ck_assert(reading_parameter(&in, "k") == log(2) / dwell);
    ck_assert(reading_parameter(&in, "bare") == 3);
    const tarry_dimension unit = in.builder.parameters.items[0].dimension;
    ck_assert(unit.known && unit.time == 1 && unit.length == 0);
    ck_assert(in.builder.parameters.items[4].dimension.time == -1);
    ck_assert(!in.builder.parameters.items[5].dimension.known);
    ck_assert_uint_eq(in.builder.parameters.n, 6);
    reading_end(&in);
    reading_start(&in, "genes: {}\n", NULL, 0);
    reading_pass(&in, readers, 1);
    ck_assert_uint_eq(in.builder.parameters.n, 0);
    reading_end(&in);
}
END_TEST

START_TEST(values_from_the_command_line) {
    const tarry_override given[] = {
        {"--set", 1, "k", "2 * bare"}, {"--cells", 0, "cells", "7"}, {"--set", 1, "lag", "90 s"}};
    reading in;
    reading_start(&in, "parameters: {k: 0.1 /min, lag: 2 min, bare: 3, twice: 2 * k}\n", given, 3);
    reading_pass(&in, readers, 1);
    ck_assert(reading_parameter(&in, "k") == 6);
    ck_assert(reading_parameter(&in, "twice") == 12);
    ck_assert(reading_parameter(&in, "lag") == 1.5);
    /* A bare number takes the unit that the file gives. */
    ck_assert(in.builder.parameters.items[0].dimension.time == -1);
    reading_end(&in);
}
END_TEST

START_TEST(what_is_refused) {
    refused("parameters: [a]\n", 1, 13, "'parameters' must be a map");
    refused("parameters:\n  min: 3\n", 2, 3, "is a unit or a function");
    refused("parameters:\n  2k: 3\n", 2, 3, "cannot name a parameter");
    refused("parameters:\n  vela.k: 3\n", 2, 3, "cannot name a parameter");
    refused("parameters:\n  k:\n", 2, 5, "k has no value");
    refused("parameters:\n  k: [3]\n", 2, 6, "k");
    refused("parameters:\n  k: {mean: 3}\n", 2, 7, "k has no key 'mean'");
    refused("parameters:\n  k: {}\n", 2, 6, "k needs 'value'");
    refused("parameters:\n  k: kk + 1\n  kl: 2\n", 2, 6, "did you mean");
    refused("parameters:\n  a: 2 min\n  b: 3 + a * c\n  c: 1 kb\n  e: a + c\n", 5, 8,
            "a time and a length cannot be added");
    refused("parameters:\n  e: a + c\n  a: 2 min\n  c: 1 kb\n", 2, 8,
            "a time and a length cannot be added");
    refused("parameters:\n  a: 2\n  b: a / (a - 2)\n", 3, 6,
            "'b', which is a / (a - 2), comes to no finite number");
}
END_TEST

START_TEST(circles) {
    refused("parameters:\n  a: 2\n  b: c + a\n  c: e\n  e: a * b\n", 3, 3,
            "in a circle: b -> c -> e -> b; one of them needs a number");
    refused("parameters:\n  a: a + 1\n", 2, 3, "in a circle: a -> a;");
    refused_set("parameters: {a: 2, b: a * 3}\n", "a", "b + 1", 1, 14, "in a circle: a -> b -> a;");
    tarry_text text = {0};
    tarry_text_add_string(&text, "parameters:\n");
    for (int i = 0; i < 100; i++)
        tarry_text_printf(&text, "  k%d: k%d\n", i, (i + 1) % 100);
    refused(text.data, 2, 3,
            "k0 -> k1 -> k2 -> k3 -> k4 -> k5 -> k6 -> k7 -> k8 -> k9 -> k10 -> "
            "k11 -> ... -> k0; one");
    tarry_text_release(&text);
}
END_TEST

START_TEST(what_the_command_line_may_not_give) {
    const char *text = "parameters: {k_open: 0.1 /min, lag: 2 min, two: 2 * k_open}\n";
    refused_set(text, "k_opne", "3", 0, 0,
                "--set k_opne=3: the model has no parameter 'k_opne'; did you mean 'k_open'?");
    refused_set(text, "zzzz", "3", 0, 0, "only what stands under 'parameters' can be set");
    refused_set("genes: {}\n", "k", "3", 0, 0, "the model has no parameters to set");
    refused_set(text, "k_open", "5 min", 0, 0,
                "--set k_open=5 min: '5 min' is a time where a rate (1/time) is due");
    refused_set(text, "k_open", "1 / lag * lag", 0, 0, "is a pure number where a rate");
    refused_set(text, "k_open", "3 nM", 0, 0, "stochastic constants in counts");
    refused_set(text, "k_open", "", 0, 0, "--set k_open=: a value is missing here");
    const tarry_override two[] = {{"--set", 1, "a", "3 min"}, {"--set", 1, "b", "a + 1 kb"}};
    reading_refused("parameters: {a: 1, b: 2}\n", two, 2, readers, 1, TARRY_INPUT, 0, 0,
                    "--set b=a + 1 kb: a time and a length cannot be added");
    refused_set(text, "lag", "1 / 0", 0, 0, "'lag', which is 1 / 0, comes to no finite number");
}
END_TEST

/* A chain as long as this would exhaust the stack of a search that calls itself. */
START_TEST(a_long_chain) {
    enum { LENGTH = 100000 };
    tarry_text text = {0};
    reading in;
    tarry_text_add_string(&text, "parameters:\n");
    for (int i = 0; i < LENGTH; i++)
        tarry_text_printf(&text, "  k%d: k%d + 1\n", i, i + 1);
    tarry_text_printf(&text, "  k%d: 1\n", LENGTH);
    reading_start(&in, text.data, NULL, 0);
    reading_pass(&in, readers, 1);
    ck_assert(reading_parameter(&in, "k0") == LENGTH + 1);
    reading_end(&in);
    tarry_text_release(&text);
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"values", values},
        {"values_from_the_command_line", values_from_the_command_line},
        {"what_is_refused", what_is_refused},
        {"circles", circles},
        {"what_the_command_line_may_not_give", what_the_command_line_may_not_give},
        {"a_long_chain", a_long_chain},
    };
    return run_tests("read_parameters", tests, sizeof tests / sizeof *tests);
}
