/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "model/builder.h"

/* The first pass over genes: names of their species, promoters and tracks, so that expressions
 * anywhere in the file may refer to them. */

#include "base/error.h"
#include "base/memory.h"
#include "model/expect.h"
#include "model/gene_layout.h"
#include "model/like_genes.h"

#include <string.h>

static int add_species(tarry_builder *builder, const char *name, tarry_species_role role,
                       int32_t gene, tarry_place place, tarry_error *error) {
    if (name == NULL)
        return tarry_fail_memory(error, "a species");
    const uint32_t index = (uint32_t)builder->species.n;
    const tarry_species species = {.name = name, .role = role, .gene = gene, .place = place};
    if (TARRY_APPEND(&builder->species, species) != 0 ||
        TARRY_APPEND(&builder->stage_lags, TARRY_NONE) != 0)
        return tarry_fail_memory(error, "a species");
    if (role == TARRY_SPECIES_ALLELE)
        return 0;
    return tarry_builder_enter(builder, TARRY_SYMBOL_SPECIES, name, index, place, error);
}

static int check_part_name(const tarry_gene_layout *layout, const tarry_entry *entry,
                           const char *what, tarry_error *error) {
    static const char *const kept[] = {"promoter", "transcript", "protein", "steady", "clearance"};
    /* The last only where the gene has one: figures of both would stand under one name. */
    const size_t n = sizeof kept / sizeof *kept - (layout->clearance == NULL);
    for (size_t i = 0; i < n; i++)
        if (strcmp(entry->key, kept[i]) == 0)
            return tarry_fail_at(error, TARRY_INPUT, entry->place,
                                 "'%s' has a meaning of its own in a gene and cannot name %s; "
                                 "choose another name",
                                 entry->key, what);
    return tarry_builder_check_name(entry->key, entry->place, what, error);
}

/* ---- promoters ----------------------------------------------------------------------------------
 */

static int declare_states(tarry_builder *builder, const tarry_gene_layout *layout, int32_t gene,
                          tarry_error *error) {
    int code = 0;
    for (uint32_t i = 0; code == 0 && i < layout->n_states; i++) {
        const tarry_entry *state = &layout->promoter->entries[i];
        code = check_part_name(layout, state, "a promoter state", error);
        if (code == 0)
            code = add_species(
                builder, tarry_arena_format(builder->arena, "%s.%s", layout->name, state->key),
                TARRY_SPECIES_STATE, gene, state->place, error);
    }
    if (layout->n_copies == 1)
        return code;
    for (uint32_t allele = 0; allele < layout->n_copies; allele++)
        for (uint32_t i = 0; code == 0 && i < layout->n_states; i++) {
            const tarry_entry *state = &layout->promoter->entries[i];
            code = add_species(builder,
                               tarry_arena_format(builder->arena, "%s.%s#%u", layout->name,
                                                  state->key, allele + 1),
                               TARRY_SPECIES_ALLELE, gene, state->place, error);
        }
    return code;
}

/* Whether each allele is ready to initiate; at the start it is. */
static int declare_ready(tarry_builder *builder, const tarry_gene_layout *layout, int32_t gene,
                         tarry_error *error) {
    int code = 0;
    if (layout->clearance == NULL)
        return 0;
    for (uint32_t allele = 0; code == 0 && allele < layout->n_copies; allele++) {
        code = add_species(builder, tarry_arena_format(builder->arena, "ready %s", layout->name),
                           TARRY_SPECIES_ALLELE, gene, layout->clearance->place, error);
        if (code == 0)
            builder->species.items[builder->species.n - 1].start = 1;
    }
    return code;
}

/* Promoters and tracks, one for each allele. */
static int declare_promoters(tarry_builder *builder, const tarry_gene_layout *layout,
                             tarry_gene *gene, tarry_error *error) {
    const uint32_t index = (uint32_t)builder->genes.n;
    gene->promoters.from = (uint32_t)builder->promoters.n;
    gene->tracks.from = (uint32_t)builder->tracks.n;
    for (uint32_t allele = 0; allele < layout->n_copies; allele++) {
        tarry_promoter promoter = {
            .gene = index, .allele = allele, .track = (uint32_t)builder->tracks.n};
        promoter.states.from = (uint32_t)builder->states.n;
        for (uint32_t i = 0; i < layout->n_states; i++) {
            const tarry_promoter_state state = {.name = layout->promoter->entries[i].key,
                                                .species = tarry_layout_state(layout, allele, i),
                                                .sum = tarry_layout_sum(layout, i),
                                                .lag = TARRY_NONE};
            if (TARRY_APPEND(&builder->states, state) != 0)
                return tarry_fail_memory(error, "a promoter");
        }
        promoter.states.to = (uint32_t)builder->states.n;
        const tarry_track track = {.name = layout->name, .gene = (int32_t)index, .allele = allele};
        if (TARRY_APPEND(&builder->promoters, promoter) != 0 ||
            TARRY_APPEND(&builder->tracks, track) != 0)
            return tarry_fail_memory(error, "a promoter");
    }
    gene->promoters.to = (uint32_t)builder->promoters.n;
    gene->tracks.to = (uint32_t)builder->tracks.n;
    return 0;
}

