/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_MODEL_EXPRESSION_H
#define TARRY_MODEL_EXPRESSION_H

/* Expressions: text -> a small stack program over parameters and species. */

#include <stdbool.h>
#include <stdint.h>
#include "base/memory.h"
#include "model/quantity.h"
#include "tarry/error.h"

enum { TARRY_EXPRESSION_DEPTH = 64 }; /* deepest stack a compiled expression may need */

typedef enum tarry_name_kind {
    TARRY_NAME_UNKNOWN,
    TARRY_NAME_PARAMETER,
    TARRY_NAME_SPECIES,
} tarry_name_kind;

/* How names are found. `find` gets a name that is not NUL-ended; it may set *dimension (a
 * parameter's, where known). `candidates` (may be NULL, n 0) feed "did you mean". */
typedef struct tarry_scope {
    void *context;
    tarry_name_kind (*find)(void *context, const char *name, size_t n, uint32_t *index,
                            tarry_dimension *dimension);
    const char *const *candidates;
    size_t n_candidates;
    /* Say what is wrong with an unknown name better than "there is no 'x' here" (0: no better word
     * is known); may be NULL. */
    int (*fail)(void *context, const char *name, tarry_place place, tarry_error *error);
} tarry_scope;

typedef struct tarry_instruction {
    uint32_t code;  /* from the list in program.h */
    uint32_t index; /* parameter or species */
    double value;   /* constant */
} tarry_instruction;

typedef struct tarry_expression {
    const tarry_instruction *instructions;
    uint32_t n_instructions;
    uint32_t n_parameters;
    uint32_t n_species;
    const uint32_t *parameters; /* those read, ascending, each once */
    const uint32_t *species;    /* those read, ascending, each once */
    tarry_dimension dimension;
    const char *text; /* as written */
    tarry_place place;
} tarry_expression;

/* Compile a scalar: a quantity as a whole, or an expression. Units are checked as far as they are
 * given; the result must fit `due` (TARRY_ANY: anything goes). Everything lives in `arena`.
 * `scope` may be NULL (no names). A plain number and what no unit was given for fits any `due`.
 * Errors: TARRY_INPUT with the column of the fault, TARRY_MEMORY. */
int tarry_expression_compile(const char *text, tarry_place place, tarry_dimension due,
                             tarry_units units, const tarry_scope *scope, tarry_arena *arena,
                             tarry_expression *out, tarry_error *error);

/* name[0..n) is the word of a unit or a function, which names nothing else. */
bool tarry_expression_is_reserved(const char *name, size_t n);

/* Value from parameters and species counts (either may be NULL where not read). Thread-safe. */
double tarry_expression_value(const tarry_expression *expression, const double *parameters,
                              const double *counts);

/* A copy in `arena` in which parameters are constants and what is constant is worked out. */
int tarry_expression_fold(const tarry_expression *expression, const double *parameters,
                          tarry_arena *arena, tarry_expression *out, tarry_error *error);

#endif
