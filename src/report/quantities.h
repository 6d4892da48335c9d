/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_REPORT_QUANTITIES_H
#define TARRY_REPORT_QUANTITIES_H

/* What is told of a gene or a signal, in the order and in the words in which people read it: the
 * same on the terminal and on the page. */

#include "model/network.h"
#include "tarry/error.h"
#include "tarry/table.h"

enum { TARRY_FEW = 20 }; /* periods or events, below which an interval is marked */

/* Columns of the tables `bursts` and `signals`. */
enum {
    TARRY_QUANTITY_OF,
    TARRY_QUANTITY_WINDOW,
    TARRY_QUANTITY_NAME,
    TARRY_QUANTITY_UNIT,
    TARRY_QUANTITY_VALUE,
    TARRY_QUANTITY_LOW,
    TARRY_QUANTITY_HIGH,
    TARRY_QUANTITY_SAMPLES
};

typedef enum tarry_quantity_section {
    TARRY_SECTION_BURSTS,
    TARRY_SECTION_TIMES,
    TARRY_SECTION_PRODUCTS, /* molecules in a cell, one product after another */
    TARRY_SECTION_SIGNAL,
} tarry_quantity_section;

typedef struct tarry_quantity {
    tarry_quantity_section section;
    const char *name;    /* the table's: "transcript_decay_time" */
    const char *words;   /* "decay time" */
    size_t product_size; /* of "transcript" in the name; 0 where there is none */
    const char *unit;    /* the table's: "/min per allele" */
    const size_t *rows;  /* [window]: its row, or the table's number of rows where it has none */
} tarry_quantity;

typedef struct tarry_quantities {
    size_t n;
    tarry_quantity *items;
    size_t *rows;
} tarry_quantities;

/* Of the rows of one gene or signal. Names and units are the table's. Zero-initialise ({0}).
 * Release accepts a half-built one. */
int tarry_quantities_init(tarry_quantities *quantities, const tarry_network *network,
                          const tarry_table *table, const size_t *rows, size_t n_rows,
                          tarry_error *error);
void tarry_quantities_release(tarry_quantities *quantities);

/* The row of the quantity with this name in a window, or n_rows where there is none. */
size_t tarry_quantities_find(const tarry_quantities *quantities, const char *name, uint32_t window,
                             size_t n_rows);

/* "/min" of "/min per allele", "" of a pure number. Returns `out`. */
const char *tarry_quantity_unit(const char *unit, char out[48]);

/* The title of a section; `alleles`: there may be more than one. */
const char *tarry_section_title(tarry_quantity_section section, bool alleles);

/* The gene or named burst of this name, or NULL. */
const tarry_gene *tarry_network_gene(const tarry_network *network, const char *name);

/* Whether a gene has alleles (a named burst has none). */
bool tarry_gene_has_alleles(const tarry_gene *gene);

#endif
