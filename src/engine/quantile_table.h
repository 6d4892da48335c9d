/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_ENGINE_QUANTILE_TABLE_H
#define TARRY_ENGINE_QUANTILE_TABLE_H

/* Tables of quantiles: a lag out of one 64-bit number by looking up a cubic.
 *
 * u = tarry_unit(bits) is taken from its nearer end: v = u below 1/2, else v = 1 - u. Each octave
 * of v, [2^-(j+1), 2^-j) for j = 1 .. 52, is cut into the same number of equal intervals, a power
 * of two, with one cubic each. So the tails are as fine as they need to be, and octave, interval
 * and place within it are the bits of v as they stand in a double. */

#include <stdint.h>
#include <string.h>
#include "model/law.h"

enum {
    TARRY_QUANTILE_OCTAVES = 52,
    TARRY_QUANTILE_LOG2_FEWEST = 4, /* 16 to 1024 intervals an octave: 53 kB to 3.4 MB */
    TARRY_QUANTILE_LOG2_MOST = 10,
};

/* Power-basis coefficients in the place t within the interval, 0 <= t < 1. */
typedef struct tarry_cubic {
    double c[4];
} tarry_cubic;

typedef struct tarry_quantile_table {
    const tarry_cubic *cubics; /* [side: low, high][octave, outermost first][interval] */
    uint32_t log2_intervals;   /* of one octave */
    void *memory;
} tarry_quantile_table;

/* Make the table of a continuous law, refined until its error at the middle and the quarter points
 * is under 1e-9 of the lag (of a millionth of the mean, for lags below that). TARRY_MEMORY;
 * TARRY_NUMERIC where 1024 intervals an octave do not do. */
int tarry_quantile_table_init(tarry_quantile_table *table, const tarry_law *law,
                              tarry_error *error);
void tarry_quantile_table_release(tarry_quantile_table *table);
size_t tarry_quantile_table_bytes(const tarry_quantile_table *table);

/* The quantile at u = tarry_unit(bits). */
static inline double tarry_quantile_table_at(const tarry_cubic *cubics, uint32_t log2_intervals,
                                             uint64_t bits) {
    const uint64_t side = bits >> 63;
    const double v = (double)(int64_t)((bits ^ (0 - side)) >> 12) + 0.5; /* 2^52 v */
    uint64_t pattern;
    memcpy(&pattern, &v, sizeof pattern);
    const uint64_t octave_0 = UINT64_C(1022) << log2_intervals; /* of 0.5, the least v */
    const uint64_t row = (pattern >> (52 - log2_intervals)) - octave_0;
    const uint64_t within = (pattern << log2_intervals) & UINT64_C(0x000fffffffffffff);
    const uint64_t place = within | UINT64_C(0x3ff0000000000000);
    double t;
    memcpy(&t, &place, sizeof t);
    t -= 1;
    const tarry_cubic *cubic = cubics + ((side * TARRY_QUANTILE_OCTAVES) << log2_intervals) + row;
    return cubic->c[0] + t * (cubic->c[1] + t * (cubic->c[2] + t * cubic->c[3]));
}

#endif
