/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "model/segment_values.h"

#include "base/error.h"
#include "base/memory.h"
#include "base/number.h"
#include "model/law_template.h"

#include <math.h>

static int source_value(const tarry_source *source, const double *parameters, const char *kind,
                        double *out, tarry_error *error) {
    const double value = tarry_expression_value(&source->expression, parameters, NULL);
    const bool fits = source->half_life ? value > 0 : value >= source->least;
    *out = source->half_life ? log(2) / value : value;
    if (fits && isfinite(value) && isfinite(*out))
        return 0;
    char text[TARRY_NUMBER_SIZE], least[TARRY_NUMBER_SIZE];
    tarry_number_write(value, text);
    tarry_number_write(source->least, least);
    if (source->half_life)
        return tarry_fail_at(error, TARRY_INPUT, source->expression.place,
                             "the half-life behind '%s' is %s; it must be finite and above 0",
                             source->what, text);
    return tarry_fail_at(error, TARRY_INPUT, source->expression.place,
                         "the %s of '%s' is %s; it must be finite and not below %s", kind,
                         source->what, text, least);
}

static int source_values(const tarry_source *sources, size_t n, const double *parameters,
                         const char *kind, tarry_arena *arena, const double **out,
                         tarry_error *error) {
    double *values = tarry_arena_calloc(arena, n, sizeof *values);
    if (values == NULL)
        return tarry_fail_memory(error, "the rates");
    int code = 0;
    for (size_t i = 0; code == 0 && i < n; i++)
        code = source_value(&sources[i], parameters, kind, &values[i], error);
    *out = values;
    return code;
}

static int fold_formulas(const tarry_value_sources *sources, tarry_arena *arena,
                         tarry_segment *segment, tarry_error *error) {
    tarry_expression *formulas = tarry_arena_calloc(arena, sources->n_formulas, sizeof *formulas);
    if (formulas == NULL)
        return tarry_fail_memory(error, "the rates");
    int code = 0;
    for (size_t i = 0; code == 0 && i < sources->n_formulas; i++)
        code = tarry_expression_fold(&sources->formulas[i], segment->parameters, arena,
                                     &formulas[i], error);
    segment->formulas = formulas;
    return code;
}

static int make_laws(const tarry_value_sources *sources, tarry_arena *arena, tarry_segment *segment,
                     tarry_error *error) {
    tarry_law *laws = tarry_arena_calloc(arena, sources->n_laws, sizeof *laws);
    if (laws == NULL)
        return tarry_fail_memory(error, "the delays");
    int code = 0;
    for (size_t i = 0; code == 0 && i < sources->n_laws; i++)
        code = tarry_law_template_value(&sources->laws[i], segment->parameters, arena, &laws[i],
                                        error);
    segment->laws = laws;
    return code;
}

int tarry_segment_fill(const tarry_value_sources *sources, tarry_arena *arena,
                       tarry_segment *segment, tarry_error *error) {
    int code = source_values(sources->rates, sources->n_rates, segment->parameters, "rate", arena,
                             &segment->rates, error);
    if (code == 0)
        code = source_values(sources->means, sources->n_means, segment->parameters, "mean number",
                             arena, &segment->means, error);
    if (code == 0)
        code = fold_formulas(sources, arena, segment, error);
    if (code == 0)
        code = make_laws(sources, arena, segment, error);
    return code;
}
