/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_MODEL_EXPECT_H
#define TARRY_MODEL_EXPECT_H

/* What a reader expects at a place of the tree; errors say what stands there and what would be
 * right. `what` names the thing in messages: "the gene 'vela'", "delays". */

#include "model/yaml.h"

int tarry_expect_map(const tarry_node *node, const char *what, tarry_error *error);
int tarry_expect_list(const tarry_node *node, const char *what, tarry_error *error);
int tarry_expect_scalar(const tarry_node *node, const char *what, tarry_error *error);

/* A map whose keys are all in `keys`; an unknown one is named with its nearest. */
int tarry_expect_keys(const tarry_node *node, const char *what, const char *const *keys,
                      size_t n_keys, tarry_error *error);

/* Keys of this list that stand in the map are TARRY_NOT_YET: "... cannot be used yet". */
int tarry_expect_not_yet(const tarry_node *node, const char *what, const char *const *keys,
                         size_t n_keys, tarry_error *error);

/* The value under `key`, or TARRY_INPUT at the map's place: "what: needs 'key'". */
int tarry_expect_value(const tarry_node *map, const char *what, const char *key,
                       const tarry_node **value, tarry_error *error);

/* A whole number in [least, most], written as digits. */
int tarry_expect_count(const tarry_node *node, const char *what, double least, double most,
                       double *value, tarry_error *error);

/* `yes` or `no`, or `true` or `false`. */
int tarry_expect_answer(const tarry_node *node, const char *what, bool *answer, tarry_error *error);

/* TARRY_INPUT about a number that came out wrong: its text stands between `before` and `after`. */
int tarry_fail_number(tarry_error *error, tarry_place place, const char *before, double number,
                      const char *after);

/* The place of the key (not the value) in its map. */
tarry_place tarry_key_place(const tarry_node *map, const char *key);

#endif
