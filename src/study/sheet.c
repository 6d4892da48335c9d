/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "study/sheet.h"

#include "base/memory.h"

#include <math.h>
#include <stdarg.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

void tarry_sheet_row(tarry_sheet *sheet) {
    const size_t needed = (sheet->n_rows + 1) * TARRY_SHEET_COLUMNS;
    if (sheet->failed ||
        tarry_grow((void **)&sheet->cells, &sheet->capacity, needed, sizeof *sheet->cells)) {
        sheet->failed = true;
        return;
    }
    memset(sheet->cells + sheet->n_rows * TARRY_SHEET_COLUMNS, 0,
           TARRY_SHEET_COLUMNS * sizeof *sheet->cells);
    sheet->n_rows++;
}

void tarry_sheet_cell(tarry_sheet *sheet, size_t column, const char *format, ...) {
    if (sheet->failed || sheet->n_rows == 0)
        return;
    va_list arguments, again;
    va_start(arguments, format);
    va_copy(again, arguments);
    const int n = vsnprintf(NULL, 0, format, arguments);
    char *cell = n >= 0 ? tarry_calloc((size_t)n + 1, 1) : NULL;
    if (cell)
        vsnprintf(cell, (size_t)n + 1, format, again);
    else
        sheet->failed = true;
    va_end(again);
    va_end(arguments);
    char **at = &sheet->cells[(sheet->n_rows - 1) * TARRY_SHEET_COLUMNS + column];
    free(*at);
    *at = cell;
}

/* Characters of UTF-8. */
static size_t count_characters(const char *text) {
    size_t n = 0;
    for (; *text; text++)
        n += ((unsigned char)*text & 0xc0) != 0x80;
    return n;
}

static void add_blanks(tarry_text *text, size_t n) {
    for (size_t i = 0; i < n; i++)
        tarry_text_add(text, " ", 1);
}

static void write_row(const tarry_sheet *sheet, char *const *cells, const size_t *widths,
                      tarry_text *text) {
    size_t pending = 2; /* blanks owed, left out at the end of a line */
    for (size_t c = 0; c < TARRY_SHEET_COLUMNS; c++) {
        if (widths[c] == 0)
            continue;
        const size_t n = cells[c] ? count_characters(cells[c]) : 0;
        const size_t rest = widths[c] - n;
        const bool right = sheet->right & 1u << c;
        if (n > 0) {
            add_blanks(text, pending + (right ? rest : 0));
            tarry_text_add_string(text, cells[c]);
            pending = 2 + (right ? 0 : rest);
        } else {
            pending += widths[c] + 2;
        }
    }
    tarry_text_add(text, "\n", 1);
}

static void empty(tarry_sheet *sheet) {
    for (size_t i = 0; i < sheet->n_rows * TARRY_SHEET_COLUMNS; i++)
        free(sheet->cells[i]);
    sheet->n_rows = 0;
}

void tarry_sheet_write(tarry_sheet *sheet, tarry_text *text) {
    size_t widths[TARRY_SHEET_COLUMNS] = {0};
    for (size_t i = 0; i < sheet->n_rows * TARRY_SHEET_COLUMNS; i++) {
        const size_t n = sheet->cells[i] ? count_characters(sheet->cells[i]) : 0;
        if (n > widths[i % TARRY_SHEET_COLUMNS])
            widths[i % TARRY_SHEET_COLUMNS] = n;
    }
    for (size_t r = 0; r < sheet->n_rows; r++)
        write_row(sheet, sheet->cells + r * TARRY_SHEET_COLUMNS, widths, text);
    text->failed = text->failed || sheet->failed;
    empty(sheet);
}

void tarry_sheet_release(tarry_sheet *sheet) {
    empty(sheet);
    free(sheet->cells);
    *sheet = (tarry_sheet){0};
}

/* Rounded to a decimal by one exact power of ten, so that the shortest text that reads back the
 * same has no more digits than asked for. */
void tarry_number_short(double value, int digits, char out[TARRY_NUMBER_SIZE]) {
    static const double powers[] = {1e0,  1e1,  1e2,  1e3,  1e4,  1e5,  1e6,  1e7,
                                    1e8,  1e9,  1e10, 1e11, 1e12, 1e13, 1e14, 1e15,
                                    1e16, 1e17, 1e18, 1e19, 1e20, 1e21, 1e22};
    if (isfinite(value) && value != 0) {
        const int shift = digits - 1 - (int)floor(log10(fabs(value)));
        if (shift >= 0 && shift <= 22)
            value = round(value * powers[shift]) / powers[shift];
        else if (shift < 0 && shift >= -22)
            value = round(value / powers[-shift]) * powers[-shift];
    }
    tarry_number_write(value, out);
}

const char *tarry_bytes_text(double bytes, char out[TARRY_BYTES_SIZE]) {
    static const char *const units[] = {"B", "kB", "MB", "GB", "TB"};
    char number[TARRY_NUMBER_SIZE];
    size_t unit = 0;
    while (bytes >= 1000 && unit < 4) {
        bytes /= 1000;
        unit++;
    }
    tarry_number_short(bytes, 3, number);
    size_t n = strlen(number);
    memcpy(out, number, n);
    out[n++] = ' ';
    memcpy(out + n, units[unit], strlen(units[unit]) + 1);
    return out;
}
