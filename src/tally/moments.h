/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_TALLY_MOMENTS_H
#define TARRY_TALLY_MOMENTS_H

/* Moments out of power sums about a shift, and the figures made of them. */

#include <math.h>

/* Four figures that every name gets. */
enum { TARRY_MEAN, TARRY_SD, TARRY_FANO, TARRY_CV2, TARRY_N_MOMENTS };

/* From mean and variance; NaN where undefined (a variance below 0 is rounding off 0). */
static inline void tarry_moments_of(double mean, double variance, double figures[TARRY_N_MOMENTS]) {
    variance = variance < 0.0 ? 0.0 : variance;
    figures[TARRY_MEAN] = mean;
    figures[TARRY_SD] = sqrt(variance);
    figures[TARRY_FANO] = variance / mean;
    figures[TARRY_CV2] = mean > 0.0 || mean < 0.0 ? variance / (mean * mean) : NAN;
}

#endif
