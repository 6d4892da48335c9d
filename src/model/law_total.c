/* SPDX-License-Identifier: GPL-3.0-or-later */

/* A lag made of several, one after another.
 *
 * Means and variances add. For cdf, survival and its integral the parts are first brought to their
 * simplest form: fixed parts only shift, a mix or a list of values splits the law into a weighted
 * sum of simpler totals, and gamma-like parts with one scale join into one. What is left is
 *
 *   one part      the part's own functions;
 *   Erlangs       exact, by uniformisation: the chain of steps is watched at the points of a
 *                 Poisson process of its fastest rate (Jensen 1953, Skand. Aktuarietidskr. 36:87);
 *   else          P(X + Y <= x) = integral of f_X(t) P(Y <= x - t), likewise for the others, by
 *                 adaptive Gauss-Kronrod quadrature (Piessens et al. 1983, QUADPACK) on panels that
 *                 end where X or Y changes. All terms are positive, so both tails keep a relative
 *                 accuracy of 1e-8 or better; NaN where memory for the panels is short.
 *                 With three parts or more Y is a total itself: each further part costs a factor of
 *                 some hundreds. */

#include "base/error.h"
#include "base/memory.h"
#include "model/incomplete_gamma.h"
#include "model/law_family.h"

#include <gsl/gsl_integration.h>
#include <gsl/gsl_sort.h>
#include <math.h>
#include <stdbool.h>
#include <stdlib.h>

enum {
    MOST_PARTS = 32,
    MOST_PHASES = 400,   /* steps of a chain that are uniformised */
    N_LANDMARKS = 9,     /* quantiles that end panels */
    MOST_HALVINGS = 40,  /* of one panel */
    MOST_POISSON = 20000 /* expected points of the Poisson process */
};

typedef enum function { CDF, SURVIVAL, INTEGRAL } function;

typedef struct sum {
    double shift;
    size_t n;
    tarry_law parts[MOST_PARTS];
} sum;

static double evaluate(const sum *s, function which, double x);

/* ---- checks and moments ---- */

/* Parts that can be in play at once. */
static size_t count_parts(const tarry_law *law) {
    size_t n = 0;
    if (law->kind == TARRY_LAW_TOTAL) {
        for (size_t i = 0; i < law->n; i++)
            n += count_parts(&law->parts[i]);
        return n;
    }
    if (law->kind != TARRY_LAW_MIX)
        return 1;
    for (size_t i = 0; i < law->n; i++) {
        const size_t inner = count_parts(&law->parts[i]);
        n = inner > n ? inner : n;
    }
    return n;
}

static int check(const tarry_law *law, tarry_error *error) {
    if (law->n == 0)
        return tarry_fail(error, TARRY_INPUT, "a total delay needs at least one part");
    for (size_t i = 0; i < law->n; i++)
        if (tarry_law_check(&law->parts[i], error))
            return TARRY_INPUT;
    if (count_parts(law) > MOST_PARTS)
        return tarry_fail(error, TARRY_INPUT, "a total delay can have %d parts at most, not %zu",
                          MOST_PARTS, count_parts(law));
    return 0;
}

static double mean(const tarry_law *law) {
    double total = 0;
    for (size_t i = 0; i < law->n; i++)
        total += tarry_law_mean(&law->parts[i]);
    return total;
}

static double variance(const tarry_law *law) {
    double total = 0;
    for (size_t i = 0; i < law->n; i++)
        total += tarry_law_family_of(law->parts[i].kind)->variance(&law->parts[i]);
    return total;
}

static double least(const tarry_law *law) {
    double total = 0;
    for (size_t i = 0; i < law->n; i++)
        total += tarry_law_least(&law->parts[i]);
    return total;
}

static double most(const tarry_law *law) {
    double total = 0;
    for (size_t i = 0; i < law->n; i++)
        total += tarry_law_most(&law->parts[i]);
    return total;
}

/* ---- the simplest form ---- */

