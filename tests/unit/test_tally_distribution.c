/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Distributions against counts by hand and GSL's histograms, lags and drift against GSL's
 * statistics and Student's law. */
#include "base/table.h"
#include "hand.h"
#include "support.h"
#include "tally/kinds.h"

#include <gsl/gsl_cdf.h>
#include <gsl/gsl_histogram.h>
#include <gsl/gsl_randist.h>
#include <gsl/gsl_rng.h>
#include <gsl/gsl_statistics_double.h>
#include <math.h>
#include <stdio.h>
#include <string.h>

enum { MOST_CELLS = 200, N_FRAMES = 4 };

static void assert_within(double found, double expected, double limit) {
    ck_assert_msg(fabs(found - expected) <= limit, "%.17g is not %.17g", found, expected);
}

static void records_init(const hand *h, tarry_record *records, size_t n) {
    for (size_t c = 0; c < n; c++)
        hand_record(h, &records[c], (int64_t)c);
}

static void records_release(tarry_record *records, size_t n) {
    for (size_t c = 0; c < n; c++)
        tarry_record_release(&records[c]);
}

/* A transcript counted and a signal seen. */
static void names_init(hand *h) {
    hand_init(h, 0, 6, N_FRAMES);
    const uint32_t gene = hand_gene(h, "vela", 1, true);
    hand_species(h, "vela.transcript", (int32_t)gene);
    hand_signal(h, "spot", 0.5, 0.25);
}

/* ---- distributions --------------------------------------------------------------------------- */

/* Row of a name with this count, pooled over `window` or ("") at the snapshot. */
static size_t bin_row(const tarry_table *table, const char *name, const char *window,
                      double count) {
    for (size_t row = 0; row < tarry_table_n_rows(table); row++)
        if (strcmp(tarry_table_text(table, row, 0), name) == 0 &&
            strcmp(tarry_table_text(table, row, 1), window) == 0 &&
            hand_number(table, row, "count") == count)
            return row;
    ck_abort_msg("no row of %s in '%s' with count %g", name, window, count);
}

/* The share of `value` and its interval by leaving out each group, on the logit scale. */
static void assert_share(const tarry_table *table, size_t row, const double values[][N_FRAMES],
                         size_t n_cells, size_t n_frames, double value) {
    double counts[64] = {0}, totals[64] = {0}, count = 0, total = 0, sum = 0;
    for (size_t c = 0; c < n_cells; c++)
        for (size_t i = 0; i < n_frames; i++) {
            counts[c % 64] += values[c][i] == value;
            totals[c % 64] += 1;
            count += values[c][i] == value;
            total += 1;
        }
    const double z = log(count / (total - count));
    for (int g = 0; g < 64; g++) {
        const double k = count - counts[g], n = total - totals[g];
        sum += pow(log(k / (n - k)) - z, 2);
    }
    const double half = gsl_cdf_tdist_Pinv(0.975, 63) * sqrt(63.0 / 64.0 * sum);
    assert_within(hand_number(table, row, "probability"), count / total, 1e-15);
    assert_within(hand_number(table, row, "low"), 1 / (1 + exp(half - z)), 1e-12);
    assert_within(hand_number(table, row, "high"), 1 / (1 + exp(-half - z)), 1e-12);
    ck_assert_double_eq(hand_number(table, row, "width"), 1);
}

START_TEST(counts_by_hand) {
    static tarry_record records[MOST_CELLS];
    static double frames[MOST_CELLS][N_FRAMES], snapshots[MOST_CELLS][N_FRAMES];
    hand h;
    names_init(&h);
    records_init(&h, records, MOST_CELLS);
    gsl_rng *rng = gsl_rng_alloc(gsl_rng_mt19937);
    gsl_rng_set(rng, 1);
    for (size_t c = 0; c < MOST_CELLS; c++) {
        const unsigned own = gsl_ran_poisson(rng, 2);
        for (size_t i = 0; i < N_FRAMES; i++)
            frames[c][i] = records[c].frames[i] = own + gsl_ran_poisson(rng, 1);
        snapshots[c][0] = records[c].snapshots[0] = gsl_ran_poisson(rng, 2);
    }
    gsl_rng_free(rng);
    tarry_results *results = hand_results(&h, &tarry_tally_distribution, records, MOST_CELLS);
    const tarry_table *table = tarry_results_table(results, TARRY_TABLE_distribution);
    const char *name = "vela.transcript";
    for (double value = 0; value < 5; value++) {
        const size_t row = bin_row(table, name, "all", value);
        assert_share(table, row, frames, MOST_CELLS, N_FRAMES, value);
        ck_assert(isnan(hand_number(table, row, "time")));
        assert_share(table, bin_row(table, name, "", value), snapshots, MOST_CELLS, 1, value);
        ck_assert_double_eq(hand_number(table, bin_row(table, name, "", value), "time"), 6);
    }
    double sum = 0;
    for (size_t row = 0; row < tarry_table_n_rows(table); row++) {
        ck_assert_double_gt(hand_number(table, row, "probability"), 0);
        if (strcmp(tarry_table_text(table, row, 0), name) == 0)
            sum += hand_number(table, row, "probability");
    }
    assert_within(sum, 2, 1e-12); /* snapshot and window */
    tarry_results_free(results);
    records_release(records, MOST_CELLS);
}
END_TEST

