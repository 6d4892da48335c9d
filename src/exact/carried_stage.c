/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "exact/carried.h"

#include "exact/delayed.h"

int tarry_exact_presence(const tarry_exact_chain *chain, size_t stage, double horizon,
                         tarry_curve *presence, tarry_error *error) {
    const tarry_exact_stage *stages = chain->stages;
    int code = tarry_delayed_dwell(stages[stage].law, stages[stage].rate, horizon, presence, error);
    for (size_t i = stage; code == 0 && i-- > 0;) {
        tarry_curve later = *presence;
        *presence = (tarry_curve){0};
        code = tarry_delayed_by(stages[i].law, stages[i].rate, &later, horizon, presence, error);
        tarry_curve_release(&later);
    }
    return code;
}

/* g = 1 + (z - 1) P(there). */
static void put_loads(void *context, double a, double inside, size_t from, size_t to, double *re,
                      double *im) {
    const tarry_exact_carried *c = context;
    const double h = tarry_curve_value(&c->mean, a, inside);
    for (size_t j = from; j < to; j++) {
        re[j - from] = 1 + c->re[j] * h;
        im[j - from] = c->im[j] * h;
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

int tarry_exact_carry_stage(const tarry_exact_chain *chain, size_t stage, double horizon,
                            tarry_exact_carried *carried, tarry_error *error) {
    *carried = (tarry_exact_carried){.prepare = prepare};
    const int code = tarry_exact_presence(chain, stage, horizon, &carried->mean, error);
    carried->load = (tarry_exact_load){.values = put_loads,
                                       .context = carried,
                                       .breaks = carried->mean.breaks,
                                       .n_breaks = carried->mean.n_breaks,
                                       .horizon = tarry_curve_end(&carried->mean)};
    carried->total = tarry_curve_integral(&carried->mean, carried->load.horizon);
    return code;
}

void tarry_exact_carried_release(tarry_exact_carried *carried) {
    if (carried->release != NULL)
        carried->release(carried);
    tarry_curve_release(&carried->mean);
    tarry_curve_release(&carried->second);
}
