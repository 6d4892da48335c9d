/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_TALLY_DWELLS_H
#define TARRY_TALLY_DWELLS_H

/* The grid of dwell curves: bins (start, end] of lengths up to `longest`, 32 to each doubling over
 * 20 doublings, so that a bin is at most 1/32 of where it starts wide; what is shorter than
 * longest/2^20 shares the first bin, which ends there. */

#include <math.h>
#include <stdint.h>

enum {
    TARRY_DWELL_OCTAVE = 32,
    TARRY_DWELL_OCTAVES = 20,
    TARRY_DWELL_BINS = TARRY_DWELL_OCTAVE * TARRY_DWELL_OCTAVES + 1,
};

/* The bin of a length x >= 0. */
static inline uint32_t tarry_dwell_bin(double x, double longest) {
    int exponent;
    const double m = frexp(x / longest, &exponent); /* x = m 2^exponent longest, m in [1/2, 1) */
    const double step = ceil((m - 0.5) * (2 * TARRY_DWELL_OCTAVE));
    const double bin = (double)(TARRY_DWELL_OCTAVES + exponent - 1) * TARRY_DWELL_OCTAVE + step;
    if (!(bin > 0.0) || !(x > 0.0))
        return 0;
    return bin < TARRY_DWELL_BINS ? (uint32_t)bin : TARRY_DWELL_BINS - 1;
}

/* Where a bin ends. */
static inline double tarry_dwell_bin_end(uint32_t bin, double longest) {
    const int octave = (int)(bin / TARRY_DWELL_OCTAVE);
    const double part = (double)(bin % TARRY_DWELL_OCTAVE) / TARRY_DWELL_OCTAVE;
    return ldexp((1.0 + part) * longest, octave - TARRY_DWELL_OCTAVES);
}

#endif
