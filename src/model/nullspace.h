/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_MODEL_NULLSPACE_H
#define TARRY_MODEL_NULLSPACE_H

/* Whole-number solutions y of equations row . y = 0, exactly. */

#include <stdbool.h>
#include <stddef.h>
#include <stdint.h>

typedef struct tarry_nullspace {
    size_t n;       /* unknowns */
    int64_t *row;   /* [n]: put an equation here, then take it */
    int64_t *basis; /* [n_basis][n], once solved */
    size_t n_basis;
    int64_t *pivots; /* [column][n]: the row that leads in this column, where `leads` */
    bool *leads;     /* [column] */
} tarry_nullspace;

/* 0, or 1 when memory is short. Release accepts a zeroed or half-built one. */
int tarry_nullspace_init(tarry_nullspace *space, size_t n);
void tarry_nullspace_release(tarry_nullspace *space);

/* Take the equation in `row` in (it is spoilt). False where a number passes 64 bits. */
bool tarry_nullspace_take(tarry_nullspace *space);

/* Find all independent solutions, made readable: without common divisors, without negative numbers
 * where that can be had, none contained in another, by the first unknown in them. False where a
 * number passes 64 bits. */
bool tarry_nullspace_solve(tarry_nullspace *space);

#endif
