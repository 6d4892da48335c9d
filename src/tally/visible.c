/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "tally/visible.h"

#include <math.h>

typedef enum state { UNKNOWN, DARK, VISIBLE } state;

/* A trace while it is read. */
typedef struct reader {
    double low, high;
    size_t least;
    tarry_visible_visit *visit;
    void *context;
    state now;        /* of the period under way */
    size_t from;      /* where that began */
    bool starts;      /* within the trace */
    state seen;       /* of the frame before, by the thresholds alone */
    size_t seen_from; /* since when that has been so */
} reader;

static void tell(const reader *r, size_t to, bool cut_off) {
    if (r->now == UNKNOWN || to <= r->from)
        return;
    const tarry_visible_period period = {r->now == VISIBLE, r->from, to, r->starts, cut_off};
    r->visit(&period, r->context);
}

static state look(const reader *r, double value) {
    if (value > r->high)
        return VISIBLE;
    if (value < r->low)
        return DARK;
    return r->seen;
}

static void take_frame(reader *r, size_t frame, double value) {
    const state seen = look(r, value);
    if (seen != r->seen) {
        r->seen = seen;
        r->seen_from = frame;
    }
    if (seen == r->now || seen == UNKNOWN)
        return;
    if (r->now == UNKNOWN) {
        r->now = seen;
        r->from = frame;
    } else if (frame + 1 - r->seen_from >= r->least) {
        tell(r, r->seen_from, false);
        r->now = seen;
        r->from = r->seen_from;
        r->starts = true;
    }
}

void tarry_visible_periods(const double *values, size_t n_frames, double low, double high,
                           size_t least, tarry_visible_visit *visit, void *context) {
    reader r = {.low = low, .high = high, .least = least, .visit = visit, .context = context};
    size_t end = n_frames;
    while (end > 0 && isnan(values[end - 1]))
        end--;
    for (size_t frame = 0; frame < end; frame++)
        if (!isnan(values[frame]))
            take_frame(&r, frame, values[frame]);
    tell(&r, r.seen == r.now ? end : r.seen_from, true);
}
