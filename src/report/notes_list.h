/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_REPORT_NOTES_LIST_H
#define TARRY_REPORT_NOTES_LIST_H

/* Notes for reading: those that say the same of several names in one window become one. */

#include "base/text.h"
#include "tarry/results.h"

/* Hand the notes of the results to `add` one after another, a paragraph each. Returns false when
 * memory was short. */
bool tarry_notes_each(const tarry_results *results,
                      void (*add)(void *context, const char *paragraph), void *context);

/* Append them for a terminal, in lines of at most `width` columns. */
void tarry_notes_list(const tarry_results *results, int width, tarry_text *text);

#endif
