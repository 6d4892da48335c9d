/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "study/predict.h"

#include "base/error.h"
#include "base/table.h"
#include "exact/first.h"

#include <math.h>
#include <string.h>

/* What is waited for: that a molecule of the chain comes to a stage; stage 0 of a transcript is its
 * initiation. `why`: NULL, or why that cannot be worked out. */
typedef struct awaited {
    bool is_protein;
    size_t stage;
    const char *why;
} awaited;

static bool find_stage(const tarry_exact_chain *chain, uint32_t species, awaited *a) {
    for (size_t i = 0; i < chain->n; i++)
        if (chain->stages[i].species == species) {
            a->stage = i;
            a->why = i > 0 ? chain->stages[i - 1].why : NULL;
            return true;
        }
    return false;
}

static awaited read_awaited(const tarry_exact_gene *gene, const tarry_first *first) {
    awaited a = {.why = gene->why};
    if (a.why != NULL || first->species == TARRY_NONE ||
        find_stage(&gene->transcript, (uint32_t)first->species, &a))
        return a;
    a.is_protein = find_stage(&gene->protein, (uint32_t)first->species, &a);
    if (!a.is_protein)
        a.why = "it is no molecule that comes from the gene's initiations";
    else if (a.why == NULL)
        a.why = gene->protein.why;
    return a;
}

/* The share over all cells. */
static int find_share(tarry_prediction *p, const tarry_first *first, const awaited *a, double step,
                      const double *times, size_t n, double *share, tarry_error *error) {
    double own[TARRY_PREDICT_POINTS] = {0};
    int code = 0;
    for (size_t k = 0; code == 0 && k < p->n_cells; k++) {
        code = (a->is_protein ? tarry_exact_no_protein_yet : tarry_exact_none_yet)(
            &p->cells[k].genes[first->gene], a->stage, step, times, n, p->horizon, own, error);
        for (size_t i = 0; code == 0 && i < n; i++)
            share[i] += p->cells[k].weight * own[i];
    }
    return code;
}

/* Proteins take long: every so many of the times is enough. */
enum { FEWER = 4 };

static int predict_curve(tarry_prediction *p, const tarry_first *first, const awaited *a,
                         const tarry_response *response, tarry_error *error) {
    double times[TARRY_PREDICT_POINTS], share[TARRY_PREDICT_POINTS] = {0};
    int n = TARRY_PREDICT_POINTS;
    tarry_predict_grid(response->to - response->from, times);
    if (a->is_protein) {
        n = (n - 1) / FEWER + 1;
        for (int i = 0; i < n; i++)
            times[i] = times[(size_t)i * FEWER];
    }
    int code = find_share(p, first, a, response->from, times, (size_t)n, share, error);
    for (int i = 0; code == 0 && i < n; i++)
        code = tarry_table_add(p->results->tables[TARRY_TABLE_first], error, first->name,
                               response->from, times[i], share[i], NAN, NAN);
    return code;
}

int tarry_predict_first(tarry_prediction *p, tarry_error *error) {
    const tarry_network *network = p->network;
    int code = 0;
    for (uint32_t i = 0; code == 0 && i < network->n_firsts; i++) {
        const tarry_first *first = &network->firsts[i];
        if (p->genes[first->gene].why != NULL)
            continue; /* told with the gene */
        awaited a = read_awaited(&p->genes[first->gene], first);
        if (a.why == NULL && a.is_protein && p->is_quick)
            a.why = "it takes long; `tarry predict` works it out";
        if (a.why != NULL)
            code = tarry_predict_leave_out(p, first->name, "its first response", a.why, error);
        for (uint32_t r = 0; code == 0 && a.why == NULL && r < network->n_responses; r++)
            code = predict_curve(p, first, &a, &network->responses[r], error);
    }
    return code;
}
