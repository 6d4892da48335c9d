/* SPDX-License-Identifier: GPL-3.0-or-later */

/* The generic part of the estimators: jackknife, shares, bins, blocks, sets. Expected values are
 * worked out from GSL's statistics, quantiles and histograms, or written out in full; those of
 * Wilson's interval are printed in Newcombe (1998), Stat. Med. 17:857, table I, method 3 (from
 * memory). */
#include "base/error.h"
#include "base/table.h"
#include "faults.h"
#include "hand.h"
#include "support.h"
#include "tally/bins.h"
#include "tally/blocks.h"
#include "tally/jackknife.h"
#include "tally/kinds.h"
#include "tally/real_bins.h"
#include "tally/tally.h"

#include <gsl/gsl_cdf.h>
#include <gsl/gsl_histogram.h>
#include <gsl/gsl_randist.h>
#include <gsl/gsl_rng.h>
#include <gsl/gsl_statistics_double.h>
#include <math.h>
#include <stdint.h>
#include <stdlib.h>
#include <string.h>

enum { N = 20 };

static void assert_near(double found, double expected, double relative) {
    ck_assert_msg(fabs(found - expected) <= relative * fabs(expected), "%.17g is not %.17g", found,
                  expected);
}

static void assert_none(tarry_estimate e) {
    ck_assert(isnan(e.low) && isnan(e.high));
}

/* Positive values of a skewed law and their delete-one means. */
static void make_values(double values[N], double replicates[N]) {
    gsl_rng *rng = gsl_rng_alloc(gsl_rng_mt19937);
    gsl_rng_set(rng, 1);
    for (int i = 0; i < N; i++)
        values[i] = gsl_ran_gamma(rng, 2.0, 0.05);
    gsl_rng_free(rng);
    for (int i = 0; i < N; i++) {
        double rest[N - 1];
        for (int j = 0; j < N - 1; j++)
            rest[j] = values[j < i ? j : j + 1];
        replicates[i] = gsl_stats_mean(rest, 1, N - 1);
    }
}

/* ---- jackknife ------------------------------------------------------------------------------- */

START_TEST(mean_has_textbook_error) {
    double values[N], replicates[N];
    make_values(values, replicates);
    const tarry_jackknife jackknife = tarry_jackknife_of(N);
    const double mean = gsl_stats_mean(values, 1, N), se = gsl_stats_sd(values, 1, N) / sqrt(N);
    const tarry_estimate e = tarry_jackknife_estimate(&jackknife, mean, replicates,
                                                      TARRY_SCALE_PLAIN);
    ck_assert_double_eq(e.value, mean);
    assert_near(e.se, se, 1e-12);
    /* Student's t at 0.975 with 19 degrees of freedom is 2.093 in every handbook. */
    ck_assert_double_eq_tol(jackknife.t, 2.093, 5e-4);
    assert_near(e.low, mean - jackknife.t * se, 1e-12);
    assert_near(e.high, mean + jackknife.t * se, 1e-12);
}
END_TEST

static double forth(tarry_scale scale, double x) {
    if (scale == TARRY_SCALE_LOG)
        return log(x);
    return scale == TARRY_SCALE_LOGIT ? log(x / (1.0 - x)) : log(-log(x));
}

static double back(tarry_scale scale, double z) {
    if (scale == TARRY_SCALE_LOG)
        return exp(z);
    return scale == TARRY_SCALE_LOGIT ? exp(z) / (1.0 + exp(z)) : exp(-exp(z));
}

