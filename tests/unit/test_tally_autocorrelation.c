/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Autocorrelations against sums written out, against GSL's general transform, against exact
 * expectations, and against the autocorrelation of shot noise. */

#include "base/random.h"
#include "hand.h"
#include "support.h"
#include "tally/kinds.h"

#include <gsl/gsl_cdf.h>
#include <gsl/gsl_fft_halfcomplex.h>
#include <gsl/gsl_fft_real.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

enum { FRAMES = 40, LAGS = 13, CELLS = 5, SIGNALS = 4, MOST = 64 + 7 };

static const char *const signal_names[SIGNALS] = {"red", "green", "far_red", "blue"};

/* cells[cell][signal][frame] */
typedef double film[SIGNALS][FRAMES];

/* Walks that are pulled back to 0 and share a part, so that lags of both signs differ. */
static void make_films(film *films, size_t n) {
    tarry_stream stream;
    tarry_stream_init(&stream, 1, 0, TARRY_STREAM_EVENTS);
    for (size_t i = 0; i < n; i++) {
        double shared[FRAMES], x[SIGNALS] = {0};
        for (size_t t = 0; t < FRAMES; t++)
            shared[t] = tarry_unit(tarry_stream_next(&stream)) - 0.5;
        for (size_t t = 0; t < FRAMES; t++)
            for (size_t s = 0; s < SIGNALS; s++) {
                x[s] = 0.8 * x[s] + tarry_unit(tarry_stream_next(&stream)) - 0.5;
                films[i][s][t] = floor(1024 * (x[s] + shared[t >= s ? t - s : 0])) / 1024 +
                                 (double)s + 0.3 * (double)i;
            }
    }
}

static void film_hand(hand *h, double settle) {
    hand_init(h, settle, FRAMES - 1, FRAMES);
    h->network.run.n_lags = LAGS;
    for (size_t s = 0; s < SIGNALS; s++)
        hand_signal(h, signal_names[s], 0, 0);
}

static tarry_results *film_results(const hand *h, const film *films, size_t n, double add) {
    tarry_record *records = calloc(n, sizeof *records);
    ck_assert_ptr_nonnull(records);
    for (size_t i = 0; i < n; i++) {
        hand_record(h, &records[i], (int64_t)i);
        for (size_t s = 0; s < h->network.n_channels; s++)
            for (size_t t = 0; t < FRAMES; t++)
                records[i].frames[s * FRAMES + t] = films[i][s][t] + add;
    }
    tarry_results *results = hand_results(h, &tarry_tally_autocorrelation, records, n);
    for (size_t i = 0; i < n; i++)
        tarry_record_release(&records[i]);
    free(records);
    return results;
}

/* ---- the plain way ----------------------------------------------------------------------------
 */

static double mean_of(const double *x, size_t from, size_t to) {
    double sum = 0;
    for (size_t t = from; t < to; t++)
        sum += x[t];
    return sum / (double)(to - from);
}

static double sample_covariance(const double *x, const double *y, size_t n) {
    const double mx = mean_of(x, 0, n), my = mean_of(y, 0, n);
    double sum = 0;
    for (size_t i = 0; i < n; i++)
        sum += (x[i] - mx) * (y[i] - my);
    return sum / (double)(n - 1);
}

/* cov(a(t), b(t + lag)) about the mean of all cells and frames, less its bias: with m, h and g the
 * means of a cell's trace, of its first and of its last part, the products about the common mean
 * have the expectation C - [cov(h_a, m_b) + cov(m_a, g_b) - cov(m_a, m_b)] / n. */
