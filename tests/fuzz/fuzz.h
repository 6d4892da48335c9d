/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_FUZZ_H
#define TARRY_FUZZ_H

/* Readers fed with any bytes whatever. Each takes one input, checks what must hold of any answer,
 * and aborts where that fails; otherwise it returns 0. `make fuzz` looks for inputs with libFuzzer;
 * the corpora are replayed by tests/unit/test_fuzz.c with any compiler. */

#include <stddef.h>
#include <stdint.h>

typedef int fuzz_function(const uint8_t *data, size_t size);

fuzz_function fuzz_model, fuzz_expression, fuzz_quantity, fuzz_table, fuzz_data;

/* Stop here, with words, where `holds` is false. */
void fuzz_must(int holds, const char *words);

/* The bytes up to the first 0, with a 0 after them; to be freed. */
char *fuzz_text(const uint8_t *data, size_t size);

#endif
