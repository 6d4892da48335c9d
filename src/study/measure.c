/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Measuring: each cell of the data becomes a record, as if it had been simulated, and records go
 * into tallies. Threads take whole groups, one after another: within a group cells are added in
 * order by one thread, so that results are the same in bytes for any number of them. */
#include "study/data.h"
#include "study/self_check.h"

#include "base/error.h"
#include "base/file.h"
#include "base/memory.h"
#include "base/number.h"
#include "base/table.h"
#include "base/threads.h"
#include "study/sheet.h"
#include "study/sketch.h"
#include "tally/kinds.h"
#include "tally/results.h"

#include <math.h>
#include <pthread.h>
#include <stdlib.h>

/* ---- reading --------------------------------------------------------------------------------- */

/* Rows are numbered by 32 bits, and no row is shorter than two bytes. What is no file on a disk (a
 * pipe, a device) may have no end. */
static const size_t largest_file = ((size_t)1 << 33) - 4096, largest_stream = (size_t)1 << 28;

void tarry_data_free(tarry_data *data) {
    if (data == NULL)
        return;
    tarry_text_release(&data->text);
    tarry_data_frames_release(&data->frames);
    tarry_data_table_release(&data->table);
    free(data->unit_group);
    free(data->snapshot);
    tarry_model_free(data->model);
    tarry_model_free(data->beside);
    free(data);
}

static int read_data(tarry_data *data, const char *path, const tarry_override *settings, size_t n,
                     tarry_error *error) {
    tarry_arena *arena = &data->model->arena;
    int code = tarry_data_options_read(settings, n, arena, &data->options, error);
    bool on_disk = false;
    if (code == TARRY_OK)
        code = tarry_file_is_regular(path, &on_disk, error);
    if (code == TARRY_OK)
        code = tarry_file_read(path, on_disk ? largest_file : largest_stream, &data->text, error);
    if (code == TARRY_OK)
        code = tarry_data_table_read(&data->table, path, &data->text, &data->options, arena, error);
    if (code == TARRY_OK && data->table.kind == TARRY_DATA_TRACES)
        code = tarry_data_frames_find(&data->frames, &data->table, &data->options, error);
    if (code == TARRY_OK)
        code = tarry_data_network_build(data, error);
    if (code == TARRY_OK)
        code = tarry_data_beside_read(data, settings, n, error);
    tarry_text_release(&data->text);
    return code;
}

int tarry_data_read(const char *path, const tarry_override *settings, size_t n_settings,
                    tarry_data **out, tarry_error *error) {
    *out = NULL;
    tarry_data *data = tarry_calloc(1, sizeof *data);
    tarry_model *model = tarry_calloc(1, sizeof *model);
    if (data == NULL || model == NULL) {
        free(data);
        free(model);
        return tarry_fail_memory(error, "the data");
    }
    data->model = model;
    const int code = read_data(data, path, settings, n_settings, error);
    if (code != TARRY_OK)
        tarry_data_free(data);
    else
        *out = data;
    return code;
}

const tarry_model *tarry_data_model(const tarry_data *data) {
    return data->model;
}

/* ---- one unit -> one record ------------------------------------------------------------------ */

static void fill_nan(double *values, size_t n) {
    for (size_t i = 0; i < n; i++)
        values[i] = NAN;
}

/* Frames left out between the first and the last known one, as dark. */
static void fill_dark(const tarry_data *data, size_t first, size_t last, double *frames) {
    const tarry_data_frames *all = &data->frames;
    const uint32_t from = all->frame[all->rows[first]], to = all->frame[all->rows[last]];
    for (uint32_t t = from; t < to; t++)
        if (isnan(frames[t]))
            frames[t] = data->options.background;
}

