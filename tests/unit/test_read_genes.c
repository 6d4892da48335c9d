/* SPDX-License-Identifier: GPL-3.0-or-later */

/* What is refused in genes and delays, with the place and the words that help; the rules are those
 * of design.md, section 3. */
#include "network_text.h"
#include "support.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>

/* One gene, 'vela', whose keys begin in line 3, column 5. */
static const char *gene(const char *keys) {
    static char text[4000];
    snprintf(text, sizeof text, "genes:\n  vela:\n%s", keys);
    return text;
}

#define PROMOTER "    promoter: {shut: {to: {open: 1}}, open: {to: {shut: 1}, initiates: 1}}\n"

static void refused(const char *keys, int line, int column, const char *words) {
    network_refused(gene(keys), line, column, words);
}

START_TEST(keys_of_a_gene) {
    refused("    copies: 2\n", 3, 5, "vela needs 'promoter'");
    refused(PROMOTER "    coopies: 2\n", 4, 5, "vela has no key 'coopies'; did you mean 'copies'?");
    refused(PROMOTER "    zzz: 2\n", 4, 5, "its keys are: copies, start, promoter");
    refused(PROMOTER "    copies: 0\n", 4, 13, "'copies' must be a whole number from 1 to 1000");
    refused(PROMOTER "    copies: 1.5\n", 4, 13, "not '1.5'");
    refused(PROMOTER "    protein: {translation: 1}\n", 4, 5, "no transcript to translate");
    network_refused("genes:\n", 1, 7, "'genes' must be a map");
    network_refused("genes: {2vela: {}}\n", 1, 9, "'2vela' cannot name a gene");
    network_refused("genes: {kb: {}}\n", 1, 9, "'kb' is a unit or a function");
    network_refused("parameters: {vela: 1}\ngenes: {vela: {}}\n", 2, 9,
                    "'vela' would name a gene here, but it names a parameter already (line 1)");
}
END_TEST

START_TEST(states) {
    refused("    promoter: {}\n", 3, 15, "needs a state at least");
    refused("    promoter: {a: 3}\n", 3, 19, "a must be a map");
    refused("    promoter: {a: {goes: {b: 1}}}\n", 3, 20, "a has no key 'goes'");
    refused("    promoter: {open: {to: {opem: 1}}, shut: {}}\n", 3, 28,
            "the gene 'vela' has no state 'opem'; did you mean 'open'?");
    refused("    promoter: {open: {to: {open: 1}}}\n", 3, 28, "leads to itself");
    refused("    promoter: {open: {to: {shut: {}}}, shut: {}}\n", 3, 34, "a move needs 'rate'");
    refused("    promoter: {a: {lasts: 3}, b: {}}\n", 3, 19, "lasts: DELAY, then:");
    refused("    promoter: {a: {then: b}, b: {}}\n", 3, 19, "lasts: DELAY, then:");
    refused("    promoter: {a: {lasts: 3, then: b, to: {b: 1}}, b: {}}\n", 3, 39, "not both");
    refused("    promoter: {a: {lasts: 3, then: {b: 0.5, c: 0.4}}, b: {}, c: {}}\n", 3, 36,
            "add up to 0.9; they must add up to 1");
    refused("    promoter: {a: {lasts: 3, then: {b: -1, c: 2}}, b: {}, c: {}}\n", 3, 40,
            "0 or more, not -1");
    refused("    promoter: {steady: {}}\n", 3, 16, "'steady' has a meaning of its own");
    refused("    promoter: {transcript: {}}\n", 3, 16, "'transcript' has a meaning of its own");
    refused("    promoter: {a b: {}}\n", 3, 16, "'a b' cannot name a promoter state");
    refused(
        "    promoter: {a: {lasts: 0, then: b}, b: {lasts: {uniform: {from: 0, to: 1}}, then: c},"
        " c: {lasts: 0 s, then: a}, f: {lasts: 0, then: e}, e: {lasts: 0, then: f}}\n",
        2, 3, "'f' among them, in no time");
}
END_TEST

