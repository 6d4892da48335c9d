/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_BASE_CSV_H
#define TARRY_BASE_CSV_H

/* Walking through the rows of CSV text without copying it: fields parted by commas, blanks around
 * them passed over, lines ended by \n or \r\n. A field may stand in double quotes (with commas in
 * it, but no quotes and no line's end). */

#include <stdbool.h>
#include <stddef.h>
#include <stdint.h>
#include "base/text.h"
#include "tarry/error.h"

typedef struct tarry_csv_field {
    const char *text; /* not NUL-ended */
    size_t n;
} tarry_csv_field;

typedef struct tarry_csv {
    const char *path; /* for messages, as all texts borrowed */
    const char *at, *end;
    const char *line_start; /* of the row read last */
    int line;               /* its number, from 1 */
} tarry_csv;

/* A mark at the head of UTF-8 text is passed over. */
tarry_csv tarry_csv_of(const char *path, const tarry_text *text);

/* The next line as a whole, without its end; false after the last. */
bool tarry_csv_line(tarry_csv *csv, tarry_csv_field *line);

/* Cut the next line that is not blank into at most `most` fields; *n is how many there are, or
 * most + 1 where there are more. *n = 0: the text is over. TARRY_INPUT where quotes do not match.
 */
int tarry_csv_row(tarry_csv *csv, tarry_csv_field *fields, size_t most, size_t *n,
                  tarry_error *error);

/* Line and column (in characters) of a byte of the row read last. */
tarry_place tarry_csv_place(const tarry_csv *csv, const char *at);

#endif
