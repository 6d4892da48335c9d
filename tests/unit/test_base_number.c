/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Numbers as text, against IEEE 754 arithmetic worked out by hand, the C library's strtod and
 * printf, and under a locale with a decimal comma. */
#include "base/number.h"
#include "base/random.h"
#include "support.h"

#include <float.h>
#include <locale.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

static double read_number(const char *text) {
    double value = NAN;
    ck_assert_msg(tarry_number_read(text, strlen(text), &value) == TARRY_NUMBER_OK,
                  "\"%s\" was not read", text);
    return value;
}

static const char *write_number(double value) {
    static char out[TARRY_NUMBER_SIZE];
    ck_assert_uint_eq(tarry_number_write(value, out), strlen(out));
    return out;
}

/* The grammar is ours; the values are plain arithmetic. */
START_TEST(numbers_are_read) {
    const struct {
        const char *text;
        double value;
    } cases[] = {
        {"0", 0},         {"12", 12},
        {"-3", -3},       {"+4", 4},
        {"0.5", 0.5},     {".5", 0.5},
        {"5.", 5},        {"-.25", -0.25},
        {"1e3", 1000},    {"1E+3", 1000},
        {"25e-2", 0.25},  {"000123.500", 123.5},
        {"1e0000000", 1}, {"0e999999999999", 0},
        {"1e22", 1e22},   {"0.000000000000000000000001e24", 1},
        {"", NAN},
    };
    for (size_t i = 0; !isnan(cases[i].value); i++)
        ck_assert_double_eq(read_number(cases[i].text), cases[i].value);
    ck_assert(signbit(read_number("-0")));
}
END_TEST

START_TEST(other_texts_are_refused) {
    const char *const bad[] = {"",      ".",     "-",   "+",     "e5",   "1e",      "1e+",
                               "1.2.3", " 1",    "1 ",  "1,5",   "0x10", "inf",     "nan",
                               "-inf",  "1_000", "--1", "1e5.0", "1d5",  "١",       "1e 5",
                               "½",     "+-1",   "1f",  "1.e",   "\t1",  "infinity"};
    for (size_t i = 0; i < sizeof bad / sizeof bad[0]; i++) {
        double value = 77;
        ck_assert_msg(tarry_number_read(bad[i], strlen(bad[i]), &value) == TARRY_NUMBER_BAD,
                      "\"%s\" was read", bad[i]);
        ck_assert_double_eq(value, 77);
    }
    double value = 77;
    ck_assert_int_eq(tarry_number_read("1\0", 2, &value), TARRY_NUMBER_BAD);
    ck_assert_int_eq(tarry_number_read("123", 2, &value), TARRY_NUMBER_OK);
    ck_assert_double_eq(value, 12);
}
END_TEST

START_TEST(ends_of_the_range) {
    double value = 77;
    ck_assert_int_eq(tarry_number_read("1e309", 5, &value), TARRY_NUMBER_RANGE);
    ck_assert_int_eq(tarry_number_read("-1e309", 6, &value), TARRY_NUMBER_RANGE);
    ck_assert_int_eq(tarry_number_read("1e99999999999999999999", 22, &value), TARRY_NUMBER_RANGE);
    ck_assert_double_eq(value, 77);
    ck_assert_double_eq(read_number("1.7976931348623157e308"), DBL_MAX);
    ck_assert_double_eq(read_number("2.2250738585072014e-308"), DBL_MIN);
    ck_assert_double_eq(read_number("4.9e-324"), 0x1p-1074);
    ck_assert_double_eq(read_number("1e-400"), 0);
    ck_assert_double_eq(read_number("1e-99999999999999999999"), 0);
}
END_TEST

/* Halfway cases go to the even neighbour, and the least digit beyond decides (IEEE 754, round to
 * nearest). The long text is 1 + 2^-53 written out, exactly between two doubles. */
