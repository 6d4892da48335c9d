/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Measuring data against a general-purpose statistics library: R's packages stats and datasets,
 * version 4.2.2 (Debian r-base-core 4.2.2.20221110-2), run once; its numbers are recorded here.
 *
 * airquality: daily ozone and sunshine, of which many days are missing; to us one cell with 153
 * frames. ChickWeight: weights of 50 chicks on days 0, 2, ..., 20, some of which end early; to us
 * 50 cells of unlike length. And against exact expectations for short traces. */

#include "base/random.h"
#include "hand.h"
#include "measured.h"
#include "sample.h"
#include "support.h"

#include <gsl/gsl_cdf.h>
#include <math.h>
#include <stdlib.h>

enum { DAYS = 153, LAGS = 21, CROSS = 10, CHICKS = 50, WEIGHINGS = 11 };

/* -1: missing. R: airquality$Ozone, airquality$Solar.R */
static const int ozone[DAYS] = {
    41, 36, 12, 18, -1, 28, 23,  19,  8,  -1, 7,   16, 11,  14, 18, 14, 34, 6,   30, 11,  1,  11,
    4,  32, -1, -1, -1, 23, 45,  115, 37, -1, -1,  -1, -1,  -1, -1, 29, -1, 71,  39, -1,  -1, 23,
    -1, -1, 21, 37, 20, 12, 13,  -1,  -1, -1, -1,  -1, -1,  -1, -1, -1, -1, 135, 49, 32,  -1, 64,
    40, 77, 97, 97, 85, -1, 10,  27,  -1, 7,  48,  35, 61,  79, 63, 16, -1, -1,  80, 108, 20, 52,
    82, 50, 64, 59, 39, 9,  16,  78,  35, 66, 122, 89, 110, -1, -1, 44, 28, 65,  -1, 22,  59, 23,
    31, 44, 21, 9,  -1, 45, 168, 73,  -1, 76, 118, 84, 85,  96, 78, 73, 91, 47,  32, 20,  23, 21,
    24, 44, 21, 28, 9,  13, 46,  18,  13, 24, 16,  13, 23,  36, 7,  14, 30, -1,  14, 18,  20};
static const int sun[DAYS] = {
    190, 118, 149, 313, -1,  -1,  299, 99,  19,  194, -1,  256, 290, 274, 65,  334, 307,
    78,  322, 44,  8,   320, 25,  92,  66,  266, -1,  13,  252, 223, 279, 286, 287, 242,
    186, 220, 264, 127, 273, 291, 323, 259, 250, 148, 332, 322, 191, 284, 37,  120, 137,
    150, 59,  91,  250, 135, 127, 47,  98,  31,  138, 269, 248, 236, 101, 175, 314, 276,
    267, 272, 175, 139, 264, 175, 291, 48,  260, 274, 285, 187, 220, 7,   258, 295, 294,
    223, 81,  82,  213, 275, 253, 254, 83,  24,  77,  -1,  -1,  -1,  255, 229, 207, 222,
    137, 192, 273, 157, 64,  71,  51,  115, 244, 190, 259, 36,  255, 212, 238, 215, 153,
    203, 225, 237, 188, 167, 197, 183, 189, 95,  92,  252, 220, 230, 259, 236, 259, 238,
    24,  112, 237, 224, 27,  238, 201, 238, 14,  139, 49,  20,  193, 145, 191, 131, 223};

