/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_MODEL_PUBLIC_H
#define TARRY_MODEL_PUBLIC_H

/* Reading models. */

#include <stddef.h>
#include "tarry/error.h"

typedef struct tarry_model tarry_model;

/* A value that beats the file: of a key under `run:` ("cells", "settle", "until", "every",
 * "snapshots", "seed") or of a parameter. `value` is text as in the file ("5 h", "k * 2",
 * "0 min,5 h"). `option` names where it came from, for messages ("--cells"). */
typedef struct tarry_override {
    const char *option;
    int is_parameter; /* 0: a key of `run:` */
    const char *name;
    const char *value;
} tarry_override;

/* Read and check a model file (at most 64 MiB). Every error says file:line:column. */
int tarry_model_read(const char *path, const tarry_override *overrides, size_t n_overrides,
                     tarry_model **model, tarry_error *error);

/* The same from memory; `name` stands for the file in messages, tables are sought beside it. */
int tarry_model_read_text(const char *text, size_t size, const char *name,
                          const tarry_override *overrides, size_t n_overrides, tarry_model **model,
                          tarry_error *error);

void tarry_model_free(tarry_model *model); /* NULL is fine */

/* Warnings met while reading: whole sentences with their place. */
size_t tarry_model_n_warnings(const tarry_model *model);
const char *tarry_model_warning(const tarry_model *model, size_t i);

/* The text as read, NUL-ended. */
const char *tarry_model_text(const tarry_model *model, size_t *size);

#endif
