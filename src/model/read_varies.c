/* SPDX-License-Identifier: GPL-3.0-or-later */

/* `varies: {gamma: {cv: 0.3}}` under a parameter: the law of the factor by which cells differ. A
 * law whose spread relative to its mean can be chosen takes `cv` alone; any law can be written as a
 * delay is, in whatever unit, and is then scaled to a mean of 1. */

#include "model/variation.h"

#include "base/error.h"
#include "base/memory.h"
#include "model/expect.h"
#include "model/law_template.h"
#include "model/read_delays.h"

#include <gsl/gsl_sf_gamma.h>
#include <math.h>
#include <string.h>

/* ---- who depends on a varied parameter ---------------------------------------------------------
 */

const char *tarry_varied_name(const tarry_builder *builder, const tarry_expression *expression) {
    for (uint32_t i = 0; i < expression->n_parameters; i++) {
        const tarry_builder_parameter *read = &builder->parameters.items[expression->parameters[i]];
        if (read->root != NULL)
            return read->root;
    }
    return NULL;
}

int tarry_refuse_varied(const tarry_builder *builder, const tarry_expression *expression,
                        const char *what, tarry_error *error) {
    const char *name = tarry_varied_name(builder, expression);
    if (name == NULL)
        return 0;
    return tarry_fail_at(
        error, TARRY_INPUT, expression->place,
        "%s, '%s', would differ from cell to cell, since '%s' varies, which is not "
        "possible here; use a parameter that all cells share",
        what, expression->text, name);
}

static int refuse_in_template(const tarry_builder *builder, const tarry_law_template *law,
                              tarry_error *error) {
    static const char what[] = "a number under 'varies'";
    int code = 0;
    if (law->a != NULL)
        code = tarry_refuse_varied(builder, law->a, what, error);
    if (code == 0 && law->b != NULL)
        code = tarry_refuse_varied(builder, law->b, what, error);
    const size_t n_points = law->n + (law->kind == TARRY_LAW_BINS);
    for (size_t i = 0; code == 0 && law->points != NULL && i < n_points; i++)
        code = tarry_refuse_varied(builder, &law->points[i], what, error);
    for (size_t i = 0; code == 0 && law->weights != NULL && i < law->n; i++)
        code = tarry_refuse_varied(builder, &law->weights[i], what, error);
    for (size_t i = 0; code == 0 && law->parts != NULL && i < law->n; i++)
        code = refuse_in_template(builder, &law->parts[i], error);
    return code;
}

/* ---- laws by their cv --------------------------------------------------------------------------
 */

/* The squared cv of a Weibull law falls with its shape. */
static double weibull_cv2(double shape) {
    const double first = gsl_sf_lngamma(1 + 1 / shape), second = gsl_sf_lngamma(1 + 2 / shape);
    return expm1(second - 2 * first);
}

static double weibull_shape(double cv) {
    double low = 0.05, high = 1000; /* on a log scale; its cv is 0.0013 at the end */
    for (int i = 0; i < 200; i++) {
        const double middle = sqrt(low * high);
        if (weibull_cv2(middle) > cv * cv)
            low = middle;
        else
            high = middle;
    }
    return sqrt(low * high);
}

static int erlang_by_cv(const tarry_node *node, double cv, tarry_law *law, tarry_error *error) {
    const double steps = floor(1 / (cv * cv) + 0.5);
    if (!(steps >= 1) || fabs(1 / sqrt(steps) - cv) > 1e-3 * cv)
        return tarry_fail_number(error, node->place,
                                 "an erlang factor of n steps has cv 1/sqrt(n): 1, 0.7071, 0.5774, "
                                 "0.5, ..., and not ",
                                 cv, "; use gamma for any other");
    *law = (tarry_law){.kind = TARRY_LAW_ERLANG, .a = 1, .b = steps};
    return 0;
}

