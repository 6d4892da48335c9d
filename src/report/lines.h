/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_REPORT_LINES_H
#define TARRY_REPORT_LINES_H

/* Lines for a terminal: padding and wrapping by characters of UTF-8. */

#include "base/text.h"

/* Characters of a text. */
int tarry_lines_characters(const char *word);

/* Append a text without control characters. */
void tarry_lines_add(tarry_text *text, const char *word);

/* The same, then blanks up to `width` characters (left), or after them (right). A longer text is
 * followed by one blank, or has none before it. */
void tarry_lines_left(tarry_text *text, const char *word, int width);
void tarry_lines_right(tarry_text *text, const char *word, int width);

/* A paragraph of at most `width` characters a line where words allow; its first line begins with
 * `first`, the others with as many blanks. */
void tarry_lines_wrap(tarry_text *text, const char *first, const char *paragraph, int width);

#endif
