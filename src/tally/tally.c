/* SPDX-License-Identifier: GPL-3.0-or-later */

/* The set of all sums: groups made when their first cell comes, totals, replicates.
 *
 * A group keeps the sums of all kinds in one array, kind after kind, and the blocks of each kind.
 * Figures and their replicates are independent tasks, each of which reads the sums of the total and
 * of one group and writes a row of its own, so that threads change nothing: no sum is ever split
 * among them. */
#include "tally/tally.h"

#include "base/error.h"
#include "base/memory.h"
#include "base/threads.h"
#include "tally/results.h"

#include <assert.h>
#include <math.h>
#include <pthread.h>
#include <stdlib.h>
#include <string.h>

typedef struct tally_group {
    double *sums;         /* of all kinds; NULL while there is no cell */
    tarry_blocks *blocks; /* [kind] */
    double n_cells;
    int64_t last_cell;
} tally_group;

/* What is kept of one kind. */
typedef struct tally_part {
    const tarry_tally_kind *kind;
    size_t offset, size, form; /* of its sums */
    size_t n_blocks;
    size_t n_figures;
    double *figures; /* [1 + group][figure]: from all sums, then the replicates */
} tally_part;

struct tarry_tally_set {
    const tarry_network *network;
    size_t n_kinds;
    tally_part *parts;
    size_t n_sums; /* of all kinds */
    tally_group groups[TARRY_GROUPS];
    tally_group total;
    const tally_group *filled[TARRY_GROUPS]; /* groups that hold cells, set by finish */
    size_t n_filled;
    tarry_jackknife jackknife;
};

/* ---- making and freeing ---------------------------------------------------------------------- */

static size_t ask(size_t (*size)(const tarry_network *), const tarry_network *network) {
    return size ? size(network) : 0;
}

static tally_part part_of(const tarry_tally_kind *kind, const tarry_network *network) {
    return (tally_part){
        .kind = kind,
        .size = kind->size(network),
        .form = ask(kind->form, network),
        .n_blocks = ask(kind->n_blocks, network),
        .n_figures = ask(kind->n_figures, network),
    };
}

int tarry_tally_set_new_of(const tarry_network *network, const tarry_tally_kind *const *kinds,
                           size_t n_kinds, tarry_tally_set **out, tarry_error *error) {
    *out = NULL;
    tarry_tally_set *set = tarry_calloc(1, sizeof *set);
    tally_part *parts = tarry_calloc(n_kinds, sizeof *parts);
    if (!set || !parts) {
        free(set);
        free(parts);
        return tarry_fail_memory(error, "the estimators' sums");
    }
    for (size_t k = 0; k < n_kinds; k++) {
        parts[k] = part_of(kinds[k], network);
        parts[k].offset = set->n_sums;
        set->n_sums += parts[k].size;
    }
    set->network = network;
    set->parts = parts;
    set->n_kinds = n_kinds;
    set->jackknife = tarry_jackknife_of(0);
    *out = set;
    return TARRY_OK;
}

int tarry_tally_set_new(const tarry_network *network, tarry_tally_set **set, tarry_error *error) {
    return tarry_tally_set_new_of(network, tarry_tally_kinds, tarry_n_tally_kinds, set, error);
}

static void group_release(tally_group *group, size_t n_kinds) {
    for (size_t k = 0; group->blocks && k < n_kinds; k++)
        tarry_blocks_release(&group->blocks[k]);
    free(group->blocks);
    free(group->sums);
    *group = (tally_group){0};
}

/* Zeroed sums and no blocks taken. Returns 0, or 1 when memory is short: then half of it is there,
 * to be released with the set. */
static int group_init(tally_group *group, const tarry_tally_set *set) {
    group->sums = tarry_calloc(set->n_sums + 1, sizeof *group->sums);
    group->blocks = tarry_calloc(set->n_kinds, sizeof *group->blocks);
    int failed = !group->sums || !group->blocks;
    for (size_t k = 0; !failed && k < set->n_kinds; k++)
        failed = tarry_blocks_init(&group->blocks[k], set->parts[k].n_blocks);
    return failed;
}

