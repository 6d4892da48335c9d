/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_REPORT_JSON_H
#define TARRY_REPORT_JSON_H

/* JSON: values are jansson's, the text is ours, since jansson writes 0.1 with 17 digits. Keys stay
 * in the order in which they were put in, numbers take the fewest digits that read back the same,
 * and what holds no further lists or objects stands on one line. */

#include <jansson.h>
#include <stdbool.h>
#include "base/text.h"

/* Append `value` as it stands at this depth of nesting (2 blanks each); NULL: `text` is failed. */
void tarry_json_write(const json_t *value, int depth, tarry_text *text);

/* A finite number, or null. */
json_t *tarry_json_number(double value);

/* A text; bytes that are no UTF-8 become '?'. NULL only when memory is short. */
json_t *tarry_json_text(const char *text);

/* Put a value (owned from now on) into an object or a list. Where that fails, or `value` is NULL,
 * *failed becomes true: look at it once at the end. */
void tarry_json_put(json_t *object, const char *key, json_t *value, bool *failed);
void tarry_json_append(json_t *list, json_t *value, bool *failed);

#endif
