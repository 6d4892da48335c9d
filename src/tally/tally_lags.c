/* SPDX-License-Identifier: GPL-3.0-or-later */

/* How long the lags were that were drawn: lags.csv, one row for each delayed step and bin that any
 * fell into, with the share that the law asked for gives the bin.
 *
 * The bins are those of the record (engine/record.h), eight to a doubling; lags that began between
 * time 0 and `until` count. Steps are pooled as in transit.csv. Formulas: docs/statistics.md, "In
 * transit". */
#include "base/error.h"
#include "base/memory.h"
#include "base/table.h"
#include "tally/kinds.h"
#include "tally/pooled_lags.h"
#include "tally/results.h"

#include <math.h>

/* All of it is in blocks. */
static size_t lags_size(const tarry_network *network) {
    (void)network;
    return 0;
}

static size_t lags_n_blocks(const tarry_network *network) {
    const size_t n = network->n_lags <= TARRY_MOST_LAGS_WITH_BINS ? network->n_lags : 0;
    return n * tarry_blocks_for(TARRY_LAG_BINS);
}

static int lags_add(const tarry_network *network, const tarry_record *record, double *sums,
                    tarry_blocks *blocks, double *scratch) {
    (void)sums;
    (void)scratch;
    const size_t n = record->lag_bins ? (size_t)network->n_lags * TARRY_LAG_BINS : 0;
    for (size_t i = 0; i < n; i++) {
        if (record->lag_bins[i] == 0)
            continue;
        double *sum = tarry_blocks_at(blocks, i);
        if (!sum)
            return 1;
        *sum += (double)record->lag_bins[i];
    }
    return 0;
}

/* The law of a lag where it is one and the same from 0 to `until` and in all cells, or NULL. */
static const tarry_law *only_law(const tarry_network *network, uint32_t lag) {
    const tarry_law *law = NULL;
    if (network->lags[lag].in_order || network->variation)
        return NULL;
    for (uint32_t s = 0; s < network->n_segments; s++) {
        const bool over = s + 1 < network->n_segments && network->segments[s + 1].start <= 0;
        if (over || network->segments[s].start >= network->run.until)
            continue;
        const tarry_law *here = &network->segments[s].laws[network->lags[lag].delay];
        if (law && !tarry_law_same(law, here))
            return NULL;
        law = here;
    }
    return law;
}

/* The chance of a lag in [from, to): single values at `from` belong to it. */
static double law_share(const tarry_law *law, double from, double to) {
    if (!law)
        return NAN;
    const double before = from > 0 ? nextafter(from, 0) : -1;
    const double below = before < 0 ? 0 : tarry_law_cdf(law, before);
    if (below > 0.5)
        return tarry_law_survival(law, before) - tarry_law_survival(law, nextafter(to, 0));
    return tarry_law_cdf(law, nextafter(to, 0)) - below;
}

/* One bin of a lag and of those like it, summed. */
static double pooled(const tarry_network *network, const tarry_blocks *blocks, uint32_t lag,
                     uint32_t bin) {
    double sum = 0;
    for (uint32_t i = lag; i < network->n_lags; i = tarry_next_like_lag(network, lag, i))
        sum += tarry_blocks_get(blocks, (size_t)i * TARRY_LAG_BINS + bin);
    return sum;
}

/* Of each group: lags drawn, in one bin or in all. */
typedef struct group_counts {
    double bin[TARRY_GROUPS], all[TARRY_GROUPS];
} group_counts;

static double count_all(const tarry_network *network, const tarry_tally_set *set,
                        const tarry_tally_kind *kind, uint32_t lag, group_counts *counts) {
    double all = 0;
    for (size_t g = 0; g < tarry_tally_n_groups(set); g++) {
        const tarry_blocks *blocks = tarry_tally_group_blocks(set, kind, g);
        counts->all[g] = 0;
        for (uint32_t bin = 0; bin < TARRY_LAG_BINS; bin++)
            counts->all[g] += pooled(network, blocks, lag, bin);
        all += counts->all[g];
    }
    return all;
}

static int report_lag(const tarry_network *network, const tarry_tally_set *set,
                      const tarry_tally_kind *kind, uint32_t lag, tarry_table *table,
                      tarry_error *error) {
    group_counts counts;
    const tarry_blocks *blocks = tarry_tally_blocks(set, kind);
    const tarry_law *law = only_law(network, lag);
    if (count_all(network, set, kind, lag, &counts) <= 0)
        return TARRY_OK;
    int code = TARRY_OK;
    for (uint32_t bin = 0; !code && bin < TARRY_LAG_BINS; bin++) {
        const double drawn = pooled(network, blocks, lag, bin);
        if (drawn <= 0)
            continue;
        for (size_t g = 0; g < tarry_tally_n_groups(set); g++)
            counts.bin[g] = pooled(network, tarry_tally_group_blocks(set, kind, g), lag, bin);
        const tarry_estimate share = tarry_jackknife_share(tarry_tally_jackknife(set), counts.bin,
                                                           counts.all, tarry_tally_cells(set));
        const double from = tarry_lag_bin_start(bin);
        const double to = tarry_lag_bin_start(bin + 1);
        code = tarry_table_add(table, error, network->lags[lag].name, network->lags[lag].delay_name,
                               from, to, drawn, share.value, share.low, share.high,
                               law_share(law, from, to));
    }
    return code;
}

static int lags_report(const tarry_network *network, const tarry_tally_set *set,
                       const tarry_tally_kind *kind, tarry_results *results, tarry_error *error) {
    int code = TARRY_OK;
    if (tarry_tally_cells(set) <= 0 || network->n_lags > TARRY_MOST_LAGS_WITH_BINS)
        return TARRY_OK;
    for (uint32_t i = 0; !code && i < network->n_lags; i++)
        if (!tarry_is_like_earlier_lag(network, i))
            code = report_lag(network, set, kind, i, results->tables[TARRY_TABLE_lags], error);
    return code;
}

const tarry_tally_kind tarry_tally_lags = {
    .name = "lags",
    .size = lags_size,
    .n_blocks = lags_n_blocks,
    .add_blocks = lags_add,
    .report = lags_report,
};