void tarry_tally_set_free(tarry_tally_set *set) {
    if (!set)
        return;
    for (size_t g = 0; g < TARRY_GROUPS; g++)
        group_release(&set->groups[g], set->n_kinds);
    group_release(&set->total, set->n_kinds);
    for (size_t k = 0; k < set->n_kinds; k++)
        free(set->parts[k].figures);
    free(set->parts);
    free(set);
}

size_t tarry_tally_set_scratch(const tarry_network *network) {
    size_t most = 0;
    for (size_t k = 0; k < tarry_n_tally_kinds; k++) {
        const size_t n = ask(tarry_tally_kinds[k]->scratch, network);
        most = n > most ? n : most;
    }
    return most;
}

double tarry_tally_set_bytes(const tarry_network *network) {
    return tarry_tally_set_bytes_of(network, tarry_tally_kinds, tarry_n_tally_kinds);
}

double tarry_tally_set_bytes_of(const tarry_network *network, const tarry_tally_kind *const *kinds,
                                size_t n_kinds) {
    const int64_t cells = network->run.cells;
    const double n_groups = cells < TARRY_GROUPS ? (double)cells : TARRY_GROUPS;
    double bytes = 0.0;
    for (size_t k = 0; k < n_kinds; k++) {
        const tally_part part = part_of(kinds[k], network);
        const double n_blocks = (double)part.n_blocks;
        const double sums = (double)part.size * sizeof(double) + n_blocks * sizeof(double *) +
                            n_blocks / 16.0 * TARRY_BLOCK * sizeof(double);
        bytes += (n_groups + 2.0) * sums; /* and the total, and what remains without a group */
        bytes += (n_groups + 1.0) * (double)part.n_figures * sizeof(double);
    }
    return bytes;
}

/* ---- adding ---------------------------------------------------------------------------------- */

int tarry_tally_set_add(tarry_tally_set *set, const tarry_record *record, double *scratch,
                        tarry_error *error) {
    return tarry_tally_set_add_to(set, record, (size_t)(record->cell % TARRY_GROUPS), scratch,
                                  error);
}

int tarry_tally_set_add_to(tarry_tally_set *set, const tarry_record *record, size_t index,
                           double *scratch, tarry_error *error) {
    tally_group *group = &set->groups[index];
    int failed = group->sums ? 0 : group_init(group, set);
    assert(failed || group->n_cells <= 0.0 || record->cell > group->last_cell);
    for (size_t k = 0; !failed && k < set->n_kinds; k++) {
        const tally_part *part = &set->parts[k];
        double *sums = group->sums + part->offset;
        if (part->kind->add_blocks)
            failed = part->kind->add_blocks(set->network, record, sums, &group->blocks[k], scratch);
        else
            part->kind->add(set->network, record, sums, scratch);
    }
    if (failed)
        return tarry_fail_memory(error, "the estimators' sums");
    group->n_cells += 1.0;
    group->last_cell = record->cell;
    return TARRY_OK;
}

/* ---- totals ---------------------------------------------------------------------------------- */

static void align(const tarry_tally_set *set, const tally_part *part, tally_group *total,
                  tally_group *group) {
    if (part->kind->align)
        part->kind->align(set->network, total->sums + part->offset, group->sums + part->offset);
}

/* Bring a group to the total's form and add it; the first one gives its form. */
static int total_add(tarry_tally_set *set, tally_group *group, bool first) {
    tally_group *total = &set->total;
    if (first)
        memcpy(total->sums, group->sums, set->n_sums * sizeof *total->sums);
    for (size_t k = 0; k < set->n_kinds; k++) {
        const tally_part *part = &set->parts[k];
        if (!first) {
            align(set, part, total, group);
            double *to = total->sums + part->offset;
            const double *from = group->sums + part->offset;
            for (size_t i = part->form; i < part->size; i++)
                to[i] += from[i];
        }
        if (tarry_blocks_merge(&total->blocks[k], &group->blocks[k]))
            return 1;
    }
    total->n_cells += group->n_cells;
    return 0;
}