/* 0: not weighed any more. R: ChickWeight, weights by Chick in the order of the file, Time <= 20 */
static const int chicks[CHICKS][WEIGHINGS] = {
    {42, 51, 59, 64, 76, 93, 106, 125, 149, 171, 199},
    {40, 49, 58, 72, 84, 103, 122, 138, 162, 187, 209},
    {43, 39, 55, 67, 84, 99, 115, 138, 163, 187, 198},
    {42, 49, 56, 67, 74, 87, 102, 108, 136, 154, 160},
    {41, 42, 48, 60, 79, 106, 141, 164, 197, 199, 220},
    {41, 49, 59, 74, 97, 124, 141, 148, 155, 160, 160},
    {41, 49, 57, 71, 89, 112, 146, 174, 218, 250, 288},
    {42, 50, 61, 71, 84, 93, 110, 116, 126, 134, 125},
    {42, 51, 59, 68, 85, 96, 90, 92, 93, 100, 100},
    {41, 44, 52, 63, 74, 81, 89, 96, 101, 112, 120},
    {43, 51, 63, 84, 112, 139, 168, 177, 182, 184, 181},
    {41, 49, 56, 62, 72, 88, 119, 135, 162, 185, 195},
    {41, 48, 53, 60, 65, 67, 71, 70, 71, 81, 91},
    {41, 49, 62, 79, 101, 128, 164, 192, 227, 248, 259},
    {41, 49, 56, 64, 68, 68, 67, 68, 0, 0, 0},
    {41, 45, 49, 51, 57, 51, 54, 0, 0, 0, 0},
    {42, 51, 61, 72, 83, 89, 98, 103, 113, 123, 133},
    {39, 35, 0, 0, 0, 0, 0, 0, 0, 0, 0},
    {43, 48, 55, 62, 65, 71, 82, 88, 106, 120, 144},
    {41, 47, 54, 58, 65, 73, 77, 89, 98, 107, 115},
    {40, 50, 62, 86, 125, 163, 217, 240, 275, 307, 318},
    {41, 55, 64, 77, 90, 95, 108, 111, 131, 148, 164},
    {43, 52, 61, 73, 90, 103, 127, 135, 145, 163, 170},
    {42, 52, 58, 74, 66, 68, 70, 71, 72, 72, 76},
    {40, 49, 62, 78, 102, 124, 146, 164, 197, 231, 259},
    {42, 48, 57, 74, 93, 114, 136, 147, 169, 205, 236},
    {39, 46, 58, 73, 87, 100, 115, 123, 144, 163, 185},
    {39, 46, 58, 73, 92, 114, 145, 156, 184, 207, 212},
    {39, 48, 59, 74, 87, 106, 134, 150, 187, 230, 279},
    {42, 48, 59, 72, 85, 98, 115, 122, 143, 151, 157},
    {42, 53, 62, 73, 85, 102, 123, 138, 170, 204, 235},
    {41, 49, 65, 82, 107, 129, 159, 179, 221, 263, 291},
    {39, 50, 63, 77, 96, 111, 137, 144, 151, 146, 156},
    {41, 49, 63, 85, 107, 134, 164, 186, 235, 294, 327},
    {41, 53, 64, 87, 123, 158, 201, 238, 287, 332, 361},
    {39, 48, 61, 76, 98, 116, 145, 166, 198, 227, 225},
    {41, 48, 56, 68, 80, 83, 103, 112, 135, 157, 169},
    {41, 49, 61, 74, 98, 109, 128, 154, 192, 232, 280},
    {42, 50, 61, 78, 89, 109, 130, 146, 170, 214, 250},
    {41, 55, 66, 79, 101, 120, 154, 182, 215, 262, 295},
    {42, 51, 66, 85, 103, 124, 155, 153, 175, 184, 199},
    {42, 49, 63, 84, 103, 126, 160, 174, 204, 234, 269},
    {42, 55, 69, 96, 131, 157, 184, 188, 197, 198, 199},
    {42, 51, 65, 86, 103, 118, 127, 138, 145, 146, 0},
    {41, 50, 61, 78, 98, 117, 135, 141, 147, 174, 197},
    {40, 52, 62, 82, 101, 120, 144, 156, 173, 210, 231},
    {41, 53, 66, 79, 100, 123, 148, 157, 168, 185, 210},
    {39, 50, 62, 80, 104, 125, 154, 170, 222, 261, 303},
    {40, 53, 64, 85, 108, 128, 152, 166, 184, 203, 233},
    {41, 54, 67, 84, 105, 122, 155, 175, 205, 234, 264},
};
/* ... and their Diet */
static const int diets[CHICKS] = {1, 1, 1, 1, 1, 1, 1, 1, 1, 1, 1, 1, 1, 1, 1, 1, 1,
                                  1, 1, 1, 2, 2, 2, 2, 2, 2, 2, 2, 2, 2, 3, 3, 3, 3,
                                  3, 3, 3, 3, 3, 3, 4, 4, 4, 4, 4, 4, 4, 4, 4, 4};

