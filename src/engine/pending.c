/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "engine/pending.h"

#include "base/error.h"
#include "base/memory.h"

#include <math.h>
#include <stdlib.h>

__extension__ typedef __int128 wide;
__extension__ typedef unsigned __int128 unsigned_wide;

static const tarry_pending_entry never = {INT64_MAX, UINT64_MAX};

/* One number of 128 bits for (due, lag, order scheduled): compared without a branch, since which of
 * two children comes first cannot be foretold. */
static inline wide place_of(tarry_pending_entry entry) {
    /* Unsigned, since order may be negative and such numbers must not be shifted to the left. */
    return (wide)((unsigned_wide)(uint64_t)entry.order << 64 | entry.key);
}

static inline bool is_before(tarry_pending_entry one, tarry_pending_entry other) {
    return place_of(one) < place_of(other);
}

static uint32_t lag_of(tarry_pending_entry entry) {
    return (uint32_t)(entry.key >> TARRY_PENDING_LAG_SHIFT);
}

static bool is_ring_head(tarry_pending_entry entry) {
    return entry.key & 1;
}

int tarry_pending_init(tarry_pending *pending, uint32_t n_lags, tarry_error *error) {
    *pending = (tarry_pending){.n_lags = n_lags};
    if (n_lags >= TARRY_PENDING_MOST_LAGS)
        return tarry_fail(error, TARRY_LIMIT, "%u lags are too many: at most %d can be followed",
                          n_lags, TARRY_PENDING_MOST_LAGS - 1);
    pending->rings = tarry_calloc(n_lags, sizeof *pending->rings);
    const size_t start = 64;
    pending->heap = tarry_calloc(start, sizeof *pending->heap);
    if (!pending->rings || !pending->heap) {
        tarry_pending_release(pending);
        return tarry_fail_memory(error, "completions under way");
    }
    pending->heap_capacity = start;
    tarry_pending_clear(pending);
    return TARRY_OK;
}

void tarry_pending_release(tarry_pending *pending) {
    for (uint32_t lag = 0; pending->rings && lag < pending->n_lags; lag++)
        free(pending->rings[lag].entries);
    free(pending->rings);
    free(pending->heap);
    *pending = (tarry_pending){0};
}

void tarry_pending_clear(tarry_pending *pending) {
    for (uint32_t lag = 0; lag < pending->n_lags; lag++)
        pending->rings[lag].head = pending->rings[lag].n = 0;
    pending->n_heap = 0;
    pending->n_scheduled = 0;
    pending->n = 0;
    pending->heap[0] = never;
}

/* Let `entry` rise from the hole at i. */
static void sift_up(tarry_pending_entry *heap, size_t i, tarry_pending_entry entry) {
    while (i > 0) {
        const size_t parent = (i - 1) / 2;
        if (!is_before(entry, heap[parent]))
            break;
        heap[i] = heap[parent];
        i = parent;
    }
    heap[i] = entry;
}

/* Let `entry` sink from the hole at i in a heap of n: the hole goes all the way down first, since
 * an entry from the end or from a ring mostly belongs near the leaves (Wegener 1993, Theor. Comput.
 * Sci. 118:81). */
static void sift_down(tarry_pending_entry *heap, size_t n, size_t i, tarry_pending_entry entry) {
    const size_t top = i;
    size_t child = 2 * i + 1;
    while (child + 1 < n) {
        child += is_before(heap[child + 1], heap[child]);
        heap[i] = heap[child];
        i = child;
        child = 2 * i + 1;
    }
    if (child < n) {
        heap[i] = heap[child];
        i = child;
    }
    while (i > top && is_before(entry, heap[(i - 1) / 2])) {
        heap[i] = heap[(i - 1) / 2];
        i = (i - 1) / 2;
    }
    heap[i] = entry;
}

static int grow_heap(tarry_pending *pending) {
    void *heap = pending->heap;
    const int short_of = tarry_grow(&heap, &pending->heap_capacity, pending->n_heap + 1,
                                    sizeof *pending->heap);
    pending->heap = heap;
    return short_of ? TARRY_MEMORY : TARRY_OK;
}

