/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "model/variation.h"

#include "base/error.h"
#include "base/memory.h"
#include "base/number.h"
#include "base/text.h"
#include "model/steady.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

void tarry_cell_network_release(tarry_cell_network *cell) {
    tarry_arena_release(&cell->arena);
    free(cell->factors);
    *cell = (tarry_cell_network){0};
}

int tarry_cell_network_init(tarry_cell_network *cell, const tarry_network *common,
                            tarry_error *error) {
    *cell = (tarry_cell_network){.network = *common, .common = common};
    cell->factors = tarry_calloc(common->variation->n, sizeof *cell->factors);
    return cell->factors != NULL ? 0 : tarry_fail_memory(error, "the parameters of a cell");
}

/* All parameters in one segment: what a step has set stays what it set, times the factor. */
static void fill_parameters(const tarry_cell_network *cell, const tarry_segment *common,
                            double *factor_of, double *out) {
    const tarry_variation *variation = cell->common->variation;
    const uint32_t n = cell->common->n_parameters;
    for (uint32_t i = 0; i < n; i++)
        factor_of[i] = 1;
    for (uint32_t i = 0; i < variation->n; i++)
        factor_of[variation->varied[i].parameter] = cell->factors[i];
    for (uint32_t i = 0; i < n; i++) {
        const uint32_t at = variation->order[i];
        const bool is_set = common->is_set != NULL && common->is_set[at];
        const double centre = is_set
                                  ? common->parameters[at]
                                  : tarry_expression_value(&variation->parameters[at], out, NULL);
        out[at] = centre * factor_of[at];
    }
}

static int fill_segments(tarry_cell_network *cell, tarry_error *error) {
    const tarry_network *common = cell->common;
    const uint32_t n = common->n_parameters;
    tarry_segment *segments = tarry_arena_calloc(&cell->arena, common->n_segments,
                                                 sizeof *segments);
    double *factor_of = tarry_arena_calloc(&cell->arena, n, sizeof *factor_of);
    if (segments == NULL || factor_of == NULL)
        return tarry_fail_memory(error, "the parameters of a cell");
    int code = 0;
    for (uint32_t s = 0; code == 0 && s < common->n_segments; s++) {
        double *parameters = tarry_arena_calloc(&cell->arena, n, sizeof *parameters);
        if (parameters == NULL)
            return tarry_fail_memory(error, "the parameters of a cell");
        segments[s] = common->segments[s];
        fill_parameters(cell, &common->segments[s], factor_of, parameters);
        segments[s].parameters = parameters;
        code = tarry_segment_fill(&common->variation->sources, &cell->arena, &segments[s], error);
    }
    cell->network.segments = segments;
    return code;
}

/* Starting states: those of a steady start follow from the cell's own rates. */
static int fill_starts(tarry_cell_network *cell, tarry_error *error) {
    const tarry_network *common = cell->common;
    tarry_promoter *promoters = tarry_arena_calloc(&cell->arena, common->n_promoters,
                                                   sizeof *promoters);
    if (promoters == NULL)
        return tarry_fail_memory(error, "the parameters of a cell");
    if (common->n_promoters > 0)
        memcpy(promoters, common->promoters, common->n_promoters * sizeof *promoters);
    const tarry_steady_source source = {.genes = common->genes,
                                        .n_genes = common->n_genes,
                                        .promoters = promoters,
                                        .states = common->states,
                                        .lags = common->lags,
                                        .moves = common->variation->moves,
                                        .n_moves = common->variation->n_moves,
                                        .segments = cell->network.segments,
                                        .n_segments = common->n_segments,
                                        .arena = &cell->arena};
    cell->network.promoters = promoters;
    return tarry_steady_starts(&source, error);
}

/* "cell 17 (k_init = 3.2, lag = 4)" */
static int add_cell(const tarry_cell_network *cell, int64_t number, tarry_error *error) {
    const tarry_variation *variation = cell->common->variation;
    const double *parameters = cell->network.segments[0].parameters;
    tarry_text list = {0};
    for (uint32_t i = 0; i < variation->n; i++) {
        char text[TARRY_NUMBER_SIZE];
        const uint32_t at = variation->varied[i].parameter;
        tarry_number_write_rounded(parameters[at], 6, text);
        tarry_text_printf(&list, "%s%s = %s", i > 0 ? ", " : "", cell->common->parameter_names[at],
                          text);
    }
    const int code = list.failed ? tarry_fail_memory(error, "a message")
                                 : tarry_error_context(error, "cell %lld (%s)", (long long)number,
                                                       list.data);
    tarry_text_release(&list);
    return code;
}

int tarry_cell_network_set(tarry_cell_network *cell, int64_t number, tarry_error *error) {
    tarry_error fault = {0};
    tarry_arena_release(&cell->arena);
    int code = fill_segments(cell, &fault);
    if (code == 0)
        code = fill_starts(cell, &fault);
    if (code == 0)
        return 0;
    if (code == TARRY_INPUT) { /* the model is sound: it is this cell that cannot be */
        fault.code = TARRY_RUN;
        code = add_cell(cell, number, &fault);
    }
    if (error != NULL)
        *error = fault;
    return code;
}
