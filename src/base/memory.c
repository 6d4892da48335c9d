/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Heap memory and arenas.
 *
 * An arena is a chain of blocks, the newest first. A block doubles the one before it up to a bound;
 * what would fill most of a block gets one of its own behind the newest, so that the room left
 * there is not lost. */
#include "base/memory.h"

#include <stdarg.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

enum { FIRST_BLOCK = 4096, LARGEST_BLOCK = 1 << 20 };

typedef struct tarry_block {
    struct tarry_block *next;
    size_t size; /* bytes of data */
    size_t used;
    max_align_t data[];
} tarry_block;

void *tarry_calloc(size_t n, size_t size) {
    if (n == 0 || size == 0)
        return calloc(1, 1);
    return calloc(n, size);
}

/* The capacity to go to, or 0 where it would overflow. */
static size_t next_capacity(size_t capacity, size_t needed, size_t size) {
    if (size == 0 || needed > SIZE_MAX / size)
        return 0;
    size_t next = capacity <= SIZE_MAX / 2 / size ? 2 * capacity : needed;
    if (next < 8 && 8 <= SIZE_MAX / size)
        next = 8;
    return next < needed ? needed : next;
}

int tarry_grow(void **array, size_t *capacity, size_t needed, size_t size) {
    if (needed <= *capacity)
        return 0;
    const size_t next = next_capacity(*capacity, needed, size);
    if (next == 0)
        return 1;
    void *grown = realloc(*array, next * size);
    if (grown == NULL)
        return 1;
    *array = grown;
    *capacity = next;
    return 0;
}

static tarry_block *new_block(size_t size) {
    if (size > SIZE_MAX - sizeof(tarry_block))
        return NULL;
    tarry_block *block = calloc(1, sizeof *block + size);
    if (block != NULL)
        block->size = size;
    return block;
}

/* A block with room for n bytes, in the arena's chain. */
static tarry_block *block_for(tarry_arena *arena, size_t n) {
    tarry_block *newest = arena->blocks;
    if (newest != NULL && newest->size - newest->used >= n)
        return newest;

    size_t size = newest == NULL ? FIRST_BLOCK : 2 * newest->size;
    if (size > LARGEST_BLOCK)
        size = LARGEST_BLOCK;
    const int own = n > size / 2;
    tarry_block *block = new_block(own ? n : size);
    if (block == NULL)
        return NULL;
    if (own && newest != NULL) {
        block->next = newest->next;
        newest->next = block;
    } else {
        block->next = newest;
        arena->blocks = block;
    }
    return block;
}

void *tarry_arena_calloc(tarry_arena *arena, size_t n, size_t size) {
    const size_t unit = sizeof(max_align_t);
    if (size != 0 && n > (SIZE_MAX - unit) / size)
        return NULL;
    size_t bytes = (n * size + unit - 1) / unit * unit;
    if (bytes == 0)
        bytes = unit;
    tarry_block *block = block_for(arena, bytes);
    if (block == NULL)
        return NULL;
    void *memory = (char *)block->data + block->used;
    block->used += bytes;
    arena->used += bytes;
    return memory;
}

char *tarry_arena_text(tarry_arena *arena, const char *text, size_t n) {
    if (n == SIZE_MAX)
        return NULL;
    char *copy = tarry_arena_calloc(arena, n + 1, 1);
    if (copy != NULL && n > 0)
        memcpy(copy, text, n);
    return copy;
}

char *tarry_arena_format(tarry_arena *arena, const char *format, ...) {
    va_list arguments, again;
    va_start(arguments, format);
    va_copy(again, arguments);
    char *text = NULL;
    const int n = vsnprintf(NULL, 0, format, arguments);
    if (n >= 0)
        text = tarry_arena_calloc(arena, (size_t)n + 1, 1);
    if (text != NULL)
        vsnprintf(text, (size_t)n + 1, format, again);
    va_end(again);
    va_end(arguments);
    return text;
}

int tarry_arena_grow(tarry_arena *arena, void **array, size_t *capacity, size_t needed,
                     size_t size) {
    if (needed <= *capacity)
        return 0;
    const size_t next = next_capacity(*capacity, needed, size);
    void *grown = next == 0 ? NULL : tarry_arena_calloc(arena, next, size);
    if (grown == NULL)
        return 1;
    if (*capacity > 0)
        memcpy(grown, *array, *capacity * size);
    *array = grown;
    *capacity = next;
    return 0;
}

void tarry_arena_release(tarry_arena *arena) {
    tarry_block *block = arena->blocks;
    while (block != NULL) {
        tarry_block *next = block->next;
        free(block);
        block = next;
    }
    *arena = (tarry_arena){NULL, 0};
}
