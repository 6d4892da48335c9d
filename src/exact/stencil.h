/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_EXACT_STENCIL_H
#define TARRY_EXACT_STENCIL_H

/* Which states' unknowns meet while the collocation equations of a promoter's chain are eliminated
 * state after state: a chain of phases meets its neighbours only, and what is 0 throughout is never
 * touched (symbolic elimination; George & Liu 1981, Computer Solution of Large Sparse Positive
 * Definite Systems, chapter 5; from memory). Unknown i of state p has the number p * nodes + i. */

#include "exact/radau.h"

#include <stdbool.h>
#include "tarry/error.h"

typedef struct tarry_stencil_run {
    size_t from, to; /* columns of states from <= q < to; state n_states is the right-hand side */
} tarry_stencil_run;

typedef struct tarry_stencil {
    size_t n_states;
    bool *moves, *meets;     /* [n_states][n_states]: before and after elimination */
    size_t *rows;            /* a pivot and the states below it that meet it, pivot after pivot, */
    size_t *row_starts;      /* [n_states + 1] */
    tarry_stencil_run *runs; /* columns of a pivot's row from itself on, likewise, */
    size_t *run_starts;      /* [n_states + 1] */
} tarry_stencil;

/* Nothing moves yet. Zero-initialise ({0}); release accepts a zeroed or half-built one. 0 or
 * TARRY_MEMORY. */
int tarry_stencil_init(tarry_stencil *stencil, size_t n_states, tarry_error *error);
void tarry_stencil_release(tarry_stencil *stencil);

/* Let it cover all places where these matrices ([n_states][n_states]) are not 0, as well. */
void tarry_stencil_cover(tarry_stencil *stencil, const double *quiet, const double *jump);

#endif
