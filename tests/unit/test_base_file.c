/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Files: what is read and written, and what is left when a call fails. SHA-256 against the examples
 * that NIST gives for FIPS 180-4. */
#include "base/file.h"
#include "faults.h"
#include "support.h"

#include <dirent.h>
#include <errno.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

enum { PLENTY = 1 << 20 };

/* Write without the code under test. */
static void put_file(const char *path, const char *bytes, size_t n) {
    FILE *file = fopen(path, "wb");
    ck_assert_ptr_nonnull(file);
    ck_assert_uint_eq(fwrite(bytes, 1, n, file), n);
    ck_assert_int_eq(fclose(file), 0);
}

static bool holds(const char *path, const char *bytes, size_t n) {
    char found[4096];
    FILE *file = fopen(path, "rb");
    if (file == NULL)
        return false;
    const size_t got = fread(found, 1, sizeof found, file);
    fclose(file);
    return got == n && memcmp(found, bytes, n) == 0;
}

/* Names in the test's folder, but for . and .. */
static int count_files(void) {
    DIR *folder = opendir(test_folder());
    ck_assert_ptr_nonnull(folder);
    int n = -2;
    while (readdir(folder) != NULL)
        n++;
    closedir(folder);
    return n;
}

START_TEST(files_are_read) {
    char bytes[200000];
    for (size_t i = 0; i < sizeof bytes; i++)
        bytes[i] = (char)(i * 7 % 251);
    const char *path = test_path("input");
    put_file(path, bytes, sizeof bytes);
    tarry_text text = {0};
    tarry_error error = {0};
    ck_assert_int_eq(tarry_file_read(path, PLENTY, &text, &error), 0);
    ck_assert_uint_eq(text.size, sizeof bytes);
    ck_assert_mem_eq(text.data, bytes, sizeof bytes);
    ck_assert_int_eq(text.data[text.size], 0);
    /* The limit is for the file, and is met exactly. */
    ck_assert_int_eq(tarry_file_read(path, sizeof bytes, &text, &error), 0);
    ck_assert_uint_eq(text.size, 2 * sizeof bytes);
    ck_assert_int_eq(tarry_file_read(path, sizeof bytes - 1, &text, &error), TARRY_INPUT);
    ck_assert_str_eq(error.file, path);
    ck_assert_ptr_nonnull(strstr(error.message, "199999"));
    tarry_text_release(&text);
}
END_TEST

START_TEST(an_empty_file_is_an_empty_text) {
    put_file(test_path("empty"), "", 0);
    tarry_text text = {0};
    tarry_error error = {0};
    ck_assert_int_eq(tarry_file_read(test_path("empty"), 0, &text, &error), 0);
    ck_assert_str_eq(text.data, "");
    tarry_text_release(&text);
}
END_TEST

START_TEST(reading_can_fail) {
    tarry_text text = {0};
    tarry_error error = {0};
    ck_assert_int_eq(tarry_file_read(test_path("missing"), PLENTY, &text, &error), TARRY_FILE);
    ck_assert_str_eq(error.file, test_path("missing"));
    ck_assert_ptr_nonnull(strstr(error.message, strerror(ENOENT)));
    ck_assert_int_eq(tarry_file_read(test_folder(), PLENTY, &text, &error), TARRY_INPUT);

    const char *path = test_path("input");
    put_file(path, "some text", 9);
    faults_arm(FAULT_READ, 1, EIO);
    ck_assert_int_eq(tarry_file_read(path, PLENTY, &text, &error), TARRY_FILE);
    ck_assert(faults_struck());
    ck_assert_ptr_nonnull(strstr(error.message, strerror(EIO)));
    tarry_text_release(&text);

    /* A signal or a short read is no failure. */
    faults_arm(FAULT_READ, 0, EINTR);
    ck_assert_int_eq(tarry_file_read(path, PLENTY, &text, &error), 0);
    ck_assert_str_eq(text.data, "some text");
    tarry_text_release(&text);
    faults_arm(FAULT_READ, 0, 0);
    ck_assert_int_eq(tarry_file_read(path, PLENTY, &text, &error), 0);
    ck_assert(faults_struck());
    ck_assert_str_eq(text.data, "some text");
    tarry_text_release(&text);

    for (long n = 0;; n++) {
        faults_arm(FAULT_MEMORY, n, 0);
        const int status = tarry_file_read(path, PLENTY, &text, &error);
        const bool struck = faults_struck();
        faults_clear();
        ck_assert_int_eq(status, struck ? TARRY_MEMORY : 0);
        tarry_text_release(&text);
        if (!struck)
            break;
    }
}
END_TEST

