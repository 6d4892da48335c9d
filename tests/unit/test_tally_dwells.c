/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Dwell curves against the product limit of times as they are, and against a published one. */

#include "base/random.h"
#include "hand.h"
#include "support.h"
#include "tally/dwells.h"
#include "tally/kinds.h"

#include <gsl/gsl_cdf.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

/* One period of each cell: how long, and whether it was cut off. */
typedef struct dwell {
    double time;
    bool cut_off;
} dwell;

/* Active from minute 0 on, one period a cell; the record ends where one is cut off. */
static tarry_results *results_of(const hand *h, const dwell *dwells, size_t n) {
    tarry_record *records = calloc(n, sizeof *records);
    ck_assert_ptr_nonnull(records);
    for (size_t i = 0; i < n; i++) {
        hand_record(h, &records[i], (int64_t)i);
        hand_mark(&records[i], 0, 0, true, 0);
        records[i].end = dwells[i].time;
        if (!dwells[i].cut_off) {
            hand_mark(&records[i], dwells[i].time, 0, false, 0);
            records[i].end = 2 * h->network.run.until;
        }
    }
    tarry_results *results = hand_results(h, &tarry_tally_dwells, records, n);
    for (size_t i = 0; i < n; i++)
        tarry_record_release(&records[i]);
    free(records);
    return results;
}

/* Kaplan & Meier's product over the times themselves, all but one of them if `left` is one. */
static double product_limit(const dwell *dwells, size_t n, size_t left, double time) {
    double survival = 1;
    for (size_t i = 0; i < n; i++) {
        if (i == left || dwells[i].cut_off || dwells[i].time > time)
            continue;
        /* Ties one after another: the first of r at risk, then of r - 1, ... */
        size_t at_risk = 0;
        for (size_t j = 0; j < n; j++)
            at_risk += j != left &&
                       (dwells[j].time > dwells[i].time ||
                        (dwells[j].time == dwells[i].time && (dwells[j].cut_off || j >= i)));
        survival *= 1 - 1 / (double)at_risk;
    }
    return survival;
}

static void one_gene(hand *h, double until) {
    hand_init(h, 10, until, 11);
    hand_gene(h, "vela", 1, true);
    hand_species(h, "vela.transcript", 0);
}

/* Weeks of remission under 6-mercaptopurine (Freireich et al. 1963, Blood 21:699, the usual example
 * since Gehan 1965, Biometrika 52:203; times and curve from memory): + is cut off. On this grid
 * every whole number from 16 on, and many below, ends a bin. */
START_TEST(test_published) {
    static const dwell weeks[] = {
        {6, false},  {6, false},  {6, false},  {6, true},   {7, false}, {9, true},  {10, false},
        {10, true},  {11, true},  {13, false}, {16, false}, {17, true}, {19, true}, {20, true},
        {22, false}, {23, false}, {25, true},  {32, true},  {32, true}, {34, true}, {35, true},
    };
    static const double curve[][2] = {{0, 1},      {6, 0.857},  {7, 0.807},  {10, 0.753},
                                      {13, 0.690}, {16, 0.627}, {22, 0.538}, {23, 0.448}};
    hand h;
    one_gene(&h, 32);
    tarry_results *results = results_of(&h, weeks, sizeof weeks / sizeof weeks[0]);
    const tarry_table *table = tarry_results_table(results, TARRY_TABLE_dwells);
    const size_t first = hand_row(table, "vela", "all", "active");
    for (size_t i = 0; i < sizeof curve / sizeof curve[0]; i++) {
        ck_assert_double_eq(hand_number(table, first + i, "time"), curve[i][0]);
        ck_assert_double_eq_tol(hand_number(table, first + i, "survival"), curve[i][1], 5e-4);
    }
    ck_assert_str_eq(tarry_table_text(table, first + 8, 2), "inactive");
    tarry_results_free(results);
}
END_TEST

static void draw_dwells(dwell *dwells, size_t n, double mean, double cut_after) {
    tarry_stream stream;
    tarry_stream_init(&stream, 1, 0, TARRY_STREAM_EVENTS);
    for (size_t i = 0; i < n; i++) {
        const double time = -mean * log(tarry_unit(tarry_stream_next(&stream)));
        const double cut = cut_after * (1 + tarry_unit(tarry_stream_next(&stream)));
        dwells[i] = (dwell){fmin(time, cut), time > cut};
    }
}

