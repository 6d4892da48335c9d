/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Making tables of quantiles.
 *
 * Each interval gets the cubic that has the quantile and its slope 1/density at both ends; its
 * error falls with the fourth power of the width. Nodes are walked from the median outwards, each
 * starting from what its neighbours promise and polished by Newton's steps on the logarithm of the
 * tail against the logarithm of the lag, in which the tails are nearly straight. */

#include "engine/quantile_table.h"

#include "base/error.h"
#include "base/memory.h"

#include <math.h>
#include <stdbool.h>
#include <stdlib.h>

enum { CACHE_LINE = 64 };

static const double error_limit = 1e-9;
static const double floor_share = 1e-6; /* of the mean: shorter lags are judged as if this long */
static const double nothing_share = 1e-30; /* of the mean: what is shorter is taken for 0 */

typedef struct walk {
    const tarry_law *law;
    const tarry_law_family *family;
    double mean;
    int side;                      /* 0: v is the cdf, 1: v is the survival */
    double sign;                   /* of d lag / d v */
    double v, x;                   /* where the walk is */
    double slope;                  /* d log x / d log v there */
    double log_step, slope_before; /* of the step that led there; 0 at the start */
} walk;

static double tail(const walk *w, double x) {
    return w->side == 0 ? w->family->cdf(w->law, x) : w->family->survival(w->law, x);
}

static double log_slope(const walk *w, double v, double x) {
    return w->sign * v / (x * w->family->density(w->law, x));
}

/* The lag at v near `x`, or from the law itself where Newton's steps do not settle. */
static double polish(const walk *w, double v, double x) {
    for (int i = 0; i < 6; i++) {
        const double at = tail(w, x);
        const double step = log(at / v) * log_slope(w, at, x);
        if (!(fabs(step) < 0.5) || !(x > 0))
            break;
        x *= exp(-step);
        if (fabs(step) < 1e-7) /* the next one would be about its square */
            return x;
    }
    return w->side == 0 ? tarry_law_quantile(w->law, v, 1 - v)
                        : tarry_law_quantile(w->law, 1 - v, v);
}

static void start(walk *w, const tarry_law *law, int side) {
    *w = (walk){.law = law, .family = tarry_law_family_of(law->kind), .side = side, .v = 0.5};
    w->mean = tarry_law_mean(law);
    w->sign = side == 0 ? 1 : -1;
    w->x = tarry_law_quantile(law, 0.5, 0.5);
    w->slope = log_slope(w, w->v, w->x);
}

/* Go to v, with a guess by the two-step Adams-Bashforth formula. */
static void go_to(walk *w, double v) {
    const double log_step = log(v / w->v);
    const double bend = w->log_step != 0 ? (w->slope - w->slope_before) / w->log_step : 0;
    if (w->x > nothing_share * w->mean)
        w->x = polish(w, v, w->x * exp(log_step * (w->slope + 0.5 * bend * log_step)));
    else if (w->side == 1) /* a median of nothing, but the tail comes */
        w->x = tarry_law_quantile(w->law, 1 - v, v);
    w->v = v;
    w->slope_before = w->slope;
    w->log_step = log_step;
    w->slope = log_slope(w, v, w->x);
}

/* Value and slope d lag / d v where the walk is. */
static void look(const walk *w, double *x, double *slope) {
    const bool nothing = !(w->x > nothing_share * w->mean);
    *x = nothing ? 0 : w->x;
    *slope = nothing ? 0 : w->slope * w->x / w->v;
}

/* The cubic with these values and slopes (per interval) at t = 0 and t = 1. */
static tarry_cubic hermite(double x0, double s0, double x1, double s1) {
    const double rise = x1 - x0;
    return (tarry_cubic){{x0, s0, 3 * rise - 2 * s0 - s1, s0 + s1 - 2 * rise}};
}

static bool is_good(const walk *w, const tarry_cubic *cubic, double from, double width, double t) {
    const double *c = cubic->c;
    const double x = c[0] + t * (c[1] + t * (c[2] + t * c[3]));
    const double v = from + t * width;
    const double scale = fmax(x, floor_share * w->mean);
    if (!(x > nothing_share * w->mean))
        return c[0] + c[1] + c[2] + c[3] <= error_limit * scale;
    return fabs(tail(w, x) - v) <= error_limit * scale * w->family->density(w->law, x);
}

/* One octave inwards to outwards, v from `top` down to top / 2. Returns false where it is too
 * coarse. */
static bool make_octave(walk *w, tarry_cubic *cubics, int n, double top) {
    const double width = 0.5 * top / n;
    double x1, s1, x0, s0;
    look(w, &x1, &s1);
    for (int i = n - 1; i >= 0; i--, x1 = x0, s1 = s0) {
        const double from = 0.5 * top + i * width;
        go_to(w, from);
        look(w, &x0, &s0);
        cubics[i] = hermite(x0, s0 * width, x1, s1 * width);
        if (!is_good(w, &cubics[i], from, width, 0.5))
            return false;
        if (i % 4 == 0 && !(is_good(w, &cubics[i], from, width, 0.25) &&
                            is_good(w, &cubics[i], from, width, 0.75)))
            return false;
    }
    return true;
}

static bool make_sides(tarry_cubic *cubics, const tarry_law *law, int n) {
    for (int side = 0; side < 2; side++) {
        walk w;
        start(&w, law, side);
        for (int j = 1; j <= TARRY_QUANTILE_OCTAVES; j++) {
            const int row = (side + 1) * TARRY_QUANTILE_OCTAVES - j;
            if (!make_octave(&w, cubics + (size_t)row * (size_t)n, n, ldexp(1, -j)))
                return false;
        }
    }
    return true;
}

size_t tarry_quantile_table_bytes(const tarry_quantile_table *table) {
    const size_t n = (size_t)2 * TARRY_QUANTILE_OCTAVES << table->log2_intervals;
    return table->memory ? n * sizeof(tarry_cubic) + CACHE_LINE : 0;
}

int tarry_quantile_table_init(tarry_quantile_table *table, const tarry_law *law,
                              tarry_error *error) {
    for (uint32_t log2 = TARRY_QUANTILE_LOG2_FEWEST; log2 <= TARRY_QUANTILE_LOG2_MOST; log2++) {
        *table = (tarry_quantile_table){.log2_intervals = log2};
        const size_t n = (size_t)2 * TARRY_QUANTILE_OCTAVES << log2;
        table->memory = tarry_calloc(n * sizeof(tarry_cubic) + CACHE_LINE, 1);
        if (!table->memory)
            return tarry_fail_memory(error, "a table of quantiles");
        const uintptr_t past = (uintptr_t)table->memory % CACHE_LINE;
        tarry_cubic *cubics = (void *)((char *)table->memory + (CACHE_LINE - past) % CACHE_LINE);
        table->cubics = cubics;
        if (make_sides(cubics, law, 1 << log2))
            return TARRY_OK;
        tarry_quantile_table_release(table);
    }
    return tarry_fail(error, TARRY_NUMERIC,
                      "this %s delay cannot be drawn to 1e-9 from a table of %d intervals an "
                      "octave; a smaller sd would do",
                      tarry_law_family_of(law->kind)->word, 1 << TARRY_QUANTILE_LOG2_MOST);
}

void tarry_quantile_table_release(tarry_quantile_table *table) {
    free(table->memory);
    *table = (tarry_quantile_table){0};
}
