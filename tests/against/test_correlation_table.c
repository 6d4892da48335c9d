/* SPDX-License-Identifier: GPL-3.0-or-later */

/* The estimator of autocorrelation.csv against a general-purpose statistics library: R's package
 * stats, version 4.2.2 (Debian r-base-core 4.2.2.20221110-2), run once; its numbers are recorded
 * here.
 *
 * x and y are the numbers of value_x and value_y below, 6 cells of 48 frames. Recorded with
 *   n <- 48; k <- 0:12; acf(x[1,], type = "covariance", lag.max = 12, plot = FALSE)$acf * n / (n -
 * k) k <- -12:12; ccf(y[1,], x[1,], type = "covariance", lag.max = 12)$acf * n / (n - abs(k)) mean
 * over frames i of cov(x[, i], x[, i + k]), and of cov(x[, i], y[, i + k]), over the six cells. */

#include "hand.h"
#include "support.h"
#include "tally/kinds.h"

#include <math.h>

enum { FRAMES = 48, LAGS = 13, CELLS = 6 };

static const double one_cell_auto[LAGS] = {
    61.55164930555555,   20.661116651891252,  5.2377528683574859, -12.817853009259261,
    -3.5620659722222219, -3.5516493055555549, 20.49993799603175,  -2.6293932079945805,
    -5.9427951388888909, -7.7845552884615419, 8.4987892909356741, 1.5694092530030035,
    5.9489293981481488};

static const double one_cell_cross[2 * LAGS - 1] = {
    -28.651331018518519, -22.32153246996997,   -1.7969206871345049, 8.5549545940170919,
    6.1053819444444404,  6.74074779810298,     -5.0445188492063506, -4.1517885981912137,
    3.2974273989898988,  23.653993055555556,   3.6657986111111138,  1.9612330082742289,
    -2.4470486111111103, 11.286587618203306,   26.562084842995169,  63.166030092592592,
    19.056897095959599,  -0.32523821059431129, -16.082217261904759, -0.8253091124661216,
    -5.8717013888888889, 21.221621260683769,   -4.4230171783625716, -7.7978838213213191,
    -9.6154513888888822};

static const double over_cells_auto[LAGS] = {
    69.80416666666666,   9.3737588652482273,  -3.2094202898550726, -9.3103703703703715,
    -13.586363636363636, 5.713953488372093,   17.704761904761906,  3.9300813008130082,
    8.7341666666666669,  -2.5452991452991451, 5.8324561403508772,  2.644144144144144,
    -7.4916666666666663};

static const double over_cells_cross[2 * LAGS - 1] = {
    -2.072222222222222,  -3.0198198198198201,  8.5236842105263158,   -6.9905982905982906,
    2.3191666666666668,  6.4268292682926829,   -0.33412698412698422, 10.539534883720931,
    3.5250000000000008,  17.117777777777778,   5.2376811594202906,   -10.336170212765957,
    -4.3500000000000005, -0.15673758865248213, 12.151449275362319,   67.8237037037037,
    8.5825757575757571,  -4.4325581395348834,  -8.5976190476190482,  -11.198373983739838,
    5.4508333333333336,  18.324786324786324,   0.71052631578947356,  9.2585585585585584,
    -5.4259259259259256};

static double value_x(int c, int i) {
    return (7 * i * i + 13 * c * i + 5 * c * c + 3 * i) % 29 + 3 * ((i / 6) % 4);
}

static double value_y(int c, int i) {
    return value_x(c, i > 3 ? i - 3 : 0) + (11 * i + 17 * c) % 7;
}

static tarry_results *estimate(size_t n_cells, double settle) {
    static hand h;
    tarry_record records[CELLS] = {{0}};
    hand_init(&h, settle, FRAMES - 1, FRAMES);
    h.network.run.n_lags = LAGS;
    hand_signal(&h, "x", 0, 0);
    hand_signal(&h, "y", 0, 0);
    for (size_t c = 0; c < n_cells; c++) {
        hand_record(&h, &records[c], (int64_t)c);
        for (int i = 0; i < FRAMES; i++) {
            records[c].frames[i] = value_x((int)c, i);
            records[c].frames[FRAMES + i] = value_y((int)c, i);
        }
    }
    tarry_results *results = hand_results(&h, &tarry_tally_autocorrelation, records, n_cells);
    for (size_t c = 0; c < n_cells; c++)
        tarry_record_release(&records[c]);
    return results;
}

/* Rows of x with `second` in the order of lags; both numbers are sums of some thousand products
 * rounded to 1e-16, hence 1e-12 of the variance. */
static void compare(const tarry_results *results, const char *second, const double *expected,
                    size_t n) {
    const tarry_table *table = tarry_results_table(results, TARRY_TABLE_autocorrelation);
    const size_t row = hand_row(table, "all", "x", second);
    for (size_t k = 0; k < n; k++)
        ck_assert_double_eq_tol(hand_number(table, row + k, "covariance"), expected[k], 7e-11);
    ck_assert_double_eq(hand_number(table, row + n - 1, "lag"), LAGS - 1);
}

START_TEST(test_one_cell) {
    tarry_results *results = estimate(1, 10);
    compare(results, "x", one_cell_auto, LAGS);
    compare(results, "y", one_cell_cross, 2 * LAGS - 1);
    tarry_results_free(results);
}
END_TEST

/* Without settling the mean over cells at each frame is taken off. */
START_TEST(test_over_cells) {
    tarry_results *results = estimate(CELLS, 0);
    compare(results, "x", over_cells_auto, LAGS);
    compare(results, "y", over_cells_cross, 2 * LAGS - 1);
    tarry_results_free(results);
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"one cell", test_one_cell},
        {"over cells at each frame", test_over_cells},
    };
    return run_tests("correlation_table", tests, sizeof tests / sizeof *tests);
}
