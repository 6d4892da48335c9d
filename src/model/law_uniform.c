/* SPDX-License-Identifier: GPL-3.0-or-later */

/* The uniform law. */

#include "model/law_family.h"

#include <math.h>

static int check(const tarry_law *law, tarry_error *error) {
    if (!(law->a >= 0) || isinf(law->a))
        return tarry_law_refuse(error, "a uniform delay needs a `from` of 0 or more", law->a);
    if (!(law->b > law->a) || isinf(law->b))
        return tarry_law_refuse(error, "a uniform delay needs a `to` above its `from`", law->b);
    return 0;
}

static double mean(const tarry_law *law) {
    return 0.5 * (law->a + law->b);
}

static double variance(const tarry_law *law) {
    const double width = law->b - law->a;
    return width * width / 12;
}

static double cdf(const tarry_law *law, double x) {
    if (x <= law->a)
        return 0;
    return x < law->b ? (x - law->a) / (law->b - law->a) : 1;
}

static double survival(const tarry_law *law, double x) {
    if (x <= law->a)
        return 1;
    return x < law->b ? (law->b - x) / (law->b - law->a) : 0;
}

static double quantile(const tarry_law *law, double p, double q) {
    const double width = law->b - law->a;
    return p < q ? law->a + p * width : law->b - q * width;
}

static double survival_integral(const tarry_law *law, double x) {
    if (x <= law->a)
        return x;
    const double into = fmin(x, law->b) - law->a;
    return law->a + into * (1 - 0.5 * into / (law->b - law->a));
}

static double least(const tarry_law *law) {
    return law->a;
}

static double most(const tarry_law *law) {
    return law->b;
}

static double density(const tarry_law *law, double x) {
    return x >= law->a && x < law->b ? 1 / (law->b - law->a) : 0;
}

const tarry_law_family tarry_law_uniform = {
    .word = "uniform",
    .check = check,
    .mean = mean,
    .variance = variance,
    .cdf = cdf,
    .survival = survival,
    .quantile = quantile,
    .survival_integral = survival_integral,
    .least = least,
    .most = most,
    .density = density,
};
