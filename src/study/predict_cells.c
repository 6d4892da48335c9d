/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Where parameters differ from cell to cell, a few cells with weights stand for all: Gauss
 * quadrature for each law, every value of one with every value of the other. */

#include "study/predict.h"

#include "base/error.h"
#include "base/memory.h"
#include "exact/quadrature.h"

#include <string.h>

/* Means and variances are known to six digits or more with these; where lags are fixed
 * autocorrelations bend with the parameters, and are known to three or four (docs/exact.md). */
enum {
    POINTS_OF_ONE = 32,
    POINTS_OF_TWO = 10,
    QUICK_OF_ONE = 10,
    QUICK_OF_TWO = 6,
    MOST_VARIED = 2
};

/* Is the law's density infinite at 0? Its curves have many pieces then. */
static bool is_steep(const tarry_law *law) {
    if (law == NULL)
        return false;
    if (law->kind == TARRY_LAW_GAMMA)
        return law->b > law->a;
    if (law->kind == TARRY_LAW_WEIBULL)
        return law->b < 1;
    for (size_t i = 0; (law->kind == TARRY_LAW_MIX || law->kind == TARRY_LAW_TOTAL) && i < law->n;
         i++)
        if (is_steep(&law->parts[i]))
            return true;
    return false;
}

/* Do proteins take long? Where steep laws are on the way, or the time in which a transcript is
 * translated is not exponential. */
static bool is_slow(const tarry_exact_gene *gene) {
    bool slow = false;
    for (size_t i = 0; i < gene->transcript.n; i++) {
        const tarry_exact_stage *s = &gene->transcript.stages[i];
        slow = slow || is_steep(s->law) ||
               (s->translation > 0 && s->law != NULL && s->law->kind != TARRY_LAW_EXPONENTIAL);
    }
    for (size_t i = 0; i < gene->protein.n; i++)
        slow = slow || is_steep(gene->protein.stages[i].law);
    return slow;
}

static void leave_proteins(tarry_exact_gene *gene) {
    static const char why[] = "its proteins take long; `tarry predict` works them out";
    if (gene->why != NULL || !is_slow(gene))
        return;
    gene->protein.why = why;
    for (size_t i = 0; i < gene->protein.n; i++)
        if (gene->protein.stages[i].why == NULL)
            gene->protein.stages[i].why = why;
}

static int read_genes(tarry_prediction *p, const tarry_network *network,
                      const tarry_flow_index *index, tarry_exact_gene **genes, tarry_error *error) {
    int code = 0;
    *genes = tarry_arena_calloc(&p->arena, network->n_genes, sizeof **genes);
    if (*genes == NULL)
        return tarry_fail_memory(error, "a prediction");
    for (uint32_t g = 0; code == 0 && g < network->n_genes; g++) {
        const tarry_gene *gene = &network->genes[g];
        tarry_exact_gene *out = &(*genes)[g];
        *out = (tarry_exact_gene){.gene = g};
        if (gene->promoters.from == gene->promoters.to)
            out->why = "plain reactions have no exact law";
        else if (network->variation != NULL && network->variation->n > MOST_VARIED)
            out->why = "more than two parameters differ from cell to cell";
        else
            code = tarry_exact_gene_read(index, network->segments, g, &p->arena, out, error);
        if (code == 0 && p->is_quick)
            leave_proteins(out);
        if (code != 0)
            tarry_error_context(error, "%s", gene->name);
    }
    return code;
}

static int read_one_for_all(tarry_prediction *p, tarry_error *error) {
    p->cells = tarry_arena_calloc(&p->arena, 1, sizeof *p->cells);
    if (p->cells == NULL)
        return tarry_fail_memory(error, "a prediction");
    p->n_cells = 1;
    p->cells[0].weight = 1;
    return read_genes(p, p->network, &p->index, &p->cells[0].genes, error);
}

/* A cell with these factors. */
static int read_cell(tarry_prediction *p, tarry_predict_cell *cell, const double *factors,
                     tarry_error *error) {
    int code = tarry_cell_network_init(&cell->own, p->network, error);
    p->n_cells++;
    if (code != 0)
        return code;
    memcpy(cell->own.factors, factors, p->network->variation->n * sizeof *factors);
    code = tarry_cell_network_set(&cell->own, (int64_t)p->n_cells, error);
    if (code == 0)
        code = tarry_flow_index_init(&cell->index, &cell->own.network, error);
    return code == 0 ? read_genes(p, &cell->own.network, &cell->index, &cell->genes, error) : code;
}

static size_t points_of(const tarry_prediction *p) {
    if (p->network->variation->n > 1)
        return p->is_quick ? QUICK_OF_TWO : POINTS_OF_TWO;
    return p->is_quick ? QUICK_OF_ONE : POINTS_OF_ONE;
}

static int read_cells(tarry_prediction *p, tarry_error *error) {
    const tarry_variation *variation = p->network->variation;
    tarry_quadrature q[MOST_VARIED] = {{.n = 1, .weight = {1}}, {.n = 1, .weight = {1}}};
    int code = 0;
    for (uint32_t i = 0; code == 0 && i < variation->n; i++)
        code = tarry_quadrature_find(&variation->varied[i].law, points_of(p), &q[i], error);
    p->cells = tarry_arena_calloc(&p->arena, q[0].n * q[1].n, sizeof *p->cells);
    if (code == 0 && p->cells == NULL)
        code = tarry_fail_memory(error, "a prediction");
    for (size_t i = 0; code == 0 && i < q[0].n; i++)
        for (size_t k = 0; code == 0 && k < q[1].n; k++) {
            const double factors[] = {q[0].at[i], q[1].at[k]};
            tarry_predict_cell *cell = &p->cells[p->n_cells];
            cell->weight = q[0].weight[i] * q[1].weight[k];
            code = read_cell(p, cell, factors, error);
        }
    return code;
}

/* What cannot be worked out of one cell cannot be of all. */
static void gather_reasons(tarry_prediction *p) {
    for (size_t k = 1; k < p->n_cells; k++)
        for (uint32_t g = 0; g < p->network->n_genes; g++)
            if (p->genes[g].why == NULL)
                p->genes[g].why = p->cells[k].genes[g].why;
}

int tarry_predict_read_genes(tarry_prediction *p, tarry_error *error) {
    const tarry_variation *variation = p->network->variation;
    const bool differ = variation != NULL && variation->n <= MOST_VARIED;
    const int code = differ ? read_cells(p, error) : read_one_for_all(p, error);
    if (code != 0)
        return code;
    p->genes = p->cells[0].genes;
    gather_reasons(p);
    return 0;
}

void tarry_predict_release(tarry_prediction *p) {
    for (size_t k = 0; k < p->n_cells; k++) {
        tarry_flow_index_release(&p->cells[k].index);
        tarry_cell_network_release(&p->cells[k].own);
    }
    tarry_flow_index_release(&p->index);
    tarry_arena_release(&p->arena);
}
