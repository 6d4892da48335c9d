/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Values are compared with C's own arithmetic and libm, written out beside each expression; the
 * formulas of hill and repress are those of design.md (x^n/(K^n + x^n) and 1 less that). */
#include "base/text.h"
#include "model/expression.h"
#include "support.h"

#include <check.h>
#include <float.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>

static const tarry_units minutes = {60};
static tarry_arena arena;

static void set_up(void) {
    arena = (tarry_arena){0};
}

static void tear_down(void) {
    tarry_arena_release(&arena);
}

/* ---- a small world of names ------------------------------------------------------------------ */

enum { K = 0, LENGTH, SPEED, BARE, N_PARAMETERS, CLASP = 0, PROTEIN, N_SPECIES };

static const double parameters[N_PARAMETERS] = {0.37, 4200, 1800, 2.5};
static const double counts[N_SPECIES] = {14, 63};
static const char *const names[] = {"k_open", "length", "speed", "bare", "clasp", "vela.protein"};

static tarry_name_kind find_name(void *context, const char *name, size_t n, uint32_t *index,
                                 tarry_dimension *dimension) {
    static const tarry_dimension known[] = {{true, -1, 0}, {true, 0, 1}, {true, -1, 1}, {0}};
    for (uint32_t i = 0; i < sizeof names / sizeof *names; i++) {
        if (strlen(names[i]) != n || memcmp(names[i], name, n) != 0)
            continue;
        *index = i < N_PARAMETERS ? i : i - N_PARAMETERS;
        if (i < N_PARAMETERS && context == NULL)
            *dimension = known[i];
        return i < N_PARAMETERS ? TARRY_NAME_PARAMETER : TARRY_NAME_SPECIES;
    }
    return TARRY_NAME_UNKNOWN;
}

static const tarry_scope scope = {NULL, find_name, names, sizeof names / sizeof *names, NULL};

/* The same names, parameters without units. */
static const tarry_scope unitless = {(void *)names, find_name, names, 0, NULL};

static tarry_expression compile(const char *text, tarry_dimension due) {
    tarry_expression made = {0};
    tarry_error error = {0};
    int code = tarry_expression_compile(text, (tarry_place){"m.yaml", 3, 10}, due, minutes, &scope,
                                        &arena, &made, &error);
    ck_assert_msg(code == 0, "%s: %d: %s", text, error.column, error.message);
    ck_assert_str_eq(made.text, text);
    return made;
}

static void check_same(const char *text, double value, double expected, double units_in_last) {
    bool same = (isnan(value) && isnan(expected)) || value == expected ||
                fabs(value - expected) <= units_in_last * DBL_EPSILON * fabs(expected);
    ck_assert_msg(same, "%s: %.17g, not %.17g", text, value, expected);
}

/* The value as compiled and as folded; folding must not change a bit. */
static void check_near(const char *text, double expected, double units_in_last) {
    tarry_expression made = compile(text, TARRY_ANY), folded, twice;
    ck_assert_int_eq(tarry_expression_fold(&made, parameters, &arena, &folded, NULL), 0);
    ck_assert_int_eq(tarry_expression_fold(&folded, NULL, &arena, &twice, NULL), 0);
    double value = tarry_expression_value(&made, parameters, counts);
    check_same(text, value, expected, units_in_last);
    check_same(text, tarry_expression_value(&folded, NULL, counts), value, 0);
    check_same(text, tarry_expression_value(&twice, NULL, counts), value, 0);
    ck_assert_uint_eq(folded.n_parameters, 0);
    ck_assert_uint_eq(folded.n_species, made.n_species);
    if (made.n_species == 0)
        ck_assert_uint_eq(folded.n_instructions, 1);
}

static void check_value(const char *text, double expected) {
    check_near(text, expected, 0);
}

static void check_fails_in(const char *text, tarry_dimension due, const tarry_scope *in, int column,
                           const char *words) {
    tarry_expression made = {0};
    tarry_error error = {0};
    int code = tarry_expression_compile(text, (tarry_place){"m.yaml", 3, 10}, due, minutes, in,
                                        &arena, &made, &error);
    ck_assert_msg(code == TARRY_INPUT, "accepted: %.80s", text);
    ck_assert_msg(error.line == 3 && error.column == column + 9 && strstr(error.message, words),
                  "%.80s\nexpected %d: ...%s...\ngot      %d:%d: %s", text, column, words,
                  error.line, error.column - 9, error.message);
    ck_assert_ptr_null(made.instructions);
}

