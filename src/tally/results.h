/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_TALLY_RESULTS_H
#define TARRY_TALLY_RESULTS_H

#include <stdbool.h>
#include "base/notes.h"
#include "base/table.h"
#include "tarry/results.h"

struct tarry_results {
    tarry_table *tables[TARRY_N_RESULT_TABLES];
    tarry_table *cells;   /* may be NULL */
    tarry_table *traces;  /* may be NULL */
    tarry_table *periods; /* may be NULL */
    tarry_notes notes;
    int64_t n_cells;
    int64_t n_cells_asked;
    double firings;
    double completions;
    bool is_predicted;
    bool is_measured;
};

/* Empty tables. */
int tarry_results_new(tarry_results **results, tarry_error *error);

#endif
