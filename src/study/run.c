/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Simulating: cells go out to threads, their records come back into tallies.
 *
 * Cells are handed out in increasing order. A finished record is added to its group (cell mod 64)
 * once the record 64 before it has been, so that every group takes in its cells in order whatever
 * the number of threads: sums of doubles, and with them all results, are the same in bytes. Nobody
 * can wait for ever: a cell waits only for a lower one, and the lowest that is under way waits for
 * none.
 *
 * No new cell starts once `stop` is set or a cell has failed; those started are finished. So cells
 * 0 .. n-1 always exist, and of several failures the lowest-numbered is known: everything below it
 * was started before it. */

#include "study/run.h"

#include "base/error.h"
#include "base/memory.h"
#include "base/table.h"
#include "base/text.h"
#include "base/threads.h"
#include "engine/cell.h"
#include "model/model.h"
#include "study/as_data.h"
#include "study/gather.h"
#include "study/self_check.h"
#include "study/sheet.h"
#include "study/sketch.h"
#include "tally/results.h"
#include "tally/tally.h"
#include "tarry/run.h"

#include <pthread.h>
#include <stdlib.h>
#include <string.h>

/* Counts over cells: whole numbers, so that their sum does not depend on the order. */
typedef struct totals {
    double firings, completions, ignored;
    double *skipped; /* [lag] */
} totals;

/* What one thread owns. */
typedef struct worker {
    tarry_cell *cell;
    tarry_record record;
    double *scratch;
    totals totals;
} worker;

/* What the threads share; everything below `lock` is read and changed under it. */
typedef struct job {
    const tarry_network *network;
    const tarry_run_options *options;
    tarry_engine *engine;
    tarry_tally_set *set;
    tarry_gather kept; /* frames of the first cells */
    tarry_gather data; /* what is told as data */
    tarry_sketch sketch;

    bool has_lock, has_added;
    pthread_mutex_t lock;
    pthread_cond_t added;           /* a record was added, or a cell failed */
    int64_t next;                   /* the next cell to hand out */
    int64_t n_done;                 /* cells added */
    int64_t in_group[TARRY_GROUPS]; /* cells added to each group */
    int64_t failed;                 /* the lowest cell that failed, or -1 */
    tarry_error failure;
} job;

/* ---- totals --------------------------------------------------------------------------------- */

static int totals_init(totals *t, const tarry_network *network, tarry_error *error) {
    t->skipped = tarry_calloc(network->n_lags, sizeof *t->skipped);
    return t->skipped ? 0 : tarry_fail_memory(error, "the totals of a run");
}

static void totals_count(totals *t, const tarry_record *record, const tarry_network *network) {
    for (uint32_t i = 0; i < network->n_reactions; i++)
        t->firings += (double)record->firings[i];
    for (uint32_t i = 0; i < network->n_lags; i++) {
        t->completions += (double)record->completions[i];
        t->skipped[i] += (double)record->skipped[i];
    }
    t->ignored += (double)record->ignored;
}

static void totals_add(totals *t, const totals *other, uint32_t n_lags) {
    t->firings += other->firings;
    t->completions += other->completions;
    t->ignored += other->ignored;
    for (uint32_t i = 0; i < n_lags; i++)
        t->skipped[i] += other->skipped[i];
}

/* ---- one thread ----------------------------------------------------------------------------- */

static int worker_init(worker *w, const job *j, tarry_error *error) {
    const tarry_network *network = j->network;
    int code = tarry_cell_new(j->engine, &w->cell, error);
    if (!code)
        code = tarry_record_init(&w->record, network, error);
    if (code)
        return code;
    w->scratch = tarry_calloc(tarry_tally_set_scratch(network), sizeof *w->scratch);
    if (!w->scratch)
        return tarry_fail_memory(error, "the workspace of a thread");
    return totals_init(&w->totals, network, error);
}

