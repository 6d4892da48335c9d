/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Burst figures and sizes of marks written by hand, worked out by hand beside them; then those of a
 * two-state promoter, whose figures are known. */

#include "base/random.h"
#include "faults.h"
#include "hand.h"
#include "support.h"
#include "tally/bins.h"
#include "tally/kinds.h"

#include <gsl/gsl_cdf.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

static double figure(const tarry_results *results, const char *gene, const char *window,
                     const char *quantity, const char *column) {
    const tarry_table *table = tarry_results_table(results, TARRY_TABLE_bursts);
    return hand_number(table, hand_row(table, gene, window, quantity), column);
}

static void check_value(const tarry_results *results, const char *window, const char *quantity,
                        double value, double samples) {
    ck_assert_double_eq_tol(figure(results, "vela", window, quantity, "value"), value, 1e-12);
    ck_assert_double_eq(figure(results, "vela", window, quantity, "samples"), samples);
}

static void release(tarry_record *records, size_t n) {
    for (size_t i = 0; i < n; i++)
        tarry_record_release(&records[i]);
}

/* ---- two cells of two alleles, 100 min ---------------------------------------------------------
 *
 *   cell 0, allele 0: active 10-14 (3 initiations), 30-36 (none), 90-104 (5), opens again at 130;
 *                     one initiation outside, at 50
 *   cell 0, allele 1: active until 5 (2), 60-61 (2), opens again at 125
 *   cell 1, allele 0: never active
 *   cell 1, allele 1: active 20-22 (1), opens again at 102 */

static void write_two_cells(const hand *h, tarry_record records[2], const int64_t *counts_0,
                            const int64_t *counts_1, const int64_t *counts_3) {
    hand_record(h, &records[0], 0);
    records[0].status[1] = TARRY_TRACK_OPEN;
    records[0].end = 130;
    hand_mark(&records[0], 5, 1, false, 2);
    hand_mark(&records[0], 10, 0, true, 0);
    hand_mark(&records[0], 14, 0, false, 3);
    hand_mark(&records[0], 30, 0, true, 3);
    hand_mark(&records[0], 36, 0, false, 3);
    hand_mark(&records[0], 60, 1, true, 2);
    hand_mark(&records[0], 61, 1, false, 4);
    hand_mark(&records[0], 90, 0, true, 4);
    hand_mark(&records[0], 104, 0, false, 9);
    hand_mark(&records[0], 125, 1, true, 4);
    hand_mark(&records[0], 130, 0, true, 9);
    hand_counts(h, &records[0], 0, counts_0);
    hand_counts(h, &records[0], 1, counts_1);
    hand_record(h, &records[1], 1);
    records[1].end = 102;
    hand_mark(&records[1], 20, 1, true, 0);
    hand_mark(&records[1], 22, 1, false, 1);
    hand_mark(&records[1], 102, 1, true, 1);
    hand_counts(h, &records[1], 1, counts_3);
}

START_TEST(test_figures) {
    hand h;
    tarry_record records[2];
    hand_init(&h, 10, 100, 11);
    hand_gene(&h, "vela", 2, true);
    write_two_cells(&h, records, (const int64_t[]){0, 7}, (const int64_t[]){0, 4},
                    (const int64_t[]){0, 1});
    tarry_results *results = hand_results(&h, &tarry_tally_bursts, records, 2);
    /* Openings in the window: 10, 30, 90, 60, 20. Watched: 2 cells x 2 alleles x 100 min. */
    check_value(results, "all", "burst_frequency", 5.0 / 400, 5);
    /* Sizes 3, 0, 5, 2, 1. */
    check_value(results, "all", "burst_size_mean", 2.2, 5);
    check_value(results, "all", "burst_size_sd", sqrt(3.7), 5);
    check_value(results, "all", "silent_fraction", 0.2, 5);
    check_value(results, "all", "loud_frequency", 4.0 / 400, 4);
    check_value(results, "all", "loud_size_mean", 2.75, 4);
    /* 4, 6, 14, 1, 2 min. */
    check_value(results, "all", "active_time_mean", 5.4, 5);
    /* 14-30, 36-90, 5-60, 61-125, 22-102. */
    check_value(results, "all", "inactive_time_mean", (16 + 54 + 55 + 64 + 80) / 5.0, 5);
    /* 10-30, 30-90, 90-130, 60-125, 20-102: mean 53.4, sum of squared deviations 2291.2. */
    check_value(results, "all", "interval_mean", 53.4, 5);
    check_value(results, "all", "interval_sd", sqrt(2291.2 / 4), 5);
    /* Within the window 4 + 6 + 10, 5 + 1 and 2 min; 7 + 4 + 1 initiations, one of them outside. */
    check_value(results, "all", "active_fraction", 28.0 / 400, 4);
    check_value(results, "all", "initiation_rate", 12.0 / 400, 12);
    check_value(results, "all", "outside_fraction", 1.0 / 12, 12);
    const tarry_table *table = tarry_results_table(results, TARRY_TABLE_bursts);
    ck_assert_uint_eq(tarry_table_n_rows(table), 13);
    ck_assert_str_eq(tarry_table_text(table, 0, 3), "/min per allele");
    ck_assert_str_eq(tarry_table_text(table, 1, 3), "initiations");
    ck_assert(hand_noted(results, "fewer than 20 periods behind burst_frequency (5)"));
    ck_assert(!hand_noted(results, "active_fraction"));
    tarry_results_free(results);
    release(records, 2);
}
END_TEST

