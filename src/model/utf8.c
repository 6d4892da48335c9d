/* SPDX-License-Identifier: GPL-3.0-or-later */

/* UTF-8 by RFC 3629, section 4: the second byte's range depends on the first, all others are
 * 80..BF. */
#include "model/utf8.h"

#include "base/error.h"

#include <stdbool.h>

size_t tarry_utf8_read(const char *text, size_t n, unsigned long *code) {
    const unsigned char *bytes = (const unsigned char *)text;
    unsigned char first = bytes[0];
    if (first < 0x80) {
        *code = first;
        return 1;
    }
    if (first < 0xc2 || first > 0xf4)
        return 0;
    size_t size = first < 0xe0 ? 2 : first < 0xf0 ? 3 : 4;
    if (n < size)
        return 0;
    unsigned char least = first == 0xe0 ? 0xa0 : first == 0xf0 ? 0x90 : 0x80;
    unsigned char most = first == 0xed ? 0x9f : first == 0xf4 ? 0x8f : 0xbf;
    if (bytes[1] < least || bytes[1] > most)
        return 0;
    unsigned long value = first & (0x7fu >> size);
    for (size_t i = 1; i < size; i++) {
        if ((bytes[i] & 0xc0) != 0x80)
            return 0;
        value = value << 6 | (bytes[i] & 0x3fu);
    }
    *code = value;
    return size;
}

static bool belongs_in_text(unsigned long code) {
    if (code < 0x20)
        return code == '\t' || code == '\n' || code == '\r';
    return !(code >= 0x7f && code < 0xa0 && code != 0x85) && code != 0xfeff && code != 0xfffe &&
           code != 0xffff;
}

static int fail_bytes(const char *text, size_t at, tarry_place place, tarry_error *error) {
    const unsigned char *bytes = (const unsigned char *)text;
    if (at == 0 && (bytes[0] == 0xff || bytes[0] == 0xfe))
        return tarry_fail_at(error, TARRY_INPUT, place,
                             "this file is in UTF-16; save it as UTF-8 text");
    return tarry_fail_at(error, TARRY_INPUT, place,
                         "the byte 0x%02x here is not UTF-8; save the file as UTF-8 text",
                         (unsigned)bytes[at]);
}

int tarry_utf8_check(const char *text, size_t n, const char *file, tarry_error *error) {
    tarry_place place = {file, 1, 1};
    for (size_t i = 0; i < n;) {
        unsigned long code = 0;
        size_t size = tarry_utf8_read(text + i, n - i, &code);
        if (size == 0)
            return fail_bytes(text, i, place, error);
        if (code == 0)
            return tarry_fail_at(error, TARRY_INPUT, place,
                                 "a NUL character stands here; a model is plain text");
        if (!belongs_in_text(code))
            return tarry_fail_at(error, TARRY_INPUT, place,
                                 "the character U+%04lX stands here, which no text should hold; "
                                 "remove it",
                                 code);
        bool line_end = code == '\n' || (code == '\r' && (i + 1 == n || text[i + 1] != '\n'));
        place.line += line_end;
        place.column = line_end ? 1 : place.column + 1;
        i += size;
    }
    return 0;
}

size_t tarry_utf8_length(const char *text, size_t n) {
    size_t length = 0;
    for (size_t i = 0; i < n; i++)
        length += ((unsigned char)text[i] & 0xc0) != 0x80;
    return length;
}