static void worker_release(worker *w) {
    tarry_cell_free(w->cell);
    tarry_record_release(&w->record);
    free(w->scratch);
    free(w->totals.skipped);
}

/* The next cell, or -1 when there is none to start. */
static int64_t take_cell(job *j) {
    pthread_mutex_lock(&j->lock);
    const bool stopped = j->options->stop && __atomic_load_n(j->options->stop, __ATOMIC_RELAXED);
    const bool more = !stopped && j->failed < 0 && j->next < j->network->run.cells;
    const int64_t cell = more ? j->next++ : -1;
    pthread_mutex_unlock(&j->lock);
    return cell;
}

static void note_failure(job *j, int64_t cell, const tarry_error *error) {
    pthread_mutex_lock(&j->lock);
    if (j->failed < 0 || cell < j->failed) {
        j->failed = cell;
        j->failure = *error;
    }
    pthread_cond_broadcast(&j->added);
    pthread_mutex_unlock(&j->lock);
}

/* Wait until the cell's group holds everything before it. False where that cannot come any more,
 * since a lower cell failed. */
static bool wait_for_turn(job *j, int64_t cell) {
    const int64_t before = cell / TARRY_GROUPS;
    pthread_mutex_lock(&j->lock);
    while (j->in_group[cell % TARRY_GROUPS] < before && (j->failed < 0 || j->failed > cell))
        pthread_cond_wait(&j->added, &j->lock);
    const bool turn = j->in_group[cell % TARRY_GROUPS] == before;
    pthread_mutex_unlock(&j->lock);
    return turn;
}

static void note_added(job *j, int64_t cell) {
    const tarry_run_options *options = j->options;
    pthread_mutex_lock(&j->lock);
    j->in_group[cell % TARRY_GROUPS]++;
    j->n_done++;
    if (options->progress)
        options->progress(options->progress_context, j->n_done, j->network->run.cells);
    pthread_cond_broadcast(&j->added);
    pthread_mutex_unlock(&j->lock);
}

/* The job and everybody who has a hand in it. */
typedef struct team {
    job *job;
    worker *workers;
} team;

static void work(void *context, int index) {
    const team *t = context;
    job *j = t->job;
    worker *w = &t->workers[index];
    int64_t cell;
    while ((cell = take_cell(j)) >= 0) {
        tarry_error error = {0};
        int code = tarry_cell_run(w->cell, cell, &w->record, &error);
        if (!code && wait_for_turn(j, cell)) {
            code = tarry_tally_set_add(j->set, &w->record, w->scratch, &error);
            if (!code)
                code = tarry_sketch_add(&j->sketch, &w->record, &error);
            if (!code) {
                totals_count(&w->totals, &w->record, j->network);
                tarry_gather_add(&j->kept, &w->record);
                tarry_gather_add(&j->data, &w->record);
                note_added(j, cell);
            }
        }
        if (code)
            note_failure(j, cell, &error);
    }
}

/* ---- memory --------------------------------------------------------------------------------- */

tarry_run_memory tarry_run_memory_of(const tarry_network *network, int threads, double kept) {
    tarry_run_memory memory = {0};
    memory.tallies = tarry_tally_set_bytes(network);
    memory.thread = (double)tarry_record_bytes(network) +
                    (double)tarry_tally_set_scratch(network) * sizeof(double);
    memory.threads = memory.thread * threads;
    memory.kept = kept;
    memory.all = memory.tallies + memory.threads + memory.kept;
    return memory;
}

