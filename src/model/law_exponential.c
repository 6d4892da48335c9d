/* SPDX-License-Identifier: GPL-3.0-or-later */

/* The exponential law: no memory. */

#include "model/law_family.h"

#include <math.h>

static int check(const tarry_law *law, tarry_error *error) {
    if (!(law->a > 0) || isinf(law->a))
        return tarry_law_refuse(error, "an exponential delay needs a mean above 0", law->a);
    return 0;
}

static double mean(const tarry_law *law) {
    return law->a;
}

static double variance(const tarry_law *law) {
    return law->a * law->a;
}

static double cdf(const tarry_law *law, double x) {
    return x > 0 ? -expm1(-x / law->a) : 0;
}

static double survival(const tarry_law *law, double x) {
    return x > 0 ? exp(-x / law->a) : 1;
}

static double quantile(const tarry_law *law, double p, double q) {
    return -law->a * (p < q ? log1p(-p) : log(q));
}

static double survival_integral(const tarry_law *law, double x) {
    return -law->a * expm1(-x / law->a);
}

static double density(const tarry_law *law, double x) {
    return exp(-x / law->a) / law->a;
}

const tarry_law_family tarry_law_exponential = {
    .word = "exponential",
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
