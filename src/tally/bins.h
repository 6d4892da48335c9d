/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_TALLY_BINS_H
#define TARRY_TALLY_BINS_H

/* Bins for counts: one each below 1,024, then 64 an octave up to 2^53, so that a bin is never wider
 * than 1/64 of where it starts. */

#include <stdint.h>

enum {
    TARRY_BINS_SINGLE = 1024, /* 2^10 */
    TARRY_BINS_OCTAVE = 64,
    TARRY_BINS = TARRY_BINS_SINGLE + (53 - 10) * TARRY_BINS_OCTAVE, /* a multiple of TARRY_BLOCK */
};

/* The bin of a whole number from 0 on; from 2^53 on the last one. */
static inline uint32_t tarry_bin_of(double count) {
    if (count < TARRY_BINS_SINGLE)
        return (uint32_t)count;
    if (count >= 0x1p53)
        return TARRY_BINS - 1;
    const uint64_t n = (uint64_t)count;
    const uint32_t octave = 63 - (uint32_t)__builtin_clzll(n); /* 10 .. 52 */
    const uint32_t step = (uint32_t)(n >> (octave - 6)) & (TARRY_BINS_OCTAVE - 1);
    return TARRY_BINS_SINGLE + (octave - 10) * TARRY_BINS_OCTAVE + step;
}

/* Least count of a bin, and how many counts fall into it. */
static inline double tarry_bin_width(uint32_t bin) {
    if (bin < TARRY_BINS_SINGLE)
        return 1.0;
    return (double)(UINT64_C(1) << ((bin - TARRY_BINS_SINGLE) / TARRY_BINS_OCTAVE + 4));
}

static inline double tarry_bin_start(uint32_t bin) {
    if (bin < TARRY_BINS_SINGLE)
        return bin;
    return tarry_bin_width(bin) *
           (TARRY_BINS_OCTAVE + (bin - TARRY_BINS_SINGLE) % TARRY_BINS_OCTAVE);
}

#endif
