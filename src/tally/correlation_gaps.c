/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "tally/correlation_gaps.h"

#include <assert.h>
#include <gsl/gsl_fft_halfcomplex.h>
#include <gsl/gsl_fft_real.h>
#include <math.h>
#include <string.h>

/* Sums: these, then an array over lags for each of the next list. */
enum { RAW, SUM_X, N_X, SUM_Y, N_Y, SUM_XY, N_XY, N_CELLS, N_SCALARS };
enum {
    PAIRS,     /* n */
    PRODUCTS,  /* P */
    EARLIER,   /* H */
    LATER,     /* L */
    Y_EARLIER, /* Sy H of one cell */
    X_LATER,   /* Sx L */
    Y_PAIRS,   /* Ny n */
    X_PAIRS,   /* Nx n */
    N_CURVES
};

/* A buffer: what is known of the trace, then the transforms of values and of where they are. */
enum { TRACE_RAW, TRACE_SUM, TRACE_KNOWN, TRACE_SCALARS };

size_t tarry_gaps_n_sums(const tarry_film_shape *shape, size_t n_lags) {
    (void)shape;
    return N_SCALARS + N_CURVES * n_lags;
}

size_t tarry_gaps_trace_size(const tarry_film_shape *shape) {
    return TRACE_SCALARS + 2 * shape->n_padded;
}

static const double *values_of(const double *buffer) {
    return buffer + TRACE_SCALARS;
}

static const double *places_of(const tarry_film_shape *shape, const double *buffer) {
    return buffer + TRACE_SCALARS + shape->n_padded;
}

/* The length is a power of two, so GSL has nothing to refuse. */
static void transform(double *data, size_t n) {
    const int status = gsl_fft_real_radix2_transform(data, 1, n);
    assert(status == 0);
    (void)status;
}

void tarry_gaps_prepare(const tarry_film_shape *shape, const double *frames, double shift,
                        double *buffer) {
    double *x = buffer + TRACE_SCALARS, *m = x + shape->n_padded;
    double sum = 0.0, known = 0.0;
    memset(x, 0, 2 * shape->n_padded * sizeof *x);
    for (size_t t = 0; t < shape->n_frames; t++) {
        if (isnan(frames[t]))
            continue;
        x[t] = frames[t] - shift;
        m[t] = 1.0;
        sum += x[t];
        known += 1.0;
    }
    buffer[TRACE_RAW] = buffer[TRACE_SUM] = sum;
    buffer[TRACE_KNOWN] = known;
    if (shape->own_mean) {
        for (size_t t = 0; t < shape->n_frames; t++)
            x[t] -= m[t] > 0.0 ? sum / known : 0.0;
        buffer[TRACE_SUM] = 0.0;
    }
    transform(x, shape->n_padded);
    transform(m, shape->n_padded);
}

/* sum over t of first(t) second(t + k), at k mod n_padded, from the two transforms. */
static void correlate(const double *first, const double *second, size_t n, double *out) {
    out[0] = first[0] * second[0];
    out[n / 2] = first[n / 2] * second[n / 2];
    for (size_t f = 1; f < n / 2; f++) {
        out[f] = first[f] * second[f] + first[n - f] * second[n - f];
        out[n - f] = first[f] * second[n - f] - first[n - f] * second[f];
    }
    const int status = gsl_fft_halfcomplex_radix2_inverse(out, 1, n);
    assert(status == 0);
    (void)status;
}

static size_t turned(const tarry_film_shape *shape, ptrdiff_t lag) {
    return lag >= 0 ? (size_t)lag : shape->n_padded - (size_t)-lag;
}

void tarry_gaps_add(const tarry_film_shape *shape, const double *first, const double *second,
                    ptrdiff_t least, size_t n_lags, double *work, double *sums) {
    const double *x = values_of(first), *y = values_of(second);
    const double *mx = places_of(shape, first), *my = places_of(shape, second);
    const double sx = first[TRACE_SUM], sy = second[TRACE_SUM];
    const double nx = first[TRACE_KNOWN], ny = second[TRACE_KNOWN];
    double *curves = sums + N_SCALARS;
    sums[RAW] += first[TRACE_RAW];
    sums[SUM_X] += sx;
    sums[SUM_Y] += sy;
    sums[N_X] += nx;
    sums[N_Y] += ny;
    sums[SUM_XY] += sx * sy;
    sums[N_XY] += nx * ny;
    sums[N_CELLS] += nx > 0.0 && ny > 0.0;
    correlate(x, y, shape->n_padded, work);
    for (size_t i = 0; i < n_lags; i++)
        curves[PRODUCTS * n_lags + i] += work[turned(shape, least + (ptrdiff_t)i)];
    correlate(mx, my, shape->n_padded, work);
    for (size_t i = 0; i < n_lags; i++) {
        const double n = round(work[turned(shape, least + (ptrdiff_t)i)]);
        curves[PAIRS * n_lags + i] += n;
        curves[Y_PAIRS * n_lags + i] += ny * n;
        curves[X_PAIRS * n_lags + i] += nx * n;
    }
    if (shape->own_mean)
        return;
    correlate(x, my, shape->n_padded, work);
    for (size_t i = 0; i < n_lags; i++) {
        const double earlier = work[turned(shape, least + (ptrdiff_t)i)];
        curves[EARLIER * n_lags + i] += earlier;
        curves[Y_EARLIER * n_lags + i] += sy * earlier;
    }
    correlate(mx, y, shape->n_padded, work);
    for (size_t i = 0; i < n_lags; i++) {
        const double later = work[turned(shape, least + (ptrdiff_t)i)];
        curves[LATER * n_lags + i] += later;
        curves[X_LATER * n_lags + i] += sx * later;
    }
}

double tarry_gaps_mean(const double *sums) {
    return sums[RAW] / sums[N_X];
}

double tarry_gaps_pairs(size_t n_lags, const double *sums, size_t i) {
    return sums[N_SCALARS + PAIRS * n_lags + i];
}

/* One cell: its own means, which are all there are. */
static double alone(const double *sums, double n, double products, double earlier, double later) {
    const double x = sums[SUM_X] / sums[N_X], y = sums[SUM_Y] / sums[N_Y];
    return (products - y * earlier - x * later) / n + x * y;
}

void tarry_gaps_covariance(const tarry_film_shape *shape, double n, size_t n_lags,
                           const double *sums, double *covariance) {
    const double *curves = sums + N_SCALARS;
    const bool one = sums[N_CELLS] < 1.5;
    (void)n;
    const double of_means = (sums[SUM_X] * sums[SUM_Y] - sums[SUM_XY]) /
                            (sums[N_X] * sums[N_Y] - sums[N_XY]);
    for (size_t i = 0; i < n_lags; i++) {
        const double pairs = curves[PAIRS * n_lags + i], p = curves[PRODUCTS * n_lags + i];
        const double h = curves[EARLIER * n_lags + i], l = curves[LATER * n_lags + i];
        if (!(pairs > 0.5)) {
            covariance[i] = NAN;
        } else if (shape->own_mean) {
            covariance[i] = p / pairs;
        } else if (one) {
            covariance[i] = alone(sums, pairs, p, h, l);
        } else {
            const double by_y = (sums[SUM_Y] * h - curves[Y_EARLIER * n_lags + i]) /
                                (sums[N_Y] * pairs - curves[Y_PAIRS * n_lags + i]);
            const double by_x = (sums[SUM_X] * l - curves[X_LATER * n_lags + i]) /
                                (sums[N_X] * pairs - curves[X_PAIRS * n_lags + i]);
            covariance[i] = p / pairs - by_y - by_x + of_means;
        }
    }
}