/* The jackknife as it is defined, on each scale: z +- t sqrt((n - 1)/n sum (z_g - z)^2). */
START_TEST(scales_follow_the_definition) {
    double values[N], replicates[N];
    make_values(values, replicates);
    const tarry_jackknife jackknife = tarry_jackknife_of(N);
    const double value = gsl_stats_mean(values, 1, N), t = gsl_cdf_tdist_Pinv(0.975, N - 1);
    for (int s = TARRY_SCALE_LOG; s <= TARRY_SCALE_LOGLOG; s++) {
        const tarry_scale scale = (tarry_scale)s;
        double z[N];
        for (int i = 0; i < N; i++)
            z[i] = forth(scale, replicates[i]);
        /* variance_with_fixed_mean is the mean square about it */
        const double centre = forth(scale, value);
        const double spread = sqrt((N - 1) * gsl_stats_variance_with_fixed_mean(z, 1, N, centre));
        const double one = back(scale, centre - t * spread), two = back(scale, centre + t * spread);
        const tarry_estimate e = tarry_jackknife_estimate(&jackknife, value, replicates, scale);
        assert_near(e.low, fmin(one, two), 1e-12);
        assert_near(e.high, fmax(one, two), 1e-12);
        assert_near(e.se, gsl_stats_sd(values, 1, N) / sqrt(N), 1e-12);
    }
}
END_TEST

/* A ratio of sums over cells against delete-one written out. */
START_TEST(ratio_against_delete_one) {
    const double top[5] = {3, 0, 7, 2, 5}, bottom[5] = {1.5, 0.5, 2.0, 1.0, 4.0};
    const double ratio = 17.0 / 9.0;
    const double replicates[5] = {14.0 / 7.5, 17.0 / 8.5, 10.0 / 7.0, 15.0 / 8.0, 12.0 / 5.0};
    double sum = 0.0;
    for (int i = 0; i < 5; i++) {
        ck_assert_double_eq(replicates[i], (17.0 - top[i]) / (9.0 - bottom[i]));
        sum += pow(log(replicates[i] / ratio), 2);
    }
    const double t = 2.776445105197793; /* 4 degrees of freedom; handbooks have 2.776 */
    const tarry_jackknife jackknife = tarry_jackknife_of(5);
    const tarry_estimate e = tarry_jackknife_estimate(&jackknife, ratio, replicates,
                                                      TARRY_SCALE_LOG);
    assert_near(e.low, ratio * exp(-t * sqrt(0.8 * sum)), 1e-9);
    assert_near(e.high, ratio * exp(t * sqrt(0.8 * sum)), 1e-9);
}
END_TEST

START_TEST(no_interval_where_none_can_be) {
    const double same[3] = {0.5, 0.5, 0.5}, broken[3] = {0.5, NAN, 0.4};
    const double zeros[3] = {0, 0, 0}, beyond[3] = {0.5, 0.7, 0.0};
    const tarry_jackknife none = tarry_jackknife_of(0), one = tarry_jackknife_of(1);
    const tarry_jackknife three = tarry_jackknife_of(3);
    assert_none(tarry_jackknife_estimate(&none, 0.5, same, TARRY_SCALE_PLAIN));
    assert_none(tarry_jackknife_estimate(&one, 0.5, same, TARRY_SCALE_PLAIN));
    ck_assert(isnan(tarry_jackknife_se(&one, 0.5, same)));
    for (int s = TARRY_SCALE_PLAIN; s <= TARRY_SCALE_LOGLOG; s++) {
        const tarry_scale scale = (tarry_scale)s;
        assert_none(tarry_jackknife_estimate(&three, 0.5, broken, scale));
        assert_none(tarry_jackknife_estimate(&three, NAN, same, scale));
        tarry_estimate e = tarry_jackknife_estimate(&three, 0.5, same, scale);
        ck_assert(e.low == 0.5 && e.high == 0.5 && e.se == 0.0);
        e = tarry_jackknife_estimate(&three, 0.0, zeros, scale);
        ck_assert(e.value == 0.0 && (scale == TARRY_SCALE_PLAIN ? e.low == 0.0 : isnan(e.low)));
        ck_assert(isfinite(tarry_jackknife_estimate(&three, 0.4, beyond, scale).high));
    }
    for (double x = 0.01; x < 1.0; x += 0.01) { /* not a rounding off the value */
        const double like[3] = {x, x, x};
        for (int s = TARRY_SCALE_PLAIN; s <= TARRY_SCALE_LOGLOG; s++) {
            const tarry_estimate e = tarry_jackknife_estimate(&three, x, like, (tarry_scale)s);
            ck_assert(e.low == x && e.high == x);
        }
    }
    assert_none(tarry_jackknife_estimate(&three, 1.0, same, TARRY_SCALE_LOGIT));
    assert_none(tarry_jackknife_estimate(&three, 1.0, same, TARRY_SCALE_LOGLOG));
    assert_none(tarry_jackknife_estimate(&three, -0.5, same, TARRY_SCALE_LOG));
}
END_TEST

