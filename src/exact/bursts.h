/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_EXACT_BURSTS_H
#define TARRY_EXACT_BURSTS_H

/* Bursts of one allele: how often they begin, how long they last, how many initiations they make.
 */

#include "exact/gene.h"

/* Times a Markov chain spends in some of its states: entered with probabilities `entry`, left for
 * good; moves [n][n] is the generator within, so that P(longer than t) = entry exp(moves t) 1. */
typedef struct tarry_exact_dwell {
    size_t n;
    double *entry;
    double *moves;
    double mean, sd;
} tarry_exact_dwell;

typedef struct tarry_exact_bursts {
    double frequency; /* openings per unit of time */
    double size_mean, size_sd, silent_fraction;
    double active_fraction; /* of time */
    double initiation_rate;
    double outside_fraction; /* of initiations; NaN where there are none */
    tarry_exact_dwell active, inactive, interval;
    double *sizes; /* [n_sizes] probabilities; what lies beyond adds up to less than 1e-12 */
    size_t n_sizes;
} tarry_exact_bursts;

enum { TARRY_BURSTS_MOST_SIZES = 1 << 20 };

/* Periods that begin between `from` and `to`, not before the start of the model; all in `arena`.
 * *why: NULL, or why they cannot be worked out (as the rest of a sentence), then nothing else is
 * filled. Errors: TARRY_MEMORY, TARRY_NUMERIC.
 *
 * With pi the mean of the states' probabilities over the window and A the active states: openings
 * come at rate pi_I Q_IA 1 and enter in proportion to pi_I Q_IA; sizes have the generating function
 * entry (-(quiet_AA + z jump_AA))^-1 (quiet_AI + z jump_AI) 1 (Markovian arrivals between two
 * visits, common practice). */
int tarry_exact_bursts_read(const tarry_exact_gene *gene, double from, double to,
                            tarry_arena *arena, tarry_exact_bursts *bursts, const char **why,
                            tarry_error *error);

/* P(dwell > t). Errors: TARRY_MEMORY, TARRY_NUMERIC. */
int tarry_exact_dwell_survival(const tarry_exact_dwell *dwell, double t, double *survival,
                               tarry_error *error);

#endif
