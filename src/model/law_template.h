/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_MODEL_LAW_TEMPLATE_H
#define TARRY_MODEL_LAW_TEMPLATE_H

#include "model/builder.h"

/* Make the law that a template stands for with these parameters, its arrays in `arena`, and check
 * it. Errors have the place of the template or of what is wrong in it. */
int tarry_law_template_value(const tarry_law_template *template, const double *parameters,
                             tarry_arena *arena, tarry_law *law, tarry_error *error);

#endif