/* `column` counts from 1 in the text. */
static void check_fails(const char *text, int column, const char *words) {
    check_fails_in(text, TARRY_ANY, &scope, column, words);
}

/* ---- values ---------------------------------------------------------------------------------- */

START_TEST(arithmetic) {
    const double k = parameters[K], b = parameters[BARE], x = counts[CLASP], y = counts[PROTEIN];
    check_value("2", 2);
    check_value(" -1.5e-3 ", -1.5e-3);
    check_value("2 + 3 * 4", 2.0 + 3.0 * 4.0);
    check_value("(2 + 3) * 4", (2.0 + 3.0) * 4.0);
    check_value("2 - 3 - 4", 2.0 - 3.0 - 4.0);
    check_value("2 / 3 / 4", 2.0 / 3.0 / 4.0);
    check_value("2 / 3 * 4", 2.0 / 3.0 * 4.0);
    check_value("0.1 + 0.2 + 0.3", 0.1 + 0.2 + 0.3);
    check_value("0.1 + (0.2 + 0.3)", 0.1 + (0.2 + 0.3));
    check_value("2 - -3", 5);
    check_value("--2", 2);
    check_value("-2 * -bare", -2.0 * -b);
    check_value("clasp + vela.protein", x + y);
    check_value("clasp - vela.protein / clasp * bare", x - y / x * b);
    check_value("k_open * clasp * (clasp - 1) / 2", k * x * (x - 1) / 2);
    check_value("bare / clasp + 1 - clasp * 3", b / x + 1 - x * 3);
    check_value("bare - clasp", b - x);
    check_value("(clasp)", x);
}
END_TEST

START_TEST(powers) {
    const double b = parameters[BARE], x = counts[CLASP], y = counts[PROTEIN];
    check_value("2^3^2", 512);
    check_value("(2^3)^2", 64);
    check_value("-2^2", -4);
    check_value("(-2)^2", 4);
    check_value("(-2)^3", -8);
    check_value("2^-2", 0.25);
    check_value("2^-2^2", 0.0625);
    check_value("2 * 3^2", 18);
    check_value("0^0", 1);
    check_value("0^-1", INFINITY);
    check_value("clasp^2", x * x);
    check_value("clasp^-1", 1 / x);
    check_value("clasp^bare", pow(x, b));
    check_value("clasp^(1/3)", pow(x, 1.0 / 3));
    check_value("(-clasp)^0.5", NAN);
    check_value("1.01^17", pow(1.01, 17));
    /* Products of up to 16 factors: at most six roundings against pow's one. */
    for (int n = 3; n <= 16; n++) {
        char text[64];
        snprintf(text, sizeof text, "(vela.protein / 7.3)^%d", n);
        check_near(text, pow(y / 7.3, n), 16);
        snprintf(text, sizeof text, "(vela.protein / 7.3)^-%d", n);
        check_near(text, pow(y / 7.3, -n), 16);
    }
}
END_TEST

START_TEST(calls) {
    const double b = parameters[BARE], x = counts[CLASP], y = counts[PROTEIN];
    check_value("exp(bare)", exp(b));
    check_value("log(clasp)", log(x));
    check_value("sqrt(clasp)", sqrt(x));
    check_value("log(-1)", NAN);
    check_value("min(clasp, bare)", b);
    check_value("min(bare, clasp)", b);
    check_value("max(clasp, bare)", x);
    check_value("max(bare, clasp)", x);
    check_value("max(1, 5, 3) - min(4, 2, 6, 3)", 3);
    check_value("min(0/0, 1)", NAN);
    check_value("min(1, 0/0)", NAN);
    check_value("max(0/0, 1)", NAN);
    check_value("max(1, 0/0)", NAN);
    check_value("exp(min(log(clasp), 1)) * 2", exp(1.0) * 2);
    for (int n = 0; n <= 20; n++) {
        char text[64];
        double p = pow(y, n), q = pow(40, n);
        snprintf(text, sizeof text, "hill(vela.protein, 40, %d)", n);
        check_near(text, p / (q + p), 40);
        snprintf(text, sizeof text, "repress(vela.protein, 40, %d)", n);
        check_near(text, q / (q + p), 40);
    }
    check_near("hill(vela.protein, bare, 1.7)", pow(y, 1.7) / (pow(b, 1.7) + pow(y, 1.7)), 8);
    check_near("repress(clasp, vela.protein, bare)", 1 - pow(x, b) / (pow(y, b) + pow(x, b)), 8);
    check_near("hill(clasp, 40, -2)", pow(x, -2) / (pow(40, -2) + pow(x, -2)), 8);
    check_value("hill(0, 40, 2)", 0);
    check_value("repress(0, 40, 2)", 1);
    check_value("hill(clasp, 0, 2)", 1);
    /* 1e300^2 is no double, its share is. */
    check_value("hill(1e300, 1e300, 2)", 0.5);
    check_value("repress(1e300, 1, 2)", 0);
}
END_TEST

