/* SPDX-License-Identifier: GPL-3.0-or-later */

/* A lag that always has the same length. */

#include "model/law_family.h"

#include <math.h>

static int check(const tarry_law *law, tarry_error *error) {
    if (!(law->a >= 0) || isinf(law->a))
        return tarry_law_refuse(error, "a fixed delay needs a length of 0 or more", law->a);
    return 0;
}

static double mean(const tarry_law *law) {
    return law->a;
}

static double variance(const tarry_law *law) {
    (void)law;
    return 0;
}

static double cdf(const tarry_law *law, double x) {
    return x >= law->a;
}

static double survival(const tarry_law *law, double x) {
    return x < law->a;
}

static double quantile(const tarry_law *law, double p, double q) {
    (void)p;
    (void)q;
    return law->a;
}

static double survival_integral(const tarry_law *law, double x) {
    return fmin(x, law->a);
}

const tarry_law_family tarry_law_fixed = {
    .word = "fixed",
    .check = check,
    .mean = mean,
    .variance = variance,
    .cdf = cdf,
    .survival = survival,
    .quantile = quantile,
    .survival_integral = survival_integral,
    .least = mean,
    .most = mean,
};