static int check_memory(const job *j, tarry_error *error) {
    const int threads = tarry_run_threads(j->network, j->options->threads);
    const double of_cells = tarry_gather_bytes(&j->kept) + tarry_gather_bytes(&j->data);
    const tarry_run_memory memory = tarry_run_memory_of(j->network, threads,
                                                        of_cells + tarry_sketch_bytes(&j->sketch));
    const double limit = j->network->run.limit_memory;
    if (memory.all <= limit)
        return 0;
    char all[TARRY_BYTES_SIZE], tallies[TARRY_BYTES_SIZE], thread[TARRY_BYTES_SIZE];
    char kept[TARRY_BYTES_SIZE], most[TARRY_BYTES_SIZE];
    return tarry_fail(
        error, TARRY_LIMIT,
        "this run needs %s of memory (sums of the estimators %s, %d threads of %s each, kept "
        "traces %s) and the limit is %s: record fewer names (run: record), take frames less often "
        "(run: every), use fewer windows%s or raise limits: memory",
        tarry_bytes_text(memory.all, all), tarry_bytes_text(memory.tallies, tallies), threads,
        tarry_bytes_text(memory.thread, thread), tarry_bytes_text(memory.kept, kept),
        tarry_bytes_text(limit, most), of_cells > 0 ? " or kept cells" : "");
}

/* ---- the results ---------------------------------------------------------------------------- */

/* What happened in running that a reader of the figures must know. */
static int report_notes(const job *j, const totals *total, tarry_notes *notes, tarry_error *error) {
    const tarry_network *network = j->network;
    int code = 0;
    for (uint32_t i = 0; i < network->n_lags && !code; i++)
        if (total->skipped[i] > 0)
            code = tarry_notes_add(
                notes, network->lags[i].place, error,
                "%s: %.0f completions in %lld cells were skipped, since what they use was not "
                "there any more (if_short: skip)",
                network->lags[i].name, total->skipped[i], (long long)j->n_done);
    if (!code && total->ignored > 0)
        code = tarry_notes_add(notes, (tarry_place){0}, error,
                               "%.0f openings of a burst that was open, or closings of one that "
                               "was closed, were ignored (bursts:)",
                               total->ignored);
    if (!code && j->n_done < network->run.cells)
        code = tarry_notes_add(notes, (tarry_place){0}, error,
                               "interrupted: the figures rest on the first %lld of %lld cells",
                               (long long)j->n_done, (long long)network->run.cells);
    return code;
}

static int report(const job *j, const totals *total, tarry_results **results, tarry_error *error) {
    tarry_results *r = NULL;
    int code = tarry_results_new(&r, error);
    if (!code) {
        r->n_cells = j->n_done;
        r->n_cells_asked = j->network->run.cells;
        r->firings = total->firings;
        r->completions = total->completions;
        if (j->options->self_check && !(r->ledger = tarry_calloc(1, sizeof *r->ledger)))
            code = tarry_fail_memory(error, "the figures that are compared with exact laws");
    }
    if (!code) {
        code = report_notes(j, total, &r->notes, error);
    }
    if (!code)
        code = tarry_tally_set_report(j->set, r, error);
    if (!code)
        code = tarry_gather_table(&j->kept, "cells", j->n_done, false, &r->cells, error);
    if (!code)
        code = tarry_as_data_report(&j->data, j->options->as_data, j->n_done, r, error);
    if (!code)
        code = tarry_sketch_report(&j->sketch, j->n_done, r, error);
    if (!code && r->ledger)
        code = tarry_self_check_run(j->network, r, error);
    if (code)
        tarry_results_free(r);
    else
        *results = r;
    return code;
}

/* ---- the run -------------------------------------------------------------------------------- */

static bool is_recorded(const tarry_network *network, const tarry_channel *channel) {
    (void)network;
    return channel->recorded;
}

