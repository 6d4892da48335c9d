/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "report/json.h"

#include "base/memory.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

static void write_indent(int depth, tarry_text *text) {
    tarry_text_add(text, "\n", 1);
    for (int i = 0; i < depth; i++)
        tarry_text_add(text, "  ", 2);
}

static void write_string(const json_t *value, tarry_text *text) {
    char *quoted = json_dumps(value, JSON_ENCODE_ANY);
    if (quoted)
        tarry_text_add_string(text, quoted);
    else
        text->failed = true;
    free(quoted);
}

static bool is_nest(const json_t *value) {
    return json_is_object(value) || json_is_array(value);
}

static bool holds_nests(const json_t *value) {
    const char *key;
    json_t *inner;
    size_t i;
    json_object_foreach((json_t *)value, key, inner) if (is_nest(inner)) return true;
    json_array_foreach(value, i, inner) if (is_nest(inner)) return true;
    return false;
}

/* What comes before the next element: a comma if it is not the first, and a new line or a blank. */
static void write_gap(bool *first, bool spread, int depth, tarry_text *text) {
    if (!*first)
        tarry_text_add(text, ",", 1);
    if (spread)
        write_indent(depth, text);
    else if (!*first)
        tarry_text_add(text, " ", 1);
    *first = false;
}

static void write_object(const json_t *value, int depth, tarry_text *text) {
    const char *key;
    json_t *inner;
    const bool spread = holds_nests(value) || depth == 0;
    bool first = true;
    tarry_text_add(text, "{", 1);
    json_object_foreach((json_t *)value, key, inner) {
        write_gap(&first, spread, depth + 1, text);
        json_t *name = json_string(key);
        write_string(name, text);
        json_decref(name);
        tarry_text_add(text, ": ", 2);
        tarry_json_write(inner, depth + 1, text);
    }
    if (spread && !first)
        write_indent(depth, text);
    tarry_text_add(text, "}", 1);
}

static void write_array(const json_t *value, int depth, tarry_text *text) {
    json_t *inner;
    size_t i;
    const bool spread = holds_nests(value);
    bool first = true;
    tarry_text_add(text, "[", 1);
    json_array_foreach(value, i, inner) {
        write_gap(&first, spread, depth + 1, text);
        tarry_json_write(inner, depth + 1, text);
    }
    if (spread && !first)
        write_indent(depth, text);
    tarry_text_add(text, "]", 1);
}

void tarry_json_write(const json_t *value, int depth, tarry_text *text) {
    if (!value) {
        text->failed = true;
        return;
    }
    switch (json_typeof(value)) {
    case JSON_OBJECT:
        write_object(value, depth, text);
        break;
    case JSON_ARRAY:
        write_array(value, depth, text);
        break;
    case JSON_STRING:
        write_string(value, text);
        break;
    case JSON_INTEGER:
        tarry_text_printf(text, "%lld", (long long)json_integer_value(value));
        break;
    case JSON_REAL:
        tarry_text_add_number(text, json_real_value(value));
        break;
    case JSON_TRUE:
        tarry_text_add(text, "true", 4);
        break;
    case JSON_FALSE:
        tarry_text_add(text, "false", 5);
        break;
    case JSON_NULL:
        tarry_text_add(text, "null", 4);
        break;
    }
}

json_t *tarry_json_number(double value) {
    return isfinite(value) ? json_real(value) : json_null();
}

json_t *tarry_json_text(const char *text) {
    json_t *value = json_string(text);
    if (value)
        return value;
    const size_t n = strlen(text);
    char *plain = tarry_calloc(n + 1, 1);
    if (!plain)
        return NULL;
    bool any = false;
    for (size_t i = 0; i < n; i++) {
        const bool high = (signed char)text[i] < 0;
        plain[i] = high ? '?' : text[i];
        any = any || high;
    }
    value = any ? json_string(plain) : NULL; /* plain ASCII fails for want of memory only */
    free(plain);
    return value;
}

void tarry_json_put(json_t *object, const char *key, json_t *value, bool *failed) {
    if (json_object_set_new(object, key, value))
        *failed = true;
}

void tarry_json_append(json_t *list, json_t *value, bool *failed) {
    if (json_array_append_new(list, value))
        *failed = true;
}
