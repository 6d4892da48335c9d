/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "exact/generating.h"

#include "exact/chain.h"

#include "base/error.h"
#include "base/memory.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

typedef struct generator {
    const tarry_exact_gene *gene;
    const tarry_exact_load *load;
    double tolerance;
    size_t n;
    double *re, *im;
    double *states; /* [n_states] */
    tarry_error *error;
} generator;

/* On to age `to` under one regime, stopping at every break. */
static int march(const generator *g, tarry_march *m, size_t regime, double to) {
    const tarry_exact_regime *r = &g->gene->regimes[regime];
    int code = 0;
    for (size_t i = 0; code == 0 && i < g->load->n_breaks && g->load->breaks[i] < to; i++)
        code = tarry_march_to(m, r->quiet, r->jump, g->load->breaks[i], g->error);
    return code == 0 ? tarry_march_to(m, r->quiet, r->jump, to, g->error) : code;
}

/* The states before the oldest age that was marched to, times w, to the power of the copies. */
static int finish(const generator *g, const tarry_march *m, double time, double *re, double *im) {
    const size_t n_states = g->gene->n_states;
    const int code = tarry_exact_states(g->gene, time - m->at, g->states, g->error);
    for (size_t j = 0; code == 0 && j < g->n; j++) {
        double x = 0, y = 0, power_x = 1, power_y = 0;
        for (size_t s = 0; s < n_states; s++) {
            x += g->states[s] * m->re[j * n_states + s];
            y += g->states[s] * m->im[j * n_states + s];
        }
        for (double copy = 0; copy < g->gene->n_copies; copy++) {
            const double next = power_x * x - power_y * y;
            power_y = power_x * y + power_y * x;
            power_x = next;
        }
        re[j] = power_x;
        im[j] = power_y;
    }
    return code;
}

/* From where the newest regime ends, back through the older ones. */
static int march_back(const generator *g, const tarry_march *newest, size_t regime, double time,
                      double *re, double *im) {
    const double end = fmin(g->load->horizon, time - g->gene->regimes[0].from);
    if (regime == 0 || newest->at >= end)
        return finish(g, newest, time, re, im);
    tarry_march older = {0};
    int code = tarry_march_copy(newest, &older, g->error);
    while (code == 0 && regime-- > 0 && older.at < end)
        code = march(g, &older, regime, fmin(end, time - g->gene->regimes[regime].from));
    if (code == 0)
        code = finish(g, &older, time, re, im);
    tarry_march_release(&older);
    return code;
}

/* Times that have the same newest regime go along it together. */
static int run(generator *g, size_t n_probes, const double *times, size_t n_times) {
    int code = 0;
    for (size_t i = 0; code == 0 && i < n_times;) {
        const size_t regime = tarry_exact_regime_before(g->gene, times[i]);
        tarry_march m = {0};
        code = tarry_march_init(&m, g->gene->n_states, g->n, n_probes, g->tolerance,
                                g->load->values, g->load->context, g->error);
        for (; code == 0 && i < n_times && tarry_exact_regime_before(g->gene, times[i]) == regime;
             i++) {
            const double age = times[i] - g->gene->regimes[regime].from;
            code = march(g, &m, regime, fmin(g->load->horizon, age));
            if (code == 0)
                code = march_back(g, &m, regime, times[i], &g->re[i * g->n], &g->im[i * g->n]);
        }
        tarry_march_release(&m);
    }
    return code;
}

int tarry_exact_generating(const tarry_exact_gene *gene, const tarry_exact_load *load,
                           double tolerance, size_t n, size_t n_probes, const double *times,
                           size_t n_times, double *re, double *im, tarry_error *error) {
    generator g = {.gene = gene,
                   .load = load,
                   .tolerance = tolerance,
                   .n = n,
                   .re = re,
                   .im = im,
                   .states = tarry_calloc(gene->n_states, sizeof(double)),
                   .error = error};
    const int code = g.states == NULL ? tarry_fail_memory(error, "a generating function")
                                      : run(&g, n_probes, times, n_times);
    free(g.states);
    return code;
}
