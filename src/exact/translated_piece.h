/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_EXACT_TRANSLATED_PIECE_H
#define TARRY_EXACT_TRANSLATED_PIECE_H

/* One piece of V_s - 1 (translated.h). */

#include "exact/translated.h"

typedef struct tarry_piece_work tarry_piece_work;

/* Room for `n` functions. 0 or TARRY_MEMORY. */
int tarry_piece_work_new(tarry_piece_work **work, size_t n, tarry_error *error);
void tarry_piece_work_free(tarry_piece_work *work); /* NULL is fine */

/* Make ready for a stage, the next one being worked out. 0 or TARRY_MEMORY. */
int tarry_piece_prepare(tarry_piece_work *work, const tarry_translated *t, size_t stage,
                        tarry_error *error);

/* Fill re, im [TARRY_FAN_NODES][t->n] with V_s - 1 of stage s at the nodes of the piece [from, to],
 * which begins where the last one of the stage's fan ends; the next stage is worked out. */
void tarry_piece_fill(tarry_piece_work *work, const tarry_translated *t, size_t stage, double from,
                      double to, double *re, double *im);

#endif
