/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_REPORT_FIGURES_TABLE_H
#define TARRY_REPORT_FIGURES_TABLE_H

/* The figures of genes or signals, one block of lines each, for a terminal. */

#include "base/text.h"
#include "model/network.h"
#include "report/groups.h"

/* Append a block for each group of `table` (`bursts` or `signals`, grouped by its first column).
 * Windows stand side by side, at least one, as many as `width` columns allow. *marked becomes true
 * where a figure rests on few periods and carries a star. */
int tarry_figures_write(const tarry_network *network, const tarry_table *table,
                        const tarry_groups *groups, int width, bool *marked, tarry_text *text,
                        tarry_error *error);

#endif
