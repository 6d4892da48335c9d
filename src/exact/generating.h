/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_EXACT_GENERATING_H
#define TARRY_EXACT_GENERATING_H

/* Generating functions of what a gene's transcripts carry: E[product of loads] at given times.
 *
 * Each transcript carries a load that depends on its age a alone, E[z^load] = g(z, a). With w(a)
 * the mean of z^(all loads of initiations in the last a units of time), given the promoter's state
 * at their beginning, dw/da = (quiet + jump g(z, a)) w, w(0) = 1, and G = start . w for one allele
 * (Markov-modulated infinite-server queue; common practice). */

#include "exact/gene.h"
#include "exact/march.h"

typedef struct tarry_exact_load {
    tarry_march_loads *values; /* g of each system at an age */
    void *context;
    const double *breaks; /* ages, ascending, at which g may jump or bend */
    size_t n_breaks;
    double horizon; /* the age from which on every g is 1 */
} tarry_exact_load;

/* Put G of `n` systems at each of `n_times` times (ascending, none before the start) into
 * re[n_times][n] and im. The first `n_probes` systems guide the steps, and the first of them is the
 * largest of all. `tolerance`: error of a
 * step of integration, over the first one's value. Errors: TARRY_MEMORY,
 * TARRY_NUMERIC. */
int tarry_exact_generating(const tarry_exact_gene *gene, const tarry_exact_load *load,
                           double tolerance, size_t n, size_t n_probes, const double *times,
                           size_t n_times, double *re, double *im, tarry_error *error);

#endif