START_TEST(moves_that_initiate_and_clearance) {
    refused("    promoter: {a: {to: {b: {rate: 1, initiates: maybe}}}, b: {}}\n", 3, 49,
            "'initiates' of a move is yes or no, not 'maybe'");
    refused("    promoter: {a: {to: {b: {initiates: yes}}}, b: {}}\n", 3, 28,
            "a move needs 'rate'");
    refused("    promoter: {a: {to: {b: {rate: 1, initiate: yes}}}, b: {}}\n", 3, 38,
            "did you mean 'initiates'?");
    refused(PROMOTER "    clearance: {gama: 3}\n", 4, 17, "did you mean 'gamma'?");
    refused(PROMOTER "    clearance: 3 kb\n", 4, 16, "a time");
    refused(PROMOTER "    clearance: 1\n    transcript: {stages: {clearance: 1}}\n", 5, 27,
            "'clearance' has a meaning of its own");
    refused("    start: steady\n    clearance: 1\n"
            "    promoter: {a: {to: {b: {rate: 1, initiates: yes}}}, b: {to: {a: 1}}}\n",
            5, 25, "since this move waits for the clearance");
    /* A stage may be called so where there is no clearance. */
    const tarry_network *network = network_of("genes:\n  vela:\n" PROMOTER
                                              "    transcript: {stages: {clearance: 1}}\n");
    ck_assert_uint_eq(network->n_lags, 1);
    network_end();
}
END_TEST

START_TEST(order_on_an_allele) {
    refused(PROMOTER "    transcript: {no_overtaking: true}\n", 4, 18, "this transcript has none");
    refused(PROMOTER "    transcript: {stages: {nascent: 1}, no_overtaking: 1}\n", 4, 55,
            "'no_overtaking' is yes or no, not '1'");
    refused(PROMOTER "    transcript: {stages: {nascent: 1}, headway: 1}\n", 4, 40,
            "'headway' goes with 'no_overtaking: true'");
    refused(PROMOTER "    transcript: {stages: {nascent: 1}, no_overtaking: no, headway: 1}\n", 4,
            59, "'headway' goes with");
    refused(PROMOTER "    transcript: {stages: {nascent: 1}, no_overtaking: yes, headway: -1}\n", 4,
            69, "'headway' must be 0 or more, not -1");
    refused(PROMOTER "    transcript: {stages: {nascent: 1}, no_overtaking: yes, headway: 2 kb}\n",
            4, 69, "a time");
    refused(PROMOTER
            "    transcript: {stages: {nascent: {lasts: 1, lost: 1}}, no_overtaking: yes}\n",
            4, 53, "'lost' does not go with 'no_overtaking'");
    const tarry_network *network = network_of(
        "genes:\n  vela:\n    copies: 3\n" PROMOTER
        "    transcript: {stages: {nascent: 1, nuclear: 2}, no_overtaking: yes, headway: 0.5}\n");
    ck_assert_uint_eq(network->n_lags, 4);
    for (uint32_t i = 0; i < 4; i++) {
        ck_assert(network->lags[i].in_order == (i < 3));
        ck_assert_uint_eq(network->lags[i].allele, i % 3);
        ck_assert(network->lags[i].headway == (i < 3 ? 0.5 : 0));
    }
    network_end();
}
END_TEST

START_TEST(active_states) {
    const tarry_network *network = network_of(
        "genes: {vela: {promoter: {a: {to: {b: {rate: 1, initiates: yes}, c: 1}},\n"
        "  b: {to: {a: {rate: 1, initiates: no}}}, c: {initiates: 1, to: {a: 1}}}}}\n");
    ck_assert(network->genes[0].tells);
    ck_assert(network->states[0].active && !network->states[1].active && network->states[2].active);
    network_end();
}
END_TEST

START_TEST(where_bursts_are_and_how_a_gene_starts) {
    refused(PROMOTER "    bursts_in: open\n", 4, 16, "'bursts_in' must be a list");
    refused(PROMOTER "    bursts_in: [opne]\n", 4, 17, "no state 'opne'; did you mean 'open'?");
    refused(PROMOTER "    start: opne\n", 4, 12, "no state 'opne'; did you mean 'open'?");
    refused(PROMOTER "    start: {open: -1, shut: 2}\n", 4, 19, "0 or more, not -1");
    refused(PROMOTER "    start: {open: 0}\n", 4, 12, "at least one must be above 0");
    refused("    start: steady\n    promoter: {a: {to: {b: 1, c: 1}}, b: {}, c: {}}\n", 2, 3,
            "depends on the state at the start");
    refused("    start: steady\n    promoter: {a: {to: {b: 0}}, b: {to: {a: 0}}}\n", 2, 3,
            "depends on the state at the start");
    refused("    start: steady\n    transcript: {}\n"
            "    promoter: {a: {to: {b: 1 + vela.transcript}}, b: {to: {a: 1}}}\n",
            5, 25, "this rate reads species");
}
END_TEST