static void fill_film(const tarry_data *data, size_t unit, tarry_record *record) {
    const tarry_data_frames *all = &data->frames;
    const tarry_run_plan *run = &data->model->network.run;
    const size_t from = all->cell_at[unit], to = all->cell_at[unit + 1];
    for (size_t k = 0; k < data->table.n_names; k++) {
        const double *values = data->table.values[k];
        double *frames = record->frames + k * run->n_frames;
        size_t first, last;
        fill_nan(frames, run->n_frames);
        for (size_t i = from; i < to; i++)
            frames[all->frame[all->rows[i]]] = values[all->rows[i]];
        if (data->options.gaps == TARRY_DATA_GAPS_DARK &&
            tarry_data_known(all, values, from, to, &first, &last))
            fill_dark(data, first, last, frames);
        for (size_t s = 0; s < run->n_snapshots; s++)
            record->snapshots[k * run->n_snapshots + s] =
                frames[(size_t)round((run->snapshots[s] - all->start) / all->every)];
    }
}

/* A row of fixed cells has values at its time only. False where its time does not count. */
static bool fill_row(const tarry_data *data, size_t row, tarry_record *record) {
    const tarry_run_plan *run = &data->model->network.run;
    const uint32_t time = data->snapshot[row];
    for (size_t k = 0; k < data->table.n_names && time != UINT32_MAX; k++)
        record->snapshots[k * run->n_snapshots + time] = data->table.values[k][row];
    return time != UINT32_MAX;
}

static void empty_row(const tarry_data *data, size_t row, tarry_record *record) {
    const tarry_run_plan *run = &data->model->network.run;
    for (size_t k = 0; k < data->table.n_names && data->snapshot[row] != UINT32_MAX; k++)
        record->snapshots[k * run->n_snapshots + data->snapshot[row]] = NAN;
}

/* ---- groups among threads -------------------------------------------------------------------- */

typedef struct measuring {
    const tarry_data *data;
    const volatile int *stop;
    const tarry_network *network;
    tarry_tally_set *set;
    tarry_sketch sketch;
    size_t group_at[TARRY_GROUPS + 1]; /* into units */
    uint32_t *units;                   /* group by group, ascending */
    pthread_mutex_t lock;
    size_t next; /* group; under the lock, as all below */
    int code;
    tarry_error error;
} measuring;

static int sort_by_group(measuring *m, tarry_error *error) {
    const tarry_data *data = m->data;
    size_t at[TARRY_GROUPS];
    m->units = tarry_calloc(data->n_units, sizeof *m->units);
    if (m->units == NULL)
        return tarry_fail_memory(error, "the groups of cells");
    for (size_t i = 0; i < data->n_units; i++)
        m->group_at[data->unit_group[i] + 1]++;
    for (size_t g = 0; g < TARRY_GROUPS; g++) {
        m->group_at[g + 1] += m->group_at[g];
        at[g] = m->group_at[g];
    }
    for (size_t i = 0; i < data->n_units; i++)
        m->units[at[data->unit_group[i]]++] = (uint32_t)i;
    return TARRY_OK;
}

static size_t take_group(measuring *m) {
    pthread_mutex_lock(&m->lock);
    const size_t group = m->code == TARRY_OK && m->next < TARRY_GROUPS ? m->next++ : TARRY_GROUPS;
    pthread_mutex_unlock(&m->lock);
    return group;
}

static void note_failure(measuring *m, int code, const tarry_error *error) {
    pthread_mutex_lock(&m->lock);
    m->code = code;
    m->error = *error;
    pthread_mutex_unlock(&m->lock);
}

static int add_unit(measuring *m, size_t group, size_t unit, tarry_record *record, double *scratch,
                    tarry_error *error) {
    const bool film = m->data->table.kind == TARRY_DATA_TRACES;
    if (m->stop != NULL && __atomic_load_n(m->stop, __ATOMIC_RELAXED))
        return tarry_fail(error, TARRY_INTERRUPTED, "interrupted; nothing was written");
    record->cell = (int64_t)unit;
    if (film)
        fill_film(m->data, unit, record);
    else if (!fill_row(m->data, unit, record))
        return TARRY_OK;
    int code = tarry_tally_set_add_to(m->set, record, group, scratch, error);
    if (code == TARRY_OK && film)
        code = tarry_sketch_add(&m->sketch, record, error);
    if (!film)
        empty_row(m->data, unit, record);
    return code;
}

