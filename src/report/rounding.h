/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_REPORT_ROUNDING_H
#define TARRY_REPORT_ROUNDING_H

#include "base/number.h"

/* Numbers for reading: as many digits as their interval bears. Files have all digits. */

enum { TARRY_ROUNDED = TARRY_NUMBER_SIZE, TARRY_ROUND_MOST = 7 };

typedef struct tarry_rounded {
    char value[TARRY_ROUNDED]; /* "-" where there is none */
    char low[TARRY_ROUNDED];   /* "" where there is no interval */
    char high[TARRY_ROUNDED];
} tarry_rounded;

/* Value and bounds to the same decimal, at which half the interval has two digits (at least one
 * digit of the value and at most `most` are kept). Without an interval (NaN, or of no width): four
 * digits. */
void tarry_round(double value, double low, double high, int most, tarry_rounded *out);

/* A number by itself, to four digits. */
void tarry_round_plain(double value, char out[TARRY_ROUNDED]);

#endif
