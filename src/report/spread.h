/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_REPORT_SPREAD_H
#define TARRY_REPORT_SPREAD_H

/* Where genes are many: how each figure spreads over them. */

#include "base/text.h"
#include "report/groups.h"

/* The genes whose figure is the least or the most of all. */
typedef struct tarry_spread_end {
    double value;
    size_t row; /* of the first of them */
    size_t n;   /* how many are alike */
} tarry_spread_end;

typedef struct tarry_spread_item {
    size_t row; /* that names quantity, window and unit */
    size_t n;   /* genes that have it; the rest is NaN where none has */
    double median, tenth, nine_tenths;
    tarry_spread_end least, most;
} tarry_spread_item;

typedef struct tarry_spread {
    size_t n;
    tarry_spread_item *items; /* in the order of the first gene's rows */
    bool several_windows;
} tarry_spread;

/* Over rows of `bursts` or `signals`, grouped by its first column. The first group names the
 * figures; a gene without some of them just adds nothing. Zero-initialise ({0}). Release accepts a
 * half-built one. */
int tarry_spread_init(tarry_spread *spread, const tarry_table *table, const tarry_groups *groups,
                      tarry_error *error);
void tarry_spread_release(tarry_spread *spread);

/* Whether one gene alone has the least or the most. */
bool tarry_spread_has_ends(const tarry_spread_item *item);

/* The spread as one table of 80 columns: quantity, window, median over genes, tenth and nine tenths
 * of the genes, extremes; then whose the extremes are. */
int tarry_spread_write(const tarry_table *table, const tarry_groups *groups, tarry_text *text,
                       tarry_error *error);

#endif
