/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "model/shown_genes.h"

#include "base/error.h"
#include "base/text.h"

#include <stdlib.h>
#include <string.h>

static bool is_recorded(const tarry_network *network, uint32_t gene) {
    const tarry_range promoters = network->genes[gene].promoters;
    if (promoters.from == promoters.to)
        return true; /* named bursts */
    for (uint32_t c = 0; c < network->n_channels; c++) {
        const tarry_channel *channel = &network->channels[c];
        if (channel->recorded && channel->species != TARRY_NONE &&
            network->species[channel->species].gene == (int32_t)gene)
            return true;
    }
    return false;
}

static int refuse_name(const tarry_network *network, const char *name, tarry_error *error) {
    const char **names = tarry_calloc(network->n_genes, sizeof *names);
    if (!names)
        return tarry_fail_memory(error, "the names of genes");
    for (uint32_t g = 0; g < network->n_genes; g++)
        names[g] = network->genes[g].name;
    const char *nearest = tarry_nearest_word(name, names, network->n_genes);
    free(names);
    if (network->n_genes == 0)
        return tarry_fail(error, TARRY_INPUT,
                          "there is no gene '%s': the model has neither genes nor named bursts",
                          name);
    if (nearest)
        return tarry_fail(error, TARRY_INPUT, "there is no gene '%s'; did you mean '%s'?", name,
                          nearest);
    return tarry_fail(error, TARRY_INPUT, "there is no gene '%s'; the first gene is '%s'", name,
                      network->genes[0].name);
}

static int show_named(tarry_shown *shown, const tarry_network *network, const char *const *names,
                      size_t n_names, tarry_error *error) {
    for (size_t i = 0; i < n_names; i++) {
        uint32_t g = 0;
        while (g < network->n_genes && strcmp(network->genes[g].name, names[i]))
            g++;
        if (g == network->n_genes)
            return refuse_name(network, names[i], error);
        shown->n_genes += !shown->genes[g];
        shown->genes[g] = true;
    }
    return 0;
}

static void show_first(tarry_shown *shown, const tarry_network *network) {
    for (uint32_t g = 0; g < network->n_genes; g++) {
        if (shown->n_genes < TARRY_SHOWN_MOST && is_recorded(network, g)) {
            shown->genes[g] = true;
            shown->n_genes++;
        } else if (shown->n_genes >= TARRY_SHOWN_MOST) {
            shown->n_genes_left++;
        }
    }
}

/* Does it tell of a species of a gene that is shown (or, where none are named, of no gene)? */
static bool tells_of(const tarry_shown *shown, int32_t gene, bool named) {
    return gene == TARRY_NONE ? !named : shown->genes[gene];
}

static bool sees_shown(const tarry_shown *shown, const tarry_network *network, uint32_t signal,
                       bool named) {
    const tarry_signal *s = &network->signals[signal];
    for (uint32_t i = s->weights.from; i < s->weights.to; i++)
        if (tells_of(shown, network->species[network->weights[i].species].gene, named))
            return true;
    for (uint32_t i = s->ramps.from; i < s->ramps.to; i++) {
        const tarry_ramp *ramp = &network->ramps[network->signal_ramps[i]];
        if (tells_of(shown, network->lags[ramp->lag].gene, named))
            return true;
    }
    return false;
}

static void show_channels(tarry_shown *shown, const tarry_network *network, bool named) {
    size_t n_plain = 0;
    for (uint32_t c = 0; c < network->n_channels; c++) {
        const tarry_channel *channel = &network->channels[c];
        if (!channel->recorded)
            continue;
        if (channel->signal != TARRY_NONE) {
            const bool few = named || shown->n_signals < TARRY_SHOWN_MOST;
            const bool seen = network->data ||
                              sees_shown(shown, network, (uint32_t)channel->signal, named);
            shown->channels[c] = seen && few;
            shown->n_signals += seen && few;
            shown->n_signals_left += !(seen && few);
            continue;
        }
        const int32_t gene = network->species[channel->species].gene;
        shown->channels[c] = tells_of(shown, gene, named) &&
                             (gene != TARRY_NONE || n_plain++ < TARRY_SHOWN_MOST);
    }
}

int tarry_shown_init(tarry_shown *shown, const tarry_network *network, const char *const *names,
                     size_t n_names, tarry_error *error) {
    *shown = (tarry_shown){0};
    shown->genes = tarry_calloc(network->n_genes, sizeof *shown->genes);
    shown->channels = tarry_calloc(network->n_channels, sizeof *shown->channels);
    int code = shown->genes && shown->channels
                   ? 0
                   : tarry_fail_memory(error, "the list of what is drawn");
    if (!code && n_names > 0)
        code = show_named(shown, network, names, n_names, error);
    else if (!code)
        show_first(shown, network);
    if (!code)
        show_channels(shown, network, n_names > 0);
    if (code)
        tarry_shown_release(shown);
    return code;
}

void tarry_shown_release(tarry_shown *shown) {
    free(shown->genes);
    free(shown->channels);
    *shown = (tarry_shown){0};
}
