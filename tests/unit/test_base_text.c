/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Errors, growing texts, nearest words and notes. */
#include "base/error.h"
#include "base/notes.h"
#include "base/text.h"
#include "faults.h"
#include "support.h"

#include <limits.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

START_TEST(errors_say_where) {
    char out[2048];
    tarry_error error = {0};
    const tarry_place place = {"a.yaml", 3, 7};
    ck_assert_int_eq(tarry_fail_at(&error, TARRY_INPUT, place, "%d is %s", 5, "odd"), TARRY_INPUT);
    ck_assert_int_eq(error.code, TARRY_INPUT);
    ck_assert_str_eq(tarry_error_text(&error, out, sizeof out), "a.yaml:3:7: 5 is odd");
    ck_assert_int_eq(tarry_error_context(&error, "gene %s", "vela"), TARRY_INPUT);
    ck_assert_str_eq(tarry_error_text(&error, out, sizeof out), "a.yaml:3:7: gene vela: 5 is odd");

    tarry_fail_at(&error, TARRY_FILE, (tarry_place){"b", 0, 0}, "gone");
    ck_assert_str_eq(tarry_error_text(&error, out, sizeof out), "b: gone");
    tarry_fail_at(&error, TARRY_FILE, (tarry_place){"b", 4, 0}, "gone");
    ck_assert_str_eq(tarry_error_text(&error, out, sizeof out), "b:4: gone");
    tarry_fail_at(&error, TARRY_FILE, (tarry_place){NULL, 4, 2}, "gone");
    ck_assert_str_eq(tarry_error_text(&error, out, sizeof out), "4:2: gone");
    ck_assert_int_eq(tarry_fail(&error, TARRY_RUN, "plain"), TARRY_RUN);
    ck_assert_str_eq(tarry_error_text(&error, out, sizeof out), "plain");
    ck_assert_int_eq(tarry_fail_memory(&error, "a tree"), TARRY_MEMORY);
    ck_assert_ptr_nonnull(strstr(error.message, "a tree"));
}
END_TEST

START_TEST(errors_may_be_null) {
    char out[8] = "before";
    ck_assert_int_eq(tarry_fail(NULL, TARRY_RUN, "x"), TARRY_RUN);
    ck_assert_int_eq(tarry_fail_at(NULL, TARRY_INPUT, (tarry_place){0}, "x"), TARRY_INPUT);
    ck_assert_int_eq(tarry_fail_memory(NULL, "x"), TARRY_MEMORY);
    ck_assert_int_ne(tarry_error_context(NULL, "x"), 0);
    ck_assert_str_eq(tarry_error_text(NULL, out, sizeof out), "");
}
END_TEST

/* Exit statuses are the design's: 1 failed while running, 2 wrong input, 3 interrupted. */
START_TEST(codes_have_texts_and_statuses) {
    ck_assert_int_eq(tarry_code_status(TARRY_OK), 0);
    ck_assert_int_eq(tarry_code_status(TARRY_INPUT), 2);
    ck_assert_int_eq(tarry_code_status(TARRY_RUN), 1);
    ck_assert_int_eq(tarry_code_status(TARRY_INTERRUPTED), 3);
    for (int code = TARRY_OK; code <= TARRY_INTERRUPTED; code++)
        ck_assert_uint_gt(strlen(tarry_code_text((tarry_code)code)), 0);
    ck_assert_str_eq(tarry_code_text((tarry_code)99), "unknown error");
    ck_assert_int_eq(tarry_code_status((tarry_code)99), 1);
}
END_TEST

/* Whole characters of UTF-8, as RFC 3629 builds them. */
static bool is_utf8(const char *text) {
    for (const unsigned char *at = (const unsigned char *)text; *at != '\0';) {
        int more = *at < 0x80 ? 0 : *at >= 0xf0 ? 3 : *at >= 0xe0 ? 2 : *at >= 0xc0 ? 1 : -1;
        if (more < 0)
            return false;
        for (at++; more > 0; more--, at++)
            if ((*at & 0xc0) != 0x80)
                return false;
    }
    return true;
}