/* The total in ascending order of groups; then every group in the form that the total ended with.
 */
static int total_up(tarry_tally_set *set) {
    for (size_t g = 0; g < TARRY_GROUPS; g++) {
        tally_group *group = &set->groups[g];
        if (!group->sums)
            continue;
        if (set->n_filled == 0 && group_init(&set->total, set))
            return 1;
        if (total_add(set, group, set->n_filled == 0))
            return 1;
        set->filled[set->n_filled++] = group;
    }
    for (size_t g = 0; g < TARRY_GROUPS; g++)
        for (size_t k = 0; set->groups[g].sums && k < set->n_kinds; k++)
            align(set, &set->parts[k], &set->total, &set->groups[g]);
    return 0;
}

/* ---- figures and replicates ------------------------------------------------------------------ */

/* The figures of one kind from all sums (row 0) or without filled group row - 1. `rest` is this
 * thread's room for what remains. */
static int work_out(const tarry_tally_set *set, const tally_part *part, size_t row, double *rest,
                    tarry_error *error) {
    const double *sums = set->total.sums + part->offset;
    if (row > 0) {
        const double *without = set->filled[row - 1]->sums + part->offset;
        for (size_t i = 0; i < part->size; i++)
            rest[i] = i < part->form ? sums[i] : sums[i] - without[i];
        sums = rest;
    }
    return part->kind->figures(set->network, sums, part->figures + row * part->n_figures, error);
}

/* Room for the figures of all kinds; returns the most sums that a kind with figures has. */
static size_t figures_init(tarry_tally_set *set, bool *failed) {
    size_t most = 0;
    for (size_t k = 0; k < set->n_kinds; k++) {
        tally_part *part = &set->parts[k];
        if (!part->n_figures)
            continue;
        part->figures = tarry_calloc((set->n_filled + 1) * part->n_figures, sizeof(double));
        *failed |= !part->figures;
        most = part->size > most ? part->size : most;
    }
    return most;
}

/* Tasks that threads take one after another: row r of kind k is task k * n_rows + r. */
typedef struct tally_tasks {
    const tarry_tally_set *set;
    size_t n_rows, n;
    size_t n_sums; /* the most of a kind with figures */
    pthread_mutex_t lock;
    size_t next;        /* under the lock, as all below */
    size_t failed;      /* the first task that failed, whichever thread met it */
    int code;           /* its error, or 0 */
    tarry_error *error; /* may be NULL */
} tally_tasks;

/* The number of the next task; n where there is none. */
static size_t task_take(tally_tasks *tasks) {
    pthread_mutex_lock(&tasks->lock);
    const size_t task = tasks->next < tasks->n ? tasks->next++ : tasks->n;
    pthread_mutex_unlock(&tasks->lock);
    return task;
}

static void task_fail(tally_tasks *tasks, size_t task, int code, const tarry_error *error) {
    pthread_mutex_lock(&tasks->lock);
    if (!tasks->code || task < tasks->failed) {
        tasks->failed = task;
        tasks->code = code;
        if (tasks->error)
            *tasks->error = *error;
    }
    pthread_mutex_unlock(&tasks->lock);
}

static void tasks_do(void *context, int index) {
    tally_tasks *tasks = context;
    double *rest = tarry_calloc(tasks->n_sums + 1, sizeof *rest);
    size_t task;
    (void)index;
    while ((task = task_take(tasks)) < tasks->n) {
        const tally_part *part = &tasks->set->parts[task / tasks->n_rows];
        tarry_error error = {0};
        int code = TARRY_OK;
        if (!rest)
            code = tarry_fail_memory(&error, "the figures' replicates");
        else if (part->n_figures)
            code = work_out(tasks->set, part, task % tasks->n_rows, rest, &error);
        if (code)
            task_fail(tasks, task, code, &error);
    }
    free(rest);
}

