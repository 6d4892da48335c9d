/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "model/gene_layout.h"

/* What a gene is made of. Read twice: once for the names of all genes, once for what they do. */

#include "base/error.h"
#include "base/memory.h"
#include "base/text.h"
#include "model/expect.h"

#include <stdlib.h>
#include <string.h>

enum { MOST_COPIES = 1000, MOST_STATES = 250 };

static const char *const GENE_KEYS[] = {"copies",  "start",     "promoter",  "transcript",
                                        "protein", "bursts_in", "clearance", "many"};
static const char *const TRANSCRIPT_KEYS[] = {"stages",   "half_life",     "decay",
                                              "lifetime", "no_overtaking", "headway"};
static const char *const PROTEIN_KEYS[] = {"translation", "stages",   "half_life",
                                           "decay",       "lifetime", "from"};

/* The keys of a transcript or protein, and its stages. */
static int read_product(const tarry_node *gene, const char *key, const char *const *keys,
                        size_t n_keys, const char *const *later, size_t n_later,
                        const tarry_node **product, const tarry_node **stages, uint32_t *n_stages,
                        tarry_error *error) {
    *product = tarry_node_get(gene, key);
    if (*product == NULL)
        return 0;
    int code = tarry_expect_keys(*product, key, keys, n_keys, error);
    if (code == 0)
        code = tarry_expect_not_yet(*product, key, later, n_later, error);
    if (code != 0)
        return code;
    *stages = tarry_node_get(*product, "stages");
    if (*stages == NULL)
        return 0;
    code = tarry_expect_map(*stages, "'stages'", error);
    *n_stages = (uint32_t)(*stages)->n;
    return code;
}

static int read_promoter(const tarry_entry *gene, tarry_gene_layout *layout, tarry_error *error) {
    int code = tarry_expect_value(gene->node, gene->key, "promoter", &layout->promoter, error);
    if (code == 0)
        code = tarry_expect_map(layout->promoter, "'promoter'", error);
    if (code != 0)
        return code;
    layout->n_states = (uint32_t)layout->promoter->n;
    if (layout->n_states == 0)
        return tarry_fail_at(error, TARRY_INPUT, layout->promoter->place,
                             "a promoter needs a state at least, as {on: {initiates: 2 /min}}");
    if (layout->n_states > MOST_STATES)
        return tarry_fail_at(error, TARRY_INPUT, layout->promoter->place,
                             "a promoter has at most %d states; this one has %u", MOST_STATES,
                             layout->n_states);
    return 0;
}

int tarry_gene_layout_read(const tarry_entry *gene, tarry_gene_layout *layout, tarry_error *error) {
    *layout = (tarry_gene_layout){.name = gene->key, .node = gene->node, .n_copies = 1};
    int code = tarry_expect_keys(gene->node, gene->key, GENE_KEYS, 8, error);
    if (code != 0)
        return code;
    layout->clearance = tarry_node_get(gene->node, "clearance");
    const tarry_node *copies = tarry_node_get(gene->node, "copies");
    double n_copies = 1;
    if (copies != NULL)
        code = tarry_expect_count(copies, "'copies'", 1, MOST_COPIES, &n_copies, error);
    layout->n_copies = (uint32_t)n_copies;
    if (code == 0)
        code = read_promoter(gene, layout, error);
    if (code == 0)
        code = read_product(gene->node, "transcript", TRANSCRIPT_KEYS, 6, NULL, 0,
                            &layout->transcript, &layout->transcript_stages,
                            &layout->n_transcript_stages, error);
    if (code == 0)
        code = read_product(gene->node, "protein", PROTEIN_KEYS, 6, NULL, 0, &layout->protein,
                            &layout->protein_stages, &layout->n_protein_stages, error);
    if (code == 0 && layout->protein != NULL && layout->transcript == NULL)
        return tarry_fail_at(error, TARRY_INPUT, tarry_key_place(gene->node, "protein"),
                             "the gene '%s' has a protein but no transcript to translate; give it "
                             "'transcript'",
                             gene->key);
    return code;
}

/* ---- species ------------------------------------------------------------------------------------
 */

uint32_t tarry_layout_sum(const tarry_gene_layout *layout, uint32_t state) {
    return layout->first + state;
}

uint32_t tarry_layout_state(const tarry_gene_layout *layout, uint32_t allele, uint32_t state) {
    if (layout->n_copies == 1)
        return layout->first + state;
    return layout->first + (1 + allele) * layout->n_states + state;
}

uint32_t tarry_layout_ready(const tarry_gene_layout *layout, uint32_t allele) {
    const uint32_t n_rows = layout->n_copies == 1 ? 1 : 1 + layout->n_copies;
    return layout->first + n_rows * layout->n_states + allele;
}

uint32_t tarry_layout_transcript(const tarry_gene_layout *layout) {
    return tarry_layout_ready(layout, layout->clearance == NULL ? 0 : layout->n_copies);
}

uint32_t tarry_layout_protein(const tarry_gene_layout *layout) {
    return tarry_layout_transcript(layout) + layout->n_transcript_stages + 1;
}

/* ---- states -------------------------------------------------------------------------------------
 */

int32_t tarry_layout_find_state(const tarry_gene_layout *layout, const char *name) {
    for (uint32_t i = 0; i < layout->n_states; i++)
        if (strcmp(layout->promoter->entries[i].key, name) == 0)
            return (int32_t)i;
    return TARRY_NONE;
}

int tarry_layout_need_state(const tarry_gene_layout *layout, const char *name, tarry_place place,
                            uint32_t *state, tarry_error *error) {
    const int32_t found = tarry_layout_find_state(layout, name);
    *state = (uint32_t)found;
    if (found != TARRY_NONE)
        return 0;
    const char *nearest = NULL;
    const char **names = tarry_calloc(layout->n_states, sizeof *names);
    if (names == NULL)
        return tarry_fail_memory(error, "a message");
    for (uint32_t i = 0; i < layout->n_states; i++)
        names[i] = layout->promoter->entries[i].key;
    nearest = tarry_nearest_word(name, names, layout->n_states);
    free(names);
    return tarry_fail_at(error, TARRY_INPUT, place, "the gene '%s' has no state '%s'%s%s%s",
                         layout->name, name, nearest == NULL ? "" : "; did you mean '",
                         nearest == NULL ? "" : nearest, nearest == NULL ? "" : "'?");
}
