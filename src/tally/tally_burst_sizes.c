/* SPDX-License-Identifier: GPL-3.0-or-later */

/* How many initiations a burst holds: burst_sizes.csv.
 *
 * Bursts that start in the window and have closed, alleles and cells pooled, in the bins of counts
 * (tally/bins.h); bins that no burst fell into are not listed. What was cut off is left out: its
 * size is not known. Formulas: docs/statistics.md, "Bursts". */
#include "base/error.h"
#include "base/memory.h"
#include "base/table.h"
#include "tally/bins.h"
#include "tally/kinds.h"
#include "tally/periods.h"
#include "tally/results.h"

#include <stdlib.h>

/* All of it is in blocks. */
static size_t sizes_size(const tarry_network *network) {
    (void)network;
    return 0;
}

static size_t sizes_n_blocks(const tarry_network *network) {
    return tarry_recorded_genes(network, NULL) * network->run.n_windows *
           tarry_blocks_for(TARRY_BINS);
}

static size_t sizes_scratch(const tarry_network *network) {
    return network->n_genes + tarry_periods_scratch(network);
}

static size_t first_bin(const tarry_network *network, size_t slot, uint32_t window) {
    return (slot * network->run.n_windows + window) * TARRY_BINS;
}

typedef struct add_context {
    const tarry_network *network;
    const double *slots;
    tarry_blocks *blocks;
    int failed;
} add_context;

static void add_period(const tarry_period *period, void *context) {
    add_context *adding = context;
    const tarry_run_plan *run = &adding->network->run;
    const double slot = adding->slots[period->gene];
    if (period->status != TARRY_TRACK_OPEN || !period->starts || period->cut_off || slot < 0)
        return;
    const uint32_t bin = tarry_bin_of((double)(period->count_end - period->count_start));
    for (uint32_t w = 0; w < run->n_windows; w++) {
        if (!tarry_window_holds(&run->windows[w], period->start))
            continue;
        double *sum = tarry_blocks_at(adding->blocks,
                                      first_bin(adding->network, (size_t)slot, w) + bin);
        if (!sum) {
            adding->failed = 1;
            return;
        }
        *sum += 1.0;
    }
}

static int sizes_add(const tarry_network *network, const tarry_record *record, double *sums,
                     tarry_blocks *blocks, double *scratch) {
    (void)sums;
    add_context adding = {network, scratch, blocks, 0};
    tarry_recorded_genes(network, scratch);
    tarry_periods(network, record, scratch + network->n_genes, add_period, &adding);
    return adding.failed;
}

/* Bursts of one gene and window in each group. Returns those of all. */
static double totals_of(const tarry_tally_set *set, const tarry_tally_kind *kind, size_t first,
                        double totals[TARRY_GROUPS]) {
    double all = 0.0;
    for (size_t g = 0; g < tarry_tally_n_groups(set); g++) {
        const tarry_blocks *blocks = tarry_tally_group_blocks(set, kind, g);
        totals[g] = 0.0;
        for (size_t block = first / TARRY_BLOCK; block < (first + TARRY_BINS) / TARRY_BLOCK;
             block++)
            for (size_t i = 0; blocks->block[block] && i < TARRY_BLOCK; i++)
                totals[g] += blocks->block[block][i];
        all += totals[g];
    }
    return all;
}

static int report_window(const tarry_network *network, const tarry_tally_set *set,
                         const tarry_tally_kind *kind, uint32_t gene, size_t first,
                         const tarry_window *window, tarry_results *results, tarry_error *error) {
    double totals[TARRY_GROUPS], counts[TARRY_GROUPS];
    if (totals_of(set, kind, first, totals) <= 0.0)
        return TARRY_OK;
    const tarry_blocks *blocks = tarry_tally_blocks(set, kind);
    int code = TARRY_OK;
    for (size_t bin = 0; !code && bin < TARRY_BINS; bin++) {
        if (tarry_blocks_get(blocks, first + bin) <= 0.0)
            continue;
        for (size_t g = 0; g < tarry_tally_n_groups(set); g++)
            counts[g] = tarry_blocks_get(tarry_tally_group_blocks(set, kind, g), first + bin);
        const tarry_estimate share = tarry_jackknife_share(tarry_tally_jackknife(set), counts,
                                                           totals, tarry_tally_cells(set));
        code = tarry_table_add(
            results->tables[TARRY_TABLE_burst_sizes], error, network->genes[gene].name,
            window->name, tarry_bin_start((uint32_t)bin), tarry_bin_width((uint32_t)bin),
            tarry_blocks_get(blocks, first + bin), share.value, share.low, share.high);
        if (!code)
            code = tarry_results_keep(results, TARRY_LEDGER_burst_sizes_probability, &share, error);
    }
    return code;
}

static int sizes_report(const tarry_network *network, const tarry_tally_set *set,
                        const tarry_tally_kind *kind, tarry_results *results, tarry_error *error) {
    if (tarry_tally_cells(set) <= 0.0)
        return TARRY_OK;
    double *slots = tarry_calloc(network->n_genes, sizeof *slots);
    if (!slots)
        return tarry_fail_memory(error, "burst sizes");
    tarry_recorded_genes(network, slots);
    int code = TARRY_OK;
    for (uint32_t g = 0; !code && g < network->n_genes; g++) {
        if (slots[g] < 0.0 || !network->genes[g].tells)
            continue;
        for (uint32_t w = 0; !code && w < network->run.n_windows; w++)
            code = report_window(network, set, kind, g, first_bin(network, (size_t)slots[g], w),
                                 &network->run.windows[w], results, error);
    }
    free(slots);
    return code;
}

const tarry_tally_kind tarry_tally_burst_sizes = {
    .name = "burst_sizes",
    .size = sizes_size,
    .n_blocks = sizes_n_blocks,
    .scratch = sizes_scratch,
    .add_blocks = sizes_add,
    .report = sizes_report,
};
