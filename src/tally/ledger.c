/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "tally/ledger.h"

#include "base/error.h"
#include "base/memory.h"

#include <stdlib.h>

void tarry_ledger_release(tarry_ledger *ledger) {
    for (int i = 0; i < TARRY_N_LEDGER_COLUMNS; i++) {
        free(ledger->pages[i].entries);
        ledger->pages[i] = (struct tarry_ledger_page){0};
    }
}

/* Keep every second entry. */
static void thin(struct tarry_ledger_page *page) {
    for (size_t i = 0; 2 * i < page->n; i++)
        page->entries[i] = page->entries[2 * i];
    page->n = (page->n + 1) / 2;
    page->step *= 2;
}

int tarry_ledger_keep(tarry_ledger *ledger, tarry_ledger_column column, size_t row,
                      const tarry_estimate *estimate, tarry_error *error) {
    struct tarry_ledger_page *page = &ledger->pages[column];
    if (estimate->n_moves == 0)
        return TARRY_OK;
    if (!page->entries) {
        page->entries = tarry_calloc(TARRY_LEDGER_ROWS, sizeof *page->entries);
        page->step = 1;
    }
    if (!page->entries)
        return tarry_fail_memory(error, "the figures that are compared with exact laws");
    if (page->n_seen++ % page->step != 0)
        return TARRY_OK;
    if (page->n == TARRY_LEDGER_ROWS)
        thin(page);
    page->entries[page->n++] = (tarry_ledger_entry){row, *estimate};
    return TARRY_OK;
}
