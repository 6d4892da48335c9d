/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Reading data and measuring them: forms of files, gaps, covariances from their definition, notes,
 * memory that runs out. Expected numbers are worked out here by hand or by plain loops. */

#include "base/file.h"
#include "base/random.h"
#include "faults.h"
#include "hand.h"
#include "measured.h"
#include "support.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

static const char *const minutes[] = {"--time", "min", NULL};
static const char *const missing[] = {"--time", "min", "--gaps", "missing", NULL};
static const char *const dark[] = {"--time", "min", "--gaps", "dark", NULL};

static double mean_at(const measured *m, const char *name, size_t i, const char *column) {
    const tarry_table *table = tarry_results_table(m->results, TARRY_TABLE_means);
    return hand_number(table, hand_row(table, name, NULL, NULL) + i, column);
}

/* ---- forms of files -------------------------------------------------------------------------- */

/* One film in many dresses. */
START_TEST(test_dresses) {
    static const char *const dresses[] = {
        "cell,time,spot\na,0,1\na,1,2\nb,0,3\nb,1,6\n",
        ("\xef\xbb\xbf# a title\r\n#\r\n\"cell\", time ,spot\r\n "
         "a,0,1\r\na,1,\"2\"\r\nb,0,3\r\nb,1,6"),
        "time,spot,cell\n0,1,a\n0,3,b\n1,2,a\n1,6e0,b\n\n\n",
        "cell,time,spot,group\na,0,1,x\nb,0,3,x\nb,1,6,x\na,1,2,x\n",
    };
    for (size_t i = 0; i < sizeof dresses / sizeof *dresses; i++) {
        measured m;
        measured_pass(&m, dresses[i], minutes);
        ck_assert_int_eq(m.data->table.kind, TARRY_DATA_TRACES);
        ck_assert_int_eq(tarry_results_n_cells(m.results), 2);
        ck_assert_int_eq(tarry_results_is_measured(m.results), 1);
        ck_assert_double_eq(mean_at(&m, "spot", 0, "mean"), 2);
        ck_assert_double_eq(mean_at(&m, "spot", 1, "mean"), 4);
        ck_assert_double_eq_tol(mean_at(&m, "spot", 1, "sd"), sqrt(8), 1e-14);
        ck_assert_str_eq(tarry_data_model(m.data)->network.title, i == 1 ? "a title" : "");
        ck_assert_int_eq(hand_noted(m.results, "1 groups are too few"), i == 3);
        measured_release(&m);
    }
}
END_TEST

/* Times that were rounded, that begin late, and of which most differences are two frames. */
START_TEST(test_intervals) {
    static const struct {
        const char *text, *every;
        double start, found;
        uint32_t n_frames;
    } cases[] = {
        {"cell,time,x\n1,0.33,1\n1,0.67,2\n1,1,3\n1,1.33,3\n2,0.33,1\n2,1.33,1\n", NULL, 0.33,
         1.0 / 3, 4},
        {"cell,time,x\n1,-5,1\n1,-3,2\n1,-1,3\n2,-5,1\n2,-1,2\n", NULL, -5, 2, 3},
        {"cell,time,x\n1,0,1\n1,2,2\n1,4,3\n2,0,1\n2,4,2\n", "60 s", 0, 1, 5},
    };
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        const char *options[] = {"--time",  "min",          "--gaps", "missing",
                                 "--every", cases[i].every, NULL};
        measured m;
        options[4] = cases[i].every ? options[4] : NULL;
        measured_pass(&m, cases[i].text, options);
        ck_assert_double_eq_tol(m.data->frames.start, cases[i].start, 1e-15);
        ck_assert_double_eq_tol(m.data->frames.every, cases[i].found, 1e-2);
        ck_assert_uint_eq(m.data->frames.n_frames, cases[i].n_frames);
        measured_release(&m);
    }
}
END_TEST