static int figures_work_out(tarry_tally_set *set, int n_threads, tarry_error *error) {
    bool failed = false;
    const size_t most = figures_init(set, &failed);
    const size_t n_rows = set->n_filled + 1;
    tally_tasks tasks = {.set = set, .n_rows = n_rows, .n = n_rows * set->n_kinds};
    if (failed || pthread_mutex_init(&tasks.lock, NULL))
        return tarry_fail_memory(error, "the figures' replicates");
    tasks.n_sums = most;
    tasks.error = error;
    tarry_threads_run(n_threads, tasks_do, &tasks);
    pthread_mutex_destroy(&tasks.lock);
    return tasks.code;
}

int tarry_tally_set_finish(tarry_tally_set *set, int n_threads, tarry_error *error) {
    if (total_up(set))
        return tarry_fail_memory(error, "the total of the estimators' sums");
    set->jackknife = tarry_jackknife_of(set->n_filled);
    return set->n_filled ? figures_work_out(set, n_threads > 1 ? n_threads : 1, error) : TARRY_OK;
}

int tarry_tally_set_report(const tarry_tally_set *set, tarry_results *results, tarry_error *error) {
    int code = TARRY_OK;
    for (size_t k = 0; !code && set->n_filled && k < set->n_kinds; k++) {
        const tarry_tally_kind *kind = set->parts[k].kind;
        code = kind->report(set->network, set, kind, results, error);
    }
    return code;
}

/* ---- for `report` ---------------------------------------------------------------------------- */

static size_t index_of(const tarry_tally_set *set, const tarry_tally_kind *kind) {
    size_t k = 0;
    while (k < set->n_kinds && set->parts[k].kind != kind)
        k++;
    assert(k < set->n_kinds);
    return k;
}

const double *tarry_tally_sums(const tarry_tally_set *set, const tarry_tally_kind *kind) {
    return set->n_filled ? set->total.sums + set->parts[index_of(set, kind)].offset : NULL;
}

const tarry_blocks *tarry_tally_blocks(const tarry_tally_set *set, const tarry_tally_kind *kind) {
    return set->n_filled ? &set->total.blocks[index_of(set, kind)] : NULL;
}

double tarry_tally_cells(const tarry_tally_set *set) {
    return set->total.n_cells;
}

size_t tarry_tally_n_groups(const tarry_tally_set *set) {
    return set->n_filled;
}

const double *tarry_tally_group_sums(const tarry_tally_set *set, const tarry_tally_kind *kind,
                                     size_t group) {
    return set->filled[group]->sums + set->parts[index_of(set, kind)].offset;
}

const tarry_blocks *tarry_tally_group_blocks(const tarry_tally_set *set,
                                             const tarry_tally_kind *kind, size_t group) {
    return &set->filled[group]->blocks[index_of(set, kind)];
}

double tarry_tally_group_cells(const tarry_tally_set *set, size_t group) {
    return set->filled[group]->n_cells;
}

const tarry_jackknife *tarry_tally_jackknife(const tarry_tally_set *set) {
    return &set->jackknife;
}

tarry_estimate tarry_tally_estimate(const tarry_tally_set *set, const tarry_tally_kind *kind,
                                    size_t figure, tarry_scale scale) {
    const tally_part *part = &set->parts[index_of(set, kind)];
    if (!part->figures)
        return (tarry_estimate){.value = NAN, .low = NAN, .high = NAN, .se = NAN};
    double replicates[TARRY_GROUPS];
    for (size_t g = 0; g < set->n_filled; g++)
        replicates[g] = part->figures[(g + 1) * part->n_figures + figure];
    return tarry_jackknife_estimate(&set->jackknife, part->figures[figure], replicates, scale);
}