/* n <- 153; k <- 0:20; nu: pairs of days at lag k of which both are known;
 * acf(airquality$Ozone, type = "covariance", lag.max = 20, na.action = na.pass)$acf * (nu + k) / nu
 * (R divides by nu + k) */
static const double ozone_pairs[LAGS] = {116, 98, 92, 91, 90, 88, 87, 88, 86, 85, 85,
                                         83,  83, 80, 77, 77, 78, 77, 77, 78, 76};
static const double ozone_covariance[LAGS] = {
    1078.8194857312721524, 611.9699231357229792, 423.7381417050097525,  434.8566226431119617,
    315.5751502840534499,  321.8846678737432967, 278.4107956797463430,  187.1909962436493799,
    196.0551133064181215,  134.4539422606140420, 202.6179382038190226,  47.6889272309213226,
    -92.8218745970803383,  -95.9000891795481465, -129.8765838056117445, 24.4463002069274111,
    72.4052048080734636,   58.9102500501876278,  118.8016517519341448,  7.9627865941034992,
    -1.8235692158458363};

/* k <- -10:10; ccf(airquality$Solar.R, airquality$Ozone, type = "covariance", lag.max = 10,
 * na.action = na.pass)$acf * (nu + abs(k)) / nu: sunshine k days after ozone */
static const double cross_pairs[2 * CROSS + 1] = {103, 103, 103, 105, 107, 109, 107,
                                                  106, 107, 108, 111, 111, 108, 106,
                                                  106, 106, 107, 105, 104, 103, 102};
static const double cross_covariance[2 * CROSS + 1] = {
    -510.5474430293833734, -757.0351500337077368, -209.5210363630525876, -35.8124468587623497,
    -3.0037491336267741,   -247.8063806321048048, -194.5995203492863652, -140.6693824030087399,
    108.4149453246746191,  506.2331741283086899,  1047.0988161047212088, 337.1552330554455921,
    40.6722235343515877,   106.8057938431920917,  318.6839355264213509,  436.7779776918210928,
    469.6905678993812785,  226.9600951481207289,  -155.0234820682387635, 246.2791307996752153,
    136.8565522335528897};

static double known(int value) {
    return value < 0 ? (double)NAN : value;
}

static void write_days(tarry_text *text, size_t cell) {
    for (size_t day = 0; day < DAYS; day++)
        measured_row(text, cell, (double)day, (double[]){known(ozone[day]), known(sun[day])}, 2);
}

static void compare(const measured *m, const char *first, const char *second, const double *pairs,
                    const double *covariance, size_t n) {
    const tarry_table *table = tarry_results_table(m->results, TARRY_TABLE_autocorrelation);
    const size_t row = hand_row(table, "all", first, second);
    for (size_t k = 0; k < n; k++) {
        ck_assert_double_eq(hand_number(table, row + k, "pairs"), pairs[k]);
        ck_assert_double_eq_tol(hand_number(table, row + k, "covariance"), covariance[k], 1e-9);
    }
}

/* Gaps: each cell's own mean, and the pairs of frames that are known. */
START_TEST(test_days) {
    static const char *const wide[] = {"--time", "d",      "--mean",  "cell", "--lags",
                                       "20",     "--gaps", "missing", NULL};
    static const char *const narrow[] = {"--time", "d",      "--mean",  "cell", "--lags",
                                         "10",     "--gaps", "missing", NULL};
    tarry_text text = {0};
    measured m;
    tarry_text_add_string(&text, "cell,time,ozone,sun\n");
    write_days(&text, 1);
    measured_pass(&m, text.data, wide);
    compare(&m, "ozone", "ozone", ozone_pairs, ozone_covariance, LAGS);
    measured_release(&m);
    measured_pass(&m, text.data, narrow);
    compare(&m, "ozone", "sun", cross_pairs, cross_covariance, 2 * CROSS + 1);
    measured_release(&m);
    tarry_text_release(&text);
}
END_TEST