/* A replicate at the border: s = se |dz/dx|, the delta method. */
START_TEST(replicate_at_the_border) {
    const double replicates[3] = {0.5, 0.7, 0.0}, value = 0.4;
    const tarry_jackknife jackknife = tarry_jackknife_of(3);
    const double se = sqrt(2.0 / 3.0 * (0.01 + 0.09 + 0.16)), t = 4.302652729749464;
    tarry_estimate e = tarry_jackknife_estimate(&jackknife, value, replicates, TARRY_SCALE_LOG);
    assert_near(e.high, value * exp(t * se / value), 1e-9);
    e = tarry_jackknife_estimate(&jackknife, value, replicates, TARRY_SCALE_LOGIT);
    assert_near(e.high / (1 - e.high), value / 0.6 * exp(t * se / (value * 0.6)), 1e-9);
    e = tarry_jackknife_estimate(&jackknife, value, replicates, TARRY_SCALE_LOGLOG);
    assert_near(-log(e.low), -log(value) * exp(t * se / (-log(value) * value)), 1e-9);
}
END_TEST

/* ---- shares ---------------------------------------------------------------------------------- */

START_TEST(wilson_as_printed) {
    static const struct {
        double count, n, low, high;
    } rows[] = {{81, 263, 0.2553, 0.3662},
                {15, 148, 0.0624, 0.1605},
                {0, 20, 0.0000, 0.1611},
                {1, 29, 0.0061, 0.1718}};
    for (size_t i = 0; i < sizeof rows / sizeof rows[0]; i++) {
        const tarry_estimate e = tarry_wilson(rows[i].count / rows[i].n, rows[i].n);
        ck_assert_double_eq_tol(e.low, rows[i].low, 5.1e-5);
        ck_assert_double_eq_tol(e.high, rows[i].high, 5.1e-5);
    }
    const tarry_estimate full = tarry_wilson(1.0, 20.0); /* the mirror of none */
    ck_assert_double_eq_tol(full.low, 1.0 - 0.1611, 5.1e-5);
    ck_assert_double_eq(full.high, 1.0);
    assert_none(tarry_wilson(0.5, 0.0));
    assert_none(tarry_wilson(NAN, 10.0));
}
END_TEST