static void work(void *context, int index) {
    measuring *m = context;
    tarry_error error = {0};
    tarry_record record;
    (void)index;
    int code = tarry_record_init(&record, m->network, &error);
    double *scratch = tarry_calloc(tarry_tally_set_scratch(m->network), sizeof *scratch);
    if (code == TARRY_OK && scratch == NULL)
        code = tarry_fail_memory(&error, "the workspace of a thread");
    if (code == TARRY_OK)
        fill_nan(record.snapshots, (size_t)m->network->n_channels * m->network->run.n_snapshots);
    size_t group;
    while (code == TARRY_OK && (group = take_group(m)) < TARRY_GROUPS)
        for (size_t i = m->group_at[group]; code == TARRY_OK && i < m->group_at[group + 1]; i++)
            code = add_unit(m, group, m->units[i], &record, scratch, &error);
    if (code != TARRY_OK)
        note_failure(m, code, &error);
    free(scratch);
    tarry_record_release(&record);
}

/* ---- what a reader must know ----------------------------------------------------------------- */

/* Below this deviate, and with so clear a difference, values beside gaps are low. */
static const double low_z = -3.29, low_below = 0.6;

static int note_low_values(const tarry_data *data, size_t k, tarry_notes *notes,
                           tarry_error *error) {
    tarry_gap_test test;
    char below[TARRY_NUMBER_SIZE], z[TARRY_NUMBER_SIZE];
    const int code = tarry_data_gap_test(&data->frames, data->table.values[k], &test, error);
    if (code != TARRY_OK || !(test.z < low_z && test.below > low_below))
        return code;
    tarry_number_write_rounded(test.below, 2, below);
    tarry_number_write_rounded(test.z, 2, z);
    return tarry_notes_add(
        notes, (tarry_place){0}, error,
        "%s: values beside gaps are low (one of them lies below another value with probability %s; "
        "Mann and Whitney's z = %s), as they are where a spot went dark and was not found: --gaps "
        "dark may be right",
        data->table.names[k], below, z);
}

static int note_gaps(const tarry_data *data, tarry_notes *notes, tarry_error *error) {
    char percent[TARRY_NUMBER_SIZE];
    int code = TARRY_OK;
    tarry_number_write_rounded(100.0 * data->plan.missing, 3, percent);
    if (!(data->frames.missing > 0.0))
        return TARRY_OK;
    code = tarry_notes_add(notes, (tarry_place){0}, error,
                           "%s %% of the frames between a cell's first and last are missing and %s",
                           percent,
                           data->options.gaps == TARRY_DATA_GAPS_DARK
                               ? "were taken as dark (--gaps dark)"
                               : "were left out; if the spot was dark in them, means are high and "
                                 "correlations short");
    for (size_t k = 0; code == TARRY_OK && k < data->table.n_names; k++)
        if (data->options.gaps != TARRY_DATA_GAPS_DARK)
            code = note_low_values(data, k, notes, error);
    return code;
}

/* How much the own means take away, as a share of the variance about the mean of all. */
static double own_mean_share(const tarry_data *data, const double *values) {
    const tarry_data_frames *frames = &data->frames;
    double cells = 0.0, sum = 0.0, squares = 0.0, n = 0.0, all = 0.0, all_squares = 0.0;
    double first_value = NAN;
    for (size_t c = 0; c < frames->n_cells; c++) {
        double own = 0.0, known = 0.0;
        for (size_t i = frames->cell_at[c]; i < frames->cell_at[c + 1]; i++) {
            const double value = values[frames->rows[i]];
            if (isnan(value))
                continue;
            if (isnan(first_value))
                first_value = value;
            const double d = value - first_value;
            own += d;
            known += 1.0;
            all += d;
            all_squares += d * d;
        }
        if (known < 1.0)
            continue;
        n += known;
        cells += 1.0;
        sum += own / known;
        squares += own / known * (own / known);
    }
    const double between = (squares - sum * sum / cells) / (cells - 1.0);
    return between / ((all_squares - all * all / n) / (n - 1.0));
}

