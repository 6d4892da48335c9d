/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "base/error.h"

#include <stdarg.h>
#include <stdio.h>
#include <string.h>

const char *tarry_code_text(tarry_code code) {
    switch (code) {
#define TARRY_CODE_TEXT(name, status, text)                                                        \
    case TARRY_##name:                                                                             \
        return text;
        TARRY_CODES(TARRY_CODE_TEXT)
#undef TARRY_CODE_TEXT
    }
    return "unknown error";
}

int tarry_code_status(tarry_code code) {
    switch (code) {
#define TARRY_CODE_STATUS(name, status, text)                                                      \
    case TARRY_##name:                                                                             \
        return status;
        TARRY_CODES(TARRY_CODE_STATUS)
#undef TARRY_CODE_STATUS
    }
    return 1;
}

/* The largest cut at or before `at` that does not split a character of UTF-8. */
static size_t character_start(const char *text, size_t at) {
    while (at > 0 && ((unsigned char)text[at] & 0xc0) == 0x80)
        at--;
    return at;
}

/* Copy as much of `text` as goes into `out`, whole characters only. */
static void copy_cut(char *out, size_t size, const char *text) {
    const size_t length = strlen(text);
    const size_t n = length < size ? length : character_start(text, size - 1);
    memcpy(out, text, n);
    out[n] = '\0';
}

/* The end of a path tells more than its beginning. */
static void copy_path(char *out, size_t size, const char *path) {
    static const char mark[] = "...";
    const size_t n = strlen(path);
    if (n < size) {
        memcpy(out, path, n + 1);
        return;
    }
    size_t from = n - (size - sizeof mark);
    while (((unsigned char)path[from] & 0xc0) == 0x80)
        from++;
    memcpy(out, mark, sizeof mark - 1);
    memcpy(out + sizeof mark - 1, path + from, n - from + 1);
}

/* vsnprintf that cuts between characters. */
static void format_cut(char *out, size_t size, const char *format, va_list arguments)
    __attribute__((format(printf, 3, 0)));

static void format_cut(char *out, size_t size, const char *format, va_list arguments) {
    const int n = vsnprintf(out, size, format, arguments);
    if (n < 0)
        copy_cut(out, size, format);
    else if ((size_t)n >= size) {
        /* The byte after the cut is lost, so the last character is taken to be split unless it is
         * plain or has all of its bytes. */
        size_t lead = character_start(out, size - 2);
        const unsigned char first = (unsigned char)out[lead];
        const size_t need = first < 0x80 ? 1 : first >= 0xf0 ? 4 : first >= 0xe0 ? 3 : 2;
        out[lead + need > size - 1 ? lead : size - 1] = '\0';
    }
}

static int fill(tarry_error *error, tarry_code code, tarry_place place, const char *format,
                va_list arguments) __attribute__((format(printf, 4, 0)));

static int fill(tarry_error *error, tarry_code code, tarry_place place, const char *format,
                va_list arguments) {
    if (error == NULL)
        return (int)code;
    error->code = code;
    error->line = place.line;
    error->column = place.column;
    copy_path(error->file, sizeof error->file, place.file != NULL ? place.file : "");
    format_cut(error->message, sizeof error->message, format, arguments);
    return (int)code;
}

int tarry_fail(tarry_error *error, tarry_code code, const char *format, ...) {
    va_list arguments;
    va_start(arguments, format);
    fill(error, code, (tarry_place){NULL, 0, 0}, format, arguments);
    va_end(arguments);
    return (int)code;
}

int tarry_fail_at(tarry_error *error, tarry_code code, tarry_place place, const char *format, ...) {
    va_list arguments;
    va_start(arguments, format);
    fill(error, code, place, format, arguments);
    va_end(arguments);
    return (int)code;
}

int tarry_fail_memory(tarry_error *error, const char *what) {
    return tarry_fail(error, TARRY_MEMORY, "there is not enough memory for %s", what);
}

int tarry_error_context(tarry_error *error, const char *format, ...) {
    if (error == NULL)
        return TARRY_RUN;
    char old[sizeof error->message];
    memcpy(old, error->message, sizeof old);

    va_list arguments;
    va_start(arguments, format);
    format_cut(error->message, sizeof error->message, format, arguments);
    va_end(arguments);

    const size_t n = strlen(error->message);
    if (n + 2 < sizeof error->message) {
        memcpy(error->message + n, ": ", 3);
        copy_cut(error->message + n + 2, sizeof error->message - n - 2, old);
    }
    return (int)error->code;
}

const char *tarry_error_text(const tarry_error *error, char *out, int size) {
    if (size <= 0)
        return out;
    if (error == NULL) {
        out[0] = '\0';
        return out;
    }
    const char *colon = error->file[0] != '\0' ? ":" : "";
    if (error->line > 0 && error->column > 0)
        snprintf(out, (size_t)size, "%s%s%d:%d: %s", error->file, colon, error->line, error->column,
                 error->message);
    else if (error->line > 0)
        snprintf(out, (size_t)size, "%s%s%d: %s", error->file, colon, error->line, error->message);
    else if (error->file[0] != '\0')
        snprintf(out, (size_t)size, "%s: %s", error->file, error->message);
    else
        snprintf(out, (size_t)size, "%s", error->message);
    return out;
}
