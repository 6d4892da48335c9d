/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_BASE_TABLE_H
#define TARRY_BASE_TABLE_H

#include <stdbool.h>
#include "base/text.h"
#include "tarry/error.h"
#include "tarry/table.h"

/* Filling tables and turning them into CSV (RFC 4180 quoting where a text needs it). */

/* `columns` is one text such as "gene:text window:text value:number", columns parted by blanks.
 * Returns NULL when memory is short. */
tarry_table *tarry_table_new(const char *name, const char *columns);
void tarry_table_free(tarry_table *table);

/* Append a row: one argument a column in order, `const char *` for text (NULL: empty) and `double`
 * for numbers (NaN: empty). Texts are stored once each, however often they are used. Returns 0 or
 * TARRY_MEMORY; after a failure the table holds whole rows only. */
int tarry_table_add(tarry_table *table, tarry_error *error, ...);

/* Append a row to a table all of whose columns hold numbers: one for each column in order. */
int tarry_table_add_numbers(tarry_table *table, const double *numbers, tarry_error *error);

/* Append the whole table to `text` as CSV with a header row; numbers as base/number writes them. */
void tarry_table_write_csv(const tarry_table *table, tarry_text *text);

/* Heap bytes in use. */
size_t tarry_table_bytes(const tarry_table *table);

#endif