START_TEST(quantities_in_expressions) {
    check_value("5 h", 300);
    check_value("0.1 /s", 6);
    check_value("1.8 kb/min", 1800);
    check_value("length / speed", 4200.0 / 1800.0);
    check_value("4.2 kb / speed", 4200.0 / 1800.0);
    check_value("2 * 5 min + 30 s", 10.5);
    check_value("log(2) / 2h", log(2) / 120);
    check_value("3 kb / 2 min", 1500);
    check_value("min(5 min, 1 h)", 5);
    check_value("(90 s)^2", 2.25);
}
END_TEST

/* ---- units ----------------------------------------------------------------------------------- */

static void check_unit(const char *text, tarry_dimension expected) {
    tarry_dimension found = compile(text, TARRY_ANY).dimension;
    ck_assert_msg(found.known == expected.known && found.time == expected.time &&
                      found.length == expected.length,
                  "%s: %d %d %d", text, found.known, found.time, found.length);
}

START_TEST(units_are_followed) {
    check_unit("2", TARRY_ANY);
    check_unit("clasp * 2 + hill(clasp, 4, 2)", TARRY_ANY);
    check_unit("bare * 5 min", TARRY_ANY);
    check_unit("5 min * bare", TARRY_ANY);
    check_unit("2 * 5 min", TARRY_TIME);
    check_unit("5 min + 2", TARRY_TIME);
    check_unit("2 + 5 min", TARRY_TIME);
    check_unit("bare + 5 min", TARRY_TIME);
    check_unit("length / speed", TARRY_TIME);
    check_unit("speed / length", TARRY_RATE);
    check_unit("1 / (5 min)", TARRY_RATE);
    check_unit("log(2) / 35 min", TARRY_RATE);
    check_unit("k_open * repress(vela.protein, 40, 2)", TARRY_RATE);
    check_unit("-k_open * clasp", TARRY_RATE);
    check_unit("5 min / 2 h", TARRY_PURE);
    check_unit("exp(5 min / 2 h)", TARRY_ANY);
    check_unit("(length)^2 / (1 kb)", TARRY_LENGTH);
    check_unit("sqrt(length^2)", TARRY_LENGTH);
    check_unit("sqrt((5 min)^2)", TARRY_TIME);
    check_unit("length^-1 * length", TARRY_PURE);
    check_unit("bare^2", TARRY_ANY);
    check_unit("max(5 min, bare, 2)", TARRY_TIME);
    check_unit("(1 min)^100", ((tarry_dimension){true, 100, 0}));
    check_unit("(1 min)^100 * 1 min", TARRY_ANY);
}
END_TEST

