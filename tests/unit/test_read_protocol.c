/* SPDX-License-Identifier: GPL-3.0-or-later */

/* `protocol:`. What is right follows from design.md (section 3, Protocol); values by hand. */
#include "reading.h"
#include "support.h"

#include <stdio.h>

/* A gene of two alleles and a plain species, without the rest of the reader of models. */
static int make_names(tarry_builder *builder, tarry_error *error) {
    static const struct {
        const char *name;
        tarry_species_role role;
        int32_t gene;
    } rows[] = {{"vela.shut", TARRY_SPECIES_STATE, 0},
                {"vela.open", TARRY_SPECIES_STATE, 0},
                {"vela.nascent", TARRY_SPECIES_STAGE, 0},
                {"vela.transcript", TARRY_SPECIES_PRODUCT, 0},
                {"load", TARRY_SPECIES_PLAIN, TARRY_NONE}};
    static const char *const states[] = {"shut", "open"};
    const tarry_gene gene = {.name = "vela", .promoters = {0, 2}};
    const tarry_place place = {0};
    int code = 0;
    for (uint32_t i = 0; code == 0 && i < sizeof rows / sizeof *rows; i++) {
        const tarry_species row = {
            .name = rows[i].name, .role = rows[i].role, .gene = rows[i].gene};
        ck_assert_int_eq(TARRY_APPEND(&builder->species, row), 0);
        code = tarry_builder_enter(builder, TARRY_SYMBOL_SPECIES, row.name, i, place, error);
    }
    for (uint32_t i = 0; i < 2; i++) {
        const tarry_promoter_state state = {.name = states[i], .species = i};
        const tarry_promoter promoter = {.allele = i, .states = {0, 2}};
        ck_assert_int_eq(TARRY_APPEND(&builder->states, state), 0);
        ck_assert_int_eq(TARRY_APPEND(&builder->promoters, promoter), 0);
    }
    ck_assert_int_eq(TARRY_APPEND(&builder->genes, gene), 0);
    return code != 0 ? code
                     : tarry_builder_enter(builder, TARRY_SYMBOL_GENE, "vela", 0, place, error);
}

static reader *const readers[] = {tarry_read_parameters, make_names, tarry_read_protocol};

#define HEAD                                                                                       \
    "parameters: {k: 1, twice: 2 * k, lag: 5 min, four: 2 * twice}\n"                              \
    "run: {until: 100}\n"                                                                          \
    "protocol:\n"

static void refused(const char *text, int line, int column, const char *words) {
    reading_refused(text, NULL, 0, readers, 3, TARRY_INPUT, line, column, words);
}

static void check_values(const tarry_segment *segment, double start, const double *values,
                         const char *text) {
    ck_assert_msg(segment->start == start, "%g", segment->start);
    for (size_t i = 0; i < 4; i++)
        ck_assert_msg(segment->parameters[i] == values[i], "parameter %zu: %g, not %g", i,
                      segment->parameters[i], values[i]);
    ck_assert_str_eq(segment->text, text);
}

START_TEST(without_a_protocol) {
    reading in;
    reading_start(&in, "parameters: {k: 1, twice: 2 * k, lag: 5 min, four: 2 * twice}\n", NULL, 0);
    reading_pass(&in, readers, 3);
    ck_assert_uint_eq(in.builder.segments.n, 1);
    check_values(&in.builder.segments.items[0], 0, (double[]){1, 2, 5, 4}, "");
    ck_assert_uint_eq(in.builder.settings.n, 0);
    reading_end(&in);
}
END_TEST

