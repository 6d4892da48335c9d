/* SPDX-License-Identifier: GPL-3.0-or-later */

/* From the newest regime back to the oldest, as in generating.c, but for two derivatives alone. */

#include "exact/moments.h"

#include "exact/chain.h"
#include "exact/drift.h"

#include "base/error.h"
#include "base/memory.h"

#include <math.h>
#include <stdint.h>
#include <stdlib.h>
#include <string.h>

typedef struct finder {
    const tarry_exact_gene *gene;
    const tarry_exact_carried *carried;
    tarry_drift drift;
    tarry_drift_state newest, older; /* of the regime in force, and on from there */
    double *room;                    /* [5][n_states] */
    tarry_error *error;
} finder;

/* Of all copies, from the states before the oldest age that counts. */
static int finish(finder *f, const tarry_drift_state *s, double time, tarry_exact_moments *out) {
    const size_t n = f->gene->n_states;
    double *p = f->room + 4 * n, first = 0, second = 0;
    const int code = tarry_exact_states(f->gene, time - s->at, p, f->error);
    for (size_t i = 0; code == 0 && i < n; i++) {
        first += p[i] * s->w1[i];
        second += p[i] * s->w2[i];
    }
    if (!f->carried->is_plain)
        second += first; /* the second factorial moment is E[N (N - 1)] */
    *out = (tarry_exact_moments){f->gene->n_copies * first,
                                 f->gene->n_copies * fmax(second - first * first, 0)};
    return code;
}

static int find_at(finder *f, size_t regime, double time, tarry_exact_moments *out) {
    const tarry_exact_regime *regimes = f->gene->regimes;
    const size_t n = f->gene->n_states;
    const double horizon = f->carried->load.horizon, end = fmin(horizon, time - regimes[0].from);
    int code = tarry_drift_to(&f->drift, &f->newest, regime,
                              fmin(horizon, time - regimes[regime].from), f->error);
    f->older.at = f->newest.at;
    f->older.step = f->newest.step;
    memcpy(f->older.w1, f->newest.w1, n * sizeof(double));
    memcpy(f->older.w2, f->newest.w2, n * sizeof(double));
    while (code == 0 && regime-- > 0 && f->older.at < end)
        code = tarry_drift_to(&f->drift, &f->older, regime, fmin(end, time - regimes[regime].from),
                              f->error);
    return code == 0 ? finish(f, &f->older, time, out) : code;
}

/* Times that have the same newest regime go along it together. */
static int find(finder *f, const double *times, size_t n_times, tarry_exact_moments *moments) {
    const size_t n = f->gene->n_states;
    size_t before = SIZE_MAX;
    int code = 0;
    for (size_t i = 0; code == 0 && i < n_times; i++) {
        const size_t regime = tarry_exact_regime_before(f->gene, times[i]);
        if (regime != before) {
            memset(f->room, 0, 2 * n * sizeof *f->room);
            f->newest = (tarry_drift_state){.w1 = f->room, .w2 = f->room + n};
        }
        before = regime;
        code = find_at(f, regime, times[i], &moments[i]);
    }
    return code;
}

int tarry_exact_moments_at(const tarry_exact_gene *gene, tarry_exact_carried *carried,
                           const double *times, size_t n_times, tarry_exact_moments *moments,
                           tarry_error *error) {
    const size_t n = gene->n_states;
    finder f = {.gene = gene, .carried = carried, .error = error};
    f.room = tarry_calloc(5 * n, sizeof *f.room);
    if (f.room == NULL)
        return tarry_fail_memory(error, "moments of a count");
    f.older = (tarry_drift_state){.w1 = f.room + 2 * n, .w2 = f.room + 3 * n};
    int code = tarry_drift_init(&f.drift, gene, &carried->mean, &carried->second, error);
    if (code == 0)
        code = find(&f, times, n_times, moments);
    tarry_drift_release(&f.drift);
    free(f.room);
    return code;
}

int tarry_exact_initiations(const tarry_exact_gene *gene, double time, double *rate,
                            tarry_error *error) {
    const double *jump = gene->regimes[tarry_exact_regime_before(gene, time)].jump;
    double *p = tarry_calloc(gene->n_states, sizeof *p);
    int code = p == NULL ? tarry_fail_memory(error, "the states of a promoter")
                         : tarry_exact_states(gene, time, p, error);
    *rate = 0;
    for (size_t i = 0; code == 0 && i < gene->n_states; i++)
        for (size_t j = 0; j < gene->n_states; j++)
            *rate += gene->n_copies * p[i] * jump[i * gene->n_states + j];
    free(p);
    return code;
}
