/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_TESTS_READING_H
#define TARRY_TESTS_READING_H

/* Reading parts of a model without the rest: the builder with a text's tree in it. */

#include "model/builder.h"

typedef int reader(tarry_builder *builder, tarry_error *error);

/* The workshop of one test; `file` is "m.yaml" and the unit of time a minute. */
typedef struct reading {
    tarry_model model;
    tarry_builder builder;
    tarry_error error;
} reading;

/* Read `text` (YAML) into a tree; nothing of it is understood yet. */
void reading_start(reading *in, const char *text, const tarry_override *overrides,
                   size_t n_overrides);
void reading_end(reading *in);

/* Call readers[0..n) in order; all must succeed. */
void reading_pass(reading *in, reader *const *readers, size_t n);

/* Read `text` with readers[0..n): one of them must fail with this code, at this place (line 0:
 * none) and with these words. */
void reading_refused(const char *text, const tarry_override *overrides, size_t n_overrides,
                     reader *const *readers, size_t n, tarry_code code, int line, int column,
                     const char *words);

/* Value of a parameter before any step. */
double reading_parameter(const reading *in, const char *name);

#endif