static double plain_stationary(const film *films, size_t n, size_t a, size_t b, long lag) {
    if (lag < 0)
        return plain_stationary(films, n, b, a, -lag);
    const size_t k = (size_t)lag, pairs = FRAMES - k;
    double ma[MOST], mb[MOST], ha[MOST], gb[MOST], sum = 0;
    for (size_t i = 0; i < n; i++) {
        ma[i] = mean_of(films[i][a], 0, FRAMES);
        mb[i] = mean_of(films[i][b], 0, FRAMES);
        ha[i] = mean_of(films[i][a], 0, pairs);
        gb[i] = mean_of(films[i][b], k, FRAMES);
    }
    for (size_t i = 0; i < n; i++)
        for (size_t t = 0; t < pairs; t++)
            sum += (films[i][a][t] - mean_of(ma, 0, n)) * (films[i][b][t + k] - mean_of(mb, 0, n));
    const double bias = sample_covariance(ha, mb, n) + sample_covariance(ma, gb, n) -
                        sample_covariance(ma, mb, n);
    return sum / (double)(n * pairs) + bias / (double)n;
}

/* The sample covariance over cells at each frame, averaged over frames. */
static double plain_changing(const film *films, size_t n, size_t a, size_t b, long lag) {
    if (lag < 0)
        return plain_changing(films, n, b, a, -lag);
    const size_t k = (size_t)lag;
    double sum = 0, x[MOST], y[MOST];
    for (size_t t = 0; t + k < FRAMES; t++) {
        for (size_t i = 0; i < n; i++) {
            x[i] = films[i][a][t];
            y[i] = films[i][b][t + k];
        }
        sum += sample_covariance(x, y, n);
    }
    return sum / (double)(FRAMES - k);
}

typedef double plain_covariance(const film *films, size_t n, size_t a, size_t b, long lag);

static void check_curves(const tarry_results *results, const film *films, size_t n,
                         plain_covariance *plain, double tolerance) {
    const tarry_table *table = tarry_results_table(results, TARRY_TABLE_autocorrelation);
    for (size_t a = 0; a < SIGNALS; a++)
        for (size_t b = a; b < SIGNALS; b++) {
            size_t row = hand_row(table, "all", signal_names[a], signal_names[b]);
            const double scale = sqrt(plain(films, n, a, a, 0) * plain(films, n, b, b, 0));
            for (long lag = a == b ? 0 : 1 - LAGS; lag < LAGS; lag++, row++) {
                const double covariance = plain(films, n, a, b, lag);
                ck_assert_double_eq(hand_number(table, row, "lag"), (double)lag);
                ck_assert_double_eq(hand_number(table, row, "pairs"),
                                    (double)(n * (size_t)(FRAMES - labs(lag))));
                ck_assert_double_eq_tol(hand_number(table, row, "covariance"), covariance,
                                        tolerance);
                ck_assert_double_eq_tol(hand_number(table, row, "correlation"), covariance / scale,
                                        tolerance / scale);
            }
        }
}

START_TEST(test_plain_stationary) {
    hand h;
    film films[CELLS];
    film_hand(&h, 10);
    make_films(films, CELLS);
    tarry_results *results = film_results(&h, films, CELLS, 0);
    check_curves(results, films, CELLS, plain_stationary, 1e-13);
    tarry_results_free(results);
}
END_TEST

START_TEST(test_plain_changing) {
    hand h;
    film films[CELLS];
    film_hand(&h, 0);
    make_films(films, CELLS);
    tarry_results *results = film_results(&h, films, CELLS, 0);
    check_curves(results, films, CELLS, plain_changing, 1e-13);
    tarry_results_free(results);
}
END_TEST

/* Two cells in some groups, and shifts that differ from group to group. */
START_TEST(test_many_cells) {
    hand h;
    film *films = calloc(MOST, sizeof *films);
    ck_assert_ptr_nonnull(films);
    make_films(films, MOST);
    for (size_t i = 64; i < MOST; i++)
        for (size_t s = 0; s < SIGNALS; s++)
            for (size_t t = 0; t < FRAMES; t++)
                films[i][s][t] += 5 - (double)(t * (s + 1)) * 0.25;
    for (int settle = 0; settle <= 1; settle++) {
        film_hand(&h, settle);
        tarry_results *results = film_results(&h, films, MOST, 0);
        check_curves(results, films, MOST, settle ? plain_stationary : plain_changing, 1e-11);
        tarry_results_free(results);
    }
    free(films);
}
END_TEST