/* Past 1,024 bins are 1/64 of an octave wide: 5,000 falls into [4992, 5056), by hand 4096 + 14
 * x 64. All cells there: Wilson on the number of cells, though there are more frames. */
START_TEST(large_counts_share_bins) {
    tarry_record records[20];
    hand h;
    names_init(&h);
    records_init(&h, records, 20);
    for (size_t c = 0; c < 20; c++)
        for (size_t i = 0; i < N_FRAMES; i++)
            records[c].frames[i] = c == 0 && i == 0 ? 4992 : c == 1 ? 5055 : 5000;
    tarry_results *results = hand_results(&h, &tarry_tally_distribution, records, 20);
    const tarry_table *table = tarry_results_table(results, TARRY_TABLE_distribution);
    const size_t row = bin_row(table, "vela.transcript", "all", 4992);
    ck_assert_double_eq(hand_number(table, row, "width"), 64);
    ck_assert_double_eq(hand_number(table, row, "probability"), 1);
    /* Newcombe (1998), Stat. Med. 17:857: 0 of 20 has 0 .. 0.1611 (from memory); mirrored */
    assert_within(hand_number(table, row, "low"), 1 - 0.1611, 5.1e-5);
    ck_assert_double_eq(hand_number(table, row, "high"), 1);
    tarry_results_free(results);
    records_release(records, 20);
}
END_TEST

/* Signals of cells that differ much, so that groups end with bins of different widths. */
START_TEST(signals_against_a_histogram) {
    static tarry_record records[MOST_CELLS];
    static double values[MOST_CELLS * N_FRAMES];
    hand h;
    names_init(&h);
    records_init(&h, records, MOST_CELLS);
    gsl_rng *rng = gsl_rng_alloc(gsl_rng_mt19937);
    gsl_rng_set(rng, 1);
    for (size_t c = 0; c < MOST_CELLS; c++)
        for (size_t i = 0; i < N_FRAMES; i++) {
            const double bright = c % 64 == 40 ? 10 : 0;
            const double value = 0.5 + bright + gsl_ran_gaussian(rng, 0.25);
            values[c * N_FRAMES + i] = records[c].frames[N_FRAMES + i] = value;
        }
    gsl_rng_free(rng);
    tarry_results *results = hand_results(&h, &tarry_tally_distribution, records, MOST_CELLS);
    const tarry_table *table = tarry_results_table(results, TARRY_TABLE_distribution);
    size_t n = 0;
    double all = 0;
    for (size_t row = 0; row < tarry_table_n_rows(table); row++) {
        if (strcmp(tarry_table_text(table, row, 0), "spot") != 0 ||
            strcmp(tarry_table_text(table, row, 1), "all") != 0)
            continue;
        const double centre = hand_number(table, row, "count");
        const double width = hand_number(table, row, "width");
        ck_assert_double_eq(width, 0.125); /* 11.5 or so in at most 128 bins: 92 of them */
        ck_assert_double_gt(hand_number(table, row, "probability"), 0);
        gsl_histogram *histogram = gsl_histogram_alloc(1);
        gsl_histogram_set_ranges_uniform(histogram, centre - width / 2, centre + width / 2);
        for (size_t i = 0; i < MOST_CELLS * N_FRAMES; i++)
            gsl_histogram_increment(histogram, values[i]);
        assert_within(hand_number(table, row, "probability"),
                      gsl_histogram_get(histogram, 0) / (MOST_CELLS * N_FRAMES), 1e-15);
        gsl_histogram_free(histogram);
        all += hand_number(table, row, "probability");
        n++;
    }
    ck_assert_uint_le(n, 128);
    assert_within(all, 1, 1e-12);
    tarry_results_free(results);
    records_release(records, MOST_CELLS);
}
END_TEST

