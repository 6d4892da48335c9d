/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Moments over time and pooled over windows, against GSL's statistics of the same values. */
#include "base/table.h"
#include "hand.h"
#include "support.h"
#include "tally/kinds.h"

#include <gsl/gsl_randist.h>
#include <gsl/gsl_rng.h>
#include <gsl/gsl_statistics_double.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

enum { MOST_CELLS = 300, N_FRAMES = 5, N_SNAPSHOTS = 3 };

static void assert_near(double found, double expected, double relative) {
    ck_assert_msg(fabs(found - expected) <= relative * fabs(expected), "%.17g is not %.17g", found,
                  expected);
}

static void assert_within(double found, double expected, double limit) {
    ck_assert_msg(fabs(found - expected) <= limit, "%.17g is not %.17g", found, expected);
}

/* A gene with a transcript, and a signal. Frames at 0, 2.5, 5, 7.5, 10; snapshots between, on a
 * frame (but for rounding) and at the end. */
typedef struct films {
    hand h;
    double snapshots[N_SNAPSHOTS];
    tarry_record records[MOST_CELLS];
    size_t n;
} films;

static void films_init(films *f, size_t n) {
    hand_init(&f->h, 0, 10, N_FRAMES);
    const uint32_t gene = hand_gene(&f->h, "vela", 1, true);
    hand_species(&f->h, "vela.transcript", (int32_t)gene);
    hand_species(&f->h, "vela.protein", (int32_t)gene);
    hand_signal(&f->h, "spot", 0.5, 0.1);
    const double snapshots[N_SNAPSHOTS] = {1.25, 7.5 + 1e-14, 10};
    memcpy(f->snapshots, snapshots, sizeof snapshots);
    f->h.network.run.snapshots = f->snapshots;
    f->h.network.run.n_snapshots = N_SNAPSHOTS;
    f->n = n;
    for (size_t c = 0; c < n; c++)
        hand_record(&f->h, &f->records[c], (int64_t)c);
}

static void films_release(films *f) {
    for (size_t c = 0; c < f->n; c++)
        tarry_record_release(&f->records[c]);
}

static double *frame_of(films *f, size_t cell, size_t channel, size_t frame) {
    return &f->records[cell].frames[channel * N_FRAMES + frame];
}

/* Counts about `level`, alike in neighbouring frames; signals about 0. */
static void films_fill(films *f, double level) {
    gsl_rng *rng = gsl_rng_alloc(gsl_rng_mt19937);
    gsl_rng_set(rng, 1);
    for (size_t c = 0; c < f->n; c++) {
        const double own = level + gsl_ran_negative_binomial(rng, 0.1, 2.0);
        for (size_t i = 0; i < N_FRAMES; i++) {
            *frame_of(f, c, 0, i) = own + gsl_ran_poisson(rng, 3.0);
            *frame_of(f, c, 1, i) = level + gsl_ran_poisson(rng, 3.0);
            *frame_of(f, c, 2, i) = gsl_ran_gaussian(rng, 2.0);
        }
        for (size_t i = 0; i < 3 * N_SNAPSHOTS; i++)
            f->records[c].snapshots[i] = level + gsl_ran_poisson(rng, 5.0);
    }
    gsl_rng_free(rng);
}

static size_t row_at(const tarry_table *table, const char *name, double time) {
    for (size_t row = 0; row < tarry_table_n_rows(table); row++)
        if (strcmp(tarry_table_text(table, row, 0), name) == 0 &&
            hand_number(table, row, "time") == time)
            return row;
    ck_abort_msg("no row of %s at %g", name, time);
}

/* Figures of n values by GSL: mean, sd, Fano factor, squared coefficient of variation. */
static void figures_of(const double *values, size_t n, double figures[4]) {
    figures[0] = gsl_stats_mean(values, 1, n);
    figures[1] = gsl_stats_sd(values, 1, n);
    figures[2] = figures[1] * figures[1] / figures[0];
    figures[3] = pow(figures[1] / figures[0], 2);
}

