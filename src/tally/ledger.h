/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_TALLY_LEDGER_H
#define TARRY_TALLY_LEDGER_H

/* How leaving out each group moves figures that stand in tables, for whoever asks how far many
 * figures of the same cells may be off together (study/self_check.h).
 *
 * Room is bounded: of a column with many rows every 2nd, 4th, ... is kept, evenly over them. */

#include "tally/jackknife.h"
#include "tarry/error.h"
#include "tarry/results.h"

/* Columns of tables that are kept. */
#define TARRY_LEDGER_COLUMNS(X)                                                                    \
    X(means, mean)                                                                                 \
    X(distribution, probability)                                                                   \
    X(bursts, value)                                                                               \
    X(signals, value)                                                                              \
    X(burst_sizes, probability)                                                                    \
    X(dwells, survival)                                                                            \
    X(autocorrelation, correlation)                                                                \
    X(first, survival)

typedef enum tarry_ledger_column {
#define TARRY_LEDGER_ENUM(table, column) TARRY_LEDGER_##table##_##column,
    TARRY_LEDGER_COLUMNS(TARRY_LEDGER_ENUM)
#undef TARRY_LEDGER_ENUM
        TARRY_N_LEDGER_COLUMNS
} tarry_ledger_column;

enum { TARRY_LEDGER_ROWS = 1024 }; /* kept of a column, at most */

typedef struct tarry_ledger_entry {
    size_t row; /* of the table */
    tarry_estimate estimate;
} tarry_ledger_entry;

typedef struct tarry_ledger {
    struct tarry_ledger_page {
        tarry_ledger_entry *entries; /* [TARRY_LEDGER_ROWS], or NULL before the first */
        size_t n, n_seen, step;
    } pages[TARRY_N_LEDGER_COLUMNS];
} tarry_ledger;

/* Zero-initialise ({0}); release accepts a half-built one. */
void tarry_ledger_release(tarry_ledger *ledger);

/* Keep the estimate that stands in this column of a table's row. Estimates without moves are passed
 * over. */
int tarry_ledger_keep(tarry_ledger *ledger, tarry_ledger_column column, size_t row,
                      const tarry_estimate *estimate, tarry_error *error);

#endif
