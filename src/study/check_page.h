/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_STUDY_CHECK_PAGE_H
#define TARRY_STUDY_CHECK_PAGE_H

/* The page that `tarry check` prints, in the making: its parts are written one after another. */

#include "base/text.h"
#include "model/model.h"
#include "study/sheet.h"

enum { TARRY_CHECK_MOST = 40 }; /* rows of one list */

typedef struct tarry_page {
    const tarry_model *model;
    const tarry_network *network;
    tarry_text *text;
    tarry_sheet sheet;
} tarry_page;

/* "Species (7)" on a line of its own, after an empty one. `n` < 0: without a number. */
void tarry_page_head(tarry_page *page, const char *title, long long n);

/* Write out the sheet, and where there are more than `shown` of `all` say so. */
void tarry_page_list(tarry_page *page, size_t shown, size_t all, const char *what);

/* Reactions with their rates, and what happens at the end of each lag. */
void tarry_page_reactions(tarry_page *page);
void tarry_page_completions(tarry_page *page);

/* Delays with kind, parameters, mean and sd. */
void tarry_page_delays(tarry_page *page);

/* Distances from the steady means; those that are large go into the notes. */
int tarry_page_distances(tarry_page *page, tarry_notes *notes, tarry_error *error);

/* Parameters that differ from cell to cell. */
int tarry_page_varied(tarry_page *page, tarry_error *error);

#endif
