/* SPDX-License-Identifier: GPL-3.0-or-later */

/* A molecule with dwell D in its stage, in it since x, shines rho(x/D) while x < D; a loss at rate
 * r leaves exp(-r x) of those that came in. Means over D are taken by a density or values
 * (measure.h); what came before the stage is folded in by its laws (delayed.h). */

#include "exact/glimpse.h"

#include "exact/delayed.h"
#include "exact/gauss.h"
#include "exact/measure.h"

#include "base/error.h"
#include "base/memory.h"

#include <math.h>
#include <stdlib.h>

/* ---- one stage ------------------------------------------------------------------------------- */

static bool is_flat(const tarry_exact_glimpse *g) {
    return g->from == 0 && g->to == 0;
}

/* rho(f), 0 <= f <= 1; a step at from = to counts from there on. */
static double shine(const tarry_exact_glimpse *g, double f) {
    if (g->from == g->to)
        return f >= g->from ? g->weight : 0;
    return g->weight * fmin(fmax((f - g->from) / (g->to - g->from), 0), 1);
}

typedef struct stage_work {
    const tarry_exact_stage *stage;
    tarry_measure measure; /* of its dwell */
    const tarry_exact_glimpse *one, *other;
    double at; /* the argument of the curve under way */
} stage_work;

static int start_stage(stage_work *w, const tarry_exact_stage *stage, tarry_error *error) {
    *w = (stage_work){.stage = stage};
    return tarry_measure_init(&w->measure, stage->law, error);
}

/* The places at which a curve of this stage may bend: single dwells, and edges of the density,
 * times each of the fractions. */
static double *places(const stage_work *w, const double *fractions, size_t n_fractions, size_t *n) {
    const tarry_curve *density = &w->measure.density;
    double *out = tarry_calloc((w->measure.n + density->n_breaks) * n_fractions, sizeof *out);
    *n = 0;
    for (size_t k = 0; out != NULL && k < n_fractions; k++) {
        for (size_t i = 0; i < w->measure.n; i++)
            out[(*n)++] = w->measure.at[i] * fractions[k];
        for (size_t i = 0; i < density->n_breaks; i++)
            out[(*n)++] = density->breaks[i] * fractions[k];
    }
    return out;
}

static int build(stage_work *w, const double *fractions, size_t n_fractions, double scale,
                 tarry_curve_function *function, double horizon, tarry_curve *out,
                 tarry_error *error) {
    size_t n = 0;
    double *breaks = places(w, fractions, n_fractions, &n);
    const double end = fmin(horizon, tarry_measure_most(&w->measure));
    int code = 0;
    if (breaks == NULL)
        code = tarry_fail_memory(error, "what a signal sees");
    else if (end > 0)
        code = tarry_curve_init(out, end, breaks, n, TARRY_DELAYED_TOLERANCE * scale, function, w,
                                error);
    free(breaks);
    return code;
}

/* What is seen at x since the molecule came in: by one, or by one times the other. */
static double shine_now(void *context, double dwell) {
    const stage_work *w = context;
    const double f = w->at / dwell;
    return shine(w->one, f) * (w->other != NULL ? shine(w->other, f) : 1);
}

static double mean_at(void *context, double x) {
    stage_work *w = context;
    const tarry_exact_glimpse *other = w->other != NULL ? w->other : w->one;
    const double bends[] = {x / w->one->from, x / w->one->to, x / other->from, x / other->to};
    w->at = x;
    return exp(-w->stage->rate * x) * tarry_measure_mean(&w->measure, x, bends, 4, shine_now, w);
}

/* *out (zeroed): the mean contribution x after it came in; with `other`, of both multiplied. */
static int stage_mean(const tarry_exact_stage *stage, const tarry_exact_glimpse *glimpse,
                      const tarry_exact_glimpse *other, double horizon, tarry_curve *out,
                      tarry_error *error) {
    const double weight = glimpse->weight * (other != NULL ? other->weight : 1);
    if (is_flat(glimpse) && (other == NULL || is_flat(other))) {
        tarry_curve there = {0};
        const tarry_curve_term term = {&there, 0, weight};
        int code = tarry_delayed_dwell(stage->law, stage->rate, horizon, &there, error);
        if (code == 0)
            code = tarry_curve_sum(&term, 1, horizon, TARRY_DELAYED_TOLERANCE * fabs(weight), out,
                                   error);
        tarry_curve_release(&there);
        return code;
    }
    stage_work w;
    const double fractions[] = {1, glimpse->from, glimpse->to, other != NULL ? other->from : 1,
                                other != NULL ? other->to : 1};
    int code = start_stage(&w, stage, error);
    w.one = glimpse;
    w.other = other;
    if (code == 0)
        code = build(&w, fractions, 5, fabs(weight), mean_at, horizon, out, error);
    tarry_measure_release(&w.measure);
    return code;
}

