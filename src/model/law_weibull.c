/* SPDX-License-Identifier: GPL-3.0-or-later */

/* The Weibull law. */

#include "model/incomplete_gamma.h"
#include "model/law_family.h"

#include <gsl/gsl_errno.h>
#include <gsl/gsl_sf_gamma.h>
#include <math.h>

static int check(const tarry_law *law, tarry_error *error) {
    if (!(law->a > 0) || isinf(law->a))
        return tarry_law_refuse(error, "a weibull delay needs a scale above 0", law->a);
    if (!(law->b >= 0.1 && law->b <= 1000))
        return tarry_law_refuse(error, "a weibull delay needs a shape from 0.1 to 1000", law->b);
    return 0;
}

/* log Gamma(1 + x) */
static double log_gamma_1(double x) {
    gsl_sf_result result;
    return gsl_sf_lngamma_e(1 + x, &result) == GSL_SUCCESS ? result.val : NAN;
}

static double mean(const tarry_law *law) {
    return law->a * exp(log_gamma_1(1 / law->b));
}

static double variance(const tarry_law *law) {
    const double log_mean = log_gamma_1(1 / law->b);
    const double square = law->a * law->a * exp(2 * log_mean);
    return square * expm1(log_gamma_1(2 / law->b) - 2 * log_mean);
}

/* -log S(x) */
static double hazard(const tarry_law *law, double x) {
    return pow(x / law->a, law->b);
}

static double cdf(const tarry_law *law, double x) {
    return x > 0 ? -expm1(-hazard(law, x)) : 0;
}

static double survival(const tarry_law *law, double x) {
    return x > 0 ? exp(-hazard(law, x)) : 1;
}

static double quantile(const tarry_law *law, double p, double q) {
    return law->a * pow(p < q ? -log1p(-p) : -log(q), 1 / law->b);
}

static double survival_integral(const tarry_law *law, double x) {
    return mean(law) * tarry_gamma_lower(1 / law->b, hazard(law, x));
}

static double density(const tarry_law *law, double x) {
    const double h = hazard(law, x);
    return law->b / x * h * exp(-h);
}

const tarry_law_family tarry_law_weibull = {
    .word = "weibull",
    .check = check,
    .mean = mean,
    .variance = variance,
    .cdf = cdf,
    .survival = survival,
    .quantile = quantile,
    .survival_integral = survival_integral,
    .least = tarry_law_from_zero,
    .most = tarry_law_without_end,
    .density = density,
};
