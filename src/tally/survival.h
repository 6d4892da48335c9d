/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_TALLY_SURVIVAL_H
#define TARRY_TALLY_SURVIVAL_H

/* Survival curves by Kaplan & Meier (1958, J. Am. Stat. Assoc. 53:457), of dwells and of first
 * responses.
 *
 * Times lie on a grid of fixed bins (tally/dwells.h), so that memory does not grow with cells. In
 * each bin the number that ended and the number cut off are kept. At the end of a bin, S = product
 * of (1 - ended / at risk), at risk being all that lasted beyond the bin's start: with nothing cut
 * off this is exactly the share that lasts longer. One cut off counts as at risk through its bin,
 * which the product limit also does at ties. */

#include <stdbool.h>
#include "tally/dwells.h"
#include "tally/tally.h"

enum {
    /* Bins of one fate (ended, cut off), rounded up to whole blocks, and blocks of a curve. */
    TARRY_SURVIVAL_ROOM = (TARRY_DWELL_BINS + TARRY_BLOCK - 1) / TARRY_BLOCK * TARRY_BLOCK,
    TARRY_SURVIVAL_BLOCKS = 2 * TARRY_SURVIVAL_ROOM / TARRY_BLOCK,
};

/* One of the curves that a kind keeps in its blocks, numbered from 0. */
typedef struct tarry_survival {
    const tarry_tally_set *set;
    const tarry_tally_kind *kind;
    size_t curve;
    double longest; /* no time is longer */
} tarry_survival;

/* Add a time that ended, or that was cut off. Returns 0, or 1 when memory is short. */
int tarry_survival_add(tarry_blocks *blocks, size_t curve, double time, double longest,
                       bool cut_off);

/* Called for time 0 and at the end of each bin in which something ended. */
typedef int tarry_survival_row(void *context, double time, const tarry_estimate *survival,
                               tarry_error *error);

/* Call `row` for each point of the curve, with intervals by the jackknife on the scale log(-log S).
 * A curve of nothing has no point. Stops at the first code that is not 0 and returns it. */
int tarry_survival_rows(const tarry_survival *survival, tarry_survival_row *row, void *context,
                        tarry_error *error);

/* Of a curve on which whatever is cut off is so at `longest`: the share that lasted till then, with
 * its interval as a share has it (tarry_jackknife_share), also where it is 0 or 1. */
tarry_estimate tarry_survival_end(const tarry_survival *survival);

#endif