/* A molecule whose dwell D is over in y, and that was not lost by then. */
static double shine_before_end(void *context, double dwell) {
    const stage_work *w = context;
    return exp(-w->stage->rate * dwell) * shine(w->one, fmax(1 - w->at / dwell, 0));
}

static double before_end_at(void *context, double y) {
    stage_work *w = context;
    const double bends[] = {y / (1 - w->one->from), y / (1 - w->one->to)};
    w->at = y;
    return tarry_measure_mean(&w->measure, y, bends, 2, shine_before_end, w);
}

static int stage_before_end(const tarry_exact_stage *stage, const tarry_exact_glimpse *glimpse,
                            double horizon, tarry_curve *out, tarry_error *error) {
    stage_work w;
    const double fractions[] = {1, 1 - glimpse->from, 1 - glimpse->to};
    int code = start_stage(&w, stage, error);
    w.one = glimpse;
    if (code == 0)
        code = build(&w, fractions, 3, fabs(glimpse->weight), before_end_at, horizon, out, error);
    tarry_measure_release(&w.measure);
    return code;
}

static int compare(const void *one, const void *other) {
    const double a = *(const double *)one, b = *(const double *)other;
    return (a > b) - (a < b);
}

/* The integral over x of rho1(x/D) rho2((x + tau)/D) exp(-r (x + tau)), both within the dwell. */
static double overlap_of_dwell(void *context, double dwell) {
    const stage_work *w = context;
    const double tau = w->at, end = dwell - tau;
    double cuts[] = {0,
                     end,
                     w->one->from * dwell,
                     w->one->to * dwell,
                     w->other->from * dwell - tau,
                     w->other->to * dwell - tau};
    enum { N = sizeof cuts / sizeof *cuts };
    double sum = 0;
    if (!(end > 0))
        return 0;
    for (int i = 0; i < N; i++)
        cuts[i] = fmin(fmax(cuts[i], 0), end);
    qsort(cuts, N, sizeof *cuts, compare);
    for (int i = 0; i + 1 < N; i++) {
        const double half = 0.5 * (cuts[i + 1] - cuts[i]), middle = 0.5 * (cuts[i + 1] + cuts[i]);
        for (int k = 0; k < TARRY_GAUSS && half > 0; k++) {
            const double x = middle + half * tarry_gauss_node[k];
            sum += half * tarry_gauss_weight[k] * shine(w->one, x / dwell) *
                   shine(w->other, (x + tau) / dwell) * exp(-w->stage->rate * (x + tau));
        }
    }
    return sum;
}

static double overlap_at(void *context, double tau) {
    stage_work *w = context;
    const double shifts[] = {w->other->from,
                             w->other->to,
                             w->other->from - w->one->from,
                             w->other->to - w->one->from,
                             w->other->from - w->one->to,
                             w->other->to - w->one->to,
                             1 - w->one->from,
                             1 - w->one->to};
    enum { N = sizeof shifts / sizeof *shifts };
    double bends[N];
    for (int i = 0; i < N; i++)
        bends[i] = tau / shifts[i];
    w->at = tau;
    return tarry_measure_mean(&w->measure, tau, bends, N, overlap_of_dwell, w);
}

/* Within one stage. */
static int stage_overlap(const tarry_exact_stage *stage, const tarry_exact_glimpse *one,
                         const tarry_exact_glimpse *other, double horizon, tarry_curve *out,
                         tarry_error *error) {
    stage_work w;
    const double fractions[] = {1,
                                other->from,
                                other->to,
                                other->from - one->from,
                                other->to - one->from,
                                other->from - one->to,
                                other->to - one->to,
                                1 - one->from,
                                1 - one->to};
    int code = start_stage(&w, stage, error);
    w.one = one;
    w.other = other;
    if (code == 0)
        code = build(&w, fractions, sizeof fractions / sizeof *fractions,
                     fabs(one->weight * other->weight) * tarry_law_mean(stage->law), overlap_at,
                     horizon, out, error);
    tarry_measure_release(&w.measure);
    return code;
}

typedef struct tail {
    const tarry_curve *there;
    double factor;
} tail;

static double tail_at(void *context, double tau) {
    const tail *t = context;
    return t->factor * (tarry_curve_integral(t->there, tarry_curve_end(t->there)) -
                        tarry_curve_integral(t->there, tau));
}

/* The same where both see all of the molecule: what is left of the dwell's integral. */
static int flat_overlap(const tarry_exact_stage *stage, double weight, double horizon,
                        tarry_curve *out, tarry_error *error) {
    tarry_curve there = {0};
    tail t = {&there, weight};
    int code = tarry_delayed_dwell(stage->law, stage->rate, horizon, &there, error);
    if (code == 0 && there.n > 0) {
        const double whole = fabs(weight) * tarry_curve_integral(&there, tarry_curve_end(&there));
        code = tarry_curve_init(out, tarry_curve_end(&there), there.breaks, there.n_breaks,
                                TARRY_DELAYED_TOLERANCE * whole, tail_at, &t, error);
    }
    tarry_curve_release(&there);
    return code;
}