/* Standard errors by leaving out the cells of each group (cell mod 64) and working all out anew. */
static void errors_of(const double *values, size_t n, double errors[4]) {
    double figures[4], sums[4] = {0};
    const size_t n_groups = n < 64 ? n : 64;
    figures_of(values, n, figures);
    for (size_t g = 0; g < n_groups; g++) {
        double rest[MOST_CELLS], without[4];
        size_t n_rest = 0;
        for (size_t c = 0; c < n; c++)
            if (c % 64 != g)
                rest[n_rest++] = values[c];
        figures_of(rest, n_rest, without);
        for (int j = 0; j < 4; j++)
            sums[j] += pow(without[j] - figures[j], 2);
    }
    for (int j = 0; j < 4; j++)
        errors[j] = sqrt(sums[j] * (double)(n_groups - 1) / (double)n_groups);
}

static const char *const columns[4] = {"mean", "sd", "fano", "cv2"};
static const char *const error_columns[4] = {"mean_se", "sd_se", "fano_se", "cv2_se"};

static void assert_row(const tarry_table *table, const char *name, double time,
                       const double *values, size_t n, bool species) {
    const size_t row = row_at(table, name, time);
    double figures[4], errors[4];
    figures_of(values, n, figures);
    errors_of(values, n, errors);
    for (int j = 0; j < 4; j++) {
        if (j == 2 && !species) {
            ck_assert(isnan(hand_number(table, row, "fano")));
            ck_assert(isnan(hand_number(table, row, "fano_se")));
            continue;
        }
        assert_near(hand_number(table, row, columns[j]), figures[j], 1e-12);
        /* Differences of nearly equal numbers on GSL's side: 1e-16 of a figure for each replicate.
         */
        assert_within(hand_number(table, row, error_columns[j]), errors[j],
                      1e-10 * errors[j] + 1e-14 * fabs(figures[j]));
    }
}

static void assert_means(films *f, double level) {
    films_fill(f, level);
    tarry_results *results = hand_results(&f->h, &tarry_tally_moments, f->records, f->n);
    const tarry_table *means = tarry_results_table(results, TARRY_TABLE_means);
    static const char *const names[3] = {"vela.transcript", "vela.protein", "spot"};
    static const double frame_times[N_FRAMES] = {0, 2.5, 5, 7.5, 10};
    for (size_t i = 0; i < 3; i++) {
        double values[MOST_CELLS];
        for (size_t frame = 0; frame < 3; frame++) {
            for (size_t c = 0; c < f->n; c++)
                values[c] = *frame_of(f, c, i, frame);
            assert_row(means, names[i], frame_times[frame], values, f->n, i < 2);
        }
        for (size_t s = 0; s < N_SNAPSHOTS; s++) {
            for (size_t c = 0; c < f->n; c++)
                values[c] = f->records[c].snapshots[i * N_SNAPSHOTS + s];
            assert_row(means, names[i], f->snapshots[s], values, f->n, i < 2);
        }
    }
    ck_assert_uint_eq(tarry_table_n_rows(means), 3 * (N_FRAMES + 1)); /* two snapshots on frames */
    tarry_results_free(results);
}

START_TEST(means_against_gsl) {
    static films f;
    static const size_t n_cells[] = {3, 63, 64, 65, MOST_CELLS};
    for (size_t i = 0; i < sizeof n_cells / sizeof n_cells[0]; i++) {
        films_init(&f, n_cells[i]);
        assert_means(&f, 0);
        films_release(&f);
    }
}
END_TEST

/* The same about 1e9, where a plain sum of squares would have lost the variance whole: sd and its
 * error must be to the last digits those of the counts less 1e9. */
START_TEST(large_counts_lose_nothing) {
    static films f;
    films_init(&f, MOST_CELLS);
    films_fill(&f, 0);
    tarry_results *low = hand_results(&f.h, &tarry_tally_moments, f.records, f.n);
    films_fill(&f, 1e9);
    tarry_results *high = hand_results(&f.h, &tarry_tally_moments, f.records, f.n);
    const tarry_table *one = tarry_results_table(low, TARRY_TABLE_means);
    const tarry_table *other = tarry_results_table(high, TARRY_TABLE_means);
    for (size_t row = 0; row < 2 * (N_FRAMES + 1); row++) {
        assert_near(hand_number(other, row, "mean"), 1e9 + hand_number(one, row, "mean"), 1e-15);
        assert_near(hand_number(other, row, "sd"), hand_number(one, row, "sd"), 1e-15);
        assert_near(hand_number(other, row, "sd_se"), hand_number(one, row, "sd_se"), 1e-13);
    }
    tarry_results_free(low);
    tarry_results_free(high);
    films_release(&f);
}
END_TEST