static int note_own_means(const tarry_data *data, tarry_notes *notes, tarry_error *error) {
    int code = TARRY_OK;
    if (data->plan.mean != TARRY_FILM_MEAN_CELL)
        return TARRY_OK;
    for (size_t k = 0; code == TARRY_OK && k < data->table.n_names; k++) {
        const double share = own_mean_share(data, data->table.values[k]);
        char percent[TARRY_NUMBER_SIZE];
        tarry_number_write_rounded(100.0 * share, 3, percent);
        code = isfinite(share)
                   ? tarry_notes_add(
                         notes, (tarry_place){0}, error,
                         "%s: each cell's own mean was taken off (--mean cell), and with it the "
                         "slow part of its changes: all covariances are low by about %s %% of the "
                         "variance (the variance of the cells' means, less what of it is a "
                         "difference in gain), so that the correlation is too short",
                         data->table.names[k], percent)
                   : TARRY_OK;
    }
    return code;
}

static int note_groups(const tarry_data *data, tarry_notes *notes, tarry_error *error) {
    const tarry_data_table *table = &data->table;
    if (table->groups == NULL || data->plan.n_resampled == table->n_groups)
        return TARRY_OK;
    return tarry_notes_add(notes, (tarry_place){0}, error,
                           "%u groups are too few to tell how groups differ (4 are due): intervals "
                           "come from how cells differ and do not hold for another %s",
                           (unsigned)table->n_groups, "dish, embryo or day");
}

static int note_all(const tarry_data *data, tarry_notes *notes, tarry_error *error) {
    int code = note_groups(data, notes, error);
    if (code == TARRY_OK && data->table.kind == TARRY_DATA_TRACES)
        code = note_gaps(data, notes, error);
    if (code == TARRY_OK && data->table.kind == TARRY_DATA_TRACES)
        code = note_own_means(data, notes, error);
    if (code == TARRY_OK)
        code = tarry_data_note_thresholds(data, notes, error);
    return code;
}

/* ---- means that come with their errors ------------------------------------------------------- */

static bool has_errors(const tarry_data *data) {
    for (size_t k = 0; k < data->table.n_names; k++)
        if (data->table.errors[k] != NULL)
            return true;
    return false;
}

static int report_means(const tarry_data *data, tarry_results *results, tarry_error *error) {
    const tarry_data_table *table = &data->table;
    int code = TARRY_OK;
    for (size_t k = 0; code == TARRY_OK && k < table->n_names; k++)
        for (size_t row = 0; code == TARRY_OK && row < table->n_rows; row++)
            if (data->snapshot[row] != UINT32_MAX && !isnan(table->values[k][row]))
                code = tarry_table_add(results->tables[TARRY_TABLE_means], error, table->names[k],
                                       table->times[row], table->values[k][row], NAN,
                                       table->errors[k] != NULL ? table->errors[k][row] : NAN, NAN,
                                       NAN, NAN, NAN, NAN);
    return code;
}

/* ---- the whole ------------------------------------------------------------------------------- */

static const tarry_tally_kind *const film_kinds[] = {
    &tarry_tally_moments,         &tarry_tally_distribution, &tarry_tally_pooled,
    &tarry_tally_autocorrelation, &tarry_tally_visible,      &tarry_tally_drift};

static const double most_bytes = 4e9;

