/* SPDX-License-Identifier: GPL-3.0-or-later */

/* What is refused and noted in species, reactions and bursts, and files of lags; the rules are
 * those of design.md, section 3. */
#include "model/builder.h"
#include "network_text.h"
#include "support.h"

#include <stdio.h>
#include <string.h>

#define GENE                                                                                       \
    "genes: {vela: {promoter: {on: {initiates: 1}}, transcript: {stages: {young: 1}, decay: "      \
    "1}}}\n"
#define SPECIES "species: {clasp: 4, pin: 3}\n"

/* Line 3 is one reaction, 'go', whose keys begin in column 18. */
static void refused(const char *keys, int column, const char *words) {
    char text[2000];
    snprintf(text, sizeof text, GENE SPECIES "reactions: {go: {%s}}\n", keys);
    network_refused(text, 3, column, words);
}

START_TEST(species) {
    network_refused("species: {clasp: -1}\n", 1, 18, "whole number from 0 to 2^53, not -1");
    network_refused("species: {clasp: 1.5}\n", 1, 18, "not 1.5");
    network_refused("species: {clasp: 1e16}\n", 1, 18, "2^53");
    network_refused("species: {clasp: pin, pin: 1}\n", 1, 18, "cannot depend on 'pin'");
    network_refused("species: {max: 1}\n", 1, 11, "'max' is a unit or a function");
    network_refused("species: [a]\n", 1, 10, "'species' must be a map");
    network_refused("parameters: {a: 1}\nspecies: {a: 1}\n", 2, 11, "names a parameter already");
    network_refused(GENE "species: {vela: 1}\n", 2, 11, "names a gene already");
}
END_TEST

START_TEST(reactions) {
    refused("uses: {clasp: 1}", 13, "needs either 'rate'");
    refused("rate: 1, propensity: 1", 13, "not both");
    refused("rate: 1, makes: {clsp: 1}", 35, "no species is called 'clsp'; did you mean 'clasp'?");
    refused("rate: 1, makes: {vela: 1}", 35, "'vela' is a gene; here a species is due");
    refused("rate: 1, makes: {vela.young: 1}", 35, "stages change by their gene alone");
    refused("rate: 1, uses: {vela.on: 1}", 34, "promoter states change by their gene alone");
    refused("rate: 1, uses: {clasp: 0}", 41, "whole number from 1 to 100");
    refused("rate: 1, uses: {clasp: two}", 41, "not 'two'");
    refused("rate: 1, uses: [clasp]", 33, "uses must be a map");
    refused("rate: -1", 24, "the rate of 'go' is -1");
    refused("rate: 2 min", 24, "a rate");
    refused("rates: 1", 18, "did you mean 'rate'?");
    network_refused("reactions: {2go: {rate: 1}}\n", 1, 13, "cannot name a reaction");
    network_refused("reactions: [go]\n", 1, 12, "'reactions' must be a map");
}
END_TEST

START_TEST(later) {
    refused("rate: 1, later: {after: 1}", 34, "'later' must be a list");
    refused("rate: 1, later: [{makes: {pin: 1}}]", 35, "needs 'after'");
    refused("rate: 1, later: [{after: 1, rate: 1}]", 46, "has no key 'rate'");
    refused("rate: 1, later: [{after: 1, uses: {vela.young: 1}}]", 53, "by their gene alone");
    refused("rate: 1, later: [{after: 1, chance: 1.5}]", 54, "between 0 and 1; it is 1.5");
    refused("rate: 1, later: [{after: 1, chance: log(0)}]", 54, "comes to no finite number");
    refused("rate: 1, later: [{after: 1, if_short: drop}]", 56, "stop or skip, not 'drop'");
    refused("rate: 1, later: [{after: 1, later: [{after: soon}]}]", 62,
            "no delay is called 'soon'; a delay is a name");
    refused("rate: 1, later: [{after: pin + 1}]", 43, "cannot depend on 'pin'");
}
END_TEST

