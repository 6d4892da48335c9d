/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "base/notes.h"

#include "base/error.h"
#include "base/memory.h"
#include "base/text.h"

#include <stdarg.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

static void add_place(tarry_text *line, tarry_place place) {
    if (place.file != NULL)
        tarry_text_printf(line, "%s:", place.file);
    if (place.line > 0)
        tarry_text_printf(line, "%d:", place.line);
    if (place.line > 0 && place.column > 0)
        tarry_text_printf(line, "%d:", place.column);
    if (line->size > 0)
        tarry_text_add(line, " ", 1);
}

static int stands_already(const tarry_notes *notes, const char *line) {
    for (size_t i = 0; i < notes->n; i++)
        if (strcmp(notes->lines[i], line) == 0)
            return 1;
    return 0;
}

/* Take over `line`, or free it where it stands already. */
static int keep_line(tarry_notes *notes, char *line, tarry_error *error) {
    if (stands_already(notes, line)) {
        free(line);
        return 0;
    }
    void *lines = notes->lines;
    if (tarry_grow(&lines, &notes->capacity, notes->n + 1, sizeof *notes->lines) != 0) {
        free(line);
        return tarry_fail_memory(error, "a warning");
    }
    notes->lines = lines;
    notes->lines[notes->n++] = line;
    return 0;
}

int tarry_notes_add(tarry_notes *notes, tarry_place place, tarry_error *error, const char *format,
                    ...) {
    va_list arguments;
    va_start(arguments, format);
    const int n = vsnprintf(NULL, 0, format, arguments);
    va_end(arguments);

    tarry_text line = {0};
    add_place(&line, place);
    char *message = n < 0 ? NULL : tarry_calloc((size_t)n + 1, 1);
    if (message == NULL) {
        tarry_text_release(&line);
        return tarry_fail_memory(error, "a warning");
    }
    va_start(arguments, format);
    vsnprintf(message, (size_t)n + 1, format, arguments);
    va_end(arguments);
    tarry_text_add(&line, message, (size_t)n);
    free(message);

    if (line.failed) {
        tarry_text_release(&line);
        return tarry_fail_memory(error, "a warning");
    }
    return keep_line(notes, line.data, error);
}

void tarry_notes_release(tarry_notes *notes) {
    for (size_t i = 0; i < notes->n; i++)
        free(notes->lines[i]);
    free(notes->lines);
    *notes = (tarry_notes){NULL, 0, 0};
}
