/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Visible and dark periods: the rule on traces written by hand, and runs of a promoter that is seen
 * itself against the chain of its frames (the chance to be open one frame after the other is that
 * of a two-state Markov process, Cox & Miller 1965, The Theory of Stochastic Processes, 4.3). */

#include "support.h"

#include "tally/visible.h"
#include "tarry/tarry.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

/* ---- by hand -------------------------------------------------------------------------------- */

static void write_period(const tarry_visible_period *period, void *context) {
    char *text = context;
    sprintf(text + strlen(text), "%s%c%zu-%zu%s", period->starts ? "" : "(",
            period->visible ? 'v' : 'd', period->from, period->to, period->cut_off ? ") " : " ");
}

/* A trace as digits, `.` for a missing frame; dark below 3, visible above 5. */
static void check_trace(const char *trace, size_t least, const char *expected) {
    double values[64];
    char found[512] = "";
    for (size_t i = 0; trace[i]; i++)
        values[i] = trace[i] == '.' ? NAN : trace[i] - '0';
    tarry_visible_periods(values, strlen(trace), 3, 5, least, write_period, found);
    ck_assert_msg(!strcmp(found, expected), "%s, %zu: %s, not %s", trace, least, found, expected);
}

START_TEST(by_hand) {
    check_trace("", 1, "");
    check_trace("....", 1, "");
    check_trace("4444", 1, "");
    check_trace("0", 1, "(d0-1) ");
    check_trace("0099900", 1, "(d0-2 v2-5 d5-7) ");
    check_trace("0053990054", 1, "(d0-4 v4-6 d6-10) "); /* at 5 and 3 nothing changes */
    check_trace("4490044", 1, "(v2-3 d3-7) ");          /* nothing known before the 9 */
    check_trace("00.9.00", 1, "(d0-3 v3-5 d5-7) ");     /* missing: as the frame before */
    check_trace("..00999..", 1, "(d2-4 v4-7) ");
    check_trace("0090099900", 2, "(d0-5 v5-8 d8-10) ");  /* one bright frame is passed over */
    check_trace("00999099900", 2, "(d0-2 v2-9 d9-11) "); /* and one dark one */
    check_trace("0090909000", 2, "(d0-10) ");            /* never two in a row */
    check_trace("9000", 2, "(v0-1 d1-4) ");              /* the first has no length of its own */
    check_trace("000990009", 2, "(d0-3 v3-5 d5-8) ");    /* cut off where the last change began */
    check_trace("0009.9000", 3, "(d0-3 v3-6 d6-9) ");    /* a gap counts with what it is in */
    check_trace("0004999444000", 3, "(d0-4 v4-10 d10-13) ");
}
END_TEST

/* ---- runs ----------------------------------------------------------------------------------- */

static const double on = 0.3, off = 0.5, every = 0.5;

enum { MOST = 4000 };

/* Chances from one frame to the next to stay open (shut). */
static double stays(bool open) {
    const double share = on / (on + off), leave = exp(-(on + off) * every);
    return open ? share + (1 - share) * leave : 1 - share + share * leave;
}

/* P(a period lasts more than k frames), where a change must last `least`: its first `least` frames
 * are given; it goes on through shorter changes, and ends where one begins that lasts. */
static void lasts(bool open, size_t least, double survival[MOST]) {
    static double here[2 * MOST];
    const double stay = stays(open), other = stays(!open);
    double left = 1;
    memset(here, 0, sizeof here);
    here[least] = 1; /* chance to be in the state at the last of so many frames */
    for (size_t k = 0; k < MOST; k++) {
        left -= k >= least ? here[k] * (1 - stay) * pow(other, (double)least - 1) : 0;
        survival[k] = left;
        here[k + 1] += here[k] * stay;
        for (size_t j = 1; j < least; j++)
            here[k + j + 1] += here[k] * (1 - stay) * pow(other, (double)j - 1) * (1 - other);
    }
}

