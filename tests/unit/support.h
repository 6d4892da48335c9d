/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_TESTS_SUPPORT_H
#define TARRY_TESTS_SUPPORT_H

/* What every test program needs. */

#include <check.h>
#include <stdbool.h>
#include <stddef.h>

/* One of the tests of a program. */
typedef struct test_entry {
    const char *name;
    const TTest *test;
} test_entry;

/* Run the tests one after another, each in a process of its own; returns what main should return.
 */
int run_tests(const char *name, const test_entry *tests, size_t n);

/* Smaller samples are wanted (TARRY_TEST_SMALL is set, as under sanitizers). */
bool test_small(void);

/* A new folder for the files of one test (in TMPDIR or /tmp), removed with what is in it when the
 * test's process ends. The text stays valid. */
const char *test_folder(void);

/* "FOLDER/name" of that folder; the text stays valid for 16 more calls. */
const char *test_path(const char *name);

/* For loops: ck_assert takes a microsecond even when all is well, since it notes where it is. */
#define ASSERT_FAST(condition, ...)                                                                \
    do {                                                                                           \
        if (!(condition))                                                                          \
            ck_abort_msg(__VA_ARGS__);                                                             \
    } while (0)

#endif