/* In time's order, a name after another; a snapshot on a frame stands for both. */
START_TEST(rows_lie_in_order) {
    static films f;
    films_init(&f, 3);
    f.h.channels[1].recorded = false; /* the protein: snapshots only */
    for (size_t c = 0; c < f.n; c++) {
        tarry_record_release(&f.records[c]);
        hand_record(&f.h, &f.records[c], (int64_t)c);
    }
    *frame_of(&f, 2, 1, 0) = 6; /* the signal's, the protein having no frames */
    tarry_results *results = hand_results(&f.h, &tarry_tally_moments, f.records, f.n);
    const tarry_table *means = tarry_results_table(results, TARRY_TABLE_means);
    const double times[] = {0, 1.25, 2.5, 5, f.snapshots[1], 10, 1.25, f.snapshots[1], 10,
                            0, 1.25, 2.5, 5, f.snapshots[1], 10};
    const size_t n = sizeof times / sizeof times[0];
    ck_assert_uint_eq(tarry_table_n_rows(means), n);
    for (size_t row = 0; row < n; row++)
        ck_assert_double_eq(hand_number(means, row, "time"), times[row]);
    ck_assert_str_eq(tarry_table_text(means, 6, 0), "vela.protein");
    ck_assert_double_eq(hand_number(means, row_at(means, "spot", 0), "mean"), 2);
    tarry_results_free(results);
    films_release(&f);
}
END_TEST

START_TEST(few_cells) {
    static films f;
    films_init(&f, 1);
    films_fill(&f, 0);
    tarry_results *results = hand_results(&f.h, &tarry_tally_moments, f.records, 1);
    const tarry_table *means = tarry_results_table(results, TARRY_TABLE_means);
    ck_assert_double_eq(hand_number(means, 0, "mean"), *frame_of(&f, 0, 0, 0));
    for (int j = 0; j < 4; j++) {
        ck_assert(j == 0 || isnan(hand_number(means, 0, columns[j])));
        ck_assert(isnan(hand_number(means, 0, error_columns[j])));
    }
    tarry_results_free(results);
    films_release(&f);

    films_init(&f, 2);
    films_fill(&f, 0);
    results = hand_results(&f.h, &tarry_tally_moments, f.records, 2);
    means = tarry_results_table(results, TARRY_TABLE_means);
    const double a = *frame_of(&f, 0, 0, 0), b = *frame_of(&f, 1, 0, 0);
    assert_near(hand_number(means, 0, "mean_se"), fabs(a - b) / 2, 1e-14);
    assert_near(hand_number(means, 0, "sd"), fabs(a - b) / sqrt(2), 1e-14);
    ck_assert(isnan(hand_number(means, 0, "sd_se")));
    tarry_results_free(results);

    /* Nothing there: mean 0, sd 0, and no ratio. */
    for (size_t c = 0; c < 2; c++)
        *frame_of(&f, c, 0, 0) = 0;
    results = hand_results(&f.h, &tarry_tally_moments, f.records, 2);
    means = tarry_results_table(results, TARRY_TABLE_means);
    ck_assert(hand_number(means, 0, "mean") == 0 && hand_number(means, 0, "sd") == 0);
    ck_assert(hand_number(means, 0, "mean_se") == 0 && isnan(hand_number(means, 0, "fano")));
    ck_assert(isnan(hand_number(means, 0, "cv2")));
    tarry_results_free(results);
    films_release(&f);
}
END_TEST

/* ---- pooled over windows --------------------------------------------------------------------- */

/* The variance as defined: mean square about the pooled mean, plus the variance of that mean as the
 * cells' own means tell it. Frames from .. to - 1 of `channel`, cells with cell mod 64 != less. */
static void pooled_of(films *f, size_t channel, size_t from, size_t to, size_t less, double *mean,
                      double *variance) {
    static double values[MOST_CELLS * N_FRAMES];
    double means[MOST_CELLS];
    size_t n = 0, n_cells = 0;
    for (size_t c = 0; c < f->n; c++) {
        if (c % 64 == less)
            continue;
        for (size_t i = from; i < to; i++)
            values[n++] = *frame_of(f, c, channel, i);
        means[n_cells++] = gsl_stats_mean(values + n - (to - from), 1, to - from);
    }
    *mean = gsl_stats_mean(values, 1, n);
    *variance = gsl_stats_variance_with_fixed_mean(values, 1, n, *mean) +
                gsl_stats_variance(means, 1, n_cells) / (double)n_cells;
}