static void gather(sum *s, const tarry_law *law) {
    if (law->kind == TARRY_LAW_FIXED) {
        s->shift += law->a;
    } else if (law->kind == TARRY_LAW_TOTAL) {
        for (size_t i = 0; i < law->n; i++)
            gather(s, &law->parts[i]);
    } else {
        s->parts[s->n++] = *law;
    }
}

static bool is_gamma(const tarry_law *law) {
    return law->kind == TARRY_LAW_GAMMA || law->kind == TARRY_LAW_ERLANG ||
           law->kind == TARRY_LAW_EXPONENTIAL;
}

static bool join(tarry_law *one, const tarry_law *other) {
    const double scale = tarry_law_gamma_scale(one);
    const double shape = tarry_law_gamma_shape(one) + tarry_law_gamma_shape(other);
    if (fabs(tarry_law_gamma_scale(other) - scale) > 1e-15 * scale)
        return false;
    const bool whole = one->kind != TARRY_LAW_GAMMA && other->kind != TARRY_LAW_GAMMA;
    const tarry_law joined = {.kind = whole ? TARRY_LAW_ERLANG : TARRY_LAW_GAMMA,
                              .a = shape * scale,
                              .b = whole ? shape : sqrt(shape) * scale};
    *one = joined;
    return true;
}

static void join_gammas(sum *s) {
    for (size_t i = 0; i < s->n; i++)
        for (size_t j = i + 1; is_gamma(&s->parts[i]) && j < s->n;) {
            if (is_gamma(&s->parts[j]) && join(&s->parts[i], &s->parts[j]))
                s->parts[j] = s->parts[--s->n];
            else
                j++;
        }
}

/* The power of t with which a density that is infinite at 0 starts, plus 1; else 1. */
static double power_at_zero(const tarry_law *law) {
    if (is_gamma(law))
        return fmin(1, tarry_law_gamma_shape(law));
    return law->kind == TARRY_LAW_WEIBULL ? fmin(1, law->b) : 1;
}

/* ---- chains of exponential steps ---- */

static bool is_chain(const sum *s, double x) {
    double phases = 0, fastest = 0;
    for (size_t i = 0; i < s->n; i++) {
        if (s->parts[i].kind != TARRY_LAW_ERLANG && s->parts[i].kind != TARRY_LAW_EXPONENTIAL)
            return false;
        phases += tarry_law_gamma_shape(&s->parts[i]);
        fastest = fmax(fastest, 1 / tarry_law_gamma_scale(&s->parts[i]));
    }
    return phases <= MOST_PHASES && fastest * x <= MOST_POISSON;
}

static double chain(const sum *s, function which, double x) {
    double step[MOST_PHASES], present[MOST_PHASES] = {0}; /* chance to leave, chance to be there */
    size_t n = 0;
    double fastest = 0, over = 0, total = 0;
    for (size_t i = 0; i < s->n; i++)
        fastest = fmax(fastest, 1 / tarry_law_gamma_scale(&s->parts[i]));
    for (size_t i = 0; i < s->n; i++)
        for (double j = 0; j < tarry_law_gamma_shape(&s->parts[i]); j++)
            step[n++] = 1 / tarry_law_gamma_scale(&s->parts[i]) / fastest;
    present[0] = 1;
    for (double k = 0;; k++) {
        double left = 0;
        for (size_t j = 0; j < n; j++)
            left += present[j];
        const double term = which == CDF        ? tarry_gamma_term(k, fastest * x) * over
                            : which == SURVIVAL ? tarry_gamma_term(k, fastest * x) * left
                                                : tarry_gamma_lower(k + 1, fastest * x) * left;
        total += term;
        if (k > fastest * x + (double)n && term <= 1e-17 * total)
            break;
        over += present[n - 1] * step[n - 1];
        for (size_t j = n; j-- > 0;)
            present[j] += (j > 0 ? present[j - 1] * step[j - 1] : 0) - present[j] * step[j];
    }
    return which == INTEGRAL ? total / fastest : total;
}

/* ---- quadrature ---- */