/* Each cell a group: the frequency is 1/200 without cell 0 and 4/200 without cell 1. */
START_TEST(test_interval) {
    hand h;
    tarry_record records[2];
    hand_init(&h, 10, 100, 11);
    hand_gene(&h, "vela", 2, true);
    write_two_cells(&h, records, (const int64_t[]){0, 7}, (const int64_t[]){0, 4},
                    (const int64_t[]){0, 1});
    tarry_results *results = hand_results(&h, &tarry_tally_bursts, records, 2);
    const double z = log(5.0 / 400);
    const double s = sqrt((pow(log(0.005) - z, 2) + pow(log(0.02) - z, 2)) / 2);
    const double t = 12.706204736432095; /* Student, 1 degree of freedom, 0.975: any table */
    ck_assert_double_eq_tol(figure(results, "vela", "all", "burst_frequency", "low"),
                            exp(z - t * s), 1e-12);
    ck_assert_double_eq_tol(
        figure(results, "vela", "all", "burst_frequency", "high") / exp(z + t * s), 1, 1e-9);
    tarry_results_free(results);
    release(records, 2);
}
END_TEST

START_TEST(test_windows) {
    hand h;
    tarry_record records[2];
    hand_init(&h, 10, 100, 11);
    hand_windows(&h, (const double[]){0, 40, 100}, 2);
    hand_gene(&h, "vela", 2, true);
    write_two_cells(&h, records, (const int64_t[]){0, 3, 7}, (const int64_t[]){0, 2, 4},
                    (const int64_t[]){0, 1, 1});
    tarry_results *results = hand_results(&h, &tarry_tally_bursts, records, 2);
    check_value(results, "w1", "burst_frequency", 3.0 / 160, 3);
    check_value(results, "w2", "burst_frequency", 2.0 / 240, 2);
    check_value(results, "w1", "burst_size_mean", 4.0 / 3, 3);
    check_value(results, "w2", "burst_size_mean", 3.5, 2);
    check_value(results, "w1", "inactive_time_mean", (16 + 54 + 55 + 80) / 4.0, 4);
    check_value(results, "w2", "inactive_time_mean", 64, 1);
    check_value(results, "w1", "interval_mean", (20 + 60 + 82) / 3.0, 3);
    check_value(results, "w2", "interval_mean", (40 + 65) / 2.0, 2);
    check_value(results, "w1", "active_fraction", 17.0 / 160, 4);
    check_value(results, "w2", "active_fraction", 11.0 / 240, 4);
    check_value(results, "w1", "initiation_rate", 6.0 / 160, 6);
    check_value(results, "w2", "initiation_rate", 6.0 / 240, 6);
    check_value(results, "w1", "outside_fraction", 0, 6);
    check_value(results, "w2", "outside_fraction", 1.0 / 6, 6);
    tarry_results_free(results);
    release(records, 2);
}
END_TEST

/* What starts at a bound belongs to the window that begins there. A period that spans the bound
 * gives its time and initiations to both. */