START_TEST(files_are_written) {
    tarry_error error = {0};
    const char *path = test_path("out.csv");
    ck_assert_int_eq(tarry_file_write(path, "first\n", 6, &error), 0);
    ck_assert(holds(path, "first\n", 6));
    ck_assert_int_eq(tarry_file_write(path, "a\0b", 3, &error), 0);
    ck_assert(holds(path, "a\0b", 3));
    ck_assert_int_eq(tarry_file_write(path, "", 0, &error), 0);
    ck_assert(holds(path, "", 0));
    ck_assert_int_eq(count_files(), 1);
    /* Readable by whom the umask lets. */
    struct stat about;
    umask(022);
    ck_assert_int_eq(tarry_file_write(path, "x", 1, &error), 0);
    ck_assert_int_eq(stat(path, &about), 0);
    ck_assert_int_eq(about.st_mode & 0777, 0644);
    /* An unfinished file of another process is not touched. */
    put_file(test_path("out.csv.part0"), "other", 5);
    ck_assert_int_eq(tarry_file_write(path, "mine", 4, &error), 0);
    ck_assert(holds(path, "mine", 4));
    ck_assert(holds(test_path("out.csv.part0"), "other", 5));
}
END_TEST

/* After each kind of failure nothing new is left and what was there before still is. */
START_TEST(writing_whole_or_not_at_all) {
    const struct {
        fault which;
        int number;
    } cases[] = {{FAULT_OPEN, EACCES},  {FAULT_WRITE, ENOSPC}, {FAULT_FSYNC, EIO},
                 {FAULT_CLOSE, EDQUOT}, {FAULT_RENAME, EPERM}, {FAULT_MEMORY, 0}};
    for (size_t i = 0; i < sizeof cases / sizeof cases[0]; i++)
        for (int before = 0; before < 2; before++) {
            const char *path = test_path("out.csv");
            tarry_error error = {0};
            unlink(path);
            if (before)
                put_file(path, "old", 3);
            faults_arm(cases[i].which, 0, cases[i].number);
            const int status = tarry_file_write(path, "new text", 8, &error);
            const bool struck = faults_struck();
            faults_clear();
            ck_assert(struck);
            ck_assert_int_eq(status, cases[i].which == FAULT_MEMORY ? TARRY_MEMORY : TARRY_FILE);
            ck_assert_int_eq(error.code, status);
            if (cases[i].number != 0)
                ck_assert_ptr_nonnull(strstr(error.message, strerror(cases[i].number)));
            ck_assert_int_eq(count_files(), before);
            ck_assert(!before || holds(path, "old", 3));
        }
}
END_TEST

START_TEST(writing_goes_on_after_signals_and_short_writes) {
    const int numbers[] = {EINTR, 0};
    for (int i = 0; i < 2; i++) {
        tarry_error error = {0};
        faults_arm(FAULT_WRITE, 0, numbers[i]);
        ck_assert_int_eq(tarry_file_write(test_path("out"), "some text", 9, &error), 0);
        ck_assert(faults_struck());
        faults_clear();
        ck_assert(holds(test_path("out"), "some text", 9));
    }
}
END_TEST

START_TEST(writing_where_one_cannot) {
    tarry_error error = {0};
    ck_assert_int_eq(tarry_file_write(test_path("no/out"), "x", 1, &error), TARRY_FILE);
    ck_assert_str_eq(error.file, test_path("no/out"));
    ck_assert_int_eq(tarry_file_write(test_path("no/out"), "x", 1, NULL), TARRY_FILE);
    ck_assert_int_eq(mkdir(test_path("folder"), 0777), 0);
    ck_assert_int_eq(tarry_file_write(test_path("folder"), "x", 1, &error), TARRY_FILE);
    ck_assert_int_eq(count_files(), 1);
    for (int i = 0; i < 100; i++) {
        char name[32];
        snprintf(name, sizeof name, "out.part%d", i);
        put_file(test_path(name), "", 0);
    }
    ck_assert_int_eq(tarry_file_write(test_path("out"), "x", 1, &error), TARRY_FILE);
    ck_assert_ptr_nonnull(strstr(error.message, "remove"));
}
END_TEST

START_TEST(names_are_flushed) {
    tarry_error error = {0};
    ck_assert_int_eq(tarry_folder_flush(test_folder(), &error), 0);
    ck_assert_int_eq(tarry_folder_flush(test_path("none"), &error), 0);
    const fault kinds[] = {FAULT_OPEN, FAULT_FSYNC, FAULT_CLOSE};
    for (size_t i = 0; i < sizeof kinds / sizeof *kinds; i++) {
        faults_arm(kinds[i], 0, EIO);
        const int status = tarry_folder_flush(test_folder(), &error);
        faults_clear();
        ck_assert_int_eq(status, TARRY_FILE);
        ck_assert_str_eq(error.file, test_folder());
        ck_assert_ptr_nonnull(strstr(error.message, strerror(EIO)));
    }
}
END_TEST

