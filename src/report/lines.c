/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "report/lines.h"

#include <string.h>

/* Characters of a text of n bytes: bytes that do not continue one. */
static int count_characters(const char *word, size_t n) {
    int count = 0;
    for (size_t i = 0; i < n; i++)
        count += ((unsigned char)word[i] & 0xc0) != 0x80;
    return count;
}

int tarry_lines_characters(const char *word) {
    return count_characters(word, strlen(word));
}

static void add_bytes(tarry_text *text, const char *word, size_t n) {
    for (size_t i = 0; i < n; i++) {
        const unsigned char byte = (unsigned char)word[i];
        tarry_text_add(text, byte < ' ' || byte == 127 ? "?" : word + i, 1);
    }
}

static void add_blanks(tarry_text *text, int n) {
    while (n-- > 0)
        tarry_text_add(text, " ", 1);
}

void tarry_lines_add(tarry_text *text, const char *word) {
    add_bytes(text, word, strlen(word));
}

void tarry_lines_left(tarry_text *text, const char *word, int width) {
    const int blanks = width - count_characters(word, strlen(word));
    tarry_lines_add(text, word);
    add_blanks(text, blanks > 0 ? blanks : 1);
}

void tarry_lines_right(tarry_text *text, const char *word, int width) {
    add_blanks(text, width - count_characters(word, strlen(word)));
    tarry_lines_add(text, word);
}

void tarry_lines_wrap(tarry_text *text, const char *first, const char *paragraph, int width) {
    const int indent = count_characters(first, strlen(first));
    int used = indent;
    tarry_lines_add(text, first);
    for (const char *at = paragraph; *at;) {
        const size_t n = strcspn(at, " \n");
        const int size = count_characters(at, n);
        const bool begins = used == indent;
        if (!begins && used + 1 + size > width) {
            tarry_text_add(text, "\n", 1);
            add_blanks(text, indent);
            used = indent;
        } else if (!begins) {
            tarry_text_add(text, " ", 1);
            used++;
        }
        add_bytes(text, at, n);
        used += size;
        at += n;
        at += strspn(at, " \n");
    }
    tarry_text_add(text, "\n", 1);
}
