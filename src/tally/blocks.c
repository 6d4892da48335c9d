/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "tally/blocks.h"

#include "base/memory.h"

#include <stdlib.h>

int tarry_blocks_init(tarry_blocks *blocks, size_t n) {
    *blocks = (tarry_blocks){.n = n};
    blocks->block = tarry_calloc(n ? n : 1, sizeof *blocks->block);
    return blocks->block ? 0 : 1;
}

void tarry_blocks_release(tarry_blocks *blocks) {
    for (size_t i = 0; blocks->block && i < blocks->n; i++)
        free(blocks->block[i]);
    free(blocks->block);
    *blocks = (tarry_blocks){0};
}

double *tarry_blocks_take(tarry_blocks *blocks, size_t block) {
    if (!blocks->block[block]) {
        blocks->block[block] = tarry_calloc(TARRY_BLOCK, sizeof(double));
        blocks->n_taken += blocks->block[block] != NULL;
    }
    return blocks->block[block];
}

int tarry_blocks_merge(tarry_blocks *blocks, const tarry_blocks *other) {
    for (size_t i = 0; i < blocks->n; i++) {
        const double *from = other->block[i];
        if (!from)
            continue;
        double *to = tarry_blocks_take(blocks, i);
        if (!to)
            return 1;
        for (int j = 0; j < TARRY_BLOCK; j++)
            to[j] += from[j];
    }
    return 0;
}