START_TEST(random_amounts) {
    refused("rate: 1, makes: {pin: {}}", 40, "a random amount is one law");
    refused("rate: 1, makes: {pin: {gauss: {mean: 1}}}", 41, "has no key 'gauss'");
    refused("rate: 1, makes: {pin: {geometric: {}}}", 52, "geometric needs 'mean'");
    refused("rate: 1, makes: {pin: {geometric: {mean: 2, from: 2}}}", 68, "from 0 to 1");
    refused("rate: 1, makes: {pin: {geometric: {mean: 0.5, from: 1}}}", 59,
            "the mean number of 'pin' is 0.5; it must be finite and not below 1");
    refused("rate: 1, makes: {pin: {poisson: {mean: -1}}}", 57, "not below 0");
    refused("rate: 1, makes: {pin: {poisson: {mean: 1 min}}}", 57, "a pure number");
    refused("rate: 1, makes: {pin: {table: {values: [1, 2], weights: [1]}}}", 48,
            "each value has a weight");
    refused("rate: 1, makes: {pin: {table: {values: [2, 1], weights: [1, 1]}}}", 48, "ascend");
    refused("rate: 1, makes: {pin: {table: {values: [0.5], weights: [1]}}}", 48, "whole numbers");
    refused("rate: 1, makes: {pin: {table: {values: [1], weights: [0]}}}", 48, "above 0");
    network_refused("genes: {v: {promoter: {on: {initiates: 1}}, transcript: {lifetime: 2}}}\n"
                    "reactions: {go: {rate: 1, makes: {v.transcript: {poisson: {mean: 1}}}}}\n",
                    2, 35, "'v.transcript' has a lifetime");
}
END_TEST

START_TEST(bursts) {
    network_refused(SPECIES "bursts: {b: {opens: [go], closes: [go]}}\n", 2, 22,
                    "no reaction is called 'go'");
    network_refused("reactions: {go: {rate: 1}}\nbursts: {b: {opens: [go]}}\n", 2, 13,
                    "bursts need 'closes'");
    network_refused("reactions: {go: {rate: 1}}\nbursts: {b: {closes: [go]}}\n", 2, 13,
                    "bursts need 'opens'");
    network_refused("reactions: {go: {rate: 1}}\nbursts: {b: {opens: go, closes: [go]}}\n", 2, 21,
                    "opens must be a list");
    network_refused(GENE "reactions: {go: {rate: 1}}\n"
                         "bursts: {vela: {opens: [go], closes: [go]}}\n",
                    3, 10, "would name a name of bursts here, but it names a gene already");
}
END_TEST

static bool noted(const char *yaml, const char *words) {
    char text[2000];
    snprintf(text, sizeof text, SPECIES "reactions:\n%s", yaml);
    network_of(text);
    return strstr(network_notes(), words) != NULL;
}

START_TEST(molecules_are_anonymous) {
    ck_assert(noted("  go: {rate: 1, later: [{after: 1, uses: {pin: 1}}]}\n",
                    "m.yaml:3:43: a completion of 'go' uses 'pin', which the reaction neither"));
    ck_assert(
        !noted("  go: {rate: 1, needs: {pin: 1}, later: [{after: 1, uses: {pin: 1}}]}\n", ":"));
    ck_assert(
        !noted("  go: {rate: 1, makes: {pin: 1}, later: [{after: 1, uses: {pin: 1}}]}\n", ":"));
    /* Made by the completion before it; but not by its neighbour. */
    ck_assert(!noted("  go: {rate: 1, later: [{after: 1, makes: {pin: 1},"
                     " later: [{after: 1, uses: {pin: 1}}]}]}\n",
                     ":"));
    ck_assert(noted("  go: {rate: 1, later: [{after: 1, makes: {pin: 1}},"
                    " {after: 1, uses: {pin: 1}}]}\n",
                    "uses 'pin', which the reaction neither"));
    ck_assert(
        !noted("  go: {rate: 1, uses: {pin: 1}, later: [{after: 1, uses: {pin: 1}}]}\n", ":"));
    ck_assert(noted("  go: {rate: 1, makes: {pin: 1}, later: [{after: 1, uses: {pin: 1}}]}\n"
                    "  gone: {uses: {pin: 1}, rate: 1}\n",
                    "m.yaml:3:60: 'pin' waits for a completion of 'go' and is also removed by "
                    "'gone'"));
    network_of("genes: {v: {promoter: {a: {initiates: 1}, b: {}}, transcript: {lifetime: 2}}}\n"
               "reactions: {cut: {uses: {v.transcript: 1}, rate: 1}}\n");
    ck_assert_ptr_nonnull(
        strstr(network_notes(), "'v.transcript' has a lifetime and is also removed by 'cut'"));
    network_end();
}
END_TEST

