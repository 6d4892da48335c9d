/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "report/groups.h"

#include "base/error.h"
#include "base/memory.h"

#include <stdlib.h>
#include <string.h>

/* A word that finds no memory is left out of the hash, which is noticed. */
#define HASH_NONFATAL_OOM 1
#include <uthash.h>

typedef struct seen {
    UT_hash_handle hh;
    size_t group;
} seen;

typedef struct row_grouping {
    tarry_groups *groups;
    const tarry_table *table;
    int column;
    size_t *group_of; /* [row] */
    seen *seen;       /* [row], the first n used */
    seen *table_of_seen;
} row_grouping;

/* The group of a name, made where it is new. Returns 0, or 1 when memory is short. */
static int find_group(row_grouping *grouping, const char *name, size_t *group) {
    seen *found = NULL;
    const size_t n = strlen(name);
    HASH_FIND(hh, grouping->table_of_seen, name, n, found);
    if (found) {
        *group = found->group;
        return 0;
    }
    seen *new = &grouping->seen[grouping->groups->n];
    new->group = grouping->groups->n;
    HASH_ADD_KEYPTR(hh, grouping->table_of_seen, name, n, new);
    if (!new->hh.tbl)
        return 1;
    grouping->groups->names[new->group] = name;
    *group = new->group;
    grouping->groups->n++;
    return 0;
}

static int find_all_groups(row_grouping *grouping, size_t n_rows) {
    int short_of_memory = 0;
    for (size_t row = 0; row < n_rows && !short_of_memory; row++)
        short_of_memory = find_group(grouping,
                                     tarry_table_text(grouping->table, row, grouping->column),
                                     &grouping->group_of[row]);
    HASH_CLEAR(hh, grouping->table_of_seen);
    return short_of_memory;
}

/* A counting sort of the rows by group, which keeps their order within one. */
static void sort_rows(row_grouping *grouping, size_t n_rows) {
    tarry_groups *groups = grouping->groups;
    for (size_t row = 0; row < n_rows; row++)
        groups->starts[grouping->group_of[row] + 1]++;
    for (size_t g = 0; g < groups->n; g++)
        groups->starts[g + 1] += groups->starts[g];
    for (size_t row = n_rows; row-- > 0;)
        groups->rows[--groups->starts[grouping->group_of[row] + 1]] = row;
    for (size_t g = 0; g < groups->n; g++)
        groups->starts[g] = groups->starts[g + 1];
    groups->starts[groups->n] = n_rows;
}

int tarry_groups_init(tarry_groups *groups, const tarry_table *table, const char *column,
                      tarry_error *error) {
    const size_t n_rows = tarry_table_n_rows(table);
    row_grouping grouping = {groups, table, tarry_table_column(table, column), NULL, NULL, NULL};
    memset(groups, 0, sizeof *groups);
    groups->names = tarry_calloc(n_rows + 1, sizeof *groups->names);
    groups->starts = tarry_calloc(n_rows + 2, sizeof *groups->starts);
    groups->rows = tarry_calloc(n_rows + 1, sizeof *groups->rows);
    grouping.group_of = tarry_calloc(n_rows + 1, sizeof *grouping.group_of);
    grouping.seen = tarry_calloc(n_rows + 1, sizeof *grouping.seen);
    int status = 0;
    if (!groups->names || !groups->starts || !groups->rows || !grouping.group_of ||
        !grouping.seen || find_all_groups(&grouping, n_rows))
        status = tarry_fail_memory(error, "the rows of a table by gene");
    else
        sort_rows(&grouping, n_rows);
    free(grouping.group_of);
    free(grouping.seen);
    return status;
}

void tarry_groups_release(tarry_groups *groups) {
    free(groups->names);
    free(groups->starts);
    free(groups->rows);
    memset(groups, 0, sizeof *groups);
}
