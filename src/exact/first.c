/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "exact/first.h"

#include "exact/carried.h"
#include "exact/delayed.h"
#include "exact/generating.h"

#include "base/error.h"
#include "base/memory.h"

#include <math.h>
#include <stdlib.h>

static const double tolerance = 1e-11;

typedef struct arrivals {
    tarry_curve there; /* at an age: it has come to the stage */
    double stretch;    /* the time that is looked at, up to now */
    double *breaks;
} arrivals;

/* Past the end of the curve all that will come have come. */
static double there_by(const arrivals *w, double a, double inside) {
    const double end = tarry_curve_end(&w->there);
    if (a >= end)
        return tarry_curve_value(&w->there, end, 0);
    return tarry_curve_value(&w->there, a, inside);
}

static void put_loads(void *context, double a, double inside, size_t from, size_t to, double *re,
                      double *im) {
    const arrivals *w = context;
    const double before = a - w->stretch;
    double share = there_by(w, a, inside);
    if (before > 0 || (before >= 0 && inside > a))
        share -= there_by(w, before, inside - w->stretch);
    for (size_t j = from; j < to; j++) {
        re[j - from] = 1 - share;
        im[j - from] = 0;
    }
}

/* The age at which even the slowest has passed all stages before. */
static double slowest(const tarry_exact_chain *chain, size_t stage) {
    double sum = 0;
    for (size_t i = 0; i < stage; i++)
        sum += tarry_law_quantile(chain->stages[i].law, 1, 1e-16);
    return sum;
}

static int find_arrivals(const tarry_exact_gene *gene, size_t stage, double horizon, arrivals *w,
                         tarry_error *error) {
    const tarry_exact_chain *chain = &gene->transcript;
    const double end = fmin(horizon, slowest(chain, stage) * (1 + 1e-9) + 1e-9 * horizon);
    int code = tarry_delayed_dwell(NULL, 0, end, &w->there, error);
    for (size_t i = stage; code == 0 && i-- > 0;) {
        tarry_curve later = w->there;
        w->there = (tarry_curve){0};
        code = tarry_delayed_by(chain->stages[i].law, chain->stages[i].rate, &later, end, &w->there,
                                error);
        tarry_curve_release(&later);
    }
    return code;
}

static int compare(const void *one, const void *other) {
    const double a = *(const double *)one, b = *(const double *)other;
    return (a > b) - (a < b);
}

static int find_share(const tarry_exact_gene *gene, arrivals *w, double time, double horizon,
                      double *share, tarry_error *error) {
    const tarry_curve *there = &w->there;
    const size_t n = 2 * there->n_breaks;
    double im = 0;
    w->breaks = tarry_calloc(n, sizeof *w->breaks);
    if (w->breaks == NULL)
        return tarry_fail_memory(error, "a first response");
    for (size_t i = 0; i < n; i++)
        w->breaks[i] = there->breaks[i / 2] + (i % 2 > 0 ? w->stretch : 0);
    qsort(w->breaks, n, sizeof *w->breaks, compare);
    const tarry_exact_load load = {put_loads, w, w->breaks, n,
                                   fmin(horizon, tarry_curve_end(there) + w->stretch)};
    const int code = tarry_exact_generating(gene, &load, tolerance, 1, 1, &time, 1, share, &im,
                                            error);
    free(w->breaks);
    return code;
}

int tarry_exact_none_yet(const tarry_exact_gene *gene, size_t stage, double step,
                         const double *times, size_t n_times, double horizon, double *share,
                         tarry_error *error) {
    arrivals w = {0};
    int code = find_arrivals(gene, stage, horizon, &w, error);
    for (size_t i = 0; code == 0 && i < n_times; i++) {
        w.stretch = times[i];
        share[i] = 1;
        if (times[i] > 0 && w.there.n > 0)
            code = find_share(gene, &w, step + times[i], horizon, &share[i], error);
    }
    tarry_curve_release(&w.there);
    return code;
}

static int find_no_protein(const tarry_exact_gene *gene, size_t stage, double step, double stretch,
                           double horizon, double *share, tarry_error *error) {
    static const double minus_one = -1, zero = 0;
    const double time = step + stretch;
    tarry_exact_carried carried = {0};
    double im = 0;
    int code = tarry_exact_carry_arrivals(gene, stage, stretch, horizon, &carried, error);
    *share = 1;
    if (code == 0 && carried.load.horizon > 0) {
        code = carried.prepare(&carried, 1, &minus_one, &zero, error);
        if (code == 0)
            code = tarry_exact_generating(gene, &carried.load, tolerance, 1, 1, &time, 1, share,
                                          &im, error);
    }
    tarry_exact_carried_release(&carried);
    return code;
}

int tarry_exact_no_protein_yet(const tarry_exact_gene *gene, size_t stage, double step,
                               const double *times, size_t n_times, double horizon, double *share,
                               tarry_error *error) {
    int code = 0;
    for (size_t i = 0; code == 0 && i < n_times; i++)
        code = find_no_protein(gene, stage, step, times[i], horizon, &share[i], error);
    return code;
}
