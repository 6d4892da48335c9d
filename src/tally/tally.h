#ifndef TARRY_TALLY_TALLY_H
#define TARRY_TALLY_TALLY_H

/* Estimators as sums. A tally kind declares how many sums it needs, how one cell's record is added
 * to them and how figures follow from them. Everything else (zeroing, merging, groups, memory,
 * jackknife) is done once, here.
 *
 * Cells belong to group (cell mod 64). Error bars are 95 % by the delete-a-group jackknife (Efron &
 * Stein 1981, Ann. Stat. 9:586; Kott 2001, J. Off. Stat. 17:521): the figures are worked out from
 * all sums, and from all sums less those of each group in turn. */

#include <stdbool.h>
#include "engine/record.h"
#include "model/network.h"
#include "tarry/error.h"

enum { TARRY_GROUPS = 64 };

/* The scale on which an interval is symmetric. */
typedef enum tarry_scale {
    TARRY_SCALE_PLAIN,
    TARRY_SCALE_LOG,    /* positive figures */
    TARRY_SCALE_LOGIT,  /* fractions */
    TARRY_SCALE_LOGLOG, /* survival: log(-log S) */
} tarry_scale;

/* An estimate with its interval; low and high are NaN where there is none. */
typedef struct tarry_estimate {
    double value, low, high;
    double se; /* on the plain scale */
} tarry_estimate;

typedef struct tarry_results tarry_results;
typedef struct tarry_tally_set tarry_tally_set;
typedef struct tarry_tally_kind tarry_tally_kind;

struct tarry_tally_kind {
    const char *name;

    /* Sums (doubles) that one group needs. */
    size_t (*size)(const tarry_network *network);

    /* Doubles of scratch that one thread needs in `add` (may be NULL: none). */
    size_t (*scratch)(const tarry_network *network);

    /* Add one cell. Sums start at zero. */
    void (*add)(const tarry_network *network, const tarry_record *record, double *sums,
                double *scratch);

    /* Bring two groups' sums to a common form before they are added or subtracted (bins whose width
     * adapts). Both may change. NULL where sums add as they are. */
    void (*align)(const tarry_network *network, double *one, double *other);

    /* Figures worked out from sums: how many, and their values (NaN where undefined). `figures`
     * must depend on the sums only. */
    size_t (*n_figures)(const tarry_network *network, const double *sums);
    int (*figures)(const tarry_network *network, const double *sums, double *figures,
                   tarry_error *error);

    /* Put the figures into tables. `set` gives estimates: tarry_tally_estimate(). */
    int (*report)(const tarry_network *network, const tarry_tally_set *set,
                  const tarry_tally_kind *kind, tarry_results *results, tarry_error *error);
};

/* Every estimator of a run, in the order in which their tables are filled. */
extern const tarry_tally_kind *const tarry_tally_kinds[];
extern const size_t tarry_n_tally_kinds;

/* All sums of all kinds in all groups. Groups that hold no cell take no memory. */
int tarry_tally_set_new(const tarry_network *network, tarry_tally_set **set, tarry_error *error);
void tarry_tally_set_free(tarry_tally_set *set);

/* Add a record to its group. Within a group cells must come in order; different groups may be added
 * to at the same time by different threads, each with scratch of its own. */
int tarry_tally_set_add(tarry_tally_set *set, const tarry_record *record, double *scratch,
                        tarry_error *error);
size_t tarry_tally_set_scratch(const tarry_network *network); /* doubles */

/* Bytes that a full set will take. */
double tarry_tally_set_bytes(const tarry_network *network);

/* Once all cells are in: total the groups and work out the figures of every kind with their
 * jackknife replicates; then tarry_tally_set_report fills the tables. */
int tarry_tally_set_finish(tarry_tally_set *set, int n_threads, tarry_error *error);
int tarry_tally_set_report(const tarry_tally_set *set, tarry_results *results, tarry_error *error);

/* For `report`: sums over all cells, number of cells, and figure i with its interval. */
const double *tarry_tally_sums(const tarry_tally_set *set, const tarry_tally_kind *kind);
double tarry_tally_cells(const tarry_tally_set *set);
tarry_estimate tarry_tally_estimate(const tarry_tally_set *set, const tarry_tally_kind *kind,
                                    size_t figure, tarry_scale scale);

#endif