/* Counts of 10^9 lose nothing: every value here is a multiple of 2^-10 below 2^31. */
START_TEST(test_large_means) {
    hand h;
    film films[CELLS];
    make_films(films, CELLS);
    for (int settle = 0; settle <= 1; settle++) {
        film_hand(&h, settle);
        tarry_results *results = film_results(&h, films, CELLS, 1e9);
        check_curves(results, films, CELLS, settle ? plain_stationary : plain_changing, 1e-6);
        tarry_results_free(results);
    }
}
END_TEST

/* GSL's transform for any length, unlike the one in use, of traces less the mean over cells. */
START_TEST(test_gsl) {
    enum { PADDED = 3 * 20 };
    hand h;
    film films[CELLS];
    film_hand(&h, 0);
    make_films(films, CELLS);
    double power[PADDED] = {0}, mean[FRAMES] = {0};
    gsl_fft_real_wavetable *forth = gsl_fft_real_wavetable_alloc(PADDED);
    gsl_fft_halfcomplex_wavetable *back = gsl_fft_halfcomplex_wavetable_alloc(PADDED);
    gsl_fft_real_workspace *work = gsl_fft_real_workspace_alloc(PADDED);
    ck_assert(forth && back && work);
    for (size_t i = 0; i < CELLS; i++)
        for (size_t t = 0; t < FRAMES; t++)
            mean[t] += films[i][0][t] / CELLS;
    for (size_t i = 0; i < CELLS; i++) {
        double x[PADDED] = {0};
        for (size_t t = 0; t < FRAMES; t++)
            x[t] = films[i][0][t] - mean[t];
        ck_assert_int_eq(gsl_fft_real_transform(x, 1, PADDED, forth, work), 0);
        power[0] += x[0] * x[0];
        power[PADDED - 1] += x[PADDED - 1] * x[PADDED - 1];
        for (size_t f = 1; f < PADDED - 1; f += 2)
            power[f] += x[f] * x[f] + x[f + 1] * x[f + 1];
    }
    ck_assert_int_eq(gsl_fft_halfcomplex_inverse(power, 1, PADDED, back, work), 0);
    tarry_results *results = film_results(&h, films, CELLS, 0);
    const tarry_table *table = tarry_results_table(results, TARRY_TABLE_autocorrelation);
    const size_t row = hand_row(table, "all", "red", "red");
    for (size_t k = 0; k < LAGS; k++)
        ck_assert_double_eq_tol(hand_number(table, row + k, "covariance"),
                                power[k] / (double)((CELLS - 1) * (FRAMES - k)), 1e-13);
    tarry_results_free(results);
    gsl_fft_real_wavetable_free(forth);
    gsl_fft_halfcomplex_wavetable_free(back);
    gsl_fft_real_workspace_free(work);
}
END_TEST

/* ---- expectations ------------------------------------------------------------------------------
 *
 * A covariance estimate is a quadratic form in the traces, so its expectation over Gaussian traces
 * with covariance R = L L' is the sum of the estimates for the columns of L, one at a time. */

typedef struct gauss_process {
    size_t n_frames;
    double factor[50][50]; /* L */
} gauss_process;

/* R(i, j) = phi^|i - j|. */
static void make_process(gauss_process *process, size_t n, double phi) {
    memset(process, 0, sizeof *process);
    process->n_frames = n;
    for (size_t i = 0; i < n; i++)
        for (size_t j = 0; j <= i; j++)
            process->factor[i][j] = pow(phi, (double)(i - j)) * (j > 0 ? sqrt(1 - phi * phi) : 1);
}