START_TEST(share_by_jackknife_or_wilson) {
    const tarry_jackknife four = tarry_jackknife_of(4);
    const double totals[4] = {10, 10, 10, 20}, none[4] = {0}, some[4] = {1, 0, 3, 2};
    const double lone[4] = {0, 2, 0, 0}, but_lone[4] = {10, 8, 10, 20};
    const double replicates[4] = {5.0 / 40, 6.0 / 40, 3.0 / 40, 4.0 / 30};
    tarry_estimate e = tarry_jackknife_share(&four, some, totals, 50), w;
    w = tarry_jackknife_estimate(&four, 0.12, replicates, TARRY_SCALE_LOGIT);
    assert_near(e.value, 0.12, 1e-15);
    assert_near(e.low, w.low, 1e-12);
    assert_near(e.high, w.high, 1e-12);

    e = tarry_jackknife_share(&four, none, totals, 20);
    ck_assert(e.value == 0.0 && e.low == 0.0);
    ck_assert_double_eq_tol(e.high, 0.1611, 5.1e-5);
    e = tarry_jackknife_share(&four, totals, totals, 20);
    ck_assert(e.value == 1.0 && e.high == 1.0);
    ck_assert_double_eq_tol(e.low, 1.0 - 0.1611, 5.1e-5);

    /* 2 of 50, both in one group: se^2 = 3/4 (3 (2/40 or 2/30 - 0.04)^2 + 0.04^2) by hand. */
    const double se2 = 0.75 * (2 * 0.01 * 0.01 + 0.04 * 0.04 + pow(2.0 / 30 - 0.04, 2));
    e = tarry_jackknife_share(&four, lone, totals, 50);
    w = tarry_wilson(0.04, 0.04 * 0.96 / se2);
    assert_near(e.se, sqrt(se2), 1e-12);
    assert_near(e.low, w.low, 1e-12);
    assert_near(e.high, w.high, 1e-12);
    const tarry_estimate mirror = tarry_jackknife_share(&four, but_lone, totals, 50);
    assert_near(mirror.low, 1.0 - e.high, 1e-12);
    assert_near(mirror.high, 1.0 - e.low, 1e-12);

    const tarry_jackknife one = tarry_jackknife_of(1);
    assert_none(tarry_jackknife_share(&one, lone, totals, 10));
    ck_assert(isnan(tarry_jackknife_share(&four, none, none, 50).value));
}
END_TEST

/* ---- bins and blocks ------------------------------------------------------------------------- */

START_TEST(count_bins_tile_all_counts) {
    double next = 0.0;
    for (uint32_t bin = 0; bin < TARRY_BINS; bin++) {
        const double start = tarry_bin_start(bin), width = tarry_bin_width(bin);
        ck_assert_double_eq(start, next);
        ck_assert_uint_eq(tarry_bin_of(start), bin);
        ck_assert_uint_eq(tarry_bin_of(start + width - 1.0), bin);
        ck_assert(start < 1024.0 ? width == 1.0 : width * 64.0 <= start);
        next = start + width;
    }
    ck_assert_double_eq(next, 0x1p53);
    ck_assert_double_eq(tarry_bin_width(tarry_bin_of(1024)), 16.0); /* 64 an octave */
    ck_assert_uint_eq(tarry_bin_of(1e300), TARRY_BINS - 1);
}
END_TEST

START_TEST(blocks_take_memory_on_use) {
    tarry_blocks one, other;
    ck_assert_int_eq(tarry_blocks_init(&one, 10), 0);
    ck_assert_int_eq(tarry_blocks_init(&other, 10), 0);
    *tarry_blocks_at(&one, 3) += 1.0;
    *tarry_blocks_at(&one, 3) += 1.0;
    *tarry_blocks_at(&other, 3) += 5.0;
    *tarry_blocks_at(&other, 639) += 7.0;
    ck_assert_uint_eq(one.n_taken, 1);
    ck_assert_int_eq(tarry_blocks_merge(&one, &other), 0);
    ck_assert_uint_eq(one.n_taken, 2);
    ck_assert_double_eq(tarry_blocks_get(&one, 3), 7.0);
    ck_assert_double_eq(tarry_blocks_get(&one, 639), 7.0);
    ck_assert_double_eq(tarry_blocks_get(&one, 300), 0.0);
    ck_assert_double_eq(tarry_blocks_get(&other, 3), 5.0);
    tarry_blocks_release(&one);
    tarry_blocks_release(&other);
    tarry_blocks_release(&other);
}
END_TEST

enum { N_REALS = 5000 };

typedef struct reals {
    tarry_real_bins_form form;
    double bins[TARRY_REAL_BINS];
} reals;

static reals count_reals(const double *values, int n, int step, int from) {
    reals r = {0};
    for (int i = 0; i < n; i++)
        tarry_real_bins_add(&r.form, r.bins, 0x1p-30, values[(from + i * step + n) % n]);
    return r;
}

