/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Measured laws: a histogram that is uniform within its bins, and a list of values. */

#include "base/error.h"
#include "base/number.h"
#include "model/law_family.h"

#include <math.h>

/* 0 where points[0..n-1] are finite, not negative and rise. */
static int check_rising(const char *what, const double *points, size_t n, tarry_error *error) {
    char text[TARRY_NUMBER_SIZE], before[TARRY_NUMBER_SIZE];
    for (size_t i = 0; i < n; i++) {
        tarry_number_write(points[i], text);
        if (!(points[i] >= 0) || isinf(points[i]))
            return tarry_fail(error, TARRY_INPUT, "a table delay needs %s of 0 or more, not %s",
                              what, text);
        if (i > 0 && points[i] <= points[i - 1]) {
            tarry_number_write(points[i - 1], before);
            return tarry_fail(error, TARRY_INPUT,
                              "a table delay needs %s that rise, but %s follows %s", what, text,
                              before);
        }
    }
    return 0;
}

/* ---- bins ---- */

static int check_bins(const tarry_law *law, tarry_error *error) {
    if (tarry_law_check_shares("table", law->weights, law->n, error))
        return TARRY_INPUT;
    return check_rising("edges", law->points, law->n + 1, error);
}

static double bins_mean(const tarry_law *law) {
    double sum = 0;
    for (size_t i = 0; i < law->n; i++)
        sum += law->weights[i] * 0.5 * (law->points[i] + law->points[i + 1]);
    return sum;
}

static double bins_variance(const tarry_law *law) {
    const double mean = bins_mean(law);
    double sum = 0;
    for (size_t i = 0; i < law->n; i++) {
        const double width = law->points[i + 1] - law->points[i];
        const double off = 0.5 * (law->points[i] + law->points[i + 1]) - mean;
        sum += law->weights[i] * (width * width / 12 + off * off);
    }
    return sum;
}

/* Share of bin i that lies below x. */
static double bin_below(const tarry_law *law, size_t i, double x) {
    const double from = law->points[i], to = law->points[i + 1];
    return x <= from ? 0 : x >= to ? 1 : (x - from) / (to - from);
}

static double bin_above(const tarry_law *law, size_t i, double x) {
    const double from = law->points[i], to = law->points[i + 1];
    return x <= from ? 1 : x >= to ? 0 : (to - x) / (to - from);
}

static double bins_density(const tarry_law *law, double x) {
    for (size_t i = 0; i < law->n; i++)
        if (x >= law->points[i] && x < law->points[i + 1])
            return law->weights[i] / (law->points[i + 1] - law->points[i]);
    return 0;
}

static double bins_cdf(const tarry_law *law, double x) {
    double sum = 0;
    if (x >= law->points[law->n])
        return 1;
    for (size_t i = 0; i < law->n && law->points[i] < x; i++)
        sum += law->weights[i] * bin_below(law, i, x);
    return sum;
}

static double bins_survival(const tarry_law *law, double x) {
    double sum = 0;
    if (x < law->points[0])
        return 1;
    for (size_t i = law->n; i > 0 && law->points[i] > x; i--)
        sum += law->weights[i - 1] * bin_above(law, i - 1, x);
    return sum;
}

static double bins_least(const tarry_law *law) {
    size_t i = 0;
    while (i + 1 < law->n && law->weights[i] <= 0)
        i++;
    return law->points[i];
}

static double bins_most(const tarry_law *law) {
    size_t i = law->n;
    while (i > 1 && law->weights[i - 1] <= 0)
        i--;
    return law->points[i];
}

