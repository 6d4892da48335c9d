/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_EXACT_COUNTS_H
#define TARRY_EXACT_COUNTS_H

/* The law of a count: of one stage's molecules, or of the transcript. */

#include "exact/carried.h"

/* p[0 .. n-1]; what lies beyond adds up to less than 1e-14. n is 0 where the law would need
 * `most` numbers or more. */
typedef struct tarry_exact_counts {
    double *p;
    size_t n;
} tarry_exact_counts;

enum { TARRY_COUNTS_MOST = 1 << 16 };

/* `most`: at most TARRY_COUNTS_MOST. Laws at each of n_times times (ascending, none before the
 * start) of what transcripts carry. Relative error below 1e-6 where the probability is above 1e-12.
 * counts[n_times] zeroed; release each. Errors: TARRY_MEMORY, TARRY_NUMERIC. */
int tarry_exact_counts_at(const tarry_exact_gene *gene, tarry_exact_carried *carried,
                          const double *times, size_t n_times, size_t most,
                          tarry_exact_counts *counts, tarry_error *error);
void tarry_exact_counts_release(tarry_exact_counts *counts);

#endif
