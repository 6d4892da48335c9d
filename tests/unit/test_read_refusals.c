/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Values that are malformed in one way each, put where such a value is due in a small model: none
 * is read, and what is said names the key. Places are the matter of the cases of tests/cli. */

#include "support.h"

#include "tarry/tarry.h"

#include <stdio.h>
#include <string.h>

typedef struct refusal {
    const char *value, *words;
} refusal;

static void check_all(const char *model, const refusal *cases, size_t n) {
    tarry_start();
    for (size_t i = 0; i < n; i++) {
        char text[2048];
        tarry_model *read = NULL;
        tarry_error error = {0};
        ck_assert_int_lt(snprintf(text, sizeof text, model, cases[i].value), (int)sizeof text);
        const int code = tarry_model_read_text(text, strlen(text), "m.yaml", NULL, 0, &read,
                                               &error);
        ck_assert_msg(code == TARRY_INPUT, "%s: %d", cases[i].value, code);
        ck_assert_msg(strstr(error.message, cases[i].words) != NULL, "%s: %s", cases[i].value,
                      error.message);
        ck_assert_int_gt(error.line, 0);
    }
}

#define COUNT(array) (sizeof(array) / sizeof *(array))

START_TEST(test_delays) {
    static const refusal cases[] = {
        {"{gamma: {mean: 3}}", "gamma needs 'sd'"},
        {"{gamma: {sd: 3}}", "gamma needs 'mean'"},
        {"{gamma: {mean: 3, sd: [1]}}", "sd"},
        {"{gamma: {mean: [3], sd: 1}}", "mean"},
        {"{gamma: {mean: 3, sd: 1, cv: 2}}", "cv"},
        {"{gamma: 3}", "gamma"},
        {"{exponential: {}}", "exponential needs 'mean'"},
        {"{erlang: {mean: 3}}", "needs 'steps'"},
        {"{uniform: {from: 1}}", "needs 'to'"},
        {"{weibull: {shape: 1}}", "needs 'scale'"},
        {"{erlang: {steps: 0.5, mean: 3}}", "steps"},
        {"{erlang: {steps: 1.5, mean: 3}}", "steps"},
        {"{erlang: {steps: 1e9, mean: 3}}", "steps"},
        {"{erlang: {steps: 2, mean: -3}}", "mean"},
        {"{gamma: {mean: 0, sd: 1}}", "mean"},
        {"{gamma: {mean: 3, sd: -1}}", "sd"},
        {"{lognormal: {mean: 3, sd: 0}}", "sd"},
        {"{weibull: {shape: 1 min, scale: 2}}", "a pure number is due"},
        {"{fixed: [1]}", "fixed"},
        {"{fixed: 1, gamma: {mean: 3, sd: 1}}", "one law"},
        {"{}", "one law"},
        {"[1]", "a delay"},
        {"{gama: {mean: 3, sd: 1}}", "gamma"},
        {"{table: [1]}", "table"},
        {"{table: {edges: [0, 1]}}", "a table is"},
        {"{table: {weights: [1]}}", "a table is"},
        {"{table: {edges: [0, 1], values: [1], weights: [1]}}", "a table is"},
        {"{table: {file: lags.csv, weights: [1]}}", "a table is"},
        {"{table: {file: [lags.csv]}}", "file"},
        {"{table: {edges: 1, weights: [1]}}", "edges"},
        {"{table: {edges: [0, 1], weights: 1}}", "weights"},
        {"{table: {edges: [0, x], weights: [1]}}", "x"},
        {"{table: {edges: [0, 1], weights: [y]}}", "y"},
        {"{table: {edges: [], weights: []}}", "at least one weight"},
        {"{table: {edges: [0, 1, 2], weights: [1]}}", "3 edges and 1 weights"},
        {"{table: {values: [0, 1], weights: [1]}}", "2 values and 1 weights"},
        {"{table: {edges: [0, 2, 1], weights: [1, 1]}}", "rise"},
        {"{table: {values: [-2, 1], weights: [1, 1]}}", "0 or more"},
        {"{table: {values: [1, 2], weights: [1, -1]}}", "0 or more"},
        {"{table: {values: [1, 2], weights: [0, 0]}}", "weight"},
        {"{mix: 3}", "mix"},
        {"{mix: []}", "at least one delay"},
        {"{mix: [3]}", "a part of a mix"},
        {"{mix: [{lasts: 3}]}", "needs 'share'"},
        {"{mix: [{share: 1}]}", "needs 'lasts'"},
        {"{mix: [{share: 1 min, lasts: 3}]}", "a pure number is due"},
        {"{mix: [{share: 1, lasts: [3]}]}", "a delay"},
        {"{mix: [{share: 0.4, lasts: 3}, {share: 0.4, lasts: 4}]}", "add up to 1"},
        {"{mix: [{share: 1, long: 3}]}", "long"},
        {"{total: 3}", "total"},
        {"{total: [[3]]}", "a delay"},
        {"{total: [{fixed: -1}]}", "0 or more"},
    };
    check_all(
        "tarry: 1\ntime: min\ndelays:\n  way: %s\ngenes: {vela: {promoter: {on: {initiates: 1}}, "
        "transcript: {stages: {n: way}, decay: 1}}}\nrun: {until: 5}\n",
        cases, COUNT(cases));
}
END_TEST