START_TEST(test_bound) {
    hand h;
    tarry_record record;
    hand_init(&h, 10, 100, 11);
    hand_windows(&h, (const double[]){0, 40, 100}, 2);
    hand_gene(&h, "vela", 1, true);
    hand_record(&h, &record, 0);
    record.end = 120;
    hand_mark(&record, 30, 0, true, 0);
    hand_mark(&record, 40, 0, false, 2);
    hand_mark(&record, 40, 0, true, 2);
    hand_mark(&record, 70, 0, false, 5);
    hand_mark(&record, 100, 0, true, 5);
    hand_mark(&record, 110, 0, false, 9);
    hand_mark(&record, 120, 0, true, 9);
    hand_counts(&h, &record, 0, (const int64_t[]){0, 2, 5});
    tarry_results *results = hand_results(&h, &tarry_tally_bursts, &record, 1);
    check_value(results, "w1", "burst_frequency", 1.0 / 40, 1);
    check_value(results, "w2", "burst_frequency", 1.0 / 60, 1);
    check_value(results, "w2", "burst_size_mean", 3, 1);
    check_value(results, "w2", "inactive_time_mean", 15, 2);
    check_value(results, "w1", "active_fraction", 10.0 / 40, 1);
    check_value(results, "w2", "active_fraction", 30.0 / 60, 1);
    tarry_results_free(results);
    tarry_record_release(&record);
}
END_TEST

/* An inactive period over the bound at 40, with initiations in it at 20, 50 and 55. */
START_TEST(test_outside) {
    hand h;
    tarry_record record;
    hand_init(&h, 10, 100, 11);
    hand_windows(&h, (const double[]){0, 40, 100}, 2);
    hand_gene(&h, "vela", 1, true);
    hand_record(&h, &record, 0);
    record.end = 120;
    hand_mark(&record, 5, 0, true, 0);
    hand_mark(&record, 10, 0, false, 2);
    hand_mark(&record, 60, 0, true, 5);
    hand_mark(&record, 70, 0, false, 9);
    hand_mark(&record, 120, 0, true, 9);
    hand_counts(&h, &record, 0, (const int64_t[]){0, 3, 9});
    tarry_results *results = hand_results(&h, &tarry_tally_bursts, &record, 1);
    check_value(results, "w1", "outside_fraction", 1.0 / 3, 3);
    check_value(results, "w2", "outside_fraction", 2.0 / 6, 6);
    tarry_results_free(results);
    tarry_record_release(&record);
}
END_TEST

/* Intervals all alike have no spread, whatever the rounding of their squares. */
START_TEST(test_no_spread) {
    for (int tenths = 1; tenths < 30; tenths += 2) {
        hand h;
        tarry_record record;
        hand_init(&h, 10, 1000, 11);
        hand_gene(&h, "vela", 1, true);
        hand_record(&h, &record, 0);
        for (int i = 0; i < 300; i++) {
            hand_mark(&record, 0.1 * tenths * i, 0, true, 0);
            hand_mark(&record, 0.1 * tenths * (i + 0.5), 0, false, 0);
        }
        record.end = 2000;
        tarry_results *results = hand_results(&h, &tarry_tally_bursts, &record, 1);
        ck_assert_double_eq(figure(results, "vela", "all", "interval_sd", "value"), 0);
        tarry_results_free(results);
        tarry_record_release(&record);
    }
}
END_TEST

/* ---- cut off ---- */

/* Three bursts of 2 min that closed, with 4, 4 and no initiations, and one open from 5 to the end
 * at 20. */
START_TEST(test_cut_off) {
    static const int64_t size[4] = {4, 4, 0, 9}; /* of the last, until minute 10 */
    hand h;
    tarry_record records[4];
    hand_init(&h, 10, 10, 11);
    hand_gene(&h, "vela", 1, true);
    for (int i = 0; i < 4; i++) {
        hand_record(&h, &records[i], i);
        hand_mark(&records[i], 5, 0, true, 0);
        hand_counts(&h, &records[i], 0, (const int64_t[]){0, size[i]});
        records[i].end = i < 3 ? 11 : 20;
        if (i < 3) {
            hand_mark(&records[i], 7, 0, false, size[i]);
            hand_mark(&records[i], 11, 0, true, size[i]);
        }
    }
    tarry_results *results = hand_results(&h, &tarry_tally_bursts, records, 4);
    check_value(results, "all", "burst_frequency", 4.0 / 40, 4);
    check_value(results, "all", "active_time_mean", (3 * 2 + 15) / 3.0, 3);
    /* 8 initiations in 6 minutes of active time, and 21 minutes in all for 3 endings. */
    check_value(results, "all", "burst_size_mean", 8.0 / 6 * 7, 3);
    check_value(results, "all", "burst_size_sd", sqrt((32 - 64.0 / 3) / 2), 3);
    check_value(results, "all", "silent_fraction", 1.0 / 4, 4);
    check_value(results, "all", "loud_frequency", 3.0 / 40, 3);
    check_value(results, "all", "loud_size_mean", 8.0 / 6 * 21 / 2, 2);
    check_value(results, "all", "inactive_time_mean", 4, 3);
    check_value(results, "all", "interval_mean", 7 + 4, 3);
    check_value(results, "all", "interval_sd", 0, 3);
    ck_assert(hand_noted(results, "vela, window all: 1 of 4 active and 0 of 3 inactive periods"));
    tarry_results_free(results);
    release(records, 4);
}
END_TEST

