/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_REPORT_RESPONSES_H
#define TARRY_REPORT_RESPONSES_H

/* First responses in figures: of each curve in `first` the share of cells that responded and the
 * median time, both with their intervals. */

#include <stddef.h>
#include "report/rounding.h"
#include "tarry/error.h"
#include "tarry/table.h"

/* `low` and `high` are NaN where there is no bound. */
typedef struct tarry_response_figure {
    double value, low, high;
} tarry_response_figure;

typedef struct tarry_response_item {
    const char *name; /* the table's: one pointer for one name */
    double step;      /* its time */
    double length;    /* of the stretch that was looked at */
    tarry_response_figure responders;
    tarry_response_figure median; /* NaN where fewer than half responded */
} tarry_response_item;

typedef struct tarry_responses {
    size_t n;
    tarry_response_item *items;
} tarry_responses;

/* In the order of names and, for each, of steps. Zero-initialise ({0}). Release accepts a
 * half-built one. */
int tarry_responses_init(tarry_responses *responses, const tarry_table *first, tarry_error *error);
void tarry_responses_release(tarry_responses *responses);

/* Value and bounds for reading; `high` is "-" where only that is missing. */
void tarry_response_round(const tarry_response_figure *figure, tarry_rounded *out);

#endif
