/* SPDX-License-Identifier: GPL-3.0-or-later */

/* `signals:`. What is right follows from design.md (section 3, Signals). */
#include "reading.h"
#include "support.h"

#include <math.h>
#include <string.h>

static int make_names(tarry_builder *builder, tarry_error *error) {
    static const struct {
        const char *name;
        tarry_species_role role;
        int32_t lag;
    } rows[] = {{"vela.nascent", TARRY_SPECIES_STAGE, 4},
                {"vela.nuclear", TARRY_SPECIES_STAGE, 6},
                {"vela.protein", TARRY_SPECIES_PRODUCT, TARRY_NONE}};
    int code = 0;
    ck_assert_int_eq(TARRY_APPEND(&builder->genes, ((tarry_gene){.n_copies = 2})), 0);
    /* Each allele has its own for the first stage, 4 and 5; all share 6 for the second. */
    for (int32_t i = 0; i < 7; i++) {
        const int32_t stage = i == 6 ? 1 : i >= 4 ? 0 : TARRY_NONE;
        const tarry_lag lag = {.stage = stage, .allele = i == 5};
        ck_assert_int_eq(TARRY_APPEND(&builder->lags, lag), 0);
    }
    for (uint32_t i = 0; code == 0 && i < sizeof rows / sizeof *rows; i++) {
        const tarry_species row = {.name = rows[i].name, .role = rows[i].role};
        ck_assert_int_eq(TARRY_APPEND(&builder->species, row), 0);
        ck_assert_int_eq(TARRY_APPEND(&builder->stage_lags, rows[i].lag), 0);
        code = tarry_builder_enter(builder, TARRY_SYMBOL_SPECIES, row.name, i, (tarry_place){0},
                                   error);
    }
    return code;
}

static reader *const readers[] = {tarry_read_parameters, make_names, tarry_read_signals};

static void refused(const char *text, int line, int column, const char *words) {
    reading_refused(text, NULL, 0, readers, 3, TARRY_INPUT, line, column, words);
}

static void check_ramp(const tarry_ramp *ramp, uint32_t signal, uint32_t lag, double from,
                       double to, double brightness) {
    ck_assert_uint_eq(ramp->signal, signal);
    ck_assert_uint_eq(ramp->lag, lag);
    ck_assert(ramp->from == from && ramp->to == to && ramp->brightness == brightness);
}

START_TEST(signals) {
    reading in;
    reading_start(
        &in,
        "parameters: {length: 5 kb, label: 1 kb}\n"
        "signals:\n"
        "  spot: {of: vela.nascent, ramp: {from: label / length, to: 0.4}, brightness: 3,\n"
        "         background: 2, noise: 0.3}\n"
        "  plain: {of: vela.protein, brightness: 0.05, responds_above: 2 * 3}\n"
        "  sum: {sum: {vela.nascent: {ramp: {from: 0.1, to: 0.1}, brightness: 2},\n"
        "              vela.nuclear: {ramp: {from: 0, to: 1}}, vela.protein: -1},\n"
        "        noise: {fixed: 4, share: 0.2}}\n"
        "  one: {of: vela.nascent, allele: 2, brightness: 7}\n",
        NULL, 0);
    reading_pass(&in, readers, 3);
    const tarry_signal *rows = in.builder.signals.items;
    ck_assert_uint_eq(in.builder.signals.n, 4);
    ck_assert_uint_eq(in.builder.ramps.n, 6);
    ck_assert(isnan(rows[0].responds_above) && rows[1].responds_above == 6);
    ck_assert_uint_eq(in.builder.weights.n, 2);
    ck_assert_str_eq(rows[0].name, "spot");
    ck_assert(rows[0].background == 2 && rows[0].noise == 0.3);
    ck_assert(rows[0].weights.from == 0 && rows[0].weights.to == 0);
    ck_assert(rows[1].weights.from == 0 && rows[1].weights.to == 1);
    ck_assert(rows[1].background == 0 && rows[1].noise == 0);
    ck_assert(rows[2].weights.from == 1 && rows[2].weights.to == 2 && rows[2].noise == 4);
    ck_assert(rows[0].share == 0 && rows[2].share == 0.2);
    check_ramp(&in.builder.ramps.items[0], 0, 4, 0.2, 0.4, 3);
    check_ramp(&in.builder.ramps.items[1], 0, 5, 0.2, 0.4, 3);
    check_ramp(&in.builder.ramps.items[2], 2, 4, 0.1, 0.1, 2);
    check_ramp(&in.builder.ramps.items[3], 2, 5, 0.1, 0.1, 2);
    check_ramp(&in.builder.ramps.items[4], 2, 6, 0, 1, 1);
    check_ramp(&in.builder.ramps.items[5], 3, 5, 0, 0, 7);
    ck_assert(in.builder.weights.items[0].species == 2 &&
              in.builder.weights.items[0].weight == 0.05);
    ck_assert(in.builder.weights.items[1].weight == -1);
    ck_assert_int_eq(tarry_builder_find(&in.builder, TARRY_SYMBOL_SIGNAL, "sum"), 2);
    /* Kept, so that a step that would change it is found. */
    ck_assert_uint_eq(in.builder.constants.n, 1);
    reading_end(&in);
}
END_TEST