START_TEST(units_that_do_not_fit) {
    check_fails_in("4.2 kb", TARRY_TIME, &scope, 1, "'4.2 kb' is a length where a time is due");
    check_fails_in("5 min", TARRY_RATE, &scope, 1,
                   "'5 min' is a time where a rate (1/time) is due");
    check_fails_in("2 * 5 min", TARRY_RATE, &scope, 1, "is a time where a rate");
    check_fails_in("length / speed", TARRY_RATE, &scope, 1, "is a time where a rate");
    check_fails_in("k_open * 2", TARRY_PURE, &scope, 1, "where a pure number is due");
    check_fails_in("5 min / 2 min", TARRY_TIME, &scope, 1, "a pure number where a time is due");
    compile("bare", TARRY_RATE);
    compile("12", TARRY_TIME);
    compile("clasp", TARRY_RATE);
    check_fails("5 min + 2 kb", 7, "a time and a length cannot be added");
    check_fails("length - k_open", 8, "a length and a rate (1/time) cannot be subtracted");
    check_fails("min(5 min, 2 kb)", 12, "cannot be compared");
    check_fails("hill(clasp, 40, 2 h)", 17,
                "n in hill(x, K, n) is a pure number; here it is a time");
    check_fails("hill(length, 40 min, 2)", 14, "a length and a time cannot be compared");
    check_fails("exp(5 min)", 5, "x in exp(x) is a pure number; here it is a time");
    check_fails("log(length)", 5, "x in log(x) is a pure number; here it is a length");
    check_fails("sqrt(4 h)", 6, "the square root of a time");
    check_fails("2^(3 h)", 2, "the exponent of '^' is a pure number; here it is a time");
    check_fails("(2 h)^bare", 6, "a whole number only");
    check_fails("(2 h)^0.5", 6, "a whole number only");
}
END_TEST

/* ---- faults ---------------------------------------------------------------------------------- */

START_TEST(words_that_do_not_fit) {
    check_fails("", 1, "a value is missing here");
    check_fails("  ", 1, "a value is missing here");
    check_fails("2 +", 3, "a value is missing after '+'");
    check_fails("2 + * 3", 5, "a value is due here, not '*'");
    check_fails("2 ** 3", 4, "a power is written x^n");
    check_fails("()", 2, "a value is due here, not ')'");
    check_fails("2 * (3 + 4", 5, "this '(' is not closed");
    check_fails("min(1, 2", 4, "this '(' is not closed");
    check_fails("2 + 3)", 6, "this ')' closes no '('");
    check_fails("1,5", 2, "decimals are written with a point");
    check_fails("(1,5)", 3, "an operator or ')' is due");
    check_fails("bare clasp", 6, "an operator is missing before 'clasp'");
    check_fails("bare 2", 6, "an operator is missing before '2'");
    check_fails("1.2.3", 4, "an operator is missing before '.3'");
    check_fails("5 min(2)", 6, "an operator is missing before '('");
    check_fails("2 bare", 3, "an operator is missing between '2' and 'bare'");
    check_fails("bare(2)", 5, "an operator is missing between 'bare' and '('");
    check_fails("50 %", 4, "'%' has no meaning in an expression");
    check_fails("bare == 2", 6, "'=' has no meaning in an expression");
    check_fails("1e999", 1, "'1e999' is too large for a number");
    check_fails("2 + 1e308 d", 5, "'1e308' is too large for a number");
}
END_TEST

START_TEST(names_that_do_not_fit) {
    check_fails("k_opne * 2", 1, "there is no 'k_opne' here; did you mean 'k_open'?");
    check_fails("2 * vela.protien", 5, "did you mean 'vela.protein'?");
    check_fails("zzzzzz", 1, "there is no 'zzzzzz' here; a name in an expression is a parameter");
    check_fails_in("clasp", TARRY_ANY, NULL, 1, "there is no 'clasp' here");
    check_fails("\xc2\xb5x + \xc2\xb5y", 1, "there is no '\xc2\xb5x' here");
    check_fails("k_open + 2 * \xc2\xb5\xc2\xb5 + )", 14, "there is no");
    check_fails("exp * 2", 1, "'exp' is a function: write exp(x)");
    check_fails("hill", 1, "'hill' is a function: write hill(x, K, n)");
    check_fails("h + 1", 1, "'h' is a unit and follows a number, as in '5 h'");
    check_fails("bare * min", 8, "'min' is a unit and follows a number");
    check_fails("bare / min", 8, "inside an expression a unit follows a number: write '/ 1 min'");
    check_fails("5 kb/min * 3", 6, "write '/ 1 min'");
    check_fails("sqr(4)", 1, "there is no function 'sqr'; did you mean 'sqrt'?");
    check_fails("zzz(4)", 1, "there are exp, log, sqrt, min, max, hill and repress");
    check_fails("hill(1, 2)", 1, "'hill' takes 3 values, not 2: write hill(x, K, n)");
    check_fails("exp(1, 2)", 1, "'exp' takes 1 value, not 2: write exp(x)");
    check_fails("max()", 1, "'max' takes at least 2 values, not 0: write max(a, b)");
    check_fails("max(1)", 1, "'max' takes at least 2 values, not 1");
    check_fails("5 minutes", 3, "'minutes' is no unit; write 'min'");
    check_fails("2 + 5 furlong", 7, "'furlong' is no unit; units are s, min, h, d, bp, nt, kb");
    check_fails("3 nM", 3, "rates here are stochastic constants in counts");
    check_fails("0.1 /nM/s", 6, "rates here are stochastic constants in counts");
    check_fails("2 * 3 \xc2\xb5M", 7, "rates here are stochastic constants in counts");
}
END_TEST

