/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_BASE_LOGARITHM_H
#define TARRY_BASE_LOGARITHM_H

/* The natural logarithm for drawing exponential times: only +, - and * in a fixed order, so that
 * scalar and vector builds of every width give the same bits. */

#include <stdint.h>
#include <string.h>

enum { TARRY_LOG_STEPS = 128 };

typedef struct tarry_log_entry {
    double inverse;   /* 1/c for the middle c of the step of m in [1, 2); 1 and 1/2 at the ends */
    double logarithm; /* -log(inverse), less log 2 in the upper half, where the exponent gains 1 */
} tarry_log_entry;

extern const tarry_log_entry tarry_log_table[TARRY_LOG_STEPS];

/* log(x) for normal positive x, to 2e-16 plus 2 units in the last place, relative within 2^-8 of 1.
 * Method: x = 2^e m with m in [3/4, 3/2), m = c (1 + r) with c from a table and |r| <= 2^-7, a
 * polynomial in r. Next to 1 the table holds c = 1, so that small results keep their digits and
 * log(x) < 0 for every x < 1. (Tang 1990, ACM Trans. Math. Softw. 16:378.) */
static inline double tarry_log(double x) {
    uint64_t bits;
    memcpy(&bits, &x, sizeof bits);
    const int64_t exponent = (int64_t)((bits + (UINT64_C(1) << 51)) >> 52) - 1023;
    const tarry_log_entry entry = tarry_log_table[(bits >> 45) & (TARRY_LOG_STEPS - 1)];
    const uint64_t mantissa = (bits & UINT64_C(0x000fffffffffffff)) | UINT64_C(0x3ff0000000000000);
    double m;
    memcpy(&m, &mantissa, sizeof m);
    const double r = m * entry.inverse - 1;
    const double r2 = r * r;
    const double low = -0.5 + r * (1.0 / 3);
    const double middle = -0.25 + r * 0.2;
    const double high = -1.0 / 6 + r * (1.0 / 7);
    const double tail = low + r2 * (middle + r2 * high);
    const double whole = (double)exponent * 0x1.62e42fefa39efp-1 + entry.logarithm;
    return whole + (r + r2 * tail);
}

#endif
