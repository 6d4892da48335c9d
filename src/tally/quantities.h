/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_TALLY_QUANTITIES_H
#define TARRY_TALLY_QUANTITIES_H

/* What bursts.csv and signals.csv tell of: names and units, in the order of the rows. One list for
 * all that fill these tables. */

#include "model/network.h"
#include "tally/moments.h"

typedef enum tarry_burst_unit {
    TARRY_UNIT_PER_TIME,
    TARRY_UNIT_TIME,
    TARRY_UNIT_SHARE,
    TARRY_UNIT_INITIATIONS
} tarry_burst_unit;

/* X(quantity, unit): of a gene's alleles */
#define TARRY_BURST_QUANTITIES(X)                                                                  \
    X(burst_frequency, PER_TIME)                                                                   \
    X(burst_size_mean, INITIATIONS)                                                                \
    X(burst_size_sd, INITIATIONS)                                                                  \
    X(silent_fraction, SHARE)                                                                      \
    X(loud_frequency, PER_TIME)                                                                    \
    X(loud_size_mean, INITIATIONS)                                                                 \
    X(active_time_mean, TIME)                                                                      \
    X(inactive_time_mean, TIME)                                                                    \
    X(interval_mean, TIME)                                                                         \
    X(interval_sd, TIME)                                                                           \
    X(active_fraction, SHARE)                                                                      \
    X(initiation_rate, PER_TIME)                                                                   \
    X(outside_fraction, SHARE)

typedef enum tarry_burst_quantity {
#define TARRY_QUANTITY_ENUM(name, unit) TARRY_##name,
    TARRY_BURST_QUANTITIES(TARRY_QUANTITY_ENUM)
#undef TARRY_QUANTITY_ENUM
        TARRY_N_BURST_QUANTITIES
} tarry_burst_quantity;

const char *tarry_burst_quantity_name(tarry_burst_quantity quantity);

/* The text of its unit, which may be put into `room`. */
const char *tarry_burst_quantity_unit(const tarry_network *network, const tarry_gene *gene,
                                      tarry_burst_quantity quantity, char room[64]);

/* Rows made of moments: of a product in bursts.csv, of a signal in signals.csv. */
typedef struct tarry_moment_row {
    int moment; /* TARRY_MEAN, ... */
    const char *ending, *unit;
} tarry_moment_row;

enum { TARRY_MOMENT_ROWS = 3 };
extern const tarry_moment_row tarry_product_rows[TARRY_MOMENT_ROWS];
extern const tarry_moment_row tarry_signal_rows[TARRY_MOMENT_ROWS];

/* "transcript" of "vela.transcript". */
const char *tarry_product_name(const char *species, const char *gene);

#endif