static void assert_same_reals(const reals *one, const reals *other) {
    ck_assert(one->form.width == other->form.width && one->form.lowest == other->form.lowest &&
              one->form.highest == other->form.highest);
    ck_assert(memcmp(one->bins, other->bins, sizeof one->bins) == 0);
}

/* Against GSL's histogram of the same bins; whatever the order and however merged. */
START_TEST(real_bins_hold_all_values) {
    static double values[N_REALS];
    gsl_rng *rng = gsl_rng_alloc(gsl_rng_mt19937);
    gsl_rng_set(rng, 1);
    for (int i = 0; i < N_REALS; i++)
        values[i] = gsl_ran_gaussian(rng, 0.3) + (i % 10 == 0 ? gsl_ran_exponential(rng, 20) : 0);
    gsl_rng_free(rng);
    reals all = count_reals(values, N_REALS, 1, 0);
    const double width = all.form.width;
    ck_assert_double_eq(all.form.lowest, floor(gsl_stats_min(values, 1, N_REALS) / width));
    ck_assert_double_eq(all.form.highest, floor(gsl_stats_max(values, 1, N_REALS) / width));
    const int n = (int)(all.form.highest - all.form.lowest) + 1;
    ck_assert_int_le(n, TARRY_REAL_BINS);
    ck_assert_int_gt(n, TARRY_REAL_BINS / 2 - 1); /* no wider than needed */
    gsl_histogram *histogram = gsl_histogram_alloc((size_t)n);
    gsl_histogram_set_ranges_uniform(histogram, all.form.lowest * all.form.width,
                                     (all.form.highest + 1) * all.form.width);
    for (int i = 0; i < N_REALS; i++)
        ck_assert_int_eq(gsl_histogram_increment(histogram, values[i]), 0);
    for (int i = 0; i < n; i++)
        ck_assert_double_eq(gsl_histogram_get(histogram, (size_t)i),
                            all.bins[tarry_real_bins_index(all.form.lowest + i)]);
    gsl_histogram_free(histogram);

    const reals reversed = count_reals(values, N_REALS, -1, N_REALS - 1);
    assert_same_reals(&all, &reversed);
    reals front = count_reals(values, 100, 1, 0);
    reals rest = count_reals(values + 100, N_REALS - 100, 1, 0);
    tarry_real_bins_align(&front.form, front.bins, &rest.form, rest.bins);
    for (int i = 0; i < TARRY_REAL_BINS; i++)
        front.bins[i] += rest.bins[i];
    assert_same_reals(&all, &front);
}
END_TEST

START_TEST(real_bins_at_the_edges) {
    reals r = {0};
    tarry_real_bins_add(&r.form, r.bins, 1.0, NAN);
    tarry_real_bins_add(&r.form, r.bins, 1.0, INFINITY);
    ck_assert_double_eq(r.form.width, 0.0);
    tarry_real_bins_add(&r.form, r.bins, 1.0, 0.0);
    tarry_real_bins_add(&r.form, r.bins, 1.0, -0.5);
    ck_assert(r.form.width == 1.0 && r.form.lowest == -1.0 && r.form.highest == 0.0);
    tarry_real_bins_add(&r.form, r.bins, 1.0, 3.5); /* in 3 .. 4, and in 2 .. 4 when widened */
    tarry_real_bins_add(&r.form, r.bins, 1.0, -125.0);
    ck_assert(r.form.width == 2.0 && r.form.lowest == -63.0 && r.form.highest == 1.0);
    tarry_real_bins_add(&r.form, r.bins, 1.0, 1e300);
    tarry_real_bins_add(&r.form, r.bins, 1.0, -1e300);
    double sum = 0.0;
    for (int i = 0; i < TARRY_REAL_BINS; i++)
        sum += r.bins[i];
    ck_assert_double_eq(sum, 6.0);
    ck_assert(r.form.highest - r.form.lowest < TARRY_REAL_BINS);
    reals empty = {0};
    tarry_real_bins_align(&empty.form, empty.bins, &r.form, r.bins);
    ck_assert_double_eq(empty.form.width, r.form.width);
}
END_TEST

