/* SPDX-License-Identifier: GPL-3.0-or-later */

/* The direct method (Gillespie 1976, J. Comput. Phys. 22:403): one number for the time, one for the
 * choice. Up to LINEAR reactions the choice is a search in sums from left to right, of which only
 * those from the lowest changed reaction on are summed anew; above, it goes down a binary tree in
 * which each node is the sum of its children. Neither is ever updated by differences, so nothing
 * drifts and the sums depend on the propensities alone. */

#include "engine/sampler.h"

#include "base/error.h"
#include "base/logarithm.h"
#include "base/memory.h"

#include <math.h>
#include <stdbool.h>
#include <stdlib.h>

enum { LINEAR = 64 };

struct tarry_sampler_state {
    const tarry_propensities *propensities;
    const double *rates; /* of the segment in force */
    uint32_t segment;
    uint32_t n;
    uint32_t n_leaves; /* of the tree, a power of two; 0: linear */
    uint32_t dirty;    /* linear: lowest reaction whose sum is stale; n: none */
    bool suspicious;   /* a propensity was negative, infinite or NaN when last worked out */
    double *values;    /* linear: propensities; tree: nodes, leaves from n_leaves on, root at 1 */
    double *sums;      /* linear: from left to right */
    uint32_t *parents; /* tree: nodes to be summed anew */
};

static void release(tarry_sampler_state *state) {
    if (!state)
        return;
    free(state->values);
    free(state->sums);
    free(state->parents);
    free(state);
}

static int set_up(const tarry_propensities *propensities, tarry_sampler_state **out,
                  tarry_error *error) {
    const uint32_t n = propensities->n_reactions;
    tarry_sampler_state *state = tarry_calloc(1, sizeof *state);
    if (!state)
        return tarry_fail_memory(error, "the sampler");
    *state = (tarry_sampler_state){.propensities = propensities, .n = n, .dirty = 0};
    if (n > LINEAR)
        for (state->n_leaves = 1; state->n_leaves < n;)
            state->n_leaves *= 2;
    state->values = tarry_calloc(state->n_leaves ? 2 * (size_t)state->n_leaves : (size_t)n + 1,
                                 sizeof *state->values);
    state->sums = tarry_calloc((size_t)n + 1, sizeof *state->sums);
    state->parents = tarry_calloc((size_t)n + 1, sizeof *state->parents);
    if (!state->values || !state->sums || !state->parents) {
        release(state);
        return tarry_fail_memory(error, "the sampler");
    }
    *out = state;
    return TARRY_OK;
}

/* Work one reaction out; true where its propensity cannot be used. */
static inline bool work_out(tarry_sampler_state *state, uint32_t reaction, double *leaf,
                            const double *counts) {
    *leaf = tarry_propensity(state->propensities, state->rates, state->segment, reaction, counts);
    return !(*leaf >= 0 && *leaf < INFINITY);
}

static double *leaves_of(tarry_sampler_state *state) {
    return state->values + state->n_leaves;
}

/* Sum the nodes above the given leaves anew, level by level, each once. */
static void sum_paths(tarry_sampler_state *state, const uint32_t *reactions, uint32_t n) {
    double *node = state->values;
    uint32_t *parents = state->parents;
    uint32_t n_parents = 0;
    for (uint32_t i = 0; i < n; i++) {
        const uint32_t parent = (state->n_leaves + reactions[i]) / 2;
        if (n_parents == 0 || parents[n_parents - 1] != parent)
            parents[n_parents++] = parent;
    }
    while (n_parents > 0) {
        uint32_t n_above = 0;
        for (uint32_t i = 0; i < n_parents; i++) {
            const uint32_t k = parents[i];
            node[k] = node[2 * (size_t)k] + node[2 * (size_t)k + 1];
            if (k > 1 && (n_above == 0 || parents[n_above - 1] != k / 2))
                parents[n_above++] = k / 2;
        }
        n_parents = n_above;
    }
}

static void reset(tarry_sampler_state *state, const double *counts, uint32_t segment) {
    const uint32_t n = state->n;
    double *leaf = leaves_of(state);
    state->segment = segment;
    state->rates = state->propensities->rates + (size_t)segment * n;
    state->suspicious = false;
    state->dirty = 0;
    for (uint32_t r = 0; r < n; r++)
        state->suspicious |= work_out(state, r, &leaf[r], counts);
    for (uint32_t k = state->n_leaves; k-- > 1;)
        state->values[k] = state->values[2 * (size_t)k] + state->values[2 * (size_t)k + 1];
}

static void changed(tarry_sampler_state *state, const double *counts, const uint32_t *reactions,
                    uint32_t n_reactions) {
    if (n_reactions == 0)
        return;
    double *leaf = leaves_of(state);
    bool suspicious = state->suspicious;
    for (uint32_t i = 0; i < n_reactions; i++)
        suspicious |= work_out(state, reactions[i], &leaf[reactions[i]], counts);
    state->suspicious = suspicious;
    if (state->n_leaves)
        sum_paths(state, reactions, n_reactions);
    else if (reactions[0] < state->dirty)
        state->dirty = reactions[0];
}

static double sum_from_dirty(tarry_sampler_state *state) {
    const uint32_t n = state->n;
    double *sums = state->sums;
    double sum = state->dirty > 0 ? sums[state->dirty - 1] : 0;
    for (uint32_t r = state->dirty; r < n; r++)
        sums[r] = sum = sum + state->values[r];
    state->dirty = n;
    return sum;
}

/* A propensity that could not be used may have been mended by a later change of the same moment. */
static bool is_broken(tarry_sampler_state *state) {
    const double *leaf = leaves_of(state);
    state->suspicious = false;
    for (uint32_t r = 0; r < state->n; r++)
        state->suspicious |= !(leaf[r] >= 0 && leaf[r] < INFINITY);
    return state->suspicious;
}

static int32_t search_sums(const tarry_sampler_state *state, double target) {
    uint32_t r = 0;
    while (state->sums[r] <= target)
        r++;
    return (int32_t)r;
}

static int32_t search_tree(const tarry_sampler_state *state, double target) {
    const double *node = state->values;
    uint32_t k = 1;
    while (k < state->n_leaves) {
        const double left = node[2 * (size_t)k];
        if (target < left || node[2 * (size_t)k + 1] == 0) {
            k = 2 * k;
        } else {
            target -= left;
            k = 2 * k + 1;
        }
    }
    return (int32_t)(k - state->n_leaves);
}

static int32_t next(tarry_sampler_state *state, tarry_stream *stream, double now, double limit,
                    double *time) {
    const double e = -tarry_log(tarry_unit(tarry_stream_next(stream)));
    const double choice = tarry_unit(tarry_stream_next(stream));
    if (state->suspicious && is_broken(state))
        return TARRY_BROKEN;
    const double total = state->n_leaves ? state->values[1] : sum_from_dirty(state);
    if (!(total > 0))
        return TARRY_NONE;
    if (!(total < INFINITY))
        return TARRY_BROKEN;
    const double t = now + e / total;
    if (!(t < limit))
        return TARRY_NONE;
    *time = t;
    /* choice < 1 by 2^-53 at least, so choice * total < total in doubles too: the search ends. */
    return state->n_leaves ? search_tree(state, choice * total)
                           : search_sums(state, choice * total);
}

static double propensity(const tarry_sampler_state *state, uint32_t reaction) {
    return state->values[state->n_leaves + reaction];
}

const tarry_sampler tarry_sampler_direct = {
    .word = "direct",
    .set_up = set_up,
    .reset = reset,
    .next = next,
    .changed = changed,
    .propensity = propensity,
    .release = release,
};