static tarry_data_kind kind_of(const char *text) {
    measured m;
    measured_pass(&m, text, minutes);
    const tarry_data_kind kind = m.data->table.kind;
    measured_release(&m);
    return kind;
}

START_TEST(test_kinds) {
    ck_assert_int_eq(kind_of("cell,time,x\n1,0,1\n1,1,2\n2,0,1\n2,1,0\n"), TARRY_DATA_TRACES);
    ck_assert_int_eq(kind_of("cell,time,x\n1,0,1\n2,0,2\n3,5,1\n"), TARRY_DATA_COUNTS);
    ck_assert_int_eq(kind_of("time,x\n0,1\n0,2\n"), TARRY_DATA_COUNTS);
    ck_assert_int_eq(kind_of("time,x\n0,1.5\n0,2.5\n"), TARRY_DATA_MEANS);
    ck_assert_int_eq(kind_of("time,x,x_se\n0,1,1\n1,2,1\n"), TARRY_DATA_MEANS);
    ck_assert_int_eq(kind_of("time,x,cells\n0,1,3\n1,2,4\n"), TARRY_DATA_COUNTS);
}
END_TEST

/* The share of each count at each time, and the standard error of a mean over n cells, each left
 * out by itself: sd / sqrt(n). A time with fewer cells than another has its own number. */
START_TEST(test_counts) {
    measured m;
    measured_pass(&m, "time,x,y\n0,1,7\n0,1,\n0,4,9\n3,0,2\n3,2,4\n", minutes);
    const tarry_table *table = tarry_results_table(m.results, TARRY_TABLE_distribution);
    const size_t row = hand_row(table, "x", NULL, NULL);
    ck_assert_double_eq_tol(hand_number(table, row, "probability"), 2.0 / 3, 1e-15);
    ck_assert_double_eq(hand_number(table, row, "count"), 1);
    ck_assert_double_eq(hand_number(table, row + 3, "time"), 3);
    ck_assert_double_eq(hand_number(table, row + 3, "probability"), 0.5);
    ck_assert_double_eq_tol(mean_at(&m, "x", 0, "mean_se"), sqrt(3) / sqrt(3), 1e-14);
    ck_assert_double_eq_tol(mean_at(&m, "x", 1, "mean_se"), 1, 1e-14);
    ck_assert_double_eq_tol(mean_at(&m, "y", 0, "mean"), 8, 1e-14);
    ck_assert_double_eq_tol(mean_at(&m, "y", 0, "mean_se"), 1, 1e-14);
    ck_assert_double_eq_tol(mean_at(&m, "x", 0, "fano"), 1.5, 1e-14);
    measured_release(&m);
}
END_TEST

/* 640 cells of which half have 0 and half have 10, sorted: the error of the mean is that of cells
 * dealt by chance, 5 / sqrt(639), not that of groups which are all alike. With 64 groups its own
 * error is a share of 1/sqrt(2 * 63), so that a third is a wide limit. */
START_TEST(test_sorted) {
    measured m;
    measured_pass(&m, "time,x,cells\n0,0,320\n0,10,320\n", minutes);
    const double se = mean_at(&m, "x", 0, "mean_se");
    ck_assert_double_eq(mean_at(&m, "x", 0, "mean"), 5);
    ck_assert_double_eq_tol(se, 5 / sqrt(639), 5 / sqrt(639) / 3);
    measured_release(&m);
}
END_TEST

/* ---- gaps ------------------------------------------------------------------------------------ */

static const char gappy[] = "cell,time,x,y\n1,0,4,1\n1,1,5,1\n1,3,6,1\n1,4,7,\n2,1,8,3\n2,2,1,3\n"
                            "2,3,2,3\n";

