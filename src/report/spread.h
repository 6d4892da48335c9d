#ifndef TARRY_REPORT_SPREAD_H
#define TARRY_REPORT_SPREAD_H

/* Where genes are many: how each figure spreads over them. */

#include "base/text.h"
#include "report/groups.h"

/* Rows of `bursts` or `signals` (groups by its first column) as one table of 80
 * columns: quantity, window, median over genes, tenth and nine tenths of the genes, extremes; then
 * whose the extremes are. */
int tarry_spread_write(const tarry_table *table, const tarry_groups *groups, tarry_text *text,
                       tarry_error *error);

#endif
