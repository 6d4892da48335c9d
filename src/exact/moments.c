/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Factorial moments are derivatives of G at z = 1. They come from values on a small circle around 1
 * by Cauchy's formula, with N points exact but for the N-th derivative on: with a radius that is a
 * fraction of 1/(mean + Fano factor) that is below rounding (Trefethen & Weideman 2014, SIAM Rev.
 * 56:385). A first circle, small enough for any law, finds that radius. */

#include "exact/moments.h"

#include "exact/chain.h"

#include "base/error.h"
#include "base/memory.h"

#include <gsl/gsl_math.h>
#include <math.h>
#include <stdlib.h>

enum { POINTS = 16, HALF = POINTS / 2 + 1 };

/* z - 1 for the upper half of the circle; the first is the largest. */
static int find(const tarry_exact_gene *gene, tarry_exact_carried *carried, double radius,
                const double *times, size_t n_times, tarry_exact_moments *moments,
                tarry_error *error) {
    double zre[HALF], zim[HALF];
    double *re = tarry_calloc(n_times, HALF * sizeof *re);
    double *im = tarry_calloc(n_times, HALF * sizeof *im);
    int code = re == NULL || im == NULL ? tarry_fail_memory(error, "moments of a count") : 0;
    for (int k = 0; k < HALF; k++) {
        zre[k] = radius * cos(2 * M_PI * k / POINTS);
        zim[k] = k < HALF - 1 ? radius * sin(2 * M_PI * k / POINTS) : 0;
    }
    if (code == 0)
        code = carried->prepare(carried, HALF, zre, zim, error);
    if (code == 0)
        code = tarry_exact_generating(gene, &carried->load, 1e-12, HALF, HALF, times, n_times, re,
                                      im, error);
    for (size_t t = 0; code == 0 && t < n_times; t++) {
        double first = 0, second = 0;
        for (int k = 0; k < HALF; k++) {
            const double a = 2 * M_PI * k / POINTS, x = re[t * HALF + (size_t)k],
                         y = im[t * HALF + (size_t)k];
            const double twice = k == 0 || k == HALF - 1 ? 1 : 2; /* the lower half mirrors it */
            first += twice * (x * cos(a) + y * sin(a));
            second += twice * (x * cos(2 * a) + y * sin(2 * a));
        }
        first /= POINTS * radius;
        second *= 2 / (POINTS * radius * radius);
        if (!carried->is_plain)
            second += first; /* the second factorial moment is E[N (N - 1)] */
        moments[t] = (tarry_exact_moments){first, fmax(second - first * first, 0)};
    }
    free(re);
    free(im);
    return code;
}

/* Of all times the largest mean + variance / mean. */
static double scale_of(const tarry_exact_moments *moments, size_t n) {
    double most = 0;
    for (size_t i = 0; i < n; i++)
        if (moments[i].mean > 0)
            most = fmax(most, moments[i].mean + moments[i].variance / moments[i].mean);
    return most;
}

int tarry_exact_moments_at(const tarry_exact_gene *gene, tarry_exact_carried *carried,
                           const double *times, size_t n_times, tarry_exact_moments *moments,
                           tarry_error *error) {
    const double wide = tarry_exact_highest_rate(gene) * carried->total + 1;
    int code = find(gene, carried, 0.1 / wide, times, n_times, moments, error);
    if (code != 0)
        return code;
    const double scale = scale_of(moments, n_times);
    return scale > 0 ? find(gene, carried, 0.25 / (scale + 1), times, n_times, moments, error) : 0;
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
