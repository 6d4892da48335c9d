/* SPDX-License-Identifier: GPL-3.0-or-later */

/* First responses of records written by hand: shares counted by hand, the interval of a share where
 * none or all respond by Wilson (1927, J. Am. Stat. Assoc. 22:209). */
#include "hand.h"
#include "support.h"
#include "tally/dwells.h"
#include "tally/kinds.h"

#include <math.h>
#include <stdlib.h>

/* Steps at 4 and 20 of a record of 36, frames every minute. */
static void two_steps(hand *h) {
    hand_init(h, 10, 36, 37);
    hand_gene(h, "vela", 1, true);
    hand_species(h, "vela.transcript", 0);
    hand_response(h, 4, 20);
    hand_response(h, 20, 36);
}

static void free_all(tarry_results *results, tarry_record *records, size_t n) {
    tarry_results_free(results);
    for (size_t i = 0; i < n; i++)
        tarry_record_release(&records[i]);
}

/* The survival that a curve has at a time at which a bin ends: that of its last row till then. */
static double survival_at(const tarry_table *table, const char *name, double step, double time) {
    double survival = NAN;
    for (size_t row = hand_row(table, name, NULL, NULL); row < tarry_table_n_rows(table); row++)
        if (strcmp(tarry_table_text(table, row, 0), name) == 0 &&
            hand_number(table, row, "step") == step && hand_number(table, row, "time") <= time)
            survival = hand_number(table, row, "survival");
    return survival;
}

/* Four cells: one at once, one at 2, one at the very end, one not at all. On this grid, of 16 in
 * halves and their 32nds, 2 and 16 end bins. */
START_TEST(test_shares) {
    static const double times[] = {0, 2, 16, NAN};
    hand h;
    tarry_record records[4];
    two_steps(&h);
    hand_first(&h, "vela initiation");
    hand_first(&h, "vela.transcript");
    for (size_t i = 0; i < 4; i++) {
        hand_record(&h, &records[i], (int64_t)i);
        for (size_t k = 0; k < 4; k++)
            records[i].firsts[k] = NAN;
        records[i].firsts[0 * 2 + 1] = times[i];      /* after the first step, the transcript */
        records[i].firsts[1 * 2 + 0] = 8 + (double)i; /* after the second, the initiation */
    }
    records[1].under_way[0 * 2 + 1] = 3;
    tarry_results *results = hand_results(&h, &tarry_tally_first, records, 4);
    const tarry_table *table = tarry_results_table(results, TARRY_TABLE_first);
    const char *name = "vela.transcript";
    ck_assert_double_eq(survival_at(table, name, 4, 0), 1);
    ck_assert_double_eq(survival_at(table, name, 4, 1.9), 0.75);
    ck_assert_double_eq(survival_at(table, name, 4, 2), 0.5);
    ck_assert_double_eq(survival_at(table, name, 4, 15.9), 0.5);
    ck_assert_double_eq(survival_at(table, name, 4, 16), 0.25);
    ck_assert_double_eq(survival_at(table, name, 20, 16), 1);
    name = "vela initiation";
    ck_assert_double_eq(survival_at(table, name, 4, 16), 1);
    ck_assert_double_eq(survival_at(table, name, 20, 7.75), 1);
    ck_assert_double_eq(survival_at(table, name, 20, 8), 0.75);
    ck_assert_double_eq(survival_at(table, name, 20, 11), 0);
    /* 0 and the end of 16 always, between them a row for each bin in which something came. */
    ck_assert_uint_eq(tarry_table_n_rows(table), 2 + (2 + 4) + (2 + 2) + 2);
    ck_assert(hand_noted(results, "in 25 % of the cells"));
    ck_assert(
        hand_noted(results, "the first vela.transcript were there already at the step at 4 "));
    ck_assert(hand_noted(results, "for 1 of the 4 first responses"));
    free_all(results, records, 4);
}
END_TEST

