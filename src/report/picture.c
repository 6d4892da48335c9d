/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "report/picture.h"

#include <ctype.h>
#include <string.h>

/* ---- whole? --------------------------------------------------------------------------------- */

static bool ends_with(const char *bytes, size_t n, const char *ending, size_t n_ending) {
    while (n > 0 && isspace((unsigned char)bytes[n - 1]) &&
           !isspace((unsigned char)ending[n_ending - 1]))
        n--;
    return n >= n_ending && !memcmp(bytes + n - n_ending, ending, n_ending);
}

bool tarry_picture_is_whole(tarry_figure_format format, const char *bytes, size_t n) {
    static const char last_chunk[] = "IEND\xae\x42\x60\x82";
    switch (format) {
    case TARRY_FIGURE_SVG:
        return ends_with(bytes, n, "</svg>", 6);
    case TARRY_FIGURE_PDF:
        return ends_with(bytes, n, "%%EOF", 5);
    case TARRY_FIGURE_PNG:
        return ends_with(bytes, n, last_chunk, sizeof last_chunk - 1);
    case TARRY_FIGURE_NONE:
        break;
    }
    return false;
}

/* ---- dates ---------------------------------------------------------------------------------- */

static char *find(char *bytes, size_t n, const char *what, size_t n_what) {
    for (size_t i = 0; i + n_what <= n; i++)
        if (bytes[i] == what[0] && !memcmp(bytes + i, what, n_what))
            return bytes + i;
    return NULL;
}

bool tarry_picture_fix_dates(char *bytes, size_t n) {
    static const char *const keys[] = {"/CreationDate (D:", "/ModDate (D:"};
    static const char date[] = "19700101000000";
    const size_t n_date = sizeof date - 1;
    bool any = false;
    for (size_t k = 0; k < sizeof keys / sizeof *keys; k++) {
        const size_t n_key = strlen(keys[k]);
        char *from = bytes;
        while ((from = find(from, n - (size_t)(from - bytes), keys[k], n_key))) {
            from += n_key;
            if ((size_t)(from - bytes) + n_date > n)
                break;
            memcpy(from, date, n_date);
            any = true;
        }
    }
    return any;
}

/* ---- in a page ------------------------------------------------------------------------------ */

static bool begins(const char *text, const char *with) {
    return !strncmp(text, with, strlen(with));
}

/* Behind the next `what`, or the end of the text. */
static const char *behind(const char *text, const char *what) {
    const char *at = strstr(text, what);
    return at ? at + strlen(what) : text + strlen(text);
}

/* In tags: what it says and what it becomes. %s is the stem. */
static const struct {
    const char *old;
    const char *new;
    bool stem; /* follows `new` */
} changes[] = {
    {" id=\"", " id=\"", true},
    {" id='", " id='", true},
    {"href='#", "href='#", true},
    {"color=\"black\"", "color=\"inherit\"", false},
    {"stroke=\"black\"", "stroke=\"currentColor\"", false},
    {"stroke='black'", "stroke='currentColor'", false},
    {"stroke='rgb(  0,   0,   0)'", "stroke='currentColor'", false},
    {"fill=\"black\"", "fill=\"currentColor\"", false},
};

/* From "<" to behind ">". */
static const char *copy_tag(const char *at, const char *stem, tarry_text *out) {
    while (*at && *at != '>') {
        size_t c = 0;
        const size_t n = sizeof changes / sizeof *changes;
        while (c < n && !begins(at, changes[c].old))
            c++;
        if (c == n) {
            tarry_text_add(out, at++, 1);
            continue;
        }
        at += strlen(changes[c].old);
        tarry_text_add_string(out, changes[c].new);
        if (changes[c].stem)
            tarry_text_printf(out, "%s-", stem);
    }
    if (*at)
        tarry_text_add(out, at++, 1);
    return at;
}

static const char *skip_blanks(const char *at) {
    while (isspace((unsigned char)*at))
        at++;
    return at;
}

/* Behind an element that a page does not want, or NULL. */
static const char *behind_unwanted(const char *at) {
    if (begins(at, "<title>"))
        return behind(at, "</title>");
    if (begins(at, "<desc>"))
        return behind(at, "</desc>");
    if (begins(at, "<filter "))
        return behind(at, "</filter>");
    if (begins(at, "<rect x=\"0\" y=\"0\""))
        return behind(at, "/>");
    if (begins(at, "<g ")) {
        const char *inside = skip_blanks(behind(at, ">"));
        return begins(inside, "</g>") ? inside + strlen("</g>") : NULL;
    }
    return NULL;
}

void tarry_picture_inline(const char *svg, const char *stem, tarry_text *out) {
    const char *at = strstr(svg, "<svg");
    while (at && *at) {
        const char *next = *at == '<' ? behind_unwanted(at) : NULL;
        if (next) {
            at = skip_blanks(next);
        } else if (*at == '<') {
            at = copy_tag(at, stem, out);
        } else if (isspace((unsigned char)*at) && isspace((unsigned char)at[1])) {
            at++;
        } else {
            tarry_text_add(out, at++, 1);
        }
    }
}
