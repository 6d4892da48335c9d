/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_STUDY_SKETCH_H
#define TARRY_STUDY_SKETCH_H

/* The first few cells as they are drawn in figures: traces of what is shown, active periods. Each
 * cell has tables of its own, so that threads need not wait for one another. */

#include "engine/record.h"
#include "model/shown_genes.h"
#include "tally/results.h"

typedef struct tarry_sketch {
    const tarry_network *network;
    tarry_shown shown;
    int64_t n_cells;
    tarry_table **traces;  /* [n_cells], NULL before the cell has come */
    tarry_table **periods; /* [n_cells] */
} tarry_sketch;

/* `n_cells` 0: nothing is kept. TARRY_INPUT where a name is that of no gene. Release accepts a
 * half-built or zeroed one. */
int tarry_sketch_init(tarry_sketch *sketch, const tarry_network *network, int64_t n_cells,
                      const char *const *genes, size_t n_genes, tarry_error *error);
void tarry_sketch_release(tarry_sketch *sketch);

/* Take in a cell; others than the first few are passed over. Different cells may be added by
 * different threads at a time. */
int tarry_sketch_add(tarry_sketch *sketch, const tarry_record *record, tarry_error *error);

/* Put the tables of cells 0 .. n-1 into results, one after another. */
int tarry_sketch_report(const tarry_sketch *sketch, int64_t n, tarry_results *results,
                        tarry_error *error);

/* Bytes that it takes, tables of results included, active periods not. */
double tarry_sketch_bytes(const tarry_sketch *sketch);

#endif
