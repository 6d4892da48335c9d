/* SPDX-License-Identifier: GPL-3.0-or-later */

/* A unit is kept as a fraction of two whole numbers (20 min in hours is 20 * 60 / 3600), so that
 * reading a quantity rounds once where a scale that was rounded before would round twice. */
#include "model/quantity.h"

#include "base/error.h"
#include "base/number.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

static const struct {
    const char *name;
    double size; /* seconds or bp */
    bool is_time;
} simple_units[] = {
    {"s", 1, true},   {"min", 60, true}, {"h", 3600, true},  {"d", 86400, true},
    {"bp", 1, false}, {"nt", 1, false},  {"kb", 1e3, false},
};

/* Other ways of writing them that people are used to. */
static const struct {
    const char *word;
    const char *unit;
} other_words[] = {
    {"sec", "s"},      {"secs", "s"},      {"second", "s"}, {"seconds", "s"}, {"mins", "min"},
    {"minute", "min"}, {"minutes", "min"}, {"m", "min"},    {"hr", "h"},      {"hrs", "h"},
    {"hour", "h"},     {"hours", "h"},     {"day", "d"},    {"days", "d"},    {"kbp", "kb"},
    {"kB", "kb"},      {"Kb", "kb"},       {"knt", "kb"},   {"b", "bp"},      {"base", "bp"},
    {"bases", "nt"},   {"S", "s"},         {"H", "h"},      {"Min", "min"},
};

static const char *const molar_units[] = {
    "M",           "mM",   "uM",    "nM",    "pM",        "fM",         "aM",   "\xc2\xb5M",
    "\xce\xbcM",   "mol",  "mmol",  "umol",  "nmol",      "pmol",       "fmol", "\xc2\xb5mol",
    "\xce\xbcmol", "mole", "moles", "molar", "nanomolar", "micromolar",
};

static bool is(const char *text, size_t n, const char *word) {
    return strlen(word) == n && memcmp(text, word, n) == 0;
}

static bool is_blank(char c) {
    return c == ' ' || c == '\t' || c == '\n';
}

static void trim(const char **text, size_t *n) {
    while (*n > 0 && is_blank((*text)[*n - 1]))
        --*n;
    while (*n > 0 && is_blank(**text)) {
        ++*text;
        --*n;
    }
}

double tarry_time_unit_seconds(const char *name) {
    for (size_t i = 0; i < sizeof simple_units / sizeof *simple_units; i++)
        if (simple_units[i].is_time && strcmp(simple_units[i].name, name) == 0)
            return simple_units[i].size;
    return 0;
}

bool tarry_unit_find(const char *text, size_t n, tarry_units units, tarry_unit_fraction *unit) {
    for (size_t i = 0; i < sizeof simple_units / sizeof *simple_units; i++) {
        if (!is(text, n, simple_units[i].name))
            continue;
        bool is_time = simple_units[i].is_time;
        unit->up = simple_units[i].size;
        unit->down = is_time ? units.time_unit : 1;
        unit->dimension = is_time ? TARRY_TIME : TARRY_LENGTH;
        return true;
    }
    return false;
}

bool tarry_unit_is_molar(const char *text, size_t n) {
    for (size_t i = 0; i < sizeof molar_units / sizeof *molar_units; i++)
        if (is(text, n, molar_units[i]))
            return true;
    return false;
}

int tarry_unit_fail(const char *text, size_t n, tarry_error *error) {
    int shown = n < 60 ? (int)n : 60;
    if (tarry_unit_is_molar(text, n))
        return tarry_fail(error, TARRY_INPUT,
                          "'%.*s' is a unit of concentration; rates here are stochastic constants "
                          "in counts of molecules a cell, so give numbers of molecules and rates "
                          "per combination of molecules (with the cell's volume worked in)",
                          shown, text);
    for (size_t i = 0; i < sizeof other_words / sizeof *other_words; i++)
        if (is(text, n, other_words[i].word))
            return tarry_fail(error, TARRY_INPUT, "'%.*s' is no unit; write '%s'", shown, text,
                              other_words[i].unit);
    return tarry_fail(error, TARRY_INPUT,
                      "'%.*s' is no unit; units are s, min, h, d, bp, nt, kb and their ratios, as "
                      "in '/h' or 'kb/min'",
                      shown, text);
}