START_TEST(windows_hold_their_frames) {
    tarry_record records[5];
    hand h;
    names_init(&h);
    hand_windows(&h, (const double[]){0, 3, 6}, 2); /* frames 0, 1 and 2, 3 */
    records_init(&h, records, 5);
    for (size_t c = 0; c < 5; c++)
        for (size_t i = 0; i < N_FRAMES; i++)
            records[c].frames[i] = 10 * (double)i;
    tarry_results *results = hand_results(&h, &tarry_tally_distribution, records, 5);
    const tarry_table *table = tarry_results_table(results, TARRY_TABLE_distribution);
    for (size_t i = 0; i < N_FRAMES; i++) {
        const size_t row = bin_row(table, "vela.transcript", i < 2 ? "w1" : "w2", 10 * (double)i);
        ck_assert_double_eq(hand_number(table, row, "probability"), 0.5);
    }
    tarry_results_free(results);
    records_release(records, 5);
}
END_TEST

START_TEST(not_recorded_is_left_out) {
    tarry_record records[3];
    hand h;
    names_init(&h);
    h.channels[0].recorded = false;
    records_init(&h, records, 3);
    for (size_t c = 0; c < 3; c++)
        for (size_t i = 0; i < N_FRAMES; i++)
            records[c].frames[i] = -3; /* the signal's now */
    tarry_results *results = hand_results(&h, &tarry_tally_distribution, records, 3);
    const tarry_table *table = tarry_results_table(results, TARRY_TABLE_distribution);
    ck_assert_uint_eq(tarry_table_n_rows(table), 2);
    const size_t row = 1; /* after the snapshot */
    ck_assert_str_eq(tarry_table_text(table, row, 0), "spot");
    const double from = hand_number(table, row, "count") - hand_number(table, row, "width") / 2;
    ck_assert(from <= -3 && -3 < from + hand_number(table, row, "width"));
    tarry_results_free(results);
    records_release(records, 3);
}
END_TEST

/* ---- under way ------------------------------------------------------------------------------- */

enum { N_LENGTHS = 6, STAGE = 0, DWELL_A = 1, DWELL_B = 2, N_LAGS = 3 };

static void lag_add(tarry_record *record, uint32_t n_spans, uint32_t lag, uint32_t span,
                    double length) {
    tarry_lag_sums *sums = &record->lags[lag * n_spans + span];
    sums->drawn += 1;
    sums->sum += length;
    sums->squares += length * length;
}

