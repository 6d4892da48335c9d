/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "tally/results.h"

#include "base/error.h"
#include "base/memory.h"

#include <stdlib.h>

static const struct {
    const char *name, *columns;
} layout[TARRY_N_RESULT_TABLES] = {
#define ENTRY(name, columns) {#name, columns},
    TARRY_RESULT_TABLES(ENTRY)
#undef ENTRY
};

int tarry_results_new(tarry_results **out, tarry_error *error) {
    tarry_results *results = tarry_calloc(1, sizeof *results);
    int failed = !results;
    for (int i = 0; !failed && i < TARRY_N_RESULT_TABLES; i++) {
        results->tables[i] = tarry_table_new(layout[i].name, layout[i].columns);
        failed = !results->tables[i];
    }
    if (failed) {
        tarry_results_free(results);
        results = NULL;
    }
    *out = results;
    return failed ? tarry_fail_memory(error, "the tables of results") : TARRY_OK;
}

static const tarry_result_table ledger_tables[TARRY_N_LEDGER_COLUMNS] = {
#define ENTRY(table, column) TARRY_TABLE_##table,
    TARRY_LEDGER_COLUMNS(ENTRY)
#undef ENTRY
};

int tarry_results_keep(tarry_results *results, tarry_ledger_column column,
                       const tarry_estimate *estimate, tarry_error *error) {
    if (!results->ledger)
        return TARRY_OK;
    const size_t n = tarry_table_n_rows(results->tables[ledger_tables[column]]);
    return tarry_ledger_keep(results->ledger, column, n - 1, estimate, error);
}

void tarry_results_free(tarry_results *results) {
    if (!results)
        return;
    for (int i = 0; i < TARRY_N_RESULT_TABLES; i++)
        tarry_table_free(results->tables[i]);
    tarry_table_free(results->cells);
    tarry_table_free(results->data);
    tarry_table_free(results->traces);
    tarry_table_free(results->periods);
    if (results->ledger)
        tarry_ledger_release(results->ledger);
    free(results->ledger);
    tarry_results_free(results->exact);
    free(results->self_check.where);
    tarry_notes_release(&results->notes);
    free(results);
}

const tarry_table *tarry_results_table(const tarry_results *results, tarry_result_table which) {
    return results->tables[which];
}

const tarry_table *tarry_results_cells(const tarry_results *results) {
    return results->cells;
}

const tarry_table *tarry_results_data(const tarry_results *results) {
    return results->data;
}

const tarry_table *tarry_results_traces(const tarry_results *results) {
    return results->traces;
}

const tarry_table *tarry_results_periods(const tarry_results *results) {
    return results->periods;
}

size_t tarry_results_n_warnings(const tarry_results *results) {
    return results->notes.n;
}

const char *tarry_results_warning(const tarry_results *results, size_t i) {
    return results->notes.lines[i];
}

int64_t tarry_results_n_cells(const tarry_results *results) {
    return results->n_cells;
}

int64_t tarry_results_n_cells_asked(const tarry_results *results) {
    return results->n_cells_asked;
}

double tarry_results_firings(const tarry_results *results) {
    return results->firings;
}

double tarry_results_completions(const tarry_results *results) {
    return results->completions;
}

const tarry_self_check *tarry_results_self_check(const tarry_results *results) {
    return &results->self_check;
}

const tarry_results *tarry_results_exact(const tarry_results *results) {
    return results->exact;
}

int tarry_results_is_predicted(const tarry_results *results) {
    return results->is_predicted;
}

int tarry_results_is_measured(const tarry_results *results) {
    return results->is_measured;
}
