/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_MODEL_ANALYSIS_FLOW_H
#define TARRY_MODEL_ANALYSIS_FLOW_H

/* A gene that regulates itself and is regulated by nothing, read back from the network: how its
 * promoter moves, how often it initiates, and by which steps a molecule comes to be counted as each
 * product. Parameters are those before any protocol step. */

#include "base/memory.h"
#include "model/network.h"

typedef enum tarry_flow_kind {
    TARRY_FLOW_WHOLE,     /* a lag from its start to its end */
    TARRY_FLOW_REMAINING, /* the age of a molecule that is met within a lag: density S(x)/mean */
    TARRY_FLOW_DECAY,     /* the age of a molecule that decays at `rate`: exponential */
} tarry_flow_kind;

typedef struct tarry_flow_step {
    tarry_flow_kind kind;
    const tarry_law *law; /* or NULL for DECAY */
    double rate;
} tarry_flow_step;

/* The molecules of a product that came one way: `weight` in the steady state for each initiation
 * per unit of time. The time since initiation is the sum of the independent steps, whose laws are
 * no totals. */
typedef struct tarry_flow_path {
    const tarry_flow_step *steps;
    size_t n_steps;
    double weight;
} tarry_flow_path;

typedef struct tarry_flow_product {
    uint32_t species;
    const char *why; /* NULL, or why its mean cannot be worked out, as the rest of a sentence */
    tarry_flow_path *paths;
    size_t n_paths, paths_capacity;
} tarry_flow_product;

typedef struct tarry_flow {
    const char *why; /* NULL, or why nothing of the gene can be worked out */
    size_t n_states;
    double n_copies;
    bool steady;              /* the start is the stationary law */
    const double *start;      /* [state] probability at the start */
    const double *moves;      /* [from][to] rates, 0 on the diagonal */
    const double *initiation; /* [state] rate */
    double dwell_initiation;  /* rate, from moves that end a lasting state; where steady only */
    tarry_flow_product *products;
    size_t n_products;
} tarry_flow;

/* Who does what in a network; built once for all genes. */
typedef struct tarry_flow_index {
    const tarry_network *network;
    uint32_t *reaction_starts; /* [gene + 1] into `reactions` */
    uint32_t *reactions;
    uint32_t *effect_starts; /* [species + 1] into `effects`: those that change the species */
    uint32_t *effects;
    int32_t *reaction_of; /* [effect], or TARRY_NONE */
    int32_t *lag_of;      /* [effect], or TARRY_NONE */
    int32_t *product_of;  /* [species] its place among its gene's products, or TARRY_NONE */
} tarry_flow_index;

/* 0 or TARRY_MEMORY. Release accepts a half-built or zeroed one. */
int tarry_flow_index_init(tarry_flow_index *index, const tarry_network *network,
                          tarry_error *error);
void tarry_flow_index_release(tarry_flow_index *index);

/* The flow of a gene (not a named track), in `arena`. 0 or TARRY_MEMORY. */
int tarry_flow_read(const tarry_flow_index *index, uint32_t gene, tarry_arena *arena,
                    tarry_flow *flow, tarry_error *error);

enum { TARRY_FLOW_STEPS = 32 }; /* most steps of a path */

/* Add a path (analysis_paths.c): a lag that is a total of several becomes a step for each part, and
 * a molecule that is met within a total is met in one of its parts: a path for each. Sets `why`
 * where that makes too many steps or paths. 0, or 1 when memory is short. */
int tarry_flow_add_path(tarry_flow_product *product, const tarry_flow_step *steps, size_t n_steps,
                        double weight, tarry_arena *arena);

/* 1 - mean/steady mean, a time t after the start, of the molecules that come by this path, `rate`
 * being the mean rate of initiation in the steady state. *too_long: it has too many stages to be
 * worked out. Errors: TARRY_MEMORY, TARRY_NUMERIC. */
int tarry_flow_deficit(const tarry_flow *flow, const tarry_flow_path *path, double rate, double t,
                       double *deficit, bool *too_long, tarry_error *error);

/* What an effect does to the count of a species. */
int32_t tarry_flow_change(const tarry_network *network, uint32_t effect, uint32_t species);

/* The effect is an initiation on one of the gene's alleles. */
bool tarry_flow_initiates(const tarry_network *network, uint32_t effect, uint32_t gene);

/* It does nothing but take one molecule of the species away. */
bool tarry_flow_only_removes(const tarry_network *network, uint32_t effect, uint32_t species);

/* The lag that it schedules and whose molecules the species holds, or TARRY_NONE. */
int32_t tarry_flow_stage_lag(const tarry_network *network, uint32_t effect, uint32_t species);

/* The reactant and rate constant of a reaction with rate * count; false where it is not of that
 * form. *reads: its rate reads species. */
bool tarry_flow_linear(const tarry_network *network, const tarry_reaction *reaction,
                       uint32_t *species, double *rate, bool *reads);

#endif
