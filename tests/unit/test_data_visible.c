/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Thresholds of measured traces. That the periods told by them are right is tests/against/
 * test_visible.c's matter, and that a run's film gives the run's periods tests/cli/measure.sh's. */

#include "base/table.h"
#include "measured.h"
#include "model/model.h"
#include "study/data.h"
#include "support.h"

#include <gsl/gsl_randist.h>
#include <gsl/gsl_rng.h>
#include <math.h>
#include <string.h>

/* By hand, halves of (n + 1)/2 values: of 0 4 4.25 5 8 16 the narrowest three are 4 4.25 5, whose
 * nearer pair is 4 4.25. Of even gaps the middle one counts. */
START_TEST(test_mode) {
    ck_assert_double_eq(tarry_data_mode((double[]){0, 4, 4.25, 5, 8, 16}, 6), 4.125);
    ck_assert_double_eq(tarry_data_mode((double[]){0, 4, 4.5, 5, 8, 16}, 6), 4.5);
    ck_assert_double_eq(tarry_data_mode((double[]){0, 4, 4.75, 5, 8, 16}, 6), 4.875);
    ck_assert_double_eq(tarry_data_mode((double[]){0, 0.25, 3, 3.5, 4}, 5),
                        3.5); /* three of five */
    ck_assert_double_eq(tarry_data_mode((double[]){3}, 1), 3);
    ck_assert_double_eq(tarry_data_mode((double[]){3, 5}, 2), 4);
    ck_assert_double_eq(tarry_data_mode((double[]){1, 1, 1, 7, 9, 12, 13}, 7), 1);
}
END_TEST

enum { CELLS = 40, FRAMES = 500 };

/* Normal noise of sd 0.5 about 3, and spots of 6 to 16 above it in a fifth of the frames. */
static void write_film(tarry_text *text) {
    gsl_rng *rng = gsl_rng_alloc(gsl_rng_mt19937);
    ck_assert_ptr_nonnull(rng);
    gsl_rng_set(rng, 1);
    tarry_text_add_string(text, "cell,time,spot\n");
    for (size_t cell = 0; cell < CELLS; cell++)
        for (size_t frame = 0; frame < FRAMES; frame++) {
            const bool is_there = (frame + 7 * cell) % 50 < 10;
            const double value = 3 + gsl_ran_gaussian(rng, 0.5) +
                                 (is_there ? 6 + 10 * gsl_rng_uniform(rng) : 0);
            measured_row(text, cell, 0.5 * (double)frame, &value, 1);
        }
    gsl_rng_free(rng);
}

static double quantity(const measured *m, const char *name) {
    const tarry_table *table = tarry_results_table(m->results, TARRY_TABLE_signals);
    for (size_t row = 0; row < tarry_table_n_rows(table); row++)
        if (strcmp(tarry_table_text(table, row, 2), name) == 0)
            return tarry_table_number(table, row, 4);
    return NAN;
}

/* The half-sample mode of n normal values is off by some 1.3 n^(-1/3) sd (Bickel & Fruehwirth
 * 2006): 0.05 sd of 16,000; the sd is off by as much of that as the mode. Periods are ten frames of
 * every fifty; ratios over a record of ten such are off by what it cuts at its ends. */
START_TEST(test_found) {
    const char *const options[] = {"--time", "min", "--visible", "auto", NULL};
    tarry_text text = {0};
    measured m;
    write_film(&text);
    measured_pass(&m, text.data, options);
    const tarry_thresholds *t = m.data->model->network.channels[0].thresholds;
    ck_assert_ptr_nonnull(t);
    ck_assert_double_eq_tol(t->background, 3, 0.2);
    ck_assert_double_eq_tol(t->background_sd, 0.5, 0.1);
    ck_assert_double_eq_tol(t->low, t->background + 2 * t->background_sd, 1e-12);
    ck_assert_double_eq_tol(t->high, t->background + 4 * t->background_sd, 1e-12);
    ck_assert_double_eq_tol(t->least, 1, 1e-12);
    ck_assert_double_eq_tol(quantity(&m, "visible_time_mean"), 5, 0.1);
    ck_assert_double_eq_tol(quantity(&m, "dark_time_mean"), 20, 0.2);
    ck_assert_double_eq_tol(quantity(&m, "visible_fraction"), 0.2, 5e-3);
    ck_assert(strstr(tarry_results_warning(m.results, 0), "its background was taken to be"));
    measured_release(&m);
    tarry_text_release(&text);
}
END_TEST

static const char few[] =
    "cell,time,spot\na,0,1\na,1,1\na,2,9\na,3,1\nb,0,1\nb,1,9\nb,2,9\nb,3,1\n";

