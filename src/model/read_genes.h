/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_MODEL_READ_GENES_H
#define TARRY_MODEL_READ_GENES_H

#include "model/gene_layout.h"

/* What a state of a promoter does, read once and made for each allele. */
typedef struct tarry_state_plan {
    const char *name;
    tarry_place place;
    bool active;
    bool lasts;
    uint32_t delay; /* where it lasts */
    bool initiates;
    bool formula;      /* the rate of initiation reads species */
    uint32_t rate;     /* index into formulas or rates */
    tarry_range moves; /* builder->moves */
} tarry_state_plan;

typedef struct tarry_gene_work {
    tarry_builder *builder;
    uint32_t gene;
    tarry_gene_layout layout;
    tarry_state_plan *states; /* in the arena */
    uint32_t clearance;       /* the lag of the first allele; those of the others follow */
    bool own_lags;            /* each allele has a lag of its own for the first stage: */
    uint32_t first_lag;       /* that of the first allele; those of the others follow */
} tarry_gene_work;

/* Read the states, the start and what is active; makes the lags of states that last. */
int tarry_read_promoter(tarry_gene_work *work, tarry_error *error);

/* Make the moves and initiations of every allele. */
int tarry_build_promoter(const tarry_gene_work *work, tarry_error *error);

/* A reaction of a gene with the factors given (ascending); its effect is `draft`. */
int tarry_gene_reaction(const tarry_gene_work *work, const char *name, const tarry_factor *factors,
                        size_t n_factors, bool formula, uint32_t rate, int32_t allele,
                        tarry_draft *draft, tarry_place place, tarry_error *error);

#endif
