/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "study/sketch.h"

#include "base/error.h"
#include "base/memory.h"
#include "tally/periods.h"

#include <math.h>
#include <stdlib.h>

/* Frames beyond these are not drawn: in a column's width nothing could be told of them. */
enum { MOST_FRAMES = 1001 };

static const char period_columns[] = "gene:text allele:number cell:number from:number to:number";

static size_t n_frames_of(const tarry_network *network) {
    return network->run.n_frames < MOST_FRAMES ? network->run.n_frames : MOST_FRAMES;
}

/* "cell:number time:number vela.nascent:number ..." */
static tarry_table *new_traces(const tarry_sketch *sketch) {
    const tarry_network *network = sketch->network;
    tarry_text columns = {0};
    tarry_text_add_string(&columns, "cell:number time:number");
    for (uint32_t c = 0; c < network->n_channels; c++)
        if (sketch->shown.channels[c])
            tarry_text_printf(&columns, " %s:number", network->channels[c].name);
    tarry_table *table = columns.failed ? NULL : tarry_table_new("traces", columns.data);
    tarry_text_release(&columns);
    return table;
}

int tarry_sketch_init(tarry_sketch *sketch, const tarry_network *network, int64_t n_cells,
                      const char *const *genes, size_t n_genes, tarry_error *error) {
    *sketch = (tarry_sketch){.network = network};
    const int code = tarry_shown_init(&sketch->shown, network, genes, n_genes, error);
    if (code)
        return code;
    sketch->traces = tarry_calloc((size_t)n_cells, sizeof(tarry_table *));
    sketch->periods = tarry_calloc((size_t)n_cells, sizeof(tarry_table *));
    if (!sketch->traces || !sketch->periods)
        return tarry_fail_memory(error, "the traces of cells");
    sketch->n_cells = n_cells;
    return 0;
}

void tarry_sketch_release(tarry_sketch *sketch) {
    for (int64_t i = 0; i < sketch->n_cells; i++) {
        tarry_table_free(sketch->traces[i]);
        tarry_table_free(sketch->periods[i]);
    }
    free(sketch->traces);
    free(sketch->periods);
    tarry_shown_release(&sketch->shown);
    *sketch = (tarry_sketch){0};
}

double tarry_sketch_bytes(const tarry_sketch *sketch) {
    double columns = 2;
    for (uint32_t c = 0; c < sketch->network->n_channels; c++)
        columns += sketch->shown.channels[c];
    return 2.0 * (double)sketch->n_cells * (double)n_frames_of(sketch->network) * columns *
           sizeof(double);
}

/* ---- one cell ------------------------------------------------------------------------------- */

/* The record's frames are those of recorded channels, in order. */
static int add_traces(const tarry_sketch *sketch, const tarry_record *record, tarry_table *table,
                      double *row, tarry_error *error) {
    const tarry_network *network = sketch->network;
    const tarry_run_plan *run = &network->run;
    for (size_t frame = 0; frame < n_frames_of(network); frame++) {
        const double *frames = record->frames;
        size_t n = 0;
        row[n++] = (double)record->cell;
        const double start = network->data ? network->data->start : 0.0;
        row[n++] = frame + 1 == run->n_frames ? run->until : start + (double)frame * run->every;
        for (uint32_t c = 0; c < network->n_channels; c++) {
            if (!network->channels[c].recorded)
                continue;
            if (sketch->shown.channels[c])
                row[n++] = frames[frame];
            frames += run->n_frames;
        }
        const int code = tarry_table_add_numbers(table, row, error);
        if (code)
            return code;
    }
    return 0;
}

typedef struct period_context {
    const tarry_sketch *sketch;
    const tarry_record *record;
    tarry_table *table;
    double until;
    int code;
    tarry_error *error;
} period_context;

static void add_period(const tarry_period *period, void *context) {
    period_context *adding = context;
    const tarry_network *network = adding->sketch->network;
    const double to = fmin(period->end, adding->until);
    if (adding->code || period->status != TARRY_TRACK_OPEN || period->start >= to ||
        !adding->sketch->shown.genes[period->gene])
        return;
    adding->code = tarry_table_add(adding->table, adding->error, network->genes[period->gene].name,
                                   (double)network->tracks[period->track].allele,
                                   (double)adding->record->cell, period->start, to);
}

static int add_periods(const tarry_sketch *sketch, const tarry_record *record, tarry_table *table,
                       tarry_error *error) {
    const tarry_run_plan *run = &sketch->network->run;
    const size_t last = n_frames_of(sketch->network);
    double *scratch = tarry_calloc(tarry_periods_scratch(sketch->network), sizeof *scratch);
    if (!scratch)
        return tarry_fail_memory(error, "the active periods of a cell");
    period_context adding = {
        sketch, record, table, last == run->n_frames ? run->until : (double)(last - 1) * run->every,
        0,      error};
    tarry_periods(sketch->network, record, scratch, add_period, &adding);
    free(scratch);
    return adding.code;
}

int tarry_sketch_add(tarry_sketch *sketch, const tarry_record *record, tarry_error *error) {
    const int64_t cell = record->cell;
    if (cell >= sketch->n_cells)
        return 0;
    tarry_table *traces = sketch->traces[cell] = new_traces(sketch);
    tarry_table *periods = sketch->periods[cell] = tarry_table_new("periods", period_columns);
    double *row = tarry_calloc((size_t)sketch->network->n_channels + 2, sizeof *row);
    int code = traces && periods && row ? 0 : tarry_fail_memory(error, "the traces of cells");
    if (!code)
        code = add_traces(sketch, record, traces, row, error);
    if (!code)
        code = add_periods(sketch, record, periods, error);
    free(row);
    return code;
}

/* ---- all of them ---------------------------------------------------------------------------- */

static int append_traces(tarry_table *all, const tarry_table *one, double *row,
                         tarry_error *error) {
    for (size_t r = 0; r < tarry_table_n_rows(one); r++) {
        for (size_t c = 0; c < tarry_table_n_columns(one); c++)
            row[c] = tarry_table_number(one, r, (int)c);
        const int code = tarry_table_add_numbers(all, row, error);
        if (code)
            return code;
    }
    return 0;
}

static int append_periods(tarry_table *all, const tarry_table *one, tarry_error *error) {
    for (size_t r = 0; r < tarry_table_n_rows(one); r++) {
        const int code = tarry_table_add(
            all, error, tarry_table_text(one, r, 0), tarry_table_number(one, r, 1),
            tarry_table_number(one, r, 2), tarry_table_number(one, r, 3),
            tarry_table_number(one, r, 4));
        if (code)
            return code;
    }
    return 0;
}

int tarry_sketch_report(const tarry_sketch *sketch, int64_t n, tarry_results *results,
                        tarry_error *error) {
    if (sketch->n_cells == 0)
        return 0;
    results->traces = new_traces(sketch);
    results->periods = tarry_table_new("periods", period_columns);
    double *row = tarry_calloc((size_t)sketch->network->n_channels + 2, sizeof *row);
    int code = results->traces && results->periods && row
                   ? 0
                   : tarry_fail_memory(error, "the traces of cells");
    for (int64_t i = 0; !code && i < n && i < sketch->n_cells; i++) {
        code = append_traces(results->traces, sketch->traces[i], row, error);
        if (!code)
            code = append_periods(results->periods, sketch->periods[i], error);
    }
    free(row);
    return code;
}
