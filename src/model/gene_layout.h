/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_MODEL_GENE_LAYOUT_H
#define TARRY_MODEL_GENE_LAYOUT_H

/* The parts of one gene in the file and where its species lie. A gene's species follow one another:
 * promoter states (sums over alleles), with several copies those of each allele, with clearance
 * each allele's readiness to initiate (1 or 0), stages of the transcript, the transcript, stages of
 * the protein, the protein. */

#include "model/builder.h"

typedef struct tarry_gene_layout {
    const char *name;
    const tarry_node *node;
    uint32_t n_copies;
    const tarry_node *promoter; /* a map, one key a state */
    uint32_t n_states;
    const tarry_node *clearance;         /* a delay or NULL */
    const tarry_node *transcript;        /* a map or NULL */
    const tarry_node *transcript_stages; /* a map or NULL */
    uint32_t n_transcript_stages;
    const tarry_node *protein;
    const tarry_node *protein_stages;
    uint32_t n_protein_stages;
    uint32_t first; /* species */
} tarry_gene_layout;

/* Read the keys of a gene and count its parts; `first` is left to the caller. */
int tarry_gene_layout_read(const tarry_entry *gene, tarry_gene_layout *layout, tarry_error *error);

/* Species of state `state` summed over alleles, and of one allele. */
uint32_t tarry_layout_sum(const tarry_gene_layout *layout, uint32_t state);
uint32_t tarry_layout_state(const tarry_gene_layout *layout, uint32_t allele, uint32_t state);

/* Whether an allele is ready to initiate; there only with clearance. */
uint32_t tarry_layout_ready(const tarry_gene_layout *layout, uint32_t allele);

/* The first stage of the transcript; the transcript follows the stages. */
uint32_t tarry_layout_transcript(const tarry_gene_layout *layout);

/* The first stage of the protein; the protein follows the stages. */
uint32_t tarry_layout_protein(const tarry_gene_layout *layout);

/* The number of a state by name, or TARRY_NONE. */
int32_t tarry_layout_find_state(const tarry_gene_layout *layout, const char *name);

/* The same, or TARRY_INPUT with the nearest name. */
int tarry_layout_need_state(const tarry_gene_layout *layout, const char *name, tarry_place place,
                            uint32_t *state, tarry_error *error);

#endif