/* Expectation of the estimate at each lag from n_cells cells, of which one at a time is not 0. */
static void expectation(const gauss_process *process, size_t n_cells, double settle, double *out) {
    const size_t n = process->n_frames;
    hand h;
    hand_init(&h, settle, (double)n - 1, (uint32_t)n);
    hand_signal(&h, "spot", 0, 0);
    for (size_t k = 0; k < n; k++)
        out[k] = 0;
    tarry_record records[3];
    for (size_t i = 0; i < n_cells; i++)
        hand_record(&h, &records[i], (int64_t)i);
    for (size_t i = 0; i < n_cells; i++)
        for (size_t column = 0; column < n; column++) {
            for (size_t t = 0; t < n; t++)
                records[i].frames[t] = process->factor[t][column];
            tarry_results *results = hand_results(&h, &tarry_tally_autocorrelation, records,
                                                  n_cells);
            const tarry_table *table = tarry_results_table(results, TARRY_TABLE_autocorrelation);
            for (size_t k = 0; k < n; k++)
                out[k] += hand_number(table, k, "covariance");
            tarry_results_free(results);
            for (size_t t = 0; t < n; t++)
                records[i].frames[t] = 0;
        }
    for (size_t i = 0; i < n_cells; i++)
        tarry_record_release(&records[i]);
}

/* Exact expectations for one trace with its own mean taken off, 1/(N-k) tr[(I-J/N) R (I-J/N)] along
 * the k-th diagonal, worked out apart from this program. */
START_TEST(test_one_cell_is_biased_as_known) {
    static const struct {
        size_t n;
        double phi;
        size_t lag;
        double expected;
    } cases[] = {
        {50, 0.9, 0, 0.69162893},  {50, 0.9, 1, 0.58716355},   {50, 0.9, 5, 0.26498973},
        {50, 0.9, 10, 0.01663645}, {50, 0.9, 20, -0.20116847}, {20, 0.8, 0, 0.64884708},
        {20, 0.8, 5, -0.05037156}, {20, 0.8, 10, -0.24377874}, {50, 0.5, 1, 0.44084898},
        {50, 0.5, 5, -0.02851667},
    };
    for (size_t i = 0; i < sizeof cases / sizeof cases[0]; i++) {
        gauss_process process;
        double expected[50];
        make_process(&process, cases[i].n, cases[i].phi);
        expectation(&process, 1, 1, expected);
        ck_assert_double_eq_tol(expected[cases[i].lag], cases[i].expected, 6e-9);
    }
}
END_TEST

/* From two cells on there is no bias left: the expectation is phi^k itself. */
START_TEST(test_more_cells_are_unbiased) {
    gauss_process process;
    double expected[50];
    make_process(&process, 20, 0.8);
    for (size_t n_cells = 2; n_cells <= 3; n_cells++)
        for (int settle = 0; settle <= 1; settle++) {
            expectation(&process, n_cells, settle, expected);
            for (size_t k = 0; k < 20; k++)
                ck_assert_double_eq_tol(expected[k], pow(0.8, (double)k), 1e-12);
        }
}
END_TEST

/* Molecules that come at rate 0.5 and shine for 4 min: mean 2, C(lag) = 0.5 (4 - lag) below 4 and 0
 * beyond, over mean squared 0.5 and 0.375 at 0 and 1 (Campbell's theorem; Larson et al. 2011,
 * Science 332:475 use it). Read-out noise of sd 1 stands at lag 0 only. */
