/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_ENGINE_CELL_STATE_H
#define TARRY_ENGINE_CELL_STATE_H

/* The insides of an engine and of a cell's workspace, shared by the files of the engine only. */

#include <math.h>
#include <stdbool.h>
#include <stdint.h>
#include "engine/cell.h"
#include "engine/draw.h"
#include "engine/pending.h"
#include "engine/propensity.h"
#include "engine/sampler.h"

/* An effect with its ranges turned into pointers; what is rare stands behind one flag. */
typedef struct tarry_packed_effect {
    const tarry_change *changes;
    const uint32_t *affected;
    const uint32_t *schedules;
    const tarry_mark_rule *marks;
    uint32_t n_changes;
    uint32_t n_affected;
    uint32_t n_schedules;
    uint32_t n_marks;
    const tarry_effect *whole; /* for demands and random amounts */
    bool is_rare;              /* has demands or random amounts */
} tarry_packed_effect;

typedef struct tarry_packed_lag {
    const tarry_outcome *outcomes;
    uint32_t delay;
    uint32_t n_outcomes;
    bool is_certain; /* one outcome that always comes */
    uint32_t effect; /* of a certain one */
    bool is_rare;    /* its molecule may be lost, or must keep behind the one before */
    uint32_t n_ramps;
    const uint32_t *ramps;
} tarry_packed_lag;

struct tarry_engine {
    const tarry_network *network;
    const tarry_sampler *sampler;
    tarry_propensities propensities;
    tarry_packed_effect *effects; /* [effect] */
    uint32_t *reaction_effects;   /* [reaction] */
    tarry_packed_lag *lags;       /* [lag] */
    tarry_drawer_set *drawer_set;
    const tarry_drawer **drawers; /* [segment][delay] */
    double *fixed;                /* [segment][delay]: the length, or -1 where it varies */
    const tarry_drawer **factors; /* of parameters that differ from cell to cell, or NULL */
    double *frame_times;          /* [frame] */
    uint32_t *recorded;           /* [recorded]: channel */
};

/* What cannot go on; the message is made out of line, once. */
typedef enum tarry_stop {
    TARRY_GO,
    TARRY_STOP_MEMORY,
    TARRY_STOP_PENDING,
    TARRY_STOP_FIRINGS,
    TARRY_STOP_COUNT,
    TARRY_STOP_SHORT,
    TARRY_STOP_PROPENSITY,
} tarry_stop;

typedef struct tarry_vary tarry_vary;

struct tarry_cell {
    const tarry_engine *engine;
    const tarry_network *network;
    tarry_vary *vary; /* whose engine and network these are, where cells differ; or NULL */

    /* The state of the cell. */
    double now;
    double *counts;
    uint32_t segment;
    uint32_t n_lags;
    tarry_pending pending; /* of kind `lag`, or n_lags + lag for a molecule that is to be lost */
    tarry_sampler_state *sampler_state;
    tarry_stream events;
    tarry_track_status *status; /* [track] */
    int64_t *counters;          /* [track] */
    double *last_due;           /* [lag] of those in order: when the last one begun is due */

    /* The segment in force. */
    const tarry_drawer *const *drawers;
    const double *fixed;
    const double *means;

    /* What stops the loop. */
    double end;
    double next_segment;
    tarry_stop stop;
    uint32_t stop_index; /* species, lag or reaction, by the kind of stop */
    int64_t n_firings;
    int64_t most_firings;
    int64_t most_pending;

    /* Recording. `record` is NULL in a bare run. */
    tarry_record *record;
    int64_t number;
    uint64_t noise_key;
    double watch; /* earliest observation still to be made */
    uint32_t next_frame;
    uint32_t next_snapshot;
    uint32_t next_bound;    /* 0: recording has not begun */
    bool has_begun;         /* the status at time 0 has been taken */
    double *frame_ramps;    /* [signal][frame], ramp sums */
    double *snapshot_ramps; /* [signal][snapshot] */
    double *firsts;         /* [first] of the response under way, in the record; or NULL */
    double response_start;  /* the time of its step */
    bool *runs_on;          /* [track] waits for its first opening after `until` */
    uint32_t n_running_on;
    int64_t *firings;     /* [reaction]; the record's, or the cell's own in a bare run */
    int64_t *completions; /* [lag] */
    int64_t *own_counts;  /* behind the two above in a bare run */
};

/* Make all observations at times before `t`. */
void tarry_cell_observe(tarry_cell *cell, double t);

/* Once all is observed: leave out (NaN) what a search for a signal does not find (`detects`). */
void tarry_cell_miss(tarry_cell *cell);

/* Ready for a new record; called at the start of a cell. */
void tarry_cell_begin_record(tarry_cell *cell);

/* A lag of `length` as drawn begins now and would be over at `due`; its molecule is there until
 * `leaves`. `is_drawn`: it counts among those drawn. */
void tarry_cell_note_lag(tarry_cell *cell, uint32_t lag, double length, double due, double leaves,
                         bool is_drawn);

/* A molecule is lost now. */
void tarry_cell_note_loss(tarry_cell *cell, uint32_t lag);

/* A lag that was due at `due` is cancelled now. */
void tarry_cell_note_cancel(tarry_cell *cell, uint32_t lag, double due);

/* A step has been carried out: first responses are told from now on. */
void tarry_cell_begin_response(tarry_cell *cell);

/* What a FIRST mark waits for happens now. */
static inline void tarry_cell_note_first(tarry_cell *cell, uint32_t first) {
    if (cell->firsts && isnan(cell->firsts[first]))
        cell->firsts[first] = cell->now - cell->response_start;
}

/* A track opens or closes now. */
void tarry_cell_note_mark(tarry_cell *cell, uint32_t track, bool opens);

#endif
