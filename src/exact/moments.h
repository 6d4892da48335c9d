/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_EXACT_MOMENTS_H
#define TARRY_EXACT_MOMENTS_H

/* Mean and variance of a count without its law. */

#include "exact/carried.h"

typedef struct tarry_exact_moments {
    double mean, variance;
} tarry_exact_moments;

/* At each of n_times times (ascending, none before the start), of what the transcripts of all
 * copies carry; within about 1e-8 of themselves. Errors: TARRY_MEMORY, TARRY_NUMERIC. */
int tarry_exact_moments_at(const tarry_exact_gene *gene, tarry_exact_carried *carried,
                           const double *times, size_t n_times, tarry_exact_moments *moments,
                           tarry_error *error);

/* The mean number of initiations per unit of time on all copies at `time`. */
int tarry_exact_initiations(const tarry_exact_gene *gene, double time, double *rate,
                            tarry_error *error);

#endif
