/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_MODEL_ANALYSIS_H
#define TARRY_MODEL_ANALYSIS_H

/* What can be said of a network without simulating it: sums that never change, how far means are
 * from steady when the record begins, and what looks like a slip. */

#include "base/memory.h"
#include "base/notes.h"
#include "model/network.h"

/* ---- conserved sums (analysis_sums.c) -------------------------------------------------------- */

/* weight * (count of a species, or completions under way in a lag). */
typedef struct tarry_sum_term {
    int32_t species; /* or TARRY_NONE: */
    int32_t lag;
    int64_t weight; /* never 0 */
} tarry_sum_term;

/* A weighted sum that no reaction and no completion changes. */
typedef struct tarry_sum {
    const tarry_sum_term *terms;
    uint32_t n_terms;
    bool known;   /* false: the value depends on the state drawn at the start */
    double value; /* at the start, where known */
    double until; /* the protocol sets something in it at this time; infinity: never */
} tarry_sum;

typedef struct tarry_sums {
    const tarry_sum *sums; /* independent of each other; by the first species in them */
    uint32_t n_sums;
    uint32_t n_large;    /* groups of connected species that were left out as too large */
    uint32_t n_overflow; /* groups left out since numbers grew past 64 bits */
} tarry_sums;

enum { TARRY_SUMS_LARGEST = 200 }; /* species (and lags) in a connected group */

/* All independent conserved sums, in `arena`. */
int tarry_analysis_sums(const tarry_network *network, tarry_arena *arena, tarry_sums *sums,
                        tarry_error *error);

/* ---- distance from the steady state (analysis_steady.c) -------------------------------------- */

/* A product of a gene whose rates read no species. */
typedef struct tarry_distance {
    uint32_t gene;
    uint32_t species;
    double steady;   /* its mean in the steady state of the parameters before any step */
    double mean;     /* its mean at the time asked for */
    double relative; /* (mean - steady) / steady; NaN where steady is 0 */
    const char *why; /* NULL, or why it cannot be worked out (as the rest of a sentence) */
} tarry_distance;

typedef struct tarry_distances {
    const tarry_distance *items; /* by gene, in the order of its products */
    size_t n;
    size_t n_left_out; /* genes: only so many that differ are worked out */
} tarry_distances;

enum { TARRY_DISTANCES_MOST = 100 }; /* genes that differ */

/* Means a time `settle` after the start of the model, against the steady ones, in `arena`. Errors:
 * TARRY_MEMORY, TARRY_NUMERIC. */
int tarry_analysis_distances(const tarry_network *network, double settle, tarry_arena *arena,
                             tarry_distances *distances, tarry_error *error);

/* The time after the start from which on every mean that can be worked out is within `tolerance` of
 * its steady value, to 1 % of that time. (Looked for at times that double; a mean that strays again
 * between them goes unseen.) *n_unknown: products whose mean cannot be worked out. TARRY_NUMERIC
 * where no such time is found. */
int tarry_analysis_settle(const tarry_network *network, double tolerance, double *settle,
                          size_t *n_unknown, tarry_error *error);

/* ---- what looks like a slip (analysis_slips.c) ----------------------------------------------- */

/* Add a sentence for each: species that are never there, reactions that never fire, rates that may
 * become negative, waits longer than the record, steps that change delays. Of one kind at
 * most ten are told, then how many more there are. (What a reader of the model sees by itself, as
 * completions that may lack what they use, it notes itself.) */
int tarry_analysis_slips(const tarry_network *network, tarry_notes *notes, tarry_error *error);

/* ---- what can happen (analysis_reach.c) ------------------------------------------------------ */

typedef struct tarry_reach {
    bool *made;      /* [species] something that can happen makes it, or it is set */
    double *at_hand; /* [species] most that the start or the protocol gives */
    bool *fires;     /* [reaction] */
    bool *runs;      /* [lag] */
} tarry_reach;

/* What can ever be there and happen: the least fixed point, over all parameters of the protocol. */
int tarry_analysis_reach(const tarry_network *network, tarry_reach *reach, tarry_error *error);
void tarry_reach_release(tarry_reach *reach);

/* At least n of the species can be there at once, as far as this analysis sees. */
bool tarry_reach_has(const tarry_reach *reach, uint32_t species, double n);

/* ---- values of expressions (analysis_range.c) ------------------------------------------------ */

typedef struct tarry_interval {
    double low, high;
} tarry_interval;

/* Bounds on the value where each species read has at least its `least` (by index; NULL: 0) and no
 * upper bound. Parameters are folded in. The bounds hold but need not be reached. */
tarry_interval tarry_analysis_range(const tarry_expression *expression, const double *least);

#endif
