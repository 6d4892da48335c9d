/* SPDX-License-Identifier: GPL-3.0-or-later */

/* How long active and inactive periods last: dwells.csv, survival curves (tally/survival.h).
 *
 * Periods that start in the window count. Rows stand at the ends of bins in which some period
 * ended. Formulas: docs/statistics.md, "Dwell times". */
#include "base/error.h"
#include "base/memory.h"
#include "base/table.h"
#include "tally/kinds.h"
#include "tally/periods.h"
#include "tally/results.h"
#include "tally/survival.h"

#include <stdlib.h>

enum { ACTIVE, INACTIVE, N_PERIODS };

static const char *const period_names[N_PERIODS] = {"active", "inactive"};

/* All of it is in blocks. */
static size_t dwells_size(const tarry_network *network) {
    (void)network;
    return 0;
}

static size_t dwells_n_blocks(const tarry_network *network) {
    return tarry_recorded_genes(network, NULL) * network->run.n_windows * N_PERIODS *
           TARRY_SURVIVAL_BLOCKS;
}

static size_t dwells_scratch(const tarry_network *network) {
    return network->n_genes + tarry_periods_scratch(network);
}

/* No period is longer than a cell that runs on. */
static double longest_of(const tarry_network *network) {
    return 2.0 * network->run.until;
}

static size_t curve_of(const tarry_network *network, size_t slot, uint32_t window, int period) {
    return (slot * network->run.n_windows + window) * N_PERIODS + (size_t)period;
}

typedef struct add_context {
    const tarry_network *network;
    const double *slots;
    tarry_blocks *blocks;
    int failed;
} add_context;

static void add_period(const tarry_period *period, void *context) {
    add_context *adding = context;
    const tarry_network *network = adding->network;
    const double slot = adding->slots[period->gene];
    if (!period->starts || slot < 0.0)
        return;
    const int which = period->status == TARRY_TRACK_OPEN ? ACTIVE : INACTIVE;
    for (uint32_t w = 0; w < network->run.n_windows; w++) {
        if (!tarry_window_holds(&network->run.windows[w], period->start))
            continue;
        if (tarry_survival_add(adding->blocks, curve_of(network, (size_t)slot, w, which),
                               period->end - period->start, longest_of(network), period->cut_off)) {
            adding->failed = 1;
            return;
        }
    }
}

static int dwells_add(const tarry_network *network, const tarry_record *record, double *sums,
                      tarry_blocks *blocks, double *scratch) {
    (void)sums;
    add_context adding = {network, scratch, blocks, 0};
    tarry_recorded_genes(network, scratch);
    tarry_periods(network, record, scratch + network->n_genes, add_period, &adding);
    return adding.failed;
}

/* ---- curves ---- */

typedef struct curve_rows {
    tarry_results *results;
    const char *gene, *window, *period;
} curve_rows;

static int add_row(void *context, double time, const tarry_estimate *survival, tarry_error *error) {
    const curve_rows *rows = context;
    const int code = tarry_table_add(rows->results->tables[TARRY_TABLE_dwells], error, rows->gene,
                                     rows->window, rows->period, time, survival->value,
                                     survival->low, survival->high);
    return code ? code
                : tarry_results_keep(rows->results, TARRY_LEDGER_dwells_survival, survival, error);
}

static int report_gene(const tarry_network *network, const tarry_tally_set *set,
                       const tarry_tally_kind *kind, uint32_t gene, size_t slot,
                       tarry_results *results, tarry_error *error) {
    int code = TARRY_OK;
    for (uint32_t w = 0; !code && w < network->run.n_windows; w++) {
        for (int period = 0; !code && period < N_PERIODS; period++) {
            curve_rows rows = {results, network->genes[gene].name, network->run.windows[w].name,
                               period_names[period]};
            const tarry_survival curve = {set, kind, curve_of(network, slot, w, period),
                                          longest_of(network)};
            code = tarry_survival_rows(&curve, add_row, &rows, error);
        }
    }
    return code;
}

static int dwells_report(const tarry_network *network, const tarry_tally_set *set,
                         const tarry_tally_kind *kind, tarry_results *results, tarry_error *error) {
    if (tarry_tally_cells(set) <= 0.0)
        return TARRY_OK;
    double *slots = tarry_calloc(network->n_genes, sizeof *slots);
    if (!slots)
        return tarry_fail_memory(error, "dwell times");
    tarry_recorded_genes(network, slots);
    int code = TARRY_OK;
    for (uint32_t g = 0; !code && g < network->n_genes; g++)
        if (slots[g] >= 0.0 && network->genes[g].tells)
            code = report_gene(network, set, kind, g, (size_t)slots[g], results, error);
    free(slots);
    return code;
}

const tarry_tally_kind tarry_tally_dwells = {
    .name = "dwells",
    .size = dwells_size,
    .n_blocks = dwells_n_blocks,
    .scratch = dwells_scratch,
    .add_blocks = dwells_add,
    .report = dwells_report,
};