static tarry_results *run(const char *visible, int until) {
    static const char format[] =
        "tarry: 1\ntime: min\ngenes:\n  vela:\n    start: steady\n    promoter:\n"
        "      shut: {to: {open: 0.3}}\n      open: {to: {shut: 0.5}, initiates: 1}\n"
        "    transcript: {decay: 1}\n"
        "signals: {lamp: {sum: {vela.open: 1}}}\n"
        "run: {cells: %d, until: %d, every: 0.5, visible: %s, record: [lamp]}\n";
    char text[1024];
    tarry_model *model;
    tarry_results *results;
    tarry_error error = {0};
    const tarry_run_options options = {0};
    snprintf(text, sizeof text, format, (test_small() ? 320 : 3200) * (100 / until), until,
             visible);
    tarry_start();
    ck_assert_msg(!tarry_model_read_text(text, strlen(text), "m.yaml", NULL, 0, &model, &error),
                  "%s", error.message);
    ck_assert_msg(!tarry_run(model, &options, &results, &error), "%s", error.message);
    tarry_model_free(model);
    return results;
}

/* An interval holds the value, or would if it were 2.3 times as wide: 4.5 standard errors. */
static void near(double exact, double value, double low, double high, const char *what) {
    const double half = exact < value ? value - low : high - value;
    ck_assert_msg(fabs(exact - value) <= 2.3 * half + 1e-12, "%s: %g (%g to %g), exact %g", what,
                  value, low, high, exact);
}

static size_t check_curve(const tarry_results *results, const char *period, size_t least) {
    static double survival[MOST];
    const tarry_table *table = tarry_results_table(results, TARRY_TABLE_dwells);
    size_t n = 0;
    lasts(!strcmp(period, "visible"), least, survival);
    for (size_t row = 0; row < tarry_table_n_rows(table); row++) {
        const double value = tarry_table_number(table, row, tarry_table_column(table, "survival"));
        const double low = tarry_table_number(table, row, tarry_table_column(table, "low"));
        const double high = tarry_table_number(table, row, tarry_table_column(table, "high"));
        const size_t k = (size_t)lround(
            tarry_table_number(table, row, tarry_table_column(table, "time")) / every);
        if (strcmp(tarry_table_text(table, row, tarry_table_column(table, "period")), period) ||
            value < 0.01)
            continue;
        if (k < least) {
            ck_assert_double_eq(value, 1);
            continue;
        }
        near(survival[k], value, low, high, period);
        n++;
    }
    return n;
}

START_TEST(curves) {
    static const struct {
        const char *visible;
        size_t least;
    } cases[] = {{"[0.5, 0.5, 0]", 1}, {"[0.2, 0.7, 1]", 2}, {"[0.5, 0.5, 1.4]", 3}};
    for (size_t i = 0; i < 3; i++) {
        tarry_results *results = run(cases[i].visible, 100);
        ck_assert_uint_gt(check_curve(results, "visible", cases[i].least), 10);
        ck_assert_uint_gt(check_curve(results, "dark", cases[i].least), 10);
        tarry_results_free(results);
    }
}
END_TEST

static void check_quantity(const tarry_results *results, const char *quantity, double exact) {
    const tarry_table *table = tarry_results_table(results, TARRY_TABLE_signals);
    size_t row = 0;
    while (strcmp(tarry_table_text(table, row, tarry_table_column(table, "quantity")), quantity))
        ck_assert_uint_lt(++row, tarry_table_n_rows(table));
    near(exact, tarry_table_number(table, row, tarry_table_column(table, "value")),
         tarry_table_number(table, row, tarry_table_column(table, "low")),
         tarry_table_number(table, row, tarry_table_column(table, "high")), quantity);
}

START_TEST(figures) {
    const double share = on / (on + off);
    tarry_results *results = run("[0.5, 0.5, 0]", 5); /* 11 frames: the first one matters */
    check_quantity(results, "visible_fraction", share);
    check_quantity(results, "visible_frequency", (1 - share) * (1 - stays(false)) / every);
    check_quantity(results, "visible_time_mean", every / (1 - stays(true)));
    check_quantity(results, "dark_time_mean", every / (1 - stays(false)));
    tarry_results_free(results);
}
END_TEST

int main(void) {
    const test_entry tests[] = {{"by hand", by_hand}, {"curves", curves}, {"figures", figures}};
    return run_tests("visible", tests, sizeof tests / sizeof *tests);
}
