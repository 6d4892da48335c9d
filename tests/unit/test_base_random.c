/* SPDX-License-Identifier: GPL-3.0-or-later */

/* The random streams and the logarithm against plain versions written from the publications, the C
 * library and the laws of uniform numbers. */
#include "base/logarithm.h"
#include "base/random.h"
#include "support.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

/* SplitMix64 as published (Steele, Lea & Flood 2014, OOPSLA, fig. 16-17, variant "Mix13" of
 * Stafford, which the authors' later programs use), statement by statement. */
static uint64_t plain_splitmix(uint64_t *state) {
    *state = *state + UINT64_C(11400714819323198485); /* 2^64 divided by the golden ratio, odd */
    uint64_t z = *state;
    z = z ^ z / (UINT64_C(1) << 30);
    z = z * UINT64_C(13787848793156543929);
    z = z ^ z / (UINT64_C(1) << 27);
    z = z * UINT64_C(10723151780598845931);
    z = z ^ z / (UINT64_C(1) << 31);
    return z;
}

static uint64_t plain_rotate(uint64_t x, int n) {
    for (int i = 0; i < n; i++)
        x = 2 * x + (x >= UINT64_C(1) << 63 ? 1 : 0);
    return x;
}

/* xoshiro256++ (Blackman & Vigna 2021, ACM Trans. Math. Softw. 47:36, fig. 1 and table 2), as the
 * linear map on a new array and the ++ scrambler: rotate(s0 + s3, 23) + s0. */
static uint64_t plain_xoshiro(uint64_t s[4]) {
    const uint64_t result = plain_rotate(s[0] + s[3], 23) + s[0];
    const uint64_t next[4] = {
        s[0] ^ s[1] ^ s[3],
        s[0] ^ s[1] ^ s[2],
        s[0] ^ s[2] ^ s[1] * (UINT64_C(1) << 17),
        plain_rotate(s[1] ^ s[3], 45),
    };
    memcpy(s, next, sizeof next);
    return result;
}

START_TEST(splitmix_matches_publication) {
    /* First outputs for state 1234567, known from the authors' program; from memory. */
    const uint64_t known[] = {UINT64_C(6457827717110365317), UINT64_C(3203168211198807973),
                              UINT64_C(9817491932198370423), UINT64_C(4593380528125082431)};
    uint64_t state = 1234567, plain = 1234567;
    for (int i = 0; i < 4; i++) {
        state += UINT64_C(0x9e3779b97f4a7c15);
        ck_assert_uint_eq(tarry_mix64(state), known[i]);
        ck_assert_uint_eq(plain_splitmix(&plain), known[i]);
    }
    for (int i = 0; i < 10000; i++) {
        state += UINT64_C(0x9e3779b97f4a7c15);
        ASSERT_FAST(tarry_mix64(state) == plain_splitmix(&plain), "number %d differs", i);
    }
}
END_TEST

START_TEST(xoshiro_matches_publication) {
    /* First outputs for state 1, 2, 3, 4, known from the authors' program; from memory. */
    const uint64_t known[] = {41943041, 58720359, UINT64_C(3588806011781223),
                              UINT64_C(3591011842654386), UINT64_C(9228616714210784205)};
    tarry_stream stream = {{1, 2, 3, 4}};
    uint64_t plain[4] = {1, 2, 3, 4};
    for (int i = 0; i < 5; i++) {
        ck_assert_uint_eq(tarry_stream_next(&stream), known[i]);
        ck_assert_uint_eq(plain_xoshiro(plain), known[i]);
    }
    for (int i = 0; i < 10000; i++)
        ASSERT_FAST(tarry_stream_next(&stream) == plain_xoshiro(plain), "number %d differs", i);
}
END_TEST

START_TEST(state_is_filled_by_splitmix) {
    for (uint64_t cell = 0; cell < 100; cell++) {
        tarry_stream stream;
        tarry_stream_init(&stream, 1, cell, TARRY_STREAM_NOISE);
        uint64_t state = tarry_stream_key(1, cell, TARRY_STREAM_NOISE);
        for (int i = 0; i < 4; i++)
            ck_assert_uint_eq(stream.s[i], plain_splitmix(&state));
    }
}
END_TEST

static int compare_keys(const void *a, const void *b) {
    const uint64_t x = *(const uint64_t *)a, y = *(const uint64_t *)b;
    return (x > y) - (x < y);
}

/* Among 2^16 keys of 64 bits two are equal with probability 1e-10 (birthday bound). */
START_TEST(keys_differ) {
    static uint64_t keys[1 << 16];
    size_t n = 0;
    for (uint64_t seed = 0; seed < 16; seed++)
        for (uint64_t cell = 0; cell < 1024; cell++)
            for (uint64_t purpose = 0; purpose < 4; purpose++)
                keys[n++] = tarry_stream_key(seed, cell, purpose);
    qsort(keys, n, sizeof keys[0], compare_keys);
    for (size_t i = 1; i < n; i++)
        ASSERT_FAST(keys[i - 1] != keys[i], "two keys are equal");
}
END_TEST

/* The i-th number of streams 0, 1, 2, ... must be uniform too, and independent of its neighbour's:
 * chi squared over 256 bins has mean 255 and sd sqrt(510); the product of neighbours about 1/2 has
 * mean 0 and sd 1/12 (laws of uniform numbers). */