/* ---- products -----------------------------------------------------------------------------------
 */

static int declare_product(tarry_builder *builder, const tarry_gene_layout *layout, int32_t gene,
                           const char *name, const tarry_node *stages, tarry_error *error) {
    int code = 0;
    for (size_t i = 0; code == 0 && stages != NULL && i < stages->n; i++) {
        const tarry_entry *stage = &stages->entries[i];
        code = check_part_name(layout, stage, "a stage", error);
        if (code == 0 && TARRY_APPEND(&builder->products, (uint32_t)builder->species.n) != 0)
            code = tarry_fail_memory(error, "a species");
        if (code == 0)
            code = add_species(
                builder, tarry_arena_format(builder->arena, "%s.%s", layout->name, stage->key),
                TARRY_SPECIES_STAGE, gene, stage->place, error);
    }
    if (code == 0 && TARRY_APPEND(&builder->products, (uint32_t)builder->species.n) != 0)
        code = tarry_fail_memory(error, "a species");
    if (code != 0)
        return code;
    return add_species(builder, tarry_arena_format(builder->arena, "%s.%s", layout->name, name),
                       TARRY_SPECIES_PRODUCT, gene, tarry_key_place(layout->node, name), error);
}

/* ---- genes --------------------------------------------------------------------------------------
 */

static int declare_gene(tarry_builder *builder, const tarry_entry *entry, tarry_error *error) {
    const int32_t index = (int32_t)builder->genes.n;
    tarry_gene gene = {.name = entry->key, .place = entry->place};
    tarry_gene_layout layout;
    int code = tarry_builder_check_name(entry->key, entry->place, "a gene", error);
    if (code == 0)
        code = tarry_builder_enter(builder, TARRY_SYMBOL_GENE, entry->key, (uint32_t)index,
                                   entry->place, error);
    if (code == 0)
        code = tarry_gene_layout_read(entry, &layout, error);
    if (code != 0)
        return code;
    layout.first = (uint32_t)builder->species.n;
    gene.n_copies = layout.n_copies;
    gene.products.from = (uint32_t)builder->products.n;
    code = declare_states(builder, &layout, index, error);
    if (code == 0)
        code = declare_ready(builder, &layout, index, error);
    if (code == 0)
        code = declare_promoters(builder, &layout, &gene, error);
    if (code == 0 && layout.transcript != NULL)
        code = declare_product(builder, &layout, index, "transcript", layout.transcript_stages,
                               error);
    if (code == 0 && layout.protein != NULL)
        code = declare_product(builder, &layout, index, "protein", layout.protein_stages, error);
    if (code != 0)
        return code;
    gene.products.to = (uint32_t)builder->products.n;
    if (TARRY_APPEND(&builder->genes, gene) != 0 ||
        TARRY_APPEND(&builder->gene_species, layout.first) != 0)
        return tarry_fail_memory(error, "a gene");
    return 0;
}

int tarry_declare_genes(tarry_builder *builder, tarry_error *error) {
    int code = tarry_list_genes(builder, error);
    for (size_t i = 0; code == 0 && i < builder->gene_entries.n; i++)
        code = declare_gene(builder, &builder->gene_entries.items[i].entry, error);
    return code;
}

int tarry_declare_species(tarry_builder *builder, tarry_error *error) {
    const tarry_node *map = tarry_node_get(builder->root, "species");
    if (map == NULL)
        return 0;
    int code = tarry_expect_map(map, "'species'", error);
    for (size_t i = 0; code == 0 && i < map->n; i++) {
        const tarry_entry *entry = &map->entries[i];
        code = tarry_builder_check_name(entry->key, entry->place, "a species", error);
        if (code == 0)
            code = add_species(builder, entry->key, TARRY_SPECIES_PLAIN, TARRY_NONE, entry->place,
                               error);
    }
    return code;
}
