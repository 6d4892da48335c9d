/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_ENGINE_VARY_H
#define TARRY_ENGINE_VARY_H

/* Cells that differ in their parameters: each gets an engine of its own, in which what depends on
 * them is worked out anew and all else is shared. Nothing here is touched where nothing varies. */

#include "engine/cell_state.h"
#include "model/variation.h"

struct tarry_vary {
    tarry_cell_network own;
    const tarry_engine *base;
    tarry_engine engine; /* drawers, fixed and propensities are its own */
    tarry_drawer_set *set;
};

/* The drawers of the factors' laws: engine->factors. */
int tarry_vary_prepare(tarry_engine *engine, tarry_error *error);

/* The workspace of one thread, for a network with a variation; its engine and network take the
 * place of the common ones in the cell. */
int tarry_vary_new(const tarry_engine *base, tarry_vary **vary, tarry_error *error);
void tarry_vary_free(tarry_vary *vary); /* NULL is fine */

/* Give the workspace the parameters of a cell. Errors: TARRY_RUN where they cannot be,
 * TARRY_MEMORY. */
int tarry_vary_set(tarry_vary *vary, int64_t number, tarry_error *error);

#endif
