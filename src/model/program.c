/* SPDX-License-Identifier: GPL-3.0-or-later */

/* One result for each operation, however it is written. x^n for whole n from -16 to 16 is a product
 * (square and multiply, and the reciprocal where n < 0), for other n it is pow(x, n); whether n is
 * known when compiling makes no difference. hill(x, K, n) = 1 / (1 + (K/x)^n) and repress(x, K, n)
 * = 1 / (1 + (x/K)^n), which equal x^n/(K^n + x^n) and 1 less that, but neither overflow nor
 * cancel. The order of operations is that of the text; folding works out what is constant and moves
 * nothing.
 */
#include "model/program.h"

#include "base/error.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

enum { LARGEST_WHOLE = 16 }; /* the highest power that is a product */

/* ---- running --------------------------------------------------------------------------------- */

static double power_whole(double x, uint32_t n) {
    double result = 1;
    for (; n > 1; n >>= 1) {
        if (n & 1)
            result *= x;
        x *= x;
    }
    return n == 1 ? result * x : result;
}

static double power(double x, double n) {
    if (!(fabs(n) <= LARGEST_WHOLE) || n != floor(n))
        return pow(x, n);
    return n < 0 ? 1 / power_whole(x, (uint32_t)-n) : power_whole(x, (uint32_t)n);
}

/* Not a number where either is none, unlike fmin and fmax: a faulty rate must not be hidden. */
static double smaller(double a, double b) {
    return a < b || isnan(a) ? a : b;
}

static double larger(double a, double b) {
    return a > b || isnan(a) ? a : b;
}

double tarry_expression_value(const tarry_expression *expression, const double *parameters,
                              const double *counts) {
    double stack[TARRY_EXPRESSION_DEPTH + 1];
    double *below = stack; /* what lies under the top, which is kept apart */
    double top = 0;
    const tarry_instruction *end = expression->instructions + expression->n_instructions;
    for (const tarry_instruction *in = expression->instructions; in < end; in++) {
        switch ((tarry_operation)in->code) {
        case TARRY_OP_CONSTANT:
            *below++ = top;
            top = in->value;
            break;
        case TARRY_OP_PARAMETER:
            *below++ = top;
            top = parameters[in->index];
            break;
        case TARRY_OP_SPECIES:
            *below++ = top;
            top = counts[in->index];
            break;
        case TARRY_OP_NEGATE:
            top = -top;
            break;
        case TARRY_OP_EXP:
            top = exp(top);
            break;
        case TARRY_OP_LOG:
            top = log(top);
            break;
        case TARRY_OP_SQRT:
            top = sqrt(top);
            break;
        case TARRY_OP_ADD:
            top = *--below + top;
            break;
        case TARRY_OP_SUBTRACT:
            top = *--below - top;
            break;
        case TARRY_OP_MULTIPLY:
            top = *--below * top;
            break;
        case TARRY_OP_DIVIDE:
            top = *--below / top;
            break;
        case TARRY_OP_POWER:
            top = power(*--below, top);
            break;
        case TARRY_OP_MIN:
            top = smaller(*--below, top);
            break;
        case TARRY_OP_MAX:
            top = larger(*--below, top);
            break;
        case TARRY_OP_HILL:
            below -= 2;
            top = 1 / (1 + power(below[1] / below[0], top));
            break;
        case TARRY_OP_REPRESS:
            below -= 2;
            top = 1 / (1 + power(below[0] / below[1], top));
            break;
        case TARRY_OP_ADD_CONSTANT:
            top = top + in->value;
            break;
        case TARRY_OP_SUBTRACT_CONSTANT:
            top = top - in->value;
            break;
        case TARRY_OP_MULTIPLY_CONSTANT:
            top = top * in->value;
            break;
        case TARRY_OP_DIVIDE_CONSTANT:
            top = top / in->value;
            break;
        case TARRY_OP_ADD_SPECIES:
            top = top + counts[in->index];
            break;
        case TARRY_OP_SUBTRACT_SPECIES:
            top = top - counts[in->index];
            break;
        case TARRY_OP_MULTIPLY_SPECIES:
            top = top * counts[in->index];
            break;
        case TARRY_OP_DIVIDE_SPECIES:
            top = top / counts[in->index];
            break;
        case TARRY_OP_POWER_WHOLE:
            top = power_whole(top, in->index);
            break;
        case TARRY_OP_HILL_WHOLE:
            top = 1 / (1 + power_whole(in->value / top, in->index));
            break;
        case TARRY_OP_REPRESS_WHOLE:
            top = 1 / (1 + power_whole(top / in->value, in->index));
            break;
        }
    }
    return top;
}

