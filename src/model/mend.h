/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_MODEL_MEND_H
#define TARRY_MODEL_MEND_H

/* Calls that YAML split: inside { } and [ ] a comma parts entries, so that in
 * `to: {open: k * repress(x, 40, 2)}` the value of `open` ends at `repress(x`. */

#include <stdbool.h>
#include <stddef.h>
#include "base/text.h"

/* text[0..n) has more opening than closing parentheses. */
bool tarry_mend_is_split(const char *text, size_t n);

/* The line(s) of `text` from the line that holds byte `at` to the line where the parentheses of the
 * value that begins at `at` close, as one line in which every value with a split call stands in
 * quotes. False, and nothing is added, where the parentheses never close. */
bool tarry_mend_line(const char *text, size_t n, size_t at, tarry_text *out);

#endif