START_TEST(test_shot_noise) {
    enum { N = 64 * 6, LENGTH = 101 };
    const double rate = 0.5, dwell = 4, until = 50;
    hand h;
    hand_init(&h, 10, until, LENGTH);
    h.network.run.n_lags = 21;
    hand_signal(&h, "spot", 3, 1);
    tarry_record *records = calloc(N, sizeof *records);
    ck_assert_ptr_nonnull(records);
    tarry_stream stream;
    tarry_stream_init(&stream, 1, 0, TARRY_STREAM_EVENTS);
    for (size_t i = 0; i < N; i++) {
        hand_record(&h, &records[i], (int64_t)i);
        double at = -dwell;
        while ((at -= log(tarry_unit(tarry_stream_next(&stream))) / rate) < until)
            for (size_t t = 0; t < LENGTH; t++)
                records[i].frames[t] += (double)t * 0.5 >= at && (double)t * 0.5 < at + dwell;
        for (size_t t = 0; t < LENGTH; t++)
            records[i].frames[t] += 3 +
                                    gsl_cdf_ugaussian_Pinv(tarry_unit(tarry_stream_next(&stream)));
    }
    tarry_results *results = hand_results(&h, &tarry_tally_autocorrelation, records, N);
    const tarry_table *table = tarry_results_table(results, TARRY_TABLE_autocorrelation);
    for (size_t k = 0; k < 21; k++) {
        const double exact = fmax(rate * (dwell - (double)k * 0.5), 0) + (k == 0 ? 1 : 0);
        const double se = (hand_number(table, k, "pms_high") - hand_number(table, k, "pms_low")) /
                          (2 * gsl_cdf_tdist_Pinv(0.975, 63));
        ck_assert_double_lt(se, 0.05);
        ck_assert_double_lt(fabs(hand_number(table, k, "per_mean_squared") - exact / 4), 5 * se);
        const double correlation = k == 0 ? 1 : exact / 2;
        ck_assert_double_lt(fabs(hand_number(table, k, "correlation") - correlation), 0.08);
    }
    const tarry_table *signals = tarry_results_table(results, TARRY_TABLE_signals);
    /* 1 - lag/4 falls to 1/e at 4 (1 - 1/e) = 2.528. */
    const size_t row = hand_row(signals, "spot", "all", "decay_time");
    ck_assert_double_lt(hand_number(signals, row, "low"), 2.5285);
    ck_assert_double_gt(hand_number(signals, row, "high"), 2.5285);
    ck_assert_double_eq(hand_number(signals, row, "samples"), N);
    const double amplitude = hand_number(signals, hand_row(signals, "spot", "all", "amplitude"),
                                         "value");
    ck_assert_double_eq_tol(amplitude, 0.5, 0.05);
    tarry_results_free(results);
    for (size_t i = 0; i < N; i++)
        tarry_record_release(&records[i]);
    free(records);
}
END_TEST

/* ---- figures ---- */

/* Plateau and decay time from the curve as it is written, by hand. */
START_TEST(test_decay_time) {
    hand h;
    film films[CELLS];
    film_hand(&h, 1);
    h.network.run.every = 0.25; /* lags in minutes */
    make_films(films, CELLS);
    tarry_results *results = film_results(&h, films, CELLS, 0);
    const tarry_table *table = tarry_results_table(results, TARRY_TABLE_autocorrelation);
    const tarry_table *signals = tarry_results_table(results, TARRY_TABLE_signals);
    for (size_t s = 0; s < SIGNALS; s++) {
        const size_t first = hand_row(table, "all", signal_names[s], signal_names[s]);
        double curve[LAGS];
        for (size_t k = 0; k < LAGS; k++)
            curve[k] = hand_number(table, first + k, "correlation");
        /* 13 lags: three quarters are 9.75, so the plateau is over lags 10, 11 and 12. */
        const double plateau = (curve[10] + curve[11] + curve[12]) / 3;
        const double level = plateau + (1 - plateau) / exp(1);
        size_t k = 1;
        while (curve[k] > level)
            k++;
        const double slope = curve[k] - curve[k - 1];
        const double decay = 0.25 * ((double)k - 1 + (level - curve[k - 1]) / slope);
        ck_assert_double_eq_tol(
            hand_number(signals, hand_row(signals, signal_names[s], "all", "plateau"), "value"),
            plateau, 1e-14);
        const size_t row = hand_row(signals, signal_names[s], "all", "decay_time");
        ck_assert_double_eq_tol(hand_number(signals, row, "value"), decay, 1e-14);
        ck_assert_str_eq(tarry_table_text(signals, row, 3), "min");
        ck_assert_double_eq(hand_number(table, first + 1, "lag"), 0.25);
    }
    tarry_results_free(results);
}
END_TEST