/* An inactive period that never ends cuts its interval off too. */
START_TEST(test_cut_off_inactive) {
    hand h;
    tarry_record records[2];
    hand_init(&h, 10, 10, 11);
    hand_gene(&h, "vela", 1, true);
    for (int i = 0; i < 2; i++) {
        hand_record(&h, &records[i], i);
        hand_mark(&records[i], 4, 0, true, 0);
        hand_mark(&records[i], 6, 0, false, 1);
        hand_counts(&h, &records[i], 0, (const int64_t[]){0, 1});
        records[i].end = i == 0 ? 12 : 20;
    }
    hand_mark(&records[0], 12, 0, true, 1);
    tarry_results *results = hand_results(&h, &tarry_tally_bursts, records, 2);
    check_value(results, "all", "inactive_time_mean", 6 + 14, 1);
    check_value(results, "all", "interval_mean", 2 + 20, 1);
    check_value(results, "all", "active_time_mean", 2, 2);
    ck_assert(hand_noted(results, "0 of 2 active and 1 of 2 inactive periods"));
    tarry_results_free(results);
    release(records, 2);
}
END_TEST

/* ---- little or nothing to tell ---- */

START_TEST(test_no_bursts) {
    hand h;
    tarry_record records[3];
    hand_init(&h, 10, 10, 11);
    hand_gene(&h, "vela", 1, true);
    for (int i = 0; i < 3; i++)
        hand_record(&h, &records[i], i);
    tarry_results *results = hand_results(&h, &tarry_tally_bursts, records, 3);
    check_value(results, "all", "burst_frequency", 0, 0);
    check_value(results, "all", "initiation_rate", 0, 0);
    check_value(results, "all", "active_fraction", 0, 3);
    ck_assert(isnan(figure(results, "vela", "all", "burst_frequency", "high")));
    ck_assert(isnan(figure(results, "vela", "all", "burst_size_mean", "value")));
    ck_assert(isnan(figure(results, "vela", "all", "silent_fraction", "value")));
    ck_assert(isnan(figure(results, "vela", "all", "inactive_time_mean", "value")));
    ck_assert(isnan(figure(results, "vela", "all", "outside_fraction", "value")));
    /* Wilson's upper bound for none of 3: z^2 / (3 + z^2). */
    ck_assert_double_eq_tol(figure(results, "vela", "all", "active_fraction", "high"),
                            3.841458820694124 / (3 + 3.841458820694124), 1e-12);
    tarry_results_free(results);
    release(records, 3);
}
END_TEST

START_TEST(test_one_cell) {
    hand h;
    tarry_record record;
    hand_init(&h, 10, 10, 11);
    hand_gene(&h, "vela", 1, true);
    hand_record(&h, &record, 0);
    hand_mark(&record, 4, 0, true, 0);
    hand_mark(&record, 6, 0, false, 1);
    hand_mark(&record, 12, 0, true, 1);
    record.end = 12;
    hand_counts(&h, &record, 0, (const int64_t[]){0, 1});
    tarry_results *results = hand_results(&h, &tarry_tally_bursts, &record, 1);
    check_value(results, "all", "active_time_mean", 2, 1);
    ck_assert(isnan(figure(results, "vela", "all", "active_time_mean", "low")));
    ck_assert(isnan(figure(results, "vela", "all", "burst_size_sd", "value")));
    tarry_results_free(results);
    tarry_record_release(&record);
}
END_TEST

