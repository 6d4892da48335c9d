/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_ENGINE_DRAW_H
#define TARRY_ENGINE_DRAW_H

/* Drawing lags by inversion: one 64-bit number for each elementary law in a lag, none for a fixed
 * one. Closed form where there is one, else a table of quantiles. */

#include <stdint.h>
#include "base/logarithm.h"
#include "base/memory.h"
#include "base/random.h"
#include "model/law.h"

typedef struct tarry_drawer tarry_drawer; /* one law made ready; const once built */

/* Drawers for laws share tables where laws have the same shape. */
typedef struct tarry_drawer_set tarry_drawer_set;

int tarry_drawer_set_new(tarry_drawer_set **set, tarry_error *error);
void tarry_drawer_set_free(tarry_drawer_set *set);

/* A set that makes no tables and takes those of `lender`, which must outlive it: a law of another
 * shape (beyond 1e-12 of it) is drawn by solving for its quantile, which is slow. */
int tarry_drawer_set_new_from(const tarry_drawer_set *lender, tarry_drawer_set **set,
                              tarry_error *error);

/* Forget all drawers; those of a set with tables of its own must stay. */
void tarry_drawer_set_clear(tarry_drawer_set *set);

/* A drawer for `law` (checked before; must outlive the set). Errors: TARRY_MEMORY, TARRY_NUMERIC
 * where a table cannot be brought under 1e-9 of the lag. The set owns the drawer. */
int tarry_drawer_set_add(tarry_drawer_set *set, const tarry_law *law, const tarry_drawer **drawer,
                         tarry_error *error);

/* The length of a lag that never varies, or -1. */
double tarry_drawer_fixed(const tarry_drawer *drawer);

/* Draw one lag. */
double tarry_draw(const tarry_drawer *drawer, tarry_stream *stream);

/* Draw what is left of a lag that is met at a random moment, as a dwell is at a steady start: its
 * density is survival / mean. An elementary law takes one number, by tarry_law_remaining_quantile.
 * A mix: one number chooses the part, by share times mean. A total: one number chooses the part
 * that is under way, by its mean; what is left of that is drawn, then the later parts, in order. */
double tarry_draw_remaining(const tarry_drawer *drawer, tarry_stream *stream);

/* The lag at u = tarry_unit(bits), for drawers of one elementary law (tests). Exponential and
 * Weibull lags fall with u, all others rise. */
double tarry_draw_at(const tarry_drawer *drawer, uint64_t bits);

/* Bytes of all tables of the set. */
size_t tarry_drawer_set_bytes(const tarry_drawer_set *set);

#endif