START_TEST(halves_go_to_even) {
    const char *half = "1.00000000000000011102230246251565404236316680908203125";
    char text[2048];
    ck_assert_double_eq(read_number(half), 1);
    snprintf(text, sizeof text, "%s1", half);
    ck_assert_double_eq(read_number(text), 1 + DBL_EPSILON);
    memset(text, '0', sizeof text);
    memcpy(text, half, strlen(half));
    text[1500] = '\0';
    ck_assert_double_eq(read_number(text), 1);
    text[1499] = '1';
    ck_assert_double_eq(read_number(text), 1 + DBL_EPSILON);
    ck_assert_double_eq(read_number("9007199254740993"), 9007199254740992.0);
    ck_assert_double_eq(read_number("9007199254740993.00000000000000000001"), 9007199254740994.0);
    ck_assert_double_eq(read_number("9007199254740995"), 9007199254740996.0);
}
END_TEST

/* A decimal at random: digits with a point and an exponent. */
static void random_text(tarry_stream *stream, char out[80]) {
    const uint64_t bits = tarry_stream_next(stream);
    const int n = 1 + (int)(bits % 40), point = (int)((bits >> 8) % 42);
    char *at = out;
    for (int i = 0; i < n; i++) {
        if (i == point)
            *at++ = '.';
        *at++ = (char)('0' + tarry_stream_next(stream) % 10);
    }
    const int range = (bits >> 60) < 8 ? 25 : 345;
    if ((bits >> 20) % 4 != 0)
        at += snprintf(at, 16, "e%d", (int)((bits >> 24) % (2 * (uint64_t)range)) - range);
    *at = '\0';
}

START_TEST(reading_agrees_with_strtod) {
    tarry_stream stream;
    tarry_stream_init(&stream, 1, 0, TARRY_STREAM_EVENTS);
    const int n = test_small() ? 20000 : 300000;
    for (int i = 0; i < n; i++) {
        char text[80];
        random_text(&stream, text);
        const double truth = strtod(text, NULL);
        double value = 0;
        const tarry_number_status status = tarry_number_read(text, strlen(text), &value);
        if (isinf(truth))
            ASSERT_FAST(status == TARRY_NUMBER_RANGE, "%s is too large", text);
        else
            ASSERT_FAST(status == TARRY_NUMBER_OK && value == truth, "%s: %a, not %a", text, value,
                        truth);
    }
}
END_TEST

START_TEST(prefixes) {
    const struct {
        const char *text;
        size_t length;
    } cases[] = {
        {"5 min", 1}, {"3.5kb", 3}, {"2e3s", 3}, {"2eggs", 1}, {"1e+", 1},  {"1e-5/h", 4},
        {"min", 0},   {"-", 0},     {"-2x", 2},  {"1.2.3", 3}, {".", 0},    {"..5", 0},
        {".5.", 2},   {"7.", 2},    {"", 0},     {"0x1F", 1},  {"1.e5", 4}, {"+.e5", 0},
    };
    for (size_t i = 0; i < sizeof cases / sizeof cases[0]; i++)
        ck_assert_msg(tarry_number_prefix(cases[i].text, strlen(cases[i].text)) == cases[i].length,
                      "\"%s\"", cases[i].text);
    ck_assert_uint_eq(tarry_number_prefix("1e5", 2), 1);
    ck_assert_uint_eq(tarry_number_prefix("1.5", 2), 2);
}
END_TEST

