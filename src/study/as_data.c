/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "study/as_data.h"

#include "base/error.h"
#include "base/memory.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

static const char table_name[] = "data";

static const char *const form_names[] = {
#define FORM_NAME(name, word) [TARRY_DATA_FORM_##name] = (word),
    TARRY_DATA_FORMS(FORM_NAME)
#undef FORM_NAME
};

const char *tarry_data_form_name(tarry_data_form form) {
    return form_names[form];
}

int tarry_data_form_of(const char *name) {
    for (size_t i = 0; i < sizeof form_names / sizeof *form_names; i++)
        if (!strcmp(name, form_names[i]))
            return (int)i;
    return -1;
}

/* ---- which names ----------------------------------------------------------------------------- */

static bool is_recorded_signal(const tarry_channel *channel) {
    return channel->recorded && channel->signal != TARRY_NONE;
}

static bool has_signals(const tarry_network *network) {
    for (uint32_t c = 0; c < network->n_channels; c++)
        if (is_recorded_signal(&network->channels[c]))
            return true;
    return false;
}

/* What an instrument sees; the products themselves where the model has no instrument. */
static bool takes_seen(const tarry_network *network, const tarry_channel *channel) {
    return has_signals(network) ? is_recorded_signal(channel) : channel->correlates;
}

/* Molecules, which can be counted in a fixed cell. */
static bool takes_molecules(const tarry_network *network, const tarry_channel *channel) {
    if (channel->species == TARRY_NONE)
        return false;
    const tarry_species_role role = network->species[channel->species].role;
    return role != TARRY_SPECIES_STATE && role != TARRY_SPECIES_ALLELE;
}

static int check_names(const tarry_gather *gather, tarry_error *error) {
    static const char *const taken[] = {"cell", "time", "group", "count", "cells"};
    for (uint32_t i = 0; i < gather->n_names; i++) {
        const char *name = gather->network->channels[gather->channels[i]].name;
        for (size_t k = 0; k < sizeof taken / sizeof *taken; k++)
            if (!strcmp(name, taken[k]))
                return tarry_fail(error, TARRY_INPUT,
                                  "--as-data: a column '%s' has a meaning of its own in data; give "
                                  "the species or signal '%s' another name",
                                  name, name);
    }
    return TARRY_OK;
}

int tarry_as_data_init(tarry_gather *gather, const tarry_network *network, tarry_data_form form,
                       tarry_error *error) {
    const bool fixed = form == TARRY_DATA_FORM_COUNTS;
    if (form == TARRY_DATA_FORM_NONE)
        return TARRY_OK;
    int code = tarry_gather_init(gather, network, fixed ? TARRY_GATHER_FIXED : TARRY_GATHER_FRAMES,
                                 network->run.cells, fixed ? takes_molecules : takes_seen, error);
    if (!code && gather->n_names == 0)
        code = tarry_fail(error, TARRY_INPUT,
                          fixed ? "--as-data counts: the model has no molecules to be counted"
                                : "--as-data: no signal, stage, transcript or protein is recorded; "
                                  "name what is seen under 'record'");
    if (!code)
        code = check_names(gather, error);
    if (form == TARRY_DATA_FORM_MEANS)
        gather->n_cells = 0; /* they come from the results */
    return code;
}

/* ---- means ----------------------------------------------------------------------------------- */

/* "time:number lum:number lum_se:number ..." */
static tarry_table *new_means(const tarry_gather *gather) {
    tarry_text columns = {0};
    tarry_text_add_string(&columns, "time:number");
    for (uint32_t i = 0; i < gather->n_names; i++) {
        const char *name = gather->network->channels[gather->channels[i]].name;
        tarry_text_printf(&columns, " %s:number %s_se:number", name, name);
    }
    tarry_table *table = columns.failed ? NULL : tarry_table_new(table_name, columns.data);
    tarry_text_release(&columns);
    return table;
}

/* Number of a name among those that are told, or n_names. */
static uint32_t find_name(const tarry_gather *gather, const char *name) {
    uint32_t i = 0;
    while (i < gather->n_names &&
           strcmp(gather->network->channels[gather->channels[i]].name, name) != 0)
        i++;
    return i;
}

/* rows[frame]: time, then mean and standard error of each name; snapshots between frames are left
 * out. */
static void fill_means(const tarry_gather *gather, const tarry_table *means, double *rows) {
    const tarry_run_plan *run = &gather->network->run;
    const int mean = tarry_table_column(means, "mean"), se = tarry_table_column(means, "mean_se");
    const size_t width = 1 + 2 * (size_t)gather->n_names;
    for (size_t i = 0; i < run->n_frames * width; i++)
        rows[i] = NAN;
    for (size_t row = 0; row < tarry_table_n_rows(means); row++) {
        const uint32_t name = find_name(gather, tarry_table_text(means, row, 0));
        const double time = tarry_table_number(means, row, 1), frame = round(time / run->every);
        if (name == gather->n_names || fabs(time - frame * run->every) > 1e-9 * run->every)
            continue;
        double *to = rows + (size_t)frame * width;
        to[0] = time;
        to[1 + 2 * name] = tarry_table_number(means, row, mean);
        to[2 + 2 * name] = tarry_table_number(means, row, se);
    }
}

static int report_means(const tarry_gather *gather, tarry_results *results, tarry_error *error) {
    const size_t n = gather->network->run.n_frames, width = 1 + 2 * (size_t)gather->n_names;
    double *rows = tarry_calloc(n, width * sizeof *rows);
    results->data = new_means(gather);
    int code = rows && results->data ? TARRY_OK : tarry_fail_memory(error, "means as data");
    if (!code)
        fill_means(gather, results->tables[TARRY_TABLE_means], rows);
    for (size_t frame = 0; frame < n && !code; frame++)
        if (!isnan(rows[frame * width]))
            code = tarry_table_add_numbers(results->data, rows + frame * width, error);
    free(rows);
    return code;
}

int tarry_as_data_report(const tarry_gather *gather, tarry_data_form form, int64_t n,
                         tarry_results *results, tarry_error *error) {
    if (form == TARRY_DATA_FORM_NONE)
        return TARRY_OK;
    if (form == TARRY_DATA_FORM_MEANS)
        return report_means(gather, results, error);
    return tarry_gather_table(gather, table_name, n, true, &results->data, error);
}
