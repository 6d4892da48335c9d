/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_MODEL_SEGMENT_VALUES_H
#define TARRY_MODEL_SEGMENT_VALUES_H

/* What a segment's parameters come to: rates, mean numbers, formulas and laws of waiting times. */

#include "model/builder.h"

typedef struct tarry_value_sources {
    const tarry_source *rates;
    size_t n_rates;
    const tarry_source *means;
    size_t n_means;
    const tarry_expression *formulas;
    size_t n_formulas;
    const tarry_law_template *laws;
    size_t n_laws;
} tarry_value_sources;

/* Fill rates, means, formulas and laws of a segment from its parameters, all in `arena`.
 * TARRY_INPUT with the place of a value that cannot be, or TARRY_MEMORY. */
int tarry_segment_fill(const tarry_value_sources *sources, tarry_arena *arena,
                       tarry_segment *segment, tarry_error *error);

#endif