START_TEST(test_given) {
    const char *const options[] = {"--time", "min", "--visible", "2.5,4,30 s", NULL};
    measured m;
    measured_pass(&m, few, options);
    const tarry_thresholds *t = m.data->model->network.channels[0].thresholds;
    ck_assert_double_eq(t->low, 2.5);
    ck_assert_double_eq(t->high, 4);
    ck_assert_double_eq(t->least, 0.5);
    ck_assert(!t->is_found);
    ck_assert_double_eq_tol(quantity(&m, "visible_fraction"), 3.0 / 8, 1e-12);
    measured_release(&m);
}
END_TEST

static void refused(const char *text, const char *value, const char *words) {
    const char *const options[] = {"--time", "min", "--visible", value, NULL};
    measured m;
    ck_assert_int_eq(measured_try(&m, text, options), TARRY_INPUT);
    ck_assert_msg(strstr(m.error.message, words) != NULL, "%s: %s", value, m.error.message);
    measured_release(&m);
}

START_TEST(test_refused) {
    static const char *const forms[] = {"2,4",   "2",        "",     "a,4,1",
                                        "2,b,1", "2,4,1 kb", "2,4,", "Auto"};
    for (size_t i = 0; i < sizeof forms / sizeof *forms; i++)
        refused(few, forms[i], "`auto` is due here");
    refused(few, "4,2,1", "must not be above the upper one");
    refused(few, "2,4,-1", "the length is not negative");
    refused(few, "auto", "the background of 'spot' cannot be told");
    refused("time,spot\n0,1\n0,2\n", "2,4,1", "--visible is for traces");
}
END_TEST

/* Frames 0 to 11 min, visible 9 and dark 0, one missing in a visible period, changes of two frames.
 *
 * a: dark 0-1, visible 2-4, dark 5-7, visible 8-9, dark 10-11
 * b: visible 0-1, dark 2-8 (the 9 at 5 is too short), visible 9-11
 *
 * Without the first frame of each, at which nothing can start, 22 min are seen, 9 of them visible,
 * 13 dark, and three periods of either start. Visible ones last 3, 2, and 3 cut off: of three, one
 * ends at 2, and of the two that are left one at 3. Dark ones last 3, 2 cut off, and 7. */
static const char worked[] =
    "cell,time,spot\na,0,0\na,1,0\na,2,9\na,3,NaN\na,4,9\na,5,0\na,6,0\na,7,0\na,8,9\na,9,9\n"
    "a,10,0\na,11,0\nb,0,9\nb,1,9\nb,2,0\nb,3,0\nb,4,0\nb,5,9\nb,6,0\nb,7,0\nb,8,0\nb,9,9\n"
    "b,10,9\nb,11,9\n";

START_TEST(test_by_hand) {
    const char *const options[] = {"--time",    "min",       "--gaps", "missing",
                                   "--visible", "3,5,2 min", NULL};
    static const struct {
        const char *period;
        double time, survival;
    } curve[] = {{"visible", 0, 1}, {"visible", 2, 2.0 / 3}, {"visible", 3, 1.0 / 3},
                 {"dark", 0, 1},    {"dark", 3, 0.5},        {"dark", 7, 0}};
    measured m;
    measured_pass(&m, worked, options);
    ck_assert_double_eq_tol(quantity(&m, "visible_fraction"), 10.0 / 24, 1e-12);
    ck_assert_double_eq_tol(quantity(&m, "visible_frequency"), 3.0 / 22, 1e-12);
    ck_assert_double_eq_tol(quantity(&m, "visible_time_mean"), 9.0 / 3, 1e-12);
    ck_assert_double_eq_tol(quantity(&m, "dark_time_mean"), 13.0 / 3, 1e-12);
    const tarry_table *dwells = tarry_results_table(m.results, TARRY_TABLE_dwells);
    ck_assert_uint_eq(tarry_table_n_rows(dwells), sizeof curve / sizeof *curve);
    for (size_t i = 0; i < sizeof curve / sizeof *curve; i++) {
        ck_assert_str_eq(tarry_table_text(dwells, i, 2), curve[i].period);
        ck_assert_double_eq_tol(tarry_table_number(dwells, i, 3), curve[i].time, 1e-12);
        ck_assert_double_eq_tol(tarry_table_number(dwells, i, 4), curve[i].survival, 1e-12);
    }
    measured_release(&m);
}
END_TEST

int main(void) {
    const test_entry tests[] = {{"mode", test_mode},
                                {"found", test_found},
                                {"given", test_given},
                                {"by hand", test_by_hand},
                                {"refused", test_refused}};
    return run_tests("data visible", tests, sizeof tests / sizeof *tests);
}
