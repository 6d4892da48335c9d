/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Files that cannot be opened, read, written, flushed, closed or put in their place: each such call
 * of a whole `tarry run` fails once, in a new folder and over the results of an earlier run. */

#include "cli/talk.h"
#include "faults.h"
#include "finished.h"
#include "support.h"
#include "whole_program.h"

#include <errno.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

static const char model[] =
    "tarry: 1\n"
    "time: min\n"
    "delays: {making: {table: {file: lags.csv}}}\n"
    "genes:\n"
    "  vela:\n"
    "    promoter: {shut: {to: {open: 1}}, open: {to: {shut: 1}, initiates: "
    "3}}\n"
    "    transcript: {stages: {nascent: making}, half_life: 5}\n"
    "run: {cells: 2, until: 2, every: 1}\n";

static void put_file(const char *path, const char *text) {
    FILE *file = fopen(path, "w");
    ck_assert_ptr_nonnull(file);
    ck_assert_int_ne(fputs(text, file), EOF);
    ck_assert_int_eq(fclose(file), 0);
}

/* `tarry run` into `folder`, over what is there. */
static int run_into(const char *folder, char *said, size_t size) {
    static char run[] = "run", keep[] = "--keep=1", overwrite[] = "--overwrite", out[] = "--out";
    static char figures[] = "--figures=none"; /* a picture that cannot be read is only told of */
    char *words[] = {
        run, (char *)test_path("model.yaml"), keep, overwrite, out, (char *)folder, figures, NULL};
    return program_call(words, said, size);
}

/* What must hold after a failure: it was told of which file, and why; and the folder holds nothing,
 * or the whole of the earlier results. What is met before simulating may be called a wrong setting;
 * then nothing has been touched. */
static void check_failure(int status, const char *said, const char *folder, int number,
                          int files_before) {
    ck_assert_msg(status == TARRY_EXIT_FAILED || status == TARRY_EXIT_WRONG, "%d: %s", status,
                  said);
    ck_assert_msg(strstr(said, strerror(number)) != NULL, "no reason: %s", said);
    ck_assert_msg(strstr(said, folder) || strstr(said, "model.yaml") || strstr(said, "lags.csv"),
                  "no file: %s", said);
    const folder_state state = look_at_folder(folder);
    const int n_files = count_files_in(folder);
    if (status == TARRY_EXIT_WRONG || state == FOLDER_FINISHED)
        ck_assert_msg(n_files == files_before && state != FOLDER_BROKEN, "%d files: %s", n_files,
                      said);
    else
        ck_assert_msg(state == FOLDER_UNFINISHED && n_files <= 0, "%d files: %s", n_files, said);
}

/* Fail the n-th call of a kind for each n (every third where samples are small). Returns how many
 * there are. */
static long fail_each(fault which, int number, bool earlier) {
    char folder[512], said[2048];
    for (long n = 0;; n += test_small() ? 3 : 1) {
        snprintf(folder, sizeof folder, "%s/out%ld", test_folder(), n);
        if (earlier)
            ck_assert_int_eq(run_into(folder, said, sizeof said), 0);
        const int before = count_files_in(folder);
        faults_arm(which, n, number);
        const int status = run_into(folder, said, sizeof said);
        const bool struck = faults_struck();
        faults_clear();
        if (!status)
            ck_assert_msg(look_at_folder(folder) == FOLDER_FINISHED, "call %ld", n);
        if (!struck) {
            ck_assert_int_eq(status, 0);
            return n;
        }
        /* Of a file that was only read, closing may fail. */
        if (status || which != FAULT_CLOSE)
            check_failure(status, said, folder, number, before);
    }
}

START_TEST(each_in_turn) {
    const struct {
        fault which;
        int number;
        int least[2]; /* calls there must be: in a new folder, over an earlier run */
    } cases[] = {
        {FAULT_OPEN, EMFILE, {10, 12}},  {FAULT_READ, EIO, {4, 8}},
        {FAULT_WRITE, ENOSPC, {10, 10}}, {FAULT_FSYNC, EIO, {12, 12}},
        {FAULT_CLOSE, EDQUOT, {10, 10}}, {FAULT_RENAME, EACCES, {10, 10}},
    };
    const size_t i = (size_t)_i / 2;
    const int earlier = _i % 2;
    put_file(test_path("model.yaml"), model);
    put_file(test_path("lags.csv"), "value,weight\n1,2\n3,1\n");
    program_listen();
    ck_assert_int_ge(fail_each(cases[i].which, cases[i].number, earlier), cases[i].least[earlier]);
}
END_TEST

int main(void) {
    Suite *suite = suite_create("lost files");
    TCase *tests = tcase_create("each in turn");
    tcase_set_timeout(tests, test_small() ? 240 : 60);
    tcase_add_loop_test(tests, each_in_turn, 0, 12);
    suite_add_tcase(suite, tests);
    SRunner *runner = srunner_create(suite);
    srunner_run_all(runner, CK_ENV);
    const int failed = srunner_ntests_failed(runner);
    srunner_free(runner);
    return failed == 0 ? EXIT_SUCCESS : EXIT_FAILURE;
}
