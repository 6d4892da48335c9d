/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_MODEL_LAW_FAMILY_H
#define TARRY_MODEL_LAW_FAMILY_H

/* What the families of laws share among themselves; others use law.h. */

#include <stdbool.h>
#include "model/law.h"

extern const tarry_law_family tarry_law_fixed;
extern const tarry_law_family tarry_law_exponential;
extern const tarry_law_family tarry_law_erlang;
extern const tarry_law_family tarry_law_gamma;
extern const tarry_law_family tarry_law_lognormal;
extern const tarry_law_family tarry_law_normal;
extern const tarry_law_family tarry_law_uniform;
extern const tarry_law_family tarry_law_weibull;
extern const tarry_law_family tarry_law_bins;
extern const tarry_law_family tarry_law_values;
extern const tarry_law_family tarry_law_mix;
extern const tarry_law_family tarry_law_total;

/* Fill the error with "NEEDS, not GIVEN" (TARRY_INPUT) and return its code. */
int tarry_law_refuse(tarry_error *error, const char *needs, double given);

/* 0 where shares[0..n-1] are numbers from 0 on that sum to 1; `what` names the law in messages. */
int tarry_law_check_shares(const char *what, const double *shares, size_t n, tarry_error *error);

/* 0 where law->a is a mean and law->b an sd that this kind of law can have. */
int tarry_law_check_mean_sd(const char *what, const tarry_law *law, tarry_error *error);

/* For families that start at 0, and that never end. */
double tarry_law_from_zero(const tarry_law *law);
double tarry_law_without_end(const tarry_law *law);

/* Shape and scale of a gamma, Erlang or exponential law. */
double tarry_law_gamma_shape(const tarry_law *law);
double tarry_law_gamma_scale(const tarry_law *law);

/* Solve for the quantile (p, q) between low and high, which must enclose it, with cdf and survival
 * alone. Jumps and flat stretches are fine: the least x with cdf(x) >= p is found. */
double tarry_law_solve(const tarry_law *law, double p, double q, double low, double high);

#endif
