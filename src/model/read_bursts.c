/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "model/builder.h"

/* `bursts:` names what opens, closes and counts on a track of its own, for plain reactions. Their
 * effects have no marks before, so that the marks of each are put in one row here. */

#include "base/error.h"
#include "base/memory.h"
#include "model/expect.h"

#include <stdlib.h>

typedef struct placed_mark {
    uint32_t effect;
    tarry_mark_rule rule;
} placed_mark;

typedef struct bursts_work {
    tarry_builder *builder;
    uint32_t track;
    TARRY_LIST(placed_mark) marks;
} bursts_work;

static int read_names(bursts_work *work, const tarry_node *map, const char *key,
                      tarry_mark_kind kind, bool required, tarry_error *error) {
    const tarry_node *list = tarry_node_get(map, key);
    if (list == NULL)
        return !required ? 0
                         : tarry_fail_at(error, TARRY_INPUT, map->place,
                                         "bursts need '%s', a list of reactions", key);
    int code = tarry_expect_list(list, key, error);
    if (code == 0 && required && list->n == 0)
        return tarry_fail_at(error, TARRY_INPUT, list->place,
                             "'%s' is empty; name the reactions by which bursts begin or end", key);
    for (size_t i = 0; code == 0 && i < list->n; i++) {
        const tarry_node *name = list->entries[i].node;
        uint32_t reaction = 0;
        code = tarry_expect_scalar(name, "the name of a reaction", error);
        if (code == 0)
            code = tarry_builder_need(work->builder, TARRY_SYMBOL_REACTION, name->text, name->place,
                                      &reaction, error);
        if (code != 0)
            return code;
        const placed_mark mark = {.effect = work->builder->reactions.items[reaction].effect,
                                  .rule = {.track = work->track, .kind = kind}};
        if (TARRY_APPEND(&work->marks, mark) != 0)
            return tarry_fail_memory(error, "bursts");
    }
    return code;
}

static int read_track(bursts_work *work, const tarry_entry *entry, tarry_error *error) {
    static const char *const keys[] = {"opens", "closes", "counts"};
    tarry_builder *builder = work->builder;
    work->track = (uint32_t)builder->tracks.n;
    int code = tarry_builder_check_name(entry->key, entry->place, "bursts", error);
    if (code == 0)
        code = tarry_expect_keys(entry->node, entry->key, keys, 3, error);
    if (code == 0)
        code = tarry_builder_enter(builder, TARRY_SYMBOL_BURSTS, entry->key,
                                   (uint32_t)builder->genes.n, entry->place, error);
    if (code == 0)
        code = read_names(work, entry->node, "opens", TARRY_MARK_OPEN, true, error);
    if (code == 0)
        code = read_names(work, entry->node, "closes", TARRY_MARK_CLOSE, true, error);
    if (code == 0)
        code = read_names(work, entry->node, "counts", TARRY_MARK_COUNT, false, error);
    if (code != 0)
        return code;
    const tarry_track track = {.name = entry->key, .gene = TARRY_NONE, .tells = true};
    const uint32_t n_promoters = (uint32_t)builder->promoters.n;
    const uint32_t n_products = (uint32_t)builder->products.n;
    const tarry_gene gene = {.name = entry->key,
                             .promoters = {n_promoters, n_promoters},
                             .tracks = {work->track, work->track + 1},
                             .products = {n_products, n_products},
                             .n_copies = 1,
                             .tells = true,
                             .place = entry->place};
    if (TARRY_APPEND(&builder->tracks, track) != 0 || TARRY_APPEND(&builder->genes, gene) != 0)
        return tarry_fail_memory(error, "bursts");
    return 0;
}

/* By effect; in one effect COUNT first, then by track. */
static int by_effect(const void *one, const void *other) {
    const placed_mark *a = one, *b = other;
    if (a->effect != b->effect)
        return a->effect > b->effect ? 1 : -1;
    const int a_counts = a->rule.kind == TARRY_MARK_COUNT;
    const int b_counts = b->rule.kind == TARRY_MARK_COUNT;
    if (a_counts != b_counts)
        return b_counts - a_counts;
    if (a->rule.track != b->rule.track)
        return a->rule.track > b->rule.track ? 1 : -1;
    return (a->rule.kind > b->rule.kind) - (a->rule.kind < b->rule.kind);
}

static int place_marks(bursts_work *work, tarry_error *error) {
    tarry_builder *builder = work->builder;
    if (work->marks.n > 0)
        qsort(work->marks.items, work->marks.n, sizeof *work->marks.items, by_effect);
    for (size_t i = 0; i < work->marks.n;) {
        const uint32_t effect = work->marks.items[i].effect;
        tarry_range *marks = &builder->effects.items[effect].marks;
        marks->from = (uint32_t)builder->marks.n;
        for (; i < work->marks.n && work->marks.items[i].effect == effect; i++)
            if (TARRY_APPEND(&builder->marks, work->marks.items[i].rule) != 0)
                return tarry_fail_memory(error, "bursts");
        marks->to = (uint32_t)builder->marks.n;
    }
    return 0;
}

int tarry_read_bursts(tarry_builder *builder, tarry_error *error) {
    const tarry_node *map = tarry_node_get(builder->root, "bursts");
    if (map == NULL)
        return 0;
    bursts_work work = {.builder = builder};
    int code = tarry_expect_map(map, "'bursts'", error);
    for (size_t i = 0; code == 0 && i < map->n; i++)
        code = read_track(&work, &map->entries[i], error);
    if (code == 0)
        code = place_marks(&work, error);
    free(work.marks.items);
    return code;
}
