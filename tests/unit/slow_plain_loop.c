/* SPDX-License-Identifier: GPL-3.0-or-later */

/* The engine against the plain loop on more random models than test_plain_loop has time for. */
#include "random_cells.h"
#include "support.h"
#include "tarry/tarry.h"

enum { N_TESTS = 10, N_MODELS = 1000 };

START_TEST(random_models) {
    const uint64_t first = 10000 + (uint64_t)_i * N_MODELS;
    check_random_models(first, first + N_MODELS);
}
END_TEST

int main(void) {
    tarry_start();
    Suite *suite = suite_create("engine and plain loop, at length");
    TCase *tcase = tcase_create("random models");
    tcase_set_timeout(tcase, 300);
    tcase_add_loop_test(tcase, random_models, 0, N_TESTS);
    suite_add_tcase(suite, tcase);
    SRunner *runner = srunner_create(suite);
    srunner_run_all(runner, CK_ENV);
    const int failed = srunner_ntests_failed(runner);
    srunner_free(runner);
    return failed != 0;
}