/* Cells that each stand still at a level of their own are a plateau of 1 and never decay. */
START_TEST(test_plateau) {
    hand h;
    film films[CELLS];
    film_hand(&h, 1);
    for (size_t i = 0; i < CELLS; i++)
        for (size_t t = 0; t < FRAMES; t++)
            for (size_t s = 0; s < SIGNALS; s++)
                films[i][s][t] = s != 3 ? (double)i : t % 2 ? 7.7 : nextafter(7.7, 8);
    tarry_results *results = film_results(&h, films, CELLS, 0);
    const tarry_table *table = tarry_results_table(results, TARRY_TABLE_autocorrelation);
    const tarry_table *signals = tarry_results_table(results, TARRY_TABLE_signals);
    const size_t row = hand_row(table, "all", "red", "red");
    ck_assert_double_eq_tol(hand_number(table, row + 5, "covariance"), 2.5, 1e-13);
    ck_assert_double_eq_tol(
        hand_number(signals, hand_row(signals, "red", "all", "plateau"), "value"), 1, 1e-13);
    ck_assert(isnan(hand_number(signals, hand_row(signals, "red", "all", "decay_time"), "value")));
    ck_assert(hand_noted(results, "red, window all: the correlation has not levelled off"));
    /* What varies by rounding only has no correlation. */
    const size_t still = hand_row(table, "all", "blue", "blue");
    ck_assert_double_eq_tol(hand_number(table, still, "covariance"), 0, 1e-25);
    ck_assert(isnan(hand_number(table, still, "correlation")));
    ck_assert(isnan(hand_number(table, hand_row(table, "all", "red", "blue"), "correlation")));
    tarry_results_free(results);
}
END_TEST

/* The jackknife over cells, each of them a group here, by hand at one lag of a pair. */
START_TEST(test_interval) {
    hand h;
    film films[CELLS];
    film_hand(&h, 0);
    make_films(films, CELLS);
    tarry_results *results = film_results(&h, films, CELLS, 0);
    const tarry_table *table = tarry_results_table(results, TARRY_TABLE_autocorrelation);
    const size_t row = hand_row(table, "all", "red", "green") + LAGS - 1 - 4;
    const double scale = sqrt(plain_changing(films, CELLS, 0, 0, 0) *
                              plain_changing(films, CELLS, 1, 1, 0));
    const double value = plain_changing(films, CELLS, 0, 1, -4) / scale;
    double sum = 0;
    for (size_t left = 0; left < CELLS; left++) {
        film rest[CELLS];
        size_t n = 0;
        for (size_t i = 0; i < CELLS; i++)
            if (i != left)
                memcpy(rest[n++], films[i], sizeof films[i]);
        const double of_rest = sqrt(plain_changing(rest, n, 0, 0, 0) *
                                    plain_changing(rest, n, 1, 1, 0));
        sum += pow(plain_changing(rest, n, 0, 1, -4) / of_rest - value, 2);
    }
    const double half = gsl_cdf_tdist_Pinv(0.975, CELLS - 1) * sqrt(sum * (CELLS - 1) / CELLS);
    ck_assert_double_eq(hand_number(table, row, "lag"), -4);
    ck_assert_double_eq_tol(hand_number(table, row, "low"), value - half, 1e-12);
    ck_assert_double_eq_tol(hand_number(table, row, "high"), value + half, 1e-12);
    tarry_results_free(results);
}
END_TEST

/* The same rise in all cells is no covariance where the mean may change, and is one where the
 * window is said to be stationary: before a step, after settling. */