START_TEST(test_gaps) {
    measured m;
    ck_assert_int_eq(measured_try(&m, gappy, minutes), TARRY_INPUT);
    ck_assert_int_eq(m.error.line, 4);
    ck_assert_ptr_nonnull(strstr(m.error.message, "13.3 % of the frames"));
    measured_release(&m);
    measured_pass(&m, gappy, missing);
    ck_assert_double_eq(mean_at(&m, "x", 2, "mean"), 1); /* of the second cell alone */
    ck_assert_double_eq(mean_at(&m, "x", 3, "mean"), 4);
    ck_assert_double_eq(mean_at(&m, "x", 0, "mean"), 4);
    ck_assert_int_eq(hand_noted(m.results, "13.3 % of the frames"), 1);
    ck_assert_int_eq(hand_noted(m.results, "were left out"), 1);
    measured_release(&m);
    measured_pass(&m, gappy, dark);
    ck_assert_double_eq(mean_at(&m, "x", 2, "mean"), 0.5); /* 0 and 1 */
    ck_assert_double_eq(mean_at(&m, "y", 2, "mean"), 1.5); /* 0 and 3 */
    ck_assert_double_eq(mean_at(&m, "y", 3, "mean"), 2);
    ck_assert_int_eq(hand_noted(m.results, "were taken as dark"), 1);
    measured_release(&m);
}
END_TEST

/* A tracker that loses a spot below 0.3: what stands beside gaps is low, and said to be so. */
START_TEST(test_lost_dark) {
    tarry_text text = {0};
    tarry_stream stream;
    measured m;
    tarry_stream_init(&stream, 1, 0, TARRY_STREAM_EVENTS);
    tarry_text_add_string(&text, "cell,time,x\n");
    for (size_t cell = 0; cell < 40; cell++) {
        double x = 0.5;
        for (size_t i = 0; i < 100; i++) {
            x = 0.8 * x + 0.2 * tarry_unit(tarry_stream_next(&stream));
            if (x >= 0.4)
                measured_row(&text, cell, (double)i, &x, 1);
        }
    }
    measured_pass(&m, text.data, missing);
    ck_assert_int_eq(hand_noted(m.results, "x: values beside gaps are low"), 1);
    measured_release(&m);
    measured_pass(&m, text.data, dark);
    ck_assert_int_eq(hand_noted(m.results, "values beside gaps are low"), 0);
    measured_release(&m);
    tarry_text_release(&text);
}
END_TEST

/* ---- covariances from their definition ---------------------------------------------------------
 */

enum { CELLS = 5, FRAMES = 12, LAGS = 6 };

/* Sums over pairs of different cells, one by one, as docs/statistics.md has it. */
typedef struct films {
    double x[CELLS][FRAMES], y[CELLS][FRAMES];
} films;

static double product_of_means(const double a[CELLS][FRAMES], const double b[CELLS][FRAMES],
                               const double c[CELLS][FRAMES], int lag_of_b, int lag_of_c) {
    /* sum over cells d != e of sum a_d(s) b_e(t), over t with b_e(t) and c_e(t + lags) known */
    double sum = 0, n = 0;
    for (int d = 0; d < CELLS; d++)
        for (int e = 0; e < CELLS; e++)
            for (int s = 0; d != e && s < FRAMES; s++)
                for (int t = 0; t < FRAMES; t++) {
                    const int u = t + lag_of_c - lag_of_b;
                    if (u < 0 || u >= FRAMES || isnan(a[d][s]) || isnan(b[e][t]) || isnan(c[e][u]))
                        continue;
                    sum += a[d][s] * b[e][t];
                    n++;
                }
    return sum / n;
}

