/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_TALLY_POOLED_LAGS_H
#define TARRY_TALLY_POOLED_LAGS_H

/* Alleles of one gene have lags of one name (a promoter state that lasts, a clearance), which are
 * pooled as bursts are. */

#include <stdbool.h>
#include "model/network.h"

/* Is it the same step as a lag before it? Then that one speaks for it. */
bool tarry_is_like_earlier_lag(const tarry_network *network, uint32_t lag);

/* The next lag after `after` that is the same step as `lag` (of another allele), or n_lags. */
uint32_t tarry_next_like_lag(const tarry_network *network, uint32_t lag, uint32_t after);

#endif