/* ---- putting together ------------------------------------------------------------------------ */

static size_t operands(tarry_operation code) {
    static const unsigned char takes[] = {
#define TARRY_OPERATION_TAKES(name, n) [TARRY_OP_##name] = (n),
        TARRY_OPERATIONS(TARRY_OPERATION_TAKES)
#undef TARRY_OPERATION_TAKES
    };
    return takes[code];
}

/* Instructions at the end of the program that are constants, at most n. */
static size_t constants(const tarry_program *program, size_t n) {
    size_t found = 0;
    while (found < n && found < program->n &&
           program->instructions[program->n - 1 - found].code == TARRY_OP_CONSTANT)
        found++;
    return found;
}

/* An operation on constants alone becomes their result. */
static bool fold(tarry_program *program, tarry_operation code) {
    size_t n = operands(code);
    if (n == 0 || constants(program, n) < n)
        return false;
    tarry_instruction work[4];
    memcpy(work, program->instructions + program->n - n, n * sizeof *work);
    work[n] = (tarry_instruction){code, 0, 0};
    tarry_expression call = {.instructions = work, .n_instructions = (uint32_t)n + 1};
    double value = tarry_expression_value(&call, NULL, NULL);
    program->n -= n - 1;
    program->instructions[program->n - 1] = (tarry_instruction){TARRY_OP_CONSTANT, 0, value};
    return true;
}

static bool is_whole_power(double n) {
    return n >= 0 && n <= LARGEST_WHOLE && n == floor(n);
}

/* An operation whose last operands are plain takes them into itself. */
static bool fuse(tarry_program *program, tarry_operation code) {
    tarry_instruction *last = &program->instructions[program->n - 1];
    if (code >= TARRY_OP_ADD && code <= TARRY_OP_DIVIDE && last->code == TARRY_OP_CONSTANT) {
        last->code = TARRY_OP_ADD_CONSTANT + (code - TARRY_OP_ADD);
        return true;
    }
    if (code >= TARRY_OP_ADD && code <= TARRY_OP_DIVIDE && last->code == TARRY_OP_SPECIES) {
        last->code = TARRY_OP_ADD_SPECIES + (code - TARRY_OP_ADD);
        return true;
    }
    if (code == TARRY_OP_POWER && constants(program, 1) == 1 && is_whole_power(last->value)) {
        *last = (tarry_instruction){TARRY_OP_POWER_WHOLE, (uint32_t)last->value, 0};
        return true;
    }
    if ((code == TARRY_OP_HILL || code == TARRY_OP_REPRESS) && constants(program, 2) == 2 &&
        is_whole_power(last->value)) {
        last[-1].code = code == TARRY_OP_HILL ? TARRY_OP_HILL_WHOLE : TARRY_OP_REPRESS_WHOLE;
        last[-1].index = (uint32_t)last->value;
        program->n--;
        return true;
    }
    return false;
}

void tarry_program_add(tarry_program *program, tarry_operation code, uint32_t index, double value) {
    if (program->failed)
        return;
    program->height += 1 - operands(code);
    if (program->height > program->highest)
        program->highest = program->height;
    if (program->folding && (fold(program, code) || (operands(code) > 1 && fuse(program, code))))
        return;
    program->failed = tarry_grow((void **)&program->instructions, &program->capacity,
                                 program->n + 1, sizeof *program->instructions);
    if (!program->failed)
        program->instructions[program->n++] = (tarry_instruction){code, index, value};
}

void tarry_program_release(tarry_program *program) {
    free(program->instructions);
    *program = (tarry_program){0};
}

static int ascending(const void *one, const void *other) {
    uint32_t a = *(const uint32_t *)one, b = *(const uint32_t *)other;
    return (a > b) - (a < b);
}

static bool reads(const tarry_instruction *in, tarry_operation code) {
    return in->code == (uint32_t)code ||
           (code == TARRY_OP_SPECIES && in->code >= TARRY_OP_ADD_SPECIES &&
            in->code <= TARRY_OP_DIVIDE_SPECIES);
}