/* mean(x, na.rm = TRUE), sd(x, na.rm = TRUE) of both columns: pooled over the frames of one cell.
 */
START_TEST(test_pooled) {
    static const char *const options[] = {"--time", "d",       "--mean", "cell",
                                          "--gaps", "missing", NULL};
    static const double expected[][2] = {{42.129310344827587, 32.987884514433951},
                                         {185.93150684931507, 90.058422228381673}};
    static const char *const names[] = {"ozone", "sun"};
    tarry_text text = {0};
    measured m;
    tarry_text_add_string(&text, "cell,time,ozone,sun\n");
    write_days(&text, 1);
    measured_pass(&m, text.data, options);
    const tarry_table *table = tarry_results_table(m.results, TARRY_TABLE_signals);
    for (size_t i = 0; i < 2; i++) {
        const size_t row = hand_row(table, names[i], "all", "signal_mean");
        ck_assert_double_eq_tol(hand_number(table, row, "value"), expected[i][0], 1e-11);
        ck_assert_double_eq_tol(hand_number(table, row + 1, "value"), expected[i][1], 1e-11);
    }
    measured_release(&m);
    tarry_text_release(&text);
}
END_TEST

/* wilcox.test(x[beside], x[!beside], exact = FALSE, correct = FALSE), beside: days of known ozone
 * next to a day of which it is not; W = 1291, p = 0.74331330685824837. */
START_TEST(test_beside_gaps) {
    static const char *const options[] = {"--time", "d",       "--mean", "cell",
                                          "--gaps", "missing", NULL};
    tarry_text text = {0};
    measured m;
    tarry_gap_test test;
    tarry_text_add_string(&text, "cell,time,ozone,sun\n");
    write_days(&text, 1);
    measured_pass(&m, text.data, options);
    ck_assert_int_eq(tarry_data_gap_test(&m.data->frames, m.data->table.values[0], &test, NULL), 0);
    ck_assert_double_eq(test.n_beside, 32);
    ck_assert_double_eq(test.n_other, 84);
    ck_assert_double_eq_tol(test.z, -0.32746884015789812, 1e-13);
    ck_assert_double_eq_tol(test.below, 1 - 1291.0 / (32.0 * 84.0), 1e-14);
    ck_assert(!hand_noted(m.results, "values beside gaps are low"));
    measured_release(&m);
    tarry_text_release(&text);
}
END_TEST

/* ---- cells of unlike length ------------------------------------------------------------------ */

/* cw <- ChickWeight[ChickWeight$Time <= 20, ]; tapply(cw$weight, cw$Time, mean), ... sd */
static const double chick_mean[WEIGHINGS] = {
    41.060000000000002,  49.219999999999999,  59.959183673469390,  74.306122448979593,
    91.244897959183675,  107.836734693877546, 129.244897959183675, 143.812500000000000,
    168.085106382978722, 190.191489361702139, 209.717391304347814};
static const double chick_sd[WEIGHINGS] = {
    1.1322724125962491,  3.6883158039120993,  4.4951788232573380,  9.0120384339334603,
    16.2397796221768580, 23.9872769563848749, 34.1196000686341208, 38.3004117804651258,
    46.9040787079861303, 57.3947574858890306, 66.5117075887907987};
static const int chick_n[WEIGHINGS] = {50, 50, 49, 49, 49, 49, 49, 48, 47, 47, 46};

static void write_chicks(tarry_text *text, bool groups) {
    tarry_text_add_string(text, groups ? "cell,time,weight,group\n" : "cell,time,weight\n");
    for (size_t c = 0; c < CHICKS; c++)
        for (size_t i = 0; i < WEIGHINGS && chicks[c][i] > 0; i++) {
            tarry_text_printf(text, "%zu,%zu,%d", c, 2 * i, chicks[c][i]);
            if (groups)
                tarry_text_printf(text, ",%d", diets[c]);
            tarry_text_add_string(text, "\n");
        }
}

