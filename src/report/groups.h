/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_REPORT_GROUPS_H
#define TARRY_REPORT_GROUPS_H

/* Rows of a table by the text of one column: those of each gene, wherever in the table they are. */

#include <stddef.h>
#include "tarry/error.h"
#include "tarry/table.h"

typedef struct tarry_groups {
    size_t n;
    const char **names; /* in the order in which they first appear; the table's */
    size_t *starts;     /* rows[starts[g]] up to rows[starts[g + 1]] are those of group g, */
    size_t *rows;       /* in the table's order */
} tarry_groups;

/* Zero-initialise ({0}). Release accepts a half-built one. */
int tarry_groups_init(tarry_groups *groups, const tarry_table *table, const char *column,
                      tarry_error *error);
void tarry_groups_release(tarry_groups *groups);

#endif
