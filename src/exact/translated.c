/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Stages are worked out from the last to the first, all z together, piece by piece: pieces end at
 * the breaks, and are halved until some z, those that vary most, are followed well enough. */

#include "exact/translated.h"

#include "exact/delayed.h"
#include "exact/translated_piece.h"

#include "base/error.h"
#include "base/memory.h"

#include <gsl/gsl_math.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

enum { MOST_PIECES = 4000, FEW = 40, PROBES = 19 };

static const double highest = 1e200; /* beyond this a value is out of range */

/* ---- setting up ------------------------------------------------------------------------------ */

static void release_stage(tarry_translated_stage *s) {
    tarry_measure_release(&s->measure);
    tarry_curve_release(&s->stay);
    tarry_curve_release(&s->once);
    tarry_curve_release(&s->square);
    tarry_fan_release(&s->values);
    free(s->breaks);
}

void tarry_translated_release(tarry_translated *t) {
    for (size_t i = 0; i < t->n_stages; i++)
        release_stage(&t->stages[i]);
    free(t->stages);
    for (int i = 0; i < 2; i++) {
        tarry_curve_release(&t->seen[i]);
        tarry_curve_release(&t->summed[i]);
    }
    *t = (tarry_translated){0};
}

static double integral_at(void *context, double x) {
    return tarry_curve_integral(context, x);
}

static int sum_up(tarry_curve *seen, tarry_curve *summed, tarry_error *error) {
    const double end = tarry_curve_end(seen);
    double scale = 0;
    for (size_t k = 0; k < seen->n; k++)
        scale = fmax(scale, fabs(tarry_curve_integral(seen, seen->bounds[k + 1])));
    if (!(scale > 0))
        return 0;
    return tarry_curve_init(summed, end, seen->breaks, seen->n_breaks,
                            TARRY_DELAYED_TOLERANCE * scale, integral_at, seen, error);
}

static int compare(const void *one, const void *other) {
    const double a = *(const double *)one, b = *(const double *)other;
    return (a > b) - (a < b);
}

/* Sorted within [0, end], each once, with both ends. */
static void order_breaks(tarry_translated_stage *s) {
    size_t kept = 1;
    qsort(s->breaks, s->n_breaks, sizeof *s->breaks, compare);
    for (size_t i = 1; i < s->n_breaks; i++)
        if (s->breaks[i] < s->end && s->breaks[i] - s->breaks[kept - 1] > 1e-13 * s->end)
            s->breaks[kept++] = s->breaks[i];
    if (kept > 1 && s->end - s->breaks[kept - 1] < 1e-13 * s->end)
        kept--;
    s->breaks[kept++] = s->end;
    s->n_breaks = kept;
}

/* Where what comes after bends, and that moved by the ends of the dwell. */
static int find_breaks(tarry_translated *t, tarry_translated_stage *s,
                       const tarry_translated_stage *next, tarry_error *error) {
    static const double zero = 0;
    const double *const lists[] = {&zero, t->seen[0].breaks, t->seen[1].breaks,
                                   next != NULL ? next->breaks : NULL};
    const size_t sizes[] = {1, t->seen[0].n_breaks, t->seen[1].n_breaks,
                            next != NULL ? next->n_breaks : 0};
    const size_t n_ends = s->stay.n_breaks > 0 ? s->stay.n_breaks : 1;
    size_t n = 0;
    for (int i = 0; i < 4; i++)
        n += sizes[i];
    s->breaks = tarry_calloc(n_ends * n + 2, sizeof *s->breaks);
    if (s->breaks == NULL)
        return tarry_fail_memory(error, "proteins of a transcript");
    for (size_t e = 0; e < n_ends; e++)
        for (int i = 0; i < 4; i++)
            for (size_t k = 0; k < sizes[i]; k++)
                s->breaks[s->n_breaks++] = lists[i][k] + (e > 0 ? s->stay.breaks[e] : 0);
    order_breaks(s);
    return 0;
}