/* Exponents of a unit stay below some thousands; the longest name is shown in part. */
START_TEST(test_expressions) {
    static const refusal cases[] = {
        {"sqrt(3 min)", "the square root of a time"},
        {"sqrt(2 kb)", "the square root of a length"},
        {"(2 min)^2.5", "a whole number only"},
        {"(2 min)^k", "a whole number only"},
        {"(1 min)^(0 - 2)", "a whole number only"},
        {"3 min + 2 kb", "a time and a length cannot be added"},
        {"3 kb + 2 min", "a length and a time cannot be added"},
        {"3 min + 2 kb / 1 min", "a time and a speed"},
        {"6 /min/kb", "write '/ 1 min'"},
        {"(2 min)^100000", "min"},
        {"(2 kb)^100000", "kb"},
        {"foo(2)", "there is no function 'foo'"},
        {"min(1)", "takes at least 2 values, not 1"},
        {"hill(1, 2)", "takes 3 values, not 2"},
        {"2 furlong", "'furlong' is no unit"},
        {"3 /", "a value is missing after '/'"},
        {"k + 1", "in a circle"},
        {"1e400", "too large"},
        {".5.5", "an operator is missing"},
        {"5.x", "'x' is no unit"},
        {"x.y", "there is no 'x.y' here"},
        {"1 $ 2", "has no meaning in an expression"},
        {"log(-1)", "comes to no finite number"},
        {"exp(1e9)", "comes to no finite number"},
        {"3minutes", "write 'min'"},
        {"3 min min", "an operator is missing"},
        {"( 1", "is not closed"},
        {"1 )", "closes no '('"},
        {"a_name_that_is_longer_than_what_is_shown_of_any_name_in_messages_of_this_kind_by_far(3)",
         "there is no function"},
        {"a_name_that_is_longer_than_what_is_shown_of_any_name_in_messages_of_this_kind_by_far",
         "a_name_that_is_longer"},
    };
    check_all(
        "tarry: 1\ntime: min\nparameters: {k: \"%s\"}\ngenes: {vela: {promoter: {on: {initiates: "
        "1}}, transcript: {decay: 1}}}\nrun: {until: 5}\n",
        cases, COUNT(cases));
}
END_TEST

/* Signals of a gene with alleles. */
START_TEST(test_signals) {
    static const refusal cases[] = {
        {"{of: vela.n, allele: 3}", "there is no allele 3"},
        {"{sum: {vela.n: 1, vela.transcript: 1}, allele: 1}", "'vela.transcript' is none"},
        {"{sum: {vela.n: {ramp: {from: 0.2, to: 0.1}}}, allele: 1}", "a ramp goes from"},
        {"{of: vela.transcript, allele: 1}", "is none"},
        {"{of: [vela.n], allele: 1}", "'of'"},
        {"{sum: [vela.n], allele: 1}", "'sum'"},
        {"{sum: {vela.n: [1]}}", "vela.n"},
        {"{of: vela.n, ramp: 3}", "'ramp'"},
        {"{of: vela.n, ramp: {from: 0}}", "needs 'to'"},
        {"{of: vela.n, noise: {fixed: 1, part: 2}}", "part"},
        {"{of: vela.n, noise: {share: -1}}", "not below 0"},
        {"{of: vela.n, detects: 3}", "'detects'"},
        {"{of: vela.n, detects: {above: 2, first: yes}}", "first"},
        {"{of: vela.n, sum: {vela.n: 1}}", "either 'of'"},
        {"{noise: 1}", "either 'of'"},
    };
    check_all("tarry: 1\ntime: min\ngenes: {vela: {copies: 2, promoter: {on: {initiates: 1}}, "
              "transcript: {stages: {n: 3}, decay: 1}}}\nsignals:\n  spot: %s\nrun: {until: 5}\n",
              cases, COUNT(cases));
}
END_TEST