START_TEST(parameters_and_what_follows_them) {
    reading in;
    reading_start(&in,
                  HEAD "- {at: 1 h, set: {twice: 10 * k}}\n" /* third in time */
                       "- {at: 20, set: {k: 3, lag: 2 * lag + k}}\n"
                       "- {at: 20, set: {k: k + 1}}\n" /* after the other at 20 */
                       "- {at: 100, set: {k: 7}}\n",
                  NULL, 0);
    reading_pass(&in, readers, 3);
    ck_assert_uint_eq(in.builder.segments.n, 4);
    check_values(&in.builder.segments.items[0], 0, (double[]){1, 2, 5, 4}, "");
    check_values(&in.builder.segments.items[1], 20, (double[]){4, 8, 11, 16},
                 "k = 3, lag = 2 * lag + k, k = k + 1");
    check_values(&in.builder.segments.items[2], 60, (double[]){4, 40, 11, 80}, "twice = 10 * k");
    /* Once set, `twice` no longer follows k. */
    check_values(&in.builder.segments.items[3], 100, (double[]){7, 40, 11, 80}, "k = 7");
    reading_end(&in);
}
END_TEST

START_TEST(species_and_promoters) {
    reading in;
    reading_start(&in,
                  HEAD "- {at: 0, set: {load: 4 * k, vela.promoter: open, k: 2}}\n"
                       "- {at: 5, set: {vela.transcript: 0}}\n"
                       "- {at: 6, set: {k: 1}}\n",
                  NULL, 0);
    reading_pass(&in, readers, 3);
    ck_assert_uint_eq(in.builder.segments.n, 4);
    const tarry_segment *segments = in.builder.segments.items;
    const tarry_setting *settings = in.builder.settings.items;
    ck_assert_uint_eq(segments[0].settings.to, 0);
    ck_assert_uint_eq(segments[1].settings.from, 0);
    ck_assert_uint_eq(segments[1].settings.to, 3);
    ck_assert_str_eq(segments[1].text, "load = 4 * k, vela.promoter = open, k = 2");
    ck_assert(settings[0].species == 4 && settings[0].value == 4); /* k before the step */
    for (uint32_t i = 0; i < 2; i++) {                             /* every allele */
        ck_assert_int_eq(settings[1 + i].species, TARRY_NONE);
        ck_assert_uint_eq(settings[1 + i].promoter, i);
        ck_assert_uint_eq(settings[1 + i].state, 1);
    }
    ck_assert_int_eq(settings[1].place.line, 4);
    ck_assert_uint_eq(segments[2].settings.from, 3);
    ck_assert_uint_eq(segments[2].settings.to, 4);
    ck_assert(settings[3].species == 3 && settings[3].value == 0);
    ck_assert(segments[3].settings.from == segments[3].settings.to);
    reading_end(&in);
}
END_TEST

START_TEST(wrong_steps) {
    refused("run: {until: 9}\nprotocol: {at: 1}\n", 2, 11, "'protocol' must be a list");
    refused("run: {until: 9}\nprotocol: [5]\n", 2, 12, "a step of the protocol must be a map");
    refused("protocol: [{at: 5, set: {k: 1}}]\n", 1, 1, "'run' needs 'until'");
    refused(HEAD "- {att: 5}\n", 4, 4, "did you mean 'at'?");
    refused(HEAD "- {set: {k: 1}}\n", 4, 3, "a step of the protocol needs 'at'");
    refused(HEAD "- {at: 5}\n", 4, 3, "a step of the protocol needs 'set'");
    refused(HEAD "- {at: 5, set: {}}\n", 4, 16, "'set' is empty");
    refused(HEAD "- {at: 5, set: k}\n", 4, 16, "'set' must be a map");
    refused(HEAD "- {at: -5, set: {k: 1}}\n", 4, 8, "a step at -5 lies outside the record");
    refused(HEAD "- {at: 2 h, set: {k: 1}}\n", 4, 8,
            "a step at 120 lies outside the record, which runs from 0 to 100 ('until')");
    refused(HEAD "- {at: 2 kb, set: {k: 1}}\n", 4, 8, "is a length where a time is due");
    refused(HEAD "- {at: load, set: {k: 1}}\n", 4, 8, "cannot depend on 'load'");
}
END_TEST

