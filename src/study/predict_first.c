/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "study/predict.h"

#include "base/error.h"
#include "base/table.h"
#include "exact/first.h"

#include <math.h>
#include <string.h>

/* The stage that is waited for: 0 an initiation, n what comes after the n-th; or TARRY_NONE. */
static int64_t stage_of(const tarry_exact_gene *gene, const tarry_first *first, const char **why) {
    const tarry_exact_chain *chain = &gene->transcript;
    if (first->species == TARRY_NONE)
        return 0;
    for (size_t i = 0; i < chain->n; i++)
        if (chain->stages[i].species == (uint32_t)first->species) {
            *why = i > 0 ? chain->stages[i - 1].why : NULL;
            return (int64_t)i;
        }
    return TARRY_NONE;
}

static int predict_curve(tarry_prediction *p, const tarry_first *first, int64_t stage,
                         const tarry_response *response, tarry_error *error) {
    double times[TARRY_PREDICT_POINTS], share[TARRY_PREDICT_POINTS];
    int code = 0;
    tarry_predict_grid(response->to - response->from, times);
    code = tarry_exact_none_yet(&p->genes[first->gene], (size_t)stage, response->from, times,
                                TARRY_PREDICT_POINTS, p->horizon, share, error);
    for (int i = 0; code == 0 && i < TARRY_PREDICT_POINTS; i++)
        code = tarry_table_add(p->results->tables[TARRY_TABLE_first], error, first->name,
                               response->from, times[i], share[i], NAN, NAN);
    return code;
}

int tarry_predict_first(tarry_prediction *p, tarry_error *error) {
    const tarry_network *network = p->network;
    int code = 0;
    for (uint32_t i = 0; code == 0 && i < network->n_firsts; i++) {
        const tarry_first *first = &network->firsts[i];
        const char *why = p->genes[first->gene].why;
        if (why != NULL)
            continue; /* told with the gene */
        const int64_t stage = stage_of(&p->genes[first->gene], first, &why);
        if (stage == TARRY_NONE)
            why = "proteins are not covered";
        if (why != NULL)
            code = tarry_predict_leave_out(p, first->name, "its first response", why, error);
        for (uint32_t r = 0; code == 0 && why == NULL && r < network->n_responses; r++)
            code = predict_curve(p, first, stage, &network->responses[r], error);
    }
    return code;
}