START_TEST(test_stationary_windows) {
    hand h;
    film films[CELLS];
    film_hand(&h, 5);
    hand_step(&h, 20);
    hand_windows(&h, (const double[]){0, 20, FRAMES - 1}, 2);
    make_films(films, CELLS);
    for (size_t i = 0; i < CELLS; i++)
        for (size_t t = 0; t < FRAMES; t++)
            films[i][0][t] = (double)t;
    tarry_results *results = film_results(&h, films, CELLS, 0);
    const tarry_table *table = tarry_results_table(results, TARRY_TABLE_autocorrelation);
    /* Frames 0 to 19: variance (20^2 - 1)/12. */
    const size_t before = hand_row(table, "w1", "red", "red");
    ck_assert_double_eq_tol(hand_number(table, before, "covariance"), 399.0 / 12, 1e-12);
    ck_assert_double_eq(hand_number(table, before, "pairs"), CELLS * 20);
    const size_t after = hand_row(table, "w2", "red", "red");
    ck_assert_double_eq_tol(hand_number(table, after, "covariance"), 0, 1e-12);
    ck_assert_double_eq(hand_number(table, after, "pairs"), CELLS * 20);
    /* Frames 20 to 39 have the mean 29.5, which the mean of green is not. */
    ck_assert_double_eq_tol(hand_number(table, after, "per_mean_squared"), 0, 1e-14);
    const double green = hand_number(table, hand_row(table, "w2", "green", "green"), "covariance");
    double sum = 0;
    for (size_t t = 20; t < FRAMES; t++) {
        double x[CELLS];
        for (size_t i = 0; i < CELLS; i++)
            x[i] = films[i][1][t];
        sum += sample_covariance(x, x, CELLS);
    }
    ck_assert_double_eq_tol(green, sum / 20, 1e-12);
    tarry_results_free(results);
}
END_TEST

/* The background comes off the mean that covariances are divided by; noise off the variance. */
START_TEST(test_background_and_noise) {
    hand h;
    film films[CELLS];
    film_hand(&h, 1);
    h.signals[0].background = 2;
    h.signals[0].noise = 0.25;
    make_films(films, CELLS);
    tarry_results *results = film_results(&h, films, CELLS, 5);
    const tarry_table *table = tarry_results_table(results, TARRY_TABLE_autocorrelation);
    double mean = 0;
    for (size_t i = 0; i < CELLS; i++)
        mean += mean_of(films[i][0], 0, FRAMES) / CELLS;
    mean += 5 - 2;
    const size_t row = hand_row(table, "all", "red", "red");
    const double c0 = plain_stationary(films, CELLS, 0, 0, 0);
    const double c2 = plain_stationary(films, CELLS, 0, 0, 2);
    ck_assert_double_eq_tol(hand_number(table, row, "covariance"), c0, 1e-12);
    ck_assert_double_eq(hand_number(table, row, "correlation"), 1);
    ck_assert_double_eq_tol(hand_number(table, row + 2, "correlation"), c2 / (c0 - 0.0625), 1e-12);
    ck_assert_double_eq_tol(hand_number(table, row, "per_mean_squared"), c0 / (mean * mean), 1e-12);
    const tarry_table *signals = tarry_results_table(results, TARRY_TABLE_signals);
    ck_assert_double_eq_tol(
        hand_number(signals, hand_row(signals, "red", "all", "amplitude"), "value"),
        (c0 - 0.0625) / (mean * mean), 1e-12);
    tarry_results_free(results);
}
END_TEST

/* With a share q of the signal: (C(0) - f^2 - q^2 mean^2)/(1 + q^2), in a window that moves with
 * the mean over frames of each one's squared mean. */
START_TEST(test_noise_with_a_share) {
    for (int settle = 0; settle <= 5; settle += 5) {
        hand h;
        film films[CELLS];
        film_hand(&h, settle);
        h.signals[0].background = 2;
        h.signals[0].noise = 0.25;
        h.signals[0].share = 0.1;
        make_films(films, CELLS);
        double squares = 0, mean = 0, c0 = 0;
        for (size_t t = 0; t < FRAMES; t++) {
            double x[CELLS], at = 0;
            for (size_t i = 0; i < CELLS; i++) {
                x[i] = films[i][0][t];
                at += (x[i] + 5) / CELLS;
            }
            mean += at / FRAMES;
            squares += at * at / FRAMES;
            c0 += sample_covariance(x, x, CELLS) / FRAMES;
        }
        if (settle > 0) {
            squares = mean * mean;
            c0 = plain_stationary(films, CELLS, 0, 0, 0);
        }
        tarry_results *results = film_results(&h, films, CELLS, 5);
        const tarry_table *table = tarry_results_table(results, TARRY_TABLE_signals);
        ck_assert_double_eq_tol(
            hand_number(table, hand_row(table, "red", "all", "amplitude"), "value"),
            (c0 - 0.0625 - 0.01 * squares) / 1.01 / ((mean - 2) * (mean - 2)), 1e-12);
        tarry_results_free(results);
    }
}
END_TEST

