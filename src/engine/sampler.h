/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_ENGINE_SAMPLER_H
#define TARRY_ENGINE_SAMPLER_H

/* Exact samplers: each a table of functions, one file each. All give the same law.
 *
 * A sampler owns the propensities. Each call of `next` takes two numbers from the cell's stream of
 * events: the first for the time, the second for the choice. */

#include "base/random.h"
#include "engine/cell.h"
#include "engine/propensity.h"

typedef struct tarry_sampler_state tarry_sampler_state;

struct tarry_sampler {
    const char *word;
    /* Make a state for one thread. */
    int (*set_up)(const tarry_propensities *propensities, tarry_sampler_state **state,
                  tarry_error *error);
    /* Work everything out anew at the start of a cell and after a protocol step. */
    void (*reset)(tarry_sampler_state *state, const double *counts, uint32_t segment);
    /* The next reaction, if it falls before `limit`: returns its index and sets *time; else returns
     * TARRY_NONE. A propensity that is negative, infinite or not a number gives TARRY_BROKEN. */
    int32_t (*next)(tarry_sampler_state *state, tarry_stream *stream, double now, double limit,
                    double *time);
    /* Counts have changed: work out these reactions anew. */
    void (*changed)(tarry_sampler_state *state, const double *counts, const uint32_t *reactions,
                    uint32_t n_reactions);
    /* Propensity of one reaction as it stands, for messages. */
    double (*propensity)(const tarry_sampler_state *state, uint32_t reaction);
    void (*release)(tarry_sampler_state *state); /* NULL is fine */
};

enum { TARRY_BROKEN = -2 };

extern const tarry_sampler tarry_sampler_direct;

/* By word. TARRY_INPUT with the words known; TARRY_NOT_YET for those with a place kept. */
int tarry_sampler_find(const char *word, const tarry_sampler **sampler, tarry_error *error);

#endif
