/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_MODEL_UTF8_H
#define TARRY_MODEL_UTF8_H

/* Text that people wrote, checked before anything else looks at it. */

#include <stddef.h>
#include "tarry/error.h"

/* Bytes of the UTF-8 character at text[0..n), n > 0; 0 where there is none (RFC 3629: no overlong
 * forms, no surrogates, nothing above U+10FFFF). *code is set otherwise. */
size_t tarry_utf8_read(const char *text, size_t n, unsigned long *code);

/* TARRY_INPUT with line and column in `file` where text[0..n) is not UTF-8 or holds a character
 * that no text should (control characters but tab and line ends, U+FEFF, non-characters). */
int tarry_utf8_check(const char *text, size_t n, const char *file, tarry_error *error);

/* Characters in text[0..n), which is UTF-8. */
size_t tarry_utf8_length(const char *text, size_t n);

#endif
