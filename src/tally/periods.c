/* SPDX-License-Identifier: GPL-3.0-or-later */

/* From marks to periods.
 *
 * Marks of all tracks come in order of time. Each track keeps where its period under way began; a
 * mark ends that period and begins the next. What was under way at time 0 began before the record:
 * it is told (its time counts in the window) but `starts` is false, so that nothing that looks at
 * whole periods counts it. A named track is unknown until its first mark; the period that this mark
 * begins counts, since the mark is what the model calls the start of a burst (or its end). */

#include "tally/periods.h"

#include <math.h>

/* Of one track; doubles only, since it lives in scratch. */
typedef struct track_state {
    double gene;
    double status;
    double since;  /* start of the period under way */
    double starts; /* 1 or 0 */
    double count;  /* counter at `since` */
    double opened; /* start of the last active period seen, or NaN */
} track_state;

enum { STATE_DOUBLES = sizeof(track_state) / sizeof(double) };

size_t tarry_periods_scratch(const tarry_network *network) {
    return (size_t)network->n_tracks * STATE_DOUBLES;
}

static void states_init(const tarry_network *network, const tarry_record *record,
                        track_state *states) {
    for (uint32_t g = 0; g < network->n_genes; g++) {
        const tarry_range tracks = network->genes[g].tracks;
        for (uint32_t i = tracks.from; i < tracks.to; i++) {
            states[i] = (track_state){
                .gene = g,
                .status = record->status[i],
                .count = (double)tarry_count_at(network, record, 0, i),
                .opened = NAN,
            };
        }
    }
}

static tarry_period period_of(const track_state *state, uint32_t track) {
    return (tarry_period){
        .gene = (uint32_t)state->gene,
        .track = track,
        .status = (tarry_track_status)state->status,
        .start = state->since,
        .starts = state->starts != 0,
        .count_start = (int64_t)state->count,
        .opened = state->opened,
    };
}

void tarry_periods(const tarry_network *network, const tarry_record *record, double *scratch,
                   tarry_period_visit *visit, void *context) {
    track_state *states = (track_state *)scratch;
    states_init(network, record, states);
    for (size_t m = 0; m < record->n_marks; m++) {
        const tarry_mark *mark = &record->marks[m];
        track_state *state = &states[mark->track];
        tarry_period period = period_of(state, mark->track);
        period.end = mark->time;
        period.count_end = mark->count;
        visit(&period, context);
        state->status = mark->opens ? TARRY_TRACK_OPEN : TARRY_TRACK_CLOSED;
        state->since = mark->time;
        state->starts = 1;
        state->count = (double)mark->count;
        if (mark->opens)
            state->opened = mark->time;
    }
    for (uint32_t i = 0; i < network->n_tracks; i++) {
        tarry_period period = period_of(&states[i], i);
        period.end = record->end;
        period.cut_off = true;
        period.count_end = tarry_count_at(network, record, network->run.n_spans, i);
        visit(&period, context);
    }
}

size_t tarry_recorded_genes(const tarry_network *network, double *slots) {
    size_t n = 0;
    for (uint32_t g = 0; slots && g < network->n_genes; g++)
        slots[g] = -1;
    int32_t last = TARRY_NONE;
    for (uint32_t c = 0; c < network->n_channels; c++) {
        const tarry_channel *channel = &network->channels[c];
        if (!channel->recorded || channel->species == TARRY_NONE)
            continue;
        const int32_t gene = network->species[channel->species].gene;
        if (gene == TARRY_NONE || gene == last || (slots && slots[gene] >= 0))
            continue;
        if (slots)
            slots[gene] = (double)n;
        last = gene;
        n++;
    }
    for (uint32_t g = 0; g < network->n_genes; g++) {
        const tarry_range promoters = network->genes[g].promoters;
        if (promoters.from != promoters.to)
            continue;
        if (slots)
            slots[g] = (double)n;
        n++;
    }
    return n;
}