START_TEST(integers_are_read) {
    const struct {
        const char *text;
        tarry_number_status status;
        int64_t value;
    } cases[] = {
        {"0", TARRY_NUMBER_OK, 0},
        {"-0", TARRY_NUMBER_OK, 0},
        {"+17", TARRY_NUMBER_OK, 17},
        {"007", TARRY_NUMBER_OK, 7},
        {"9223372036854775807", TARRY_NUMBER_OK, INT64_MAX},
        {"-9223372036854775808", TARRY_NUMBER_OK, INT64_MIN},
        {"9223372036854775808", TARRY_NUMBER_RANGE, 77},
        {"-9223372036854775809", TARRY_NUMBER_RANGE, 77},
        {"99999999999999999999999", TARRY_NUMBER_RANGE, 77},
        {"1.0", TARRY_NUMBER_BAD, 77},
        {"1e3", TARRY_NUMBER_BAD, 77},
        {"", TARRY_NUMBER_BAD, 77},
        {"-", TARRY_NUMBER_BAD, 77},
        {"12 ", TARRY_NUMBER_BAD, 77},
        {"x", TARRY_NUMBER_BAD, 77},
    };
    for (size_t i = 0; i < sizeof cases / sizeof cases[0]; i++) {
        int64_t value = 77;
        ck_assert_int_eq(tarry_integer_read(cases[i].text, strlen(cases[i].text), &value),
                         cases[i].status);
        ck_assert_int_eq(value, cases[i].value);
    }
}
END_TEST

/* How numbers are laid out is ours (number.h). */
START_TEST(layout) {
    const struct {
        double value;
        const char *text;
    } cases[] = {
        {0, "0"},
        {-0.0, "0"},
        {1, "1"},
        {-2.5, "-2.5"},
        {100000, "100000"},
        {0.1, "0.1"},
        {1e-5, "0.00001"},
        {0.00012, "0.00012"},
        {9.5e-6, "9.5e-6"},
        {1e16, "10000000000000000"},
        {1.5e17, "1.5e17"},
        {1e17, "1e17"},
        {1e100, "1e100"},
        {-1e-100, "-1e-100"},
        {1.0 / 3, "0.3333333333333333"},
        {2e6 / 3, "666666.6666666666"},
        {0x1p-1074, "5e-324"},
        {DBL_MAX, "1.7976931348623157e308"},
        {0x1p-44, "5.684341886080802e-14"}, /* the nearest of 16 digits is out, its neighbour in */
        {0x1p53, "9007199254740992"},
        {0x1p60, "1.152921504606847e18"},
        {INFINITY, "inf"},
        {-INFINITY, "-inf"},
        {NAN, "nan"},
    };
    for (size_t i = 0; i < sizeof cases / sizeof cases[0]; i++)
        ck_assert_str_eq(write_number(cases[i].value), cases[i].text);
}
END_TEST

/* Significant digits of a text that write_number gave. */
static int count_digits(const char *text) {
    int n = 0, zeros = 0;
    for (; *text != '\0' && *text != 'e'; text++) {
        if (*text == '0' && n > 0)
            zeros++;
        if (*text >= '1' && *text <= '9') {
            n += zeros + 1;
            zeros = 0;
        }
    }
    return n;
}

/* Whether some decimal of n digits reads back to x > 0: the one nearest to x, or a neighbour of it.
 */
static bool fits(double x, int n) {
    char text[64], other[64];
    snprintf(text, sizeof text, "%.*e", n - 1, x);
    char *e = strchr(text, 'e');
    const int exponent = atoi(e + 1);
    *e = '\0';
    char digits[32];
    int used = 0;
    for (const char *at = text; *at != '\0'; at++)
        if (*at != '.')
            digits[used++] = *at;
    digits[used] = '\0';
    const long long whole = atoll(digits);
    for (int step = -1; step <= 1; step++) {
        snprintf(other, sizeof other, "%llde%d", whole + step, exponent - (n - 1));
        if (strtod(other, NULL) == x)
            return true;
    }
    return false;
}

static void check_writing(double x) {
    char out[TARRY_NUMBER_SIZE];
    tarry_number_write(x, out);
    ASSERT_FAST(strtod(out, NULL) == x, "%a became %s", x, out);
    const int n = count_digits(out);
    ASSERT_FAST(x == 0 || n <= 1 || !fits(fabs(x), n - 1), "%s has more digits than it needs", out);
    /* Of the decimals with so few digits it is the nearest, where that one reads back. */
    char nearest[64];
    snprintf(nearest, sizeof nearest, "%.*e", n > 0 ? n - 1 : 0, x);
    if (strtod(nearest, NULL) == x)
        ASSERT_FAST(strtold(out, NULL) == strtold(nearest, NULL), "%s is not the nearest: %s", out,
                    nearest);
}

