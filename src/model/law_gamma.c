/* SPDX-License-Identifier: GPL-3.0-or-later */

/* The gamma law and, where its shape is a whole number of steps, the Erlang law. */

#include "base/error.h"
#include "model/incomplete_gamma.h"
#include "model/law_family.h"

#include <float.h>
#include <gsl/gsl_cdf.h>
#include <gsl/gsl_errno.h>
#include <gsl/gsl_sf_gamma.h>
#include <math.h>

/* Up to here every lag can be drawn from a table of quantiles of a bearable size. */
static const double most_variation = 5; /* sd / mean */

static int check_gamma(const tarry_law *law, tarry_error *error) {
    if (tarry_law_check_mean_sd("gamma", law, error))
        return TARRY_INPUT;
    if (law->b > most_variation * law->a)
        return tarry_fail(error, TARRY_INPUT,
                          "a gamma delay needs an sd of at most 5 times its mean, since nearly all "
                          "of a wider one lies next to 0: write it as a mix");
    return 0;
}

static int check_erlang(const tarry_law *law, tarry_error *error) {
    if (!(law->a > 0) || isinf(law->a))
        return tarry_law_refuse(error, "an erlang delay needs a mean above 0", law->a);
    if (!(law->b >= 1) || law->b != floor(law->b) || law->b > 1e8)
        return tarry_law_refuse(
            error, "an erlang delay needs a whole number of steps from 1 to 100000000", law->b);
    return 0;
}

double tarry_law_gamma_shape(const tarry_law *law) {
    if (law->kind == TARRY_LAW_EXPONENTIAL)
        return 1;
    if (law->kind == TARRY_LAW_ERLANG)
        return law->b;
    const double ratio = law->a / law->b;
    return ratio * ratio;
}

double tarry_law_gamma_scale(const tarry_law *law) {
    return law->a / tarry_law_gamma_shape(law);
}

static double mean(const tarry_law *law) {
    return law->a;
}

static double variance(const tarry_law *law) {
    return law->kind == TARRY_LAW_ERLANG ? law->a * law->a / law->b : law->b * law->b;
}

static double cdf(const tarry_law *law, double x) {
    return tarry_gamma_lower(tarry_law_gamma_shape(law), x / tarry_law_gamma_scale(law));
}

static double survival(const tarry_law *law, double x) {
    return tarry_gamma_upper(tarry_law_gamma_shape(law), x / tarry_law_gamma_scale(law));
}

static double density(const tarry_law *law, double x) {
    const double shape = tarry_law_gamma_shape(law);
    return tarry_gamma_term(shape, x / tarry_law_gamma_scale(law)) * shape / x;
}

/* A first guess at the logarithm of the quantile in units of the scale: Wilson & Hilferty 1931
 * (PNAS 17:684), or the leading power of the cdf where that is small. */
static double guess(double shape, double p, double q) {
    gsl_sf_result gamma;
    const double z = p < q ? gsl_cdf_ugaussian_Pinv(p) : gsl_cdf_ugaussian_Qinv(q);
    const double root = 1 - 1 / (9 * shape) + z / (3 * sqrt(shape));
    if (root > 0.3)
        return log(shape) + 3 * log(root);
    if (gsl_sf_lngamma_e(shape + 1, &gamma) != GSL_SUCCESS)
        return log(shape);
    return (log(p) + gamma.val) / shape;
}

/* Newton on the logarithm of the smaller tail against log x, where both tails are concave, so that
 * the steps close in from one side. */
static double quantile(const tarry_law *law, double p, double q) {
    const double shape = tarry_law_gamma_shape(law);
    double y = guess(shape, p, q);
    if (p <= 0)
        return 0;
    if (q <= 0)
        return INFINITY;
    for (int i = 0; i < 100; i++) {
        const double x = exp(y);
        const double slope = tarry_gamma_term(shape, x) * shape; /* x times the density */
        double step;
        if (p <= q) {
            const double at = tarry_gamma_lower(shape, x);
            step = at > 0 ? -log(at / p) * at / slope : 1;
        } else {
            const double at = tarry_gamma_upper(shape, x);
            step = at > 0 ? log(at / q) * at / slope : -1;
        }
        const double limit = p <= q && shape < 1 ? 2 / shape : 2;
        step = fmin(fmax(step, -limit), limit);
        y += step;
        if (!(fabs(step) > DBL_EPSILON * fmax(1, fabs(y))))
            break;
    }
    return exp(y) * tarry_law_gamma_scale(law);
}

/* By parts: x S(x) plus the mean over what is over by x, a gamma law with one step more. */
static double survival_integral(const tarry_law *law, double x) {
    const double shape = tarry_law_gamma_shape(law);
    const double y = x / tarry_law_gamma_scale(law);
    return x * tarry_gamma_upper(shape, y) + law->a * tarry_gamma_lower(shape + 1, y);
}

const tarry_law_family tarry_law_gamma = {
    .word = "gamma",
    .check = check_gamma,
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

const tarry_law_family tarry_law_erlang = {
    .word = "erlang",
    .check = check_erlang,
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
