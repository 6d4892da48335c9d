/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_TESTS_SAME_CELLS_H
#define TARRY_TESTS_SAME_CELLS_H

/* The engine's cells against the plain loop's, byte by byte. */

#include <stddef.h>
#include <stdint.h>
#include "model/network.h"

enum { SAME_CELLS_TEXT = 512 };

typedef enum same_cells {
    CELLS_SAME,
    CELLS_DIFFER,
    CELLS_NONE, /* the model was refused, or a cell failed on both sides */
} same_cells;

/* Run cells 0 .. n_cells - 1 both ways. `where` says what differs, or why there is nothing. */
same_cells compare_cells(const tarry_network *network, int64_t n_cells,
                         char where[SAME_CELLS_TEXT]);

/* The same for a model's text. *n_firings (may be NULL) gets the reactions that fired in all. */
same_cells compare_text(const char *text, int64_t n_cells, double *n_firings,
                        char where[SAME_CELLS_TEXT]);

#endif
