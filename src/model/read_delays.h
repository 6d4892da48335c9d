/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_MODEL_READ_DELAYS_H
#define TARRY_MODEL_READ_DELAYS_H

#include "model/builder.h"

/* Fill a template from a measured histogram in a CSV file beside the model: columns from,to,weight
 * (bins, gaps between them empty) or value,weight. Errors have their place in that file. */
int tarry_read_lag_file(tarry_builder *builder, const tarry_node *file, tarry_law_template *law,
                        tarry_error *error);

/* A delay by name or in place. */
int tarry_read_law(tarry_builder *builder, const tarry_node *node, tarry_law_template *law,
                   tarry_error *error);

#endif