static int job_init(job *j, const tarry_network *network, const tarry_run_options *options,
                    tarry_error *error) {
    j->network = network;
    j->options = options;
    j->failed = -1;
    j->has_lock = pthread_mutex_init(&j->lock, NULL) == 0;
    j->has_added = pthread_cond_init(&j->added, NULL) == 0;
    if (!j->has_lock || !j->has_added)
        return tarry_fail_memory(error, "the lock of a run");
    const int64_t cells = network->run.cells;
    int code = tarry_sketch_init(&j->sketch, network,
                                 options->traced < cells ? options->traced : cells, options->genes,
                                 options->n_genes, error);
    if (!code)
        code = tarry_gather_init(&j->kept, network, TARRY_GATHER_FRAMES,
                                 options->keep < cells ? options->keep : cells, is_recorded, error);
    if (!code)
        code = tarry_as_data_init(&j->data, network, options->as_data, error);
    if (!code)
        code = check_memory(j, error);
    if (!code)
        code = tarry_engine_new(network, options->sampler ? options->sampler : "direct", &j->engine,
                                error);
    if (!code)
        code = tarry_tally_set_new(network, &j->set, error);
    if (!code)
        code = tarry_gather_make_room(&j->kept, error);
    return code ? code : tarry_gather_make_room(&j->data, error);
}

static void job_release(job *j) {
    tarry_gather_release(&j->kept);
    tarry_gather_release(&j->data);
    tarry_sketch_release(&j->sketch);
    tarry_tally_set_free(j->set);
    tarry_engine_free(j->engine);
    if (j->has_added)
        pthread_cond_destroy(&j->added);
    if (j->has_lock)
        pthread_mutex_destroy(&j->lock);
}

static int run_cells(job *j, worker *workers, int n, tarry_error *error) {
    for (int i = 0; i < n; i++) {
        const int code = worker_init(&workers[i], j, error);
        if (code)
            return code;
    }
    tarry_threads_run(n, work, &(team){j, workers});

    if (j->failed >= 0) {
        if (error)
            *error = j->failure;
        return (int)j->failure.code;
    }
    if (j->n_done == 0)
        return tarry_fail(error, TARRY_INTERRUPTED, "interrupted before any cell was finished");
    return 0;
}

/* All cells, then the figures. */
static int simulate(job *j, worker *workers, int n, tarry_results **results, tarry_error *error) {
    totals total = {0};
    int code = run_cells(j, workers, n, error);
    if (!code)
        code = totals_init(&total, j->network, error);
    for (int i = 0; i < n && !code; i++)
        totals_add(&total, &workers[i].totals, j->network->n_lags);
    if (!code)
        code = tarry_tally_set_finish(j->set, n, error);
    if (!code)
        code = report(j, &total, results, error);
    free(total.skipped);
    return code;
}

static int check_options(const tarry_run_options *options, tarry_error *error) {
    if (options->threads < 0)
        return tarry_fail(error, TARRY_INPUT, "threads must be 0 (all cores) or more, not %d",
                          options->threads);
    if (options->keep < 0 || options->traced < 0)
        return tarry_fail(error, TARRY_INPUT, "the number of cells kept must not be negative");
    return 0;
}

int tarry_run_threads(const tarry_network *network, int asked) {
    const int n = asked > 0 ? asked : tarry_threads_available();
    return network->run.cells < n ? (int)network->run.cells : n;
}

int tarry_run_network(const tarry_network *network, const tarry_run_options *options,
                      tarry_results **results, tarry_error *error) {
    *results = NULL;
    int code = check_options(options, error);
    if (code)
        return code;
    const int n = tarry_run_threads(network, options->threads);
    job j = {0};
    worker *workers = tarry_calloc((size_t)n, sizeof *workers);
    code = workers ? job_init(&j, network, options, error)
                   : tarry_fail_memory(error, "the workspaces of threads");
    if (!code)
        code = simulate(&j, workers, n, results, error);
    for (int i = 0; workers && i < n; i++)
        worker_release(&workers[i]);
    free(workers);
    job_release(&j);
    return code;
}

int tarry_run(const tarry_model *model, const tarry_run_options *options, tarry_results **results,
              tarry_error *error) {
    return tarry_run_network(&model->network, options, results, error);
}

int tarry_run_n_threads(const tarry_model *model, int asked) {
    return tarry_run_threads(&model->network, asked);
}
