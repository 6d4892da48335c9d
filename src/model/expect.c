/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "model/expect.h"

/* Every message has the same build: what it is about, what stands there, what would be right. */

#include "base/error.h"
#include "base/number.h"
#include "base/text.h"

#include <string.h>

static const char *const KIND_TEXTS[] = {"a single value", "a list", "a map of keys"};

static const char *kind_text(const tarry_node *node) {
    if (node->kind == TARRY_NODE_SCALAR && node->text[0] == '\0' && !node->quoted)
        return "nothing";
    return KIND_TEXTS[node->kind];
}

/* ---- kinds --------------------------------------------------------------------------------------
 */

int tarry_expect_map(const tarry_node *node, const char *what, tarry_error *error) {
    if (node->kind != TARRY_NODE_MAP)
        return tarry_fail_at(error, TARRY_INPUT, node->place,
                             "%s must be a map, as {key: value}; here stands %s", what,
                             kind_text(node));
    return 0;
}

int tarry_expect_list(const tarry_node *node, const char *what, tarry_error *error) {
    if (node->kind != TARRY_NODE_LIST)
        return tarry_fail_at(error, TARRY_INPUT, node->place,
                             "%s must be a list, as [one, two]; here stands %s", what,
                             kind_text(node));
    return 0;
}

int tarry_expect_scalar(const tarry_node *node, const char *what, tarry_error *error) {
    if (node->kind != TARRY_NODE_SCALAR)
        return tarry_fail_at(error, TARRY_INPUT, node->place,
                             "%s must be a single value; here stands %s", what, kind_text(node));
    if (node->text[0] == '\0')
        return tarry_fail_at(error, TARRY_INPUT, node->place, "%s has no value", what);
    return 0;
}

/* ---- keys ---------------------------------------------------------------------------------------
 */

static bool is_one_of(const char *key, const char *const *keys, size_t n_keys) {
    for (size_t i = 0; i < n_keys; i++)
        if (strcmp(key, keys[i]) == 0)
            return true;
    return false;
}

static int fail_unknown_key(const tarry_entry *entry, const char *what, const char *const *keys,
                            size_t n_keys, tarry_error *error) {
    const char *nearest = tarry_nearest_word(entry->key, keys, n_keys);
    if (nearest != NULL)
        return tarry_fail_at(error, TARRY_INPUT, entry->place,
                             "%s has no key '%s'; did you mean '%s'?", what, entry->key, nearest);
    tarry_text list = {0};
    for (size_t i = 0; i < n_keys; i++)
        tarry_text_printf(&list, "%s%s", i == 0 ? "" : ", ", keys[i]);
    const int code = list.failed ? tarry_fail_memory(error, "a message")
                                 : tarry_fail_at(error, TARRY_INPUT, entry->place,
                                                 "%s has no key '%s'; its keys are: %s", what,
                                                 entry->key, list.data);
    tarry_text_release(&list);
    return code;
}

int tarry_expect_keys(const tarry_node *node, const char *what, const char *const *keys,
                      size_t n_keys, tarry_error *error) {
    const int code = tarry_expect_map(node, what, error);
    if (code != 0)
        return code;
    for (size_t i = 0; i < node->n; i++)
        if (!is_one_of(node->entries[i].key, keys, n_keys))
            return fail_unknown_key(&node->entries[i], what, keys, n_keys, error);
    return 0;
}

int tarry_expect_not_yet(const tarry_node *node, const char *what, const char *const *keys,
                         size_t n_keys, tarry_error *error) {
    for (size_t i = 0; i < n_keys; i++)
        if (tarry_node_get(node, keys[i]) != NULL)
            return tarry_fail_at(error, TARRY_NOT_YET, tarry_key_place(node, keys[i]),
                                 "%s: '%s' cannot be used yet; remove it for this version", what,
                                 keys[i]);
    return 0;
}

int tarry_expect_answer(const tarry_node *node, const char *what, bool *answer,
                        tarry_error *error) {
    static const char *const words[] = {"no", "yes", "false", "true"};
    const int code = tarry_expect_scalar(node, what, error);
    for (int i = 0; code == 0 && i < 4; i++)
        if (strcmp(node->text, words[i]) == 0) {
            *answer = i % 2 == 1;
            return 0;
        }
    return code != 0 ? code
                     : tarry_fail_at(error, TARRY_INPUT, node->place, "%s is yes or no, not '%s'",
                                     what, node->text);
}

int tarry_expect_value(const tarry_node *map, const char *what, const char *key,
                       const tarry_node **value, tarry_error *error) {
    *value = tarry_node_get(map, key);
    return *value != NULL
               ? 0
               : tarry_fail_at(error, TARRY_INPUT, map->place, "%s needs '%s'", what, key);
}

tarry_place tarry_key_place(const tarry_node *map, const char *key) {
    for (size_t i = 0; i < map->n; i++)
        if (strcmp(map->entries[i].key, key) == 0)
            return map->entries[i].place;
    return map->place;
}

/* ---- values -------------------------------------------------------------------------------------
 */

int tarry_expect_count(const tarry_node *node, const char *what, double least, double most,
                       double *value, tarry_error *error) {
    const int code = tarry_expect_scalar(node, what, error);
    if (code != 0)
        return code;
    int64_t count = 0;
    const tarry_number_status status = tarry_integer_read(node->text, strlen(node->text), &count);
    if (status == TARRY_NUMBER_OK && (double)count >= least && (double)count <= most) {
        *value = (double)count;
        return 0;
    }
    char low[TARRY_NUMBER_SIZE], high[TARRY_NUMBER_SIZE];
    tarry_number_write(least, low);
    tarry_number_write(most, high);
    return tarry_fail_at(error, TARRY_INPUT, node->place,
                         "%s must be a whole number from %s to %s, not '%s'", what, low, high,
                         node->text);
}

int tarry_fail_number(tarry_error *error, tarry_place place, const char *before, double number,
                      const char *after) {
    char text[TARRY_NUMBER_SIZE];
    tarry_number_write(number, text);
    return tarry_fail_at(error, TARRY_INPUT, place, "%s%s%s", before, text, after);
}
