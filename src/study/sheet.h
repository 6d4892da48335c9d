/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_STUDY_SHEET_H
#define TARRY_STUDY_SHEET_H

/* Text in aligned columns, for what `tarry check` prints. */

#include "base/number.h"
#include "base/text.h"

enum { TARRY_SHEET_COLUMNS = 6, TARRY_BYTES_SIZE = TARRY_NUMBER_SIZE + 4 };

/* Rows of cells, to be set out at once. Zero-initialise. */
typedef struct tarry_sheet {
    char **cells; /* [row][TARRY_SHEET_COLUMNS], NULL where empty */
    size_t n_rows, capacity;
    unsigned right; /* bits of the columns whose text stands on the right */
    bool failed;    /* memory was short */
} tarry_sheet;

/* Begin a row; then its cells in order. */
void tarry_sheet_row(tarry_sheet *sheet);
void tarry_sheet_cell(tarry_sheet *sheet, size_t column, const char *format, ...)
    __attribute__((format(printf, 3, 4)));

/* Append the rows to `text`, indented by two blanks, columns two blanks apart, and empty the sheet
 * for the next use. Widths count characters of UTF-8. */
void tarry_sheet_write(tarry_sheet *sheet, tarry_text *text);
void tarry_sheet_release(tarry_sheet *sheet);

/* A number to `digits` significant digits (1 to 15), the fewest that say the same. */
void tarry_number_short(double value, int digits, char out[TARRY_NUMBER_SIZE]);

/* "2.67 MB"; returns `out`. */
const char *tarry_bytes_text(double bytes, char out[TARRY_BYTES_SIZE]);

#endif
