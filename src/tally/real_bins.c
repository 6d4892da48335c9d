/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "tally/real_bins.h"

#include <math.h>
#include <stdbool.h>
#include <stdint.h>
#include <string.h>

/* Beyond this a bin's number could not be told from its neighbour's. */
static const double most_number = 0x1p52;

size_t tarry_real_bins_index(double k) {
    return (size_t)((uint64_t)(int64_t)k % TARRY_REAL_BINS);
}

static bool fits(double lowest, double highest) {
    return highest - lowest < TARRY_REAL_BINS && highest < most_number && lowest > -most_number;
}

/* Merge bins two by two. */
static void widen(tarry_real_bins_form *form, double bins[TARRY_REAL_BINS]) {
    double wide[TARRY_REAL_BINS] = {0};
    for (double k = form->lowest; k <= form->highest; k += 1.0)
        wide[tarry_real_bins_index(floor(k / 2.0))] += bins[tarry_real_bins_index(k)];
    memcpy(bins, wide, sizeof wide);
    form->width *= 2.0;
    form->lowest = floor(form->lowest / 2.0);
    form->highest = floor(form->highest / 2.0);
}

static void start(tarry_real_bins_form *form, double least, double value) {
    form->width = least;
    while (!fits(floor(value / form->width), floor(value / form->width)))
        form->width *= 2.0;
    form->lowest = form->highest = floor(value / form->width);
}

static void make_room(tarry_real_bins_form *form, double bins[TARRY_REAL_BINS], double value) {
    double k = floor(value / form->width);
    while (!fits(fmin(k, form->lowest), fmax(k, form->highest))) {
        widen(form, bins);
        k = floor(value / form->width);
    }
    form->lowest = fmin(k, form->lowest);
    form->highest = fmax(k, form->highest);
}

void tarry_real_bins_add(tarry_real_bins_form *form, double bins[TARRY_REAL_BINS], double least,
                         double value) {
    double k = floor(value / form->width);
    if (!(k >= form->lowest && k <= form->highest) || form->width <= 0.0) {
        if (!isfinite(value))
            return;
        if (form->width <= 0.0)
            start(form, least, value);
        make_room(form, bins, value);
        k = floor(value / form->width);
    }
    bins[tarry_real_bins_index(k)] += 1.0;
}

void tarry_real_bins_align(tarry_real_bins_form *one, double one_bins[TARRY_REAL_BINS],
                           tarry_real_bins_form *other, double other_bins[TARRY_REAL_BINS]) {
    if (one->width <= 0.0)
        *one = *other;
    if (other->width <= 0.0)
        *other = *one;
    while (one->width < other->width)
        widen(one, one_bins);
    while (other->width < one->width)
        widen(other, other_bins);
    while (!fits(fmin(one->lowest, other->lowest), fmax(one->highest, other->highest))) {
        widen(one, one_bins);
        widen(other, other_bins);
    }
    one->lowest = other->lowest = fmin(one->lowest, other->lowest);
    one->highest = other->highest = fmax(one->highest, other->highest);
}
