/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Laws of waiting times: what holds for every family.
 *
 * A law is plain data and a family is a table of functions, indexed by kind. Probabilities are
 * handed about as pairs (p, q) with p + q = 1, so that both tails keep their digits. */

#include "model/law.h"

#include "base/error.h"
#include "base/number.h"
#include "model/law_family.h"

#include <float.h>
#include <gsl/gsl_cdf.h>
#include <math.h>
#include <string.h>

static const tarry_law_family *const families[TARRY_N_LAWS] = {
    [TARRY_LAW_FIXED] = &tarry_law_fixed,
    [TARRY_LAW_EXPONENTIAL] = &tarry_law_exponential,
    [TARRY_LAW_ERLANG] = &tarry_law_erlang,
    [TARRY_LAW_GAMMA] = &tarry_law_gamma,
    [TARRY_LAW_LOGNORMAL] = &tarry_law_lognormal,
    [TARRY_LAW_NORMAL] = &tarry_law_normal,
    [TARRY_LAW_UNIFORM] = &tarry_law_uniform,
    [TARRY_LAW_WEIBULL] = &tarry_law_weibull,
    [TARRY_LAW_BINS] = &tarry_law_bins,
    [TARRY_LAW_VALUES] = &tarry_law_values,
    [TARRY_LAW_MIX] = &tarry_law_mix,
    [TARRY_LAW_TOTAL] = &tarry_law_total,
};

const tarry_law_family *tarry_law_family_of(tarry_law_kind kind) {
    return families[kind];
}

int tarry_law_check(const tarry_law *law, tarry_error *error) {
    return families[law->kind]->check(law, error);
}

double tarry_law_mean(const tarry_law *law) {
    return families[law->kind]->mean(law);
}

double tarry_law_sd(const tarry_law *law) {
    return sqrt(families[law->kind]->variance(law));
}

double tarry_law_cdf(const tarry_law *law, double x) {
    return families[law->kind]->cdf(law, x);
}

double tarry_law_survival(const tarry_law *law, double x) {
    return families[law->kind]->survival(law, x);
}

double tarry_law_quantile(const tarry_law *law, double p, double q) {
    return families[law->kind]->quantile(law, p, q);
}

double tarry_law_least(const tarry_law *law) {
    return families[law->kind]->least(law);
}

double tarry_law_most(const tarry_law *law) {
    return families[law->kind]->most(law);
}

double tarry_law_survival_integral(const tarry_law *law, double x) {
    if (!(x > 0))
        return 0;
    if (x >= tarry_law_most(law))
        return tarry_law_mean(law);
    return families[law->kind]->survival_integral(law, x);
}

/* The integral rises with slope S, which is 1 at 0 and falls: it is concave, and Newton's step from
 * a point left of the root never passes it. Where the tail makes those steps short, and on the flat
 * end where rounding rules, the bracket is halved instead. */
double tarry_law_remaining_quantile(const tarry_law *law, double p) {
    const double mean = tarry_law_mean(law);
    const double target = p * mean;
    double low = target; /* S <= 1: the root is not below */
    double high = tarry_law_most(law);
    if (!(target > 0))
        return 0;
    if (isinf(high)) {
        high = 2 * mean;
        while (high < DBL_MAX / 4 && tarry_law_survival_integral(law, high) < target)
            high *= 2;
    }
    for (int i = 1; i < 400 && high - low > 2 * DBL_EPSILON * high; i++) {
        const double missing = target - tarry_law_survival_integral(law, low);
        const double step = missing / tarry_law_survival(law, low);
        if (!(missing > 0) || step <= DBL_EPSILON * low)
            return low;
        if (step < high - low && i % 4 != 0) {
            low += step;
            continue;
        }
        const double middle = low + 0.5 * (high - low);
        if (tarry_law_survival_integral(law, middle) < target)
            low = middle;
        else
            high = middle;
    }
    return low;
}

double tarry_law_below_zero(const tarry_law *law) {
    return law->kind == TARRY_LAW_NORMAL ? gsl_cdf_ugaussian_P(-law->a / law->b) : 0;
}

static bool same_numbers(const double *one, const double *other, size_t n) {
    return n == 0 || memcmp(one, other, n * sizeof *one) == 0;
}

int tarry_law_same(const tarry_law *one, const tarry_law *other) {
    if (one->kind != other->kind || one->n != other->n)
        return 0;
    switch (one->kind) {
    case TARRY_LAW_BINS:
        return same_numbers(one->points, other->points, one->n + 1) &&
               same_numbers(one->weights, other->weights, one->n);
    case TARRY_LAW_VALUES:
        return same_numbers(one->points, other->points, one->n) &&
               same_numbers(one->weights, other->weights, one->n);
    case TARRY_LAW_MIX:
    case TARRY_LAW_TOTAL:
        if (one->kind == TARRY_LAW_MIX && !same_numbers(one->weights, other->weights, one->n))
            return 0;
        for (size_t i = 0; i < one->n; i++)
            if (!tarry_law_same(&one->parts[i], &other->parts[i]))
                return 0;
        return 1;
    case TARRY_LAW_FIXED:
    case TARRY_LAW_EXPONENTIAL:
        return one->a == other->a;
    default:
        return one->a == other->a && one->b == other->b;
    }
}

