/* SPDX-License-Identifier: GPL-3.0-or-later */

/* A lag that follows one of several laws, chosen at random. */

#include "base/error.h"
#include "model/law_family.h"

#include <math.h>

static int check(const tarry_law *law, tarry_error *error) {
    if (tarry_law_check_shares("mix", law->weights, law->n, error))
        return TARRY_INPUT;
    for (size_t i = 0; i < law->n; i++)
        if (tarry_law_check(&law->parts[i], error))
            return TARRY_INPUT;
    return 0;
}

static double mean(const tarry_law *law) {
    double sum = 0;
    for (size_t i = 0; i < law->n; i++)
        sum += law->weights[i] * tarry_law_mean(&law->parts[i]);
    return sum;
}

static double variance(const tarry_law *law) {
    const double centre = mean(law);
    double sum = 0;
    for (size_t i = 0; i < law->n; i++) {
        const double off = tarry_law_mean(&law->parts[i]) - centre;
        const double within = tarry_law_family_of(law->parts[i].kind)->variance(&law->parts[i]);
        sum += law->weights[i] * (within + off * off);
    }
    return sum;
}

static double cdf(const tarry_law *law, double x) {
    double sum = 0;
    for (size_t i = 0; i < law->n; i++)
        sum += law->weights[i] * tarry_law_cdf(&law->parts[i], x);
    return sum;
}

static double survival(const tarry_law *law, double x) {
    double sum = 0;
    for (size_t i = 0; i < law->n; i++)
        sum += law->weights[i] * tarry_law_survival(&law->parts[i], x);
    return sum;
}

/* The parts' own quantiles enclose it. */
static double quantile(const tarry_law *law, double p, double q) {
    double low = INFINITY, high = 0;
    for (size_t i = 0; i < law->n; i++) {
        if (law->weights[i] <= 0)
            continue;
        const double x = tarry_law_quantile(&law->parts[i], p, q);
        low = fmin(low, x);
        high = fmax(high, x);
    }
    return tarry_law_solve(law, p, q, low, high);
}

static double survival_integral(const tarry_law *law, double x) {
    double sum = 0;
    for (size_t i = 0; i < law->n; i++)
        sum += law->weights[i] * tarry_law_survival_integral(&law->parts[i], x);
    return sum;
}

static double least(const tarry_law *law) {
    double x = INFINITY;
    for (size_t i = 0; i < law->n; i++)
        if (law->weights[i] > 0)
            x = fmin(x, tarry_law_least(&law->parts[i]));
    return x;
}

static double most(const tarry_law *law) {
    double x = 0;
    for (size_t i = 0; i < law->n; i++)
        if (law->weights[i] > 0)
            x = fmax(x, tarry_law_most(&law->parts[i]));
    return x;
}

const tarry_law_family tarry_law_mix = {
    .word = "mix",
    .check = check,
    .mean = mean,
    .variance = variance,
    .cdf = cdf,
    .survival = survival,
    .quantile = quantile,
    .survival_integral = survival_integral,
    .least = least,
    .most = most,
};