START_TEST(what_cannot_be_set) {
    refused(HEAD "- {at: 5, set: {kk: 1}}\n", 4, 17, "there is no 'kk' to set; did you mean 'k'?");
    refused(HEAD "- {at: 5, set: {zzzzzz: 1}}\n", 4, 17, "a step sets parameters, species, and");
    refused(HEAD "- {at: 5, set: {lag: 3 kb}}\n", 4, 22, "is a length where a time is due");
    refused(HEAD "- {at: 5, set: {k: 1 / 0}}\n", 4, 20, "'k' is set to what is no finite number");
    refused(HEAD "- {at: 5, set: {k: load}}\n", 4, 20, "cannot depend on 'load'");
    refused(HEAD "- {at: 5, set: {k: [1]}}\n", 4, 20, "k must be a single value");
    refused(HEAD "- {at: 5, set: {vela.open: 1}}\n", 4, 17,
            "'vela.open' is a promoter state, which a step cannot set; write vela.promoter: STATE");
    refused(HEAD "- {at: 5, set: {vela.nascent: 1}}\n", 4, 17, "'vela.nascent' is a stage");
    refused(HEAD "- {at: 5, set: {load: 1.5}}\n", 4, 23, "a whole number from 0 on, not '1.5'");
    refused(HEAD "- {at: 5, set: {load: -1}}\n", 4, 23, "a whole number from 0 on, not '-1'");
    refused(HEAD "- {at: 5, set: {load: 1e17}}\n", 4, 23, "a whole number from 0 on");
    refused(HEAD "- {at: 5, set: {vela.promoter: ajar}}\n", 4, 32,
            "'ajar' is no state of 'vela'; its states are: shut, open");
    refused(HEAD "- {at: 5, set: {mira.promoter: open}}\n", 4, 17, "there is no 'mira.promoter'");
    refused("parameters: {a: 1, b: 1 / (a - 3)}\nrun: {until: 9}\nprotocol:\n"
            "- {at: 5, set: {a: 3}}\n",
            1, 23, "after the protocol's step in line 4: 'b', which is 1 / (a - 3), comes to no");
}
END_TEST

/* ---- ramps and repeats ------------------------------------------------------------------------
 */

/* Values at the middles of four stretches of a line from 1 to 3, then 3 (docs/model.md). */
START_TEST(ramp) {
    static const double k[] = {1.25, 1.75, 2.25, 2.75, 3};
    static const tarry_moment moments[] = {TARRY_MOMENT_STEP, TARRY_MOMENT_RAMP_PART,
                                           TARRY_MOMENT_RAMP_PART, TARRY_MOMENT_RAMP_PART,
                                           TARRY_MOMENT_RAMP_END};
    reading in;
    reading_start(&in, HEAD "- {from: 10, to: 30, ramp: {k: 3 * k}, steps: 4}\n", NULL, 0);
    reading_pass(&in, readers, 3);
    ck_assert_uint_eq(in.builder.segments.n, 6);
    for (size_t i = 0; i < 5; i++) {
        const tarry_segment *segment = &in.builder.segments.items[1 + i];
        char text[64] = "k to 3 * k in 4 steps until 30 min";
        if (i > 0)
            snprintf(text, sizeof text, "k = %g", k[i]);
        check_values(segment, 10 + 5 * (double)i, (double[]){k[i], 2 * k[i], 5, 4 * k[i]}, text);
        ck_assert_int_eq(segment->moment, moments[i]);
    }
    reading_end(&in);
}
END_TEST

/* A ramp begins where the one before has ended, also where the file names it first; a step in its
 * midst sets something else, and makes its time a step. */
START_TEST(ramps_meet_steps) {
    reading in;
    reading_start(&in,
                  HEAD "- {from: 20, to: 30, ramp: {k: 13}, steps: 1}\n"
                       "- {from: 0, to: 20, ramp: {k: 3, lag: 6}, steps: 2}\n"
                       "- {at: 10, set: {load: 4 * k}}\n"
                       "- {at: 30, set: {k: k + 1}}\n",
                  NULL, 0);
    reading_pass(&in, readers, 3);
    const tarry_segment *segments = in.builder.segments.items;
    ck_assert_uint_eq(in.builder.segments.n, 5);
    check_values(&segments[1], 0, (double[]){1.5, 3, 5.25, 6},
                 "k to 3 in 2 steps until 20 min, lag to 6 in 2 steps until 20 min");
    check_values(&segments[2], 10, (double[]){2.5, 5, 5.75, 10},
                 "k = 2.5, lag = 5.75, load = 4 * k");
    ck_assert_int_eq(segments[2].moment, TARRY_MOMENT_STEP);
    ck_assert(in.builder.settings.items[0].value == 10);
    check_values(&segments[3], 20, (double[]){8, 16, 6, 32},
                 "k = 3, lag = 6, k to 13 in 1 steps until 30 min");
    check_values(&segments[4], 30, (double[]){14, 28, 6, 56}, "k = 13, k = k + 1");
    reading_end(&in);
}
END_TEST

