/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_TALLY_KINDS_H
#define TARRY_TALLY_KINDS_H

/* The one list of all estimators. A kind NAME is `tarry_tally_NAME` in tally_NAME.c; add it here.
 * The order is that in which tables are filled. */

#include "tally/tally.h"

#define TARRY_TALLY_KINDS(X)                                                                       \
    X(moments)                                                                                     \
    X(distribution)                                                                                \
    X(bursts)                                                                                      \
    X(burst_sizes)                                                                                 \
    X(dwells)                                                                                      \
    X(pooled)                                                                                      \
    X(autocorrelation)                                                                             \
    X(visible)                                                                                     \
    X(transit)                                                                                     \
    X(lags)                                                                                        \
    X(first)                                                                                       \
    X(drift)

/* Rows that a window has in bursts.csv and signals.csv: of a gene whose bursts can be told (of
 * another, its initiation rate alone), of each of its recorded products, and of a recorded signal;
 * and of a signal with thresholds so many more.
 */
enum {
    TARRY_BURST_FIGURES = 13,
    TARRY_PRODUCT_FIGURES = 4,
    TARRY_SIGNAL_FIGURES = 6,
    TARRY_VISIBLE_FIGURES = 4
};

#define TARRY_TALLY_DECLARE(name) extern const tarry_tally_kind tarry_tally_##name;
TARRY_TALLY_KINDS(TARRY_TALLY_DECLARE)
#undef TARRY_TALLY_DECLARE

#endif