START_TEST(reserved_words) {
    static const char *const words[] = {"s",   "min", "h",    "d",   "bp",   "nt",     "kb",
                                        "exp", "log", "sqrt", "max", "hill", "repress"};
    for (size_t i = 0; i < sizeof words / sizeof *words; i++)
        ck_assert_msg(tarry_expression_is_reserved(words[i], strlen(words[i])), "%s", words[i]);
    ck_assert(!tarry_expression_is_reserved("k", 1));
    ck_assert(!tarry_expression_is_reserved("mi", 2));
    ck_assert(!tarry_expression_is_reserved("minimum", 7));
}
END_TEST

static char *nest(const char *open, const char *middle, const char *close, size_t n) {
    tarry_text text = {0};
    for (size_t i = 0; i < n; i++)
        tarry_text_add_string(&text, open);
    tarry_text_add_string(&text, middle);
    for (size_t i = 0; i < n; i++)
        tarry_text_add_string(&text, close);
    ck_assert(!text.failed);
    return text.data;
}

START_TEST(depths) {
    static const struct {
        const char *open, *middle, *close;
    } shapes[] = {
        {"(", "1", ")"},      {"-", "1", ""},          {"2^", "1", ""},
        {"exp(", "1", ")"},   {"1+(", "1", ")"},       {"-(", "1", ")"},
        {"min(1,", "1", ")"}, {"hill(1,2,", "3", ")"}, {"1+2*3^(", "1", ")"},
    };
    for (size_t i = 0; i < sizeof shapes / sizeof *shapes; i++) {
        tarry_expression made = {0};
        tarry_error error = {0};
        char *text = nest(shapes[i].open, shapes[i].middle, shapes[i].close, 100000);
        ck_assert_int_eq(tarry_expression_compile(text, (tarry_place){"m.yaml", 1, 1}, TARRY_ANY,
                                                  minutes, &scope, &arena, &made, &error),
                         TARRY_INPUT);
        ck_assert_msg(strstr(error.message, "nested deeper than 64") != NULL, "%s", error.message);
        free(text);
    }
    char *text = nest("(", "clasp", ")", 63);
    check_value(text, counts[CLASP]);
    free(text);
    text = nest("1+2*(", "3", ")", 31); /* two values wait at each level, and one is read */
    ck_assert_uint_gt(compile(text, TARRY_ANY).n_instructions, 100);
    free(text);
    text = nest("1+2*(", "3", ")", 32);
    check_fails(text, 1, "needs more than 64 values at once");
    free(text);
}
END_TEST

START_TEST(size) {
    tarry_expression made, folded;
    char *text = nest("", "0", " + clasp", 300000);
    clock_t start = clock();
    made = compile(text, TARRY_ANY);
    ck_assert_int_eq(tarry_expression_fold(&made, NULL, &arena, &folded, NULL), 0);
    double seconds = (double)(clock() - start) / CLOCKS_PER_SEC;
    ck_assert(tarry_expression_value(&folded, NULL, counts) == 300000.0 * counts[CLASP]);
    ck_assert_uint_eq(made.n_species, 1);
    ck_assert_msg(seconds < (test_small() ? 10 : 1), "%g s for 300,000 terms", seconds);
    free(text);
}
END_TEST