/* ---- sets ------------------------------------------------------------------------------------ */

/* A kind for these tests: the mean of the one channel's last frame, and the share of cells in which
 * it is above 3. Fails on purpose where the sum is negative. */
static size_t toy_size(const tarry_network *network) {
    (void)network;
    return 3;
}

static size_t toy_figures_n(const tarry_network *network) {
    (void)network;
    return 2;
}

static void toy_add(const tarry_network *network, const tarry_record *record, double *sums,
                    double *scratch) {
    (void)scratch;
    const double value = record->frames[network->run.n_frames - 1];
    sums[0] += 1.0;
    sums[1] += value;
    sums[2] += value > 3.0;
}

static int toy_figures(const tarry_network *network, const double *sums, double *figures,
                       tarry_error *error) {
    (void)network;
    figures[0] = sums[1] / sums[0];
    figures[1] = sums[2] / sums[0];
    return sums[1] < 0.0 ? tarry_fail(error, TARRY_NUMERIC, "sum %.0f", sums[1]) : TARRY_OK;
}

static int toy_report(const tarry_network *network, const tarry_tally_set *set,
                      const tarry_tally_kind *kind, tarry_results *results, tarry_error *error) {
    (void)network;
    const tarry_estimate e = tarry_tally_estimate(set, kind, 0, TARRY_SCALE_PLAIN);
    return tarry_table_add(results->tables[TARRY_TABLE_signals], error, "toy", "", "mean", "",
                           e.value, e.low, e.high, tarry_tally_cells(set));
}

static const tarry_tally_kind toy = {.name = "toy",
                                     .size = toy_size,
                                     .add = toy_add,
                                     .n_figures = toy_figures_n,
                                     .figures = toy_figures,
                                     .report = toy_report};
static const tarry_tally_kind *const toys[] = {&toy, &tarry_tally_transit, &toy};

static void toy_network(hand *h) {
    hand_init(h, 0, 10, 2);
    hand_species(h, "x", TARRY_NONE);
}

static void toy_cell(tarry_tally_set *set, const hand *h, int64_t cell, double value) {
    tarry_record record;
    hand_record(h, &record, cell);
    record.frames[1] = value;
    ck_assert_int_eq(tarry_tally_set_add(set, &record, NULL, NULL), TARRY_OK);
    tarry_record_release(&record);
}

/* Cells that have a value, 200 of them, in 64 groups; or only those of a few groups. */
static double toy_value(int64_t cell) {
    return (double)((cell * 37) % 11);
}

static tarry_tally_set *toy_set(const hand *h, int64_t n_cells, int n_threads) {
    tarry_tally_set *set;
    ck_assert_int_eq(tarry_tally_set_new_of(&h->network, toys, 2, &set, NULL), TARRY_OK);
    for (int64_t cell = 0; cell < n_cells; cell++)
        toy_cell(set, h, cell, toy_value(cell));
    ck_assert_int_eq(tarry_tally_set_finish(set, n_threads, NULL), TARRY_OK);
    return set;
}