START_TEST(transcripts_and_proteins) {
    refused(PROMOTER "    transcript: {decay: 1, half_life: 3}\n", 4, 17, "here stand several");
    refused(PROMOTER "    transcript: {halflife: 3}\n", 4, 18, "did you mean 'half_life'?");
    refused(PROMOTER "    transcript: {half_life: 0}\n", 4, 29,
            "is 0; it must be finite and above 0");
    refused(PROMOTER "    transcript: {decay: -2}\n", 4, 25,
            "the rate of 'vela.transcript decay' is -2");
    refused(PROMOTER "    transcript: {decay: 1 / 0}\n", 4, 25, "");
    refused(PROMOTER "    transcript: {decay: 2 min}\n", 4, 25, "a rate");
    refused(PROMOTER "    transcript: {half_life: 2 /min}\n", 4, 29, "a time");
    refused(PROMOTER "    transcript: {half_life: vela.open}\n", 4, 29,
            "cannot depend on 'vela.open'");
    refused(PROMOTER "    transcript: {stages: {open: 3}}\n", 4, 27,
            "'vela.open' would name a species here, but it names a species already (line 3)");
    refused(PROMOTER "    transcript: {stages: [nascent]}\n", 4, 26, "'stages' must be a map");
    refused(PROMOTER "    transcript: {stages: {promoter: 3}}\n", 4, 27, "a meaning of its own");
    refused(PROMOTER "    transcript: {stages: {nascent: {lost: 3, lasts: 2, x: 1}}}\n", 4, 56,
            "nascent has no key 'x'");
    refused(PROMOTER "    transcript: {stages: {nascent: {lost: 3}}}\n", 4, 36,
            "nascent needs 'lasts'");
    refused(PROMOTER "    transcript: {stages: {nascent: {lost: 3 min, lasts: 2}}}\n", 4, 43,
            "a rate");
    refused(PROMOTER "    transcript: {stages: {nascent: {lost: -3, lasts: 2}}}\n", 4, 43,
            "the rate of 'vela.nascent loss' is -3");
    refused(PROMOTER "    transcript: {stages: {nascent: {lasts: 2, lost: vela.open}}}\n", 4, 53,
            "so its rate cannot read species");
    refused(PROMOTER "    transcript: {}\n    protein: {half_life: 2}\n", 5, 14,
            "'protein' needs 'translation'");
}
END_TEST

#define STAGES "    transcript: {stages: {nascent: 1, nuclear: 1}}\n"

START_TEST(what_is_translated) {
    refused(PROMOTER STAGES "    protein: {translation: 1, from: nascent}\n", 5, 37,
            "'from' must be a list");
    refused(PROMOTER STAGES "    protein: {translation: 1, from: []}\n", 5, 37, "'from' is empty");
    refused(PROMOTER STAGES "    protein: {translation: 1, from: [nacent]}\n", 5, 38,
            "the transcript of 'vela' has no stage 'nacent'; did you mean 'nascent'?");
    refused(PROMOTER STAGES "    protein: {translation: 1, from: [[nascent]]}\n", 5, 38,
            "must be a single value");
    refused(PROMOTER STAGES "    protein: {translation: 1, from: [nuclear, nuclear]}\n", 5, 47,
            "'from' names 'nuclear' twice");
}
END_TEST

