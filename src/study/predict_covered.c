/* SPDX-License-Identifier: GPL-3.0-or-later */

/* What could be predicted, without predicting it. */

#include "study/predict.h"

#include "base/error.h"
#include "tally/channels.h"

static int tell_genes(tarry_prediction *p, tarry_predict_tell *tell, void *context) {
    int stop = 0;
    for (uint32_t g = 0; !stop && g < p->network->n_genes; g++)
        stop = tell(context, p->network->genes[g].name, p->genes[g].why);
    return stop;
}

/* Is the gene of this species left out as a whole, and told of? */
static bool is_told(const tarry_prediction *p, const tarry_channel *channel) {
    if (channel->species == TARRY_NONE)
        return false;
    const int32_t gene = p->network->species[channel->species].gene;
    return gene != TARRY_NONE && p->genes[gene].why != NULL;
}

/* Why a channel is left out. A species is seen in its own gene alone: to look at all genes for each
 * of their products would make a square of ten thousand. */
static int find_why(tarry_prediction *p, const tarry_channel *channel, const char **why,
                    tarry_error *error) {
    tarry_exact_view view, *views;
    if (channel->species == TARRY_NONE)
        return tarry_predict_views(p, channel, &views, why, error);
    const int32_t gene = p->network->species[channel->species].gene;
    const int code = tarry_exact_view_read(p->network, &p->genes[gene], channel, &p->arena, &view,
                                           error);
    *why = code == 0 ? view.why : NULL;
    return code;
}

/* Products and signals that are left out though the gene is not. */
static int tell_channels(tarry_prediction *p, tarry_predict_tell *tell, void *context,
                         tarry_error *error) {
    int code = 0;
    for (uint32_t i = 0; code == 0 && i < p->network->n_channels; i++) {
        const tarry_channel *channel = &p->network->channels[i];
        const char *why = NULL;
        const bool is_seen = channel->signal != TARRY_NONE ||
                             tarry_channel_is_product(p->network, channel);
        if (!is_seen || is_told(p, channel))
            continue;
        code = find_why(p, channel, &why, error);
        if (code == 0 && why != NULL)
            code = tell(context, channel->name, why);
    }
    return code;
}

int tarry_predict_covered(const tarry_network *network, tarry_predict_tell *tell, void *context,
                          tarry_error *error) {
    tarry_prediction p = {.network = network, .horizon = network->run.settle + network->run.until};
    int code = tarry_flow_index_init(&p.index, network, error);
    if (code == 0)
        code = tarry_predict_read_genes(&p, error);
    if (code == 0)
        code = tell_genes(&p, tell, context);
    if (code == 0)
        code = tell_channels(&p, tell, context, error);
    tarry_predict_release(&p);
    return code;
}
