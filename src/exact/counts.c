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

#include "exact/arc.h"
#include "exact/chain.h"
#include "exact/moments.h"

#include "base/error.h"
#include "base/memory.h"

#include <gsl/gsl_fft_complex.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

enum { MOST_RADII = 40, CIRCLES = 3, ROOM = 2, LONG = 2048, FINEST = 4 };

static const double beyond = 1e-14;  /* probability left out at most */
static const double reached = 1e-12; /* the least probability that keeps its digits */
static const double aliased = 1e-10; /* of G(r), by counts beyond the transform */
static const double little = 0.1;    /* z - 1 times what a transcript carries: g is near linear */
static const double unseen = 3e-13;  /* of G(r), between the points of an arc */
static const double rough = 1e-5, fine = 1e-11; /* errors of a step of integration */

typedef struct counter {
    const tarry_exact_gene *gene;
    tarry_exact_carried *carried;
    const double *times;
    size_t n_times, most;
    double radii[MOST_RADII]; /* ascending */
    size_t n_radii;
    size_t unit;     /* the number of radius 1 */
    double *logs;    /* [n_times][n_radii]: log G(r) */
    double *spreads; /* [n_times] standard deviations */
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
static int choose_radii(counter *c) {
    static const double below[] = {0, 0.02, 0.1, 0.25, 0.45, 0.65, 0.8, 0.9, 0.95, 0.98, 0.99};
    const double rate = tarry_exact_highest_rate(c->gene);
    int code = 0;
    for (size_t i = 0; i < sizeof below / sizeof *below; i++)
        c->radii[c->n_radii++] = below[i];
    c->unit = c->n_radii;
    c->radii[c->n_radii++] = 1;
    for (int k = -14; k <= 6; k++) {
        const double above = ldexp(1, k);
        double growth = above * c->carried->total;
        if (c->carried->growth != NULL && above * c->carried->most > little)
            code = c->carried->growth(c->carried, above, &growth, c->error);
        if (code != 0 || !(rate * growth < 600))
            break;
        c->radii[c->n_radii++] = 1 + ldexp(1, k);
    }
    return code;
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
    size_t low = 0, high = c->most, best = 0;
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

/* Where a circle is looked at: first z - 1 = r - 1, then by halves from the other end, which are
 * the probes; then all points of the transform's upper half, or those of an arc. */
typedef struct ring {
    size_t circle, length, n_probes, n;
    tarry_arc arc; /* no panels: all points */
} ring;

static size_t n_probes_of(size_t length) {
    size_t n = 2;
    for (size_t k = length / 2; k > 1; k /= 2)
        n++;
    return n;
}

static double angle_of(const ring *r, size_t i) {
    if (i == 0)
        return 0;
    if (i < r->n_probes)
        return ldexp(M_PI, 1 - (int)i);
    const size_t k = i - r->n_probes;
    return r->arc.n_panels > 0 ? tarry_arc_angle(&r->arc, k)
                               : 2 * M_PI * (double)k / (double)r->length;
}

static int values_on(counter *c, const ring *r, double *re, double *im) {
    double *zre = tarry_calloc(r->n, sizeof *zre), *zim = tarry_calloc(r->n, sizeof *zim);
    int code = 0;
    if (zre == NULL || zim == NULL)
        code = tarry_fail_memory(c->error, "a law of counts");
    for (size_t i = 0; code == 0 && i < r->n; i++) {
        const double angle = angle_of(r, i), half = sin(0.5 * angle), radius = c->radii[r->circle];
        zre[i] = radius - 1 - 2 * radius * half * half; /* to all digits near 1 */
        zim[i] = radius * sin(angle);
    }
    if (code == 0)
        code = generate(c, fine, r->n, zre, zim, r->n_probes, re, im);
    free(zre);
    free(zim);
    return code;
}

/* r^n P(n) from the values on the upper half circle, in data[0 .. length] and beyond. */
static int invert(const double *re, const double *im, size_t length, double *data,
                  tarry_error *error) {
    const size_t half = length / 2;
    for (size_t k = 0; k <= half; k++) {
        data[2 * k] = re[k];
        data[2 * k + 1] = im[k];
        if (k > 0 && k < half) {
            data[2 * (length - k)] = re[k];
            data[2 * (length - k) + 1] = -im[k];
        }
    }
    if (gsl_fft_complex_radix2_forward(data, 1, length) != 0)
        return tarry_fail(error, TARRY_NUMERIC, "a Fourier transform failed");
    return 0;
}

/* Take from a circle all n for which it is the best so far. */
static void take(const counter *c, size_t time, const ring *r, const double *data, double *bounds,
                 tarry_exact_counts *out) {
    const double height = c->logs[time * c->n_radii + r->circle], slope = log(c->radii[r->circle]);
    for (size_t n = 0; n < out->n && n < r->length; n++) {
        const double value = height - (double)n * slope;
        if (!(value < bounds[n]))
            continue;
        bounds[n] = value;
        out->p[n] = fmax(data[2 * n] / (double)r->length * exp(-(double)n * slope), 0);
    }
}

/* The laws of all times that want it from what is known on a ring. *rough: the values between the
 * points of its arc are not known well enough. */
static int take_all(counter *c, const ring *r, const double *re, const double *im,
                    const bool *wanted, double **bounds, tarry_exact_counts *counts,
                    bool *is_rough) {
    const size_t half = r->length / 2 + 1;
    double *data = tarry_calloc(2 * (r->length + half), sizeof *data);
    int code = data == NULL ? tarry_fail_memory(c->error, "a law of counts") : 0;
    double *xre = data != NULL ? data + 2 * r->length : NULL;
    double *xim = xre != NULL ? xre + half : NULL;
    for (int pass = 0; code == 0 && pass < 2 && !*is_rough; pass++)
        for (size_t t = 0; code == 0 && t < c->n_times && !*is_rough; t++) {
            const double *tre = &re[t * r->n], *tim = &im[t * r->n];
            double rest = 0;
            if (!wanted[t])
                continue;
            if (r->arc.n_panels > 0)
                tarry_arc_spread(&r->arc, tre + r->n_probes, tim + r->n_probes, r->length, xre, xim,
                                 &rest);
            *is_rough = rest > unseen * tre[0];
            if (pass == 0) /* first whether all are good enough */
                continue;
            const bool all = r->arc.n_panels == 0;
            code = invert(all ? tre + r->n_probes : xre, all ? tim + r->n_probes : xim, r->length,
                          data, c->error);
            if (code == 0)
                take(c, t, r, data, bounds[t], &counts[t]);
        }
    free(data);
    return code;
}

/* Long transforms by the points of an arc, made finer where that is not enough; else by all. */
static int use_ring(counter *c, ring *r, double most, double spread, const bool *wanted,
                    double **bounds, tarry_exact_counts *counts) {
    bool is_rough = true;
    int code = 0;
    for (double fineness = 1; code == 0 && is_rough; fineness *= 2) {
        tarry_arc_release(&r->arc);
        if (r->length >= LONG && fineness <= FINEST)
            code = tarry_arc_init(&r->arc, most, spread, r->length, fineness, c->error);
        if (tarry_arc_n(&r->arc) > r->length / 4)
            tarry_arc_release(&r->arc);
        const bool all = r->arc.n_panels == 0;
        r->n = r->n_probes + (all ? r->length / 2 + 1 : tarry_arc_n(&r->arc));
        double *re = tarry_calloc(c->n_times, r->n * sizeof *re);
        double *im = tarry_calloc(c->n_times, r->n * sizeof *im);
        if (code == 0 && (re == NULL || im == NULL))
            code = tarry_fail_memory(c->error, "a law of counts");
        is_rough = false;
        if (code == 0)
            code = values_on(c, r, re, im);
        if (code == 0)
            code = take_all(c, r, re, im, wanted, bounds, counts, &is_rough);
        free(re);
        free(im);
    }
    return code;
}

/* All times by one circle; `wanted[time]`: it is one of that time's. */
static int use_circle(counter *c, size_t circle, const bool *wanted, double **bounds,
                      tarry_exact_counts *counts) {
    ring r = {.circle = circle};
    double most = 0, spread = INFINITY;
    for (size_t t = 0; t < c->n_times; t++)
        if (wanted[t]) {
            const size_t needed = choose_length(c, t, counts[t].n, circle);
            r.length = needed > r.length ? needed : r.length;
            most = fmax(most, (double)counts[t].n);
            spread = fmin(spread, c->spreads[t]);
        }
    if (r.length == 0)
        return 0;
    r.n_probes = n_probes_of(r.length);
    const int code = use_ring(c, &r, most, spread, wanted, bounds, counts);
    tarry_arc_release(&r.arc);
    return code;
}

static int prepare(const counter *c, double **bounds, tarry_exact_counts *counts) {
    for (size_t t = 0; t < c->n_times; t++) {
        const size_t n = first_below(c, t, beyond);
        if (n >= c->most)
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

/* Standard deviations. *all_wide: no law is likely to need less than the most numbers. */
static int find_spreads(counter *c, bool *all_wide) {
    tarry_exact_moments *moments = tarry_calloc(c->n_times, sizeof *moments);
    c->spreads = tarry_calloc(c->n_times, sizeof *c->spreads);
    int code = moments == NULL || c->spreads == NULL
                   ? tarry_fail_memory(c->error, "a law of counts")
                   : tarry_exact_moments_at(c->gene, c->carried, c->times, c->n_times, moments,
                                            c->error);
    *all_wide = true;
    for (size_t t = 0; code == 0 && t < c->n_times; t++) {
        c->spreads[t] = sqrt(moments[t].variance);
        *all_wide = *all_wide && moments[t].mean + 6 * c->spreads[t] > (double)c->most;
    }
    free(moments);
    return code;
}

/* The bounds, and from them the laws. */
static int find_laws(counter *c, tarry_exact_counts *counts) {
    double **bounds = tarry_calloc(c->n_times, sizeof *bounds);
    int code = bounds == NULL ? tarry_fail_memory(c->error, "a law of counts") : choose_radii(c);
    if (code == 0)
        code = find_logs(c);
    if (code == 0)
        code = prepare(c, bounds, counts);
    if (code == 0)
        code = use_circles(c, bounds, counts);
    for (size_t t = 0; bounds != NULL && t < c->n_times; t++)
        free(bounds[t]);
    free(bounds);
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
                          const double *times, size_t n_times, size_t most,
                          tarry_exact_counts *counts, tarry_error *error) {
    counter c = {.gene = gene,
                 .carried = carried,
                 .times = times,
                 .n_times = n_times,
                 .most = most,
                 .error = error};
    if (!(carried->load.horizon > 0))
        return all_zero(n_times, counts, error);
    bool all_wide = false;
    int code = find_spreads(&c, &all_wide);
    if (code == 0 && !all_wide)
        code = find_laws(&c, counts);
    free(c.logs);
    free(c.spreads);
    return code;
}

void tarry_exact_counts_release(tarry_exact_counts *counts) {
    free(counts->p);
    *counts = (tarry_exact_counts){0};
}
