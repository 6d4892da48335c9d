/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Drawing lags: formulas by hand, how many numbers a draw takes, sharing, failures. The laws of
 * what is drawn are looked at in tests/against/test_draws.c. */
#include "engine/draw.h"
#include "engine/quantile_table.h"
#include "faults.h"
#include "support.h"

#include <gsl/gsl_errno.h>
#include <math.h>
#include <string.h>

#define N_OF(array) (sizeof(array) / sizeof(array)[0])

static const double edges[] = {0, 1, 2, 6, 7}, bin_shares[] = {0.2, 0, 0.7, 0.1};
static const double values[] = {1, 2, 4}, value_shares[] = {0.25, 0, 0.75};
static const tarry_law some_parts[] = {{.kind = TARRY_LAW_FIXED, .a = 2},
                                       {.kind = TARRY_LAW_EXPONENTIAL, .a = 3},
                                       {.kind = TARRY_LAW_GAMMA, .a = 8, .b = 4}};
static const double mix_shares[] = {0.3, 0.5, 0.2};

static const tarry_law fixed = {.kind = TARRY_LAW_FIXED, .a = 2.5};
static const tarry_law exponential = {.kind = TARRY_LAW_EXPONENTIAL, .a = 3};
static const tarry_law uniform = {.kind = TARRY_LAW_UNIFORM, .a = 2, .b = 5};
static const tarry_law weibull = {.kind = TARRY_LAW_WEIBULL, .a = 6, .b = 2.5};
static const tarry_law bins = {
    .kind = TARRY_LAW_BINS, .n = 4, .points = edges, .weights = bin_shares};
static const tarry_law listed = {
    .kind = TARRY_LAW_VALUES, .n = 3, .points = values, .weights = value_shares};
static const tarry_law mix = {
    .kind = TARRY_LAW_MIX, .n = 3, .weights = mix_shares, .parts = some_parts};
static const tarry_law total = {.kind = TARRY_LAW_TOTAL, .n = 3, .parts = some_parts};

static tarry_drawer_set *set;

static void set_up(void) {
    gsl_set_error_handler_off();
    ck_assert_int_eq(tarry_drawer_set_new(&set, NULL), TARRY_OK);
}

static const tarry_drawer *add(const tarry_law *law) {
    const tarry_drawer *drawer = NULL;
    tarry_error error;
    if (tarry_drawer_set_add(set, law, &drawer, &error))
        ck_abort_msg("%s", error.message);
    return drawer;
}

static void check_near(double value, double truth, double limit) {
    ASSERT_FAST(fabs(value - truth) <= limit * fabs(truth), "%.17g, should be %.17g", value, truth);
}

/* Inversion by the C library's functions. */
START_TEST(closed_forms) {
    set_up();
    const tarry_drawer *e = add(&exponential), *u = add(&uniform), *w = add(&weibull);
    tarry_stream stream;
    tarry_stream_init(&stream, 1, 0, TARRY_STREAM_EVENTS);
    for (int i = 0; i < 100000; i++) {
        const uint64_t bits = tarry_stream_next(&stream);
        const double p = tarry_unit(bits);
        /* tarry_log is good to 2e-16 beside 1, and relative to that only next to it. */
        check_near(tarry_draw_at(e, bits), -3 * log(p), 1e-13);
        check_near(tarry_draw_at(u, bits), 2 + 3 * p, 1e-15);
        check_near(tarry_draw_at(w, bits), 6 * pow(-log(p), 1 / 2.5), 1e-13);
    }
    ck_assert(tarry_draw_at(e, UINT64_MAX) > 0);
    ck_assert(isfinite(tarry_draw_at(e, 0)));
    tarry_drawer_set_free(set);
}
END_TEST

/* By walking along the shares. */
START_TEST(tables_by_a_plain_walk) {
    set_up();
    const tarry_drawer *b = add(&bins), *v = add(&listed);
    tarry_stream stream;
    tarry_stream_init(&stream, 1, 0, TARRY_STREAM_EVENTS);
    for (int i = 0; i < 100000; i++) {
        const uint64_t bits = tarry_stream_next(&stream);
        const double p = tarry_unit(bits);
        check_near(tarry_draw_at(b, bits),
                   p < 0.2   ? p / 0.2
                   : p < 0.9 ? 2 + 4 * (p - 0.2) / 0.7
                             : 6 + (p - 0.9) / 0.1,
                   1e-14);
        ASSERT_FAST(tarry_draw_at(v, bits) == (p < 0.25 ? 1 : 4), "another value at %g", p);
    }
    ck_assert_double_eq_tol(tarry_draw_at(b, UINT64_MAX), 7, 1e-14);
    ck_assert_double_eq(tarry_draw_at(v, UINT64_MAX), 4);
    tarry_drawer_set_free(set);
}
END_TEST

