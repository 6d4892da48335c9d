/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "study/predict.h"

#include "base/error.h"
#include "base/memory.h"

#include "model/model.h"
#include "tally/dwells.h"

#include <string.h>

int tarry_predict_leave_out(tarry_prediction *p, const char *name, const char *what,
                            const char *why, tarry_error *error) {
    return tarry_notes_add(&p->results->notes, (tarry_place){0}, error,
                           "%s%s%s: left out, since %s", name, what[0] != '\0' ? ", " : "", what,
                           why);
}

/* Is there a weight or a ramp of the signal on a species of no gene? */
static const char *foreign(const tarry_network *network, const tarry_channel *channel) {
    if (channel->species != TARRY_NONE)
        return network->species[channel->species].gene == TARRY_NONE ? "it is of no gene" : NULL;
    const tarry_signal *signal = &network->signals[channel->signal];
    for (uint32_t i = signal->weights.from; i < signal->weights.to; i++)
        if (network->species[network->weights[i].species].gene == TARRY_NONE)
            return "it looks at a species of no gene";
    return NULL;
}

int tarry_predict_views(tarry_prediction *p, const tarry_channel *channel, tarry_exact_view **views,
                        const char **why, tarry_error *error) {
    const uint32_t n = p->network->n_genes;
    int code = 0;
    *why = foreign(p->network, channel);
    *views = tarry_arena_calloc(&p->arena, n, sizeof **views);
    if (*views == NULL)
        return tarry_fail_memory(error, "a prediction");
    for (uint32_t g = 0; code == 0 && g < n; g++) {
        if (p->network->genes[g].promoters.from == p->network->genes[g].promoters.to)
            continue;
        tarry_exact_view *view = &(*views)[g];
        code = tarry_exact_view_read(p->network, &p->genes[g], channel, &p->arena, view, error);
        if (code == 0 && view->looks && *why == NULL)
            *why = view->why;
    }
    return code;
}

/* Genes that are left out as a whole are told once. */
static int note_genes(tarry_prediction *p, tarry_error *error) {
    int code = 0;
    for (uint32_t g = 0; code == 0 && g < p->network->n_genes; g++)
        if (p->genes[g].why != NULL)
            code = tarry_predict_leave_out(p, p->network->genes[g].name, "", p->genes[g].why,
                                           error);
    return code;
}

int tarry_predict_network(const tarry_network *network, bool is_quick, tarry_results **results,
                          tarry_error *error) {
    static int (*const parts[])(tarry_prediction *, tarry_error *) = {
        tarry_predict_read_genes, note_genes,          tarry_predict_bursts,
        tarry_predict_counts,     tarry_predict_films, tarry_predict_first};
    tarry_prediction p = {.network = network,
                          .horizon = network->run.settle + network->run.until,
                          .is_quick = is_quick};
    *results = NULL;
    int code = tarry_results_new(&p.results, error);
    if (code == 0) {
        p.results->is_predicted = true;
        code = tarry_flow_index_init(&p.index, network, error);
    }
    for (size_t i = 0; code == 0 && i < sizeof parts / sizeof *parts; i++)
        code = parts[i](&p, error);
    tarry_predict_release(&p);
    if (code != 0)
        tarry_results_free(p.results);
    else
        *results = p.results;
    return code;
}

int tarry_predict(const tarry_model *model, tarry_results **results, tarry_error *error) {
    return tarry_predict_network(&model->network, false, results, error);
}

void tarry_predict_grid(double longest, double times[TARRY_PREDICT_POINTS]) {
    enum { FIRST = TARRY_DWELL_BINS - (TARRY_PREDICT_POINTS - 1) * TARRY_PREDICT_BINS };
    times[0] = 0;
    for (uint32_t i = 1; i < TARRY_PREDICT_POINTS; i++)
        times[i] = tarry_dwell_bin_end(FIRST + i * TARRY_PREDICT_BINS - 1, longest);
}