static int law_by_cv(tarry_builder *builder, const char *word, const tarry_node *node,
                     tarry_law *law, tarry_error *error) {
    double cv = 0;
    int code = tarry_builder_constant_value(builder, node, TARRY_PURE, "'cv'", &cv, error);
    if (code != 0)
        return code;
    if (!(cv > 0))
        return tarry_fail_number(error, node->place, "'cv' must be above 0, not ", cv, "");
    if (strcmp(word, "gamma") == 0)
        *law = (tarry_law){.kind = TARRY_LAW_GAMMA, .a = 1, .b = cv};
    else if (strcmp(word, "lognormal") == 0)
        *law = (tarry_law){.kind = TARRY_LAW_LOGNORMAL, .a = 1, .b = cv};
    else if (strcmp(word, "normal") == 0)
        *law = (tarry_law){.kind = TARRY_LAW_NORMAL, .a = 1, .b = cv};
    else if (strcmp(word, "weibull") == 0)
        *law = (tarry_law){.kind = TARRY_LAW_WEIBULL, .a = 1, .b = weibull_shape(cv)};
    else if (strcmp(word, "erlang") == 0)
        return erlang_by_cv(node, cv, law, error);
    else if (strcmp(word, "uniform") == 0) {
        if (cv > 1 / sqrt(3))
            return tarry_fail_number(
                error, node->place,
                "a uniform factor has a cv of 0.577 (from 0 to 2) at most, not ", cv, "");
        *law = (tarry_law){.kind = TARRY_LAW_UNIFORM, .a = 1 - sqrt(3) * cv, .b = 1 + sqrt(3) * cv};
    } else if (strcmp(word, "exponential") == 0) {
        if (fabs(cv - 1) > 1e-9)
            return tarry_fail_number(error, node->place, "an exponential factor has cv 1, not ", cv,
                                     "; use gamma");
        *law = (tarry_law){.kind = TARRY_LAW_EXPONENTIAL, .a = 1};
    } else {
        return tarry_fail_at(error, TARRY_INPUT, node->place,
                             "'%s' has no 'cv' to choose; write it as a delay is written, it is "
                             "scaled to a mean of 1",
                             word);
    }
    return 0;
}

/* ---- scaling -----------------------------------------------------------------------------------
 */

static int scale_points(tarry_law *law, size_t n, double by, tarry_arena *arena) {
    double *points = tarry_arena_calloc(arena, n, sizeof *points);
    for (size_t i = 0; points != NULL && i < n; i++)
        points[i] = law->points[i] * by;
    law->points = points;
    return points == NULL;
}

/* Every value of the law times `by`; returns 1 when memory is short. */
static int scale(tarry_law *law, double by, tarry_arena *arena) {
    tarry_law *parts = NULL;
    switch (law->kind) {
    case TARRY_LAW_GAMMA:
    case TARRY_LAW_LOGNORMAL:
    case TARRY_LAW_NORMAL:
    case TARRY_LAW_UNIFORM:
        law->a *= by;
        law->b *= by;
        return 0;
    case TARRY_LAW_BINS:
        return scale_points(law, law->n + 1, by, arena);
    case TARRY_LAW_VALUES:
        return scale_points(law, law->n, by, arena);
    case TARRY_LAW_MIX:
    case TARRY_LAW_TOTAL:
        parts = tarry_arena_calloc(arena, law->n, sizeof *parts);
        if (parts == NULL)
            return 1;
        memcpy(parts, law->parts, law->n * sizeof *parts);
        law->parts = parts;
        for (size_t i = 0; i < law->n; i++)
            if (scale(&parts[i], by, arena) != 0)
                return 1;
        return 0;
    default:
        law->a *= by;
        return 0;
    }
}

/* ---- the reader --------------------------------------------------------------------------------
 */

static int law_as_delay(tarry_builder *builder, const tarry_node *node, tarry_law *law,
                        tarry_error *error) {
    tarry_law_template made = {0};
    int code = tarry_read_law(builder, node, &made, error);
    if (code == 0)
        code = refuse_in_template(builder, &made, error);
    if (code == 0)
        code = tarry_law_template_value(&made, builder->values, builder->arena, law, error);
    return code;
}

int tarry_read_factor(tarry_builder *builder, const tarry_builder_parameter *parameter,
                      tarry_law *law, tarry_error *error) {
    const tarry_node *node = parameter->varies;
    tarry_error fault = {0};
    if (node->kind != TARRY_NODE_MAP || node->n != 1)
        return tarry_fail_at(error, TARRY_INPUT, node->place,
                             "'varies' takes one law of the factor by which cells differ, as "
                             "{lognormal: {cv: 0.3}}");
    const tarry_node *inside = node->entries[0].node;
    const tarry_node *cv = inside->kind == TARRY_NODE_MAP ? tarry_node_get(inside, "cv") : NULL;
    int code = cv != NULL && inside->n == 1
                   ? law_by_cv(builder, node->entries[0].key, cv, law, error)
                   : law_as_delay(builder, node, law, error);
    if (code != 0)
        return code;
    const double mean = tarry_law_mean(law);
    if (!(tarry_law_sd(law) > 0) || !(mean > 0))
        return tarry_fail_at(
            error, TARRY_INPUT, node->place,
            "this factor is the same in all cells; leave 'varies' out, or give it a "
            "spread");
    if (scale(law, 1 / mean, builder->arena) != 0)
        return tarry_fail_memory(error, "the law of a parameter");
    code = tarry_law_check(law, &fault);
    return code == 0 ? 0 : tarry_fail_at(error, fault.code, node->place, "%s", fault.message);
}