START_TEST(groups_are_cells_mod_64) {
    hand h;
    toy_network(&h);
    tarry_tally_set *set = toy_set(&h, 200, 1);
    ck_assert_uint_eq(tarry_tally_n_groups(set), 64);
    ck_assert_double_eq(tarry_tally_cells(set), 200.0);
    ck_assert_double_eq(tarry_tally_group_cells(set, 7), 4.0); /* 7, 71, 135, 199 */
    ck_assert_double_eq(tarry_tally_group_cells(set, 8), 3.0);
    double all = 0.0, replicates[64], squares = 0.0;
    for (int64_t cell = 0; cell < 200; cell++)
        all += toy_value(cell);
    for (int64_t g = 0; g < 64; g++) {
        double sum = 0.0, n = 0.0;
        for (int64_t cell = g; cell < 200; cell += 64, n++)
            sum += toy_value(cell);
        ck_assert_double_eq(tarry_tally_group_sums(set, &toy, (size_t)g)[1], sum);
        replicates[g] = (all - sum) / (200.0 - n);
        squares += pow(replicates[g] - all / 200.0, 2);
    }
    ck_assert_double_eq(tarry_tally_sums(set, &toy)[1], all);
    const tarry_estimate e = tarry_tally_estimate(set, &toy, 0, TARRY_SCALE_PLAIN);
    assert_near(e.value, all / 200.0, 1e-15);
    assert_near(e.se, sqrt(63.0 / 64.0 * squares), 1e-12);
    /* Student's t at 0.975 with 63 degrees of freedom: 1.9983 (handbook). */
    assert_near(e.high - e.value, 1.9983 * e.se, 1e-4);
    tarry_tally_set_free(set);
}
END_TEST

START_TEST(empty_groups_and_one_cell) {
    hand h;
    toy_network(&h);
    tarry_tally_set *set;
    ck_assert_int_eq(tarry_tally_set_new_of(&h.network, toys, 1, &set, NULL), TARRY_OK);
    ck_assert_ptr_null(tarry_tally_sums(set, &toy));
    toy_cell(set, &h, 5, 1.0);
    toy_cell(set, &h, 9, 4.0);
    toy_cell(set, &h, 69, 7.0);
    ck_assert_int_eq(tarry_tally_set_finish(set, 1, NULL), TARRY_OK);
    ck_assert_uint_eq(tarry_tally_n_groups(set), 2);
    const tarry_estimate e = tarry_tally_estimate(set, &toy, 0, TARRY_SCALE_PLAIN);
    /* means 4, and 4 without either group: nothing varies */
    ck_assert(e.value == 4.0 && e.se == 0.0);
    const tarry_estimate share = tarry_tally_estimate(set, &toy, 1, TARRY_SCALE_PLAIN);
    assert_near(share.se, sqrt(0.5 * (1.0 / 9.0 + 1.0 / 36.0)), 1e-12);
    tarry_tally_set_free(set);

    set = toy_set(&h, 1, 1);
    const tarry_estimate lone = tarry_tally_estimate(set, &toy, 0, TARRY_SCALE_LOG);
    ck_assert(lone.value == 0.0 && isnan(lone.se));
    assert_none(lone);
    tarry_tally_set_free(set);

    set = toy_set(&h, 0, 1);
    tarry_results *results;
    ck_assert_int_eq(tarry_results_new(&results, NULL), TARRY_OK);
    ck_assert_int_eq(tarry_tally_set_report(set, results, NULL), TARRY_OK);
    ck_assert_uint_eq(tarry_table_n_rows(results->tables[TARRY_TABLE_signals]), 0);
    tarry_results_free(results);
    tarry_tally_set_free(set);
    tarry_tally_set_free(NULL);
}
END_TEST

START_TEST(threads_change_nothing) {
    hand h;
    toy_network(&h);
    tarry_tally_set *one = toy_set(&h, 300, 1), *four = toy_set(&h, 300, 4);
    for (size_t figure = 0; figure < 2; figure++) {
        const tarry_estimate a = tarry_tally_estimate(one, &toy, figure, TARRY_SCALE_LOGIT);
        const tarry_estimate b = tarry_tally_estimate(four, &toy, figure, TARRY_SCALE_LOGIT);
        ck_assert(memcmp(&a.value, &b.value, sizeof a.value) == 0);
        ck_assert(memcmp(&a.se, &b.se, sizeof a.se) == 0);
    }
    tarry_tally_set_free(one);
    tarry_tally_set_free(four);
}
END_TEST

