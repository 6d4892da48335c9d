/* SPDX-License-Identifier: GPL-3.0-or-later */

/* A stage whose dwell is exponential is solved by collocation (radau.h), some z side by side,
 * without exchanges (march.c says why). Any other is a mean over its dwell, by Gauss-Legendre
 * quadrature over pieces of its density on which all is smooth. */

#include "exact/translated_piece.h"

#include "exact/gauss.h"

#include "base/error.h"
#include "base/memory.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

enum { INNER = TARRY_RADAU_MOST, NODES = TARRY_FAN_NODES, LANES = 8 };

static const double most_exponent = 6; /* of what changes over one stretch of a quadrature */

typedef double lanes[LANES];

struct tarry_piece_work {
    lanes re[INNER][INNER + 1], im[INNER][INNER + 1]; /* equations; the last column is right */
    double *next_re[INNER], *next_im[INNER];          /* the next stage at the nodes */
    double *values_re, *values_im;
    double *row; /* weights of the next stage's values, [n_pieces][NODES] */
    size_t row_capacity;
    double *room;
};

int tarry_piece_work_new(tarry_piece_work **work, size_t n, tarry_error *error) {
    tarry_piece_work *w = *work = tarry_calloc(1, sizeof *w);
    if (w != NULL)
        w->room = tarry_calloc(2 * INNER + 2, n * sizeof(double));
    if (w == NULL || w->room == NULL)
        return tarry_fail_memory(error, "proteins of a transcript");
    for (size_t i = 0; i < INNER; i++) {
        w->next_re[i] = w->room + 2 * i * n;
        w->next_im[i] = w->room + (2 * i + 1) * n;
    }
    w->values_re = w->room + (size_t)2 * INNER * n;
    w->values_im = w->values_re + n;
    return 0;
}

void tarry_piece_work_free(tarry_piece_work *work) {
    if (work == NULL)
        return;
    free(work->room);
    free(work->row);
    free(work);
}

static const tarry_fan *next_fan(const tarry_translated *t, size_t stage) {
    return stage + 1 < t->n_stages ? &t->stages[stage + 1].values : NULL;
}

/* alpha * first + beta * second. */
static void combine(const tarry_translated *t, size_t j, double first, double second, double *re,
                    double *im) {
    *re = t->alpha_re[j] * first + (t->beta_re != NULL ? t->beta_re[j] * second : 0);
    *im = t->alpha_im[j] * first + (t->beta_im != NULL ? t->beta_im[j] * second : 0);
}

/* ---- exponential dwells ---------------------------------------------------------------------- */

/* Row i less its share of row k. */
static void reduce(tarry_piece_work *w, size_t k, size_t i) {
    lanes fre, fim;
    for (int m = 0; m < LANES; m++) {
        const double pre = w->re[k][k][m], pim = w->im[k][k][m];
        const double size = pre * pre + pim * pim;
        const double re = w->re[i][k][m], im = w->im[i][k][m];
        fre[m] = (re * pre + im * pim) / size;
        fim[m] = (im * pre - re * pim) / size;
    }
    for (size_t c = k + 1; c <= INNER; c++)
        for (int m = 0; m < LANES; m++) {
            w->re[i][c][m] -= fre[m] * w->re[k][c][m] - fim[m] * w->im[k][c][m];
            w->im[i][c][m] -= fre[m] * w->im[k][c][m] + fim[m] * w->re[k][c][m];
        }
}

static void eliminate(tarry_piece_work *w) {
    for (size_t k = 0; k < INNER; k++)
        for (size_t i = k + 1; i < INNER; i++)
            reduce(w, k, i);
}

/* The unknowns come into the last column. */
static void substitute(tarry_piece_work *w) {
    for (size_t k = INNER; k-- > 0;)
        for (int m = 0; m < LANES; m++) {
            double re = w->re[k][INNER][m], im = w->im[k][INNER][m];
            for (size_t c = k + 1; c < INNER; c++) {
                re -= w->re[k][c][m] * w->re[c][INNER][m] - w->im[k][c][m] * w->im[c][INNER][m];
                im -= w->re[k][c][m] * w->im[c][INNER][m] + w->im[k][c][m] * w->re[c][INNER][m];
            }
            const double pre = w->re[k][k][m], pim = w->im[k][k][m];
            const double size = pre * pre + pim * pim;
            w->re[k][INNER][m] = (re * pre + im * pim) / size;
            w->im[k][INNER][m] = (im * pre - re * pim) / size;
        }
}

