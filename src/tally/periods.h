/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_TALLY_PERIODS_H
#define TARRY_TALLY_PERIODS_H

/* Active and inactive periods of one cell, read off the marks in its record: the one reading on
 * which burst figures, burst sizes and dwell curves all rest. */

#include <stdbool.h>
#include "engine/record.h"

/* A stretch of one track between two marks, or between a mark and an end of the record. */
typedef struct tarry_period {
    uint32_t gene;  /* index into network->genes */
    uint32_t track; /* index into network->tracks */
    tarry_track_status status;
    double start, end; /* within [0, record->end] */
    bool starts;       /* false: it was under way at time 0 (or nothing was known before it) */
    bool cut_off;      /* it was still under way when the record ended; `end` is that time */
    int64_t count_start, count_end; /* the track's counter; where cut off, count_end is the one at
                                       `until`, the last that a record holds */
    double opened; /* inactive periods: start of the active one before, NaN where not seen */
} tarry_period;

typedef void tarry_period_visit(const tarry_period *period, void *context);

/* Call `visit` for each period of each track, in the order in which they end, tracks in order for
 * those cut off. */
void tarry_periods(const tarry_network *network, const tarry_record *record, double *scratch,
                   tarry_period_visit *visit, void *context);

/* Doubles of scratch that it takes. */
size_t tarry_periods_scratch(const tarry_network *network);

/* True where a period or interval that starts at `time` belongs to the window: [from, to). */
static inline bool tarry_window_holds(const tarry_window *window, double time) {
    return time >= window->from && time < window->to;
}

/* The track's counter when the window begins or ends. */
static inline int64_t tarry_count_at(const tarry_network *network, const tarry_record *record,
                                     uint32_t bound, uint32_t track) {
    return record->counts[(size_t)bound * network->n_tracks + track];
}

/* Genes whose burst sizes and dwell curves are kept: those with a recorded species, and all named
 * bursts. slots[gene] is the gene's number among them, or -1. Returns how many there are; without
 * `slots` (NULL), which needs no memory, perhaps a few more. */
size_t tarry_recorded_genes(const tarry_network *network, double *slots);

#endif