/* Two readings come to the same segments. */
static void check_same(const char *one_text, const char *other_text, size_t n) {
    reading one, other;
    reading_start(&one, one_text, NULL, 0);
    reading_pass(&one, readers, 3);
    reading_start(&other, other_text, NULL, 0);
    reading_pass(&other, readers, 3);
    ck_assert_uint_eq(one.builder.segments.n, n);
    ck_assert_uint_eq(other.builder.segments.n, n);
    for (size_t i = 0; i < n; i++) {
        const tarry_segment *a = &one.builder.segments.items[i];
        const tarry_segment *b = &other.builder.segments.items[i];
        check_values(a, b->start, b->parameters, b->text);
        ck_assert_int_eq(a->moment, b->moment);
        ck_assert_uint_eq(a->settings.from, b->settings.from);
        ck_assert_uint_eq(a->settings.to, b->settings.to);
    }
    reading_end(&one);
    reading_end(&other);
}

START_TEST(repeats) {
    check_same(HEAD
               "- {every: 10, times: 3, do: [{at: 4, set: {k: 5}}, {at: 1, set: {k: k + 1}}]}\n",
               HEAD "- {at: 1, set: {k: k + 1}}\n"
                    "- {at: 4, set: {k: 5}}\n"
                    "- {at: 11, set: {k: k + 1}}\n"
                    "- {at: 14, set: {k: 5}}\n"
                    "- {at: 21, set: {k: k + 1}}\n"
                    "- {at: 24, set: {k: 5}}\n",
               7);
    check_same(HEAD "- {from: 30, every: 0.5 h, times: 2, do: [{from: 5, to: 10, ramp: {k: 2 * k}, "
                    "steps: 2}, {at: 20, set: {lag: 1, load: 3}}]}\n",
               HEAD "- {from: 65, to: 70, ramp: {k: 2 * k}, steps: 2}\n"
                    "- {from: 35, to: 40, ramp: {k: 2 * k}, steps: 2}\n"
                    "- {at: 50, set: {lag: 1, load: 3}}\n"
                    "- {at: 80, set: {lag: 1, load: 3}}\n",
               9);
}
END_TEST

