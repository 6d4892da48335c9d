/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_EXACT_FIRST_H
#define TARRY_EXACT_FIRST_H

/* How long after a moment something first happens. */

#include "exact/gene.h"

/* The share of cells in which none of the gene's transcripts has come to stage `stage` (0: to its
 * initiation, n: past the last stage) from `step` until each of the n_times times after it,
 * whenever it was begun. `horizon`: the greatest age of a transcript. Errors: TARRY_MEMORY,
 * TARRY_NUMERIC.
 *
 * It is G with g(a) = 1 - P(it came there within that stretch), of a transcript of age a. */
int tarry_exact_none_yet(const tarry_exact_gene *gene, size_t stage, double step,
                         const double *times, size_t n_times, double horizon, double *share,
                         tarry_error *error);

/* The same of proteins, which come to stage `stage` of theirs (n: past the last), whenever their
 * transcript was begun. */
int tarry_exact_no_protein_yet(const tarry_exact_gene *gene, size_t stage, double step,
                               const double *times, size_t n_times, double horizon, double *share,
                               tarry_error *error);

#endif
