/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_EXACT_PHASES_H
#define TARRY_EXACT_PHASES_H

/* Waiting times as ways through phases that each last an exponential time: a sum or mix of
 * exponential times is the time to leave a small Markov chain (Neuts 1981, Matrix-Geometric
 * Solutions in Stochastic Models, chapter 2; from memory). */

#include <stdbool.h>
#include <stddef.h>
#include "base/memory.h"
#include "model/law.h"

typedef struct tarry_phases {
    size_t n;
    double *entry; /* [n] probability to begin in a phase; they sum to 1 */
    double *moves; /* [from][to] rates between phases, 0 on the diagonal */
    double *exit;  /* [n] rates out of the whole */
    double *met;   /* [n] the phase in which a wait under way is met in the steady state */
} tarry_phases;

enum { TARRY_PHASES_MOST = 120 };

/* The phases of a law, in `arena`. *is_made: false where the law is no sum or mix of exponential
 * times, or has more than TARRY_PHASES_MOST phases; then nothing else is filled. 0, TARRY_MEMORY or
 * TARRY_NUMERIC. */
int tarry_phases_read(const tarry_law *law, tarry_arena *arena, tarry_phases *phases, bool *is_made,
                      tarry_error *error);

#endif
