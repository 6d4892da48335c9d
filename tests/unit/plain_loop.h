/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_TESTS_PLAIN_LOOP_H
#define TARRY_TESTS_PLAIN_LOOP_H

/* One cell as simply as the literature writes it, by docs/engine.md and without a look at the
 * engine: every propensity anew in every pass, pending completions in one list that is scanned from
 * end to end, frames worked out when they are due. What it shares with the engine: drawing a lag or
 * an amount, the logarithm, the value of an expression, the arrays of a record. */

#include "engine/record.h"
#include "model/network.h"
#include "tarry/error.h"

/* Fill `record` (made for this network) with cell `cell`. The code of an error is the engine's, its
 * message is not. */
int plain_cell_run(const tarry_network *network, int64_t cell, tarry_record *record,
                   tarry_error *error);

#endif