static void look_across(int index, tarry_stream_purpose purpose) {
    enum { STREAMS = 1 << 17, BINS = 256 };
    double counts[BINS] = {0}, products = 0, last = 0.5;
    for (uint64_t cell = 0; cell < STREAMS; cell++) {
        tarry_stream stream;
        tarry_stream_init(&stream, 1, cell, purpose);
        uint64_t bits = 0;
        for (int i = 0; i <= index; i++)
            bits = tarry_stream_next(&stream);
        const double u = tarry_unit(bits);
        counts[(int)(u * BINS)]++;
        products += (u - 0.5) * (last - 0.5);
        last = u;
    }
    double chi_squared = 0;
    const double expected = (double)STREAMS / BINS;
    for (int i = 0; i < BINS; i++)
        chi_squared += (counts[i] - expected) * (counts[i] - expected) / expected;
    ck_assert_double_lt(fabs(chi_squared - (BINS - 1)) / sqrt(2.0 * (BINS - 1)), 5);
    ck_assert_double_lt(fabs(products) / (sqrt(STREAMS) / 12), 5);
}

START_TEST(streams_are_independent) {
    for (int index = 0; index < 3; index++)
        for (int purpose = 0; purpose < 4; purpose++)
            look_across(index, (tarry_stream_purpose)purpose);
}
END_TEST

START_TEST(unit_stays_inside) {
    ck_assert_double_eq(tarry_unit(0), 0x1p-53);
    ck_assert_double_eq(tarry_unit(UINT64_MAX), 1 - 0x1p-53);
    ck_assert_double_eq(tarry_unit(UINT64_C(1) << 63), 0.5 + 0x1p-53);
    tarry_stream stream;
    tarry_stream_init(&stream, 1, 0, TARRY_STREAM_EVENTS);
    for (int i = 0; i < 100000; i++) {
        const double u = tarry_unit(tarry_stream_next(&stream));
        ASSERT_FAST(u > 0 && u < 1 && 1 - (1 - u) == u, "%a", u);
    }
}
END_TEST

/* What the header promises, against the C library in long double. Next to 1 the bound is relative:
 * two units in the last place of the result. */
static void check_log(double x) {
    const double got = tarry_log(x);
    const long double truth = logl(x);
    const double near = fabs((double)truth);
    const double unit = nextafter(near, INFINITY) - near;
    const double bound = fabs(x - 1) < 0x1p-8 ? 2 * unit : 2e-16 + 2 * unit;
    ASSERT_FAST(fabsl(got - truth) <= bound, "log(%a): %a, and %La is right", x, got, truth);
    ASSERT_FAST((x < 1) == (got < 0), "log(%a) has the wrong sign", x);
}

START_TEST(log_is_right_for_uniform_numbers) {
    tarry_stream stream;
    tarry_stream_init(&stream, 1, 0, TARRY_STREAM_EVENTS);
    const int n = test_small() ? 100000 : 3000000;
    for (int i = 0; i < n; i++)
        check_log(tarry_unit(tarry_stream_next(&stream)));
    for (uint64_t k = 0; k < 10000; k++) {
        check_log(tarry_unit(k << 12));
        check_log(tarry_unit(UINT64_MAX - (k << 12)));
    }
}
END_TEST

START_TEST(log_is_right_for_every_exponent) {
    tarry_stream stream;
    tarry_stream_init(&stream, 1, 1, TARRY_STREAM_EVENTS);
    for (int exponent = -1022; exponent <= 1023; exponent++)
        for (int i = 0; i < 200; i++)
            check_log(ldexp(1 + tarry_unit(tarry_stream_next(&stream)), exponent));
}
END_TEST

START_TEST(log_is_right_where_steps_meet) {
    for (int exponent = -3; exponent <= 3; exponent++)
        for (int step = 0; step < 2 * TARRY_LOG_STEPS; step++) {
            const double edge = ldexp(1 + step / (2.0 * TARRY_LOG_STEPS), exponent);
            double below = edge, above = edge;
            check_log(edge);
            for (int i = 0; i < 20; i++) {
                check_log(below = nextafter(below, 0));
                check_log(above = nextafter(above, INFINITY));
            }
        }
}
END_TEST

/* Each stored logarithm is the double nearest to minus the log of the stored inverse. */
START_TEST(log_table_is_right) {
    for (int i = 0; i < TARRY_LOG_STEPS; i++) {
        const tarry_log_entry entry = tarry_log_table[i];
        long double truth = -logl(entry.inverse);
        if (i >= TARRY_LOG_STEPS / 2)
            truth -= logl(2);
        ck_assert_double_eq(entry.logarithm, (double)truth);
    }
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"SplitMix64 matches its publication", splitmix_matches_publication},
        {"xoshiro256++ matches its publication", xoshiro_matches_publication},
        {"the state is filled by SplitMix64", state_is_filled_by_splitmix},
        {"keys differ", keys_differ},
        {"streams are independent", streams_are_independent},
        {"units stay inside", unit_stays_inside},
        {"log of uniform numbers", log_is_right_for_uniform_numbers},
        {"log at every exponent", log_is_right_for_every_exponent},
        {"log where steps meet", log_is_right_where_steps_meet},
        {"table of logarithms", log_table_is_right},
    };
    return run_tests("random numbers", tests, sizeof tests / sizeof tests[0]);
}