/* A gene that always initiates tells its rate and nothing else. */
START_TEST(test_untold) {
    hand h;
    tarry_record record;
    hand_init(&h, 10, 10, 11);
    hand_gene(&h, "lyra", 1, false);
    hand_record(&h, &record, 0);
    record.status[0] = TARRY_TRACK_OPEN;
    hand_counts(&h, &record, 0, (const int64_t[]){3, 8});
    tarry_results *results = hand_results(&h, &tarry_tally_bursts, &record, 1);
    const tarry_table *table = tarry_results_table(results, TARRY_TABLE_bursts);
    ck_assert_uint_eq(tarry_table_n_rows(table), 1);
    ck_assert_str_eq(tarry_table_text(table, 0, 2), "initiation_rate");
    ck_assert_double_eq(hand_number(table, 0, "value"), 0.5);
    ck_assert_uint_eq(results->notes.n, 0); /* reading the model has warned */
    tarry_results_free(results);
    tarry_record_release(&record);
}
END_TEST

/* A named burst is unknown until its first mark: time and counts before it tell nothing, what the
 * mark begins counts. */
START_TEST(test_named) {
    hand h;
    tarry_record record;
    hand_init(&h, 0, 10, 11);
    hand_named(&h, "flash");
    hand_record(&h, &record, 0);
    record.status[0] = TARRY_TRACK_UNKNOWN;
    hand_mark(&record, 4, 0, true, 3);
    hand_mark(&record, 6, 0, false, 5);
    hand_mark(&record, 12, 0, true, 6);
    record.end = 12;
    hand_counts(&h, &record, 0, (const int64_t[]){0, 6});
    tarry_results *results = hand_results(&h, &tarry_tally_bursts, &record, 1);
    ck_assert_double_eq(figure(results, "flash", "all", "burst_frequency", "value"), 0.1);
    ck_assert_double_eq(figure(results, "flash", "all", "burst_size_mean", "value"), 2);
    ck_assert_double_eq_tol(figure(results, "flash", "all", "active_fraction", "value"), 2.0 / 6,
                            1e-15);
    ck_assert_double_eq_tol(figure(results, "flash", "all", "outside_fraction", "value"), 1.0 / 3,
                            1e-15);
    ck_assert_double_eq(figure(results, "flash", "all", "initiation_rate", "value"), 0.6);
    const tarry_table *table = tarry_results_table(results, TARRY_TABLE_bursts);
    ck_assert_str_eq(tarry_table_text(table, 0, 3), "/min per cell");
    tarry_results_free(results);
    tarry_record_release(&record);
}
END_TEST

/* ---- sizes ---- */

/* Bursts of these sizes, each open for 1 min from minute 2, 4, 6, ... on, in one cell. */
static void write_sizes(const hand *h, tarry_record *record, int64_t cell, const int64_t *sizes,
                        size_t n) {
    int64_t count = 0;
    hand_record(h, record, cell);
    for (size_t i = 0; i < n; i++) {
        hand_mark(record, 2 * (double)(i + 1), 0, true, count);
        count += sizes[i];
        hand_mark(record, 2 * (double)(i + 1) + 1, 0, false, count);
    }
    record->end = 2 * (double)(n + 1);
    hand_mark(record, record->end, 0, true, count);
    hand_counts(h, record, 0, (const int64_t[]){0, count});
}

/* The mean of all, and of those seen less one, estimate the mean of a geometric law from 0: 3.1 and
 * 25/6 here. */
START_TEST(test_geometric_sizes) {
    static const int64_t sizes[] = {0, 0, 0, 1, 7, 0, 2, 12, 4, 5};
    hand h;
    tarry_record record;
    hand_init(&h, 10, 22, 12);
    hand_gene(&h, "vela", 1, true);
    write_sizes(&h, &record, 0, sizes, 10);
    tarry_results *results = hand_results(&h, &tarry_tally_bursts, &record, 1);
    check_value(results, "all", "burst_size_mean", 3.1, 10);
    check_value(results, "all", "loud_size_mean", 25.0 / 6 + 1, 6);
    check_value(results, "all", "silent_fraction", 0.4, 10);
    tarry_results_free(results);
    tarry_record_release(&record);
}
END_TEST

