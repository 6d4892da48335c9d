/* SPDX-License-Identifier: GPL-3.0-or-later */

/* The normal law, truncated at 0: a lag is never negative. Mean and sd are given as they are before
 * truncation; the moments here are those after it.
 *
 * In units of the sd, z0 = -mean/sd is where the law is cut, and d = x/sd the distance from there.
 * At most 5 % may lie below 0, so z0 < -1.6. */

#include "base/error.h"
#include "base/number.h"
#include "model/law_family.h"

#include <float.h>
#include <gsl/gsl_cdf.h>
#include <gsl/gsl_math.h>
#include <math.h>

static const double most_below_zero = 0.05;

static int check(const tarry_law *law, tarry_error *error) {
    char text[TARRY_NUMBER_SIZE];
    if (tarry_law_check_mean_sd("normal", law, error))
        return TARRY_INPUT;
    const double below = tarry_law_below_zero(law);
    if (below <= most_below_zero)
        return 0;
    tarry_number_write(round(1000 * below) / 10, text);
    return tarry_fail(
        error, TARRY_INPUT,
        "%s %% of this normal delay lies below 0, and at most 5 %% may: use a smaller "
        "sd, or a gamma or lognormal delay",
        text);
}

static double bell(double z) {
    return exp(-0.5 * z * z) / sqrt(2 * M_PI);
}

static double cut(const tarry_law *law) {
    return -law->a / law->b;
}

/* Share that truncation leaves. */
static double kept(const tarry_law *law) {
    return gsl_cdf_ugaussian_Q(cut(law));
}

/* True where so little lies between z0 and z0 + d that the difference of two cdfs would lose its
 * digits, and the series below holds (|z0| d is under 0.15 there). */
static int is_sliver(double z0, double d) {
    return gsl_cdf_ugaussian_P(z0 + d) < 1.1 * gsl_cdf_ugaussian_P(z0);
}

/* Integral over s from 0 to d of bell(z0 + s) (d - s)^order, order 0 or 1, by the power series of
 * exp(-z0 s - s^2/2): c_n = (-z0 c_(n-1) - c_(n-2)) / n. */
static double sliver(double z0, double d, int order) {
    double before = 0, c = 1, power = d, sum = 0;
    for (int n = 0; n < 24; n++) {
        sum += c * power / (n + 1) * (order == 0 ? 1 : d / (n + 2));
        const double next = (-z0 * c - before) / (n + 1);
        before = c;
        c = next;
        power *= d;
    }
    return bell(z0) * sum;
}

/* What lies between z0 and z0 + d, before truncation. */
static double between(double z0, double d) {
    if (is_sliver(z0, d))
        return sliver(z0, d, 0);
    return gsl_cdf_ugaussian_P(z0 + d) - gsl_cdf_ugaussian_P(z0);
}

static double mean(const tarry_law *law) {
    return law->a + law->b * bell(cut(law)) / kept(law);
}

static double variance(const tarry_law *law) {
    const double hazard = bell(cut(law)) / kept(law);
    return law->b * law->b * (1 + cut(law) * hazard - hazard * hazard);
}

static double cdf(const tarry_law *law, double x) {
    return x > 0 ? between(cut(law), x / law->b) / kept(law) : 0;
}

static double survival(const tarry_law *law, double x) {
    return x > 0 ? gsl_cdf_ugaussian_Q(cut(law) + x / law->b) / kept(law) : 1;
}

static double quantile(const tarry_law *law, double p, double q) {
    const double z0 = cut(law);
    if (p <= 0)
        return 0;
    if (p > q)
        return law->b * (gsl_cdf_ugaussian_Qinv(q * kept(law)) - z0);
    const double area = p * kept(law);
    double d = gsl_cdf_ugaussian_Pinv(gsl_cdf_ugaussian_P(z0) + area) - z0;
    if (!(d > 0) || is_sliver(z0, d))
        d = area / bell(z0);
    for (int i = 0; i < 20; i++) {
        const double step = (between(z0, d) - area) / bell(z0 + d);
        d -= step;
        if (!(fabs(step) > 2 * DBL_EPSILON * d))
            break;
    }
    return law->b * d;
}

/* Left of the untruncated mean x less the integral of the cdf, else the mean less that of the
 * survival: each keeps the digits of what counts there. */
static double survival_integral(const tarry_law *law, double x) {
    const double z0 = cut(law);
    const double d = x / law->b;
    const double z = z0 + d;
    const double unit = law->b / kept(law);
    if (z > 0)
        return mean(law) - unit * (bell(z) - z * gsl_cdf_ugaussian_Q(z));
    if (is_sliver(z0, d))
        return x - unit * sliver(z0, d, 1);
    const double over = z * gsl_cdf_ugaussian_P(z) + bell(z) - bell(z0);
    return x - unit * (over - z * gsl_cdf_ugaussian_P(z0));
}

static double density(const tarry_law *law, double x) {
    return bell(cut(law) + x / law->b) / (law->b * kept(law));
}

const tarry_law_family tarry_law_normal = {
    .word = "normal",
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
