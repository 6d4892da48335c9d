/* SPDX-License-Identifier: GPL-3.0-or-later */

/* What the output names, and which of these names are recorded frame by frame. */
#include "model/read_run.h"

#include "base/error.h"
#include "base/notes.h"
#include "model/expect.h"
#include "model/like_genes.h"

#include <stdlib.h>
#include <string.h>

enum { MOST_BY_DEFAULT = 200 };

/* ---- names in the output -----------------------------------------------------------------------
 */

static bool correlates(tarry_species_role role) {
    return role == TARRY_SPECIES_STAGE || role == TARRY_SPECIES_PRODUCT;
}

static int add_channels(tarry_builder *builder, tarry_error *error) {
    bool full = false;
    for (size_t i = 0; i < builder->species.n && !full; i++) {
        const tarry_species *species = &builder->species.items[i];
        const tarry_channel channel = {
            .name = species->name, .species = (int32_t)i, .signal = TARRY_NONE};
        if (species->role != TARRY_SPECIES_ALLELE)
            full = TARRY_APPEND(&builder->channels, channel) != 0;
    }
    for (size_t i = 0; i < builder->signals.n && !full; i++) {
        const tarry_channel channel = {
            .name = builder->signals.items[i].name, .species = TARRY_NONE, .signal = (int32_t)i};
        full = TARRY_APPEND(&builder->channels, channel) != 0;
    }
    return full ? tarry_fail_memory(error, "the names in the output") : 0;
}

static void record(const tarry_builder *builder, tarry_channel *channel) {
    channel->recorded = true;
    channel->correlates = channel->signal != TARRY_NONE ||
                          correlates(builder->species.items[channel->species].role);
}

/* ---- `record:` ---------------------------------------------------------------------------------
 */

static int fail_name(const tarry_builder *builder, const tarry_node *node, tarry_error *error) {
    const tarry_like_genes *like = tarry_like_find(builder, node->text, strlen(node->text));
    if (like != NULL)
        return tarry_like_fail(like, node->text, node->place, error);
    const unsigned kinds = 1u << TARRY_SYMBOL_SPECIES | 1u << TARRY_SYMBOL_SIGNAL |
                           1u << TARRY_SYMBOL_GENE;
    const char *nearest = tarry_builder_nearest(builder, kinds, node->text);
    if (nearest != NULL)
        return tarry_fail_at(error, TARRY_INPUT, node->place,
                             "'%s' is no species, signal or gene; did you mean '%s'?", node->text,
                             nearest);
    return tarry_fail_at(error, TARRY_INPUT, node->place,
                         "'%s' is no species, signal or gene, and only those can be recorded",
                         node->text);
}

/* A whole pass over the channels for each gene named would make a square of ten thousand genes, so
 * what is meant is marked first and the channels are walked once. */
typedef struct wanted {
    bool *species, *signals, *genes;
} wanted;

static void want_like(const tarry_like_genes *like, wanted *set) {
    for (uint32_t i = 0; i < like->n; i++)
        set->genes[like->first + i] = true;
}

static int want(const tarry_builder *builder, const tarry_node *node, wanted *set,
                tarry_error *error) {
    const int code = tarry_expect_scalar(node, "a name under 'record'", error);
    if (code != 0)
        return code;
    const int32_t species = tarry_builder_find(builder, TARRY_SYMBOL_SPECIES, node->text);
    const int32_t signal = tarry_builder_find(builder, TARRY_SYMBOL_SIGNAL, node->text);
    const int32_t gene = tarry_builder_find(builder, TARRY_SYMBOL_GENE, node->text);
    const int32_t like = tarry_builder_find(builder, TARRY_SYMBOL_LIKE_GENES, node->text);
    if (species != TARRY_NONE)
        set->species[species] = true;
    else if (signal != TARRY_NONE)
        set->signals[signal] = true;
    else if (gene != TARRY_NONE)
        set->genes[gene] = true;
    else if (like != TARRY_NONE)
        want_like(&builder->like_genes.items[like], set);
    else
        return fail_name(builder, node, error);
    return 0;
}

static bool is_wanted(const tarry_builder *builder, const wanted *set,
                      const tarry_channel *channel) {
    if (channel->signal != TARRY_NONE)
        return set->signals[channel->signal];
    const int32_t gene = builder->species.items[channel->species].gene;
    return set->species[channel->species] || (gene != TARRY_NONE && set->genes[gene]);
}

static int record_list(tarry_builder *builder, const tarry_node *list, tarry_error *error) {
    wanted set = {
        .species = tarry_calloc(builder->species.n, sizeof *set.species),
        .signals = tarry_calloc(builder->signals.n, sizeof *set.signals),
        .genes = tarry_calloc(builder->genes.n, sizeof *set.genes),
    };
    int code = 0;
    if (set.species == NULL || set.signals == NULL || set.genes == NULL)
        code = tarry_fail_memory(error, "the names in the output");
    for (size_t i = 0; code == 0 && i < list->n; i++)
        code = want(builder, list->entries[i].node, &set, error);
    for (size_t i = 0; code == 0 && i < builder->channels.n; i++)
        if (is_wanted(builder, &set, &builder->channels.items[i]))
            record(builder, &builder->channels.items[i]);
    free(set.species);
    free(set.signals);
    free(set.genes);
    return code;
}

/* ---- all ---------------------------------------------------------------------------------------
 */

static int record_default(tarry_builder *builder, const tarry_node *run, tarry_error *error) {
    if (builder->channels.n > MOST_BY_DEFAULT)
        return tarry_notes_add(
            &builder->model->notes, run->place, error,
            "There are %zu names, and more than %d are not recorded unless "
            "asked for: frames, distributions, autocorrelations and dwell curves "
            "are left out, bursts and moments at the snapshots are there. Name "
            "what you want under 'record'.",
            builder->channels.n, (int)MOST_BY_DEFAULT);
    for (size_t i = 0; i < builder->channels.n; i++)
        record(builder, &builder->channels.items[i]);
    return 0;
}

/* The first frame in which a signal is detected is among its frames. */
static int check_detected(const tarry_builder *builder, tarry_error *error) {
    for (size_t i = 0; i < builder->channels.n; i++) {
        const tarry_channel *channel = &builder->channels.items[i];
        const tarry_signal *signal = channel->signal == TARRY_NONE
                                         ? NULL
                                         : &builder->signals.items[channel->signal];
        if (signal != NULL && signal->from_first && !channel->recorded)
            return tarry_fail_at(error, TARRY_INPUT, signal->place,
                                 "'%s' is told from the first frame on in which it is detected "
                                 "(from_first), so it must be recorded: name it under 'record'",
                                 signal->name);
    }
    return 0;
}

int tarry_read_record(tarry_builder *builder, const tarry_node *run, tarry_error *error) {
    const tarry_node *list = tarry_node_get(run, "record");
    int code = add_channels(builder, error);
    if (code == 0 && list == NULL)
        code = record_default(builder, run, error);
    if (code == 0 && list != NULL)
        code = tarry_expect_list(list, "'record'", error);
    if (code == 0 && list != NULL)
        code = record_list(builder, list, error);
    return code != 0 ? code : check_detected(builder, error);
}
