/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "model/law_template.h"

/* Law templates -> laws: each expression is worked out with the parameters of one segment, weights
 * are made to add up to 1, values are brought into order, and the family checks the outcome. */

#include "base/error.h"
#include "base/memory.h"
#include "model/expect.h"

#include <math.h>
#include <stdlib.h>

/* Shares of a mix are meant to add up to 1; a slip larger than this is an error. */
static const double SHARE_SLIP = 1e-6;

typedef struct weighted {
    double point;
    double weight;
} weighted;

static double value(const tarry_expression *expression, const double *parameters) {
    return expression == NULL ? 0 : tarry_expression_value(expression, parameters, NULL);
}

/* All n weights, made to add up to 1; a negative or unbounded one is an error. */
static int weights_of(const tarry_law_template *template, const double *parameters, double *out,
                      tarry_error *error) {
    double sum = 0;
    for (size_t i = 0; i < template->n; i++) {
        out[i] = value(&template->weights[i], parameters);
        if (!(out[i] >= 0) || !isfinite(out[i]))
            return tarry_fail_number(error, template->weights[i].place,
                                     "a weight must be 0 or more; this one is ", out[i], "");
        sum += out[i];
    }
    if (!(sum > 0) || !isfinite(sum))
        return tarry_fail_number(error, template->place, "the weights add up to ", sum,
                                 "; at least one must be above 0");
    if (template->kind == TARRY_LAW_MIX && fabs(sum - 1) > SHARE_SLIP)
        return tarry_fail_number(error, template->place, "the shares of a mix add up to ", sum,
                                 "; they must add up to 1");
    for (size_t i = 0; i < template->n; i++)
        out[i] /= sum;
    return 0;
}

static int by_point(const void *one, const void *other) {
    const double a = ((const weighted *)one)->point;
    const double b = ((const weighted *)other)->point;
    return (a > b) - (a < b);
}

/* Ascending values, each once, since a measured list may hold them in any order. */
static int sort_values(double *points, double *weights, size_t *n, tarry_error *error) {
    weighted *pairs = tarry_calloc(*n, sizeof *pairs);
    if (pairs == NULL)
        return tarry_fail_memory(error, "a delay");
    for (size_t i = 0; i < *n; i++)
        pairs[i] = (weighted){points[i], weights[i]};
    qsort(pairs, *n, sizeof *pairs, by_point);
    size_t kept = 0;
    for (size_t i = 0; i < *n; i++) {
        if (kept > 0 && points[kept - 1] == pairs[i].point) {
            weights[kept - 1] += pairs[i].weight;
            continue;
        }
        points[kept] = pairs[i].point;
        weights[kept++] = pairs[i].weight;
    }
    free(pairs);
    *n = kept;
    return 0;
}

static int fill_points(const tarry_law_template *template, const double *parameters,
                       tarry_arena *arena, tarry_law *law, double *weights, tarry_error *error) {
    const size_t n = template->n + (template->kind == TARRY_LAW_BINS);
    double *points = tarry_arena_calloc(arena, n, sizeof *points);
    if (points == NULL)
        return tarry_fail_memory(error, "a delay");
    for (size_t i = 0; i < n; i++) {
        points[i] = value(&template->points[i], parameters);
        if (!isfinite(points[i]))
            return tarry_fail_number(error, template->points[i].place,
                                     "a time in a table must be finite; this one is ", points[i],
                                     "");
    }
    law->points = points;
    return template->kind == TARRY_LAW_VALUES ? sort_values(points, weights, &law->n, error) : 0;
}

static int fill_parts(const tarry_law_template *template, const double *parameters,
                      tarry_arena *arena, tarry_law *law, tarry_error *error) {
    tarry_law *parts = tarry_arena_calloc(arena, template->n, sizeof *parts);
    if (parts == NULL)
        return tarry_fail_memory(error, "a delay");
    law->parts = parts;
    for (size_t i = 0; i < template->n; i++) {
        const int code = tarry_law_template_value(&template->parts[i], parameters, arena, &parts[i],
                                                  error);
        if (code != 0)
            return code;
    }
    return 0;
}

int tarry_law_template_value(const tarry_law_template *template, const double *parameters,
                             tarry_arena *arena, tarry_law *law, tarry_error *error) {
    *law = (tarry_law){.kind = template->kind, .n = template->n};
    law->a = value(template->a, parameters);
    law->b = value(template->b, parameters);
    int code = 0;
    double *weights = NULL;
    if (template->weights != NULL) {
        weights = tarry_arena_calloc(arena, template->n, sizeof *weights);
        if (weights == NULL)
            return tarry_fail_memory(error, "a delay");
        law->weights = weights;
        code = weights_of(template, parameters, weights, error);
    }
    if (code == 0 && template->points != NULL)
        code = fill_points(template, parameters, arena, law, weights, error);
    if (code == 0 && template->parts != NULL)
        code = fill_parts(template, parameters, arena, law, error);
    if (code != 0)
        return code;
    tarry_error fault = {0};
    code = tarry_law_check(law, &fault);
    return code == 0 ? 0 : tarry_fail_at(error, fault.code, template->place, "%s", fault.message);
}
