/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_REPORT_PAGE_H
#define TARRY_REPORT_PAGE_H

/* report.html: a run on one page that needs nothing else, for a reader without the program. */

#include "base/text.h"
#include "report/figure.h"
#include "tarry/write.h"

/* Append the page. `figures` may be empty; those without a picture are told of, not shown. The same
 * run gives the same bytes for any number of threads. */
int tarry_page_write(const tarry_model *model, const tarry_results *results,
                     const tarry_provenance *provenance, const tarry_figure_list *figures,
                     tarry_text *text, tarry_error *error);

#endif