/* The indices that instructions of one kind read, ascending, each once; NULL without memory. */
static const uint32_t *list(const tarry_program *program, tarry_operation code, tarry_arena *arena,
                            uint32_t *n) {
    size_t found = 0;
    for (size_t i = 0; i < program->n; i++)
        found += reads(&program->instructions[i], code);
    uint32_t *indices = tarry_arena_calloc(arena, found, sizeof *indices);
    if (indices == NULL)
        return NULL;
    found = 0;
    for (size_t i = 0; i < program->n; i++)
        if (reads(&program->instructions[i], code))
            indices[found++] = program->instructions[i].index;
    if (found > 0)
        qsort(indices, found, sizeof *indices, ascending);
    *n = 0;
    for (size_t i = 0; i < found; i++)
        if (i == 0 || indices[i] != indices[i - 1])
            indices[(*n)++] = indices[i];
    return indices;
}

int tarry_program_finish(const tarry_program *program, tarry_arena *arena, tarry_expression *out,
                         tarry_error *error) {
    tarry_instruction *instructions = NULL;
    if (!program->failed && program->instructions != NULL)
        instructions = tarry_arena_calloc(arena, program->n, sizeof *instructions);
    if (instructions == NULL)
        return tarry_fail_memory(error, "an expression");
    memcpy(instructions, program->instructions, program->n * sizeof *instructions);
    out->instructions = instructions;
    out->n_instructions = (uint32_t)program->n;
    out->parameters = list(program, TARRY_OP_PARAMETER, arena, &out->n_parameters);
    out->species = list(program, TARRY_OP_SPECIES, arena, &out->n_species);
    if (out->parameters == NULL || out->species == NULL)
        return tarry_fail_memory(error, "an expression");
    return 0;
}

/* Add an instruction of a program that may have been folded before: one that holds its last
 * operands is taken apart first. */
static void add_again(tarry_program *program, const tarry_instruction *in,
                      const double *parameters) {
    tarry_operation code = (tarry_operation)in->code;
    if (code == TARRY_OP_PARAMETER) {
        tarry_program_add(program, TARRY_OP_CONSTANT, 0, parameters[in->index]);
    } else if (code >= TARRY_OP_ADD_CONSTANT && code <= TARRY_OP_DIVIDE_CONSTANT) {
        tarry_program_add(program, TARRY_OP_CONSTANT, 0, in->value);
        tarry_program_add(program, TARRY_OP_ADD + (code - TARRY_OP_ADD_CONSTANT), 0, 0);
    } else if (code >= TARRY_OP_ADD_SPECIES && code <= TARRY_OP_DIVIDE_SPECIES) {
        tarry_program_add(program, TARRY_OP_SPECIES, in->index, 0);
        tarry_program_add(program, TARRY_OP_ADD + (code - TARRY_OP_ADD_SPECIES), 0, 0);
    } else if (code == TARRY_OP_POWER_WHOLE) {
        tarry_program_add(program, TARRY_OP_CONSTANT, 0, in->index);
        tarry_program_add(program, TARRY_OP_POWER, 0, 0);
    } else if (code == TARRY_OP_HILL_WHOLE || code == TARRY_OP_REPRESS_WHOLE) {
        tarry_program_add(program, TARRY_OP_CONSTANT, 0, in->value);
        tarry_program_add(program, TARRY_OP_CONSTANT, 0, in->index);
        tarry_program_add(program, code == TARRY_OP_HILL_WHOLE ? TARRY_OP_HILL : TARRY_OP_REPRESS,
                          0, 0);
    } else {
        tarry_program_add(program, code, in->index, in->value);
    }
}

int tarry_expression_fold(const tarry_expression *expression, const double *parameters,
                          tarry_arena *arena, tarry_expression *out, tarry_error *error) {
    tarry_program program = {.folding = true};
    tarry_expression folded = *expression;
    for (uint32_t i = 0; i < expression->n_instructions; i++)
        add_again(&program, &expression->instructions[i], parameters);
    int code = tarry_program_finish(&program, arena, &folded, error);
    if (code == 0)
        *out = folded;
    tarry_program_release(&program);
    return code;
}
