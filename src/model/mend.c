/* SPDX-License-Identifier: GPL-3.0-or-later */

/* The mended line is made from the characters of the file, not from what the YAML reader made of
 * them, so that a user sees the line that he wrote. Only values that begin after `{`, `[`, `,` or
 * `: ` are looked at, which is where a call can be split. */
#include "model/mend.h"

#include <string.h>

bool tarry_mend_is_split(const char *text, size_t n) {
    long depth = 0;
    for (size_t i = 0; i < n; i++)
        depth += text[i] == '(' ? 1 : text[i] == ')' ? -1 : 0;
    return depth > 0;
}

static bool is_line_end(char c) {
    return c == '\n' || c == '\r';
}

static bool is_blank(char c) {
    return c == ' ' || c == '\t' || is_line_end(c);
}

/* Where the value that begins at `i` ends: at the first `,`, `}` or `]` outside parentheses.
 * *closed: the parentheses are balanced there. */
static size_t value_end(const char *text, size_t n, size_t i, bool *closed) {
    long depth = 0;
    for (; i < n; i++) {
        char c = text[i];
        if (depth <= 0 && (c == ',' || c == '}' || c == ']'))
            break;
        if (c == '{' || c == '}' || c == '[' || c == ']' || c == '#')
            break;
        depth += c == '(' ? 1 : c == ')' ? -1 : 0;
    }
    *closed = depth <= 0;
    return i;
}

/* Where YAML lets a plain value end: at `,` `}` `]`, a `: ` or the line's end. */
static size_t plain_end(const char *text, size_t n, size_t i) {
    while (i < n && strchr(",{}[]\n\r", text[i]) == NULL &&
           !(text[i] == ':' && i + 1 < n && is_blank(text[i + 1])))
        i++;
    return i;
}

static size_t quoted_end(const char *text, size_t n, size_t i) {
    char quote = text[i++];
    while (i < n && text[i] != quote)
        i += text[i] == '\\' && quote == '"' && i + 1 < n ? 2 : 1;
    return i < n ? i + 1 : n;
}

/* Append text[from..to) with each run of blanks around a line end as one blank. */
static void add_joined(tarry_text *out, const char *text, size_t from, size_t to) {
    for (size_t i = from; i < to;) {
        size_t end = i;
        bool line_end = false;
        while (end < to && is_blank(text[end]))
            line_end = is_line_end(text[end++]) || line_end;
        if (line_end) {
            tarry_text_add(out, " ", 1);
            i = end;
        } else {
            tarry_text_add(out, text + i, end + (end == i) - i);
            i = end + (end == i);
        }
    }
}

/* Append the value that begins at `i`, in quotes where it holds a split call; returns its end. */
static size_t add_value(tarry_text *out, const char *text, size_t n, size_t i) {
    if (text[i] == '"' || text[i] == '\'') {
        size_t end = quoted_end(text, n, i);
        tarry_text_add(out, text + i, end - i);
        return end;
    }
    size_t end = plain_end(text, n, i);
    if (!tarry_mend_is_split(text + i, end - i)) {
        add_joined(out, text, i, end);
        return end;
    }
    bool closed = false;
    end = value_end(text, n, i, &closed);
    size_t last = end;
    while (last > i && is_blank(text[last - 1]))
        last--;
    const char *quote = closed ? "\"" : "";
    tarry_text_add_string(out, quote);
    add_joined(out, text, i, last);
    tarry_text_add_string(out, quote);
    add_joined(out, text, last, end);
    return end;
}

bool tarry_mend_line(const char *text, size_t n, size_t at, tarry_text *out) {
    size_t from = at, to = at;
    bool closed = false;
    while (from > 0 && !is_line_end(text[from - 1]))
        from--;
    while (from < at && is_blank(text[from]))
        from++;
    to = value_end(text, n, at, &closed);
    if (!closed)
        return false;
    while (to < n && !is_line_end(text[to]))
        to++;
    bool value = true;
    for (size_t i = from; i < to;) {
        size_t start = i;
        while (i < to && is_blank(text[i]))
            i++;
        add_joined(out, text, start, i);
        if (i < to && value && strchr("{[,}]:", text[i]) == NULL) {
            i = add_value(out, text, to, i);
            value = false;
        } else if (i < to) {
            value = text[i] != '}' && text[i] != ']';
            tarry_text_add(out, text + i++, 1);
        }
    }
    return true;
}
