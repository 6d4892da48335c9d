#ifndef TARRY_ENGINE_PENDING_H
#define TARRY_ENGINE_PENDING_H

/* Completions under way, in the order (due, lag, order scheduled).
 *
 * Completions of one lag and one length finish in the order they began, so they wait in a ring of
 * which only the head stands in the heap; drawn lengths go into the heap one by one. The heap is a
 * flat binary heap whose root is always valid: an entry due at infinity stands in an empty one. */

#include <stdbool.h>
#include <stddef.h>
#include <stdint.h>
#include "tarry/error.h"

/* 24 bits for the lag, 39 for the order scheduled, the lowest for "head of a ring". */
enum { TARRY_PENDING_LAG_SHIFT = 40, TARRY_PENDING_MOST_LAGS = 1 << 24 };

typedef struct tarry_pending_entry {
    double due;
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
    return pending->heap[0].due;
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
