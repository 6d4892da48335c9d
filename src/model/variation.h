/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_MODEL_VARIATION_H
#define TARRY_MODEL_VARIATION_H

/* Parameters that differ from cell to cell. Each cell has a factor for each of them, drawn from a
 * law of mean 1; the parameter is its value times the factor, before and after every step of the
 * protocol, and what is made of it follows. The network holds the values of a cell all of whose
 * factors are 1; a cell network is a copy in which segments and starting states are the cell's own.
 */

#include "model/builder.h"
#include "model/segment_values.h"

typedef struct tarry_varied {
    uint32_t parameter;
    tarry_law law; /* of the factor; its mean is 1 */
    tarry_place place;
} tarry_varied;

/* Kept in the model's arena. */
typedef struct tarry_variation {
    uint32_t n;
    const tarry_varied *varied;         /* in the model's order */
    const tarry_expression *parameters; /* [n_parameters] */
    const uint32_t *order;              /* of parameters, each after those it reads */
    tarry_value_sources sources;
    const tarry_builder_move *moves; /* of promoters, by gene */
    size_t n_moves;
} tarry_variation;

/* Workspace for one thread: the network of one cell after another. */
typedef struct tarry_cell_network {
    tarry_network network; /* the cell's; hold on to its address */
    const tarry_network *common;
    tarry_arena arena;
    double *factors; /* [n_varied] of the cell under way: put them here, then set */
} tarry_cell_network;

/* Of a network with a variation. TARRY_MEMORY. Zero-initialise ({0}); release accepts that. */
int tarry_cell_network_init(tarry_cell_network *cell, const tarry_network *common,
                            tarry_error *error);
void tarry_cell_network_release(tarry_cell_network *cell);

/* Work out the network of the cell with these factors; what an earlier cell had is gone. TARRY_RUN
 * where a value cannot be, with the cell's number and its parameters; TARRY_MEMORY. */
int tarry_cell_network_set(tarry_cell_network *cell, int64_t number, tarry_error *error);

/* ---- for the readers ---- */

/* The name of a parameter with `varies` that the expression depends on, or NULL. */
const char *tarry_varied_name(const tarry_builder *builder, const tarry_expression *expression);

/* TARRY_INPUT where the expression depends on one: `what` must be the same in all cells. */
int tarry_refuse_varied(const tarry_builder *builder, const tarry_expression *expression,
                        const char *what, tarry_error *error);

/* The law under `varies`, of mean 1, in the model's arena. */
int tarry_read_factor(tarry_builder *builder, const tarry_builder_parameter *parameter,
                      tarry_law *law, tarry_error *error);

#endif
