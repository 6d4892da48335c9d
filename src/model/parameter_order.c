/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Depth first search with a stack of its own (Tarjan 1976, Acta Informatica 6:171), so that a chain
 * of a hundred thousand parameters is no deeper for the program than a chain of two. */
#include "model/parameter_order.h"

#include "base/error.h"
#include "base/memory.h"
#include "base/text.h"

#include <math.h>
#include <stdlib.h>

enum { LONGEST_CHAIN = 12 }; /* names shown of a circle */

typedef enum visit_state { UNSEEN, OPEN, DONE } visit_state;

typedef struct open_parameter {
    uint32_t parameter;
    uint32_t next; /* of those that it reads */
} open_parameter;

typedef struct search {
    const tarry_builder *builder;
    unsigned char *states;
    open_parameter *stack;
    size_t height;
    uint32_t *order;
    size_t n;
} search;

static int fail_circle(const search *in, uint32_t again, tarry_error *error) {
    const tarry_builder_parameter *parameters = in->builder->parameters.items;
    size_t from = in->height;
    while (from > 0 && in->stack[from - 1].parameter != again)
        from--;
    tarry_text chain = {0};
    for (size_t i = from - 1; i < in->height; i++) {
        if (i - from + 1 < LONGEST_CHAIN)
            tarry_text_printf(&chain, "%s -> ", parameters[in->stack[i].parameter].name);
        else if (i - from + 1 == LONGEST_CHAIN)
            tarry_text_add_string(&chain, "... -> ");
    }
    tarry_text_add_string(&chain, parameters[again].name);
    const int code = chain.failed
                         ? tarry_fail_memory(error, "a message")
                         : tarry_fail_at(error, TARRY_INPUT, parameters[again].place,
                                         "parameters are made of one another in a circle: %s; one "
                                         "of them needs a number",
                                         chain.data);
    tarry_text_release(&chain);
    return code;
}

static void enter(search *in, uint32_t parameter) {
    in->states[parameter] = OPEN;
    in->stack[in->height++] = (open_parameter){parameter, 0};
}

/* Order `start` and all that it reads. */
static int walk(search *in, uint32_t start,
                int (*visit)(void *context, uint32_t parameter, tarry_error *error), void *context,
                tarry_error *error) {
    int code = 0;
    enter(in, start);
    while (code == 0 && in->height > 0) {
        open_parameter *top = &in->stack[in->height - 1];
        const tarry_expression *expression =
            &in->builder->parameters.items[top->parameter].expression;
        if (top->next < expression->n_parameters) {
            const uint32_t read = expression->parameters[top->next++];
            if (in->states[read] == OPEN)
                return fail_circle(in, read, error);
            if (in->states[read] == UNSEEN)
                enter(in, read);
            continue;
        }
        in->states[top->parameter] = DONE;
        in->order[in->n++] = top->parameter;
        in->height--;
        if (visit != NULL)
            code = visit(context, in->order[in->n - 1], error);
    }
    return code;
}

int tarry_parameter_order(tarry_builder *builder, uint32_t *order,
                          int (*visit)(void *context, uint32_t parameter, tarry_error *error),
                          void *context, tarry_error *error) {
    const size_t n = builder->parameters.n;
    search in = {.builder = builder, .order = order};
    in.states = tarry_calloc(n, sizeof *in.states);
    in.stack = tarry_calloc(n, sizeof *in.stack);
    int code = 0;
    if (in.states == NULL || in.stack == NULL)
        code = tarry_fail_memory(error, "the parameters");
    for (uint32_t i = 0; i < n && code == 0; i++)
        if (in.states[i] == UNSEEN)
            code = walk(&in, i, visit, context, error);
    free(in.states);
    free(in.stack);
    return code;
}

int tarry_parameter_values(const tarry_builder *builder, const bool *fixed, double *values,
                           tarry_error *error) {
    for (size_t i = 0; i < builder->parameters.n; i++) {
        const uint32_t at = builder->order[i];
        const tarry_builder_parameter *parameter = &builder->parameters.items[at];
        if (!fixed[at])
            values[at] = tarry_expression_value(&parameter->expression, values, NULL);
        if (!isfinite(values[at]))
            return tarry_fail_at(error, TARRY_INPUT, parameter->expression.place,
                                 "'%s', which is %s, comes to no finite number (a division by "
                                 "zero, a logarithm of 0?)",
                                 parameter->name, parameter->expression.text);
    }
    return 0;
}