/* ---- from stage to stage --------------------------------------------------------------------- */

/* Fold in the laws of the stages before `stage`, from `first` on. In place. */
static int fold_before(const tarry_exact_chain *chain, size_t first, size_t stage, double horizon,
                       tarry_curve *curve, tarry_error *error) {
    int code = 0;
    for (size_t i = stage; code == 0 && i-- > first;) {
        const tarry_exact_stage *s = &chain->stages[i];
        tarry_curve later = *curve;
        *curve = (tarry_curve){0};
        code = tarry_delayed_by(s->law, s->rate, &later, horizon, curve, error);
        tarry_curve_release(&later);
    }
    return code;
}

/* Of those begun, the share that comes into the stage. */
static int reach(const tarry_exact_chain *chain, size_t stage, double *share, tarry_error *error) {
    *share = 1;
    for (size_t i = 0; i < stage; i++) {
        const tarry_exact_stage *s = &chain->stages[i];
        stage_work w;
        static const tarry_exact_glimpse whole = {0, 1, 0, 0};
        if (s->rate == 0)
            continue;
        const int code = start_stage(&w, s, error);
        w.one = &whole;
        if (code == 0)
            *share *= tarry_measure_mean(&w.measure, 0, NULL, 0, shine_before_end, &w);
        tarry_measure_release(&w.measure);
        if (code != 0)
            return code;
    }
    return 0;
}

typedef struct later_work {
    const tarry_curve *before, *after;
    double factor;
} later_work;

static double later_at(void *context, double tau) {
    const later_work *w = context;
    return w->factor * tarry_curve_product(w->before, w->after, tau, -1, 0, tau);
}

/* First in an earlier stage, then in a later one: the end of the first dwell lies y ahead. */
static int later_overlap(const tarry_exact_chain *chain, const tarry_exact_glimpse *one,
                         const tarry_exact_glimpse *other, double factor, double horizon,
                         tarry_curve *out, tarry_error *error) {
    const tarry_exact_stage *stages = chain->stages;
    tarry_curve before = {0}, after = {0};
    later_work w = {&before, &after, factor};
    size_t n = 0;
    double *breaks = NULL;
    int code = stage_before_end(&stages[one->stage], one, horizon, &before, error);
    if (code == 0)
        code = stage_mean(&stages[other->stage], other, NULL, horizon, &after, error);
    if (code == 0)
        code = fold_before(chain, one->stage + 1, other->stage, horizon, &after, error);
    if (code == 0 &&
        (breaks = tarry_calloc(before.n_breaks * after.n_breaks, sizeof *breaks)) == NULL)
        code = tarry_fail_memory(error, "what a signal sees");
    for (size_t i = 0; code == 0 && i < before.n_breaks; i++)
        for (size_t k = 0; k < after.n_breaks; k++)
            breaks[n++] = before.breaks[i] + after.breaks[k];
    if (code == 0 && before.n > 0 && after.n > 0)
        code = tarry_curve_init(
            out, fmin(horizon, tarry_curve_end(&before) + tarry_curve_end(&after)), breaks, n,
            TARRY_DELAYED_TOLERANCE * fabs(one->weight * other->weight) *
                tarry_law_mean(stages[one->stage].law),
            later_at, &w, error);
    free(breaks);
    tarry_curve_release(&before);
    tarry_curve_release(&after);
    return code;
}

static int glimpse_overlap(const tarry_exact_chain *chain, const tarry_exact_glimpse *one,
                           const tarry_exact_glimpse *other, double horizon, tarry_curve *out,
                           tarry_error *error) {
    const tarry_exact_stage *stage = &chain->stages[one->stage];
    double share = 0;
    if (other->stage < one->stage)
        return 0;
    int code = reach(chain, one->stage, &share, error);
    if (code != 0)
        return code;
    if (other->stage > one->stage)
        return later_overlap(chain, one, other, share, horizon, out, error);
    tarry_curve whole = {0};
    const tarry_curve_term term = {&whole, 0, share};
    code = is_flat(one) && is_flat(other)
               ? flat_overlap(stage, one->weight * other->weight, horizon, &whole, error)
               : stage_overlap(stage, one, other, horizon, &whole, error);
    if (code == 0)
        code = tarry_curve_sum(&term, 1, horizon,
                               TARRY_DELAYED_TOLERANCE * tarry_curve_value(&whole, 0, 1e-300), out,
                               error);
    tarry_curve_release(&whole);
    return code;
}

/* ---- sums over glimpses ---------------------------------------------------------------------- */