/* None and all of ten cells: bounds by Wilson with z = 1.959964, z^2/(n + z^2) and its rest. */
START_TEST(test_borders) {
    const double z2 = 3.8414588;
    hand h;
    tarry_record records[10];
    two_steps(&h);
    hand_first(&h, "vela initiation");
    for (size_t i = 0; i < 10; i++) {
        hand_record(&h, &records[i], (int64_t)i);
        records[i].firsts[0] = NAN;
        records[i].firsts[1] = 1 + (double)i;
    }
    tarry_results *results = hand_results(&h, &tarry_tally_first, records, 10);
    const tarry_table *table = tarry_results_table(results, TARRY_TABLE_first);
    ck_assert_double_eq(hand_number(table, 1, "time"), 16);
    ck_assert_double_eq(hand_number(table, 1, "survival"), 1);
    ck_assert_double_eq_tol(hand_number(table, 1, "low"), 10 / (10 + z2), 1e-7);
    ck_assert_double_eq(hand_number(table, 1, "high"), 1);
    const size_t last = tarry_table_n_rows(table) - 1;
    ck_assert_double_eq(hand_number(table, last, "step"), 20);
    ck_assert_double_eq(hand_number(table, last, "time"), 16);
    ck_assert_double_eq(hand_number(table, last, "survival"), 0);
    ck_assert_double_eq(hand_number(table, last, "low"), 0);
    ck_assert_double_eq_tol(hand_number(table, last, "high"), z2 / (10 + z2), 1e-7);
    ck_assert(!hand_noted(results, "first transcripts"));
    free_all(results, records, 10);
}
END_TEST

/* A signal: the frame at the step counts, that at the next step is the next one's, that at `until`
 * counts; the level itself is not above it. */
START_TEST(test_signal) {
    hand h;
    tarry_record records[4];
    two_steps(&h);
    hand_signal(&h, "dim", 0, 0);
    hand_signal(&h, "spot", 0, 0);
    h.signals[1].responds_above = 5;
    for (size_t i = 0; i < 4; i++)
        hand_record(&h, &records[i], (int64_t)i);
    const size_t row = 2 * 37; /* after the transcript and the dim one */
    records[0].frames[row + 3] = 9;
    records[0].frames[row + 4] = 5.1;
    records[1].frames[row + 6] = 5;
    records[1].frames[row + 8] = 6;
    records[1].frames[row + 9] = 6;
    records[2].frames[row + 20] = 7;
    records[3].frames[row + 36] = 7;
    tarry_results *results = hand_results(&h, &tarry_tally_first, records, 4);
    const tarry_table *table = tarry_results_table(results, TARRY_TABLE_first);
    ck_assert_double_eq(survival_at(table, "spot", 4, 1), 0.75);
    ck_assert_double_eq(survival_at(table, "spot", 4, 3.9), 0.75);
    ck_assert_double_eq(survival_at(table, "spot", 4, 4), 0.5);
    ck_assert_double_eq(survival_at(table, "spot", 4, 16), 0.5);
    ck_assert_double_eq(survival_at(table, "spot", 20, 0.1), 0.75);
    ck_assert_double_eq(survival_at(table, "spot", 20, 15.9), 0.75);
    ck_assert_double_eq(survival_at(table, "spot", 20, 16), 0.5);
    for (size_t i = 0; i < tarry_table_n_rows(table); i++)
        ck_assert_str_eq(tarry_table_text(table, i, 0), "spot");
    free_all(results, records, 4);
}
END_TEST

/* No protocol, or a signal that is not recorded: nothing. */
START_TEST(test_left_out) {
    hand h;
    tarry_record record;
    hand_init(&h, 10, 36, 37);
    hand_signal(&h, "spot", 0, 0);
    h.signals[0].responds_above = -1;
    hand_record(&h, &record, 0);
    tarry_results *results = hand_results(&h, &tarry_tally_first, &record, 1);
    ck_assert_uint_eq(tarry_table_n_rows(tarry_results_table(results, TARRY_TABLE_first)), 0);
    free_all(results, &record, 1);
    two_steps(&h);
    hand_signal(&h, "spot", 0, 0);
    h.signals[0].responds_above = -1;
    h.channels[1].recorded = false;
    hand_record(&h, &record, 0);
    results = hand_results(&h, &tarry_tally_first, &record, 1);
    ck_assert_uint_eq(tarry_table_n_rows(tarry_results_table(results, TARRY_TABLE_first)), 0);
    free_all(results, &record, 1);
}
END_TEST

int main(void) {
    const test_entry tests[] = {{"shares", test_shares},
                                {"borders", test_borders},
                                {"signal", test_signal},
                                {"left out", test_left_out}};
    return run_tests("first", tests, sizeof tests / sizeof tests[0]);
}
