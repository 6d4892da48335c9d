/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_WORD_H
#define TARRY_WORD_H

/* "Did you mean": the same rule for words in models and on command lines. */

#include <stddef.h>

/* The candidate with the smallest edit distance to `word` where that is small enough to be a slip
 * of the hand (at most a third of the length, at least 1); NULL otherwise. */
const char *tarry_nearest_word(const char *word, const char *const *candidates, size_t n);

#endif
