/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_MODEL_STEADY_H
#define TARRY_MODEL_STEADY_H

#include "model/builder.h"

/* Promoters and the values that are in force; `promoters` gets what is worked out. */
typedef struct tarry_steady_source {
    const tarry_gene *genes;
    size_t n_genes;
    tarry_promoter *promoters;
    const tarry_promoter_state *states;
    const tarry_lag *lags;
    const tarry_builder_move *moves; /* by gene */
    size_t n_moves;
    const tarry_segment *segments;
    size_t n_segments;
    tarry_arena *arena; /* for the starts */
} tarry_steady_source;

/* Work out the start of every promoter that says `start: steady`, and refuse cycles of states that
 * take no time. The segments' rates and laws must be known. */
int tarry_steady_starts(const tarry_steady_source *source, tarry_error *error);

#endif
