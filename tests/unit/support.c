/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "support.h"

#include <dirent.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

enum { SECONDS = 60 }; /* for one test; sanitizers are slow, and want small samples */

int run_tests(const char *name, const test_entry *tests, size_t n) {
    Suite *suite = suite_create(name);
    for (size_t i = 0; i < n; i++) {
        TCase *tcase = tcase_create(tests[i].name);
        tcase_set_timeout(tcase, test_small() ? 4 * SECONDS : SECONDS);
        tcase_add_test(tcase, tests[i].test);
        suite_add_tcase(suite, tcase);
    }
    SRunner *runner = srunner_create(suite);
    srunner_run_all(runner, CK_ENV);
    const int failed = srunner_ntests_failed(runner);
    srunner_free(runner);
    return failed == 0 ? EXIT_SUCCESS : EXIT_FAILURE;
}

bool test_small(void) {
    const char *value = getenv("TARRY_TEST_SMALL");
    return value != NULL && value[0] != '\0' && strcmp(value, "0") != 0;
}

enum { PATH_SIZE = 1024, N_PATHS = 16 };

static char folder[PATH_SIZE];

static void remove_below(const char *path, int depth) {
    DIR *open_folder = opendir(path);
    if (open_folder == NULL)
        return;
    const struct dirent *entry;
    while ((entry = readdir(open_folder)) != NULL) {
        char below[PATH_SIZE];
        if (strcmp(entry->d_name, ".") == 0 || strcmp(entry->d_name, "..") == 0)
            continue;
        if (snprintf(below, sizeof below, "%s/%s", path, entry->d_name) >= (int)sizeof below)
            continue;
        struct stat about;
        if (lstat(below, &about) == 0 && S_ISDIR(about.st_mode) && depth < 8)
            remove_below(below, depth + 1);
        else
            unlink(below);
    }
    closedir(open_folder);
    rmdir(path);
}

static void remove_folder(void) {
    remove_below(folder, 0);
}

const char *test_folder(void) {
    if (folder[0] != '\0')
        return folder;
    const char *parent = getenv("TMPDIR");
    if (parent == NULL || parent[0] == '\0')
        parent = "/tmp";
    ck_assert_int_lt(snprintf(folder, sizeof folder, "%s/tarry-test-XXXXXX", parent),
                     (int)sizeof folder - 64);
    ck_assert_msg(mkdtemp(folder) != NULL, "cannot make a folder in %s", parent);
    ck_assert_int_eq(atexit(remove_folder), 0);
    return folder;
}

const char *test_path(const char *name) {
    static char paths[N_PATHS][PATH_SIZE];
    static int next;
    char *path = paths[next++ % N_PATHS];
    ck_assert_int_lt(snprintf(path, PATH_SIZE, "%s/%s", test_folder(), name), PATH_SIZE);
    return path;
}