/* With at most 64 cells each is left out by itself, so that the error of a mean is sd / sqrt(n). */
START_TEST(test_chicks) {
    static const char *const options[] = {"--time", "d", NULL};
    tarry_text text = {0};
    measured m;
    write_chicks(&text, false);
    measured_pass(&m, text.data, options);
    const tarry_table *table = tarry_results_table(m.results, TARRY_TABLE_means);
    ck_assert_uint_eq(tarry_table_n_rows(table), WEIGHINGS);
    for (size_t i = 0; i < WEIGHINGS; i++) {
        ck_assert_double_eq_tol(hand_number(table, i, "time"), 2 * (double)i, 1e-12);
        ck_assert_double_eq_tol(hand_number(table, i, "mean"), chick_mean[i], 1e-11);
        ck_assert_double_eq_tol(hand_number(table, i, "sd"), chick_sd[i], 1e-11);
        ck_assert_double_eq_tol(hand_number(table, i, "mean_se"), chick_sd[i] / sqrt(chick_n[i]),
                                1e-11);
    }
    ck_assert(hand_noted(m.results, "weight drifts in window all"));
    measured_release(&m);
    tarry_text_release(&text);
}
END_TEST

/* The jackknife that leaves out the four diets in turn, from its definition (Kott 2001, J. Off.
 * Stat. 17:521): sqrt(3/4 sum (mean without the diet - mean)^2). */
START_TEST(test_diets) {
    static const char *const options[] = {"--time", "d", NULL};
    tarry_text text = {0};
    measured m;
    write_chicks(&text, true);
    measured_pass(&m, text.data, options);
    const tarry_table *table = tarry_results_table(m.results, TARRY_TABLE_means);
    for (size_t i = 0; i < WEIGHINGS; i++) {
        double sum[5] = {0}, n[5] = {0}, squares = 0;
        for (size_t c = 0; c < CHICKS; c++) {
            sum[0] += chicks[c][i];
            n[0] += chicks[c][i] > 0;
            sum[diets[c]] += chicks[c][i];
            n[diets[c]] += chicks[c][i] > 0;
        }
        for (int d = 1; d <= 4; d++)
            squares += pow((sum[0] - sum[d]) / (n[0] - n[d]) - sum[0] / n[0], 2);
        ck_assert_double_eq_tol(hand_number(table, i, "mean_se"), sqrt(0.75 * squares), 1e-10);
    }
    measured_release(&m);
    tarry_text_release(&text);
}
END_TEST

/* ---- short traces ---------------------------------------------------------------------------- */

/* Cells whose values are the columns of L, with L L' the covariance phi^|i - j|: the mean over them
 * of any quadratic form is 1/N of its expectation for a Gaussian process of that covariance,
 * without any sampling. (Row 0 of L is (1, 0, ...); below, the autoregression.) */
static void write_columns(tarry_text *text, size_t n_frames, double phi) {
    tarry_text_add_string(text, "cell,time,x\n");
    for (size_t column = 0; column < n_frames; column++)
        for (size_t i = 0; i < n_frames; i++) {
            double value = i < column ? 0 : pow(phi, (double)(i - column));
            value *= column > 0 ? sqrt(1 - phi * phi) : 1;
            measured_row(text, column, (double)i, &value, 1);
        }
}

/* Exact expectations, worked out as traces of matrices with another program: E of the covariance
 * with each trace's own mean off, weight 1/(N - k). */
