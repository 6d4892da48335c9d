/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "report/html.h"

#include "model/utf8.h"

#include <stdarg.h>
#include <string.h>

/* Characters that mislead or that XML has not: controls, marks of direction, invisible ones,
 * what is no character at all. */
static bool is_unseen(unsigned long code) {
    static const struct {
        unsigned long first, last;
    } ranges[] = {
        {0x00, 0x1f},     {0x7f, 0x9f},     {0xad, 0xad},     {0x61c, 0x61c},
        {0x180e, 0x180e}, {0x200b, 0x200f}, {0x2028, 0x202e}, {0x2060, 0x206f},
        {0xfdd0, 0xfdef}, {0xfeff, 0xfeff}, {0xfff0, 0xfffb}, {0xe0000, 0xe007f},
    };
    for (size_t i = 0; i < sizeof ranges / sizeof *ranges; i++)
        if (code >= ranges[i].first && code <= ranges[i].last)
            return true;
    return (code & 0xfffe) == 0xfffe;
}

static void add_character(tarry_text *out, const char *text, size_t n, unsigned long code) {
    switch (code) {
    case '&':
        tarry_text_add_string(out, "&amp;");
        break;
    case '<':
        tarry_text_add_string(out, "&lt;");
        break;
    case '>':
        tarry_text_add_string(out, "&gt;");
        break;
    case '"':
        tarry_text_add_string(out, "&quot;");
        break;
    case '\'':
        tarry_text_add_string(out, "&#39;");
        break;
    default:
        if (is_unseen(code))
            tarry_text_printf(out, "[U+%04lX]", code);
        else
            tarry_text_add(out, text, n);
    }
}

static void add_text(tarry_text *out, const char *text, size_t n, const char *kept) {
    for (size_t i = 0; i < n;) {
        unsigned long code = 0;
        const size_t size = tarry_utf8_read(text + i, n - i, &code);
        if (!size)
            tarry_text_add_string(out, "\xef\xbf\xbd");
        else if (code < 128 && code && strchr(kept, (int)code))
            tarry_text_add(out, text + i, 1);
        else if (code != '\r' || !*kept || i + 1 == n || text[i + 1] != '\n')
            add_character(out, text + i, size, code);
        i += size ? size : 1;
    }
}

void tarry_html_text(tarry_text *out, const char *text) {
    add_text(out, text, strlen(text), "");
}

void tarry_html_lines(tarry_text *out, const char *text, size_t n) {
    add_text(out, text, n, "\n\t");
}

void tarry_html_put(tarry_text *out, const char *markup, ...) {
    va_list texts;
    va_start(texts, markup);
    for (const char *at = markup; *at;) {
        const size_t n = strcspn(at, "%");
        tarry_text_add(out, at, n);
        at += n;
        if (!*at)
            break;
        if (at[1] == 's')
            tarry_html_text(out, va_arg(texts, const char *));
        else
            tarry_text_add(out, "%", 1);
        at += 2;
    }
    va_end(texts);
}
