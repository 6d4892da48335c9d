/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Units: sizes are those of the SI and of the calendar (BIPM, The International System of Units,
 * 9th edition, table 8: min, h, d), 1 kb = 1000 bp by common practice. */
#include "model/quantity.h"

#include <check.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

static const tarry_units minutes = {60}, hours = {3600};

static void check_quantity(const char *text, tarry_units units, double value,
                           tarry_dimension dimension) {
    double read = -1;
    tarry_dimension found = TARRY_ANY;
    ck_assert_msg(tarry_quantity_read(text, strlen(text), units, &read, &found), "%s", text);
    ck_assert_msg(read == value, "%s: %.17g, not %.17g", text, read, value);
    ck_assert_msg(found.known == dimension.known && found.time == dimension.time &&
                      found.length == dimension.length,
                  "%s", text);
}

START_TEST(quantities) {
    check_quantity("12", minutes, 12, TARRY_ANY);
    check_quantity(" -1.5e3 ", minutes, -1500, TARRY_ANY);
    check_quantity("90 s", minutes, 1.5, TARRY_TIME);
    check_quantity("5min", minutes, 5, TARRY_TIME);
    check_quantity("4 h", minutes, 240, TARRY_TIME);
    check_quantity("2 d", minutes, 2880, TARRY_TIME);
    check_quantity("1 d", hours, 24, TARRY_TIME);
    check_quantity("-5 min", minutes, -5, TARRY_TIME);
    check_quantity("0.35 /min", minutes, 0.35, TARRY_RATE);
    check_quantity("0.1/s", minutes, 6, TARRY_RATE);
    check_quantity("0.1 1/s", minutes, 6, TARRY_RATE);
    check_quantity("1.5 / h", minutes, 0.025, TARRY_RATE);
    check_quantity("4.2 kb", minutes, 4200, TARRY_LENGTH);
    check_quantity("7 bp", minutes, 7, TARRY_LENGTH);
    check_quantity("7 nt", minutes, 7, TARRY_LENGTH);
    check_quantity("1.8 kb/min", hours, 108000, ((tarry_dimension){true, -1, 1}));
    check_quantity("2 min/kb", minutes, 0.002, ((tarry_dimension){true, 1, -1}));
    check_quantity("3 h/min", minutes, 180, TARRY_PURE);
    check_quantity("3 /kb", minutes, 0.003, ((tarry_dimension){true, 0, -1}));
}
END_TEST

/* One rounding: every whole number of minutes is the double nearest to its share of an hour or day,
 * as C's own division gives it. A scale rounded beforehand misses in many of them. */
START_TEST(a_quantity_is_rounded_once) {
    int misses = 0;
    for (int i = 1; i <= 3000; i++) {
        char text[32];
        double value = 0;
        tarry_dimension dimension;
        snprintf(text, sizeof text, "%d min", i);
        ck_assert(tarry_quantity_read(text, strlen(text), hours, &value, &dimension));
        ck_assert(value == i / 60.0);
        misses += i * (1 / 60.0) != value;
        snprintf(text, sizeof text, "%d /h", i);
        ck_assert(tarry_quantity_read(text, strlen(text), minutes, &value, &dimension));
        ck_assert(value == i / 60.0);
    }
    ck_assert_int_gt(misses, 0);
}
END_TEST

START_TEST(no_quantities) {
    static const char *const texts[] = {
        "",     "min",   "5 minutes", "5 min min", "5 min/",  "5 /",     "5 min/h/s",
        "k",    "2 * 3", "5 k",       "5 nM",      "1e999",   "1e308 d", "5 /min 2",
        "2 /k", "0x10",  "inf",       "nan s",     "1,5 min", "5 1",     "5 2/s",
    };
    for (size_t i = 0; i < sizeof texts / sizeof *texts; i++) {
        double value = -1;
        tarry_dimension dimension;
        ck_assert_msg(!tarry_quantity_read(texts[i], strlen(texts[i]), minutes, &value, &dimension),
                      "%s", texts[i]);
    }
}
END_TEST

static void check_unit_refused(const char *text, const char *words) {
    tarry_error error = {0};
    double scale = -1;
    tarry_dimension dimension;
    ck_assert_int_eq(tarry_unit_read(text, strlen(text), minutes, &scale, &dimension, &error),
                     TARRY_INPUT);
    ck_assert_msg(strstr(error.message, words) != NULL, "%s: %s", text, error.message);
    ck_assert(scale == -1);
}

START_TEST(units) {
    double scale = 0;
    tarry_dimension dimension;
    ck_assert_int_eq(tarry_unit_read("kb/min", 6, hours, &scale, &dimension, NULL), 0);
    ck_assert(scale == 60000 && dimension.time == -1 && dimension.length == 1);
    ck_assert_int_eq(tarry_unit_read("1/s", 3, minutes, &scale, &dimension, NULL), 0);
    ck_assert(scale == 60 && dimension.time == -1);
    check_unit_refused("minutes", "'minutes' is no unit; write 'min'");
    check_unit_refused("/hr", "'hr' is no unit; write 'h'");
    check_unit_refused("furlong", "units are s, min, h, d, bp, nt, kb");
    check_unit_refused("nM", "stochastic constants in counts");
    check_unit_refused("/\xc2\xb5M", "stochastic constants in counts");
    check_unit_refused("mol/s", "stochastic constants in counts");
    ck_assert(tarry_time_unit_seconds("min") == 60 && tarry_time_unit_seconds("d") == 86400);
    ck_assert(tarry_time_unit_seconds("kb") == 0 && tarry_time_unit_seconds("") == 0);
}
END_TEST

START_TEST(dimensions) {
    char out[48];
    ck_assert_str_eq(tarry_dimension_text(TARRY_TIME, out), "a time");
    ck_assert_str_eq(tarry_dimension_text(TARRY_RATE, out), "a rate (1/time)");
    ck_assert_str_eq(tarry_dimension_text(TARRY_LENGTH, out), "a length");
    ck_assert_str_eq(tarry_dimension_text(TARRY_PURE, out), "a pure number");
    ck_assert_str_eq(tarry_dimension_text(TARRY_ANY, out), "a number without a unit");
    ck_assert_str_eq(tarry_dimension_text((tarry_dimension){true, 2, -3}, out), "time^2 length^-3");
    ck_assert(tarry_dimension_fits(TARRY_ANY, TARRY_TIME));
    ck_assert(tarry_dimension_fits(TARRY_TIME, TARRY_ANY));
    ck_assert(tarry_dimension_fits(TARRY_TIME, TARRY_TIME));
    ck_assert(!tarry_dimension_fits(TARRY_TIME, TARRY_RATE));
    ck_assert(!tarry_dimension_fits(TARRY_PURE, TARRY_TIME));
    ck_assert(!tarry_dimension_fits(TARRY_LENGTH, TARRY_PURE));
}
END_TEST

static Suite *quantity_suite(void) {
    Suite *suite = suite_create("quantity");
    TCase *tests = tcase_create("quantity");
    tcase_add_test(tests, quantities);
    tcase_add_test(tests, a_quantity_is_rounded_once);
    tcase_add_test(tests, no_quantities);
    tcase_add_test(tests, units);
    tcase_add_test(tests, dimensions);
    suite_add_tcase(suite, tests);
    return suite;
}

int main(void) {
    SRunner *runner = srunner_create(quantity_suite());
    srunner_run_all(runner, CK_ENV);
    int failed = srunner_ntests_failed(runner);
    srunner_free(runner);
    return failed == 0 ? EXIT_SUCCESS : EXIT_FAILURE;
}