START_TEST(long_errors_are_cut_between_characters) {
    static const char *const characters[] = {"a", "ä", "→", "𝛼"};
    for (size_t c = 0; c < 4; c++)
        for (size_t shift = 0; shift < 4; shift++) {
            char text[4096] = "";
            for (size_t i = 0; i < shift; i++)
                strcat(text, "x");
            while (strlen(text) < 2000)
                strcat(text, characters[c]);
            tarry_error error = {0};
            tarry_fail_at(&error, TARRY_INPUT, (tarry_place){text, 1, 1}, "%s", text);
            ck_assert(is_utf8(error.message) && is_utf8(error.file));
            ck_assert_uint_ge(strlen(error.message), sizeof error.message - 5);
            ck_assert_int_eq(strncmp(error.message, text, strlen(error.message)), 0);
            ck_assert_uint_ge(strlen(error.file), sizeof error.file - 5);
            ck_assert_int_eq(strncmp(error.file, "...", 3), 0);
            ck_assert_str_eq(text + strlen(text) - strlen(error.file) + 3, error.file + 3);
            tarry_error_context(&error, "while %s", "reading");
            ck_assert(is_utf8(error.message));
            ck_assert_int_eq(strncmp(error.message, "while reading: ", 15), 0);
            tarry_error_context(&error, "%s", text);
            ck_assert(is_utf8(error.message));
        }
    /* What just goes in is not cut. */
    char full[sizeof((tarry_error *)0)->message];
    memset(full, 'f', sizeof full);
    full[sizeof full - 1] = '\0';
    memcpy(full + sizeof full - 4, "→", 3);
    tarry_error error = {0};
    tarry_fail(&error, TARRY_INPUT, "%s", full);
    ck_assert_str_eq(error.message, full);
    char path[sizeof error.file];
    memset(path, 'p', sizeof path);
    path[sizeof path - 1] = '\0';
    tarry_fail_at(&error, TARRY_INPUT, (tarry_place){path, 0, 0}, "x");
    ck_assert_str_eq(error.file, path);
}
END_TEST

START_TEST(texts_grow) {
    tarry_text text = {0};
    char truth[40000] = "";
    size_t n = 0;
    for (int i = 0; i < 3000; i++) {
        tarry_text_printf(&text, "%d,", i);
        n += (size_t)snprintf(truth + n, sizeof truth - n, "%d,", i);
    }
    tarry_text_add(&text, "abc", 2);
    tarry_text_add_string(&text, "→");
    tarry_text_add_number(&text, 0.25);
    tarry_text_add(&text, "", 0);
    snprintf(truth + n, sizeof truth - n, "ab→0.25");
    ck_assert(!text.failed);
    ck_assert_uint_eq(text.size, strlen(truth));
    ck_assert_str_eq(text.data, truth);
    tarry_text_release(&text);
    ck_assert_ptr_null(text.data);
    tarry_text_release(&text);
}
END_TEST

static void fill_text(tarry_text *text) {
    tarry_text_add_string(text, "one");
    for (int i = 0; i < 100; i++)
        tarry_text_add_number(text, i / 7.0);
    tarry_text_printf(text, "%0200d", 1);
    tarry_text_add_string(text, "end");
}

START_TEST(texts_remember_want_of_memory) {
    for (long n = 0;; n++) {
        tarry_text text = {0};
        faults_arm(FAULT_MEMORY, n, 0);
        fill_text(&text);
        const bool failed = text.failed, struck = faults_struck();
        faults_clear();
        tarry_text_release(&text);
        if (!struck) {
            ck_assert(!failed);
            ck_assert_int_gt(n, 3);
            break;
        }
        ck_assert(failed);
    }
    tarry_text text = {0};
    tarry_text_add(&text, "x", SIZE_MAX);
    ck_assert(text.failed);
    tarry_text_release(&text);
}
END_TEST