/* ---- shared by the families ---- */

int tarry_law_refuse(tarry_error *error, const char *needs, double given) {
    char text[TARRY_NUMBER_SIZE];
    tarry_number_write(given, text);
    return tarry_fail(error, TARRY_INPUT, "%s, not %s", needs, text);
}

/* Below this ratio of sd to mean the digits of a lag no longer tell its law. */
static const double least_variation = 1e-4;

int tarry_law_check_mean_sd(const char *what, const tarry_law *law, tarry_error *error) {
    char text[TARRY_NUMBER_SIZE];
    if (!(law->a > 0) || isinf(law->a)) {
        tarry_number_write(law->a, text);
        return tarry_fail(error, TARRY_INPUT, "a %s delay needs a mean above 0, not %s", what,
                          text);
    }
    if (!(law->b > 0) || isinf(law->b)) {
        tarry_number_write(law->b, text);
        return tarry_fail(error, TARRY_INPUT, "a %s delay needs an sd above 0, not %s", what, text);
    }
    if (law->b < least_variation * law->a)
        return tarry_fail(error, TARRY_INPUT,
                          "a %s delay whose sd is under a ten-thousandth of its mean is as good as "
                          "fixed: write `fixed`",
                          what);
    return 0;
}

double tarry_law_from_zero(const tarry_law *law) {
    (void)law;
    return 0;
}

double tarry_law_without_end(const tarry_law *law) {
    (void)law;
    return INFINITY;
}

int tarry_law_check_shares(const char *what, const double *shares, size_t n, tarry_error *error) {
    char text[TARRY_NUMBER_SIZE];
    double sum = 0;
    if (n == 0)
        return tarry_fail(error, TARRY_INPUT, "a %s delay needs at least one entry", what);
    for (size_t i = 0; i < n; i++) {
        if (!(shares[i] >= 0) || isinf(shares[i])) {
            tarry_number_write(shares[i], text);
            return tarry_fail(error, TARRY_INPUT, "a %s delay needs shares of 0 or more, not %s",
                              what, text);
        }
        sum += shares[i];
    }
    if (fabs(sum - 1) > 1e-9) {
        tarry_number_write(sum, text);
        return tarry_fail(error, TARRY_INPUT, "the shares of a %s delay sum to %s, not to 1", what,
                          text);
    }
    return 0;
}

/* How far x is from the quantile, on the scale of the smaller tail: negative left of it. */
static double miss(const tarry_law *law, double p, double q, double x) {
    if (p <= q)
        return tarry_law_cdf(law, x) - p;
    return q - tarry_law_survival(law, x);
}

/* Chandrupatla 1997 (Adv. Eng. Softw. 28:145): inverse quadratic interpolation where it can be
 * trusted, else bisection, which is also what a jump comes down to. */
double tarry_law_solve(const tarry_law *law, double p, double q, double low, double high) {
    double a = high, fa = miss(law, p, q, high); /* newest point */
    double b = low, fb = miss(law, p, q, low);   /* b and a enclose the quantile */
    double c, fc;                                /* the point that a or b was before */
    double t = 0.5;
    if (fb >= 0)
        return low;
    if (fa < 0)
        return high;
    for (int i = 0; i < 200; i++) {
        const double x = a + t * (b - a);
        const double fx = miss(law, p, q, x);
        if ((fx < 0) == (fa < 0)) {
            c = a;
            fc = fa;
        } else {
            c = b;
            fc = fb;
            b = a;
            fb = fa;
        }
        a = x;
        fa = fx;
        const double least_step = 2 * DBL_EPSILON * fabs(fabs(fa) < fabs(fb) ? a : b);
        const double width = fabs(b - a);
        if (fa == 0 || width <= 2 * least_step)
            break;
        const double xi = (a - b) / (c - b);
        const double phi = (fa - fb) / (fc - fb);
        t = 0.5;
        if (phi * phi < xi && (1 - phi) * (1 - phi) < 1 - xi)
            t = fa / (fb - fa) * (fc / (fb - fc)) +
                (c - a) / (b - a) * (fa / (fc - fa)) * (fb / (fc - fb));
        t = fmin(fmax(t, least_step / width), 1 - least_step / width);
    }
    return fa >= 0 ? a : b;
}
