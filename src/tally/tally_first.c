/* SPDX-License-Identifier: GPL-3.0-or-later */

/* First responses: first.csv, for each step of the protocol the chance that nothing has come yet
 * (tally/survival.h).
 *
 * What the engine waits for is in the record; a signal is looked at frame by frame, with its
 * read-out noise. All cells are cut off at one time, the next step's or `until`, so that the curve
 * is the plain share of cells without a response. Its last row stands there, with the interval of a
 * share, which is there also where none or all responded. Formulas: docs/statistics.md, "First
 * responses". */
#include "base/error.h"
#include "base/number.h"
#include "base/table.h"
#include "tally/kinds.h"
#include "tally/results.h"
#include "tally/survival.h"

#include <math.h>

static bool has_level(const tarry_network *network, const tarry_channel *channel) {
    return channel->recorded && channel->signal != TARRY_NONE &&
           !isnan(network->signals[channel->signal].responds_above);
}

/* What is waited for, each after every step: first what the engine notes, then signals. */
static size_t n_watched(const tarry_network *network) {
    size_t n = network->n_firsts;
    for (uint32_t i = 0; network->n_responses > 0 && i < network->n_channels; i++)
        n += has_level(network, &network->channels[i]);
    return n;
}

static size_t curve_of(const tarry_network *network, size_t watched, uint32_t response) {
    return watched * network->n_responses + response;
}

/* Cells in which molecules were under way at the step. */
static size_t first_size(const tarry_network *network) {
    return (size_t)network->n_firsts * network->n_responses;
}

static size_t first_n_blocks(const tarry_network *network) {
    return n_watched(network) * network->n_responses * TARRY_SURVIVAL_BLOCKS;
}

/* ---- adding ---- */

/* The first frame from the step on and before the stretch ends that is above the level (at `until`
 * included): its time from the step on, or NaN. */
static double crossing(const tarry_network *network, const double *frames, double level,
                       const tarry_response *response) {
    const tarry_run_plan *run = &network->run;
    for (uint32_t i = 0; i < run->n_frames; i++) {
        const double time = i + 1 < run->n_frames ? i * run->every : run->until;
        const bool inside = time >= response->from &&
                            (time < response->to || response->to >= run->until);
        if (inside && frames[i] > level)
            return time - response->from;
    }
    return NAN;
}

static int add_time(const tarry_network *network, tarry_blocks *blocks, size_t watched,
                    uint32_t response, double time) {
    const double longest = network->responses[response].to - network->responses[response].from;
    const bool none = isnan(time);
    return tarry_survival_add(blocks, curve_of(network, watched, response), none ? longest : time,
                              longest, none);
}

static int first_add(const tarry_network *network, const tarry_record *record, double *sums,
                     tarry_blocks *blocks, double *scratch) {
    (void)scratch;
    int failed = 0;
    for (uint32_t r = 0; r < network->n_responses; r++) {
        for (uint32_t i = 0; i < network->n_firsts; i++) {
            const size_t at = (size_t)r * network->n_firsts + i;
            failed |= add_time(network, blocks, i, r, record->firsts[at]);
            sums[at] += record->under_way[at] > 0.0;
        }
    }
    size_t watched = network->n_firsts, row = 0;
    for (uint32_t c = 0; c < network->n_channels; c++) {
        const tarry_channel *channel = &network->channels[c];
        if (has_level(network, channel) && network->n_responses > 0) {
            const double level = network->signals[channel->signal].responds_above;
            const double *frames = record->frames + row * network->run.n_frames;
            for (uint32_t r = 0; r < network->n_responses; r++)
                failed |= add_time(network, blocks, watched, r,
                                   crossing(network, frames, level, &network->responses[r]));
            watched++;
        }
        row += channel->recorded;
    }
    return failed;
}

/* ---- reporting ---- */

typedef struct curve_rows {
    tarry_results *results;
    const char *name;
    const tarry_response *response;
} curve_rows;

static int add_end(const curve_rows *rows, double time, const tarry_estimate *survival,
                   tarry_error *error) {
    const int code = tarry_table_add(rows->results->tables[TARRY_TABLE_first], error, rows->name,
                                     rows->response->from, time, survival->value, survival->low,
                                     survival->high);
    return code ? code
                : tarry_results_keep(rows->results, TARRY_LEDGER_first_survival, survival, error);
}

/* All but the last point, which is told as a share. */
static int add_row(void *context, double time, const tarry_estimate *survival, tarry_error *error) {
    const curve_rows *rows = context;
    const bool last = time >= rows->response->to - rows->response->from;
    return last ? TARRY_OK : add_end(rows, time, survival, error);
}

static int report_name(const tarry_network *network, const tarry_tally_set *set,
                       const tarry_tally_kind *kind, size_t watched, const char *name,
                       tarry_results *results, tarry_error *error) {
    int code = TARRY_OK;
    for (uint32_t r = 0; !code && r < network->n_responses; r++) {
        const tarry_response *response = &network->responses[r];
        curve_rows rows = {results, name, response};
        const tarry_survival curve = {set, kind, curve_of(network, watched, r),
                                      response->to - response->from};
        code = tarry_survival_rows(&curve, add_row, &rows, error);
        const tarry_estimate end = tarry_survival_end(&curve);
        if (!code)
            code = add_end(&rows, curve.longest, &end, error);
    }
    return code;
}

/* One note for all: which response is most often met by molecules begun before its step. */
static int note_under_way(const tarry_network *network, const tarry_tally_set *set,
                          const tarry_tally_kind *kind, tarry_results *results,
                          tarry_error *error) {
    const double *sums = tarry_tally_sums(set, kind);
    const double cells = tarry_tally_cells(set);
    char share[TARRY_NUMBER_SIZE], at[TARRY_NUMBER_SIZE];
    size_t n = 0, most = 0;
    for (size_t i = 0; i < first_size(network); i++) {
        n += sums[i] > 0.0;
        most = sums[i] > sums[most] ? i : most;
    }
    if (n == 0)
        return TARRY_OK;
    tarry_number_write_rounded(100.0 * sums[most] / cells, 3, share);
    tarry_number_write_rounded(network->responses[most / network->n_firsts].from, 6, at);
    return tarry_notes_add(
        &results->notes, (tarry_place){0}, error,
        "first transcripts and proteins count whenever they were begun, and in %s %% of the "
        "cells molecules that may give rise to the first %s were there already at the step at "
        "%s %s (so for %zu of the %zu first responses of genes); only first initiations tell of "
        "the step alone",
        share, network->firsts[most % network->n_firsts].name, at, network->time_unit, n,
        first_size(network));
}

static int first_report(const tarry_network *network, const tarry_tally_set *set,
                        const tarry_tally_kind *kind, tarry_results *results, tarry_error *error) {
    if (tarry_tally_cells(set) <= 0.0 || network->n_responses == 0)
        return TARRY_OK;
    size_t watched = 0;
    int code = TARRY_OK;
    for (uint32_t i = 0; !code && i < network->n_firsts; i++)
        code = report_name(network, set, kind, watched++, network->firsts[i].name, results, error);
    for (uint32_t c = 0; !code && c < network->n_channels; c++)
        if (has_level(network, &network->channels[c]))
            code = report_name(network, set, kind, watched++, network->channels[c].name, results,
                               error);
    return code ? code : note_under_way(network, set, kind, results, error);
}

const tarry_tally_kind tarry_tally_first = {
    .name = "first",
    .size = first_size,
    .n_blocks = first_n_blocks,
    .add_blocks = first_add,
    .report = first_report,
};
