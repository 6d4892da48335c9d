/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Heap memory and arenas. */
#include "base/memory.h"
#include "faults.h"
#include "support.h"

#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

START_TEST(calloc_checks_sizes) {
    ck_assert_ptr_null(tarry_calloc(SIZE_MAX / 2, 4));
    ck_assert_ptr_null(tarry_calloc(4, SIZE_MAX / 2));
    char *none = tarry_calloc(0, 8);
    ck_assert_ptr_nonnull(none);
    free(none);
    char *some = tarry_calloc(100, 3);
    ck_assert_ptr_nonnull(some);
    for (int i = 0; i < 300; i++)
        ASSERT_FAST(some[i] == 0, "byte %d", i);
    free(some);
    faults_arm(FAULT_MEMORY, 0, 0);
    ck_assert_ptr_null(tarry_calloc(1, 1));
    faults_clear();
}
END_TEST

START_TEST(arrays_grow) {
    void *array = NULL;
    size_t capacity = 0, grown = 0;
    for (size_t i = 0; i < 100000; i++) {
        const size_t before = capacity;
        ASSERT_FAST(tarry_grow(&array, &capacity, i + 1, sizeof(size_t)) == 0, "%zu", i);
        ASSERT_FAST(capacity > i && (capacity == before || capacity >= 2 * before), "%zu", i);
        grown += capacity != before;
        ((size_t *)array)[i] = i;
    }
    ck_assert_uint_lt(grown, 20);
    for (size_t i = 0; i < 100000; i++)
        ASSERT_FAST(((size_t *)array)[i] == i, "%zu was lost", i);

    const size_t before = capacity;
    void *const same = array;
    ck_assert_int_eq(tarry_grow(&array, &capacity, SIZE_MAX / 4, sizeof(size_t)), 1);
    ck_assert_int_eq(tarry_grow(&array, &capacity, SIZE_MAX / sizeof(size_t) + 2, sizeof(size_t)),
                     1);
    faults_arm(FAULT_MEMORY, 0, 0);
    ck_assert_int_eq(tarry_grow(&array, &capacity, capacity + 1, sizeof(size_t)), 1);
    faults_clear();
    ck_assert_ptr_eq(array, same);
    ck_assert_uint_eq(capacity, before);
    free(array);
}
END_TEST

START_TEST(arenas_hand_out) {
    enum { N = 3000 };
    static unsigned char *given[N];
    tarry_arena arena = {0};
    size_t total = 0;
    for (size_t i = 0; i < N; i++) {
        const size_t size = i % 97 == 0 ? 50000 : i % 61;
        given[i] = tarry_arena_calloc(&arena, size, 1);
        ASSERT_FAST(given[i] != NULL, "%zu", i);
        ASSERT_FAST((uintptr_t)given[i] % _Alignof(max_align_t) == 0, "%zu is not aligned", i);
        for (size_t j = 0; j < size; j++)
            ASSERT_FAST(given[i][j] == 0, "%zu is not zeroed", i);
        memset(given[i], (int)(i % 251), size);
        total += size;
    }
    for (size_t i = 0; i < N; i++) {
        const size_t size = i % 97 == 0 ? 50000 : i % 61;
        for (size_t j = 0; j < size; j++)
            ASSERT_FAST(given[i][j] == i % 251, "%zu was written over", i);
    }
    ck_assert_uint_ge(arena.used, total);
    ck_assert_uint_le(arena.used, total + N * sizeof(max_align_t));
    tarry_arena_release(&arena);
    ck_assert_ptr_null(arena.blocks);
    ck_assert_uint_eq(arena.used, 0);
    tarry_arena_release(&arena);
}
END_TEST

START_TEST(arenas_check_sizes) {
    tarry_arena arena = {0};
    ck_assert_ptr_null(tarry_arena_calloc(&arena, SIZE_MAX, 1));
    ck_assert_ptr_null(tarry_arena_calloc(&arena, SIZE_MAX - 16, 1));
    ck_assert_ptr_null(tarry_arena_calloc(&arena, SIZE_MAX / 2, 3));
    ck_assert_ptr_null(tarry_arena_text(&arena, "x", SIZE_MAX));
    ck_assert_uint_eq(arena.used, 0);
    tarry_arena_release(&arena);
}
END_TEST

START_TEST(arenas_keep_texts) {
    tarry_arena arena = {0};
    ck_assert_str_eq(tarry_arena_text(&arena, "abcdef", 3), "abc");
    ck_assert_str_eq(tarry_arena_text(&arena, NULL, 0), "");
    ck_assert_str_eq(tarry_arena_format(&arena, "%s_%d", "vela", 3), "vela_3");
    const char *wide = tarry_arena_format(&arena, "%09999d", 5);
    ck_assert_uint_eq(strlen(wide), 9999);
    void *array = NULL;
    size_t capacity = 0;
    for (int i = 0; i < 1000; i++) {
        ASSERT_FAST(tarry_arena_grow(&arena, &array, &capacity, (size_t)i + 1, sizeof i) == 0, "%d",
                    i);
        ((int *)array)[i] = i;
    }
    for (int i = 0; i < 1000; i++)
        ASSERT_FAST(((int *)array)[i] == i, "%d was lost", i);
    tarry_arena_release(&arena);
}
END_TEST

/* One use of everything; returns 1 where something was NULL. */
static int use_arena(tarry_arena *arena) {
    void *array = NULL;
    size_t capacity = 0;
    return tarry_arena_calloc(arena, 100, 8) == NULL || tarry_arena_text(arena, "abc", 3) == NULL ||
           tarry_arena_calloc(arena, 9000, 1) == NULL ||
           tarry_arena_format(arena, "%05000d", 1) == NULL ||
           tarry_arena_grow(arena, &array, &capacity, 5000, 8) != 0;
}

START_TEST(arenas_survive_want_of_memory) {
    for (long n = 0;; n++) {
        tarry_arena arena = {0};
        faults_arm(FAULT_MEMORY, n, 0);
        const int failed = use_arena(&arena);
        const bool struck = faults_struck();
        faults_clear();
        ck_assert_int_eq(failed, struck);
        ck_assert_int_eq(use_arena(&arena), 0);
        tarry_arena_release(&arena);
        if (!struck) {
            ck_assert_int_ge(n, 3);
            break;
        }
    }
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"calloc checks sizes", calloc_checks_sizes},
        {"arrays grow", arrays_grow},
        {"arenas hand out", arenas_hand_out},
        {"arenas check sizes", arenas_check_sizes},
        {"arenas keep texts", arenas_keep_texts},
        {"arenas survive want of memory", arenas_survive_want_of_memory},
    };
    return run_tests("memory", tests, sizeof tests / sizeof tests[0]);
}
