/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_ENGINE_CELL_H
#define TARRY_ENGINE_CELL_H

/* One cell, from its start to its record. */

#include "engine/record.h"
#include "model/network.h"
#include "tarry/error.h"

typedef struct tarry_engine tarry_engine; /* set up once for a network; const, shared by threads */
typedef struct tarry_cell tarry_cell;     /* workspace of one thread */
typedef struct tarry_sampler tarry_sampler;

/* Prepare a network: quantile tables, hot arrays. `sampler` is a word ("direct"); unknown words are
 * TARRY_INPUT, those of later versions TARRY_NOT_YET. The network must outlive the engine. */
int tarry_engine_new(const tarry_network *network, const char *sampler, tarry_engine **engine,
                     tarry_error *error);
void tarry_engine_free(tarry_engine *engine);

int tarry_cell_new(const tarry_engine *engine, tarry_cell **cell, tarry_error *error);
void tarry_cell_free(tarry_cell *cell);

/* Run cell `number` (from 0) of the network's seed and fill `record` (made for this network; reset
 * here). Errors name cell, time and state: TARRY_RUN (a propensity that is negative, infinite or
 * not a number, a completion that lacks what it uses, a count past 2^53), TARRY_LIMIT (pending
 * completions, runaway firings), TARRY_MEMORY. After an error the cell can be used again. */
int tarry_cell_run(tarry_cell *cell, int64_t number, tarry_record *record, tarry_error *error);

/* The same without filling a record: nothing but the events (for timing). Returns in *firings and
 * *completions what happened. */
int tarry_cell_run_bare(tarry_cell *cell, int64_t number, int64_t *firings, int64_t *completions,
                        tarry_error *error);

#endif
