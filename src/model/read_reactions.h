/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_MODEL_READ_REACTIONS_H
#define TARRY_MODEL_READ_REACTIONS_H

#include "model/builder.h"

/* `{clasp: 1, pin: 2}`: species with whole numbers. Zero-initialise; release with free(items). */
typedef struct tarry_count {
    uint32_t species;
    uint32_t amount;
    tarry_place place;
} tarry_count;

typedef TARRY_LIST(tarry_count) tarry_counts;

/* Read a map of species and whole numbers from 1 to `most` under `key`; a missing key leaves the
 * list empty. `changes`: the species will change, which promoter states and stages may not. */
int tarry_read_counts(tarry_builder *builder, const tarry_node *map, const char *key, bool changes,
                      double most, tarry_counts *counts, tarry_error *error);

/* Read what a reaction or completion makes into `draft`: whole numbers and random amounts. Species
 * made are appended to `made`. */
int tarry_read_makes(tarry_builder *builder, const tarry_node *map, tarry_draft *draft,
                     tarry_counts *made, tarry_error *error);

#endif