int tarry_measure_n_threads(const tarry_data *data, int asked) {
    const int n = asked > 0 ? asked : tarry_threads_available();
    const int most = data->n_units < TARRY_GROUPS ? (int)data->n_units : TARRY_GROUPS;
    return n < most ? n : most > 0 ? most : 1;
}

static int take_in(measuring *m, int n_threads, tarry_error *error) {
    if (pthread_mutex_init(&m->lock, NULL) != 0)
        return tarry_fail_memory(error, "the lock of a measurement");
    tarry_threads_run(n_threads, work, m);
    pthread_mutex_destroy(&m->lock);
    if (m->code != TARRY_OK && error != NULL)
        *error = m->error;
    return m->code;
}

static int measure(measuring *m, const tarry_measure_options *options, tarry_results *results,
                   tarry_error *error) {
    const tarry_data_kind kind = m->data->table.kind;
    const size_t n_kinds = kind == TARRY_DATA_TRACES   ? sizeof film_kinds / sizeof *film_kinds
                           : kind == TARRY_DATA_COUNTS ? 2
                                                       : 1;
    const int n_threads = tarry_measure_n_threads(m->data, options->threads);
    const double bytes = tarry_tally_set_bytes_of(m->network, film_kinds, n_kinds) +
                         n_threads * (double)tarry_record_bytes(m->network);
    char needed[TARRY_BYTES_SIZE];
    if (bytes > most_bytes)
        return tarry_fail(
            error, TARRY_LIMIT,
            "these data need %s of memory for the sums of the estimators, and 4 GB is "
            "the limit: cut them by --from and --to, give fewer columns at a time, or "
            "a smaller --lags",
            tarry_bytes_text(bytes, needed));
    int64_t traced = kind == TARRY_DATA_TRACES ? options->traced : 0;
    if (traced > (int64_t)m->data->n_units)
        traced = (int64_t)m->data->n_units;
    int code = tarry_sketch_init(&m->sketch, m->network, traced, NULL, 0, error);
    if (code == TARRY_OK)
        code = tarry_tally_set_new_of(m->network, film_kinds, n_kinds, &m->set, error);
    if (code == TARRY_OK)
        code = sort_by_group(m, error);
    if (code == TARRY_OK)
        code = take_in(m, n_threads, error);
    if (code == TARRY_OK)
        code = tarry_tally_set_finish(m->set, n_threads, error);
    if (code == TARRY_OK) {
        results->n_cells = results->n_cells_asked = (int64_t)tarry_tally_cells(m->set);
        code = tarry_tally_set_report(m->set, results, error);
    }
    if (code == TARRY_OK)
        code = tarry_sketch_report(&m->sketch, traced, results, error);
    tarry_sketch_release(&m->sketch);
    tarry_tally_set_free(m->set);
    free(m->units);
    return code;
}

int tarry_measure(const tarry_data *data, const tarry_measure_options *options, tarry_results **out,
                  tarry_error *error) {
    *out = NULL;
    measuring m = {.data = data, .stop = options->stop, .network = &data->model->network};
    tarry_results *results = NULL;
    int code = tarry_results_new(&results, error);
    if (code != TARRY_OK)
        return code;
    results->n_cells = results->n_cells_asked = (int64_t)data->n_units;
    results->is_measured = true;
    if (data->beside != NULL &&
        (results->ledger = tarry_calloc(1, sizeof *results->ledger)) == NULL)
        code = tarry_fail_memory(error, "the figures that are compared with exact laws");
    if (code == TARRY_OK)
        code = note_all(data, &results->notes, error);
    if (code == TARRY_OK)
        code = has_errors(data) ? report_means(data, results, error)
                                : measure(&m, options, results, error);
    if (code == TARRY_OK && data->beside != NULL)
        code = tarry_self_check_beside(&data->model->network, results, error);
    if (code != TARRY_OK)
        tarry_results_free(results);
    else
        *out = results;
    return code;
}