START_TEST(what_an_expression_reads) {
    tarry_expression made = compile("vela.protein * speed / clasp * k_open * clasp", TARRY_ANY);
    ck_assert_uint_eq(made.n_parameters, 2);
    ck_assert_uint_eq(made.parameters[0], K);
    ck_assert_uint_eq(made.parameters[1], SPEED);
    ck_assert_uint_eq(made.n_species, 2);
    ck_assert_uint_eq(made.species[0], CLASP);
    ck_assert_uint_eq(made.species[1], PROTEIN);
    ck_assert_int_eq(made.place.column, 10);
}
END_TEST

/* ---- random expressions ---------------------------------------------------------------------- */

/* Numbers to choose with: xorshift64* (Vigna 2016, ACM Trans. Math. Softw. 42:30), seed 1. */
static uint64_t next_bits(uint64_t *state) {
    *state ^= *state >> 12;
    *state ^= *state << 25;
    *state ^= *state >> 27;
    return *state * UINT64_C(2685821657736338717) >> 33;
}

/* Write a random expression and work it out with C on the way; every part stands in parentheses, so
 * that no rule of rank is needed here. */
static double write_random(uint64_t *state, tarry_text *text, int depth) {
    static const char operators[] = "+-*/";
    uint64_t choice = next_bits(state) % 8;
    if (depth == 0 || choice == 0) {
        size_t leaf = next_bits(state) % 7;
        if (leaf < 6) {
            tarry_text_add_string(text, names[leaf]);
            return leaf < N_PARAMETERS ? parameters[leaf] : counts[leaf - N_PARAMETERS];
        }
        tarry_text_add_string(text, "0.7");
        return 0.7;
    }
    if (choice < 6) {
        char sign = operators[next_bits(state) % 4];
        tarry_text_add_string(text, "(");
        double left = write_random(state, text, depth - 1);
        tarry_text_printf(text, " %c ", sign);
        double right = write_random(state, text, depth - 1);
        tarry_text_add_string(text, ")");
        switch (sign) {
        case '+':
            return left + right;
        case '-':
            return left - right;
        case '*':
            return left * right;
        default:
            return left / right;
        }
    }
    tarry_text_add_string(text, choice == 6 ? "(-" : "sqrt(");
    double value = write_random(state, text, depth - 1);
    tarry_text_add_string(text, ")");
    return choice == 6 ? -value : sqrt(value);
}

START_TEST(random_expressions) {
    uint64_t state = 1;
    for (int i = 0; i < 3000; i++) {
        tarry_text text = {0};
        tarry_expression made, folded;
        tarry_error error = {0};
        double expected = write_random(&state, &text, 6);
        ck_assert(!text.failed);
        int code = tarry_expression_compile(text.data, (tarry_place){NULL, 1, 1}, TARRY_ANY,
                                            minutes, &unitless, &arena, &made, &error);
        ck_assert_msg(code == 0, "%s: %s", text.data, error.message);
        ck_assert_int_eq(tarry_expression_fold(&made, parameters, &arena, &folded, NULL), 0);
        check_same(text.data, tarry_expression_value(&made, parameters, counts), expected, 0);
        check_same(text.data, tarry_expression_value(&folded, NULL, counts), expected, 0);
        tarry_text_release(&text);
    }
}
END_TEST

static Suite *expression_suite(void) {
    Suite *suite = suite_create("expression");
    TCase *tests = tcase_create("expression");
    tcase_add_checked_fixture(tests, set_up, tear_down);
    tcase_add_test(tests, arithmetic);
    tcase_add_test(tests, powers);
    tcase_add_test(tests, calls);
    tcase_add_test(tests, quantities_in_expressions);
    tcase_add_test(tests, units_are_followed);
    tcase_add_test(tests, units_that_do_not_fit);
    tcase_add_test(tests, words_that_do_not_fit);
    tcase_add_test(tests, names_that_do_not_fit);
    tcase_add_test(tests, reserved_words);
    tcase_add_test(tests, depths);
    tcase_add_test(tests, size);
    tcase_add_test(tests, what_an_expression_reads);
    tcase_add_test(tests, random_expressions);
    suite_add_tcase(suite, tests);
    return suite;
}

int main(void) {
    SRunner *runner = srunner_create(expression_suite());
    srunner_run_all(runner, CK_ENV);
    int failed = srunner_ntests_failed(runner);
    srunner_free(runner);
    return failed == 0 ? EXIT_SUCCESS : EXIT_FAILURE;
}