typedef struct integrand {
    function which;
    tarry_law first;
    sum rest;
    double x;
    double power; /* t = x (s/x)^power takes the infinity out of a density at 0 */
} integrand;

static double at(double s, void *context) {
    const integrand *f = context;
    const double t = f->power > 1 ? f->x * pow(s / f->x, f->power) : s;
    if (!(t > 0))
        return 0;
    const double slope = f->power > 1 ? f->power * t / s : 1;
    const double density = tarry_law_family_of(f->first.kind)->density(&f->first, t);
    return density > 0 ? density * slope * evaluate(&f->rest, f->which, f->x - t) : 0;
}

/* One panel, halved until its error does not count beside what there is. */
static double panel(gsl_function *f, double from, double to, double so_far, int halvings) {
    double value, error, size, spread;
    gsl_integration_qk15(f, from, to, &value, &error, &size, &spread);
    if (!(error > 1e-10 * (value + so_far)) || halvings == 0)
        return value;
    const double middle = 0.5 * (from + to);
    const double left = panel(f, from, middle, so_far, halvings - 1);
    return left + panel(f, middle, to, so_far + left, halvings - 1);
}

static const double landmarks[N_LANDMARKS][2] = {
    {1e-12, 1}, {1e-6, 1 - 1e-6}, {1e-2, 0.99}, {0.2, 0.8}, {0.5, 0.5},
    {0.8, 0.2}, {0.99, 1e-2},     {1, 1e-6},    {1, 1e-12},
};

static size_t count_edges(const tarry_law *law) {
    return law->kind == TARRY_LAW_BINS ? law->n + 1 : law->kind == TARRY_LAW_UNIFORM ? 2 : 0;
}

/* Where panels end: places inside (0, x), in any order and number of times. */
typedef struct break_list {
    double x;
    size_t n;
    double *at;
} break_list;

static void add_break(break_list *breaks, double t) {
    if (t > 0 && t < breaks->x)
        breaks->at[breaks->n++] = t;
}

/* The jumps of a density, as shift + sign * edge. */
static void add_edges(break_list *breaks, const tarry_law *law, double shift, double sign) {
    if (law->kind == TARRY_LAW_UNIFORM) {
        add_break(breaks, shift + sign * law->a);
        add_break(breaks, shift + sign * law->b);
    } else {
        for (size_t i = 0; i < count_edges(law); i++)
            add_break(breaks, shift + sign * law->points[i]);
    }
}

static void find_breaks(const integrand *f, break_list *breaks) {
    for (int i = 0; i < N_LANDMARKS; i++) {
        const double p = landmarks[i][0], q = landmarks[i][1];
        double rest = 0;
        for (size_t j = 0; j < f->rest.n; j++)
            rest += tarry_law_quantile(&f->rest.parts[j], p, q);
        add_break(breaks, tarry_law_quantile(&f->first, p, q));
        add_break(breaks, f->x - rest);
    }
    add_edges(breaks, &f->first, 0, 1);
    if (f->rest.n == 1)
        add_edges(breaks, &f->rest.parts[0], f->x, -1);
}

/* The part to integrate over: one whose density jumps, else one whose density is infinite at 0. */
static size_t choose_first(const sum *s) {
    size_t first = 0;
    for (size_t i = 1; i < s->n; i++) {
        const tarry_law *law = &s->parts[i], *best = &s->parts[first];
        const bool more = count_edges(law) > count_edges(best);
        const bool same = count_edges(law) == count_edges(best);
        if (more || (same && power_at_zero(law) < power_at_zero(best)))
            first = i;
    }
    return first;
}

static double add_panels(integrand *f, const break_list *breaks) {
    gsl_function call = {.function = at, .params = f};
    double total = 0, from = 0;
    for (size_t i = 0; i <= breaks->n; i++) {
        const double t = i < breaks->n ? breaks->at[i] : f->x;
        const double to = f->power > 1 ? f->x * pow(t / f->x, 1 / f->power) : t;
        if (to > from)
            total += panel(&call, from, to, total, MOST_HALVINGS);
        from = to;
    }
    return total;
}