/* Many rows of unequal shares, where the guide has rows to pass over. */
START_TEST(long_tables_by_a_plain_walk) {
    enum { N = 1000 };
    double points[N], shares[N], sum = 0;
    set_up();
    for (int i = 0; i < N; i++) {
        points[i] = i;
        shares[i] = i % 7 == 3 ? 0 : exp(-0.02 * i) + (i == 500 ? 3 : 0);
        sum += shares[i];
    }
    for (int i = 0; i < N; i++)
        shares[i] /= sum;
    const tarry_law law = {.kind = TARRY_LAW_VALUES, .n = N, .points = points, .weights = shares};
    const tarry_drawer *drawer = add(&law);
    tarry_stream stream;
    tarry_stream_init(&stream, 1, 0, TARRY_STREAM_EVENTS);
    for (int k = 0; k < 20000; k++) {
        const uint64_t bits = tarry_stream_next(&stream);
        double below = 0;
        int i = 0;
        while (below + shares[i] <= tarry_unit(bits))
            below += shares[i++];
        ASSERT_FAST(tarry_draw_at(drawer, bits) == i, "row %d at %g", i, tarry_unit(bits));
    }
    tarry_drawer_set_free(set);
}
END_TEST

static void check_numbers(const tarry_law *law, int n) {
    const tarry_drawer *drawer = add(law);
    tarry_stream stream, other;
    tarry_stream_init(&stream, 1, 0, TARRY_STREAM_EVENTS);
    other = stream;
    const double x = tarry_draw(drawer, &stream);
    for (int i = 0; i < n; i++)
        tarry_stream_next(&other);
    ck_assert_msg(memcmp(&stream, &other, sizeof stream) == 0, "a draw does not take %d numbers",
                  n);
    ck_assert_msg((tarry_drawer_fixed(drawer) == x) == (n == 0), "fixed or not");
}

START_TEST(one_number_for_each_elementary_law) {
    const tarry_law lognormal = {.kind = TARRY_LAW_LOGNORMAL, .a = 8, .b = 4};
    const tarry_law normal = {.kind = TARRY_LAW_NORMAL, .a = 8, .b = 4};
    const tarry_law two_fixed[] = {fixed, fixed};
    const tarry_law nested[] = {total, exponential, fixed};
    const tarry_law fixed_total = {.kind = TARRY_LAW_TOTAL, .n = 2, .parts = two_fixed};
    const tarry_law nested_total = {.kind = TARRY_LAW_TOTAL, .n = 3, .parts = nested};
    const double certain[] = {0, 1};
    const tarry_law one_value = {
        .kind = TARRY_LAW_VALUES, .n = 2, .points = values, .weights = certain};
    set_up();
    check_numbers(&fixed, 0);
    check_numbers(&one_value, 0);
    check_numbers(&fixed_total, 0);
    check_numbers(&exponential, 1);
    check_numbers(&uniform, 1);
    check_numbers(&weibull, 1);
    check_numbers(&bins, 1);
    check_numbers(&listed, 1);
    check_numbers(&some_parts[2], 1);
    check_numbers(&lognormal, 1);
    check_numbers(&normal, 1);
    check_numbers(&total, 2);
    check_numbers(&nested_total, 3);
    ck_assert_double_eq(tarry_drawer_fixed(add(&fixed_total)), 5);
    ck_assert_double_eq(tarry_drawer_fixed(add(&one_value)), 2);
    ck_assert_double_eq(tarry_drawer_fixed(add(&exponential)), -1);
    tarry_drawer_set_free(set);
}
END_TEST

/* What is left of an elementary lag takes one number, of a total one more and those of later parts.
 */
START_TEST(what_is_left_by_hand) {
    const tarry_law parts[] = {exponential, fixed, uniform};
    const tarry_law law = {.kind = TARRY_LAW_TOTAL, .n = 3, .parts = parts};
    set_up();
    const tarry_drawer *whole = add(&law), *last = add(&uniform);
    tarry_stream stream, other;
    tarry_stream_init(&stream, 1, 0, TARRY_STREAM_START);
    other = stream;
    for (int k = 0; k < 1000; k++) {
        const double met = 9 * tarry_unit(tarry_stream_next(&other)); /* of 3 + 2.5 + 3.5 */
        const double p = tarry_unit(tarry_stream_next(&other));
        double left = met < 3     ? tarry_law_remaining_quantile(&exponential, p) + 2.5
                      : met < 5.5 ? 2.5 * p
                                  : tarry_law_remaining_quantile(&uniform, p);
        if (met < 5.5)
            left += tarry_draw(last, &other);
        check_near(tarry_draw_remaining(whole, &stream), left, 1e-14);
    }
    tarry_drawer_set_free(set);
}
END_TEST

/* One number chooses the part, then the part takes its own; parts of a total in order. */
START_TEST(mixes_and_totals_part_by_part) {
    set_up();
    const tarry_drawer *m = add(&mix), *t = add(&total);
    const tarry_drawer *parts[] = {add(&some_parts[0]), add(&some_parts[1]), add(&some_parts[2])};
    tarry_stream stream, other;
    tarry_stream_init(&stream, 1, 0, TARRY_STREAM_EVENTS);
    other = stream;
    for (int k = 0; k < 10000; k++) {
        const double u = tarry_unit(tarry_stream_next(&other));
        const int i = u < 0.3 ? 0 : u < 0.8 ? 1 : 2;
        ASSERT_FAST(tarry_draw(m, &stream) == tarry_draw(parts[i], &other), "mix %d differs", k);
        double sum = 2;
        sum += tarry_draw(parts[1], &other);
        sum += tarry_draw(parts[2], &other);
        ASSERT_FAST(tarry_draw(t, &stream) == sum, "total %d differs", k);
    }
    tarry_drawer_set_free(set);
}
END_TEST

