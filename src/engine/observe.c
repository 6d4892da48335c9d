/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Recording: frames, snapshots, counters at span bounds, marks and lags under way. Observations
 * take no random numbers and cut nothing; they are made when an event after them is about to
 * happen. */

#include "engine/cell_state.h"

#include "base/memory.h"

#include <gsl/gsl_cdf.h>
#include <math.h>
#include <string.h>

static double min(double a, double b) {
    return a < b ? a : b;
}

static double max(double a, double b) {
    return a > b ? a : b;
}

/* Noise is a function of (seed, cell, signal, time): the same whatever else is recorded. */
static double noise_at(const tarry_cell *cell, uint32_t signal, double time) {
    uint64_t bits;
    memcpy(&bits, &time, sizeof bits);
    const uint64_t z = tarry_mix64(cell->noise_key +
                                   (signal + (uint64_t)1) * UINT64_C(0x9e3779b97f4a7c15));
    return gsl_cdf_ugaussian_Pinv(tarry_unit(tarry_mix64(z ^ bits)));
}

/* Two independent parts add in quadrature. */
static double noise_sd(const tarry_signal *signal, double value) {
    const double share = signal->share * value;
    return sqrt(signal->noise * signal->noise + share * share);
}

static double signal_at(const tarry_cell *cell, uint32_t index, double ramp_sum, double time) {
    const tarry_network *network = cell->network;
    const tarry_signal *signal = &network->signals[index];
    double value = signal->background;
    for (uint32_t i = signal->weights.from; i < signal->weights.to; i++)
        value += network->weights[i].weight * cell->counts[network->weights[i].species];
    value += ramp_sum;
    if (signal->share > 0)
        value += noise_sd(signal, value) * noise_at(cell, index, time);
    else if (signal->noise > 0)
        value += signal->noise * noise_at(cell, index, time);
    return value;
}

static void observe_frame(tarry_cell *cell) {
    const tarry_engine *engine = cell->engine;
    const uint32_t n_frames = cell->network->run.n_frames;
    const uint32_t frame = cell->next_frame++;
    for (uint32_t i = 0; i < cell->record->n_recorded; i++) {
        const tarry_channel *channel = &cell->network->channels[engine->recorded[i]];
        double *value = &cell->record->frames[(size_t)i * n_frames + frame];
        if (channel->species >= 0) {
            *value = cell->counts[channel->species];
        } else {
            const uint32_t signal = (uint32_t)channel->signal;
            *value = signal_at(cell, signal, cell->frame_ramps[(size_t)signal * n_frames + frame],
                               engine->frame_times[frame]);
        }
    }
}

static void observe_snapshot(tarry_cell *cell) {
    const tarry_network *network = cell->network;
    const uint32_t n_snapshots = network->run.n_snapshots;
    const uint32_t snapshot = cell->next_snapshot++;
    for (uint32_t i = 0; i < network->n_channels; i++) {
        const tarry_channel *channel = &network->channels[i];
        double *value = &cell->record->snapshots[(size_t)i * n_snapshots + snapshot];
        if (channel->species >= 0) {
            *value = cell->counts[channel->species];
        } else {
            const uint32_t signal = (uint32_t)channel->signal;
            *value = signal_at(cell, signal,
                               cell->snapshot_ramps[(size_t)signal * n_snapshots + snapshot],
                               network->run.snapshots[snapshot]);
        }
    }
}

static void observe_bound(tarry_cell *cell) {
    const uint32_t n_tracks = cell->network->n_tracks;
    if (n_tracks > 0)
        memcpy(cell->record->counts + (size_t)cell->next_bound * n_tracks, cell->counters,
               n_tracks * sizeof *cell->counters);
    cell->next_bound++;
}

static void observe_begin(tarry_cell *cell) {
    const uint32_t n_tracks = cell->network->n_tracks;
    if (n_tracks > 0)
        memcpy(cell->record->status, cell->status, n_tracks * sizeof *cell->status);
    cell->has_begun = true;
}

static double next_frame_time(const tarry_cell *cell) {
    return cell->next_frame < cell->network->run.n_frames
               ? cell->engine->frame_times[cell->next_frame]
               : INFINITY;
}

static double next_snapshot_time(const tarry_cell *cell) {
    return cell->next_snapshot < cell->network->run.n_snapshots
               ? cell->network->run.snapshots[cell->next_snapshot]
               : INFINITY;
}

static double next_bound_time(const tarry_cell *cell) {
    return cell->next_bound <= cell->network->run.n_spans
               ? cell->network->run.bounds[cell->next_bound]
               : INFINITY;
}