START_TEST(folders) {
    tarry_error error = {0};
    bool yes = false;
    ck_assert_int_eq(tarry_folder_is_empty(test_path("new"), &yes, &error), 0);
    ck_assert(yes);
    for (int i = 0; i < 2; i++)
        ck_assert_int_eq(tarry_folder_make(test_path("new"), &error), 0);
    yes = false;
    ck_assert_int_eq(tarry_folder_is_empty(test_path("new"), &yes, &error), 0);
    ck_assert(yes);
    put_file(test_path("new/.hidden"), "", 0);
    ck_assert_int_eq(tarry_folder_is_empty(test_path("new"), &yes, &error), 0);
    ck_assert(!yes);
    put_file(test_path("file"), "", 0);
    ck_assert_int_eq(tarry_folder_is_empty(test_path("file"), &yes, &error), TARRY_FILE);
    ck_assert_int_eq(tarry_folder_make(test_path("file"), &error), TARRY_FILE);
    ck_assert_ptr_nonnull(strstr(error.message, "a file of that name"));
    ck_assert_int_eq(tarry_folder_make(test_path("a/b"), &error), TARRY_FILE);

    ck_assert_int_eq(tarry_folder_writable(test_path("new"), &error), 0);
    ck_assert_int_eq(tarry_folder_writable(test_path("later"), &error), 0);
    ck_assert_int_eq(tarry_folder_writable(test_path("none/later"), &error), TARRY_FILE);
    ck_assert_int_eq(tarry_file_exists(test_path("later"), &yes, &error), 0);
    ck_assert(!yes);
}
END_TEST

START_TEST(files_are_found_and_removed) {
    tarry_error error = {0};
    bool yes = false;
    put_file(test_path("file"), "", 0);
    ck_assert_int_eq(tarry_file_exists(test_path("file"), &yes, &error), 0);
    ck_assert(yes);
    ck_assert_int_eq(tarry_file_remove(test_path("file"), &error), 0);
    ck_assert_int_eq(count_files(), 0);
    ck_assert_int_eq(tarry_file_remove(test_path("file"), &error), 0);
    ck_assert_int_eq(tarry_file_exists(test_path("file"), &yes, &error), 0);
    ck_assert(!yes);
    ck_assert_int_eq(tarry_folder_make(test_path("folder"), &error), 0);
    ck_assert_int_eq(tarry_file_remove(test_path("folder"), &error), TARRY_FILE);
}
END_TEST

/* NIST, "Examples with intermediate values", SHA256.pdf, and the million a's of FIPS 180-2,
 * appendix B.3; the empty message as coreutils' sha256sum gives it. */
START_TEST(sha256) {
    char out[TARRY_SHA256_TEXT];
    tarry_sha256("", 0, out);
    ck_assert_str_eq(out, "e3b0c44298fc1c149afbf4c8996fb92427ae41e4649b934ca495991b7852b855");
    tarry_sha256("abc", 3, out);
    ck_assert_str_eq(out, "ba7816bf8f01cfea414140de5dae2223b00361a396177a9cb410ff61f20015ad");
    const char *two_blocks = "abcdbcdecdefdefgefghfghighijhijkijkljklmklmnlmnomnopnopq";
    tarry_sha256(two_blocks, strlen(two_blocks), out);
    ck_assert_str_eq(out, "248d6a61d20638b8e5c026930c3e6039a33ce45964ff2167f6ecedd419db06c1");
    char *million = malloc(1000000);
    ck_assert_ptr_nonnull(million);
    memset(million, 'a', 1000000);
    tarry_sha256(million, 1000000, out);
    free(million);
    ck_assert_str_eq(out, "cdc76e5c9914fb9281a1c7e284d73e67f1809a48a497200e046d39ccc7112cd0");
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"files are read", files_are_read},
        {"an empty file is an empty text", an_empty_file_is_an_empty_text},
        {"reading can fail", reading_can_fail},
        {"files are written", files_are_written},
        {"writing whole or not at all", writing_whole_or_not_at_all},
        {"writing goes on", writing_goes_on_after_signals_and_short_writes},
        {"writing where one cannot", writing_where_one_cannot},
        {"names are flushed", names_are_flushed},
        {"folders", folders},
        {"files are found and removed", files_are_found_and_removed},
        {"SHA-256", sha256},
    };
    return run_tests("files", tests, sizeof tests / sizeof tests[0]);
}
