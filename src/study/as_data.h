/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_STUDY_AS_DATA_H
#define TARRY_STUDY_AS_DATA_H

/* A run told as a laboratory would tell it, in the forms that tarry_measure reads: films of all
 * cells, each cell fixed at one snapshot, or means over cells with their standard errors. */

#include "study/gather.h"
#include "tally/results.h"
#include "tarry/run.h"

/* Choose what is kept of the cells for that form. TARRY_INPUT where the model has nothing to show
 * in it, or a name that has a meaning of its own in data. */
int tarry_as_data_init(tarry_gather *gather, const tarry_network *network, tarry_data_form form,
                       tarry_error *error);

/* Put the table of the first n cells into the results, whose other tables are there. */
int tarry_as_data_report(const tarry_gather *gather, tarry_data_form form, int64_t n,
                         tarry_results *results, tarry_error *error);

#endif