START_TEST(test_size_distribution) {
    static const int64_t one[] = {0, 2, 2, 1030}, other[] = {2, 1039, 1040, 0};
    hand h;
    tarry_record records[2];
    hand_init(&h, 10, 10, 11);
    hand_gene(&h, "vela", 1, true);
    hand_species(&h, "vela.transcript", 0);
    write_sizes(&h, &records[0], 0, one, 4);
    write_sizes(&h, &records[1], 1, other, 4);
    tarry_results *results = hand_results(&h, &tarry_tally_burst_sizes, records, 2);
    const tarry_table *table = tarry_results_table(results, TARRY_TABLE_burst_sizes);
    /* 0, 2, 1,024 to 1,039, and 1,040 to 1,055. */
    static const double rows[][3] = {{0, 1, 2}, {2, 1, 3}, {1024, 16, 2}, {1040, 16, 1}};
    ck_assert_uint_eq(tarry_table_n_rows(table), 4);
    ck_assert_str_eq(tarry_table_text(table, 0, 0), "vela");
    for (size_t i = 0; i < 4; i++) {
        ck_assert_double_eq(hand_number(table, i, "size"), rows[i][0]);
        ck_assert_double_eq(hand_number(table, i, "width"), rows[i][1]);
        ck_assert_double_eq(hand_number(table, i, "bursts"), rows[i][2]);
        ck_assert_double_eq(hand_number(table, i, "probability"), rows[i][2] / 8);
    }
    /* Without cell 0 size 2 has 1 of 4, without cell 1 2 of 4; logit scale. */
    const double z = log(0.375 / 0.625);
    const double s = sqrt((pow(log(1.0 / 3) - z, 2) + pow(0 - z, 2)) / 2);
    ck_assert_double_eq_tol(hand_number(table, 1, "low"),
                            1 / (1 + exp(-z + 12.706204736432095 * s)), 1e-9);
    tarry_results_free(results);
    release(records, 2);
}
END_TEST

/* Each gene and window has a distribution of its own. */
START_TEST(test_sizes_by_window) {
    hand h;
    tarry_record record;
    hand_init(&h, 10, 10, 11);
    hand_windows(&h, (const double[]){0, 5, 10}, 2);
    hand_gene(&h, "aster", 1, true);
    hand_gene(&h, "vela", 1, true);
    hand_species(&h, "aster.transcript", 0);
    hand_species(&h, "vela.transcript", 1);
    hand_record(&h, &record, 0);
    for (uint32_t i = 0; i < 4; i++) { /* sizes 0 and 1 early, 2 and 3 late */
        hand_mark(&record, i < 2 ? 1 : 6, i % 2, true, i < 2 ? 0 : i % 2);
        hand_mark(&record, i < 2 ? 2 : 7, i % 2, false, i + (i < 2 ? 0 : i % 2));
    }
    record.end = 20;
    tarry_results *results = hand_results(&h, &tarry_tally_burst_sizes, &record, 1);
    const tarry_table *table = tarry_results_table(results, TARRY_TABLE_burst_sizes);
    ck_assert_uint_eq(tarry_table_n_rows(table), 4);
    const size_t rows[] = {
        hand_row(table, "aster", "w1", NULL), hand_row(table, "vela", "w1", NULL),
        hand_row(table, "aster", "w2", NULL), hand_row(table, "vela", "w2", NULL)};
    for (size_t i = 0; i < 4; i++) {
        ck_assert_double_eq(hand_number(table, rows[i], "size"), (double)i);
        ck_assert_double_eq(hand_number(table, rows[i], "probability"), 1);
    }
    tarry_results_free(results);
    tarry_record_release(&record);
}
END_TEST

/* A burst under way at the start and one cut off are in no distribution; nor are genes that are not
 * recorded. */
START_TEST(test_sizes_left_out) {
    hand h;
    tarry_record record;
    hand_init(&h, 10, 10, 11);
    hand_gene(&h, "aster", 1, true);
    hand_gene(&h, "vela", 1, true);
    hand_species(&h, "aster.transcript", 0);
    h.channels[0].recorded = false;
    hand_species(&h, "vela.transcript", 1);
    hand_record(&h, &record, 0);
    record.status[1] = TARRY_TRACK_OPEN;
    hand_mark(&record, 1, 1, false, 6);
    hand_mark(&record, 2, 0, true, 0);
    hand_mark(&record, 2, 1, true, 6);
    hand_mark(&record, 3, 0, false, 1);
    hand_mark(&record, 3, 1, false, 7);
    hand_mark(&record, 8, 1, true, 7);
    record.end = 20;
    tarry_results *results = hand_results(&h, &tarry_tally_burst_sizes, &record, 1);
    const tarry_table *table = tarry_results_table(results, TARRY_TABLE_burst_sizes);
    ck_assert_uint_eq(tarry_table_n_rows(table), 1);
    ck_assert_str_eq(tarry_table_text(table, 0, 0), "vela");
    ck_assert_double_eq(hand_number(table, 0, "size"), 1);
    ck_assert_double_eq(hand_number(table, 0, "bursts"), 1);
    tarry_results_free(results);
    tarry_record_release(&record);
}
END_TEST

