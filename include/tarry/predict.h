/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_PREDICT_H
#define TARRY_PREDICT_H

/* What a run would find in the limit of endlessly many cells, worked out without simulation where
 * the mathematics allows (docs/exact.md says where). */

#include "tarry/error.h"
#include "tarry/model.h"
#include "tarry/results.h"

/* Fill the tables of a run with exact values; columns for intervals, standard errors and samples
 * are empty. What cannot be worked out is left out, and the results' warnings say why. *results is
 * the caller's. Errors: TARRY_MEMORY; TARRY_NUMERIC where a method fails on a model that it covers.
 */
int tarry_predict(const tarry_model *model, tarry_results **results, tarry_error *error);

#endif