static void assert_pooled(films *f, const tarry_table *table, const char *gene, const char *window,
                          const char *quantity, size_t channel, size_t from, size_t to,
                          double (*figure)(double mean, double variance), bool plain) {
    const size_t row = hand_row(table, gene, window, quantity);
    double mean, variance, sum = 0;
    pooled_of(f, channel, from, to, 64, &mean, &variance);
    const double value = figure(mean, variance);
    for (size_t g = 0; g < 64; g++) {
        double m, v;
        pooled_of(f, channel, from, to, g, &m, &v);
        sum += pow(plain ? figure(m, v) - value : log(figure(m, v) / value), 2);
    }
    const double half = 1.998340542520745 * sqrt(63.0 / 64.0 * sum); /* t with 63 d. f. */
    assert_near(hand_number(table, row, "value"), value, 1e-12);
    const double low = plain ? value - half : value * exp(-half);
    const double high = plain ? value + half : value * exp(half);
    assert_within(hand_number(table, row, "low"), low, 1e-9 * (fabs(low) + half));
    assert_within(hand_number(table, row, "high"), high, 1e-9 * (fabs(high) + half));
    ck_assert_double_eq(hand_number(table, row, "samples"), (double)f->n);
}

static double the_mean(double mean, double variance) {
    (void)variance;
    return mean;
}

static double the_sd(double mean, double variance) {
    (void)mean;
    return sqrt(variance);
}

static double the_fano(double mean, double variance) {
    return variance / mean;
}

static double the_cv2(double mean, double variance) {
    return variance / mean / mean;
}

START_TEST(pooled_against_gsl) {
    static films f;
    films_init(&f, MOST_CELLS);
    f.h.species[0].role = TARRY_SPECIES_STAGE;
    hand_windows(&f.h, (const double[]){0, 5, 10}, 2); /* frames 0, 1 and 2, 3, 4 */
    films_fill(&f, 100);
    tarry_results *results = hand_results(&f.h, &tarry_tally_pooled, f.records, f.n);
    const tarry_table *bursts = tarry_results_table(results, TARRY_TABLE_bursts);
    const tarry_table *signals = tarry_results_table(results, TARRY_TABLE_signals);
    for (size_t w = 0; w < 2; w++) {
        const char *window = w == 0 ? "w1" : "w2";
        const size_t from = w == 0 ? 0 : 2, to = w == 0 ? 2 : 5;
        for (size_t i = 0; i < 2; i++) {
            const char *names[2][3] = {{"transcript_mean", "transcript_fano", "transcript_cv2"},
                                       {"protein_mean", "protein_fano", "protein_cv2"}};
            assert_pooled(&f, bursts, "vela", window, names[i][0], i, from, to, the_mean, false);
            assert_pooled(&f, bursts, "vela", window, names[i][1], i, from, to, the_fano, false);
            assert_pooled(&f, bursts, "vela", window, names[i][2], i, from, to, the_cv2, false);
        }
        assert_pooled(&f, signals, "spot", window, "signal_mean", 2, from, to, the_mean, true);
        assert_pooled(&f, signals, "spot", window, "signal_sd", 2, from, to, the_sd, false);
        assert_pooled(&f, signals, "spot", window, "signal_cv2", 2, from, to, the_cv2, false);
    }
    ck_assert_uint_eq(tarry_table_n_rows(bursts), 12);
    ck_assert_uint_eq(tarry_table_n_rows(signals), 6);
    tarry_results_free(results);
    films_release(&f);
}
END_TEST

/* Where the frames of a cell are all alike, more of them tell nothing: the variance is the sample
 * variance of the cells, with its n - 1. */