static int set_up(tarry_translated *t, size_t i, const tarry_exact_chain *chain,
                  const tarry_exact_glimpses *glimpses, double horizon, tarry_error *error) {
    tarry_translated_stage *s = &t->stages[i];
    const tarry_translated_stage *next = i + 1 < t->n_stages ? s + 1 : NULL;
    const tarry_law *law = chain->stages[i].law;
    s->stage = &chain->stages[i];
    s->flows = law == NULL || law->kind == TARRY_LAW_EXPONENTIAL;
    s->leave = law != NULL && s->flows ? 1 / law->a : 0;
    int code = tarry_delayed_dwell(law, s->stage->rate, horizon, &s->stay, error);
    if (code == 0 && !s->flows)
        code = tarry_measure_init(&s->measure, law, error);
    if (code == 0 && glimpses->n > 0)
        code = tarry_exact_glimpses_within(chain, i, glimpses, horizon, &s->once, &s->square,
                                           error);
    const double after = fmax(tarry_curve_end(&t->seen[0]), next != NULL ? next->end : 0);
    s->end = fmin(horizon, tarry_curve_end(&s->stay) + after);
    return code == 0 && s->end > 0 ? find_breaks(t, s, next, error) : code;
}

int tarry_translated_init(tarry_translated *t, const tarry_exact_chain *transcript,
                          const tarry_exact_glimpses *glimpses, double horizon,
                          tarry_error *error) {
    int code = 0;
    t->stages = tarry_calloc(transcript->n, sizeof *t->stages);
    if (t->stages == NULL)
        return tarry_fail_memory(error, "proteins of a transcript");
    t->n_stages = transcript->n;
    for (int i = 0; code == 0 && i < 2; i++)
        code = sum_up(&t->seen[i], &t->summed[i], error);
    for (size_t i = t->n_stages; code == 0 && i-- > 0;)
        code = set_up(t, i, transcript, glimpses, horizon, error);
    return code;
}

/* ---- pieces ---------------------------------------------------------------------------------- */

/* The z by which pieces are judged: a few first ones and the last, or all. */
static size_t choose_probes(size_t n, size_t probes[FEW]) {
    const size_t m = n <= FEW ? n : PROBES;
    for (size_t i = 0; i < m; i++)
        probes[i] = i;
    if (m < n)
        probes[m - 1] = n - 1;
    return m;
}

typedef struct builder {
    tarry_translated *t;
    size_t stage;
    tarry_piece_work *work;
    tarry_translated probes; /* the same with a few z alone */
    double *trial[2];        /* [TARRY_FAN_NODES][n_probes] */
    tarry_error *error;
} builder;

/* The largest rest of any probe over its own size, and whether one is out of range. */
static double judge(const builder *b, const tarry_fan *fan, bool *out_of_range) {
    const size_t n = b->probes.n;
    double most = 0;
    for (size_t j = 0; j < n; j++) {
        double size = 1;
        for (size_t i = 1; i < TARRY_FAN_NODES; i++)
            size = fmax(size, hypot(b->trial[0][i * n + j], b->trial[1][i * n + j]));
        const double rest = fmax(tarry_fan_rest(fan, b->trial[0] + n + j, n),
                                 tarry_fan_rest(fan, b->trial[1] + n + j, n));
        *out_of_range = *out_of_range || !(size < highest);
        most = rest / size <= most ? most : rest / size; /* not a number counts as large */
    }
    return most;
}