START_TEST(lags_against_gsl) {
    const double lengths[2][N_LENGTHS] = {{3, 4.5, 2, 8, 3.25, 1}, {30, 7, 7, 12.5, 1, 2}};
    const tarry_lag lags[N_LAGS] = {
        {.name = "vela.nascent", .delay_name = "elongation", .promoter = TARRY_NONE, .gene = 0},
        {.name = "vela.shut", .delay_name = "rest", .promoter = 0, .gene = 0},
        {.name = "vela.shut", .delay_name = "rest", .promoter = 1, .gene = 0}};
    tarry_record records[2];
    hand h;
    hand_init(&h, 0, 10, 2);
    hand_gene(&h, "vela", 2, true);
    hand_windows(&h, (const double[]){0, 4, 10}, 2);
    h.windows[2] = h.windows[1];
    h.windows[2].name = "all";
    h.windows[2].from = 0;
    h.windows[2].spans.from = 0;
    h.network.run.n_windows = 3;
    h.network.lags = lags;
    h.network.n_lags = N_LAGS;
    records_init(&h, records, 2);
    for (size_t i = 0; i < N_LENGTHS; i++)
        for (uint32_t span = 0; span < 2; span++) {
            lag_add(&records[i % 2], 2, STAGE, span, lengths[span][i]);
            lag_add(&records[i % 2], 2, i < 2 ? DWELL_A : DWELL_B, span, lengths[span][i]);
        }
    records[0].lags[0].pending = 12; /* the first span is 4 long: 12 of 2 x 4 */
    records[1].lags[1].pending = 24; /* the second 6: 24 of 2 x 6 */
    records[1].lags[1].lost = 3;
    tarry_results *results = hand_results(&h, &tarry_tally_transit, records, 2);
    const tarry_table *table = tarry_results_table(results, TARRY_TABLE_transit);
    ck_assert_uint_eq(tarry_table_n_rows(table), 6); /* the alleles' dwells are one */
    size_t row = hand_row(table, "vela.nascent", "elongation", "w1");
    ck_assert_double_eq(hand_number(table, row, "mean_pending"), 1.5);
    ck_assert_double_eq(hand_number(table, row, "drawn"), N_LENGTHS);
    assert_within(hand_number(table, row, "mean_drawn"), gsl_stats_mean(lengths[0], 1, N_LENGTHS),
                  1e-14);
    assert_within(hand_number(table, row, "sd_drawn"), gsl_stats_sd(lengths[0], 1, N_LENGTHS),
                  1e-13);
    ck_assert_double_eq(hand_number(table, row, "lost"), 0);
    row = hand_row(table, "vela.nascent", "elongation", "w2");
    ck_assert_double_eq(hand_number(table, row, "mean_pending"), 2);
    row = hand_row(table, "vela.nascent", "elongation", "all");
    ck_assert_double_eq(hand_number(table, row, "mean_pending"), 1.8);
    ck_assert_double_eq(hand_number(table, row, "lost"), 3);
    for (int i = 0; i < 2; i++) {
        row = hand_row(table, i ? "vela.shut" : "vela.nascent", i ? "rest" : "elongation", "all");
        ck_assert_double_eq(hand_number(table, row, "drawn"), 2 * N_LENGTHS);
        assert_within(hand_number(table, row, "mean_drawn"),
                      gsl_stats_mean(lengths[0], 1, 2 * N_LENGTHS), 1e-14);
        assert_within(hand_number(table, row, "sd_drawn"),
                      gsl_stats_sd(lengths[0], 1, 2 * N_LENGTHS), 1e-12);
    }
    tarry_results_free(results);
    records_release(records, 2);
}
END_TEST

/* None drawn, one drawn, and a fixed length that sums of squares cannot tell from a spread of 1e-9.
 */
START_TEST(lags_at_the_edges) {
    const tarry_lag lags[3] = {
        {.name = "none", .delay_name = "d", .promoter = TARRY_NONE, .gene = TARRY_NONE},
        {.name = "one", .delay_name = "d", .promoter = TARRY_NONE, .gene = TARRY_NONE},
        {.name = "fixed", .delay_name = "d", .promoter = TARRY_NONE, .gene = TARRY_NONE}};
    tarry_record record;
    hand h;
    hand_init(&h, 0, 10, 2);
    h.network.lags = lags;
    h.network.n_lags = 3;
    records_init(&h, &record, 1);
    lag_add(&record, 1, 1, 0, 2.5);
    for (int i = 0; i < 1000; i++)
        lag_add(&record, 1, 2, 0, 0.1);
    tarry_results *results = hand_results(&h, &tarry_tally_transit, &record, 1);
    const tarry_table *table = tarry_results_table(results, TARRY_TABLE_transit);
    ck_assert(hand_number(table, 0, "drawn") == 0 && isnan(hand_number(table, 0, "mean_drawn")));
    ck_assert(isnan(hand_number(table, 0, "sd_drawn")));
    ck_assert(hand_number(table, 0, "mean_pending") == 0 && hand_number(table, 0, "lost") == 0);
    ck_assert(hand_number(table, 1, "mean_drawn") == 2.5 &&
              isnan(hand_number(table, 1, "sd_drawn")));
    assert_within(hand_number(table, 2, "mean_drawn"), 0.1, 1e-14);
    ck_assert_double_eq(hand_number(table, 2, "sd_drawn"), 0);
    tarry_results_free(results);
    records_release(&record, 1);
}
END_TEST

/* ---- drift ----------------------------------------------------------------------------------- */

/* Two cells whose halves differ by d +- s have t = d / s with 1 degree of freedom; so a product can
 * be given any p-value. */
static void give_p(tarry_record records[2], size_t channel, double p) {
    const double t = gsl_cdf_tdist_Qinv(p / 2, 1);
    for (int c = 0; c < 2; c++)
        for (size_t i = 0; i < N_FRAMES; i++)
            records[c].frames[channel * N_FRAMES + i] =
                50 + (i >= N_FRAMES / 2 ? (c == 0 ? t + 1 : t - 1) : 0) + (i % 2 ? 3 : -3);
}