/* [UNIT][/UNIT] or 1/UNIT, not empty. *bad and *bad_n: the part that is no unit. */
static bool read_ratio(const char *text, size_t n, tarry_units units, tarry_unit_fraction *unit,
                       const char **bad, size_t *bad_n) {
    const char *slash = memchr(text, '/', n);
    const char *over = text, *under = slash == NULL ? text + n : slash + 1;
    size_t over_n = slash == NULL ? n : (size_t)(slash - text);
    size_t under_n = (size_t)(text + n - under);
    tarry_unit_fraction top = {1, 1, TARRY_PURE}, bottom = {1, 1, TARRY_PURE};
    trim(&over, &over_n);
    trim(&under, &under_n);
    *bad = over;
    *bad_n = over_n;
    bool bare = slash != NULL && (over_n == 0 || is(over, over_n, "1"));
    if (!bare && !tarry_unit_find(over, over_n, units, &top))
        return false;
    *bad = under;
    *bad_n = under_n;
    if (slash != NULL && !tarry_unit_find(under, under_n, units, &bottom))
        return false;
    unit->up = top.up * bottom.down;
    unit->down = top.down * bottom.up;
    unit->dimension.known = true;
    unit->dimension.time = (signed char)(top.dimension.time - bottom.dimension.time);
    unit->dimension.length = (signed char)(top.dimension.length - bottom.dimension.length);
    return true;
}

bool tarry_quantity_read(const char *text, size_t n, tarry_units units, double *value,
                         tarry_dimension *dimension) {
    tarry_unit_fraction unit = {1, 1, TARRY_ANY};
    const char *bad = NULL;
    size_t bad_n = 0;
    double number = 0;
    trim(&text, &n);
    size_t length = tarry_number_prefix(text, n);
    if (length == 0 || tarry_number_read(text, length, &number) != TARRY_NUMBER_OK)
        return false;
    const char *rest = text + length;
    size_t rest_n = n - length;
    trim(&rest, &rest_n);
    if (rest_n > 0 && !read_ratio(rest, rest_n, units, &unit, &bad, &bad_n))
        return false;
    *value = number * unit.up / unit.down;
    if (!isfinite(*value))
        return false;
    *dimension = unit.dimension;
    return true;
}

int tarry_unit_read(const char *text, size_t n, tarry_units units, double *scale,
                    tarry_dimension *dimension, tarry_error *error) {
    tarry_unit_fraction unit = {1, 1, TARRY_ANY};
    const char *bad = NULL;
    size_t bad_n = 0;
    trim(&text, &n);
    if (!read_ratio(text, n, units, &unit, &bad, &bad_n))
        return tarry_unit_fail(bad, bad_n, error);
    *scale = unit.up / unit.down;
    *dimension = unit.dimension;
    return 0;
}

const char *tarry_dimension_text(tarry_dimension dimension, char out[48]) {
    static const struct {
        signed char time, length;
        const char *text;
    } words[] = {
        {0, 0, "a pure number"},          {1, 0, "a time"},
        {-1, 0, "a rate (1/time)"},       {0, 1, "a length"},
        {-1, 1, "a speed (length/time)"}, {1, -1, "a time per length"},
        {0, -1, "a number per length"},
    };
    if (!dimension.known)
        return "a number without a unit";
    for (size_t i = 0; i < sizeof words / sizeof *words; i++)
        if (words[i].time == dimension.time && words[i].length == dimension.length)
            return words[i].text;
    if (dimension.length == 0)
        snprintf(out, 48, "time^%d", dimension.time);
    else if (dimension.time == 0)
        snprintf(out, 48, "length^%d", dimension.length);
    else
        snprintf(out, 48, "time^%d length^%d", dimension.time, dimension.length);
    return out;
}

bool tarry_dimension_fits(tarry_dimension given, tarry_dimension due) {
    return !given.known || !due.known || (given.time == due.time && given.length == due.length);
}