/* V - 1 where the piece begins: that of the piece before, or what is seen on coming in. */
static void begin_piece(const tarry_translated *t, const tarry_translated_stage *s, double from,
                        double *re, double *im) {
    const tarry_fan *fan = &s->values;
    if (!(from > 0)) {
        const double once = tarry_curve_value(&s->once, 0, 1e-300);
        const double square = tarry_curve_value(&s->square, 0, 1e-300);
        for (size_t j = 0; j < t->n; j++)
            combine(t, j, once, square, &re[j], &im[j]);
        return;
    }
    const size_t before = fan->n_pieces - (fan->bounds[fan->n_pieces] > from ? 2 : 1);
    const size_t last = (before * NODES + NODES - 1) * fan->n;
    memmove(re, fan->re + last, t->n * sizeof *re);
    memmove(im, fan->im + last, t->n * sizeof *im);
}

typedef struct flow {
    const tarry_translated *t;
    const tarry_translated_stage *s;
    bool goes_on;
    double length;
    double first[INNER], second[INNER]; /* k times what is seen of a protein, at the nodes */
} flow;

static void fill_equations(tarry_piece_work *w, const flow *f, size_t from, size_t n,
                           const double *re, const double *im) {
    const tarry_radau *rule = &f->s->values.rule;
    const double out = f->s->leave + f->s->stage->rate;
    for (size_t i = 0; i < INNER; i++) {
        for (size_t k = 0; k < INNER; k++)
            for (int m = 0; m < LANES; m++) {
                w->re[i][k][m] = rule->derive[i][k];
                w->im[i][k][m] = 0;
            }
        memset(w->re[i][INNER], 0, sizeof(lanes));
        memset(w->im[i][INNER], 0, sizeof(lanes));
        for (size_t m = 0; m < n; m++) {
            const size_t j = from + m;
            double x, y;
            combine(f->t, j, f->first[i], f->second[i], &x, &y);
            w->re[i][i][m] -= f->length * (x - out);
            w->im[i][i][m] -= f->length * y;
            if (f->goes_on) {
                x += f->s->leave * w->next_re[i][j];
                y += f->s->leave * w->next_im[i][j];
            }
            w->re[i][INNER][m] = rule->begin[i] * re[j] + f->length * x;
            w->im[i][INNER][m] = rule->begin[i] * im[j] + f->length * y;
        }
    }
}

static void flow_through(tarry_piece_work *w, const tarry_translated *t, size_t stage, double from,
                         double to, double *re, double *im) {
    const tarry_translated_stage *s = &t->stages[stage];
    const tarry_fan *next = next_fan(t, stage);
    const double inside = 0.5 * (from + to), k = s->stage->translation;
    flow f = {.t = t, .s = s, .goes_on = next != NULL && s->leave > 0, .length = to - from};
    begin_piece(t, s, from, re, im);
    for (size_t i = 0; i < INNER; i++) {
        const double x = from + f.length * s->values.rule.node[i];
        f.first[i] = k * tarry_curve_value(&t->seen[0], x, inside);
        f.second[i] = k * tarry_curve_value(&t->seen[1], x, inside);
        if (f.goes_on) {
            tarry_fan_place place;
            tarry_fan_find(next, x, inside, &place);
            tarry_fan_put(next, &place, 0, t->n, w->next_re[i], w->next_im[i]);
        }
    }
    for (size_t j = 0; j < t->n; j += LANES) {
        const size_t n = t->n - j < LANES ? t->n - j : LANES;
        fill_equations(w, &f, j, n, re, im);
        eliminate(w);
        substitute(w);
        for (size_t i = 0; i < INNER; i++)
            for (size_t m = 0; m < n; m++) {
                re[(i + 1) * t->n + j + m] = w->re[i][INNER][m];
                im[(i + 1) * t->n + j + m] = w->im[i][INNER][m];
            }
    }
}

/* ---- other dwells ---------------------------------------------------------------------------- */

typedef struct meanwhile {
    tarry_piece_work *w;
    const tarry_translated *t;
    const tarry_translated_stage *s;
    const tarry_fan *next;
    double r, inside;
    double most[2]; /* |alpha|, |beta| */
    double *re, *im;
} meanwhile;