START_TEST(notes_where_bursts_cannot_be_told) {
    const tarry_network *network = network_of("genes: {on: {promoter: {on: {initiates: 1}}}}\n");
    ck_assert(!network->genes[0].tells && !network->tracks[0].tells);
    ck_assert_ptr_nonnull(strstr(network_notes(), "m.yaml:1:9: every state of the gene 'on'"));
    ck_assert_ptr_nonnull(strstr(network_notes(), "bursts_in: [STATE]"));
    network = network_of("genes: {off: {promoter: {a: {to: {b: 1}}, b: {}}}}\n");
    ck_assert(!network->genes[0].tells);
    ck_assert_ptr_nonnull(strstr(network_notes(), "no state of the gene 'off' is active"));
    network = network_of("genes: {all: {bursts_in: [a], promoter: {a: {}}}}\n");
    ck_assert(!network->genes[0].tells);
    ck_assert_ptr_nonnull(strstr(network_notes(), "'bursts_in' of the gene 'all' names every"));
    network_end();
}
END_TEST

/* ---- delays -------------------------------------------------------------------------------------
 */

static void delay_refused(const char *yaml, int line, int column, const char *words) {
    char text[1000];
    snprintf(text, sizeof text, "delays:\n  wait: %s\n", yaml);
    network_refused(text, line, column, words);
}

START_TEST(delays) {
    delay_refused("{}", 2, 9, "a delay is one law");
    delay_refused("{fixed: 1, gamma: {mean: 1, sd: 1}}", 2, 9, "here stand 2");
    delay_refused("{gama: {mean: 1, sd: 1}}", 2, 10, "did you mean 'gamma'?");
    delay_refused("{gamma: {mean: 1}}", 2, 17, "gamma needs 'sd'");
    delay_refused("{gamma: {mean: 1, dev: 1}}", 2, 27, "gamma has no key 'dev'");
    delay_refused("{gamma: {mean: 0, sd: 1}}", 2, 9, "");
    delay_refused("{fixed: -1}", 2, 9, "");
    delay_refused("{fixed: 2 kb}", 2, 17, "a time");
    delay_refused("{exponential: 3}", 2, 23, "exponential must be a map");
    delay_refused("exprot", 2, 9, "no delay is called 'exprot'");
    delay_refused("wat", 2, 9, "did you mean 'wait'?");
    delay_refused("wait", 2, 9, "the delay 'wait' is made of itself");
    delay_refused("{total: [b]}\n  b: {mix: [{share: 1, lasts: wait}]}", 3, 31, "made of itself");
    delay_refused("{total: []}", 2, 17, "total is empty; it needs at least one delay");
    delay_refused("{mix: [{share: 0.5, lasts: 1}, {share: 0.4, lasts: 2}]}", 2, 9,
                  "add up to 0.9; they must add up to 1");
    delay_refused("{mix: [{share: 1}]}", 2, 16, "a part of a mix needs 'lasts'");
    delay_refused("{table: {edges: [0, 1], weights: [1, 2]}}", 2, 25, "one edge more");
    delay_refused("{table: {values: [1, 2], weights: [1]}}", 2, 26, "each value has a weight");
    delay_refused("{table: {values: [1, 2]}}", 2, 17, "a table is");
    delay_refused("{table: {values: [1, 2], weights: [1, -1]}}", 2, 47,
                  "0 or more; this one is -1");
    delay_refused("{table: {values: [1, 2], weights: [0, 0]}}", 2, 9, "at least one");
    delay_refused("{table: {edges: [1, 0], weights: [1]}}", 2, 9, "");
    delay_refused("{table: {file: none.csv}}", 2, 24, "the table of lags 'none.csv': cannot open");
    network_refused("parameters: {wait: 1}\ndelays: {wait: 2}\n", 2, 10,
                    "'wait' would name a delay here, but it names a parameter");
}
END_TEST

/* A delay made of 2^12 others is refused before it takes the memory of so many. */
START_TEST(delays_that_double) {
    char text[2000] = "delays:\n  d0: 1\n";
    for (int i = 1; i <= 60; i++) {
        const size_t n = strlen(text);
        snprintf(text + n, sizeof text - n, "  d%d: {total: [d%d, d%d]}\n", i, i - 1, i - 1);
    }
    network_refused(text, 11, 7, "more than 1000 laws");
}
END_TEST

/* Each of many like genes is what it would be when written out. */
#define LIKE(name, many)                                                                           \
    "  " name ": {" many "copies: 2, start: steady, promoter: {shut: {to: {open: 2}}, "            \
    "open: {lasts: {fixed: 3}, then: shut, initiates: \"4 * repress(" name                         \
    ".protein, 40, 2)\"}}, "                                                                       \
    "transcript: {stages: {nascent: {fixed: 5}}, decay: 0.1 + 0 * 2}, "                            \
    "protein: {translation: 0.5, half_life: 30}}\n"