#define S "signals:\n  spot: "

START_TEST(what_is_refused) {
    refused("signals: [1]\n", 1, 10, "'signals' must be a map");
    refused(S "{}\n", 2, 9, "the signal 'spot' needs either 'of'");
    refused(S "{of: vela.nascent, sum: {vela.protein: 1}}\n", 2, 9, "needs either 'of'");
    refused(S "3\n", 2, 9, "spot must be a map");
    refused("signals: {s: {of: vela.nascent}}\n", 1, 11, "is a unit or a function");
    refused(S "{of: vela.nacent}\n", 2, 14, "did you mean 'vela.nascent'?");
    refused(S "{off: vela.nascent}\n", 2, 10, "did you mean 'of'?");
    refused(S "{of: [vela.nascent]}\n", 2, 14, "'of' must be a single value");
    refused(S "{of: spot}\n", 2, 14, "'spot' is a signal; here a species is due");
    refused(S "{of: vela.protein, ramp: {from: 0, to: 1}}\n", 2, 14, "'vela.protein' is no stage");
    refused(S "{of: vela.nascent, ramp: 0.5}\n", 2, 34, "'ramp' must be a map");
    refused(S "{of: vela.nascent, ramp: {from: 0}}\n", 2, 34, "'ramp' needs 'to'");
    refused(S "{of: vela.nascent, ramp: {to: 1}}\n", 2, 34, "'ramp' needs 'from'");
    refused(S "{of: vela.nascent, ramp: {from: 0.5, to: 0.4}}\n", 2, 34, "goes from 0.5 to 0.4");
    refused(S "{of: vela.nascent, ramp: {from: -0.5, to: 0.4}}\n", 2, 34, "both from 0 to 1");
    refused(S "{of: vela.nascent, ramp: {from: 0.5, to: 1.4}}\n", 2, 34, "both from 0 to 1");
    refused(S "{of: vela.nascent, ramp: {from: 2 kb, to: 1}}\n", 2, 41,
            "is a length where a pure number is due");
    refused(S "{of: vela.nascent, ramp: {from: vela.protein, to: 1}}\n", 2, 41, "cannot depend on");
    refused(S "{of: vela.nascent, brightness: 2 min}\n", 2, 40, "is a time where a pure number");
    refused(S "{of: vela.nascent, noise: -1}\n", 2, 35, "the sd of the read-out noise");
    refused(S "{of: vela.nascent, noise: {fix: 1}}\n", 2, 36, "'noise' has no key 'fix'");
    refused(S "{of: vela.nascent, background: 1/0}\n", 2, 40, "no finite number");
    refused(S "{of: vela.nascent, responds_above: 2 min}\n", 2, 44,
            "is a time where a pure number");
    refused(S "{of: vela.nascent, responds_above: 1/0}\n", 2, 44, "no finite number");
    refused(S "{sum: {}}\n", 2, 15, "'sum' is empty");
    refused(S "{sum: 3}\n", 2, 15, "'sum' must be a map");
    refused(S "{sum: {vela.nasent: 1}}\n", 2, 16, "did you mean 'vela.nascent'?");
    refused(S "{sum: {vela.protein: [1]}}\n", 2, 30, "vela.protein must be a map");
    refused(S "{sum: {vela.protein: {weight: 1}}}\n", 2, 31, "has no key 'weight'");
    refused(S "{sum: {vela.protein: {ramp: {from: 0, to: 1}}}}\n", 2, 16, "is no stage");
    refused(S "{sum: {vela.protein: 1}, brightness: 2}\n", 2, 34, "'brightness' goes with 'of'");
    refused(S "{sum: {vela.protein: 1}, ramp: {from: 0, to: 1}}\n", 2, 34, "'ramp' goes with 'of'");
    refused(S "{of: vela.nascent, allele: 0}\n", 2, 36, "from 1 to 1000");
    refused(S "{of: vela.nascent, allele: 3}\n", 2, 14, "there is no allele 3 of");
    refused(S "{of: vela.nuclear, allele: 1}\n", 2, 14, "in the first stage of a transcript only");
    refused(S "{of: vela.nascent, noise: {fixed: 1, share: -0.1}}\n", 2, 35,
            "'share' is the sd of the noise as a share");
    refused(S "{of: vela.nascent, noise: {share: 1 min}}\n", 2, 43,
            "is a time where a pure number");
}
END_TEST

int main(void) {
    const test_entry tests[] = {{"signals", signals}, {"what_is_refused", what_is_refused}};
    return run_tests("read_signals", tests, sizeof tests / sizeof *tests);
}