static double covariance(const films *f, const double x[CELLS][FRAMES],
                         const double y[CELLS][FRAMES], int lag) {
    double sum = 0, n = 0, means = 0, n_means = 0;
    (void)f;
    for (int c = 0; c < CELLS; c++)
        for (int t = 0; t < FRAMES; t++) {
            if (t + lag < 0 || t + lag >= FRAMES || isnan(x[c][t]) || isnan(y[c][t + lag]))
                continue;
            sum += x[c][t] * y[c][t + lag];
            n++;
        }
    for (int c = 0; c < CELLS; c++)
        for (int d = 0; d < CELLS; d++)
            for (int s = 0; c != d && s < FRAMES; s++)
                for (int t = 0; t < FRAMES; t++)
                    if (!isnan(x[c][s]) && !isnan(y[d][t])) {
                        means += x[c][s] * y[d][t];
                        n_means++;
                    }
    return sum / n - product_of_means(y, x, y, 0, lag) - product_of_means(x, y, x, lag, 0) +
           means / n_means;
}

/* Values less the mean of all known ones, about which the program's sums are. */
static void centre(double x[CELLS][FRAMES]) {
    double sum = 0, n = 0;
    for (int c = 0; c < CELLS; c++)
        for (int t = 0; t < FRAMES; t++) {
            sum += isnan(x[c][t]) ? 0 : x[c][t];
            n += !isnan(x[c][t]);
        }
    for (int c = 0; c < CELLS; c++)
        for (int t = 0; t < FRAMES; t++)
            x[c][t] -= sum / n;
}

typedef enum film_shape { WHOLE, GAPS, STAGGERED } film_shape;

static void fill(films *f, tarry_text *text, film_shape shape) {
    tarry_text_add_string(text, "cell,time,x,y\n");
    for (int c = 0; c < CELLS; c++) {
        for (int t = 0; t < FRAMES; t++) {
            f->x[c][t] = (7 * t * t + 13 * c * t + 5 * c * c + 3 * t) % 29 + 100;
            f->y[c][t] = (11 * t + 17 * c * c + t * t) % 23 - 40;
            if (shape == GAPS && ((t == 4 && c == 1) || t < c || (c == 2 && t > 9)))
                f->x[c][t] = NAN;
            if (shape == GAPS && (t == 6 || t < c - 1))
                f->y[c][t] = NAN;
            if (shape == STAGGERED && (t < c || t > c + 7))
                f->x[c][t] = f->y[c][t] = NAN;
            if (!isnan(f->x[c][t]) || !isnan(f->y[c][t]))
                measured_row(text, (size_t)c, t, (double[]){f->x[c][t], f->y[c][t]}, 2);
        }
    }
    centre(f->x);
    centre(f->y);
}

static void compare(film_shape shape) {
    static const char *const options[] = {"--time", "min", "--gaps", "missing",
                                          "--lags", "5",   NULL};
    films f;
    tarry_text text = {0};
    measured m;
    fill(&f, &text, shape);
    measured_pass(&m, text.data, options);
    const tarry_table *table = tarry_results_table(m.results, TARRY_TABLE_autocorrelation);
    const size_t of_x = hand_row(table, "all", "x", "x"), of_y = hand_row(table, "all", "y", "y");
    const size_t of_both = hand_row(table, "all", "x", "y");
    for (int k = 0; k < LAGS; k++) {
        ck_assert_double_eq_tol(hand_number(table, of_x + (size_t)k, "covariance"),
                                covariance(&f, f.x, f.x, k), 1e-11);
        ck_assert_double_eq_tol(hand_number(table, of_y + (size_t)k, "covariance"),
                                covariance(&f, f.y, f.y, k), 1e-11);
    }
    for (int k = 1 - LAGS; k < LAGS; k++)
        ck_assert_double_eq_tol(hand_number(table, of_both + (size_t)(k + LAGS - 1), "covariance"),
                                covariance(&f, f.x, f.y, k), 1e-11);
    measured_release(&m);
    tarry_text_release(&text);
}

START_TEST(test_definition) {
    compare(GAPS);
}
END_TEST

/* No cell is there from the first frame to the last. */
START_TEST(test_staggered) {
    compare(STAGGERED);
}
END_TEST

/* Without gaps the program goes another way (tally/correlation.c) to the same definition. */
START_TEST(test_whole_films) {
    compare(WHOLE);
}
END_TEST

