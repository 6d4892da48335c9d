/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_BASE_MEMORY_H
#define TARRY_BASE_MEMORY_H

#include <stddef.h>

/* Heap memory with overflow-checked sizes, and arenas for what is freed all at once. */

/* Zeroed memory for n elements; NULL when there is none left or n * size overflows. n may be 0. */
void *tarry_calloc(size_t n, size_t size);

/* Make room for `needed` elements in *array (at least doubling); *capacity follows.
 * Returns 0, or 1 when memory is short: then the array is as it was. New elements are not zeroed.
 */
int tarry_grow(void **array, size_t *capacity, size_t needed, size_t size);

/* An arena: allocations live until release. Zero-initialise ({0}) before use. */
typedef struct tarry_arena {
    struct tarry_block *blocks;
    size_t used; /* bytes handed out */
} tarry_arena;

/* Zeroed, aligned for any type; NULL when memory is short. */
void *tarry_arena_calloc(tarry_arena *arena, size_t n, size_t size);

/* Copy of n bytes of text with a NUL after it; NULL when memory is short. */
char *tarry_arena_text(tarry_arena *arena, const char *text, size_t n);

/* printf into the arena; NULL when memory is short. */
char *tarry_arena_format(tarry_arena *arena, const char *format, ...)
    __attribute__((format(printf, 2, 3)));

/* Like tarry_grow, in an arena: the old array stays behind as garbage until release. */
int tarry_arena_grow(tarry_arena *arena, void **array, size_t *capacity, size_t needed,
                     size_t size);

/* Free everything; the arena is then as new. */
void tarry_arena_release(tarry_arena *arena);

#endif