/* Several replicates fail: the error is that of the lowest, whichever thread met it. */
START_TEST(first_failure_is_told) {
    hand h;
    toy_network(&h);
    for (int threads = 1; threads <= 4; threads++) {
        tarry_tally_set *set;
        tarry_error error = {0};
        ck_assert_int_eq(tarry_tally_set_new_of(&h.network, toys, 1, &set, NULL), TARRY_OK);
        for (int64_t cell = 0; cell < 40; cell++)
            toy_cell(set, &h, cell, cell < 20 ? -1.0 : cell == 30 ? 25.0 : cell == 31 ? 5.0 : -1.0);
        ck_assert_int_eq(tarry_tally_set_finish(set, threads, &error), TARRY_NUMERIC);
        ck_assert_str_eq(error.message, "sum -8");
        tarry_tally_set_free(set);
    }
}
END_TEST

/* Everything once with every estimator of a run, allocation n failing. */
static int whole_life(const hand *h, const tarry_record *records, int n_records, double *scratch) {
    tarry_tally_set *set = NULL;
    tarry_results *results = NULL;
    tarry_error error = {0};
    int code = tarry_tally_set_new(&h->network, &set, &error);
    for (int i = 0; !code && i < n_records; i++)
        code = tarry_tally_set_add(set, &records[i], scratch, &error);
    if (!code)
        code = tarry_tally_set_finish(set, 1, &error);
    if (!code)
        code = tarry_results_new(&results, &error);
    if (!code)
        code = tarry_tally_set_report(set, results, &error);
    tarry_results_free(results);
    tarry_tally_set_free(set);
    return (int)error.code == code ? code : -1; /* no ck_assert while calls fail: it allocates */
}

START_TEST(no_memory_is_an_error) {
    enum { N_RECORDS = 3, N_FRAMES = 4 };
    hand h;
    hand_init(&h, 0, 6, N_FRAMES);
    hand_species(&h, "vela.transcript", (int32_t)hand_gene(&h, "vela", 1, true));
    hand_signal(&h, "spot", 0.5, 0.1);
    tarry_record records[N_RECORDS];
    for (int c = 0; c < N_RECORDS; c++) {
        hand_record(&h, &records[c], c);
        for (int i = 0; i < 2 * N_FRAMES; i++)
            records[c].frames[i] = 3.0 * c + 1000.0 * i * i; /* drifts */
    }
    double *scratch = calloc(tarry_tally_set_scratch(&h.network) + 1, sizeof *scratch);
    ck_assert_ptr_nonnull(scratch);
    long n = 0;
    for (;; n++) {
        faults_arm(FAULT_MEMORY, n, 0);
        const int code = whole_life(&h, records, N_RECORDS, scratch);
        const bool struck = faults_struck();
        faults_clear();
        ck_assert_msg(code == (struck ? TARRY_MEMORY : TARRY_OK), "call %ld", n);
        if (!struck)
            break;
    }
    ck_assert_int_gt(n, 100);
    free(scratch);
    for (int c = 0; c < N_RECORDS; c++)
        tarry_record_release(&records[c]);
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"mean has the textbook error", mean_has_textbook_error},
        {"scales follow the definition", scales_follow_the_definition},
        {"ratio against delete-one", ratio_against_delete_one},
        {"no interval where none can be", no_interval_where_none_can_be},
        {"replicate at the border", replicate_at_the_border},
        {"Wilson as printed", wilson_as_printed},
        {"share by jackknife or Wilson", share_by_jackknife_or_wilson},
        {"count bins tile all counts", count_bins_tile_all_counts},
        {"blocks take memory on use", blocks_take_memory_on_use},
        {"real bins hold all values", real_bins_hold_all_values},
        {"real bins at the edges", real_bins_at_the_edges},
        {"groups are cells mod 64", groups_are_cells_mod_64},
        {"empty groups and one cell", empty_groups_and_one_cell},
        {"threads change nothing", threads_change_nothing},
        {"first failure is told", first_failure_is_told},
        {"no memory is an error", no_memory_is_an_error},
    };
    return run_tests("tally", tests, sizeof tests / sizeof tests[0]);
}
