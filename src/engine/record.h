/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_ENGINE_RECORD_H
#define TARRY_ENGINE_RECORD_H

/* What one cell leaves behind: the only thing that estimators see. The engine fills it, the plain
 * loop of the tests fills it, and laboratory data are put into the same form. */

#include <stdbool.h>
#include <stdint.h>
#include "model/network.h"

enum {
    TARRY_LAG_BINS_OCTAVE = 8, /* histogram bins of drawn lags in each doubling */
    TARRY_LAG_LOWEST = -20,    /* first octave starts at 2^-20 time units; shorter ones go there */
    TARRY_LAG_OCTAVES = 48,    /* longer lags than 2^28 go into the last bin */
    TARRY_LAG_BINS = TARRY_LAG_BINS_OCTAVE * TARRY_LAG_OCTAVES,
    TARRY_MOST_LAGS_WITH_BINS =
        256, /* a histogram costs 3 kB a lag; with more lags there are none */
};

/* A track opens or closes. */
typedef struct tarry_mark {
    double time; /* on the recorded clock; after `until` while the cell runs on */
    uint32_t track;
    uint32_t opens; /* 1 or 0 */
    int64_t count;  /* the track's counter: initiations since -settle */
} tarry_mark;

/* How a track stands at time 0. */
typedef enum tarry_track_status {
    TARRY_TRACK_UNKNOWN, /* a named track that neither opened nor closed yet */
    TARRY_TRACK_CLOSED,
    TARRY_TRACK_OPEN,
} tarry_track_status;

/* Sums over the lags that began in one span, and the time that molecules spent under way in it. */
typedef struct tarry_lag_sums {
    double drawn;   /* number begun */
    double sum;     /* of their lengths as drawn */
    double squares; /* of lengths squared */
    double pending; /* integral over the span of the number under way */
    double lost;    /* left before the end */
} tarry_lag_sums;

typedef struct tarry_record {
    int64_t cell;

    double *frames;    /* [recorded channel in order][frame]: n_recorded * n_frames */
    double *snapshots; /* [channel][snapshot]: n_channels * n_snapshots */

    tarry_mark *marks; /* in order of time, those at 0 or later; grows */
    size_t n_marks;
    size_t marks_capacity;
    tarry_track_status *status; /* [track], just before any event at time 0 */
    int64_t *counts;            /* [bound 0..n_spans][track]: counters at each span bound */
    double end;                 /* when the cell stopped: until, or later where it ran on */
    int64_t ignored;            /* openings while open, closings while closed (named tracks) */

    int64_t *firings;     /* [reaction], from -settle to `end` */
    int64_t *completions; /* [lag], from -settle to `end` */
    int64_t *skipped;     /* [lag]: completions dropped for want of what they use */
    tarry_lag_sums *lags; /* [lag][span] */
    int64_t *lag_bins;    /* [lag][TARRY_LAG_BINS], drawn in any span; NULL where not wanted */

    double *firsts;    /* [response][first]: time from the step on, NaN where it did not come */
    double *under_way; /* [response][first]: molecules at the step, right after it, that may still
                          give rise to it */

    uint32_t n_recorded;
} tarry_record;

/* The bin of a lag of length x >= 0. */
uint32_t tarry_lag_bin(double x);

/* Length at which a bin begins. */
double tarry_lag_bin_start(uint32_t bin);

/* Arrays for one cell of `network`; release accepts a half-built or zeroed record. */
int tarry_record_init(tarry_record *record, const tarry_network *network, tarry_error *error);
void tarry_record_release(tarry_record *record);

/* Ready for another cell; memory is kept. */
void tarry_record_reset(tarry_record *record, const tarry_network *network);

/* Bytes of one record, without its marks. */
size_t tarry_record_bytes(const tarry_network *network);

#endif