/* ---- caveats ---- */

/* 40 bursts: all of one size or so, then with one that is 100 times as large. */
START_TEST(test_long_tail_is_noted) {
    int64_t sizes[40];
    for (int outlier = 0; outlier <= 1; outlier++) {
        hand h;
        tarry_record record;
        hand_init(&h, 10, 82, 11);
        hand_gene(&h, "vela", 1, true);
        for (int i = 0; i < 40; i++)
            sizes[i] = 4 + i % 3;
        if (outlier)
            sizes[7] = 500;
        write_sizes(&h, &record, 0, sizes, 40);
        tarry_results *results = hand_results(&h, &tarry_tally_bursts, &record, 1);
        ck_assert_int_eq(hand_noted(results, "interval of burst_size_sd too short"), outlier);
        ck_assert(!hand_noted(results, "interval_sd too short"));
        ck_assert(!hand_noted(results, "fewer than"));
        tarry_results_free(results);
        tarry_record_release(&record);
    }
}
END_TEST

/* ---- a two-state promoter ---------------------------------------------------------------------
 *
 * Opens at 0.1, shuts at 0.3, initiates at 2 a minute while open. Bursts are geometric from 0 with
 * mean 2/0.3, a share 0.3/2.3 is empty, openings come at 0.1 0.3 / 0.4 (Peccoud & Ycart 1995,
 * Theor. Popul. Biol. 48:222, have the model; the rest is elementary renewal theory). */

typedef struct two_states {
    double opens, shuts, initiates;
    tarry_stream stream;
} two_states;

static double exponential(two_states *telegraph, double rate) {
    return -log(tarry_unit(tarry_stream_next(&telegraph->stream))) / rate;
}

/* One cell, run on to its first opening after `until` or to 2 until. */
static void write_telegraph(two_states *telegraph, const hand *h, tarry_record *record,
                            int64_t cell) {
    const double until = h->network.run.until;
    hand_record(h, record, cell);
    bool open = tarry_unit(tarry_stream_next(&telegraph->stream)) <
                telegraph->opens / (telegraph->opens + telegraph->shuts);
    record->status[0] = open ? TARRY_TRACK_OPEN : TARRY_TRACK_CLOSED;
    double now = 0;
    int64_t count = 0, at_until = 0;
    for (;;) {
        const double next = now +
                            exponential(telegraph, open ? telegraph->shuts : telegraph->opens);
        double at = now;
        while (open && (at += exponential(telegraph, telegraph->initiates)) < next) {
            count += at < 2 * until;
            at_until += at < until;
        }
        now = next;
        if (now >= 2 * until)
            break;
        open = !open;
        hand_mark(record, now, 0, open, count);
        if (open && now > until)
            break;
    }
    record->end = fmin(now, 2 * until);
    hand_counts(h, record, 0, (const int64_t[]){0, at_until});
}

/* |Z| on the log scale, the standard error from the interval of 64 groups. */
static void check_near(const tarry_results *results, const char *quantity, double exact) {
    const double low = figure(results, "vela", "all", quantity, "low");
    const double high = figure(results, "vela", "all", quantity, "high");
    const double value = figure(results, "vela", "all", quantity, "value");
    const double se = log(high / low) / (2 * gsl_cdf_tdist_Pinv(0.975, 63));
    ck_assert_double_gt(se, 0);
    ck_assert_double_lt(se, 0.05);
    ck_assert_double_lt(fabs(log(value / exact)), 5 * se);
}

static tarry_results *telegraph_results(two_states *telegraph, double until, size_t n) {
    hand h;
    hand_init(&h, 10, until, 11);
    hand_gene(&h, "vela", 1, true);
    tarry_record *records = calloc(n, sizeof *records);
    ck_assert_ptr_nonnull(records);
    for (size_t i = 0; i < n; i++)
        write_telegraph(telegraph, &h, &records[i], (int64_t)i);
    tarry_results *results = hand_results(&h, &tarry_tally_bursts, records, n);
    release(records, n);
    free(records);
    return results;
}

