/* SPDX-License-Identifier: GPL-3.0-or-later */

/* The median is where the curve reaches one half, its bounds where the curve's bounds do
 * (Brookmeyer & Crowley 1982, Biometrics 38:29), each on the straight line through the bin in which
 * it happens. docs/statistics.md, "First responses". */
#include "report/responses.h"

#include "base/error.h"
#include "base/memory.h"
#include "tally/dwells.h"

#include <math.h>
#include <stdbool.h>
#include <stdlib.h>
#include <string.h>

enum { NAME, STEP, TIME, SURVIVAL, LOW, HIGH };

/* Rows from .. to - 1 of a table: one curve. */
typedef struct curve {
    const tarry_table *table;
    size_t from, to;
} curve;

static double number(const curve *c, size_t row, int column) {
    return tarry_table_number(c->table, row, column);
}

/* A bound of the curve, which is the curve itself where there is no interval because all or none
 * have responded. */
static double at(const curve *c, size_t row, int column) {
    const double value = number(c, row, column), survival = number(c, row, SURVIVAL);
    return isnan(value) && (survival <= 0.0 || survival >= 1.0) ? survival : value;
}

/* Where a column comes down to one half; NaN where it does not. */
static double half(const curve *c, int column) {
    const double longest = number(c, c->to - 1, TIME);
    size_t row = c->from;
    while (row < c->to && !(at(c, row, column) <= 0.5))
        row++;
    if (row == c->to || row == c->from)
        return NAN;
    const double before = at(c, row - 1, column), after = at(c, row, column);
    const double end = number(c, row, TIME);
    const uint32_t bin = tarry_dwell_bin(end, longest);
    const double start = bin > 0 ? tarry_dwell_bin_end(bin - 1, longest) : 0.0;
    /* Between rows nothing ended, so that the curve falls within the last bin only. */
    const double share = before > after ? (before - 0.5) / (before - after) : 1.0;
    return start + (isfinite(share) ? share : 1.0) * (end - start);
}

static tarry_response_item item_of(const curve *c) {
    const size_t last = c->to - 1;
    return (tarry_response_item){
        .name = tarry_table_text(c->table, c->from, NAME),
        .step = number(c, c->from, STEP),
        .length = number(c, last, TIME),
        .responders = {1.0 - number(c, last, SURVIVAL), 1.0 - number(c, last, HIGH),
                       1.0 - number(c, last, LOW)},
        .median = {half(c, SURVIVAL), half(c, LOW), half(c, HIGH)},
    };
}

/* Each curve begins at time 0 and ends with a row at a later one. */
int tarry_responses_init(tarry_responses *responses, const tarry_table *first, tarry_error *error) {
    const size_t n_rows = tarry_table_n_rows(first);
    memset(responses, 0, sizeof *responses);
    size_t n = 0;
    for (size_t row = 0; row < n_rows; row++)
        n += tarry_table_number(first, row, TIME) == 0.0;
    responses->items = tarry_calloc(n, sizeof *responses->items);
    if (!responses->items)
        return tarry_fail_memory(error, "the first responses");
    for (curve c = {first, 0, 0}; c.from < n_rows; c.from = c.to) {
        c.to = c.from + 1;
        while (c.to < n_rows && tarry_table_number(first, c.to, TIME) > 0.0)
            c.to++;
        responses->items[responses->n++] = item_of(&c);
    }
    return TARRY_OK;
}

void tarry_responses_release(tarry_responses *responses) {
    free(responses->items);
    memset(responses, 0, sizeof *responses);
}

void tarry_response_round(const tarry_response_figure *figure, tarry_rounded *out) {
    enum { DIGITS = 4 };
    const bool open = isnan(figure->high) && !isnan(figure->low);
    tarry_round(figure->value, figure->low, open ? NAN : figure->high, DIGITS, out);
    if (open) {
        tarry_round_plain(figure->low, out->low);
        strcpy(out->high, "-");
    }
}
