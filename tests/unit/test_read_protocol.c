/* `protocol:`. What is right follows from design.md (section 3, Protocol); values by hand. */
#include "reading.h"
#include "support.h"

#include <string.h>

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

static void not_yet(const char *text, int line, int column, const char *words) {
    reading_refused(text, NULL, 0, readers, 3, TARRY_NOT_YET, line, column, words);
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

START_TEST(later_versions) {
    not_yet(HEAD "- {from: 0, to: 10, ramp: {k: 2}, steps: 50}\n", 4, 21, "'ramp' cannot be used");
    not_yet(HEAD "- {every: 2 h, times: 5, do: []}\n", 4, 4, "'every' cannot be used yet");
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"without_a_protocol", without_a_protocol},
        {"parameters_and_what_follows_them", parameters_and_what_follows_them},
        {"species_and_promoters", species_and_promoters},
        {"wrong_steps", wrong_steps},
        {"what_cannot_be_set", what_cannot_be_set},
        {"later_versions", later_versions},
    };
    return run_tests("read_protocol", tests, sizeof tests / sizeof *tests);
}