START_TEST(test_own_means) {
    static const struct {
        size_t n_frames;
        double phi;
        size_t lag;
        double expected;
    } cases[] = {
        {50, 0.9, 0, 0.69162893},   {50, 0.9, 1, 0.58716355},   {50, 0.9, 5, 0.26498973},
        {50, 0.9, 10, 0.01663645},  {50, 0.9, 20, -0.20116847}, {20, 0.8, 0, 0.64884708},
        {20, 0.8, 5, -0.05037156},  {20, 0.8, 10, -0.24377874}, {200, 0.9, 1, 0.80909296},
        {200, 0.9, 10, 0.25556692}, {200, 0.9, 20, 0.02768454}, {50, 0.5, 1, 0.44084898},
        {50, 0.5, 5, -0.02851667},
    };
    static const char *const options[] = {"--time", "s", "--mean", "cell", "--lags", "20", NULL};
    measured m = {0};
    tarry_text text = {0};
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        if (i == 0 || cases[i].n_frames != cases[i - 1].n_frames ||
            cases[i].phi != cases[i - 1].phi) {
            measured_release(&m);
            text.size = 0;
            write_columns(&text, cases[i].n_frames, cases[i].phi);
            measured_pass(&m, text.data, options);
        }
        const tarry_table *table = tarry_results_table(m.results, TARRY_TABLE_autocorrelation);
        ck_assert_double_eq_tol(hand_number(table, cases[i].lag, "covariance") *
                                    (double)cases[i].n_frames,
                                cases[i].expected, 1e-8);
    }
    ck_assert(hand_noted(m.results, "own mean was taken off"));
    measured_release(&m);
    tarry_text_release(&text);
}
END_TEST

/* Few short traces that come and go, a tenth of their frames missing: with the mean over cells and
 * frames taken off, the expectation is the process's own covariance phi^k whatever the number of
 * cells (check: a common mean taken off plainly is low by a share of 0.04 here). */
enum { ROUNDS = 3000, FEW = 8, LONG = 30, LOOKED_AT = 4 };

static void write_autoregression(tarry_text *text, tarry_stream *stream, double phi) {
    tarry_text_add_string(text, "cell,time,x\n");
    for (size_t cell = 0; cell < FEW; cell++) {
        const size_t first = cell % 3 * 4, last = LONG - cell % 4 * 3;
        double x = gsl_cdf_ugaussian_Pinv(tarry_unit(tarry_stream_next(stream)));
        for (size_t i = 0; i < LONG; i++) {
            const double value = x + 10;
            const bool is_known = tarry_unit(tarry_stream_next(stream)) < 0.9;
            if (i >= first && i < last && is_known)
                measured_row(text, cell, (double)i, &value, 1);
            x = phi * x +
                sqrt(1 - phi * phi) * gsl_cdf_ugaussian_Pinv(tarry_unit(tarry_stream_next(stream)));
        }
    }
}

START_TEST(test_common_mean) {
    static const char *const options[] = {"--time", "s", "--lags", "12", "--gaps", "missing", NULL};
    static const size_t lags[LOOKED_AT] = {0, 1, 5, 12};
    const double phi = 0.8, n = (double)sample_size(ROUNDS);
    double sum[LOOKED_AT] = {0}, squares[LOOKED_AT] = {0};
    tarry_stream stream;
    tarry_text text = {0};
    tarry_stream_init(&stream, 1, 0, TARRY_STREAM_EVENTS);
    for (double round = 0; round < n; round++) {
        measured m;
        text.size = 0;
        write_autoregression(&text, &stream, phi);
        measured_pass(&m, text.data, options);
        const tarry_table *table = tarry_results_table(m.results, TARRY_TABLE_autocorrelation);
        for (size_t i = 0; i < LOOKED_AT; i++) {
            const double found = hand_number(table, lags[i], "covariance");
            sum[i] += found;
            squares[i] += found * found;
        }
        measured_release(&m);
    }
    for (size_t i = 0; i < LOOKED_AT; i++) {
        const double mean = sum[i] / n, variance = (squares[i] - sum[i] * mean) / (n - 1);
        check_z("covariance", (mean - pow(phi, (double)lags[i])) / sqrt(variance / n));
    }
    tarry_text_release(&text);
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"gaps: R's acf and ccf", test_days},
        {"gaps: R's mean and sd", test_pooled},
        {"beside gaps: R's wilcox.test", test_beside_gaps},
        {"unlike lengths: R's tapply", test_chicks},
        {"groups", test_diets},
        {"own means of short traces", test_own_means},
        {"common mean of few short traces", test_common_mean},
    };
    return run_tests("data", tests, sizeof tests / sizeof *tests);
}
