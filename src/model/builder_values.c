/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "model/builder.h"

/* Scalars that stand for numbers: rates, means and constants. They stay expressions here; what they
 * come to in each segment is worked out by tarry_finish. */

#include "base/error.h"
#include "base/memory.h"
#include "model/expect.h"
#include "model/like_genes.h"
#include "model/variation.h"

#include <math.h>

/* Compile a scalar that may read parameters and species. */
static int compile(tarry_builder *builder, const tarry_node *node, tarry_dimension due,
                   const char *what, tarry_expression *out, tarry_error *error) {
    const int code = tarry_expect_scalar(node, what, error);
    if (code != 0)
        return code;
    return tarry_expression_compile(node->text, node->place, due, builder->units, &builder->scope,
                                    builder->arena, out, error);
}

int tarry_builder_expression(tarry_builder *builder, const tarry_node *node, tarry_dimension due,
                             const char *what, tarry_expression *out, tarry_error *error) {
    const int code = compile(builder, node, due, what, out, error);
    if (code != 0)
        return code;
    if (out->n_species == 0)
        return 0;
    return tarry_fail_at(error, TARRY_INPUT, node->place,
                         "%s cannot depend on '%s', whose count changes during a run; only "
                         "parameters may be used here",
                         what, builder->species.items[out->species[0]].name);
}

int tarry_builder_constant_value(tarry_builder *builder, const tarry_node *node,
                                 tarry_dimension due, const char *what, double *value,
                                 tarry_error *error) {
    tarry_builder_constant constant = {.what = what};
    const int code = tarry_builder_expression(builder, node, due, what, &constant.expression,
                                              error);
    if (code != 0)
        return code;
    if (tarry_refuse_varied(builder, &constant.expression, what, error) != 0)
        return TARRY_INPUT;
    *value = tarry_expression_value(&constant.expression, builder->values, NULL);
    if (!isfinite(*value))
        return tarry_fail_at(error, TARRY_INPUT, node->place,
                             "%s comes to no finite number (a division by zero, a logarithm of "
                             "0?)",
                             what);
    if (constant.expression.n_parameters > 0 && TARRY_APPEND(&builder->constants, constant) != 0)
        return tarry_fail_memory(error, "a constant");
    return 0;
}

int tarry_builder_formula(tarry_builder *builder, const tarry_node *node, const char *what,
                          uint32_t *index, tarry_error *error) {
    tarry_expression expression = {0};
    const int code = compile(builder, node, TARRY_RATE, what, &expression, error);
    if (code != 0)
        return code;
    *index = (uint32_t)builder->formulas.n;
    return TARRY_APPEND(&builder->formulas, expression) == 0
               ? 0
               : tarry_fail_memory(error, "a propensity");
}

int tarry_builder_rate(tarry_builder *builder, const tarry_node *node, bool half_life,
                       const char *what, bool *formula, uint32_t *index, tarry_error *error) {
    tarry_source source = {.half_life = half_life, .what = what};
    int code = 0;
    if (tarry_like_shared(builder, node, index)) {
        *formula = false;
        return 0;
    }
    if (half_life)
        code = tarry_builder_expression(builder, node, TARRY_TIME, what, &source.expression, error);
    else
        code = compile(builder, node, TARRY_RATE, what, &source.expression, error);
    if (code != 0)
        return code;
    *formula = source.expression.n_species > 0;
    *index = (uint32_t)(*formula ? builder->formulas.n : builder->rates.n);
    const int full = *formula ? TARRY_APPEND(&builder->formulas, source.expression)
                              : TARRY_APPEND(&builder->rates, source);
    if (full != 0)
        return tarry_fail_memory(error, "a rate");
    return *formula ? 0 : tarry_like_share(builder, node, *index, error);
}

int tarry_builder_mean(tarry_builder *builder, const tarry_node *node, double least,
                       const char *what, uint32_t *index, tarry_error *error) {
    tarry_source source = {.least = least, .what = what};
    const int code = tarry_builder_expression(builder, node, TARRY_PURE, what, &source.expression,
                                              error);
    if (code != 0)
        return code;
    *index = (uint32_t)builder->means.n;
    return TARRY_APPEND(&builder->means, source) == 0 ? 0 : tarry_fail_memory(error, "a mean");
}

void tarry_cumulate(double *weights, size_t n) {
    double sum = 0;
    for (size_t i = 0; i < n; i++)
        sum += weights[i];
    double below = 0;
    for (size_t i = 0; i < n; i++) {
        below += weights[i];
        weights[i] = i + 1 == n ? 1 : fmin(below / sum, 1);
    }
}
