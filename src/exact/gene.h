/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_EXACT_GENE_H
#define TARRY_EXACT_GENE_H

/* A gene whose rates read no species, as the mathematics needs it: a finite Markov chain that
 * initiates, and what becomes of one transcript. Its alleles are alike and independent.
 *
 * The chain's states are those of the promoter, each divided into phases where the state lasts a
 * sum or mix of exponential times, and all of them again for each phase of the clearance. */

#include <stdbool.h>
#include <stdint.h>
#include "base/memory.h"
#include "exact/phases.h"
#include "model/analysis_flow.h"
#include "model/network.h"

/* What a molecule goes through, stage by stage; the product is the last. */
typedef struct tarry_exact_stage {
    uint32_t species;
    const tarry_law *law; /* of the dwell; NULL: until it decays */
    double rate;          /* of the decay, or of the loss that competes with the dwell */
    double translation;   /* proteins begun for each molecule and unit of time */
    const char *why;      /* NULL, or why its counts cannot be worked out (rest of a sentence) */
} tarry_exact_stage;

typedef struct tarry_exact_chain {
    const char *why; /* NULL, or why nothing of it can be worked out */
    tarry_exact_stage *stages;
    size_t n;
} tarry_exact_chain;

/* The promoter from time `from` on. quiet[i][j]: rate from state i to j without an initiation, its
 * diagonal minus all rates out of i, those with an initiation included; jump[i][j]: with one. */
typedef struct tarry_exact_regime {
    double from;
    double *quiet, *jump;
    double *begin; /* [n_states] probabilities when it begins */
} tarry_exact_regime;

typedef struct tarry_exact_gene {
    uint32_t gene;
    const char *why; /* NULL, or why nothing of the gene can be worked out (rest of a sentence) */
    double n_copies;
    size_t n_states;
    uint32_t *state_of; /* [n_states] the promoter's state */
    bool *active;       /* [n_states] bursts are counted in it */
    double *start;      /* [n_states] probabilities when the first regime begins */
    tarry_exact_regime *regimes;
    size_t n_regimes; /* as many as segments that differ in the promoter's rates */
    tarry_exact_chain transcript;
    const char
        *why_translation; /* NULL, or why proteins cannot be worked out, though transcripts can */
    tarry_exact_chain protein;
} tarry_exact_gene;

enum { TARRY_EXACT_MOST_STATES = 200, TARRY_EXACT_MOST_STAGES = 32 };

/* Read a gene (not a named track) back from the network, with the values of `segments` (the
 * network's, or others of the same shape), in `arena`. 0, TARRY_MEMORY or TARRY_NUMERIC. */
int tarry_exact_gene_read(const tarry_flow_index *index, const tarry_segment *segments,
                          uint32_t gene, tarry_arena *arena, tarry_exact_gene *out,
                          tarry_error *error);

/* The chain's generator at rest: out[i][j] = quiet + jump. */
void tarry_exact_generator(const tarry_exact_gene *gene, size_t regime, double *out);

/* ---- shared by gene.c and promoter.c ----------------------------------------------------------
 */

typedef struct tarry_exact_reader {
    const tarry_flow_index *index;
    const tarry_network *network;
    const tarry_segment *segments;
    tarry_arena *arena;
    tarry_exact_gene *gene;
    bool short_of_memory;
    tarry_error *error;
} tarry_exact_reader;

/* A sentence's rest in the arena; `name` goes into %s. */
const char *tarry_exact_say(tarry_exact_reader *reader, const char *format, const char *name);

/* The rate constant of a reaction in a segment; false where it reads species. */
bool tarry_exact_rate(const tarry_exact_reader *reader, size_t segment,
                      const tarry_reaction *reaction, double *rate);

/* The law of a lag is the same in all segments. */
bool tarry_exact_law_stays(const tarry_exact_reader *reader, uint32_t delay);

/* Fill states, start and regimes, or `why`. 0, TARRY_MEMORY or TARRY_NUMERIC. */
int tarry_exact_read_promoter(tarry_exact_reader *reader);

#endif
