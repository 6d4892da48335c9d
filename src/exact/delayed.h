/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_EXACT_DELAYED_H
#define TARRY_EXACT_DELAYED_H

/* Functions of age moved by waiting times: what a molecule is, some random time after it began. */

#include "exact/curve.h"
#include "model/law.h"

/* Absolute error of the curves made here, for functions of size 1. */
#define TARRY_DELAYED_TOLERANCE 2e-12

/* *out (zeroed): E[exp(-loss D) f(a - D)] over D of this law, for ages a below `horizon`. A loss at
 * rate `loss` that competes with the wait leaves exp(-loss D) of what began. Errors: TARRY_MEMORY,
 * TARRY_NUMERIC. */
int tarry_delayed_by(const tarry_law *law, double loss, const tarry_curve *f, double horizon,
                     tarry_curve *out, tarry_error *error);

/* *out (zeroed): exp(-loss a) P(D > a), for ages a below `horizon`. `law` NULL: exp(-loss a). */
int tarry_delayed_dwell(const tarry_law *law, double loss, double horizon, tarry_curve *out,
                        tarry_error *error);

#endif
