/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_MODEL_READ_RUN_H
#define TARRY_MODEL_READ_RUN_H

/* The parts of reading `run:` and `limits:`, called by tarry_read_run in this order. All fill
 * builder->network->run or builder->channels; `run` is the map under `run:` (empty where there is
 * none). */

#include "model/builder.h"

/* The value of a key of `run:`: from the command line, else from the file. */
typedef struct tarry_run_value {
    const tarry_node *node; /* NULL: neither gives one */
    tarry_node given_node;  /* stands for the command line's text */
    const tarry_override *given;
} tarry_run_value;

void tarry_run_find(const tarry_builder *builder, const tarry_node *run, const char *key,
                    tarry_run_value *value);

/* Put "--until 5 x: " before an error that the command line's value has made. Returns `code`. */
int tarry_run_context(const tarry_run_value *value, int code, tarry_error *error);

/* The map under `run:`; its keys are checked. */
int tarry_run_map(const tarry_builder *builder, const tarry_node **run, tarry_error *error);

/* `until`, which the protocol must know before the rest of `run:` is read. */
int tarry_read_until(tarry_builder *builder, const tarry_node *run, double *until,
                     tarry_error *error);

/* settle, until, every and what follows from them: frames and lags; snapshots. */
int tarry_read_times(tarry_builder *builder, const tarry_node *run, tarry_error *error);

/* Windows and the spans between their bounds; needs frames and segments. */
int tarry_read_windows(tarry_builder *builder, const tarry_node *run, tarry_error *error);

/* The texts that commas outside parentheses part, as list nodes: for values from the command line.
 */
int tarry_run_split(tarry_arena *arena, const tarry_node *scalar, tarry_node *list,
                    tarry_error *error);

/* Names in the output, and which of them are recorded. */
int tarry_read_record(tarry_builder *builder, const tarry_node *run, tarry_error *error);

/* Thresholds of recorded signals; needs names. */
int tarry_read_visible(tarry_builder *builder, const tarry_node *run, tarry_error *error);

/* `limits:`. */
int tarry_read_limits(tarry_builder *builder, tarry_error *error);

#endif