/* ---- files of lags ------------------------------------------------------------------------------
 */

/* A model that reads its one delay from a file with these lines. */
static const char *model_with(const char *lines, char *out, size_t size) {
    const char *path = test_path("lags.csv");
    FILE *file = fopen(path, "w");
    ck_assert_ptr_nonnull(file);
    fputs(lines, file);
    ck_assert_int_eq(fclose(file), 0);
    snprintf(out, size, "delays:\n  wait: {table: {file: %s}}\n", path);
    return out;
}

START_TEST(files_of_lags) {
    char text[2000];
    const tarry_law *law = &network_of(
                                model_with("from, to ,weight\n1,2,3\n2, 4 ,6\n\n7,60 s * 8,3\r\n",
                                           text, sizeof text))
                                ->segments[0]
                                .laws[0];
    static const double edges[] = {1, 2, 4, 7, 8}, shares[] = {0.25, 0.5, 0, 0.25};
    ck_assert(law->kind == TARRY_LAW_BINS && law->n == 4);
    ck_assert_mem_eq(law->points, edges, sizeof edges);
    ck_assert_mem_eq(law->weights, shares, sizeof shares);
    law =
        &network_of(model_with("value,weight\n3,1\n1.5,1", text, sizeof text))->segments[0].laws[0];
    ck_assert(law->kind == TARRY_LAW_VALUES && law->n == 2);
    ck_assert(law->points[0] == 1.5 && law->points[1] == 3 && law->weights[0] == 0.5);
    network_end();
}
END_TEST

START_TEST(files_of_lags_refused) {
    static const struct {
        const char *lines;
        int line, column;
        const char *words;
    } cases[] = {
        {"", 2, 24, "is empty"},
        {"from,to\n", 1, 1, "must be 'from,to,weight' or 'value,weight'"},
        {"value,weight\n", 2, 1, "has no rows"},
        {"value,weight\n1\n", 2, 1, "too few columns; there must be 2"},
        {"value,weight\n1,2,3,4\n", 2, 1, "too many columns"},
        {"value,weight\n1,\n", 2, 3, "a number is missing here"},
        {"value,weight\n1,x\n", 2, 3, "'x'"},
        {"value,weight\n1 kb,1\n", 2, 1, "a time"},
        {"from,to,weight\n1,2,1\n1.5,3,1\n", 3, 1, "begins before the one above ends"},
    };
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        char text[2000];
        network_refused(model_with(cases[i].lines, text, sizeof text), cases[i].line,
                        cases[i].column, cases[i].words);
    }
}
END_TEST

/* No text comes to so many (a number of molecules ends at 1e6), but what adds them up may. */
START_TEST(too_many_at_once) {
    tarry_draft draft = {0};
    const int64_t amounts[] = {(int64_t)INT32_MAX + 1, -(int64_t)INT32_MAX - 1};
    for (size_t i = 0; i < 2; i++) {
        tarry_error error = {0};
        ck_assert_int_eq(tarry_draft_change(&draft, 0, amounts[i], &error), TARRY_INPUT);
        ck_assert_str_eq(error.message, "more than 2147483647 molecules change at once");
    }
    tarry_draft_release(&draft);
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"species", species},
        {"reactions", reactions},
        {"later", later},
        {"random amounts", random_amounts},
        {"bursts", bursts},
        {"too many at once", too_many_at_once},
        {"molecules are anonymous", molecules_are_anonymous},
        {"files of lags", files_of_lags},
        {"files of lags refused", files_of_lags_refused},
    };
    return run_tests("read reactions", tests, sizeof tests / sizeof *tests);
}
