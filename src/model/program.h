/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_MODEL_PROGRAM_H
#define TARRY_MODEL_PROGRAM_H

/* The stack programs that expressions are compiled to: their instructions, how they are put
 * together, and what each does. */

#include <stdbool.h>
#include <stddef.h>
#include "model/expression.h"

/* X(NAME, values taken from the stack); each puts one value back. The first sixteen are what the
 * compiler emits. The rest take their last operands from `value` or `index`, and are made when
 * a program is folded. */
#define TARRY_OPERATIONS(X)                                                                        \
    X(CONSTANT, 0)  /* value */                                                                    \
    X(PARAMETER, 0) /* parameters[index] */                                                        \
    X(SPECIES, 0)   /* counts[index] */                                                            \
    X(NEGATE, 1)                                                                                   \
    X(EXP, 1)                                                                                      \
    X(LOG, 1)                                                                                      \
    X(SQRT, 1)                                                                                     \
    X(ADD, 2)                                                                                      \
    X(SUBTRACT, 2)                                                                                 \
    X(MULTIPLY, 2)                                                                                 \
    X(DIVIDE, 2)                                                                                   \
    X(POWER, 2)                                                                                    \
    X(MIN, 2)                                                                                      \
    X(MAX, 2)                                                                                      \
    X(HILL, 3)                                                                                     \
    X(REPRESS, 3)                                                                                  \
    X(ADD_CONSTANT, 1)      /* x + value */                                                        \
    X(SUBTRACT_CONSTANT, 1) /* x - value */                                                        \
    X(MULTIPLY_CONSTANT, 1) /* x * value */                                                        \
    X(DIVIDE_CONSTANT, 1)   /* x / value */                                                        \
    X(ADD_SPECIES, 1)       /* x + counts[index] */                                                \
    X(SUBTRACT_SPECIES, 1)                                                                         \
    X(MULTIPLY_SPECIES, 1)                                                                         \
    X(DIVIDE_SPECIES, 1)                                                                           \
    X(POWER_WHOLE, 1)   /* x^index */                                                              \
    X(HILL_WHOLE, 1)    /* hill(x, value, index) */                                                \
    X(REPRESS_WHOLE, 1) /* repress(x, value, index) */

typedef enum tarry_operation {
#define TARRY_OPERATION_ENUM(name, takes) TARRY_OP_##name,
    TARRY_OPERATIONS(TARRY_OPERATION_ENUM)
#undef TARRY_OPERATION_ENUM
} tarry_operation;

/* A program in the making; zero-initialise. With `folding`, what is constant is worked out. */
typedef struct tarry_program {
    tarry_instruction *instructions; /* heap */
    size_t n, capacity;
    size_t height;  /* of the stack after the last instruction */
    size_t highest; /* that it ever had */
    bool folding;
    bool failed; /* memory was short: nothing more is added */
} tarry_program;

void tarry_program_add(tarry_program *program, tarry_operation code, uint32_t index, double value);
void tarry_program_release(tarry_program *program);

/* Put the program and the lists of what it reads into `out`, in `arena`. 0 or TARRY_MEMORY. */
int tarry_program_finish(const tarry_program *program, tarry_arena *arena, tarry_expression *out,
                         tarry_error *error);

#endif