START_TEST(one_table_for_one_shape) {
    const tarry_law gammas[] = {{.kind = TARRY_LAW_GAMMA, .a = 8, .b = 4},
                                {.kind = TARRY_LAW_GAMMA, .a = 2, .b = 1},
                                {.kind = TARRY_LAW_ERLANG, .a = 5, .b = 4}};
    set_up();
    const tarry_drawer *first = add(&gammas[0]);
    const size_t bytes = tarry_drawer_set_bytes(set);
    ck_assert_uint_gt(bytes, 100000);
    const tarry_drawer *second = add(&gammas[1]), *third = add(&gammas[2]);
    ck_assert_uint_lt(tarry_drawer_set_bytes(set) - bytes, 1000);
    check_near(4 * tarry_draw_at(second, UINT64_C(1) << 60),
               tarry_draw_at(first, UINT64_C(1) << 60), 1e-15);
    check_near(1.6 * tarry_draw_at(third, UINT64_C(3) << 61),
               tarry_draw_at(first, UINT64_C(3) << 61), 1e-15);
    const tarry_law other = {.kind = TARRY_LAW_GAMMA, .a = 8, .b = 5};
    add(&other);
    ck_assert_uint_gt(tarry_drawer_set_bytes(set), bytes + 100000);
    tarry_drawer_set_free(set);
}
END_TEST

START_TEST(draws_rise_with_the_number) {
    const tarry_law laws[] = {some_parts[2],
                              {.kind = TARRY_LAW_LOGNORMAL, .a = 8, .b = 4},
                              {.kind = TARRY_LAW_NORMAL, .a = 8, .b = 4}};
    set_up();
    for (size_t i = 0; i < N_OF(laws); i++) {
        const tarry_drawer *drawer = add(&laws[i]);
        double before = 0;
        for (uint64_t k = 0; k < 1 << 20; k++) {
            const double x = tarry_draw_at(drawer, (k << 44) + (UINT64_C(1) << 43));
            ASSERT_FAST(x > before, "law %zu falls at %g", i, (double)k / (1 << 20));
            before = x;
        }
    }
    tarry_drawer_set_free(set);
}
END_TEST

/* The quantile of a histogram with an empty bin jumps. */
START_TEST(hopeless_shapes_are_named) {
    tarry_quantile_table table;
    tarry_error error = {0};
    gsl_set_error_handler_off();
    ck_assert_int_eq(tarry_quantile_table_init(&table, &bins, &error), TARRY_NUMERIC);
    ck_assert_str_eq(error.message,
                     "this table delay cannot be drawn to 1e-9 from a table of 1024 intervals an "
                     "octave; a smaller sd would do");
    tarry_quantile_table_release(&table);
}
END_TEST

/* Tables and mixes so long that an arena needs a block for each of their arrays. */
START_TEST(memory_runs_out) {
    gsl_set_error_handler_off();
    enum { N = 20000 };
    static double points[N], shares[N];
    static tarry_law parts[N];
    for (int i = 0; i < N; i++) {
        points[i] = i;
        shares[i] = 1.0 / N;
        parts[i] = fixed;
    }
    const tarry_law table = {.kind = TARRY_LAW_VALUES, .n = N, .points = points, .weights = shares};
    const tarry_law long_mix = {.kind = TARRY_LAW_MIX, .n = N, .weights = shares, .parts = parts};
    const tarry_law *laws[] = {&mix, &total, &table, &long_mix};
    for (long n = 0;; n++) {
        tarry_error error = {0};
        const tarry_drawer *drawer;
        faults_arm(FAULT_MEMORY, n, 0);
        int status = tarry_drawer_set_new(&set, &error);
        for (size_t i = 0; i < N_OF(laws) && !status; i++)
            status = tarry_drawer_set_add(set, laws[i], &drawer, &error);
        const bool struck = faults_struck();
        faults_clear();
        tarry_drawer_set_free(set);
        if (!struck)
            break;
        ck_assert_int_eq(status, TARRY_MEMORY);
        ck_assert_int_eq(error.code, TARRY_MEMORY);
    }
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"closed forms", closed_forms},
        {"tables", tables_by_a_plain_walk},
        {"long tables", long_tables_by_a_plain_walk},
        {"one number for each elementary law", one_number_for_each_elementary_law},
        {"mixes and totals", mixes_and_totals_part_by_part},
        {"what is left", what_is_left_by_hand},
        {"one table for one shape", one_table_for_one_shape},
        {"draws rise with the number", draws_rise_with_the_number},
        {"hopeless shapes", hopeless_shapes_are_named},
        {"memory runs out", memory_runs_out},
    };
    return run_tests("drawing lags", tests, N_OF(tests));
}
