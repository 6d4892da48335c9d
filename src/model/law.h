/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_MODEL_LAW_H
#define TARRY_MODEL_LAW_H

/* Laws of waiting times. All are non-negative. One table of families, one file a family. */

#include <stddef.h>
#include "tarry/error.h"

/* X(NAME, word in a model) */
#define TARRY_LAWS(X)                                                                              \
    X(FIXED, "fixed")                                                                              \
    X(EXPONENTIAL, "exponential")                                                                  \
    X(ERLANG, "erlang")                                                                            \
    X(GAMMA, "gamma")                                                                              \
    X(LOGNORMAL, "lognormal")                                                                      \
    X(NORMAL, "normal")                                                                            \
    X(UNIFORM, "uniform")                                                                          \
    X(WEIBULL, "weibull")                                                                          \
    X(BINS, "table")                                                                               \
    X(VALUES, "table")                                                                             \
    X(MIX, "mix")                                                                                  \
    X(TOTAL, "total")

typedef enum tarry_law_kind {
#define TARRY_LAW_ENUM(name, word) TARRY_LAW_##name,
    TARRY_LAWS(TARRY_LAW_ENUM)
#undef TARRY_LAW_ENUM
        TARRY_N_LAWS
} tarry_law_kind;

/* Parameters as a model gives them, times in the model's unit:
 *   FIXED        a = length
 *   EXPONENTIAL  a = mean
 *   ERLANG       a = mean, b = steps (whole, >= 1)
 *   GAMMA        a = mean, b = sd
 *   LOGNORMAL    a = mean, b = sd (of the lag itself)
 *   NORMAL       a = mean, b = sd before truncation at 0
 *   UNIFORM      a = from, b = to
 *   WEIBULL      a = scale, b = shape
 *   BINS         points[0..n] edges, weights[0..n-1] shares that sum to 1, uniform within a bin
 *   VALUES       points[0..n-1] ascending, weights[0..n-1] shares that sum to 1
 *   MIX          weights[0..n-1] shares that sum to 1, parts[0..n-1]
 *   TOTAL        parts[0..n-1], one after another */
typedef struct tarry_law {
    tarry_law_kind kind;
    double a, b;
    size_t n;
    const double *points;
    const double *weights;
    const struct tarry_law *parts;
} tarry_law;

typedef struct tarry_law_family {
    const char *word;
    /* 0, or TARRY_INPUT with what is wrong (no place: the caller adds it). */
    int (*check)(const tarry_law *law, tarry_error *error);
    double (*mean)(const tarry_law *law);
    double (*variance)(const tarry_law *law);
    double (*cdf)(const tarry_law *law, double x);      /* P(lag <= x) */
    double (*survival)(const tarry_law *law, double x); /* P(lag > x), exact in its own tail */
    /* The lag exceeded with probability q and not with p; p + q = 1, the smaller one is exact. */
    double (*quantile)(const tarry_law *law, double p, double q);
    /* Integral of the survival function from 0 to x, 0 <= x < infinity. */
    double (*survival_integral)(const tarry_law *law, double x);
    double (*least)(const tarry_law *law); /* earliest and latest possible value */
    double (*most)(const tarry_law *law);
    /* Probability density at x > 0; NULL where part of the law sits on single values. */
    double (*density)(const tarry_law *law, double x);
} tarry_law_family;

const tarry_law_family *tarry_law_family_of(tarry_law_kind kind);

/* Check a law and all its parts. TARRY_INPUT (no place). */
int tarry_law_check(const tarry_law *law, tarry_error *error);

double tarry_law_mean(const tarry_law *law);
double tarry_law_sd(const tarry_law *law);
double tarry_law_cdf(const tarry_law *law, double x);
double tarry_law_survival(const tarry_law *law, double x);
double tarry_law_quantile(const tarry_law *law, double p, double q);

/* Integral of the survival function from 0 to x (the mean for x = infinity): the number in transit
 * a time x after a start from empty is rate times this. */
double tarry_law_survival_integral(const tarry_law *law, double x);

/* The elapsed part of integral S / mean that a share p of it lies below: draws the remaining time
 * of a lag met at a random moment. Slow for a total of several unlike parts (see law_total.c): the
 * engine draws what is left of those part by part (engine/draw.h). */
double tarry_law_remaining_quantile(const tarry_law *law, double p);

/* Earliest and latest possible value (infinity where there is none). */
double tarry_law_least(const tarry_law *law);
double tarry_law_most(const tarry_law *law);

/* The chance that a normal lag would be below 0 before truncation; 0 for other families. */
double tarry_law_below_zero(const tarry_law *law);

/* True where both draw the same lags from the same numbers. */
int tarry_law_same(const tarry_law *one, const tarry_law *other);

#endif
