/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Expressions: a fault has a column within the text; what compiles gives the same value as its
 * folded copy, and reads only what it says it reads. */

#include "fuzz.h"

#include "model/expression.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

enum { PARAMETERS = 3, SPECIES = 2 };

static tarry_name_kind find(void *context, const char *name, size_t n, uint32_t *index,
                            tarry_dimension *dimension) {
    static const char *const parameters[PARAMETERS] = {"k", "lag", "speed"};
    static const char *const species[SPECIES] = {"x", "vela.protein"};
    (void)context;
    for (uint32_t i = 0; i < PARAMETERS; i++)
        if (strlen(parameters[i]) == n && memcmp(parameters[i], name, n) == 0) {
            *index = i;
            *dimension = i == 0 ? TARRY_RATE : i == 1 ? TARRY_TIME : TARRY_ANY;
            return TARRY_NAME_PARAMETER;
        }
    for (uint32_t i = 0; i < SPECIES; i++)
        if (strlen(species[i]) == n && memcmp(species[i], name, n) == 0) {
            *index = i;
            return TARRY_NAME_SPECIES;
        }
    return TARRY_NAME_UNKNOWN;
}

static int same(double one, double other) {
    return one == other || (isnan(one) && isnan(other));
}

static void check(const tarry_expression *expression, tarry_arena *arena) {
    static const double parameters[PARAMETERS] = {0.25, 3, 1800}, counts[SPECIES] = {2, 0};
    tarry_expression folded;
    tarry_error error = {0};
    fuzz_must(expression->n_parameters <= PARAMETERS && expression->n_species <= SPECIES,
              "an expression reads what there is");
    const double value = tarry_expression_value(expression, parameters, counts);
    fuzz_must(tarry_expression_fold(expression, parameters, arena, &folded, &error) == 0,
              "an expression can be folded");
    fuzz_must(folded.n_parameters == 0, "a folded expression reads no parameters");
    fuzz_must(same(value, tarry_expression_value(&folded, NULL, counts)),
              "a folded expression has the same value");
}

int fuzz_expression(const uint8_t *data, size_t size) {
    static const char *const candidates[] = {"k", "lag", "speed", "x", "vela.protein"};
    static const tarry_units minutes = {60};
    const tarry_scope scope = {.find = find, .candidates = candidates, .n_candidates = 5};
    const tarry_place place = {"m.yaml", 7, 1};
    char *text = fuzz_text(data, size);
    tarry_arena arena = {0};
    tarry_expression expression;
    tarry_error error = {0};
    const tarry_dimension dues[] = {TARRY_ANY, TARRY_RATE, TARRY_TIME, TARRY_PURE};
    for (size_t i = 0; i < sizeof dues / sizeof *dues; i++) {
        error = (tarry_error){0};
        if (tarry_expression_compile(text, place, dues[i], minutes, &scope, &arena, &expression,
                                     &error) == 0) {
            check(&expression, &arena);
            continue;
        }
        fuzz_must(error.code == TARRY_INPUT && error.message[0] != '\0', "an error has words");
        fuzz_must(error.line == 7 && error.column >= 1 && (size_t)error.column <= strlen(text) + 1,
                  "a fault has a column in the text");
    }
    tarry_arena_release(&arena);
    free(text);
    return 0;
}