/* Expected by counting the edits by hand. */
START_TEST(nearest_words) {
    const char *const keys[] = {"cells", "settle", "until", "every", "snapshots", "seed", "x"};
    const struct {
        const char *word, *nearest;
    } cases[] = {
        {"cels", "cells"},
        {"cell", "cells"},
        {"setle", "settle"},
        {"snapshot", "snapshots"},
        {"snpashtos", "snapshots"},
        {"evrey", "every"},
        {"sed", "seed"},
        {"cells", "cells"},
        {"unitl", "until"},
        {"seeeeed", NULL},
        {"banana", NULL},
        {"y", NULL},
        {"", NULL},
        {"ntl", NULL},
        {"xy", "x"},
        {"ever", "every"},
        {"ce", NULL},
    };
    for (size_t i = 0; i < sizeof cases / sizeof cases[0]; i++) {
        const char *found = tarry_nearest_word(cases[i].word, keys, sizeof keys / sizeof keys[0]);
        ck_assert_msg(found == NULL
                          ? cases[i].nearest == NULL
                          : cases[i].nearest != NULL && strcmp(found, cases[i].nearest) == 0,
                      "%s gave %s", cases[i].word, found != NULL ? found : "nothing");
    }
    char very_long[200];
    memset(very_long, 'a', sizeof very_long - 1);
    very_long[sizeof very_long - 1] = '\0';
    const char *const long_key = very_long;
    ck_assert_ptr_null(tarry_nearest_word(very_long, keys, 7));
    ck_assert_ptr_null(tarry_nearest_word("aaaa", &long_key, 1));
    ck_assert_ptr_null(tarry_nearest_word("aaaa", NULL, 0));
    /* Just within what is compared. */
    very_long[63] = '\0';
    char other[64];
    memcpy(other, very_long, sizeof other);
    other[20] = 'b';
    ck_assert_ptr_eq(tarry_nearest_word(other, &long_key, 1), long_key);
}
END_TEST

START_TEST(notes_are_kept_once) {
    tarry_notes notes = {0};
    tarry_error error = {0};
    const tarry_place place = {"m.yaml", 2, 5};
    for (int i = 0; i < 40; i++)
        ck_assert_int_eq(tarry_notes_add(&notes, place, &error, "number %d", i % 20), 0);
    ck_assert_int_eq(tarry_notes_add(&notes, (tarry_place){0}, &error, "number 0"), 0);
    ck_assert_int_eq(tarry_notes_add(&notes, (tarry_place){"f", 0, 0}, &error, "z"), 0);
    ck_assert_uint_eq(notes.n, 22);
    ck_assert_str_eq(notes.lines[0], "m.yaml:2:5: number 0");
    ck_assert_str_eq(notes.lines[19], "m.yaml:2:5: number 19");
    ck_assert_str_eq(notes.lines[20], "number 0");
    ck_assert_str_eq(notes.lines[21], "f: z");
    tarry_notes_release(&notes);
    ck_assert_uint_eq(notes.n, 0);
    tarry_notes_release(&notes);
}
END_TEST

START_TEST(notes_survive_want_of_memory) {
    for (long n = 0;; n++) {
        tarry_notes notes = {0};
        tarry_error error = {0};
        int status = 0;
        faults_arm(FAULT_MEMORY, n, 0);
        for (int i = 0; i < 12 && status == 0; i++)
            status = tarry_notes_add(&notes, (tarry_place){"f", 1, 1}, &error, "number %d", i);
        const bool struck = faults_struck();
        faults_clear();
        ck_assert_int_eq(status, struck ? TARRY_MEMORY : 0);
        ck_assert_int_eq(error.code, status);
        for (size_t i = 0; i < notes.n; i++)
            ck_assert_int_eq(strncmp(notes.lines[i], "f:1:1: number", 13), 0);
        tarry_notes_release(&notes);
        if (!struck)
            break;
    }
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"errors say where", errors_say_where},
        {"errors may be NULL", errors_may_be_null},
        {"codes have texts and statuses", codes_have_texts_and_statuses},
        {"long errors are cut between characters", long_errors_are_cut_between_characters},
        {"texts grow", texts_grow},
        {"texts remember want of memory", texts_remember_want_of_memory},
        {"nearest words", nearest_words},
        {"notes are kept once", notes_are_kept_once},
        {"notes survive want of memory", notes_survive_want_of_memory},
    };
    return run_tests("errors and texts", tests, sizeof tests / sizeof tests[0]);
}