START_TEST(test_telegraph) {
    two_states telegraph = {0.1, 0.3, 2, {{0}}};
    tarry_stream_init(&telegraph.stream, 1, 0, TARRY_STREAM_EVENTS);
    tarry_results *results = telegraph_results(&telegraph, 100, 2000);
    const double b = 2 / 0.3;
    check_near(results, "burst_frequency", 0.075);
    check_near(results, "burst_size_mean", b);
    check_near(results, "burst_size_sd", sqrt(b * (1 + b)));
    check_near(results, "silent_fraction", 0.3 / 2.3);
    check_near(results, "loud_frequency", 0.075 * 2 / 2.3);
    check_near(results, "loud_size_mean", 1 + b);
    check_near(results, "active_time_mean", 1 / 0.3);
    check_near(results, "inactive_time_mean", 10);
    check_near(results, "interval_mean", 1 / 0.075);
    check_near(results, "interval_sd", sqrt(100 + 1 / 0.09));
    check_near(results, "active_fraction", 0.25);
    check_near(results, "initiation_rate", 0.5);
    ck_assert_double_eq(figure(results, "vela", "all", "outside_fraction", "value"), 0);
    ck_assert(!hand_noted(results, "under way"));
    tarry_results_free(results);
}
END_TEST

/* Records of 6 min, in which 14 and 45 % of the periods are cut off, still have the right means. */
START_TEST(test_telegraph_cut_off) {
    two_states telegraph = {0.1, 0.3, 2, {{0}}};
    tarry_stream_init(&telegraph.stream, 1, 0, TARRY_STREAM_EVENTS);
    tarry_results *results = telegraph_results(&telegraph, 6, 20000);
    ck_assert(hand_noted(results, "periods were still under way"));
    check_near(results, "burst_frequency", 0.075);
    check_near(results, "burst_size_mean", 2 / 0.3);
    check_near(results, "active_time_mean", 1 / 0.3);
    check_near(results, "inactive_time_mean", 10);
    check_near(results, "interval_mean", 1 / 0.075);
    check_near(results, "loud_size_mean", 1 + 2 / 0.3);
    tarry_results_free(results);
}
END_TEST

/* Every allocation fails once: the code says so, and nothing is lost or used after. */
START_TEST(test_memory) {
    static const tarry_tally_kind *const kinds[] = {&tarry_tally_bursts, &tarry_tally_burst_sizes,
                                                    &tarry_tally_dwells,
                                                    &tarry_tally_autocorrelation};
    hand h;
    tarry_record records[2];
    hand_init(&h, 10, 100, 11);
    hand_gene(&h, "vela", 2, true);
    hand_species(&h, "vela.transcript", 0);
    hand_signal(&h, "spot", 0, 0);
    hand_signal(&h, "haze", 0, 0);
    write_two_cells(&h, records, (const int64_t[]){0, 7}, (const int64_t[]){0, 4},
                    (const int64_t[]){0, 1});
    for (size_t k = 0; k < sizeof kinds / sizeof kinds[0]; k++)
        for (long n = 0;; n++) {
            tarry_results *results;
            faults_arm(FAULT_MEMORY, n, 0);
            const int code = hand_try(&h, kinds[k], records, 2, &results);
            const bool struck = faults_struck();
            faults_clear();
            tarry_results_free(results);
            ck_assert_int_eq(code, struck ? TARRY_MEMORY : TARRY_OK);
            if (!struck)
                break;
        }
    release(records, 2);
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"figures", test_figures},
        {"interval", test_interval},
        {"windows", test_windows},
        {"bound", test_bound},
        {"outside", test_outside},
        {"no spread", test_no_spread},
        {"cut off", test_cut_off},
        {"cut off, inactive", test_cut_off_inactive},
        {"no bursts", test_no_bursts},
        {"one cell", test_one_cell},
        {"untold", test_untold},
        {"named", test_named},
        {"geometric sizes", test_geometric_sizes},
        {"size distribution", test_size_distribution},
        {"sizes by window", test_sizes_by_window},
        {"sizes left out", test_sizes_left_out},
        {"long tail", test_long_tail_is_noted},
        {"memory", test_memory},
        {"telegraph", test_telegraph},
        {"telegraph, cut off", test_telegraph_cut_off},
    };
    return run_tests("bursts", tests, sizeof tests / sizeof tests[0]);
}