static char *copy_of(const char *text) {
    char *copy = malloc(strlen(text) + 1);
    ck_assert_ptr_nonnull(copy);
    return strcpy(copy, text);
}

/* A formula is kept as written: "repress(vela_1.protein" becomes "repress(vela.protein". */
static void take_numbers_off(char *text) {
    for (char *at = text; (at = strstr(at, "repress(vela_")) != NULL; at++) {
        char *number = at + strlen("repress(vela");
        memmove(number, number + 2, strlen(number + 2) + 1);
    }
}

START_TEST(many_like_genes) {
    const tarry_network *network = network_of("genes:\n" LIKE("vela_1", "") LIKE("vela_2", ""));
    char *species = copy_of(species_text(network)), *lags = copy_of(lags_text(network)),
         *reactions = copy_of(reactions_text(network));
    take_numbers_off(reactions);
    network = network_of("genes:\n" LIKE("vela", "many: 2, "));
    ck_assert_uint_eq(network->n_genes, 2);
    ck_assert_str_eq(network->genes[1].name, "vela_2");
    ck_assert_str_eq(species_text(network), species);
    ck_assert_str_eq(reactions_text(network), reactions);
    ck_assert_uint_eq(network->n_delays, 2); /* read once */
    ck_assert_str_eq(lags_text(network), lags);
    const tarry_expression *formulas = network->segments[0].formulas;
    for (uint32_t i = 0; i < 2; i++) {
        const tarry_species *read = &network->species[formulas[i].species[0]];
        ck_assert_uint_eq(formulas[i].n_species, 1);
        ck_assert_str_eq(read->name, i == 0 ? "vela_1.protein" : "vela_2.protein");
    }
    free(species);
    free(lags);
    free(reactions);
    network_end();
}
END_TEST

START_TEST(wrong_like_genes) {
    network_refused("genes:\n  vela: {many: 0, promoter: {on: {initiates: 1}}}\n", 2, 16,
                    "'many' must be a whole number from 1 to 1000000, not '0'");
    network_refused("genes:\n  vela_2: {promoter: {on: {initiates: 1}}}\n"
                    "  vela: {many: 3, promoter: {on: {initiates: 1}}}\n",
                    3, 3, "'vela_2' would name a gene here, but it names a gene already (line 2)");
    network_refused("genes:\n  vela: {many: 3, promoter: {on: {initiates: 1}}, "
                    "transcript: {decay: 1}}\n"
                    "  mira: {promoter: {on: {initiates: vela.transcript}}}\n",
                    3, 37,
                    "'vela' stands for 3 like genes, vela_1 to vela_3; name one of them, as "
                    "vela_1.transcript (the common name is understood in its own rates");
    network_refused("genes:\n  vela: {many: 3, promoter: {on: {initiates: vela.transcripts}}, "
                    "transcript: {decay: 1}}\n",
                    2, 46, "'vela' stands for 3 like genes");
    network_refused("genes:\n  vela: {many: 3, promoter: {on: {initiates: 1}}, "
                    "transcript: {decay: 1}}\n"
                    "reactions: {go: {uses: {vela.transcript: 1}, rate: 1}}\n",
                    3, 25, "'vela' stands for 3 like genes");
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"keys of a gene", keys_of_a_gene},
        {"states", states},
        {"moves that initiate and clearance", moves_that_initiate_and_clearance},
        {"active states", active_states},
        {"order on an allele", order_on_an_allele},
        {"what is translated", what_is_translated},
        {"where bursts are and how a gene starts", where_bursts_are_and_how_a_gene_starts},
        {"transcripts and proteins", transcripts_and_proteins},
        {"notes where bursts cannot be told", notes_where_bursts_cannot_be_told},
        {"delays", delays},
        {"many like genes", many_like_genes},
        {"wrong like genes", wrong_like_genes},
        {"delays that double", delays_that_double},
    };
    return run_tests("read genes", tests, sizeof tests / sizeof *tests);
}
