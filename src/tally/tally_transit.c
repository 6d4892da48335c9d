/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Molecules under way: transit.csv, one row for each delayed step and window.
 *
 * The sums are those of the record (engine/record.h), added over cells; a window's are those of its
 * spans. Alleles of one gene have steps of one name (a promoter state that lasts, a clearance),
 * which are pooled as bursts are. Formulas: docs/statistics.md, "In transit". */
#include "base/table.h"
#include "tally/kinds.h"
#include "tally/pooled_lags.h"
#include "tally/results.h"

#include <math.h>
#include <string.h>

enum { DRAWN, SUM, SQUARES, PENDING, LOST, N_SUMS };

/* A spread below this share of the mean cannot be told from rounding in sums of squares. */
static const double least_spread = 1e-6;

static size_t transit_size(const tarry_network *network) {
    return (size_t)network->n_lags * network->run.n_spans * N_SUMS;
}

static void transit_add(const tarry_network *network, const tarry_record *record, double *sums,
                        double *scratch) {
    (void)scratch;
    const size_t n = (size_t)network->n_lags * network->run.n_spans;
    for (size_t i = 0; i < n; i++) {
        const tarry_lag_sums *from = &record->lags[i];
        double *to = sums + i * N_SUMS;
        to[DRAWN] += from->drawn;
        to[SUM] += from->sum;
        to[SQUARES] += from->squares;
        to[PENDING] += from->pending;
        to[LOST] += from->lost;
    }
}

/* The sums of a lag and of those like it after it, over a window's spans. */
static void gather(const tarry_network *network, const double *sums, uint32_t lag,
                   const tarry_window *window, double total[N_SUMS]) {
    memset(total, 0, N_SUMS * sizeof *total);
    for (uint32_t i = lag; i < network->n_lags; i = tarry_next_like_lag(network, lag, i)) {
        for (uint32_t span = window->spans.from; span < window->spans.to; span++)
            for (int j = 0; j < N_SUMS; j++)
                total[j] += sums[((size_t)i * network->run.n_spans + span) * N_SUMS + (size_t)j];
    }
}

static double spread(const double total[N_SUMS]) {
    const double n = total[DRAWN], mean = total[SUM] / n;
    if (n < 2.0)
        return NAN;
    const double sd = sqrt(fmax((total[SQUARES] - total[SUM] * mean) / (n - 1.0), 0.0));
    return sd > least_spread * mean ? sd : 0.0;
}

static int transit_report(const tarry_network *network, const tarry_tally_set *set,
                          const tarry_tally_kind *kind, tarry_results *results,
                          tarry_error *error) {
    tarry_table *table = results->tables[TARRY_TABLE_transit];
    const double *sums = tarry_tally_sums(set, kind);
    const double cells = tarry_tally_cells(set);
    int code = TARRY_OK;
    for (uint32_t i = 0; !code && i < network->n_lags; i++) {
        if (tarry_is_like_earlier_lag(network, i))
            continue;
        for (uint32_t w = 0; !code && w < network->run.n_windows; w++) {
            const tarry_window *window = &network->run.windows[w];
            double total[N_SUMS];
            gather(network, sums, i, window, total);
            const double pending = total[PENDING] / (cells * (window->to - window->from));
            const double mean = total[DRAWN] > 0.0 ? total[SUM] / total[DRAWN] : NAN;
            code = tarry_table_add(table, error, network->lags[i].name, network->lags[i].delay_name,
                                   window->name, pending, total[DRAWN], mean, spread(total),
                                   total[LOST]);
        }
    }
    return code;
}

const tarry_tally_kind tarry_tally_transit = {
    .name = "transit",
    .size = transit_size,
    .add = transit_add,
    .report = transit_report,
};
