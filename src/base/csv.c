/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "base/csv.h"

#include "base/error.h"

#include <string.h>

tarry_csv tarry_csv_of(const char *path, const tarry_text *text) {
    tarry_csv csv = {.path = path, .at = text->data, .end = text->data + text->size};
    if (text->size >= 3 && memcmp(text->data, "\xef\xbb\xbf", 3) == 0)
        csv.at += 3;
    csv.line_start = csv.at;
    return csv;
}

tarry_place tarry_csv_place(const tarry_csv *csv, const char *at) {
    int column = 1;
    for (const char *c = csv->line_start; c < at; c++)
        column += ((unsigned char)*c & 0xC0) != 0x80; /* bytes that begin a character of UTF-8 */
    return (tarry_place){csv->path, csv->line, column};
}

bool tarry_csv_line(tarry_csv *csv, tarry_csv_field *line) {
    if (csv->at >= csv->end)
        return false;
    const size_t left = (size_t)(csv->end - csv->at);
    const char *stop = memchr(csv->at, '\n', left);
    csv->line++;
    csv->line_start = csv->at;
    line->text = csv->at;
    line->n = stop != NULL ? (size_t)(stop - csv->at) : left;
    csv->at += line->n + (stop != NULL);
    if (line->n > 0 && line->text[line->n - 1] == '\r')
        line->n--;
    return true;
}

static bool is_blank(char c) {
    return c == ' ' || c == '\t';
}

static const char *pass_blanks(const char *at, const char *stop) {
    while (at < stop && is_blank(*at))
        at++;
    return at;
}

/* A field in quotes; *at is left at the comma or the line's end behind it. */
static int cut_quoted(const tarry_csv *csv, const char **at, const char *stop,
                      tarry_csv_field *field, tarry_error *error) {
    const char *start = *at + 1;
    const char *quote = memchr(start, '"', (size_t)(stop - start));
    if (quote == NULL)
        return tarry_fail_at(error, TARRY_INPUT, tarry_csv_place(csv, *at),
                             "this quotation mark is not closed on its line");
    *field = (tarry_csv_field){start, (size_t)(quote - start)};
    *at = pass_blanks(quote + 1, stop);
    if (*at < stop && **at != ',')
        return tarry_fail_at(error, TARRY_INPUT, tarry_csv_place(csv, *at),
                             "a comma or the line's end is due after a closing quotation mark");
    return 0;
}

static void cut_plain(const char **at, const char *stop, tarry_csv_field *field) {
    const char *comma = *at;
    while (comma < stop && *comma != ',')
        comma++;
    size_t n = (size_t)(comma - *at);
    while (n > 0 && is_blank((*at)[n - 1]))
        n--;
    *field = (tarry_csv_field){*at, n};
    *at = comma;
}

int tarry_csv_row(tarry_csv *csv, tarry_csv_field *fields, size_t most, size_t *n,
                  tarry_error *error) {
    tarry_csv_field line;
    *n = 0;
    do {
        if (!tarry_csv_line(csv, &line))
            return 0;
    } while (pass_blanks(line.text, line.text + line.n) == line.text + line.n);
    const char *stop = line.text + line.n;
    for (const char *at = line.text;; at++) {
        tarry_csv_field spare = {0}, *field = *n < most ? &fields[*n] : &spare;
        at = pass_blanks(at, stop);
        if (*n <= most)
            ++*n;
        if (at < stop && *at == '"') {
            const int code = cut_quoted(csv, &at, stop, field, error);
            if (code != 0)
                return code;
        } else {
            cut_plain(&at, stop, field);
        }
        if (at >= stop)
            return 0;
    }
}
