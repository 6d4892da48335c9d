/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Pending completions against an array that is searched from end to end. */

#include "base/random.h"
#include "engine/pending.h"

#include <check.h>
#include <math.h>
#include <stdlib.h>

enum { LAGS = 5, MOST = 4000 };

/* The plain version: everything in one array, in the order scheduled. */
typedef struct plain {
    double due[MOST];
    uint32_t lag[MOST];
    size_t n;
} plain;

static size_t plain_earliest(const plain *all) {
    size_t best = 0;
    for (size_t i = 1; i < all->n; i++)
        if (all->due[i] < all->due[best] ||
            (all->due[i] == all->due[best] && all->lag[i] < all->lag[best]))
            best = i;
    return best;
}

static void plain_remove(plain *all, size_t at) {
    for (size_t i = at; i + 1 < all->n; i++) {
        all->due[i] = all->due[i + 1];
        all->lag[i] = all->lag[i + 1];
    }
    all->n--;
}

static void take_both(tarry_pending *pending, plain *all) {
    const size_t i = plain_earliest(all);
    ck_assert_double_eq(tarry_pending_due(pending), all->due[i]);
    ck_assert_uint_eq(tarry_pending_take(pending), all->lag[i]);
    plain_remove(all, i);
}

static void add_both(tarry_pending *pending, plain *all, uint32_t lag, double due, bool fixed) {
    ck_assert_int_eq(tarry_pending_add(pending, lag, due, fixed), TARRY_OK);
    all->due[all->n] = due;
    all->lag[all->n++] = lag;
}

/* Lags 0 to 2 have one length each (1, 2 and 2: ties across lags), 3 and 4 are drawn from few
 * values, so that ties within a lag and with the rings are common; lag 1 changes its length now and
 * then. */
START_TEST(test_order) {
    tarry_pending pending;
    ck_assert_int_eq(tarry_pending_init(&pending, LAGS, NULL), TARRY_OK);
    plain *all = calloc(1, sizeof *all);
    ck_assert_ptr_nonnull(all);
    tarry_stream stream;
    tarry_stream_init(&stream, 1, 0, TARRY_STREAM_EVENTS);
    double now = 0, length[3] = {1, 2, 2};
    for (int step = 0; step < 60000; step++) {
        const uint64_t bits = tarry_stream_next(&stream);
        const uint32_t lag = (uint32_t)(bits >> 8) % LAGS;
        if (bits % 1000 == 0) {
            length[1] = length[1] == 2 ? 3 : 2;
            ck_assert_int_eq(tarry_pending_pour(&pending, 1), TARRY_OK);
        }
        if (bits % 3 != 0 && all->n < MOST) {
            const bool fixed = lag < 3;
            const double wait = fixed ? length[lag] : (double)((bits >> 20) % 16) / 4;
            add_both(&pending, all, lag, now + wait, fixed);
        } else if (all->n > 0) {
            now = tarry_pending_due(&pending);
            take_both(&pending, all);
        }
        ck_assert_int_eq(pending.n, (int64_t)all->n);
    }
    while (all->n > 0)
        take_both(&pending, all);
    ck_assert(isinf(tarry_pending_due(&pending)));
    free(all);
    tarry_pending_release(&pending);
}
END_TEST

START_TEST(test_cancel) {
    tarry_pending pending;
    ck_assert_int_eq(tarry_pending_init(&pending, LAGS, NULL), TARRY_OK);
    for (uint32_t lag = 0; lag < LAGS; lag++)
        ck_assert_int_eq(tarry_pending_add(&pending, lag, 10 - lag, lag % 2 == 0), TARRY_OK);
    ck_assert_double_eq(tarry_pending_cancel(&pending, 2), 8);
    ck_assert_double_eq(tarry_pending_cancel(&pending, 3), 7);
    ck_assert(isinf(tarry_pending_cancel(&pending, 3)));
    ck_assert_int_eq(pending.n, 3);
    ck_assert_uint_eq(tarry_pending_take(&pending), 4);
    ck_assert_uint_eq(tarry_pending_take(&pending), 1);
    ck_assert_uint_eq(tarry_pending_take(&pending), 0);
    ck_assert_int_eq(tarry_pending_add(&pending, 2, 5, true), TARRY_OK);
    ck_assert_double_eq(tarry_pending_due(&pending), 5);
    tarry_pending_release(&pending);
}
END_TEST

START_TEST(test_clear) {
    tarry_pending pending;
    ck_assert_int_eq(tarry_pending_init(&pending, 1, NULL), TARRY_OK);
    for (int i = 0; i < 100; i++)
        ck_assert_int_eq(tarry_pending_add(&pending, 0, i, true), TARRY_OK);
    tarry_pending_clear(&pending);
    ck_assert(isinf(tarry_pending_due(&pending)));
    ck_assert_int_eq(tarry_pending_add(&pending, 0, 3, true), TARRY_OK);
    ck_assert_double_eq(tarry_pending_due(&pending), 3);
    tarry_pending_release(&pending);
}
END_TEST

START_TEST(test_too_many_lags) {
    tarry_pending pending;
    tarry_error error;
    ck_assert_int_eq(tarry_pending_init(&pending, TARRY_PENDING_MOST_LAGS, &error), TARRY_LIMIT);
}
END_TEST

int main(void) {
    Suite *suite = suite_create("pending");
    TCase *tests = tcase_create("pending");
    tcase_set_timeout(tests, 60);
    tcase_add_test(tests, test_order);
    tcase_add_test(tests, test_cancel);
    tcase_add_test(tests, test_clear);
    tcase_add_test(tests, test_too_many_lags);
    suite_add_tcase(suite, tests);
    SRunner *runner = srunner_create(suite);
    srunner_run_all(runner, CK_ENV);
    const int failed = srunner_ntests_failed(runner);
    srunner_free(runner);
    return failed;
}
