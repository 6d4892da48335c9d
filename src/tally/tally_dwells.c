/* How long active and inactive periods last: dwells.csv, survival curves by Kaplan & Meier (1958,
 * J. Am. Stat. Assoc. 53:457).
 *
 * Periods that start in the window count, on a grid of fixed bins (tally/dwells.h), so that memory
 * does not grow with cells. In each bin the number that ended and the number cut off are kept. At
 * the end of a bin, S = product of (1 - ended / at risk), at risk being all that lasted beyond the
 * bin's start: with nothing cut off this is exactly the share that lasts longer. One cut off counts
 * as at risk through its bin, which the product limit also does at ties. Rows stand at the ends of
 * bins in which some period ended. Formulas: docs/statistics.md, "Dwell times". */
#include "base/error.h"
#include "base/memory.h"
#include "base/table.h"
#include "tally/dwells.h"
#include "tally/kinds.h"
#include "tally/periods.h"
#include "tally/results.h"

#include <stdlib.h>

enum { ACTIVE, INACTIVE, N_PERIODS };
enum { ENDED, CUT_OFF, N_FATES };

static const char *const period_names[N_PERIODS] = {"active", "inactive"};

/* Bins of one fate, rounded up to whole blocks. */
enum { ROOM = (TARRY_DWELL_BINS + TARRY_BLOCK - 1) / TARRY_BLOCK * TARRY_BLOCK };

/* All of it is in blocks. */
static size_t dwells_size(const tarry_network *network) {
    (void)network;
    return 0;
}

static size_t dwells_n_blocks(const tarry_network *network) {
    return tarry_recorded_genes(network, NULL) * network->run.n_windows * N_PERIODS * N_FATES *
           (ROOM / TARRY_BLOCK);
}

static size_t dwells_scratch(const tarry_network *network) {
    return network->n_genes + tarry_periods_scratch(network);
}

/* No period is longer than a cell that runs on. */
static double longest_of(const tarry_network *network) {
    return 2.0 * network->run.until;
}

/* First bin of those that ended; those cut off follow it. */
static size_t first_bin(const tarry_network *network, size_t slot, uint32_t window, int period) {
    return ((slot * network->run.n_windows + window) * N_PERIODS + (size_t)period) * N_FATES * ROOM;
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
    const size_t bin = tarry_dwell_bin(period->end - period->start, longest_of(network)) +
                       (period->cut_off ? ROOM : 0);
    for (uint32_t w = 0; w < network->run.n_windows; w++) {
        if (!tarry_window_holds(&network->run.windows[w], period->start))
            continue;
        double *sum = tarry_blocks_at(adding->blocks,
                                      first_bin(network, (size_t)slot, w, which) + bin);
        if (!sum) {
            adding->failed = 1;
            return;
        }
        *sum += 1.0;
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

/* The curve of all cells and of all but each group, walked side by side. */
typedef struct curve_walk {
    const tarry_tally_set *set;
    const tarry_tally_kind *kind;
    size_t first;
    size_t n_groups;
    double at_risk, survival;
    double left_at_risk[TARRY_GROUPS], left_survival[TARRY_GROUPS];
} curve_walk;

static double all_of(const tarry_blocks *blocks, size_t first) {
    double n = 0.0;
    for (size_t i = 0; i < (size_t)N_FATES * ROOM; i++)
        n += tarry_blocks_get(blocks, first + i);
    return n;
}

static void walk_begin(curve_walk *walk) {
    walk->n_groups = tarry_tally_n_groups(walk->set);
    walk->at_risk = all_of(tarry_tally_blocks(walk->set, walk->kind), walk->first);
    walk->survival = 1.0;
    for (size_t g = 0; g < walk->n_groups; g++) {
        const tarry_blocks *group = tarry_tally_group_blocks(walk->set, walk->kind, g);
        walk->left_at_risk[g] = walk->at_risk - all_of(group, walk->first);
        walk->left_survival[g] = 1.0;
    }
}

/* The product limit over one bin. */
static void pass(double ended, double cut_off, double *at_risk, double *survival) {
    if (ended > 0.0)
        *survival *= (*at_risk - ended) / *at_risk;
    *at_risk -= ended + cut_off;
}

/* Returns how many periods ended in the bin. */
static double walk_bin(curve_walk *walk, size_t bin) {
    const tarry_blocks *total = tarry_tally_blocks(walk->set, walk->kind);
    const double ended = tarry_blocks_get(total, walk->first + bin);
    const double cut_off = tarry_blocks_get(total, walk->first + ROOM + bin);
    if (ended <= 0.0 && cut_off <= 0.0)
        return 0.0;
    pass(ended, cut_off, &walk->at_risk, &walk->survival);
    for (size_t g = 0; g < walk->n_groups; g++) {
        const tarry_blocks *group = tarry_tally_group_blocks(walk->set, walk->kind, g);
        pass(ended - tarry_blocks_get(group, walk->first + bin),
             cut_off - tarry_blocks_get(group, walk->first + ROOM + bin), &walk->left_at_risk[g],
             &walk->left_survival[g]);
    }
    return ended;
}

static int report_curve(const tarry_network *network, curve_walk *walk, const char *gene,
                        const char *window, const char *period, tarry_table *table,
                        tarry_error *error) {
    walk_begin(walk);
    if (walk->at_risk <= 0.0)
        return TARRY_OK;
    int code = tarry_table_add(table, error, gene, window, period, 0.0, 1.0, 1.0, 1.0);
    for (size_t bin = 0; !code && bin < TARRY_DWELL_BINS; bin++) {
        if (walk_bin(walk, bin) <= 0.0)
            continue;
        const tarry_estimate estimate = tarry_jackknife_estimate(
            tarry_tally_jackknife(walk->set), walk->survival, walk->left_survival,
            TARRY_SCALE_LOGLOG);
        code = tarry_table_add(table, error, gene, window, period,
                               tarry_dwell_bin_end((uint32_t)bin, longest_of(network)),
                               estimate.value, estimate.low, estimate.high);
    }
    return code;
}

static int report_gene(const tarry_network *network, const tarry_tally_set *set,
                       const tarry_tally_kind *kind, uint32_t gene, size_t slot, tarry_table *table,
                       tarry_error *error) {
    int code = TARRY_OK;
    for (uint32_t w = 0; !code && w < network->run.n_windows; w++) {
        for (int period = 0; !code && period < N_PERIODS; period++) {
            curve_walk walk = {.set = set, .kind = kind};
            walk.first = first_bin(network, slot, w, period);
            code = report_curve(network, &walk, network->genes[gene].name,
                                network->run.windows[w].name, period_names[period], table, error);
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
            code = report_gene(network, set, kind, g, (size_t)slots[g],
                               results->tables[TARRY_TABLE_dwells], error);
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
