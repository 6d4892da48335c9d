/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_BASE_NOTES_H
#define TARRY_BASE_NOTES_H

#include <stddef.h>
#include "tarry/error.h"

/* Warnings and remarks gathered on the way, in the order made. Zero-initialise ({0}). */
typedef struct tarry_notes {
    char **lines; /* complete sentences, each with "file:line:column: " before it where known */
    size_t n;
    size_t capacity;
} tarry_notes;

/* Append; returns 0 or TARRY_MEMORY. A line that stands already is not added again. */
int tarry_notes_add(tarry_notes *notes, tarry_place place, tarry_error *error, const char *format,
                    ...) __attribute__((format(printf, 4, 5)));
void tarry_notes_release(tarry_notes *notes);

#endif
