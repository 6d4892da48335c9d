/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_TABLE_H
#define TARRY_TABLE_H

/* Tables with named columns of text or numbers: the form in which all results are handed out. */

#include <stddef.h>

typedef struct tarry_table tarry_table;

const char *tarry_table_name(const tarry_table *table);
size_t tarry_table_n_rows(const tarry_table *table);
size_t tarry_table_n_columns(const tarry_table *table);
const char *tarry_table_column_name(const tarry_table *table, size_t column);

/* Index of the column called `name`, or -1. */
int tarry_table_column(const tarry_table *table, const char *name);

/* Text of a text column ("" in others); borrowed until the table is freed. */
const char *tarry_table_text(const tarry_table *table, size_t row, int column);

/* Number of a number column; NaN where the cell is empty or the column holds text. */
double tarry_table_number(const tarry_table *table, size_t row, int column);

#endif