/* Products correlate with themselves only, and their decay times stand with the bursts. */
START_TEST(test_products) {
    hand h;
    film films[CELLS];
    hand_init(&h, 1, FRAMES - 1, FRAMES);
    hand_gene(&h, "vela", 1, true);
    hand_species(&h, "vela.nascent", 0);
    hand_species(&h, "vela.transcript", 0);
    hand_signal(&h, "spot", 0, 0);
    make_films(films, CELLS);
    tarry_results *results = film_results(&h, films, CELLS, 0);
    const tarry_table *table = tarry_results_table(results, TARRY_TABLE_autocorrelation);
    ck_assert_uint_eq(tarry_table_n_rows(table), 3 * FRAMES);
    const size_t row = hand_row(table, "all", "vela.transcript", "vela.transcript");
    ck_assert_double_eq_tol(hand_number(table, row + 6, "covariance"),
                            plain_stationary(films, CELLS, 1, 1, 6), 1e-12);
    const tarry_table *bursts = tarry_results_table(results, TARRY_TABLE_bursts);
    ck_assert_uint_eq(tarry_table_n_rows(bursts), 2);
    hand_row(bursts, "vela", "all", "nascent_decay_time");
    hand_row(bursts, "vela", "all", "transcript_decay_time");
    tarry_results_free(results);
}
END_TEST

START_TEST(test_one_cell) {
    hand h;
    film films[1];
    make_films(films, 1);
    for (int settle = 0; settle <= 1; settle++) {
        film_hand(&h, settle);
        tarry_results *results = film_results(&h, films, 1, 0);
        const tarry_table *table = tarry_results_table(results, TARRY_TABLE_autocorrelation);
        ck_assert_int_eq(!isnan(hand_number(table, 0, "covariance")), settle);
        ck_assert(isnan(hand_number(table, 1, "low")));
        ck_assert(hand_noted(results, "one cell has no mean but its own"));
        tarry_results_free(results);
    }
}
END_TEST

/* A window may hold one frame or none. */
START_TEST(test_window_without_frames) {
    hand h;
    film films[CELLS];
    film_hand(&h, 0);
    hand_windows(&h, (const double[]){0, 10.2, 10.8, 11.5, FRAMES - 1}, 4);
    make_films(films, CELLS);
    tarry_results *results = film_results(&h, films, CELLS, 0);
    const tarry_table *table = tarry_results_table(results, TARRY_TABLE_autocorrelation);
    for (size_t row = 0; row < tarry_table_n_rows(table); row++)
        ck_assert(strcmp(tarry_table_text(table, row, 0), "w2") != 0 &&
                  strcmp(tarry_table_text(table, row, 0), "w3") != 0);
    ck_assert_double_eq(hand_number(table, hand_row(table, "w4", "red", "red"), "pairs"),
                        CELLS * 28);
    tarry_results_free(results);
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"plain sums, stationary", test_plain_stationary},
        {"plain sums, changing mean", test_plain_changing},
        {"many cells", test_many_cells},
        {"large means", test_large_means},
        {"GSL", test_gsl},
        {"bias of one cell", test_one_cell_is_biased_as_known},
        {"no bias from two cells on", test_more_cells_are_unbiased},
        {"shot noise", test_shot_noise},
        {"decay time", test_decay_time},
        {"plateau", test_plateau},
        {"interval", test_interval},
        {"stationary windows", test_stationary_windows},
        {"background and noise", test_background_and_noise},
        {"noise with a share", test_noise_with_a_share},
        {"products", test_products},
        {"one cell", test_one_cell},
        {"window without frames", test_window_without_frames},
    };
    return run_tests("autocorrelation", tests, sizeof tests / sizeof tests[0]);
}
