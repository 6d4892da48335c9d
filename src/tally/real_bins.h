/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_TALLY_REAL_BINS_H
#define TARRY_TALLY_REAL_BINS_H

/* Bins for real values, of a width that doubles until 128 of them hold all values.
 *
 * A width is `least` times a power of two and a bin starts at a multiple of it, so that two bins
 * merge exactly into one of the next width, and the width in the end depends on the values alone,
 * not on their order. Bin k, [k width, (k + 1) width), is kept at k mod 128: nothing moves when a
 * value comes below the lowest. */

#include <stddef.h>

enum { TARRY_REAL_BINS = 128 };

typedef struct tarry_real_bins_form {
    double width;           /* 0: nothing counted yet */
    double lowest, highest; /* numbers of the outermost bins in use; whole, below 2^52 */
} tarry_real_bins_form;

enum { TARRY_REAL_BINS_FORM = sizeof(tarry_real_bins_form) / sizeof(double) };

/* Count a value; one that is not finite is left out. `least` is a power of two, always the same for
 * the same bins. */
void tarry_real_bins_add(tarry_real_bins_form *form, double bins[TARRY_REAL_BINS], double least,
                         double value);

/* Give both the same form, which holds the values of both. */
void tarry_real_bins_align(tarry_real_bins_form *one, double one_bins[TARRY_REAL_BINS],
                           tarry_real_bins_form *other, double other_bins[TARRY_REAL_BINS]);

/* Where bin k is kept. */
size_t tarry_real_bins_index(double k);

#endif
