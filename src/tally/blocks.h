/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_TALLY_BLOCKS_H
#define TARRY_TALLY_BLOCKS_H

/* Sums of which most stay 0 (bins of a distribution): an array in blocks of 64 that take memory
 * once they are used. */

#include <stddef.h>

enum { TARRY_BLOCK = 64 };

typedef struct tarry_blocks {
    size_t n;       /* blocks; their sums are numbered through */
    size_t n_taken; /* blocks that take memory */
    double **block; /* [n], NULL where all sums are 0 */
} tarry_blocks;

/* Returns 0, or 1 when memory is short. Release accepts a zeroed one. */
int tarry_blocks_init(tarry_blocks *blocks, size_t n);
void tarry_blocks_release(tarry_blocks *blocks);

/* Blocks that hold n sums. */
static inline size_t tarry_blocks_for(size_t n) {
    return (n + TARRY_BLOCK - 1) / TARRY_BLOCK;
}

/* Make the block usable, zeroed. Returns NULL when memory is short. */
double *tarry_blocks_take(tarry_blocks *blocks, size_t block);

/* Where sum i is kept, to be added to; NULL when memory is short. */
static inline double *tarry_blocks_at(tarry_blocks *blocks, size_t i) {
    double *block = blocks->block[i / TARRY_BLOCK];
    if (!block && !(block = tarry_blocks_take(blocks, i / TARRY_BLOCK)))
        return NULL;
    return block + i % TARRY_BLOCK;
}

/* Value of sum i. */
static inline double tarry_blocks_get(const tarry_blocks *blocks, size_t i) {
    const double *block = blocks->block[i / TARRY_BLOCK];
    return block ? block[i % TARRY_BLOCK] : 0.0;
}

/* Add every sum of `other` (of the same n). Returns 0, or 1 when memory is short. */
int tarry_blocks_merge(tarry_blocks *blocks, const tarry_blocks *other);

#endif
