/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "tally/quantities.h"

#include <stdio.h>
#include <string.h>

static const struct {
    const char *name;
    tarry_burst_unit unit;
} quantities[TARRY_N_BURST_QUANTITIES] = {
#define QUANTITY_ROW(name, unit) {#name, TARRY_UNIT_##unit},
    TARRY_BURST_QUANTITIES(QUANTITY_ROW)
#undef QUANTITY_ROW
};

const tarry_moment_row tarry_product_rows[TARRY_MOMENT_ROWS] = {
    {TARRY_MEAN, "mean", "molecules per cell"},
    {TARRY_FANO, "fano", "1"},
    {TARRY_CV2, "cv2", "1"},
};

const tarry_moment_row tarry_signal_rows[TARRY_MOMENT_ROWS] = {
    {TARRY_MEAN, "mean", "signal"},
    {TARRY_SD, "sd", "signal"},
    {TARRY_CV2, "cv2", "1"},
};

const char *tarry_burst_quantity_name(tarry_burst_quantity quantity) {
    return quantities[quantity].name;
}

const char *tarry_burst_quantity_unit(const tarry_network *network, const tarry_gene *gene,
                                      tarry_burst_quantity quantity, char room[64]) {
    switch (quantities[quantity].unit) {
    case TARRY_UNIT_PER_TIME:
        snprintf(room, 64, "/%.30s per %s", network->time_unit,
                 gene->promoters.from < gene->promoters.to ? "allele" : "cell");
        return room;
    case TARRY_UNIT_TIME:
        return network->time_unit;
    case TARRY_UNIT_SHARE:
        return "1";
    case TARRY_UNIT_INITIATIONS:
        break;
    }
    return "initiations";
}

const char *tarry_product_name(const char *species, const char *gene) {
    const size_t n = strlen(gene);
    return strncmp(species, gene, n) == 0 && species[n] == '.' ? species + n + 1 : species;
}