/* With nothing cut off the curve is the share that lasts longer than the end of the bin. */
START_TEST(test_nothing_cut_off) {
    enum { N = 500 };
    dwell dwells[N];
    hand h;
    one_gene(&h, 100);
    draw_dwells(dwells, N, 8, 1000);
    tarry_results *results = results_of(&h, dwells, N);
    const tarry_table *table = tarry_results_table(results, TARRY_TABLE_dwells);
    size_t row = hand_row(table, "vela", "all", "active");
    double last = 1;
    for (; strcmp(tarry_table_text(table, row, 2), "active") == 0; row++) {
        const double time = hand_number(table, row, "time");
        size_t longer = 0;
        for (size_t i = 0; i < N; i++)
            longer += dwells[i].time > time;
        last = hand_number(table, row, "survival");
        ck_assert_double_eq_tol(last, (double)longer / N, 1e-13);
    }
    ck_assert_uint_gt(row, 100);
    ck_assert_double_eq_tol(last, 0, 1e-13);
    tarry_results_free(results);
}
END_TEST

/* Times that end bins, many of them cut off: the product limit itself, and the jackknife of it on
 * the scale of log(-log S). */
START_TEST(test_cut_off) {
    enum { N = 60 }; /* every cell a group */
    dwell dwells[N];
    hand h;
    one_gene(&h, 64);
    draw_dwells(dwells, N, 40, 32);
    for (size_t i = 0; i < N; i++)
        dwells[i].time = tarry_dwell_bin_end(tarry_dwell_bin(dwells[i].time, 128), 128);
    tarry_results *results = results_of(&h, dwells, N);
    const tarry_table *table = tarry_results_table(results, TARRY_TABLE_dwells);
    const size_t first = hand_row(table, "vela", "all", "active");
    const double t = gsl_cdf_tdist_Pinv(0.975, N - 1);
    size_t row = first + 1;
    for (; strcmp(tarry_table_text(table, row, 2), "active") == 0; row++) {
        const double time = hand_number(table, row, "time");
        const double survival = product_limit(dwells, N, N, time);
        ck_assert_double_eq_tol(hand_number(table, row, "survival"), survival, 1e-13);
        if (row < first + 3)
            continue; /* leaving one out can leave no ending: another rule (tally/jackknife.h) */
        double sum = 0;
        for (size_t i = 0; i < N; i++)
            sum += pow(log(-log(product_limit(dwells, N, i, time))) - log(-log(survival)), 2);
        const double s = sqrt(sum * (N - 1) / N), z = log(-log(survival));
        ck_assert_double_eq_tol(hand_number(table, row, "low"), exp(-exp(z + t * s)), 1e-11);
        ck_assert_double_eq_tol(hand_number(table, row, "high"), exp(-exp(z - t * s)), 1e-11);
    }
    ck_assert_uint_gt(row - first, 15);
    tarry_results_free(results);
}
END_TEST

/* A dwell x lies in its bin: start < x <= end, no bin wider than 1/32 of its start. */
START_TEST(test_grid) {
    const double longest = 1200;
    ck_assert_uint_eq(tarry_dwell_bin(0, longest), 0);
    ck_assert_uint_eq(tarry_dwell_bin(1e-300, longest), 0);
    ck_assert_uint_eq(tarry_dwell_bin(longest, longest), TARRY_DWELL_BINS - 1);
    ck_assert_uint_eq(tarry_dwell_bin(2 * longest, longest), TARRY_DWELL_BINS - 1);
    ck_assert_double_eq(tarry_dwell_bin_end(TARRY_DWELL_BINS - 1, longest), longest);
    ck_assert_double_eq(tarry_dwell_bin_end(0, longest), longest / 1048576);
    for (uint32_t bin = 1; bin < TARRY_DWELL_BINS; bin++) {
        const double start = tarry_dwell_bin_end(bin - 1, longest);
        const double end = tarry_dwell_bin_end(bin, longest);
        ck_assert_double_le((end - start) / start, 1.0 / 32 + 1e-12);
        ck_assert_uint_eq(tarry_dwell_bin(end, longest), bin);
        ck_assert_uint_eq(tarry_dwell_bin((start + end) / 2, longest), bin);
        ck_assert_uint_eq(tarry_dwell_bin(nextafter(start, end), longest), bin);
    }
}
END_TEST

