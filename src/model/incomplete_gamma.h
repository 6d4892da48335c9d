/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_MODEL_INCOMPLETE_GAMMA_H
#define TARRY_MODEL_INCOMPLETE_GAMMA_H

/* Regularised incomplete gamma functions with their digits kept in both tails, for a from 0.001 to
 * 1e10 and x >= 0 (infinity included). Gamma lags and Poisson amounts rest on them. NaN where the
 * library underneath gives up. */

/* P(a, x): the chance that a gamma variable of shape a and scale 1 is at most x. */
double tarry_gamma_lower(double a, double x);

/* Q(a, x) = 1 - P(a, x). */
double tarry_gamma_upper(double a, double x);

/* x^a exp(-x) / Gamma(a + 1): the Poisson probability of a where a is whole. */
double tarry_gamma_term(double a, double x);

#endif
