/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_ENGINE_PENDING_H
#define TARRY_ENGINE_PENDING_H

/* Completions under way, in the order (due, lag, order scheduled).
 *
 * Completions of one lag and one length finish in the order they began, so they wait in a ring of
 * which only the head stands in the heap; drawn lengths go into the heap one by one. The heap is a
 * flat binary one; entries compare as single numbers of 128 bits. */

#include "tarry/error.h"

#include <math.h>
#include <stdbool.h>
#include <stddef.h>
#include <stdint.h>
#include <string.h>

/* 24 bits for the lag, 39 for the order scheduled, the lowest for "head of a ring". */
enum { TARRY_PENDING_LAG_SHIFT = 40, TARRY_PENDING_MOST_LAGS = 1 << 24 };

/* Times as whole numbers in the same order: positive doubles sort by their bits, negative ones by
 * their bits upside down. */
static inline int64_t tarry_time_order(double time) {
    int64_t bits;
    memcpy(&bits, &time, sizeof bits);
    return bits ^ (int64_t)((uint64_t)(bits >> 63) >> 1);
}

static inline double tarry_order_time(int64_t order) {
    const int64_t bits = order ^ (int64_t)((uint64_t)(order >> 63) >> 1);
    double time;
    memcpy(&time, &bits, sizeof time);
    return time;
}

typedef struct tarry_pending_entry {
    int64_t order; /* of the time when it is due */
    uint64_t key;
} tarry_pending_entry;

typedef struct tarry_ring {
    tarry_pending_entry *entries; /* capacity is a power of two, or 0 */
    uint32_t head;
    uint32_t n;
    uint32_t capacity;
} tarry_ring;

typedef struct tarry_pending {
    tarry_pending_entry *heap; /* heap[0] is the earliest */
    size_t n_heap;
    size_t heap_capacity;
    tarry_ring *rings; /* one a lag */
    uint32_t n_lags;
    uint64_t n_scheduled; /* since the last clear */
    int64_t n;            /* under way now, rings included */
} tarry_pending;

int tarry_pending_init(tarry_pending *pending, uint32_t n_lags, tarry_error *error);
void tarry_pending_release(tarry_pending *pending);
void tarry_pending_clear(tarry_pending *pending);

/* Time of the earliest completion, infinity where there is none. */
static inline double tarry_pending_due(const tarry_pending *pending) {
    return pending->n_heap > 0 ? tarry_order_time(pending->heap[0].order) : INFINITY;
}

/* Schedule one completion; `fixed`: the lag has one length for all, and `due` never decreases from
 * call to call. Returns 0, or TARRY_MEMORY. */
int tarry_pending_add(tarry_pending *pending, uint32_t lag, double due, bool fixed);

/* Take the earliest out (there must be one); returns its lag. */
uint32_t tarry_pending_take(tarry_pending *pending);

/* The length of this lag changes: those in its ring go into the heap. Returns 0 or TARRY_MEMORY. */
int tarry_pending_pour(tarry_pending *pending, uint32_t lag);

/* Cancel the only completion of this lag; returns when it was due, or infinity if there was none.
 */
double tarry_pending_cancel(tarry_pending *pending, uint32_t lag);

#endif