static tarry_results *drift_results(hand *h, double p1, double p2) {
    tarry_record records[2];
    hand_init(h, 0, 6, N_FRAMES);
    const uint32_t gene = hand_gene(h, "vela", 1, true);
    hand_species(h, "vela.transcript", (int32_t)gene);
    if (p2 > 0)
        hand_species(h, "vela.protein", (int32_t)gene);
    hand_species(h, "plain", TARRY_NONE);
    records_init(h, records, 2);
    give_p(records, p2 > 0 ? 2 : 1, 1e-9); /* no product: not judged */
    give_p(records, 0, p1);
    if (p2 > 0)
        give_p(records, 1, p2);
    tarry_results *results = hand_results(h, &tarry_tally_drift, records, 2);
    records_release(records, 2);
    return results;
}

static void assert_drift(double p1, double p2, bool first, bool second) {
    hand h;
    tarry_results *results = drift_results(&h, p1, p2);
    ck_assert_int_eq(hand_noted(results, "vela.transcript drifts in window all"), first);
    ck_assert_int_eq(hand_noted(results, "vela.protein drifts in window all"), second);
    ck_assert_uint_eq(tarry_results_n_warnings(results), (size_t)first + (size_t)second);
    tarry_results_free(results);
}

START_TEST(drift_is_judged_by_holm) {
    assert_drift(0.9e-3, 0, true, false);
    assert_drift(1.1e-3, 0, false, false);
    assert_drift(0.9e-3, 0.9e-3, false, false); /* 2 x 0.9e-3 is above the level */
    assert_drift(0.9e-3, 0.4e-3, true, true);   /* 2 x 0.4e-3 is below, then 1 x 0.9e-3 */
    assert_drift(1.1e-3, 0.4e-3, false, true);
}
END_TEST

START_TEST(drift_tells_its_numbers) {
    hand h;
    tarry_results *results = drift_results(&h, 0.5e-3, 0);
    const char *note = tarry_results_warning(results, 0);
    /* t = 1273 with 1 degree of freedom (handbooks have 1273.2 for 0.0005 two-sided) */
    ck_assert_msg(strstr(note, "mean is 50 in the first half and 1320 in the second"), "%s", note);
    ck_assert_msg(strstr(note, "p = 0.0005 after Holm"), "%s", note);
    tarry_results_free(results);
}
END_TEST

/* No spread at all: a mean that moves is drift, one that stands is none; one cell cannot tell. */
START_TEST(drift_without_spread) {
    tarry_record records[3];
    hand h;
    hand_init(&h, 0, 6, N_FRAMES);
    hand_species(&h, "vela.transcript", (int32_t)hand_gene(&h, "vela", 1, true));
    records_init(&h, records, 3);
    tarry_results *results = hand_results(&h, &tarry_tally_drift, records, 3);
    ck_assert_uint_eq(tarry_results_n_warnings(results), 0);
    tarry_results_free(results);
    for (int c = 0; c < 3; c++)
        records[c].frames[N_FRAMES - 1] = 1e9;
    results = hand_results(&h, &tarry_tally_drift, records, 3);
    ck_assert(hand_noted(results, "mean is 0 in the first half and 500000000 in the second"));
    ck_assert(hand_noted(results, "p < 1e-12"));
    tarry_results_free(results);
    results = hand_results(&h, &tarry_tally_drift, records, 1);
    ck_assert_uint_eq(tarry_results_n_warnings(results), 0);
    tarry_results_free(results);
    records_release(records, 3);
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"counts by hand", counts_by_hand},
        {"large counts share bins", large_counts_share_bins},
        {"signals against a histogram", signals_against_a_histogram},
        {"windows hold their frames", windows_hold_their_frames},
        {"not recorded is left out", not_recorded_is_left_out},
        {"lags against GSL", lags_against_gsl},
        {"lags at the edges", lags_at_the_edges},
        {"drift is judged by Holm", drift_is_judged_by_holm},
        {"drift tells its numbers", drift_tells_its_numbers},
        {"drift without spread", drift_without_spread},
    };
    return run_tests("distribution, lags, drift", tests, sizeof tests / sizeof tests[0]);
}