/* The integral of what is seen of a protein up to age x. */
static double summed(const tarry_translated *t, int i, double x) {
    const tarry_curve *curve = &t->summed[i];
    const double end = tarry_curve_end(curve);
    if (!(x > 0) || curve->n == 0)
        return 0;
    return x < end ? tarry_curve_value(curve, x, x) : tarry_curve_value(curve, end, 0);
}

/* exp(x + iy) - 1. */
static void expm1_complex(double x, double y, double *re, double *im) {
    const double half = sin(0.5 * y), grown = expm1(x);
    *re = grown * cos(y) - 2 * half * half;
    *im = (grown + 1) * sin(y);
}

/* `weight` of the molecules had a dwell of l, and then went on (`goes_on`) or were no more. Where V
 * jumps at what is left, the side of `inside` is meant. */
static void add_dwell(const meanwhile *m, double weight, double l, bool goes_on, double inside) {
    const tarry_translated *t = m->t;
    const double k = m->s->stage->translation, rest = fmax(m->r - l, 0);
    tarry_fan_place place = {.beyond = true};
    if (goes_on && m->next != NULL)
        tarry_fan_find(m->next, rest, inside, &place);
    if (!(k > 0)) { /* later, all together */
        for (size_t i = 0; i < NODES && !place.beyond; i++)
            m->w->row[place.piece * NODES + i] += weight * place.weight[i];
        return;
    }
    const double first = k * (summed(t, 0, m->r) - summed(t, 0, rest));
    const double second = k * (summed(t, 1, m->r) - summed(t, 1, rest));
    double *nre = m->w->values_re, *nim = m->w->values_im;
    if (!place.beyond)
        tarry_fan_put(m->next, &place, 0, t->n, nre, nim);
    for (size_t j = 0; j < t->n; j++) {
        double x, y, re, im;
        combine(t, j, first, second, &x, &y);
        expm1_complex(x, y, &re, &im);
        if (!place.beyond) {
            x = re + nre[j] + re * nre[j] - im * nim[j];
            im = im + nim[j] + re * nim[j] + im * nre[j];
            re = x;
        }
        m->re[j] += weight * re;
        m->im[j] += weight * im;
    }
}

/* The last of the places below x, or 0. */
static double place_below(const double *at, size_t n, double x) {
    size_t low = 0, high = n;
    while (low < high) {
        const size_t middle = low + (high - low) / 2;
        if (at[middle] < x)
            low = middle + 1;
        else
            high = middle;
    }
    return low > 0 ? at[low - 1] : 0;
}

/* Dwells from `from` to `to` with density factor * density(l), on one piece of it. */
static void add_stretch(const meanwhile *m, const tarry_curve *density, double factor, double from,
                        double to, bool goes_on) {
    const double half = 0.5 * (to - from), middle = 0.5 * (from + to);
    for (int i = 0; i < TARRY_GAUSS; i++) {
        const double l = middle + half * tarry_gauss_node[i];
        double weight = half * tarry_gauss_weight[i] * factor * tarry_curve_value(density, l, l);
        if (goes_on)
            weight *= exp(-m->s->stage->rate * l);
        add_dwell(m, weight, l, goes_on, fmax(m->r - l, 0));
    }
}

/* How much the largest exponent changes between two dwells. */
static double change(const meanwhile *m, double from, double to) {
    double sum = 0;
    if (!(m->s->stage->translation > 0))
        return 0;
    for (int i = 0; i < 2; i++)
        sum += m->most[i] * fabs(summed(m->t, i, m->r - from) - summed(m->t, i, m->r - to));
    return sum * m->s->stage->translation;
}

/* All dwells shorter than r. */
static void add_density(const meanwhile *m, const tarry_curve *density, double factor,
                        bool goes_on) {
    const bool cuts = goes_on && m->next != NULL && m->next->n_pieces > 0;
    for (size_t i = 0; i < density->n && density->bounds[i] < m->r; i++) {
        double l = density->bounds[i];
        const double end = fmin(density->bounds[i + 1], m->r);
        while (l < end) {
            const double y = m->r - l;
            double to = end;
            for (int k = 0; k < 2; k++)
                to = fmin(to, m->r - place_below(m->t->seen[k].breaks, m->t->seen[k].n_breaks, y));
            if (cuts)
                to = fmin(to, m->r - place_below(m->next->bounds, m->next->n_pieces + 1, y));
            if (!(to > l)) /* rounding: the cut is where we are */
                to = fmin(end, l + 1e-15 * m->r);
            const double parts = fmax(1, ceil(change(m, l, to) / most_exponent));
            if (!(to > l))
                break;
            for (double p = 0; p < parts; p++)
                add_stretch(m, density, factor, l + (to - l) * p / parts,
                            l + (to - l) * (p + 1) / parts, goes_on);
            l = to;
        }
    }
}

