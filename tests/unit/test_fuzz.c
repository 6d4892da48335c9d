/* SPDX-License-Identifier: GPL-3.0-or-later */

/* The corpora of tests/fuzz, and inputs that once broke a reader: each is fed to its reader again.
 * To be run in the folder that holds tests. */

#include "fuzz.h"
#include "support.h"

#include <glob.h>
#include <stdio.h>
#include <stdlib.h>

enum { MOST = 1 << 20 };

static void replay(const char *pattern, fuzz_function *reader, size_t n_least) {
    glob_t found;
    uint8_t *data = malloc(MOST);
    ck_assert_ptr_nonnull(data);
    ck_assert_int_eq(glob(pattern, 0, NULL, &found), 0);
    ck_assert_uint_ge(found.gl_pathc, n_least);
    for (size_t i = 0; i < found.gl_pathc; i++) {
        FILE *file = fopen(found.gl_pathv[i], "rb");
        ck_assert_ptr_nonnull(file);
        const size_t n = fread(data, 1, MOST, file);
        fclose(file);
        ck_assert_int_eq(reader(data, n), 0);
    }
    globfree(&found);
    free(data);
}

START_TEST(models) {
    replay("tests/fuzz/corpus/model/*", fuzz_model, 3);
    replay("models/*.yaml", fuzz_model, 8);
}
END_TEST

START_TEST(expressions) {
    replay("tests/fuzz/corpus/expression/*", fuzz_expression, 10);
}
END_TEST

START_TEST(quantities) {
    replay("tests/fuzz/corpus/quantity/*", fuzz_quantity, 10);
}
END_TEST

START_TEST(tables) {
    replay("tests/fuzz/corpus/table/*", fuzz_table, 4);
}
END_TEST

START_TEST(data) {
    replay("tests/fuzz/corpus/data/*", fuzz_data, 5);
    replay("models/data/*.csv", fuzz_data, 3);
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"models", models},
        {"expressions", expressions},
        {"quantities", quantities},
        {"tables", tables},
        {"data", data},
    };
    return run_tests("fuzz", tests, sizeof tests / sizeof *tests);
}
