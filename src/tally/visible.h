/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_TALLY_VISIBLE_H
#define TARRY_TALLY_VISIBLE_H

/* Visible and dark periods of a trace, by two thresholds and a shortest length.
 *
 * A frame above `high` is visible and one below `low` is dark; one between them is what the frame
 * before it was. A change counts, from its first frame on, once it has lasted `least` frames;
 * shorter ones are passed over. So no period that starts within the trace is shorter. Missing
 * frames (NaN) are what the frame before them was; those before the first known frame and after the
 * last one belong to nothing, and so do frames before the first that is above `high` or below
 * `low`. Where the trace ends in a change that has not lasted long enough, the period before it is
 * cut off where the change began, and the rest belongs to nothing.
 *
 * Visible is not active: signals rise and fall slowly, two alleles overlap, short gaps close. */

#include <stdbool.h>
#include <stddef.h>

typedef struct tarry_visible_period {
    bool visible;
    size_t from, to; /* frames [from, to) */
    bool starts;     /* false: it was under way when the trace began */
    bool cut_off;    /* it was still under way when the trace ended */
} tarry_visible_period;

typedef void tarry_visible_visit(const tarry_visible_period *period, void *context);

/* Call `visit` for each period in order. `least` is at least 1. */
void tarry_visible_periods(const double *values, size_t n_frames, double low, double high,
                           size_t least, tarry_visible_visit *visit, void *context);

#endif