/* One stage from 0 to its end. The probes' fans of later stages are kept too. */
static int follow(builder *b) {
    tarry_translated_stage *s = &b->t->stages[b->stage], *probe = &b->probes.stages[b->stage];
    double at = 0, step = s->end;
    tarry_fan_begin(&s->values, b->t->n);
    tarry_fan_begin(&probe->values, b->probes.n);
    for (size_t i = 1; i < s->n_breaks && s->end > 0;) {
        const double length = fmin(step, s->breaks[i] - at);
        const bool last = length >= (s->breaks[i] - at) * (1 - 1e-9);
        const double to = last ? s->breaks[i] : at + length;
        double *re, *im;
        bool out_of_range = false;
        tarry_piece_fill(b->work, &b->probes, b->stage, at, to, b->trial[0], b->trial[1]);
        const double rest = judge(b, &s->values, &out_of_range);
        const bool is_short = to - at <= 1e-13 * s->end;
        if (!(rest <= TARRY_DELAYED_TOLERANCE) && !is_short) {
            step = 0.5 * (to - at);
            continue;
        }
        if (out_of_range || rest != rest || s->values.n_pieces >= MOST_PIECES)
            return tarry_fail(b->error, TARRY_NUMERIC,
                              "the proteins of a transcript pass the range of numbers");
        int code = tarry_fan_add(&probe->values, to, &re, &im, b->error);
        if (code != 0)
            return code;
        memcpy(re, b->trial[0], TARRY_FAN_NODES * b->probes.n * sizeof *re);
        memcpy(im, b->trial[1], TARRY_FAN_NODES * b->probes.n * sizeof *im);
        code = tarry_fan_add(&s->values, to, &re, &im, b->error);
        if (code != 0)
            return code;
        if (b->t->n == b->probes.n) { /* they are all of them */
            memcpy(re, b->trial[0], TARRY_FAN_NODES * b->probes.n * sizeof *re);
            memcpy(im, b->trial[1], TARRY_FAN_NODES * b->probes.n * sizeof *im);
        } else {
            tarry_piece_fill(b->work, b->t, b->stage, at, to, re, im);
        }
        at = to;
        i += last;
        step = 2 * length;
    }
    return 0;
}

/* The probes share all but their z and what is worked out for them. */
static int make_probes(builder *b, double *room) {
    size_t probes[FEW];
    tarry_translated *t = b->t, *p = &b->probes;
    *p = *t;
    p->n = choose_probes(t->n, probes);
    const double *const from[] = {t->alpha_re, t->alpha_im, t->beta_re, t->beta_im};
    const double **const to[] = {&p->alpha_re, &p->alpha_im, &p->beta_re, &p->beta_im};
    for (size_t k = 0; k < 4; k++) {
        for (size_t i = 0; i < p->n && from[k] != NULL; i++)
            room[k * FEW + i] = from[k][probes[i]];
        *to[k] = from[k] != NULL ? room + k * FEW : NULL;
    }
    p->stages = tarry_calloc(t->n_stages, sizeof *p->stages);
    b->trial[0] = tarry_calloc(TARRY_FAN_NODES, p->n * sizeof(double));
    b->trial[1] = tarry_calloc(TARRY_FAN_NODES, p->n * sizeof(double));
    if (p->stages == NULL || b->trial[0] == NULL || b->trial[1] == NULL)
        return tarry_fail_memory(b->error, "proteins of a transcript");
    for (size_t i = 0; i < t->n_stages; i++) {
        p->stages[i] = t->stages[i];
        p->stages[i].values = (tarry_fan){0};
    }
    return 0;
}

int tarry_translated_prepare(tarry_translated *t, size_t n, const double *alpha_re,
                             const double *alpha_im, const double *beta_re, const double *beta_im,
                             tarry_error *error) {
    double room[4 * FEW];
    builder b = {.t = t, .error = error};
    t->n = n;
    t->alpha_re = alpha_re;
    t->alpha_im = alpha_im;
    t->beta_re = beta_re;
    t->beta_im = beta_im;
    int code = tarry_piece_work_new(&b.work, n, error);
    if (code == 0)
        code = make_probes(&b, room);
    for (size_t i = t->n_stages; code == 0 && i-- > 0;) {
        b.stage = i;
        code = tarry_piece_prepare(b.work, t, i, error);
        if (code == 0)
            code = tarry_piece_prepare(b.work, &b.probes, i, error);
        if (code == 0)
            code = follow(&b);
        if (i + 1 < t->n_stages) /* no longer needed */
            tarry_fan_release(&t->stages[i + 1].values);
    }
    for (size_t i = 0; b.probes.stages != NULL && i < t->n_stages; i++)
        tarry_fan_release(&b.probes.stages[i].values);
    free(b.probes.stages);
    free(b.trial[0]);
    free(b.trial[1]);
    tarry_piece_work_free(b.work);
    return code;
}