/* Those that are still in the stage. */
static void add_staying(const meanwhile *m) {
    const tarry_translated *t = m->t;
    const double k = m->s->stage->translation;
    const double stay = tarry_curve_value(&m->s->stay, m->r, m->inside);
    const double once = tarry_curve_value(&m->s->once, m->r, m->inside);
    const double square = tarry_curve_value(&m->s->square, m->r, m->inside);
    const double first = k * summed(t, 0, m->r), second = k * summed(t, 1, m->r);
    for (size_t j = 0; j < t->n; j++) {
        double x, y, re, im, ore, oim;
        combine(t, j, first, second, &x, &y);
        expm1_complex(x, y, &re, &im);
        combine(t, j, once, square, &ore, &oim);
        m->re[j] += stay * re + (1 + re) * ore - im * oim;
        m->im[j] += stay * im + (1 + re) * oim + im * ore;
    }
}

/* The next stage's values by their weights. */
static void add_row(const meanwhile *m) {
    const tarry_fan *next = m->next;
    for (size_t i = 0; i < next->n_pieces * NODES; i++) {
        const double weight = m->w->row[i];
        for (size_t j = 0; j < next->n && weight != 0; j++) {
            m->re[j] += weight * next->re[i * next->n + j];
            m->im[j] += weight * next->im[i * next->n + j];
        }
    }
}

static void find_at(const meanwhile *m) {
    const tarry_measure *measure = &m->s->measure;
    const double loss = m->s->stage->rate;
    const bool rows = !(m->s->stage->translation > 0) && m->next != NULL;
    memset(m->re, 0, m->t->n * sizeof *m->re);
    memset(m->im, 0, m->t->n * sizeof *m->im);
    if (rows && m->next->n_pieces > 0)
        memset(m->w->row, 0, m->next->n_pieces * NODES * sizeof *m->w->row);
    for (size_t i = 0; i < measure->n; i++)
        if (measure->at[i] < m->inside)
            add_dwell(m, measure->weight[i] * exp(-loss * measure->at[i]), measure->at[i], true,
                      fmax(m->inside - measure->at[i], 0));
    add_density(m, &measure->density, 1, true);
    if (loss > 0 && m->s->stage->translation > 0)
        add_density(m, &m->s->stay, loss, false);
    add_staying(m);
    if (rows)
        add_row(m);
}

static double largest(const double *re, const double *im, size_t n) {
    double most = 0;
    for (size_t j = 0; re != NULL && j < n; j++)
        most = fmax(most, hypot(re[j], im[j]));
    return most;
}

static void average_dwells(tarry_piece_work *w, const tarry_translated *t, size_t stage,
                           double from, double to, double *re, double *im) {
    const tarry_translated_stage *s = &t->stages[stage];
    meanwhile m = {
        .w = w,
        .t = t,
        .s = s,
        .next = next_fan(t, stage),
        .inside = 0.5 * (from + to),
        .most = {largest(t->alpha_re, t->alpha_im, t->n), largest(t->beta_re, t->beta_im, t->n)}};
    for (size_t i = 0; i < NODES; i++) {
        m.r = from + (i > 0 ? (to - from) * s->values.rule.node[i - 1] : 0);
        m.re = re + i * t->n;
        m.im = im + i * t->n;
        find_at(&m);
    }
}

/* ---- either ---------------------------------------------------------------------------------- */

int tarry_piece_prepare(tarry_piece_work *w, const tarry_translated *t, size_t stage,
                        tarry_error *error) {
    const tarry_fan *next = next_fan(t, stage);
    if (next == NULL)
        return 0;
    if (tarry_grow((void **)&w->row, &w->row_capacity, next->n_pieces * NODES, sizeof *w->row) != 0)
        return tarry_fail_memory(error, "proteins of a transcript");
    return 0;
}

void tarry_piece_fill(tarry_piece_work *work, const tarry_translated *t, size_t stage, double from,
                      double to, double *re, double *im) {
    if (t->stages[stage].flows)
        flow_through(work, t, stage, from, to, re, im);
    else
        average_dwells(work, t, stage, from, to, re, im);
}