static double bins_quantile(const tarry_law *law, double p, double q) {
    double sum = 0;
    if (p <= q) {
        for (size_t i = 0; i < law->n; i++) {
            const double width = law->points[i + 1] - law->points[i];
            if (law->weights[i] > 0 && sum + law->weights[i] >= p)
                return law->points[i] + fmax(p - sum, 0) / law->weights[i] * width;
            sum += law->weights[i];
        }
        return bins_most(law);
    }
    for (size_t i = law->n; i > 0; i--) {
        const double width = law->points[i] - law->points[i - 1];
        if (law->weights[i - 1] > 0 && sum + law->weights[i - 1] >= q)
            return law->points[i] - fmax(q - sum, 0) / law->weights[i - 1] * width;
        sum += law->weights[i - 1];
    }
    return bins_least(law);
}

/* The mean of min(lag, x). */
static double bins_survival_integral(const tarry_law *law, double x) {
    double sum = 0;
    for (size_t i = 0; i < law->n; i++) {
        const double from = law->points[i], to = law->points[i + 1];
        const double below = bin_below(law, i, x);
        const double inside = from + (to - from) * below * (1 - 0.5 * below);
        sum += law->weights[i] * (x <= from ? x : inside);
    }
    return sum;
}

/* ---- values ---- */

static int check_values(const tarry_law *law, tarry_error *error) {
    if (tarry_law_check_shares("table", law->weights, law->n, error))
        return TARRY_INPUT;
    return check_rising("values", law->points, law->n, error);
}

static double values_mean(const tarry_law *law) {
    double sum = 0;
    for (size_t i = 0; i < law->n; i++)
        sum += law->weights[i] * law->points[i];
    return sum;
}

static double values_variance(const tarry_law *law) {
    const double mean = values_mean(law);
    double sum = 0;
    for (size_t i = 0; i < law->n; i++)
        sum += law->weights[i] * (law->points[i] - mean) * (law->points[i] - mean);
    return sum;
}

static double values_cdf(const tarry_law *law, double x) {
    double sum = 0;
    if (x >= law->points[law->n - 1])
        return 1;
    for (size_t i = 0; i < law->n && law->points[i] <= x; i++)
        sum += law->weights[i];
    return sum;
}

static double values_survival(const tarry_law *law, double x) {
    double sum = 0;
    if (x < law->points[0])
        return 1;
    for (size_t i = law->n; i > 0 && law->points[i - 1] > x; i--)
        sum += law->weights[i - 1];
    return sum;
}

static double values_least(const tarry_law *law) {
    size_t i = 0;
    while (i + 1 < law->n && law->weights[i] <= 0)
        i++;
    return law->points[i];
}

static double values_most(const tarry_law *law) {
    size_t i = law->n - 1;
    while (i > 0 && law->weights[i] <= 0)
        i--;
    return law->points[i];
}

static double values_quantile(const tarry_law *law, double p, double q) {
    double sum = 0;
    if (p <= q) {
        for (size_t i = 0; i < law->n; i++) {
            sum += law->weights[i];
            if (law->weights[i] > 0 && sum >= p)
                return law->points[i];
        }
        return values_most(law);
    }
    for (size_t i = law->n; i > 0; i--) {
        sum += law->weights[i - 1];
        if (law->weights[i - 1] > 0 && sum > q)
            return law->points[i - 1];
    }
    return values_least(law);
}

/* The mean of min(lag, x). */
static double values_survival_integral(const tarry_law *law, double x) {
    double sum = 0;
    for (size_t i = 0; i < law->n; i++)
        sum += law->weights[i] * fmin(law->points[i], x);
    return sum;
}

const tarry_law_family tarry_law_bins = {
    .word = "table",
    .check = check_bins,
    .mean = bins_mean,
    .variance = bins_variance,
    .cdf = bins_cdf,
    .survival = bins_survival,
    .quantile = bins_quantile,
    .survival_integral = bins_survival_integral,
    .least = bins_least,
    .most = bins_most,
    .density = bins_density,
};

const tarry_law_family tarry_law_values = {
    .word = "table",
    .check = check_values,
    .mean = values_mean,
    .variance = values_variance,
    .cdf = values_cdf,
    .survival = values_survival,
    .quantile = values_quantile,
    .survival_integral = values_survival_integral,
    .least = values_least,
    .most = values_most,
};