START_TEST(wrong_ramps) {
    refused(HEAD "- {to: 9, ramp: {k: 2}, steps: 5}\n", 4, 3,
            "a ramp of the protocol needs 'from'");
    refused(HEAD "- {from: 1, ramp: {k: 2}, steps: 5}\n", 4, 3,
            "a ramp of the protocol needs 'to'");
    refused(HEAD "- {from: 1, to: 9, ramp: {k: 2}}\n", 4, 3,
            "a ramp of the protocol needs 'steps'");
    refused(HEAD "- {from: 1, to: 9, steps: 5}\n", 4, 3, "a ramp of the protocol needs 'ramp'");
    refused(HEAD "- {from: 1, to: 9, ramp: {k: 2}, steps: 5, set: {k: 1}}\n", 4, 44,
            "a ramp of the protocol has no key 'set'");
    refused(HEAD "- {from: 1, to: 9, ramp: {}, steps: 5}\n", 4, 26, "'ramp' is empty");
    refused(HEAD "- {from: 1, to: 9, ramp: {k: 2}, steps: 0}\n", 4, 41,
            "'steps' must be a whole number from 1 to 10000");
    refused(HEAD "- {from: 9, to: 9, ramp: {k: 2}, steps: 5}\n", 4, 17, "must end after it begins");
    refused(HEAD "- {from: -1, to: 9, ramp: {k: 2}, steps: 5}\n", 4, 10,
            "a step at -1 lies outside");
    refused(HEAD "- {from: 1, to: 101, ramp: {k: 2}, steps: 5}\n", 4, 17,
            "a step at 101 lies outside the record");
    refused(HEAD "- {from: 1, to: 9, ramp: {load: 2}, steps: 5}\n", 4, 27,
            "a ramp changes parameters, and 'load' is none");
    refused(HEAD "- {from: 1, to: 9, ramp: {vela.promoter: open}, steps: 5}\n", 4, 27,
            "and 'vela.promoter' is none");
    refused(HEAD "- {from: 1, to: 9, ramp: {laag: 2}, steps: 5}\n", 4, 27, "did you mean 'lag'?");
    refused(HEAD "- {from: 1, to: 9, ramp: {lag: 2 kb}, steps: 5}\n", 4, 32, "is a length where");
    refused(HEAD "- {from: 1, to: 9, ramp: {k: 2}, steps: 5}\n- {at: 5, set: {k: 7}}\n", 5, 17,
            "'k' is on its way in the ramp of line 4");
    refused(HEAD "- {from: 1, to: 9, ramp: {k: 2}, steps: 5}\n"
                 "- {from: 8, to: 10, ramp: {k: 2}, steps: 5}\n",
            5, 28, "'k' is on its way in the ramp of line 4");
}
END_TEST

START_TEST(wrong_repeats) {
    refused(HEAD "- {every: 5, times: 2}\n", 4, 3, "a repeat of the protocol needs 'do'");
    refused(HEAD "- {every: 5, do: [{at: 1, set: {k: 2}}]}\n", 4, 3, "needs 'times'");
    refused(HEAD "- {times: 5, do: [{at: 1, set: {k: 2}}]}\n", 4, 3, "needs 'every'");
    refused(HEAD "- {every: 0, times: 2, do: [{at: 1, set: {k: 2}}]}\n", 4, 11,
            "'every' is the time from one repeat to the next and above 0, not 0");
    refused(HEAD "- {every: 5, times: 0, do: [{at: 1, set: {k: 2}}]}\n", 4, 21,
            "'times' must be a whole number from 1");
    refused(HEAD "- {every: 5, times: 2, do: []}\n", 4, 28, "'do' is empty");
    refused(HEAD "- {every: 5, times: 2, do: {at: 1}}\n", 4, 28, "'do' must be a list");
    refused(HEAD "- {every: 5, times: 2, do: [7]}\n", 4, 29, "a step under 'do' must be a map");
    refused(HEAD "- {every: 5, times: 2, do: [{every: 1, times: 2, do: []}]}\n", 4, 29,
            "a repeat cannot stand in another one");
    refused(HEAD "- {every: 5, times: 2, do: [{set: {k: 1}}]}\n", 4, 29, "needs 'at'");
    refused(HEAD "- {every: 5, times: 2, at: 3, do: [{at: 1, set: {k: 2}}]}\n", 4, 24,
            "a repeat of the protocol has no key 'at'");
    refused(HEAD "- {every: 25, times: 5, do: [{at: 1, set: {k: 2}}]}\n", 4, 35,
            "a step at 101 (repeat 5) lies outside the record");
    refused(HEAD "- {every: 0.00001, times: 1000000, do: [{at: 1, set: {k: 2}}]}\n", 4, 46,
            "more than 100000 steps");
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"without_a_protocol", without_a_protocol},
        {"parameters_and_what_follows_them", parameters_and_what_follows_them},
        {"species_and_promoters", species_and_promoters},
        {"wrong_steps", wrong_steps},
        {"what_cannot_be_set", what_cannot_be_set},
        {"ramp", ramp},
        {"ramps_meet_steps", ramps_meet_steps},
        {"repeats", repeats},
        {"wrong_ramps", wrong_ramps},
        {"wrong_repeats", wrong_repeats},
    };
    return run_tests("read_protocol", tests, sizeof tests / sizeof *tests);
}