static double convolve(const sum *s, function which, double x) {
    const size_t first = choose_first(s);
    integrand f = {.which = which, .x = x, .first = s->parts[first], .rest = *s};
    f.power = 1 / power_at_zero(&f.first);
    f.rest.parts[first] = f.rest.parts[--f.rest.n];
    f.rest.shift = 0; /* already taken off x */

    const size_t most_breaks = 2 * (size_t)N_LANDMARKS + count_edges(&f.first) +
                               count_edges(&f.rest.parts[0]);
    break_list breaks = {.x = x, .at = tarry_calloc(most_breaks, sizeof(double))};
    if (!breaks.at)
        return NAN;
    find_breaks(&f, &breaks);
    gsl_sort(breaks.at, 1, breaks.n);
    const double total = add_panels(&f, &breaks);
    free(breaks.at);
    if (which == CDF)
        return total;
    return total + (which == SURVIVAL ? tarry_law_survival(&f.first, x)
                                      : tarry_law_survival_integral(&f.first, x));
}

/* ---- putting it together ---- */

/* The value for joined continuous parts without a shift, at x > 0. */
static double evaluate_plain(const sum *s, function which, double x) {
    if (s->n == 1)
        return which == CDF        ? tarry_law_cdf(&s->parts[0], x)
               : which == SURVIVAL ? tarry_law_survival(&s->parts[0], x)
                                   : tarry_law_survival_integral(&s->parts[0], x);
    if (is_chain(s, x))
        return chain(s, which, x);
    return convolve(s, which, x);
}

static double evaluate(const sum *s, function which, double x) {
    const double y = x - s->shift;
    if (s->n > 0 && y > 0)
        return (which == INTEGRAL ? s->shift : 0) + evaluate_plain(s, which, y);
    if (which == INTEGRAL)
        return fmin(x, s->shift);
    const bool over = s->n == 0 && y >= 0;
    return which == CDF ? over : !over;
}

/* Split the first mix or list of values into its cases; without one, join and evaluate. */
static double evaluate_cases(const sum *s, function which, double x) {
    size_t i = 0;
    while (i < s->n && s->parts[i].kind != TARRY_LAW_MIX && s->parts[i].kind != TARRY_LAW_VALUES)
        i++;
    if (i == s->n) {
        sum joined = *s;
        join_gammas(&joined);
        return evaluate(&joined, which, x);
    }
    const tarry_law *split = &s->parts[i];
    double total = 0;
    for (size_t k = 0; k < split->n; k++) {
        if (split->weights[k] <= 0)
            continue;
        sum one = *s;
        one.parts[i] = one.parts[--one.n];
        if (split->kind == TARRY_LAW_VALUES)
            one.shift += split->points[k];
        else
            gather(&one, &split->parts[k]);
        total += split->weights[k] * evaluate_cases(&one, which, x);
    }
    return total;
}

static double evaluate_law(const tarry_law *law, function which, double x) {
    sum s = {.n = 0};
    gather(&s, law);
    return evaluate_cases(&s, which, x);
}

static double cdf(const tarry_law *law, double x) {
    return evaluate_law(law, CDF, x);
}

static double survival(const tarry_law *law, double x) {
    return evaluate_law(law, SURVIVAL, x);
}

static double survival_integral(const tarry_law *law, double x) {
    return evaluate_law(law, INTEGRAL, x);
}

/* The total is below the sum of what each part exceeds with probability q/n, but for q in all; and
 * above the sum of what each is below with p/n, but for p. */
static double quantile(const tarry_law *law, double p, double q) {
    const double n = (double)law->n;
    double low = 0, high = 0;
    for (size_t i = 0; i < law->n; i++) {
        low += tarry_law_quantile(&law->parts[i], p / n, 1 - p / n);
        high += tarry_law_quantile(&law->parts[i], 1 - q / n, q / n);
    }
    return tarry_law_solve(law, p, q, low, high);
}

const tarry_law_family tarry_law_total = {
    .word = "total",
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
