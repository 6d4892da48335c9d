/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Probabilities are the coefficients of G(z) at z = 0. On a circle of radius r they come out of a
 * Fourier transform as r^n P(n), with an error of the size of rounding times G(r) at each n. So
 * each n is read from the circle whose G(r) r^-n is least: r = 1 serves all but the far tails,
 * where that bound on P(n) (Chernoff's) on the unit circle is too high for six digits; two more
 * circles, one for each tail, reach down to 1e-12 (circles other than 1: Abate & Whitt 1992, Oper.
 * Res. Lett. 12:245).
 *
 * The same bound, on real z, tells beforehand how many counts there are to find. */

#include "exact/counts.h"

#include "exact/chain.h"

#include "base/error.h"
#include "base/memory.h"

#include <gsl/gsl_fft_complex.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

enum { MOST_RADII = 40, CIRCLES = 3, PROBES = 6, ROOM = 2 };

static const double beyond = 1e-14;             /* probability left out at most */
static const double reached = 1e-12;            /* the least probability that keeps its digits */
static const double aliased = 1e-10;            /* of G(r), by counts beyond the transform */
static const double rough = 1e-5, fine = 1e-11; /* errors of a step of integration */

typedef struct counter {
    const tarry_exact_gene *gene;
    tarry_exact_carried *carried;
    const double *times;
    size_t n_times;
    double radii[MOST_RADII]; /* ascending */
    size_t n_radii;
    size_t unit;  /* the number of radius 1 */
    double *logs; /* [n_times][n_radii]: log G(r) */
    tarry_error *error;
} counter;

static int generate(counter *c, double tolerance, size_t n, const double *zre, const double *zim,
                    size_t n_probes, double *re, double *im) {
    const int code = c->carried->prepare(c->carried, n, zre, zim, c->error);
    return code != 0 ? code
                     : tarry_exact_generating(c->gene, &c->carried->load, tolerance, n, n_probes,
                                              c->times, c->n_times, re, im, c->error);
}

/* ---- bounds -------------------------------------------------------------------------------- */

/* From 0 to far beyond 1, but for those whose G might pass the range of numbers. */
static void choose_radii(counter *c) {
    static const double below[] = {0, 0.02, 0.1, 0.25, 0.45, 0.65, 0.8, 0.9, 0.95, 0.98, 0.99};
    const double most = c->carried->total * tarry_exact_highest_rate(c->gene);
    for (size_t i = 0; i < sizeof below / sizeof *below; i++)
        c->radii[c->n_radii++] = below[i];
    c->unit = c->n_radii;
    c->radii[c->n_radii++] = 1;
    for (int k = -14; k <= 6 && ldexp(1, k) * most < 600; k++)
        c->radii[c->n_radii++] = 1 + ldexp(1, k);
}

static int find_logs(counter *c) {
    const size_t n = c->n_radii;
    double zero[MOST_RADII] = {0}, from_one[MOST_RADII];
    double *re = tarry_calloc(c->n_times, n * sizeof *re);
    double *im = tarry_calloc(c->n_times, n * sizeof *im);
    c->logs = tarry_calloc(c->n_times, n * sizeof *c->logs);
    int code = 0;
    if (re == NULL || im == NULL || c->logs == NULL)
        code = tarry_fail_memory(c->error, "a law of counts");
    for (size_t i = 0; i < n; i++) /* the largest first */
        from_one[i] = c->radii[n - 1 - i] - 1;
    if (code == 0)
        code = generate(c, rough, n, from_one, zero, 4, re, im);
    for (size_t t = 0; code == 0 && t < c->n_times; t++)
        for (size_t i = 0; i < n; i++)
            c->logs[t * n + n - 1 - i] = log(fmax(re[t * n + i], 1e-300));
    free(re);
    free(im);
    return code;
}

/* log of the bound on P(n): the least over the radii of G(r) r^-n, from one side of 1. *best:
 * where. */
static double bound(const counter *c, size_t time, double n, bool upper, size_t *best) {
    const double *logs = &c->logs[time * c->n_radii];
    double least = INFINITY;
    const size_t from = upper ? c->unit : 0, to = upper ? c->n_radii : c->unit + 1;
    for (size_t i = from; i < to; i++) {
        const double value = logs[i] - (n > 0 ? n * log(c->radii[i]) : 0);
        if (value < least) {
            least = value;
            *best = i;
        }
    }
    return least;
}

/* The first n at which the bound on what lies from there on is below `p`, or the most. */
static size_t first_below(const counter *c, size_t time, double p) {
    size_t low = 0, high = TARRY_COUNTS_MOST, best = 0;
    while (low < high) {
        const size_t middle = low + (high - low) / 2;
        if (bound(c, time, (double)middle, true, &best) <= log(p))
            high = middle;
        else
            low = middle + 1;
    }
    return low;
}

/* The circles for one time: 1, and where the tails need them one on each side. */
static size_t choose_circles(const counter *c, size_t time, size_t n, size_t circles[CIRCLES]) {
    size_t k = 0, best = c->unit;
    circles[k++] = c->unit;
    bound(c, time, (double)first_below(c, time, reached), true, &best);
    if (best + ROOM >= c->n_radii &&
        c->n_radii > c->unit + ROOM) /* larger ones bound what is aliased */
        best = c->n_radii - 1 - ROOM;
    if (best != c->unit)
        circles[k++] = best;
    if (bound(c, time, 0, false, &best) > log(1e3 * reached)) /* the unit circle serves them all */
        return k;
    size_t low = 0;
    while (low < n && bound(c, time, (double)low, false, &best) < log(reached))
        low++;
    if (best != c->unit)
        circles[k++] = best > 0 ? best : 1; /* the least above 0 */
    return k;
}

/* The length of a transform that counts beyond it do not disturb. */
static size_t choose_length(const counter *c, size_t time, size_t n, size_t circle) {
    size_t length = 64;
    for (; length < 2 * (size_t)TARRY_COUNTS_MOST; length *= 2) {
        double least = INFINITY;
        for (size_t i = circle; i < c->n_radii; i++)
            least = fmin(least, c->logs[time * c->n_radii + i] +
                                    (double)length * log(c->radii[circle] / c->radii[i]));
        if (length >= n && least <= log(aliased) + c->logs[time * c->n_radii + circle])
            break;
    }
    return length;
}

/* ---- circles ------------------------------------------------------------------------------- */

/* z - 1 for the upper half of a circle; first the probes: the ends and some between. */
static size_t probe_at(size_t i, size_t half) {
    return i == 0 ? 0 : i == 1 ? half : half >> (i - 1);
}

static int transform(counter *c, size_t circle, size_t length, double *re, double *im) {
    const size_t half = length / 2, n = half + 1 + PROBES;
    double *zre = tarry_calloc(n, sizeof *zre), *zim = tarry_calloc(n, sizeof *zim);
    int code = 0;
    if (zre == NULL || zim == NULL)
        code = tarry_fail_memory(c->error, "a law of counts");
    for (size_t i = 0; code == 0 && i < n; i++) {
        const size_t k = i < PROBES ? probe_at(i, half) : i - PROBES;
        const double angle = 2 * M_PI * (double)k / (double)length;
        zre[i] = c->radii[circle] * cos(angle) - 1;
        zim[i] = c->radii[circle] * sin(angle);
    }
    if (code == 0)
        code = generate(c, fine, n, zre, zim, PROBES, re, im);
    free(zre);
    free(zim);
    return code;
}

/* r^n P(n) from the values on the upper half circle. */
static int invert(const double *re, const double *im, size_t length, double *data,
                  tarry_error *error) {
    const size_t half = length / 2;
    for (size_t k = 0; k <= half; k++) {
        data[2 * k] = re[PROBES + k];
        data[2 * k + 1] = im[PROBES + k];
        if (k > 0 && k < half) {
            data[2 * (length - k)] = re[PROBES + k];
            data[2 * (length - k) + 1] = -im[PROBES + k];
        }
    }
    if (gsl_fft_complex_radix2_forward(data, 1, length) != 0)
        return tarry_fail(error, TARRY_NUMERIC, "a Fourier transform failed");
    return 0;
}

/* Take from a circle all n for which it is the best so far. */
static void take(const counter *c, size_t time, size_t circle, size_t length, const double *data,
                 double *bounds, tarry_exact_counts *out) {
    const double height = c->logs[time * c->n_radii + circle], slope = log(c->radii[circle]);
    for (size_t n = 0; n < out->n && n < length; n++) {
        const double value = height - (double)n * slope;
        if (!(value < bounds[n]))
            continue;
        bounds[n] = value;
        out->p[n] = fmax(data[2 * n] / (double)length * exp(-(double)n * slope), 0);
    }
}

/* All times by one circle; `wanted[time]`: it is one of that time's. */
static int use_circle(counter *c, size_t circle, const bool *wanted, double **bounds,
                      tarry_exact_counts *counts) {
    size_t length = 0;
    for (size_t t = 0; t < c->n_times; t++)
        if (wanted[t]) {
            const size_t needed = choose_length(c, t, counts[t].n, circle);
            length = needed > length ? needed : length;
        }
    if (length == 0)
        return 0;
    const size_t n = length / 2 + 1 + PROBES;
    double *re = tarry_calloc(c->n_times, n * sizeof *re);
    double *im = tarry_calloc(c->n_times, n * sizeof *im);
    double *data = tarry_calloc(2 * length, sizeof *data);
    int code = 0;
    if (re == NULL || im == NULL || data == NULL)
        code = tarry_fail_memory(c->error, "a law of counts");
    if (code == 0)
        code = transform(c, circle, length, re, im);
    for (size_t t = 0; code == 0 && t < c->n_times; t++) {
        if (!wanted[t])
            continue;
        code = invert(&re[t * n], &im[t * n], length, data, c->error);
        if (code == 0)
            take(c, t, circle, length, data, bounds[t], &counts[t]);
    }
    free(re);
    free(im);
    free(data);
    return code;
}

static int prepare(const counter *c, double **bounds, tarry_exact_counts *counts) {
    for (size_t t = 0; t < c->n_times; t++) {
        const size_t n = first_below(c, t, beyond);
        if (n >= TARRY_COUNTS_MOST)
            continue;
        counts[t].n = n > 0 ? n : 1;
        counts[t].p = tarry_calloc(counts[t].n, sizeof(double));
        bounds[t] = tarry_calloc(counts[t].n, sizeof(double));
        if (counts[t].p == NULL || bounds[t] == NULL)
            return tarry_fail_memory(c->error, "a law of counts");
        for (size_t i = 0; i < counts[t].n; i++)
            bounds[t][i] = INFINITY;
    }
    return 0;
}

static int use_circles(counter *c, double **bounds, tarry_exact_counts *counts) {
    bool *wanted = tarry_calloc(c->n_times, c->n_radii * sizeof *wanted);
    if (wanted == NULL)
        return tarry_fail_memory(c->error, "a law of counts");
    for (size_t t = 0; t < c->n_times; t++) {
        size_t circles[CIRCLES];
        const size_t n = counts[t].n > 0 ? choose_circles(c, t, counts[t].n, circles) : 0;
        for (size_t k = 0; k < n; k++)
            wanted[circles[k] * c->n_times + t] = true;
    }
    int code = 0;
    for (size_t i = 0; code == 0 && i < c->n_radii; i++)
        code = use_circle(c, i, &wanted[i * c->n_times], bounds, counts);
    free(wanted);
    return code;
}

/* No molecule is ever counted. */
static int all_zero(size_t n_times, tarry_exact_counts *counts, tarry_error *error) {
    for (size_t t = 0; t < n_times; t++) {
        counts[t].p = tarry_calloc(1, sizeof(double));
        if (counts[t].p == NULL)
            return tarry_fail_memory(error, "a law of counts");
        counts[t].p[0] = 1;
        counts[t].n = 1;
    }
    return 0;
}

int tarry_exact_counts_at(const tarry_exact_gene *gene, tarry_exact_carried *carried,
                          const double *times, size_t n_times, tarry_exact_counts *counts,
                          tarry_error *error) {
    counter c = {
        .gene = gene, .carried = carried, .times = times, .n_times = n_times, .error = error};
    if (!(carried->load.horizon > 0))
        return all_zero(n_times, counts, error);
    double **bounds = tarry_calloc(n_times, sizeof *bounds);
    choose_radii(&c);
    int code = bounds == NULL ? tarry_fail_memory(error, "a law of counts") : find_logs(&c);
    if (code == 0)
        code = prepare(&c, bounds, counts);
    if (code == 0)
        code = use_circles(&c, bounds, counts);
    for (size_t t = 0; bounds != NULL && t < n_times; t++)
        free(bounds[t]);
    free(bounds);
    free(c.logs);
    return code;
}

void tarry_exact_counts_release(tarry_exact_counts *counts) {
    free(counts->p);
    *counts = (tarry_exact_counts){0};
}