/* The line through lags 1 to 3, put back to 0, by least squares (GSL or any textbook: with the
 * means 2 and c of lags and covariances the slope is (c3 - c1) / 2). */
START_TEST(test_put_back) {
    static const char *const options[] = {"--time", "min", "--lags", "5", NULL};
    films f;
    tarry_text text = {0};
    measured m;
    fill(&f, &text, WHOLE);
    measured_pass(&m, text.data, options);
    const tarry_table *table = tarry_results_table(m.results, TARRY_TABLE_autocorrelation);
    const size_t row = hand_row(table, "all", "x", "x");
    double c[LAGS];
    for (size_t k = 0; k < LAGS; k++)
        c[k] = hand_number(table, row + k, "covariance");
    const double slope = (c[3] - c[1]) / 2, mean = (c[1] + c[2] + c[3]) / 3;
    ck_assert_double_eq(hand_number(table, row, "correlation"), 1);
    for (size_t k = 1; k < LAGS; k++)
        ck_assert_double_eq_tol(hand_number(table, row + k, "correlation"),
                                c[k] / (mean - 2 * slope), 1e-12);
    measured_release(&m);
    tarry_text_release(&text);
}
END_TEST

/* ---- memory ---------------------------------------------------------------------------------- */

/* Each allocation of the library fails once. */
START_TEST(test_memory) {
    static const char *const texts[] = {
        gappy,
        "cell,time,x,group\n1,0,1,a\n1,1,2,a\n2,0,2,b\n2,1,2,b\n3,0,2,c\n3,1,1,c\n4,0,4,d\n4,1,2,"
        "d\n",
        "time,x,cells,group\n0,1,2,a\n0,3,1,b\n1,4,4,a\n",
        "time,x,x_se\n0,1,0.5\n1,4,0.5\n",
    };
    const char *path = test_path("data.csv");
    for (size_t i = 0; i < sizeof texts / sizeof *texts; i++) {
        ck_assert_int_eq(tarry_file_write(path, texts[i], strlen(texts[i]), NULL), TARRY_OK);
        for (int kind = FAULT_MEMORY; kind <= FAULT_ARENA; kind++) {
            for (long n = 0;; n++) {
                measured m;
                faults_arm((fault)kind, n, 0);
                const int status = measured_file(&m, path, i == 0 ? missing : minutes);
                const bool struck = faults_struck();
                faults_clear();
                measured_release(&m);
                if (!struck) {
                    ASSERT_FAST(status == TARRY_OK, "%s", m.error.message);
                    ck_assert_int_gt(n, 5);
                    break;
                }
                ASSERT_FAST(status == TARRY_MEMORY, "allocation %ld of %zu: %d", n, i, status);
            }
        }
    }
}
END_TEST

/* A part of the data would mislead: nothing comes of a measurement that is stopped. */
START_TEST(test_stopped) {
    const volatile int stop = 1;
    const tarry_measure_options how = {.threads = 2, .stop = &stop};
    tarry_results *results = NULL;
    measured m;
    measured_pass(&m, gappy, missing);
    ck_assert_int_eq(tarry_measure(m.data, &how, &results, &m.error), TARRY_INTERRUPTED);
    ck_assert_ptr_null(results);
    measured_release(&m);
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"dresses", test_dresses},
        {"intervals", test_intervals},
        {"kinds", test_kinds},
        {"counts", test_counts},
        {"sorted counts", test_sorted},
        {"gaps", test_gaps},
        {"frames lost in the dark", test_lost_dark},
        {"covariances with gaps", test_definition},
        {"covariances of cells that come and go", test_staggered},
        {"covariances of whole films", test_whole_films},
        {"variance without noise", test_put_back},
        {"stopped", test_stopped},
        {"memory", test_memory},
    };
    return run_tests("measure", tests, sizeof tests / sizeof *tests);
}