void tarry_translated_put(const tarry_translated *t, double a, double inside, size_t from,
                          size_t to, double *re, double *im) {
    tarry_fan_place place;
    tarry_fan_find(&t->stages[0].values, a, inside, &place);
    tarry_fan_put(&t->stages[0].values, &place, from, to, re, im);
    for (size_t j = 0; j < to - from; j++)
        re[j] += 1;
}

/* ---- second moments -------------------------------------------------------------------------- */

/* By Cauchy's formula from values on a circle around 0, exact but for the derivatives from POINTS
 * on (Trefethen & Weideman 2014, SIAM Rev. 56:385). */
enum { POINTS = 16, HALF = POINTS / 2 + 1 };

typedef struct circle {
    const tarry_translated *t;
    double radius;
} circle;

static double second_at(void *context, double a) {
    const circle *c = context;
    double re[HALF], im[HALF], sum = 0;
    tarry_translated_put(c->t, a, a, 0, HALF, re, im);
    for (int k = 0; k < HALF; k++) {
        const double angle = 4 * M_PI * k / POINTS;
        const double twice = k == 0 || k == HALF - 1 ? 1 : 2; /* the lower half mirrors it */
        sum += twice * ((re[k] - 1) * cos(angle) + im[k] * sin(angle));
    }
    return 2 * sum / (POINTS * c->radius * c->radius);
}

/* No value is larger. */
static double bound_of(const tarry_curve *curve) {
    double most = 0;
    for (size_t i = 0; i < curve->n; i++) {
        double sum = 0;
        for (size_t k = 0; k < TARRY_CURVE_NODES; k++)
            sum += fabs(curve->coefficients[i * TARRY_CURVE_NODES + k]);
        most = fmax(most, sum);
    }
    return most;
}

double tarry_translated_most(const tarry_translated *t) {
    const double end = tarry_curve_end(&t->seen[0]), once = bound_of(&t->seen[0]);
    const double life = fabs(tarry_curve_integral(&t->seen[0], end));
    double sum = once;
    for (size_t i = 0; i < t->n_stages; i++) {
        const tarry_translated_stage *s = &t->stages[i];
        const double stay = tarry_curve_integral(&s->stay, tarry_curve_end(&s->stay));
        sum += s->stage->translation * fmin(life, 10 * stay * once) + bound_of(&s->once);
    }
    return sum;
}

int tarry_translated_second(tarry_translated *t, bool plain, tarry_curve *second,
                            tarry_error *error) {
    const double most = tarry_translated_most(t);
    double values[4][HALF];
    const tarry_translated_stage *first = &t->stages[0];
    circle c = {t, 0.5 / most};
    if (!(most > 0) || !(first->end > 0))
        return 0;
    for (int k = 0; k < HALF; k++) {
        const double angle = 2 * M_PI * k / POINTS, r = c.radius;
        values[0][k] = r * cos(angle);
        values[1][k] = k < HALF - 1 ? r * sin(angle) : 0;
        values[2][k] = 0.5 * r * r * cos(2 * angle);
        values[3][k] = k < HALF - 1 ? 0.5 * r * r * sin(2 * angle) : 0;
    }
    const int code = tarry_translated_prepare(
        t, HALF, values[0], values[1], plain ? values[2] : NULL, plain ? values[3] : NULL, error);
    return code != 0 ? code
                     : tarry_curve_init(second, first->end, first->breaks, first->n_breaks,
                                        1e-10 * most * most, second_at, &c, error);
}