START_TEST(test_amounts) {
    static const refusal cases[] = {
        {"{geometric: {}}", "geometric needs 'mean'"},
        {"{geometric: {mean: -1}}", "mean"},
        {"{geometric: {mean: 2, from: 2}}", "'from'"},
        {"{geometric: {mean: 0.5, from: 1}}", "mean"},
        {"{geometric: {mean: 2, to: 2}}", "to"},
        {"{poisson: {mean: 2, from: 1}}", "from"},
        {"{poisson: {}}", "poisson needs 'mean'"},
        {"{poisson: {mean: 2 min}}", "a pure number is due"},
        {"{table: {values: [1]}}", "needs 'weights'"},
        {"{table: {weights: [1]}}", "needs 'values'"},
        {"{table: {values: [], weights: []}}", "0 values and 0 weights"},
        {"{table: {values: [1, 2], weights: [1]}}", "2 values and 1 weights"},
        {"{table: {values: [1.5], weights: [1]}}", "whole"},
        {"{table: {values: [-1], weights: [1]}}", "whole"},
        {"{table: {values: 1, weights: [1]}}", "values"},
        {"{table: {values: [1], weights: [-1]}}", "weight"},
        {"{table: {values: [1], weights: [1], from: 1}}", "from"},
        {"{geometric: {mean: 2}, poisson: {mean: 1}}", "one"},
        {"[1]", "a number of molecules"},
        {"-1", "-1"},
        {"1.5", "1.5"},
        {"many", "many"},
    };
    check_all("tarry: 1\ntime: min\nspecies: {a: 0}\nreactions: {make: {makes: {a: %s}, rate: 1}}\n"
              "run: {until: 5}\n",
              cases, COUNT(cases));
}
END_TEST

START_TEST(test_varies) {
    static const refusal cases[] = {
        {"3", "varies"},
        {"{lognormal: {cv: 0.3}, gamma: {cv: 1}}", "one"},
        {"{lognormal: {cv: 0}}", "above 0"},
        {"{lognormal: {cv: -1}}", "above 0"},
        {"{erlang: {cv: 0.4}}", "erlang"},
        {"{uniform: {cv: 0.6}}", "0.577"},
        {"{exponential: {cv: 0.5}}", "use gamma"},
        {"{fixed: {cv: 0.5}}", "no 'cv' to choose"},
        {"{fixed: 3}", "the same in all cells"},
        {"{table: {values: [0, 0.5], weights: [1, 0]}}", "the same in all cells"},
        {"{lognormal: {mean: 1}}", "needs 'sd'"},
        {"[1]", "varies"},
    };
    check_all(
        "tarry: 1\ntime: min\nparameters: {k: {value: 6, varies: %s}}\ngenes: {vela: {promoter: "
        "{on: {initiates: k}}, transcript: {decay: 1}}}\nrun: {until: 5}\n",
        cases, COUNT(cases));
}
END_TEST

START_TEST(test_bursts) {
    static const refusal cases[] = {
        {"3", "loud must be a map"},
        {"{}", "bursts need 'opens'"},
        {"{opens: [make]}", "bursts need 'closes'"},
        {"{opens: make, closes: [fade], counts: [make]}", "opens"},
        {"{opens: [mak], closes: [fade], counts: [make]}", "make"},
        {"{opens: [make], closes: [[fade]], counts: [make]}", "the name of a reaction"},
        {"{opens: [], closes: [fade], counts: [make]}", "'opens' is empty"},
        {"{opens: [make], closes: [fade], counts: [make], size: 2}", "size"},
    };
    check_all("tarry: 1\ntime: min\nspecies: {a: 0}\nreactions:\n  make: {makes: {a: 1}, rate: 1}\n"
              "  fade: {uses: {a: 1}, rate: 1}\nbursts:\n  loud: %s\nrun: {until: 5}\n",
              cases, COUNT(cases));
}
END_TEST

int main(void) {
    const test_entry tests[] = {{"delays", test_delays},   {"expressions", test_expressions},
                                {"signals", test_signals}, {"amounts", test_amounts},
                                {"varies", test_varies},   {"bursts", test_bursts}};
    return run_tests("read refusals", tests, sizeof tests / sizeof *tests);
}