START_TEST(writing_is_shortest) {
    tarry_stream stream;
    tarry_stream_init(&stream, 1, 1, TARRY_STREAM_EVENTS);
    const int n = test_small() ? 3000 : 50000;
    for (int i = 0; i < n; i++) {
        const uint64_t bits = tarry_stream_next(&stream);
        double x;
        memcpy(&x, &bits, sizeof x);
        if (isfinite(x))
            check_writing(x);
        const double u = tarry_unit(tarry_stream_next(&stream));
        const double usual = u * pow(10, (double)(bits % 30) - 12);
        check_writing(usual);
        check_writing(floor(usual * 1000) / 1000);
        check_writing(floor(u * pow(2, (double)(bits % 62))));
    }
}
END_TEST

/* Powers of two lie off the middle of what reads back to them; ten and its kin try the bounds of
 * the fast way. */
START_TEST(writing_at_corners) {
    for (int e = -1074; e <= 1023; e++) {
        const double x = ldexp(1, e);
        check_writing(x);
        check_writing(nextafter(x, 0));
        check_writing(nextafter(x, INFINITY));
    }
    for (int e = -320; e <= 308; e++) {
        char text[16];
        snprintf(text, sizeof text, "1e%d", e);
        const double x = strtod(text, NULL);
        check_writing(x);
        check_writing(nextafter(x, 0));
        check_writing(nextafter(x, INFINITY));
    }
}
END_TEST

/* A locale whose decimal point is a comma: one that is installed, else one made here by localedef
 * from the few lines that matter. */
static void set_comma_locale(void) {
    static const char *const usual[] = {"de_DE.UTF-8", "de_DE.utf8", "fr_FR.UTF-8", "de_DE"};
    for (size_t i = 0; i < sizeof usual / sizeof usual[0]; i++)
        if (setlocale(LC_ALL, usual[i]) != NULL)
            return;
    FILE *source = fopen(test_path("comma.src"), "w");
    ck_assert_ptr_nonnull(source);
    fputs("comment_char %\nescape_char /\nLC_NUMERIC\ndecimal_point \",\"\nthousands_sep \".\"\n"
          "grouping 3;3\nEND LC_NUMERIC\n",
          source);
    ck_assert_int_eq(fclose(source), 0);
    char command[4096];
    snprintf(command, sizeof command, "cd %s && localedef -c -i comma.src ./comma >comma.log 2>&1",
             test_folder());
    const int status = system(command); /* 1 for categories left out, which is meant */
    (void)status;
    ck_assert_int_eq(setenv("LOCPATH", test_folder(), 1), 0);
    ck_assert_msg(setlocale(LC_NUMERIC, "comma") != NULL,
                  "no locale with a decimal comma is installed, and localedef could make none");
}

/* Rounded numbers: digits by printf, which rounds correctly; layout ours. */
START_TEST(rounded) {
    const struct {
        double value;
        int digits;
        const char *text;
    } cases[] = {
        {0.0123456, 3, "0.0123"},
        {-1234.5678, 6, "-1234.57"},
        {99.96, 3, "100"},
        {1.5, 17, "1.5"},
        {2.0 / 3, 4, "0.6667"},
        {1e20, 2, "1e20"},
        {123456, 2, "120000"},
        {3.7e-9, 1, "4e-9"},
        {0, 3, "0"},
        {-INFINITY, 3, "-inf"},
        {NAN, 3, "nan"},
    };
    for (size_t i = 0; i < sizeof cases / sizeof cases[0]; i++) {
        char out[TARRY_NUMBER_SIZE];
        ck_assert_uint_eq(tarry_number_write_rounded(cases[i].value, cases[i].digits, out),
                          strlen(cases[i].text));
        ck_assert_str_eq(out, cases[i].text);
    }
}
END_TEST

