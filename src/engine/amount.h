/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_ENGINE_AMOUNT_H
#define TARRY_ENGINE_AMOUNT_H

/* Random numbers of molecules, by inversion of one 64-bit number. */

#include "model/network.h"

/* `mean` is the segment's; unused for tables. Geometric from `least`: P(n) = (1 - q) q^(n - least)
 * with q = (mean - least) / (1 + mean - least). Exact for Poisson means up to 1e9. */
double tarry_amount_draw(const tarry_amount *amount, double mean, uint64_t bits);

#endif
