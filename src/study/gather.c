/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "study/gather.h"

#include "base/error.h"
#include "base/memory.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

static int fail_memory(tarry_error *error) {
    return tarry_fail_memory(error, "the traces of cells");
}

static size_t values_of_name(const tarry_gather *gather) {
    return gather->what == TARRY_GATHER_FRAMES ? gather->network->run.n_frames : 1;
}

static size_t values_of_cell(const tarry_gather *gather) {
    return gather->n_names * values_of_name(gather);
}

int tarry_gather_init(tarry_gather *gather, const tarry_network *network, tarry_gathered what,
                      int64_t n_cells, tarry_gather_takes *takes, tarry_error *error) {
    *gather = (tarry_gather){.network = network, .what = what, .n_cells = n_cells};
    if (n_cells == 0)
        return TARRY_OK;
    gather->channels = tarry_calloc(network->n_channels, sizeof *gather->channels);
    gather->rows = tarry_calloc(network->n_channels, sizeof *gather->rows);
    if (!gather->channels || !gather->rows)
        return fail_memory(error);
    size_t row = 0;
    for (uint32_t c = 0; c < network->n_channels; c++) {
        if (takes(network, &network->channels[c])) {
            gather->channels[gather->n_names] = c;
            gather->rows[gather->n_names++] = row;
        }
        row += network->channels[c].recorded;
    }
    return TARRY_OK;
}

void tarry_gather_release(tarry_gather *gather) {
    free(gather->channels);
    free(gather->rows);
    free(gather->values);
    *gather = (tarry_gather){0};
}

double tarry_gather_bytes(const tarry_gather *gather) {
    const double columns = 2.0 * gather->n_names + 2.0; /* here and in the table, with cell, time */
    return gather->n_cells > 0
               ? (double)gather->n_cells * (double)values_of_name(gather) * columns * sizeof(double)
               : 0.0;
}

int tarry_gather_make_room(tarry_gather *gather, tarry_error *error) {
    if (gather->n_cells == 0)
        return TARRY_OK;
    gather->values = tarry_calloc((size_t)gather->n_cells,
                                  values_of_cell(gather) * sizeof *gather->values);
    return gather->values ? TARRY_OK : fail_memory(error);
}

static uint32_t snapshot_of(const tarry_gather *gather, int64_t cell) {
    return (uint32_t)(cell % gather->network->run.n_snapshots);
}

void tarry_gather_add(tarry_gather *gather, const tarry_record *record) {
    if (record->cell >= gather->n_cells)
        return;
    const tarry_run_plan *run = &gather->network->run;
    double *values = gather->values + (size_t)record->cell * values_of_cell(gather);
    for (uint32_t i = 0; i < gather->n_names; i++) {
        if (gather->what == TARRY_GATHER_FRAMES)
            memcpy(values + (size_t)i * run->n_frames,
                   record->frames + gather->rows[i] * run->n_frames,
                   run->n_frames * sizeof *values);
        else
            values[i] = record->snapshots[(size_t)gather->channels[i] * run->n_snapshots +
                                          snapshot_of(gather, record->cell)];
    }
}

/* ---- the table ------------------------------------------------------------------------------- */

/* "cell:number time:number vela.nascent:number ..." */
static tarry_table *new_table(const tarry_gather *gather, const char *name) {
    tarry_text columns = {0};
    tarry_text_add_string(&columns, "cell:number time:number");
    for (uint32_t i = 0; i < gather->n_names; i++)
        tarry_text_printf(&columns, " %s:number",
                          gather->network->channels[gather->channels[i]].name);
    tarry_table *table = columns.failed ? NULL : tarry_table_new(name, columns.data);
    tarry_text_release(&columns);
    return table;
}

static double time_of(const tarry_gather *gather, int64_t cell, size_t frame) {
    const tarry_run_plan *run = &gather->network->run;
    if (gather->what == TARRY_GATHER_FIXED)
        return run->snapshots[snapshot_of(gather, cell)];
    return frame + 1 == run->n_frames ? run->until : (double)frame * run->every;
}

static int add_cell(const tarry_gather *gather, int64_t cell, bool skip_missing, double *row,
                    tarry_table *table, tarry_error *error) {
    const size_t n = values_of_name(gather);
    const double *values = gather->values + (size_t)cell * values_of_cell(gather);
    int code = TARRY_OK;
    for (size_t frame = 0; frame < n && !code; frame++) {
        bool is_there = false;
        row[0] = (double)cell;
        row[1] = time_of(gather, cell, frame);
        for (size_t i = 0; i < gather->n_names; i++) {
            row[2 + i] = values[i * n + frame];
            is_there = is_there || !isnan(row[2 + i]);
        }
        if (is_there || !skip_missing)
            code = tarry_table_add_numbers(table, row, error);
    }
    return code;
}

int tarry_gather_table(const tarry_gather *gather, const char *name, int64_t n, bool skip_missing,
                       tarry_table **table, tarry_error *error) {
    const int64_t cells = n < gather->n_cells ? n : gather->n_cells;
    *table = NULL;
    if (cells == 0)
        return TARRY_OK;
    double *row = tarry_calloc((size_t)gather->n_names + 2, sizeof *row);
    *table = new_table(gather, name);
    int code = row && *table ? TARRY_OK : fail_memory(error);
    for (int64_t cell = 0; cell < cells && !code; cell++)
        code = add_cell(gather, cell, skip_missing, row, *table, error);
    free(row);
    return code;
}
