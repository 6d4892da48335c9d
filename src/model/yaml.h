/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_MODEL_YAML_H
#define TARRY_MODEL_YAML_H

/* YAML text -> a tree of maps, lists and scalars with places, by libyaml's events. Plain scalars
 * stay text. Refused, each with its place: anchors, aliases, tags, merge keys, a second document,
 * nesting deeper than 64, duplicate keys, keys that are not scalars, text that is not UTF-8,
 * control characters, and inside { } and [ ] a call that YAML parts at its commas. */

#include <stdbool.h>
#include <stddef.h>
#include "base/memory.h"
#include "tarry/error.h"

typedef enum tarry_node_kind { TARRY_NODE_SCALAR, TARRY_NODE_LIST, TARRY_NODE_MAP } tarry_node_kind;

typedef struct tarry_node tarry_node;

typedef struct tarry_entry {
    const char *key;        /* NULL in lists */
    tarry_place place;      /* of the key, or of the item */
    const tarry_node *node; /* never NULL */
} tarry_entry;

struct tarry_node {
    tarry_node_kind kind;
    tarry_place place;          /* of the first character; inside the quotes where there are any */
    const char *text;           /* scalars: NUL-ended (a NUL inside the text is an error) */
    bool quoted;                /* scalars: written in quotes or as a block */
    size_t n;                   /* maps and lists: number of entries */
    const tarry_entry *entries; /* in the order of the file */
};

/* `file` is borrowed and kept in every place. */
int tarry_yaml_read(const char *text, size_t size, const char *file, tarry_arena *arena,
                    const tarry_node **root, tarry_error *error);

/* The value under `key`, or NULL. */
const tarry_node *tarry_node_get(const tarry_node *map, const char *key);

#endif
