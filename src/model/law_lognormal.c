/* SPDX-License-Identifier: GPL-3.0-or-later */

/* The lognormal law, given by the mean and sd of the lag itself. */

#include "model/law_family.h"

#include <gsl/gsl_cdf.h>
#include <gsl/gsl_math.h>
#include <math.h>

static int check(const tarry_law *law, tarry_error *error) {
    if (tarry_law_check_mean_sd("lognormal", law, error))
        return TARRY_INPUT;
    if (law->b > 100 * law->a)
        return tarry_law_refuse(
            error, "a lognormal delay needs an sd of at most 100 times its mean", law->b);
    return 0;
}

/* sd of the logarithm */
static double width(const tarry_law *law) {
    const double ratio = law->b / law->a;
    return sqrt(log1p(ratio * ratio));
}

static double median(const tarry_law *law) {
    return law->a / hypot(1, law->b / law->a);
}

static double standard(const tarry_law *law, double x) {
    return log(x / median(law)) / width(law);
}

static double mean(const tarry_law *law) {
    return law->a;
}

static double variance(const tarry_law *law) {
    return law->b * law->b;
}

static double cdf(const tarry_law *law, double x) {
    return x > 0 ? gsl_cdf_ugaussian_P(standard(law, x)) : 0;
}

static double survival(const tarry_law *law, double x) {
    return x > 0 ? gsl_cdf_ugaussian_Q(standard(law, x)) : 1;
}

static double quantile(const tarry_law *law, double p, double q) {
    const double z = p < q ? gsl_cdf_ugaussian_Pinv(p) : gsl_cdf_ugaussian_Qinv(q);
    return median(law) * exp(width(law) * z);
}

/* By parts: x S(x) plus the mean over what is over by x, the normal law shifted by its width. */
static double survival_integral(const tarry_law *law, double x) {
    const double z = standard(law, x);
    return x * gsl_cdf_ugaussian_Q(z) + law->a * gsl_cdf_ugaussian_P(z - width(law));
}

static double density(const tarry_law *law, double x) {
    const double z = standard(law, x);
    return exp(-0.5 * z * z) / (sqrt(2 * M_PI) * width(law) * x);
}

const tarry_law_family tarry_law_lognormal = {
    .word = "lognormal",
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
