/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_STUDY_GATHER_H
#define TARRY_STUDY_GATHER_H

/* Values of some names in the first cells of a run, kept as the cells come, and a table of them:
 * one row a frame (cell, time, one column a name), or one a cell, that at one of the snapshots. */

#include <stdbool.h>
#include "base/table.h"
#include "engine/record.h"
#include "model/network.h"

typedef enum tarry_gathered {
    TARRY_GATHER_FRAMES, /* all frames of recorded names */
    TARRY_GATHER_FIXED,  /* of cell c snapshot number c mod their number, as of fixed cells */
} tarry_gathered;

typedef struct tarry_gather {
    const tarry_network *network;
    tarry_gathered what;
    int64_t n_cells;
    uint32_t n_names;
    uint32_t *channels; /* [n_names] */
    size_t *rows;       /* [n_names]: where a record has its frames */
    double *values;     /* [n_cells][n_names][frames, or 1] */
} tarry_gather;

/* Is a name among those that are kept? */
typedef bool tarry_gather_takes(const tarry_network *network, const tarry_channel *channel);

/* Choose the names; n_cells 0: nothing is kept. A zeroed or half-built one can be released. */
int tarry_gather_init(tarry_gather *gather, const tarry_network *network, tarry_gathered what,
                      int64_t n_cells, tarry_gather_takes *takes, tarry_error *error);
void tarry_gather_release(tarry_gather *gather);

/* Bytes that the values take, and the table besides. */
double tarry_gather_bytes(const tarry_gather *gather);

/* To be called before the first cell. */
int tarry_gather_make_room(tarry_gather *gather, tarry_error *error);

/* Take in a cell; others than the first n_cells are passed over. Different cells may be added by
 * different threads at a time. */
void tarry_gather_add(tarry_gather *gather, const tarry_record *record);

/* The table of cells 0 .. n-1, or NULL where there are none. With `skip_missing` rows in which no
 * value is there are left out. */
int tarry_gather_table(const tarry_gather *gather, const char *name, int64_t n, bool skip_missing,
                       tarry_table **table, tarry_error *error);

#endif
