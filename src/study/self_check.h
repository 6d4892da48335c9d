/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_STUDY_SELF_CHECK_H
#define TARRY_STUDY_SELF_CHECK_H

/* Figures beside exact laws: those of a run beside its own (docs/statistics.md, "A run checks
 * itself"), those of data beside a model's. */

#include "model/network.h"
#include "tally/results.h"

/* More genes than this are not compared: the laws of each take their time. */
enum { TARRY_SELF_CHECK_GENES = 20 };

/* Work out the exact laws of a run that kept a ledger, put them into its results, and say there how
 * far figures and laws are apart. Of more genes than above, or of fewer than 20 cells, there are no
 * laws; where nothing has an exact law nothing is compared. Errors: TARRY_MEMORY. */
int tarry_self_check_run(const tarry_network *network, tarry_results *results, tarry_error *error);

/* The same of data that kept a ledger, beside the laws of the model that they are measured beside.
 * With fewer than 20 cells, or groups of them, the laws are there and nothing is compared. */
int tarry_self_check_beside(const tarry_network *data, tarry_results *results, tarry_error *error);

/* The comparison alone, with `exact` in the place of the laws; intervals come from so many cells,
 * or dishes and the like. */
int tarry_self_check_compare(tarry_results *results, const tarry_results *exact,
                             int64_t n_resampled, tarry_error *error);

#endif
