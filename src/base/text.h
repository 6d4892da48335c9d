/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_BASE_TEXT_H
#define TARRY_BASE_TEXT_H

#include <stdbool.h>
#include <stddef.h>
#include "tarry/word.h"

/* A text that grows. Zero-initialise ({0}). Failed allocations are remembered in `failed`, so that
 * a caller may append freely and look once at the end. */
typedef struct tarry_text {
    char *data; /* NUL-ended once anything was appended */
    size_t size;
    size_t capacity;
    bool failed;
} tarry_text;

void tarry_text_add(tarry_text *text, const char *bytes, size_t n);
void tarry_text_add_string(tarry_text *text, const char *string);
void tarry_text_add_number(tarry_text *text, double value);
void tarry_text_printf(tarry_text *text, const char *format, ...)
    __attribute__((format(printf, 2, 3)));
void tarry_text_release(tarry_text *text);

#endif
