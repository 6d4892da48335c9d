/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "model/like_genes.h"

#include "base/error.h"
#include "base/memory.h"
#include "model/expect.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>

#define HASH_NONFATAL_OOM 1
#define uthash_nonfatal_oom(element) ((void)(element))
#include <uthash.h>

/* ---- names ------------------------------------------------------------------------------------
 */

static int add_entry(tarry_builder *builder, tarry_gene_entry gene, tarry_error *error) {
    return TARRY_APPEND(&builder->gene_entries, gene) == 0 ? 0 : tarry_fail_memory(error, "a gene");
}

static int list_like(tarry_builder *builder, const tarry_entry *entry, uint32_t n,
                     tarry_error *error) {
    const tarry_like_genes like = {
        .name = entry->key, .first = (uint32_t)builder->gene_entries.n, .n = n};
    const uint32_t index = (uint32_t)builder->like_genes.n;
    int code = tarry_builder_check_name(entry->key, entry->place, "a gene", error);
    if (code == 0)
        code = tarry_builder_enter(builder, TARRY_SYMBOL_LIKE_GENES, entry->key, index,
                                   entry->place, error);
    if (code == 0 && TARRY_APPEND(&builder->like_genes, like) != 0)
        code = tarry_fail_memory(error, "a gene");
    for (uint32_t i = 1; code == 0 && i <= n; i++) {
        tarry_gene_entry gene = {.entry = *entry, .common = entry->key};
        gene.entry.key = tarry_arena_format(builder->arena, "%s_%u", entry->key, (unsigned)i);
        if (gene.entry.key == NULL)
            return tarry_fail_memory(error, "a gene");
        code = add_entry(builder, gene, error);
    }
    return code;
}

static int list_one(tarry_builder *builder, const tarry_entry *entry, tarry_error *error) {
    const tarry_node *many = entry->node->kind == TARRY_NODE_MAP
                                 ? tarry_node_get(entry->node, "many")
                                 : NULL;
    double n = 0;
    if (many == NULL)
        return add_entry(builder, (tarry_gene_entry){.entry = *entry}, error);
    const int code = tarry_expect_count(many, "'many'", 1, TARRY_MOST_LIKE, &n, error);
    return code == 0 ? list_like(builder, entry, (uint32_t)n, error) : code;
}

int tarry_list_genes(tarry_builder *builder, tarry_error *error) {
    const tarry_node *map = tarry_node_get(builder->root, "genes");
    if (map == NULL)
        return 0;
    int code = tarry_expect_map(map, "'genes'", error);
    for (size_t i = 0; code == 0 && i < map->n; i++)
        code = list_one(builder, &map->entries[i], error);
    return code;
}

/* ---- the common name --------------------------------------------------------------------------
 */

void tarry_like_enter(tarry_builder *builder, const tarry_gene_entry *gene) {
    builder->common = gene != NULL ? gene->common : NULL;
    builder->own = builder->common != NULL ? gene->entry.key : NULL;
}

static size_t head_of(const char *name, size_t n) {
    size_t head = 0;
    while (head < n && name[head] != '.')
        head++;
    return head;
}

const tarry_like_genes *tarry_like_find(const tarry_builder *builder, const char *name, size_t n) {
    char head[128];
    const size_t size = head_of(name, n);
    if (builder->like_genes.n == 0 || size >= sizeof head)
        return NULL;
    snprintf(head, sizeof head, "%.*s", (int)size, name);
    const int32_t found = tarry_builder_find(builder, TARRY_SYMBOL_LIKE_GENES, head);
    return found != TARRY_NONE ? &builder->like_genes.items[found] : NULL;
}

bool tarry_like_own(const tarry_builder *builder, const char *name, size_t n, char *out,
                    size_t size) {
    if (builder->common == NULL)
        return false;
    const size_t head = head_of(name, n);
    if (head == n || head != strlen(builder->common) || memcmp(name, builder->common, head) != 0)
        return false;
    const int written = snprintf(out, size, "%s%.*s", builder->own, (int)(n - head), name + head);
    return written >= 0 && (size_t)written < size;
}

int tarry_like_fail(const tarry_like_genes *like, const char *name, tarry_place place,
                    tarry_error *error) {
    const char *rest = name + head_of(name, strlen(name));
    return tarry_fail_at(error, TARRY_INPUT, place,
                         "'%s' stands for %u like genes, %s_1 to %s_%u; name one of them, as "
                         "%s_1%s (the common name is understood in its own rates only)",
                         like->name, (unsigned)like->n, like->name, like->name, (unsigned)like->n,
                         like->name, rest);
}

/* ---- what is read once ------------------------------------------------------------------------
 */

struct tarry_shared {
    const tarry_node *node;
    uint32_t index;
    UT_hash_handle hh;
};

bool tarry_like_shared(const tarry_builder *builder, const tarry_node *node, uint32_t *index) {
    tarry_shared *found = NULL;
    if (builder->common == NULL)
        return false;
    HASH_FIND_PTR(builder->shared, &node, found);
    if (found != NULL)
        *index = found->index;
    return found != NULL;
}

int tarry_like_share(tarry_builder *builder, const tarry_node *node, uint32_t index,
                     tarry_error *error) {
    if (builder->common == NULL)
        return 0;
    tarry_shared *shared = tarry_arena_calloc(builder->arena, 1, sizeof *shared);
    if (shared == NULL)
        return tarry_fail_memory(error, "a gene");
    shared->node = node;
    shared->index = index;
    HASH_ADD_PTR(builder->shared, node, shared);
    return shared->hh.tbl != NULL ? 0 : tarry_fail_memory(error, "a gene");
}

void tarry_like_release(tarry_builder *builder) {
    HASH_CLEAR(hh, builder->shared);
}