START_TEST(like_frames_count_once) {
    static films f;
    double values[5] = {4, 9, 9, 1, 30};
    films_init(&f, 5);
    for (size_t c = 0; c < 5; c++)
        for (size_t i = 0; i < N_FRAMES; i++)
            *frame_of(&f, c, 0, i) = values[c];
    tarry_results *results = hand_results(&f.h, &tarry_tally_pooled, f.records, f.n);
    const tarry_table *bursts = tarry_results_table(results, TARRY_TABLE_bursts);
    assert_near(hand_number(bursts, hand_row(bursts, "vela", "all", "transcript_fano"), "value"),
                gsl_stats_variance(values, 1, 5) / gsl_stats_mean(values, 1, 5), 1e-14);
    tarry_results_free(results);
    films_release(&f);
}
END_TEST

/* One cell: its frames are all there is, and nothing tells an interval. */
START_TEST(one_cell_pools_its_frames) {
    static films f;
    films_init(&f, 1);
    films_fill(&f, 1e9);
    tarry_results *results = hand_results(&f.h, &tarry_tally_pooled, f.records, 1);
    const tarry_table *bursts = tarry_results_table(results, TARRY_TABLE_bursts);
    const size_t row = hand_row(bursts, "vela", "all", "transcript_cv2");
    const double *frames = frame_of(&f, 0, 0, 0);
    const double sd = gsl_stats_sd(frames, 1, N_FRAMES);
    assert_near(hand_number(bursts, row, "value"), pow(sd / gsl_stats_mean(frames, 1, N_FRAMES), 2),
                1e-13);
    ck_assert(isnan(hand_number(bursts, row, "low")) && isnan(hand_number(bursts, row, "high")));
    tarry_results_free(results);
    films_release(&f);
}
END_TEST

/* 200 cells with bursty counts (negative binomial, r = 0.2): the interval of the Fano factor holds
 * the truth in 86 % (own trials, docs/statistics.md), and a note says so; Poisson counts do well.
 */
START_TEST(short_intervals_are_told) {
    static films f;
    films_init(&f, 200);
    gsl_rng *rng = gsl_rng_alloc(gsl_rng_mt19937);
    gsl_rng_set(rng, 1);
    for (size_t c = 0; c < f.n; c++) {
        const double bursty = gsl_ran_negative_binomial(rng, 1.0 / 26, 0.2);
        const double tame = gsl_ran_poisson(rng, 5);
        for (size_t i = 0; i < N_FRAMES; i++) {
            *frame_of(&f, c, 0, i) = bursty;
            *frame_of(&f, c, 1, i) = tame;
        }
    }
    gsl_rng_free(rng);
    tarry_results *results = hand_results(&f.h, &tarry_tally_pooled, f.records, f.n);
    ck_assert_uint_eq(tarry_results_n_warnings(results), 1);
    ck_assert(hand_noted(results, "vela.transcript, window all: few bursts make up"));
    tarry_results_free(results);
    films_release(&f);
}
END_TEST

START_TEST(window_without_frames) {
    static films f;
    films_init(&f, 4);
    films_fill(&f, 0);
    hand_windows(&f.h, (const double[]){0, 0.5, 1, 10}, 3); /* no frame in 0.5 .. 1 */
    for (size_t c = 0; c < f.n; c++) {
        tarry_record_release(&f.records[c]);
        hand_record(&f.h, &f.records[c], (int64_t)c);
    }
    tarry_results *results = hand_results(&f.h, &tarry_tally_pooled, f.records, f.n);
    const tarry_table *bursts = tarry_results_table(results, TARRY_TABLE_bursts);
    const size_t row = hand_row(bursts, "vela", "w2", "transcript_mean");
    ck_assert(isnan(hand_number(bursts, row, "value")) && isnan(hand_number(bursts, row, "low")));
    ck_assert(hand_number(bursts, hand_row(bursts, "vela", "w3", "transcript_mean"), "value") == 0);
    tarry_results_free(results);
    films_release(&f);
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"means against GSL", means_against_gsl},
        {"large counts lose nothing", large_counts_lose_nothing},
        {"rows lie in order", rows_lie_in_order},
        {"few cells", few_cells},
        {"pooled against GSL", pooled_against_gsl},
        {"like frames count once", like_frames_count_once},
        {"one cell pools its frames", one_cell_pools_its_frames},
        {"short intervals are told", short_intervals_are_told},
        {"window without frames", window_without_frames},
    };
    return run_tests("moments", tests, sizeof tests / sizeof tests[0]);
}
