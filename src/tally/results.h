/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_TALLY_RESULTS_H
#define TARRY_TALLY_RESULTS_H

#include <stdbool.h>
#include "base/notes.h"
#include "base/table.h"
#include "tally/ledger.h"
#include "tarry/results.h"

struct tarry_results {
    tarry_table *tables[TARRY_N_RESULT_TABLES];
    tarry_table *cells;   /* may be NULL */
    tarry_table *data;    /* may be NULL */
    tarry_table *traces;  /* may be NULL */
    tarry_table *periods; /* may be NULL */
    tarry_notes notes;
    int64_t n_cells;
    int64_t n_cells_asked;
    double firings;
    double completions;
    bool is_predicted;
    bool is_measured;
    tarry_ledger *ledger; /* kept while a run is compared with exact laws, else NULL */
    tarry_results *exact; /* may be NULL */
    tarry_self_check self_check;
};

/* Empty tables. */
int tarry_results_new(tarry_results **results, tarry_error *error);

/* The last row of a table holds this estimate in this column: for the ledger, if one is kept. */
int tarry_results_keep(tarry_results *results, tarry_ledger_column column,
                       const tarry_estimate *estimate, tarry_error *error);

#endif