/* `code`: of what made the curves, which are released either way. */
static int finish_sum(tarry_curve *curves, size_t n, int code, double horizon, tarry_curve *out,
                      tarry_error *error) {
    tarry_curve_term *terms = tarry_calloc(n, sizeof *terms);
    double scale = 0;
    if (code == 0 && terms == NULL)
        code = tarry_fail_memory(error, "what a signal sees");
    for (size_t i = 0; code == 0 && i < n; i++) {
        terms[i] = (tarry_curve_term){&curves[i], 0, 1};
        for (size_t k = 0; k < curves[i].n; k++)
            scale = fmax(scale, fabs(curves[i].coefficients[k * TARRY_CURVE_NODES]));
    }
    if (code == 0)
        code = tarry_curve_sum(terms, n, horizon, TARRY_DELAYED_TOLERANCE * scale, out, error);
    free(terms);
    for (size_t i = 0; curves != NULL && i < n; i++)
        tarry_curve_release(&curves[i]);
    free(curves);
    return code;
}

int tarry_exact_glimpses_mean(const tarry_exact_chain *chain, const tarry_exact_glimpses *glimpses,
                              double horizon, tarry_curve *mean, tarry_error *error) {
    tarry_curve *parts = tarry_calloc(glimpses->n, sizeof *parts);
    int code = parts == NULL ? tarry_fail_memory(error, "what a signal sees") : 0;
    for (size_t i = 0; code == 0 && i < glimpses->n; i++) {
        const tarry_exact_glimpse *g = &glimpses->list[i];
        code = stage_mean(&chain->stages[g->stage], g, NULL, horizon, &parts[i], error);
        if (code == 0)
            code = fold_before(chain, 0, g->stage, horizon, &parts[i], error);
    }
    return finish_sum(parts, glimpses->n, code, horizon, mean, error);
}

int tarry_exact_glimpses_overlap(const tarry_exact_chain *chain, const tarry_exact_glimpses *one,
                                 const tarry_exact_glimpses *other, double horizon,
                                 tarry_curve *overlap, tarry_error *error) {
    const size_t n = one->n * other->n;
    tarry_curve *parts = tarry_calloc(n, sizeof *parts);
    int code = parts == NULL ? tarry_fail_memory(error, "what a signal sees") : 0;
    for (size_t i = 0; code == 0 && i < n; i++)
        code = glimpse_overlap(chain, &one->list[i / other->n], &other->list[i % other->n], horizon,
                               &parts[i], error);
    return finish_sum(parts, n, code, horizon, overlap, error);
}

/* A molecule is in one stage at a time: only glimpses of one stage go together. With `stage`, of
 * those in that stage alone, as they are within it. */
static int find_square(const tarry_exact_chain *chain, const size_t *stage,
                       const tarry_exact_glimpses *glimpses, double horizon, tarry_curve *square,
                       tarry_error *error) {
    const size_t n = glimpses->n * glimpses->n;
    tarry_curve *parts = tarry_calloc(n, sizeof *parts);
    int code = parts == NULL ? tarry_fail_memory(error, "what a signal sees") : 0;
    for (size_t i = 0; code == 0 && i < n; i++) {
        const tarry_exact_glimpse *one = &glimpses->list[i / glimpses->n];
        const tarry_exact_glimpse *other = &glimpses->list[i % glimpses->n];
        if (one->stage != other->stage || (stage != NULL && one->stage != *stage))
            continue;
        code = stage_mean(&chain->stages[one->stage], one, other, horizon, &parts[i], error);
        if (code == 0 && stage == NULL)
            code = fold_before(chain, 0, one->stage, horizon, &parts[i], error);
    }
    return finish_sum(parts, n, code, horizon, square, error);
}

int tarry_exact_glimpses_square(const tarry_exact_chain *chain,
                                const tarry_exact_glimpses *glimpses, double horizon,
                                tarry_curve *square, tarry_error *error) {
    return find_square(chain, NULL, glimpses, horizon, square, error);
}

int tarry_exact_glimpses_within(const tarry_exact_chain *chain, size_t stage,
                                const tarry_exact_glimpses *glimpses, double horizon,
                                tarry_curve *mean, tarry_curve *square, tarry_error *error) {
    tarry_curve *parts = tarry_calloc(glimpses->n, sizeof *parts);
    int code = parts == NULL ? tarry_fail_memory(error, "what a signal sees") : 0;
    for (size_t i = 0; code == 0 && i < glimpses->n; i++)
        if (glimpses->list[i].stage == stage)
            code = stage_mean(&chain->stages[stage], &glimpses->list[i], NULL, horizon, &parts[i],
                              error);
    code = finish_sum(parts, glimpses->n, code, horizon, mean, error);
    return code != 0 ? code : find_square(chain, &stage, glimpses, horizon, square, error);
}
