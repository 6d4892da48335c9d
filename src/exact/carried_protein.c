/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Counts of proteins: each is there or not, so that what is seen of one has the generating function
 * 1 + (z - 1) P(there). */

#include "exact/carried.h"

#include "exact/delayed.h"
#include "exact/fold.h"
#include "exact/translated.h"

#include "base/error.h"
#include "base/memory.h"

#include <math.h>
#include <stdlib.h>

static void put_loads(void *context, double a, double inside, size_t from, size_t to, double *re,
                      double *im) {
    const tarry_exact_carried *c = context;
    tarry_translated_put(c->own, a, inside, from, to, re, im);
}

static int prepare(tarry_exact_carried *c, size_t n, const double *re, const double *im,
                   tarry_error *error) {
    c->n = n;
    c->re = re;
    c->im = im;
    return tarry_translated_prepare(c->own, n, re, im, NULL, NULL, error);
}

static int growth(tarry_exact_carried *c, double above, double *out, tarry_error *error) {
    static const double zero = 0;
    tarry_error fault = {0};
    const int code = tarry_translated_prepare(c->own, 1, &above, &zero, NULL, NULL, &fault);
    const tarry_translated *t = c->own;
    *out = code == 0 ? tarry_fan_integral(&t->stages[0].values, 0) : INFINITY;
    if (code == 0 || code == TARRY_NUMERIC)
        return 0;
    if (error != NULL)
        *error = fault;
    return code;
}

static void release(tarry_exact_carried *carried) {
    tarry_translated_release(carried->own);
    free(carried->own);
}

static int put_mean(const tarry_exact_gene *gene, tarry_exact_carried *carried, double horizon,
                    tarry_error *error) {
    const tarry_translated *t = carried->own;
    tarry_curve made = {0};
    tarry_exact_glimpses rates = {0};
    int code = tarry_exact_translations(gene, &rates, error);
    if (code == 0)
        code = tarry_exact_glimpses_mean(&gene->transcript, &rates, horizon, &made, error);
    if (code == 0)
        code = tarry_fold(&made, &t->seen[0], horizon, &carried->mean, error);
    tarry_curve_release(&made);
    free(rates.list);
    return code;
}

/* What is seen of a protein stands in seen[0]; the rest follows. */
static int finish(const tarry_exact_gene *gene, tarry_exact_carried *carried, double horizon,
                  tarry_error *error) {
    static const tarry_exact_glimpses nothing = {0};
    tarry_translated *t = carried->own;
    int code = put_mean(gene, carried, horizon, error);
    if (code == 0)
        code = tarry_translated_init(t, &gene->transcript, &nothing, horizon, error);
    if (code != 0)
        return code;
    carried->load = (tarry_exact_load){.values = put_loads,
                                       .context = carried,
                                       .breaks = carried->mean.breaks,
                                       .n_breaks = carried->mean.n_breaks,
                                       .horizon = tarry_curve_end(&carried->mean)};
    carried->total = tarry_curve_integral(&carried->mean, carried->load.horizon);
    carried->most = tarry_translated_most(t);
    return 0;
}

static int begin(tarry_exact_carried *carried, tarry_error *error) {
    *carried = (tarry_exact_carried){.prepare = prepare, .growth = growth};
    carried->own = tarry_calloc(1, sizeof(tarry_translated));
    if (carried->own == NULL)
        return tarry_fail_memory(error, "proteins of a transcript");
    carried->release = release;
    return 0;
}

int tarry_exact_carry_protein(const tarry_exact_gene *gene, size_t stage, double horizon,
                              tarry_exact_carried *carried, tarry_error *error) {
    int code = begin(carried, error);
    tarry_translated *t = carried->own;
    if (code == 0)
        code = tarry_exact_presence(&gene->protein, stage, horizon, &t->seen[0], error);
    if (code == 0)
        code = finish(gene, carried, horizon, error);
    return code == 0 ? tarry_translated_second(t, false, &carried->second, error) : code;
}

/* ---- arrivals -------------------------------------------------------------------------------- */

/* The age at which even the slowest has passed all stages before. */
static double slowest(const tarry_exact_chain *chain, size_t stage) {
    double sum = 0;
    for (size_t i = 0; i < stage; i++)
        sum += tarry_law_quantile(chain->stages[i].law, 1, 1e-16);
    return sum;
}

typedef struct arrivals {
    const tarry_curve *there;
    double end, stretch;
} arrivals;

/* Past `end` all have come that will. */
static double came_within(void *context, double y) {
    const arrivals *w = context;
    const double last = tarry_curve_value(w->there, w->end, 0);
    const double now = y < w->end ? tarry_curve_value(w->there, y, y) : last;
    const double then = y - w->stretch;
    return now - (then >= w->end ? last : tarry_curve_value(w->there, then, then));
}

int tarry_exact_carry_arrivals(const tarry_exact_gene *gene, size_t stage, double stretch,
                               double horizon, tarry_exact_carried *carried, tarry_error *error) {
    const tarry_exact_chain *chain = &gene->protein;
    const double end = fmin(horizon, slowest(chain, stage) * (1 + 1e-9) + 1e-9 * horizon);
    tarry_curve there = {0};
    int code = begin(carried, error);
    tarry_translated *t = carried->own;
    if (code == 0)
        code = tarry_delayed_dwell(NULL, 0, end, &there, error);
    for (size_t i = stage; code == 0 && i-- > 0;) {
        tarry_curve later = there;
        there = (tarry_curve){0};
        code = tarry_delayed_by(chain->stages[i].law, chain->stages[i].rate, &later, end, &there,
                                error);
        tarry_curve_release(&later);
    }
    arrivals w = {&there, tarry_curve_end(&there), stretch};
    const size_t n = 2 * there.n_breaks;
    double *breaks = tarry_calloc(n, sizeof *breaks);
    if (code == 0 && breaks == NULL)
        code = tarry_fail_memory(error, "a first response");
    for (size_t i = 0; code == 0 && i < n; i++)
        breaks[i] = there.breaks[i / 2] + (i % 2 > 0 ? stretch : 0);
    if (code == 0 && there.n > 0 && stretch > 0)
        code = tarry_curve_init(&t->seen[0], fmin(horizon, w.end + stretch), breaks, n,
                                TARRY_DELAYED_TOLERANCE, came_within, &w, error);
    free(breaks);
    tarry_curve_release(&there);
    return code == 0 ? finish(gene, carried, horizon, error) : code;
}
