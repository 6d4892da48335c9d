/* SPDX-License-Identifier: GPL-3.0-or-later */

/* What a signal sees of a transcript, r, by its first two moments: E[exp(s r)] to second order in
 * s. Only derivatives at s = 0 mean something. */

#include "exact/carried.h"

#include "base/error.h"
#include "base/memory.h"

#include <stdlib.h>

typedef struct seen {
    tarry_curve square;
    double *breaks;
} seen;

static void put_loads(void *context, double a, double inside, size_t from, size_t to, double *re,
                      double *im) {
    const tarry_exact_carried *c = context;
    const seen *s = c->own;
    const double first = tarry_curve_value(&c->mean, a, inside);
    const double second = 0.5 * tarry_curve_value(&s->square, a, inside);
    for (size_t j = from; j < to; j++) {
        const double x = c->re[j], y = c->im[j];
        re[j - from] = 1 + x * first + (x * x - y * y) * second;
        im[j - from] = y * first + 2 * x * y * second;
    }
}

static int prepare(tarry_exact_carried *carried, size_t n, const double *re, const double *im,
                   tarry_error *error) {
    (void)error;
    carried->n = n;
    carried->re = re;
    carried->im = im;
    return 0;
}

static void release(tarry_exact_carried *carried) {
    seen *s = carried->own;
    tarry_curve_release(&s->square);
    free(s->breaks);
    free(s);
}

static int compare(const void *one, const void *other) {
    const double a = *(const double *)one, b = *(const double *)other;
    return (a > b) - (a < b);
}

/* Of both curves, in order. */
static int join_breaks(tarry_exact_carried *carried, seen *s, tarry_error *error) {
    const tarry_curve *mean = &carried->mean, *square = &s->square;
    const size_t n = mean->n_breaks + square->n_breaks;
    s->breaks = tarry_calloc(n, sizeof *s->breaks);
    if (s->breaks == NULL)
        return tarry_fail_memory(error, "what a signal sees");
    for (size_t i = 0; i < n; i++)
        s->breaks[i] = i < mean->n_breaks ? mean->breaks[i] : square->breaks[i - mean->n_breaks];
    qsort(s->breaks, n, sizeof *s->breaks, compare);
    carried->load.breaks = s->breaks;
    carried->load.n_breaks = n;
    return 0;
}

int tarry_exact_carry_view(const tarry_exact_gene *gene, const tarry_exact_view *view,
                           double horizon, tarry_exact_carried *carried, tarry_error *error) {
    seen *s = tarry_calloc(1, sizeof *s);
    *carried = (tarry_exact_carried){.prepare = prepare, .is_plain = true};
    if (s == NULL)
        return tarry_fail_memory(error, "what a signal sees");
    carried->own = s;
    carried->release = release;
    int code = tarry_exact_view_mean(gene, view, horizon, &carried->mean, error);
    if (code == 0)
        code = tarry_exact_view_square(gene, view, horizon, &s->square, error);
    carried->second = &s->square;
    carried->load = (tarry_exact_load){.values = put_loads, .context = carried};
    if (code == 0)
        code = join_breaks(carried, s, error);
    const double end = tarry_curve_end(&carried->mean), other = tarry_curve_end(&s->square);
    carried->load.horizon = end > other ? end : other;
    carried->total = tarry_curve_integral(&carried->mean, end);
    return code;
}