START_TEST(decimals_are_those_of_printf) {
    tarry_stream stream;
    tarry_stream_init(&stream, 1, 2, TARRY_STREAM_EVENTS);
    for (int i = 0; i < 20000; i++) {
        const uint64_t bits = tarry_stream_next(&stream);
        const double x = (tarry_unit(tarry_stream_next(&stream)) - 0.5) *
                         pow(10, (double)(bits % 20) - 10);
        const int decimals = (int)(bits >> 60);
        char out[TARRY_NUMBER_SIZE], truth[64];
        snprintf(truth, sizeof truth, fabs(x) < 1e9 ? "%.*f" : "%.*e", decimals, x);
        const size_t n = tarry_number_write_fixed(x, decimals, out);
        ASSERT_FAST(strcmp(out, truth) == 0 && n == strlen(out), "%s, not %s", out, truth);
        snprintf(truth, sizeof truth, "%.*e", decimals, x);
        tarry_number_write_power(x, decimals, out);
        ASSERT_FAST(strcmp(out, truth) == 0, "%s, not %s", out, truth);
    }
    char out[TARRY_NUMBER_SIZE];
    tarry_number_write_fixed(-999999999.96875, 17, out);
    ck_assert_str_eq(out, "-999999999.96875000000000000");
    tarry_number_write_power(-1.5e-300, 17, out);
    ck_assert_uint_lt(strlen(out), TARRY_NUMBER_SIZE);
    tarry_number_write_fixed(INFINITY, 2, out);
    ck_assert_str_eq(out, "inf");
    tarry_number_write_fixed(NAN, 2, out);
    ck_assert(strcmp(out, "nan") == 0 || strcmp(out, "-nan") == 0);
}
END_TEST

START_TEST(locale_does_not_matter) {
    set_comma_locale();
    char text[32];
    snprintf(text, sizeof text, "%.1f", 0.5);
    ck_assert_str_eq(text, "0,5"); /* the locale is in force */
    ck_assert_double_eq(read_number("0.5"), 0.5);
    ck_assert_double_eq(read_number("0.1234567890123456789"), 0.1234567890123456789);
    ck_assert_double_eq(read_number("1.7976931348623157e308"), DBL_MAX);
    double value;
    ck_assert_int_eq(tarry_number_read("0,5", 3, &value), TARRY_NUMBER_BAD);
    ck_assert_str_eq(write_number(1.0 / 3), "0.3333333333333333");
    ck_assert_str_eq(write_number(1.5e-300), "1.5e-300");
    ck_assert_str_eq(write_number(-1.2345678901234567e+200), "-1.2345678901234567e200");
    ck_assert_str_eq(write_number(1234567.5), "1234567.5");
    char out[TARRY_NUMBER_SIZE];
    tarry_number_write_rounded(1.0 / 3, 3, out);
    ck_assert_str_eq(out, "0.333");
    tarry_number_write_fixed(1234567.25, 1, out);
    ck_assert_str_eq(out, "1234567.2");
    tarry_number_write_power(-1234.5, 3, out);
    ck_assert_str_eq(out, "-1.234e+03");
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"numbers are read", numbers_are_read},
        {"other texts are refused", other_texts_are_refused},
        {"ends of the range", ends_of_the_range},
        {"halves go to even", halves_go_to_even},
        {"reading agrees with strtod", reading_agrees_with_strtod},
        {"prefixes", prefixes},
        {"integers are read", integers_are_read},
        {"layout", layout},
        {"writing is shortest", writing_is_shortest},
        {"writing at corners", writing_at_corners},
        {"rounded", rounded},
        {"decimals are those of printf", decimals_are_those_of_printf},
        {"the locale does not matter", locale_does_not_matter},
    };
    return run_tests("numbers as text", tests, sizeof tests / sizeof tests[0]);
}