static int push(tarry_pending *pending, tarry_pending_entry entry) {
    if (pending->n_heap == pending->heap_capacity && grow_heap(pending))
        return TARRY_MEMORY;
    sift_up(pending->heap, pending->n_heap++, entry);
    return TARRY_OK;
}

/* Take the entry at place i out of the heap. */
static void take_out(tarry_pending *pending, size_t i) {
    const tarry_pending_entry last = pending->heap[--pending->n_heap];
    if (pending->n_heap == 0) {
        pending->heap[0] = never;
    } else if (i < pending->n_heap) {
        if (i > 0 && is_before(last, pending->heap[(i - 1) / 2]))
            sift_up(pending->heap, i, last);
        else
            sift_down(pending->heap, pending->n_heap, i, last);
    }
}

static int grow_ring(tarry_ring *ring) {
    const uint32_t capacity = ring->capacity ? 2 * ring->capacity : 16;
    tarry_pending_entry *entries = capacity > ring->capacity
                                       ? tarry_calloc(capacity, sizeof *entries)
                                       : NULL;
    if (!entries)
        return TARRY_MEMORY;
    for (uint32_t i = 0; i < ring->n; i++)
        entries[i] = ring->entries[(ring->head + i) & (ring->capacity - 1)];
    free(ring->entries);
    *ring = (tarry_ring){.entries = entries, .n = ring->n, .capacity = capacity};
    return TARRY_OK;
}

int tarry_pending_add(tarry_pending *pending, uint32_t lag, double due, bool fixed) {
    tarry_pending_entry entry = {tarry_time_order(due), (uint64_t)lag << TARRY_PENDING_LAG_SHIFT |
                                                            pending->n_scheduled << 1 | fixed};
    if (!fixed) {
        if (push(pending, entry))
            return TARRY_MEMORY;
    } else {
        tarry_ring *ring = &pending->rings[lag];
        if (ring->n == ring->capacity && grow_ring(ring))
            return TARRY_MEMORY;
        if (ring->n == 0 && push(pending, entry))
            return TARRY_MEMORY;
        ring->entries[(ring->head + ring->n++) & (ring->capacity - 1)] = entry;
    }
    pending->n_scheduled++;
    pending->n++;
    return TARRY_OK;
}

uint32_t tarry_pending_take(tarry_pending *pending) {
    const tarry_pending_entry first = pending->heap[0];
    const uint32_t lag = lag_of(first);
    pending->n--;
    if (is_ring_head(first)) {
        tarry_ring *ring = &pending->rings[lag];
        ring->head = (ring->head + 1) & (ring->capacity - 1);
        if (--ring->n > 0) {
            sift_down(pending->heap, pending->n_heap, 0, ring->entries[ring->head]);
            return lag;
        }
    }
    take_out(pending, 0);
    return lag;
}

static size_t find(const tarry_pending *pending, uint32_t lag) {
    size_t i = 0;
    while (i < pending->n_heap && lag_of(pending->heap[i]) != lag)
        i++;
    return i;
}

int tarry_pending_pour(tarry_pending *pending, uint32_t lag) {
    tarry_ring *ring = &pending->rings[lag];
    if (ring->n == 0)
        return TARRY_OK;
    /* The head stands in the heap already: it only ceases to speak for the ring. */
    size_t i = 0;
    while (lag_of(pending->heap[i]) != lag || !is_ring_head(pending->heap[i]))
        i++;
    pending->heap[i].key &= ~(uint64_t)1;
    for (uint32_t k = 1; k < ring->n; k++) {
        tarry_pending_entry entry = ring->entries[(ring->head + k) & (ring->capacity - 1)];
        entry.key &= ~(uint64_t)1;
        if (push(pending, entry))
            return TARRY_MEMORY;
    }
    ring->head = ring->n = 0;
    return TARRY_OK;
}

double tarry_pending_cancel(tarry_pending *pending, uint32_t lag) {
    const size_t i = find(pending, lag);
    if (i == pending->n_heap)
        return INFINITY;
    const double due = tarry_order_time(pending->heap[i].order);
    pending->rings[lag].head = pending->rings[lag].n = 0;
    take_out(pending, i);
    pending->n--;
    return due;
}