static double next_watch(const tarry_cell *cell) {
    if (!cell->has_begun)
        return -0x1p-1074; /* the status at 0 is taken before any event at 0 */
    return min(next_frame_time(cell), min(next_snapshot_time(cell), next_bound_time(cell)));
}

void tarry_cell_observe(tarry_cell *cell, double t) {
    if (!cell->has_begun)
        observe_begin(cell);
    while (next_frame_time(cell) < t)
        observe_frame(cell);
    while (next_snapshot_time(cell) < t)
        observe_snapshot(cell);
    while (next_bound_time(cell) < t)
        observe_bound(cell);
    cell->watch = next_watch(cell);
}

/* ---- what is detected ---- */

/* When it is first above its level, or infinity. */
static double first_detection(const tarry_signal *signal, const double *times, uint32_t n,
                              const double *values) {
    for (uint32_t i = 0; i < n; i++)
        if (values[i] > signal->detects_above)
            return times[i];
    return INFINITY;
}

static void miss(const tarry_signal *signal, double first, const double *times, uint32_t n,
                 double *values) {
    for (uint32_t i = 0; i < n; i++) {
        const bool is_found = signal->from_first ? times[i] >= first
                                                 : values[i] > signal->detects_above;
        if (!is_found)
            values[i] = NAN;
    }
}

void tarry_cell_miss(tarry_cell *cell) {
    const tarry_network *network = cell->network;
    const tarry_run_plan *run = &network->run;
    double *frames = cell->record->frames, *snapshots = cell->record->snapshots;
    for (uint32_t i = 0; network->gaps && i < network->n_channels; i++) {
        const tarry_channel *channel = &network->channels[i];
        const tarry_signal *signal = channel->signal == TARRY_NONE
                                         ? NULL
                                         : &network->signals[channel->signal];
        const uint32_t n_frames = channel->recorded ? run->n_frames : 0;
        if (signal && !isnan(signal->detects_above)) {
            const double *times = cell->engine->frame_times;
            const double first = first_detection(signal, times, n_frames, frames);
            miss(signal, first, times, n_frames, frames);
            miss(signal, first, run->snapshots, run->n_snapshots, snapshots);
        }
        frames += n_frames;
        snapshots += run->n_snapshots;
    }
}

static void zero(double *array, size_t n) {
    if (n > 0)
        memset(array, 0, n * sizeof *array);
}

void tarry_cell_begin_record(tarry_cell *cell) {
    const tarry_run_plan *run = &cell->network->run;
    cell->next_frame = cell->next_snapshot = cell->next_bound = 0;
    cell->has_begun = false;
    cell->n_running_on = 0;
    cell->firsts = NULL;
    if (!cell->record) {
        cell->watch = INFINITY;
        return;
    }
    cell->watch = next_watch(cell);
    cell->noise_key = tarry_stream_key(run->seed, (uint64_t)cell->number, TARRY_STREAM_NOISE);
    zero(cell->frame_ramps, (size_t)cell->network->n_signals * run->n_frames);
    zero(cell->snapshot_ramps, (size_t)cell->network->n_signals * run->n_snapshots);
}

/* The span that holds `time`, or TARRY_NONE. */
static int32_t span_of(const tarry_cell *cell, double time) {
    const tarry_run_plan *run = &cell->network->run;
    if (time < 0 || time >= run->until)
        return TARRY_NONE;
    uint32_t span = cell->next_bound > 0 ? cell->next_bound - 1 : 0;
    while (time >= run->bounds[span + 1])
        span++;
    return (int32_t)span;
}

/* Add sign times the overlap of [from, to) with each span to the time under way. */
static void add_overlaps(tarry_cell *cell, uint32_t lag, double from, double to, double sign) {
    const tarry_run_plan *run = &cell->network->run;
    tarry_lag_sums *sums = cell->record->lags + (size_t)lag * run->n_spans;
    for (uint32_t span = 0; span < run->n_spans; span++) {
        const double overlap = min(to, run->bounds[span + 1]) - max(from, run->bounds[span]);
        if (overlap > 0)
            sums[span].pending += sign * overlap;
    }
}

/* How bright a molecule is that began at `begin` and is over at `due`. */
static double ramp_at(const tarry_ramp *ramp, double time, double begin, double due) {
    const double f = (time - begin) / (due - begin);
    if (ramp->from == ramp->to)
        return f >= ramp->from ? ramp->brightness : 0;
    if (f <= ramp->from)
        return 0;
    if (f >= ramp->to)
        return ramp->brightness;
    return ramp->brightness * ((f - ramp->from) / (ramp->to - ramp->from));
}

/* What a molecule will add to the observations at times[next .. n) until it leaves: known from the
 * start, since its dwell is drawn by then. */
