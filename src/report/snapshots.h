/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_REPORT_SNAPSHOTS_H
#define TARRY_REPORT_SNAPSHOTS_H

/* The rows of `means` that fall on snapshots, in the order of names and, for each, of times. */

#include <stddef.h>
#include "model/network.h"
#include "tarry/error.h"
#include "tarry/table.h"

typedef struct tarry_snapshot {
    const char *name; /* the table's: one pointer for one name */
    double time;
    size_t row;
} tarry_snapshot;

typedef struct tarry_snapshots {
    size_t n;
    tarry_snapshot *items;
} tarry_snapshots;

/* Zero-initialise ({0}). Release accepts a half-built one. */
int tarry_snapshots_init(tarry_snapshots *snapshots, const tarry_run_plan *plan,
                         const tarry_table *means, tarry_error *error);
void tarry_snapshots_release(tarry_snapshots *snapshots);

/* Whether counts of this name are worth lines of their own for a reader: nothing else tells of them
 * (plain species), or they change with time. Promoter states are told of among the times. *at is
 * where the last name was found, 0 before the first. */
bool tarry_snapshots_tell(const tarry_network *network, const char *name, uint32_t *at);

/* "Counts at the snapshots"; of data that are means, "Means". */
const char *tarry_snapshots_title(const tarry_network *network);

#endif
