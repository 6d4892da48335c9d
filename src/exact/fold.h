/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_EXACT_FOLD_H
#define TARRY_EXACT_FOLD_H

/* Integrals of one function of age times another one moved along it, as a function of how far. Both
 * are 0 before age 0, so that what is asked for is taken apart into these. Errors: TARRY_MEMORY,
 * TARRY_NUMERIC; `out` is zeroed before, and stays empty where there is nothing. */

#include "exact/curve.h"

/* At x: the integral of one(u) other(x - u). */
int tarry_fold(const tarry_curve *one, const tarry_curve *other, double horizon, tarry_curve *out,
               tarry_error *error);

/* At y >= 0: the integral of one(u) other(u + y). */
int tarry_fold_along(const tarry_curve *one, const tarry_curve *other, double horizon,
                     tarry_curve *out, tarry_error *error);

/* At y >= 0: the integral over all h of f(h) g(y - h), f and g being functions of positive and
 * negative numbers: f(h) is ahead(h) for h > 0 and back(-h) below. */
typedef struct tarry_two_sided {
    const tarry_curve *ahead, *back;
} tarry_two_sided;
double tarry_fold_two_sided(const tarry_two_sided *f, const tarry_two_sided *g, double y);
int tarry_fold_both(const tarry_two_sided *f, const tarry_two_sided *g, double horizon,
                    tarry_curve *out, tarry_error *error);

#endif