static void add_ramp(const tarry_ramp *ramp, double begin, double due, double leaves,
                     const double *times, uint32_t next, uint32_t n, double *sums) {
    for (uint32_t i = next; i < n && times[i] < leaves; i++)
        if (times[i] >= begin)
            sums[i] += ramp_at(ramp, times[i], begin, due);
}

static void add_ramps(tarry_cell *cell, const tarry_packed_lag *lag, double due, double leaves) {
    const tarry_network *network = cell->network;
    const tarry_run_plan *run = &network->run;
    for (uint32_t i = 0; i < lag->n_ramps; i++) {
        const tarry_ramp *ramp = &network->ramps[lag->ramps[i]];
        add_ramp(ramp, cell->now, due, leaves, cell->engine->frame_times, cell->next_frame,
                 run->n_frames, cell->frame_ramps + (size_t)ramp->signal * run->n_frames);
        add_ramp(ramp, cell->now, due, leaves, run->snapshots, cell->next_snapshot,
                 run->n_snapshots, cell->snapshot_ramps + (size_t)ramp->signal * run->n_snapshots);
    }
}

static void add_drawn(tarry_cell *cell, uint32_t lag, double length) {
    const int32_t span = span_of(cell, cell->now);
    if (span == TARRY_NONE)
        return;
    tarry_lag_sums *sums =
        &cell->record->lags[(size_t)lag * cell->network->run.n_spans + (uint32_t)span];
    sums->drawn += 1;
    sums->sum += length;
    sums->squares += length * length;
    if (cell->record->lag_bins)
        cell->record->lag_bins[(size_t)lag * TARRY_LAG_BINS + tarry_lag_bin(length)]++;
}

void tarry_cell_note_lag(tarry_cell *cell, uint32_t lag, double length, double due, double leaves,
                         bool is_drawn) {
    if (leaves < 0 || cell->now >= cell->network->run.until)
        return;
    if (is_drawn)
        add_drawn(cell, lag, length);
    add_overlaps(cell, lag, cell->now, leaves, 1);
    const tarry_packed_lag *packed = &cell->engine->lags[lag];
    if (packed->n_ramps > 0)
        add_ramps(cell, packed, due, leaves);
}

/* Molecules that may still become what is waited for. */
static double under_way(const tarry_cell *cell, const tarry_first *first) {
    double n = 0;
    for (uint32_t i = first->before.from; i < first->before.to; i++)
        n += cell->counts[cell->network->products[i]];
    return n;
}

void tarry_cell_begin_response(tarry_cell *cell) {
    const tarry_network *network = cell->network;
    const int32_t response = network->segments[cell->segment].response;
    cell->firsts = NULL;
    if (!cell->record || response == TARRY_NONE)
        return;
    const size_t at = (size_t)response * network->n_firsts;
    cell->firsts = cell->record->firsts + at;
    cell->response_start = network->responses[response].from;
    for (uint32_t i = 0; i < network->n_firsts; i++)
        cell->record->under_way[at + i] = under_way(cell, &network->firsts[i]);
}

void tarry_cell_note_loss(tarry_cell *cell, uint32_t lag) {
    if (!cell->record)
        return;
    const int32_t span = span_of(cell, cell->now);
    if (span != TARRY_NONE)
        cell->record->lags[(size_t)lag * cell->network->run.n_spans + (uint32_t)span].lost += 1;
}

void tarry_cell_note_cancel(tarry_cell *cell, uint32_t lag, double due) {
    if (!cell->record)
        return;
    add_overlaps(cell, lag, cell->now, due, -1);
    tarry_cell_note_loss(cell, lag);
}

/* A track that runs on has seen its first opening after `until`: it is done. */
static void end_run_on(tarry_cell *cell, uint32_t track) {
    if (cell->n_running_on > 0 && cell->runs_on[track]) {
        cell->runs_on[track] = false;
        if (--cell->n_running_on == 0)
            cell->end = cell->now;
    }
}

void tarry_cell_note_mark(tarry_cell *cell, uint32_t track, bool opens) {
    tarry_record *record = cell->record;
    if (!record || cell->now < 0)
        return;
    if (record->n_marks == record->marks_capacity) {
        void *marks = record->marks;
        const int short_of = tarry_grow(&marks, &record->marks_capacity, record->n_marks + 1,
                                        sizeof *record->marks);
        record->marks = marks;
        if (short_of) {
            cell->stop = TARRY_STOP_MEMORY;
            return;
        }
    }
    record->marks[record->n_marks++] = (tarry_mark){
        .time = cell->now, .track = track, .opens = opens, .count = cell->counters[track]};
    if (opens)
        end_run_on(cell, track);
}
