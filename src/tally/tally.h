/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_TALLY_TALLY_H
#define TARRY_TALLY_TALLY_H

/* Estimators as sums. A tally kind declares how many sums it needs, how one cell's record is added
 * to them and how figures follow from them. Everything else (zeroing, groups, memory, totals,
 * jackknife) is done once, here.
 *
 * Cells belong to group (cell mod 64). Error bars are 95 % by the delete-a-group jackknife (see
 * tally/jackknife.h): figures are worked out from all sums, and from all sums less those of each
 * group in turn. A kind gets them in one of two ways:
 *   - it has `figures`: tarry_tally_set_finish() works out figures and replicates of all kinds on
 *     all threads, and `report` asks for tarry_tally_estimate(). For figures that need much work.
 *   - it has none, and `report` looks at the groups' sums (tarry_tally_group_sums) and makes each
 *     estimate on the spot (tarry_jackknife_estimate, tarry_jackknife_share). For plain figures in
 *     great numbers: replicates of all of them at once would take 65 doubles each. */

#include <stdbool.h>
#include "engine/record.h"
#include "model/network.h"
#include "tally/blocks.h"
#include "tally/jackknife.h"
#include "tarry/error.h"

enum { TARRY_GROUPS = 64 };

typedef struct tarry_results tarry_results;
typedef struct tarry_tally_set tarry_tally_set;
typedef struct tarry_tally_kind tarry_tally_kind;

/* Functions that may be NULL say so. A kind holds nothing else: no state, no network. */
struct tarry_tally_kind {
    const char *name;

    /* Sums (doubles) that one group needs, `form` included. */
    size_t (*size)(const tarry_network *network);

    /* How many of them, from the first on, are form and not sums: a shift about which the others
     * are taken, the width of bins. Form is never added or subtracted. NULL: none. */
    size_t (*form)(const tarry_network *network);

    /* Blocks that one group may need, for sums of which most stay 0 (tally/blocks.h). NULL: none.
     */
    size_t (*n_blocks)(const tarry_network *network);

    /* Doubles of scratch that one thread needs in `add`. NULL: none. */
    size_t (*scratch)(const tarry_network *network);

    /* Add one cell. Sums and form start at zero. */
    void (*add)(const tarry_network *network, const tarry_record *record, double *sums,
                double *scratch);

    /* The same in the place of `add` for a kind with `n_blocks`; returns 0, or 1 when memory is
     * short. */
    int (*add_blocks)(const tarry_network *network, const tarry_record *record, double *sums,
                      tarry_blocks *blocks, double *scratch);

    /* Bring two groups' sums to one form before they are added or subtracted; both may change.
     * `one` is the total so far and keeps its form where that can hold both; a total of all groups
     * is not changed by aligning one of them with it again. NULL where there is no form. */
    void (*align)(const tarry_network *network, double *one, double *other);

    /* Figures worked out from sums: how many, and their values in the same order for any sums (NaN
     * where undefined). NULL: see above. */
    size_t (*n_figures)(const tarry_network *network);
    int (*figures)(const tarry_network *network, const double *sums, double *figures,
                   tarry_error *error);

    /* Put what was found into tables. */
    int (*report)(const tarry_network *network, const tarry_tally_set *set,
                  const tarry_tally_kind *kind, tarry_results *results, tarry_error *error);
};

/* Every estimator of a run, in the order in which their tables are filled (tally/kinds.h). */
extern const tarry_tally_kind *const tarry_tally_kinds[];
extern const size_t tarry_n_tally_kinds;

/* All sums of all kinds in all groups. Groups that hold no cell take no memory. */
int tarry_tally_set_new(const tarry_network *network, tarry_tally_set **set, tarry_error *error);
/* The same for kinds of the caller's choice (at least 1, borrowed). */
int tarry_tally_set_new_of(const tarry_network *network, const tarry_tally_kind *const *kinds,
                           size_t n_kinds, tarry_tally_set **set, tarry_error *error);
void tarry_tally_set_free(tarry_tally_set *set);

/* Add a record to its group. Within a group cells must come in order; different groups may be added
 * to at the same time by different threads, each with scratch of its own. After TARRY_MEMORY the
 * set can only be freed. */
int tarry_tally_set_add(tarry_tally_set *set, const tarry_record *record, double *scratch,
                        tarry_error *error);
/* The same to a group of the caller's choice, 0 <= group < TARRY_GROUPS. */
int tarry_tally_set_add_to(tarry_tally_set *set, const tarry_record *record, size_t group,
                           double *scratch, tarry_error *error);
size_t tarry_tally_set_scratch(const tarry_network *network); /* doubles */

/* Bytes that a full set will take with its total and its replicates, one block in 16 counted as in
 * use (counts of one name crowd into few). */
double tarry_tally_set_bytes(const tarry_network *network);
double tarry_tally_set_bytes_of(const tarry_network *network, const tarry_tally_kind *const *kinds,
                                size_t n_kinds);

/* Once all cells are in: total the groups and work out the figures of every kind that has them with
 * their jackknife replicates; then tarry_tally_set_report fills the tables. Nothing can be added
 * after finish. The same bytes for any number of threads. */
int tarry_tally_set_finish(tarry_tally_set *set, int n_threads, tarry_error *error);
int tarry_tally_set_report(const tarry_tally_set *set, tarry_results *results, tarry_error *error);

/* For `report`: over all cells, sums (NULL before the first cell), blocks, number of cells. */
const double *tarry_tally_sums(const tarry_tally_set *set, const tarry_tally_kind *kind);
const tarry_blocks *tarry_tally_blocks(const tarry_tally_set *set, const tarry_tally_kind *kind);
double tarry_tally_cells(const tarry_tally_set *set);

/* The same of one group, 0 <= group < tarry_tally_n_groups(): only those that hold cells are
 * counted, in ascending order, and their sums have the form of the total. */
size_t tarry_tally_n_groups(const tarry_tally_set *set);
const double *tarry_tally_group_sums(const tarry_tally_set *set, const tarry_tally_kind *kind,
                                     size_t group);
const tarry_blocks *tarry_tally_group_blocks(const tarry_tally_set *set,
                                             const tarry_tally_kind *kind, size_t group);
double tarry_tally_group_cells(const tarry_tally_set *set, size_t group);

/* For tarry_jackknife_estimate(): one replicate for each of the groups above. */
const tarry_jackknife *tarry_tally_jackknife(const tarry_tally_set *set);

/* Figure i with its interval, for kinds that have figures. */
tarry_estimate tarry_tally_estimate(const tarry_tally_set *set, const tarry_tally_kind *kind,
                                    size_t figure, tarry_scale scale);

#endif
