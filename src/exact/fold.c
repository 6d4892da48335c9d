/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "exact/fold.h"

#include "exact/delayed.h"

#include "base/error.h"
#include "base/memory.h"

#include <math.h>
#include <stdlib.h>

enum { SAMPLES = 64, MOST_BREAKS = 4096 };

/* A list of places at which an integral may bend. */
typedef struct places {
    double *at;
    size_t n, capacity;
    int short_of_memory;
} places;

/* Each break of one with each of the other: sign * one + other. Where they are too many, halving
 * finds the bends. */
static void add_places(places *p, const tarry_curve *one, int sign, const tarry_curve *other) {
    const size_t n = one->n_breaks * other->n_breaks;
    if (n > MOST_BREAKS)
        return;
    if (tarry_grow((void **)&p->at, &p->capacity, p->n + n, sizeof *p->at) != 0) {
        p->short_of_memory = 1;
        return;
    }
    for (size_t i = 0; i < one->n_breaks; i++)
        for (size_t k = 0; k < other->n_breaks; k++)
            p->at[p->n++] = sign * one->breaks[i] + other->breaks[k];
}

/* Followed to within a share of its largest value. */
static int follow(places *p, double end, tarry_curve_function *function, void *context,
                  tarry_curve *out, tarry_error *error) {
    double scale = 0;
    int code = 0;
    if (p->short_of_memory)
        code = tarry_fail_memory(error, "a function of age");
    for (int i = 0; code == 0 && i <= SAMPLES && end > 0; i++) {
        const double s = (double)i / SAMPLES;
        scale = fmax(scale, fabs(function(context, end * s * s * s)));
    }
    if (code == 0 && scale > 0)
        code = tarry_curve_init(out, end, p->at, p->n, TARRY_DELAYED_TOLERANCE * scale, function,
                                context, error);
    free(p->at);
    return code;
}

typedef struct pair {
    const tarry_curve *one, *other;
} pair;

static double fold_at(void *context, double x) {
    const pair *p = context;
    return tarry_curve_product(p->one, p->other, x, -1, 0, x);
}

int tarry_fold(const tarry_curve *one, const tarry_curve *other, double horizon, tarry_curve *out,
               tarry_error *error) {
    pair p = {one, other};
    places at = {0};
    if (one->n == 0 || other->n == 0)
        return 0;
    add_places(&at, one, 1, other);
    return follow(&at, fmin(horizon, tarry_curve_end(one) + tarry_curve_end(other)), fold_at, &p,
                  out, error);
}

static double along_at(void *context, double y) {
    const pair *p = context;
    return tarry_curve_product(p->one, p->other, y, 1, 0, tarry_curve_end(p->one));
}

int tarry_fold_along(const tarry_curve *one, const tarry_curve *other, double horizon,
                     tarry_curve *out, tarry_error *error) {
    pair p = {one, other};
    places at = {0};
    if (one->n == 0 || other->n == 0)
        return 0;
    add_places(&at, one, -1, other);
    return follow(&at, fmin(horizon, tarry_curve_end(other)), along_at, &p, out, error);
}

double tarry_fold_two_sided(const tarry_two_sided *f, const tarry_two_sided *g, double y) {
    return tarry_curve_product(f->ahead, g->ahead, y, -1, 0, y) +
           tarry_curve_product(f->ahead, g->back, -y, 1, y, tarry_curve_end(f->ahead)) +
           tarry_curve_product(f->back, g->ahead, y, 1, 0, tarry_curve_end(f->back));
}

typedef struct sides {
    const tarry_two_sided *f, *g;
} sides;

static double both_at(void *context, double y) {
    const sides *s = context;
    return tarry_fold_two_sided(s->f, s->g, y);
}

int tarry_fold_both(const tarry_two_sided *f, const tarry_two_sided *g, double horizon,
                    tarry_curve *out, tarry_error *error) {
    sides s = {f, g};
    places at = {0};
    const double end = fmax(tarry_curve_end(f->ahead) + tarry_curve_end(g->ahead),
                            fmax(tarry_curve_end(f->ahead), tarry_curve_end(g->ahead)));
    add_places(&at, f->ahead, 1, g->ahead);
    add_places(&at, g->back, -1, f->ahead);
    add_places(&at, f->back, -1, g->ahead);
    return follow(&at, fmin(horizon, end), both_at, &s, out, error);
}