/* Periods go to the window in which they start; one under way at time 0 is in none. */
START_TEST(test_windows) {
    hand h;
    tarry_record record;
    one_gene(&h, 32);
    hand_windows(&h, (const double[]){0, 16, 32}, 2);
    hand_record(&h, &record, 0);
    record.status[0] = TARRY_TRACK_OPEN;
    hand_mark(&record, 2, 0, false, 0);
    hand_mark(&record, 6, 0, true, 0);
    hand_mark(&record, 14, 0, false, 0);
    hand_mark(&record, 16, 0, true, 0);
    hand_mark(&record, 48, 0, false, 0);
    record.end = 64;
    tarry_results *results = hand_results(&h, &tarry_tally_dwells, &record, 1);
    const tarry_table *table = tarry_results_table(results, TARRY_TABLE_dwells);
    /* w1: active 8, inactive 4 and 2; w2: active 32. What starts at 48 is in no window. */
    ck_assert_uint_eq(tarry_table_n_rows(table), 2 + 3 + 2);
    const size_t active = hand_row(table, "vela", "w1", "active");
    ck_assert_double_eq(hand_number(table, active, "survival"), 1);
    ck_assert_double_eq(hand_number(table, active + 1, "time"), 8);
    ck_assert_double_eq(hand_number(table, active + 1, "survival"), 0);
    const size_t inactive = hand_row(table, "vela", "w1", "inactive");
    ck_assert_double_eq(hand_number(table, inactive + 1, "time"), 2);
    ck_assert_double_eq(hand_number(table, inactive + 1, "survival"), 0.5);
    ck_assert(isnan(hand_number(table, inactive + 1, "low"))); /* one cell: no interval */
    ck_assert_double_eq(hand_number(table, inactive + 2, "time"), 4);
    const size_t later = hand_row(table, "vela", "w2", "active");
    ck_assert_double_eq(hand_number(table, later + 1, "time"), 32);
    tarry_results_free(results);
    tarry_record_release(&record);
}
END_TEST

/* Nothing that begins, nothing recorded, nothing to tell: no rows. A named burst has its curve. */
START_TEST(test_left_out) {
    hand h;
    tarry_record record;
    hand_init(&h, 10, 32, 11);
    hand_gene(&h, "aster", 1, true); /* not recorded */
    hand_gene(&h, "vela", 1, true);  /* no periods */
    hand_gene(&h, "lyra", 1, false); /* cannot be told */
    hand_named(&h, "flash");
    hand_species(&h, "aster.transcript", 0);
    h.channels[0].recorded = false;
    hand_species(&h, "vela.transcript", 1);
    hand_species(&h, "lyra.transcript", 2);
    hand_record(&h, &record, 0);
    for (uint32_t track = 0; track < 4; track++)
        if (track != 1) {
            hand_mark(&record, 4, track, true, 0);
            hand_mark(&record, 8, track, false, 0);
        }
    record.end = 64;
    tarry_results *results = hand_results(&h, &tarry_tally_dwells, &record, 1);
    const tarry_table *table = tarry_results_table(results, TARRY_TABLE_dwells);
    ck_assert_uint_eq(tarry_table_n_rows(table), 3);
    ck_assert_str_eq(tarry_table_text(table, 0, 0), "flash");
    ck_assert_double_eq(hand_number(table, 1, "time"), 4);
    /* Its inactive period was cut off after 56 min, longer than any that ended. */
    ck_assert_str_eq(tarry_table_text(table, 2, 2), "inactive");
    ck_assert_double_eq(hand_number(table, 2, "survival"), 1);
    tarry_results_free(results);
    tarry_record_release(&record);
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"published", test_published}, {"nothing cut off", test_nothing_cut_off},
        {"cut off", test_cut_off},     {"grid", test_grid},
        {"windows", test_windows},     {"left out", test_left_out},
    };
    return run_tests("dwells", tests, sizeof tests / sizeof tests[0]);
}
