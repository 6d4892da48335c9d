/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_MODEL_PARAMETER_ORDER_H
#define TARRY_MODEL_PARAMETER_ORDER_H

/* Parameters may be expressions of one another, in any order in the file. */

#include "model/builder.h"

/* Put into order[0..n) all parameters so that each comes after those that its expression reads, and
 * tell `visit` (may be NULL) of each in that order. TARRY_INPUT where some go round in a circle;
 * the error names the chain. The first code other than 0 from `visit` ends it. */
int tarry_parameter_order(tarry_builder *builder, uint32_t *order,
                          int (*visit)(void *context, uint32_t parameter, tarry_error *error),
                          void *context, tarry_error *error);

/* The values that parameters have where `values` holds those of the fixed ones: all others are
 * worked out anew, in builder->order. TARRY_INPUT where one comes to no finite number. */
int tarry_parameter_values(const tarry_builder *builder, const bool *fixed, double *values,
                           tarry_error *error);

#endif
