/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "tally/correlation.h"

#include "tally/correlation_gaps.h"

#include <assert.h>
#include <gsl/gsl_fft_halfcomplex.h>
#include <gsl/gsl_fft_real.h>
#include <math.h>
#include <string.h>

/* ---- where things stand -------------------------------------------------------------------------
 *
 * Series: sum of d, sum of d^2 (d: own mean less shift), for each frame the sum of x less shift,
 * for each lag the sum of d (head + tail), the power spectrum. Pair: sum of d d, for each lag from
 * the lowest the sum of (d of the later) (head of the earlier) + (d of the earlier) (tail of the
 * later), the cross spectrum. Trace: d, for each lag head and tail, the transform. Head and tail at
 * lag k: sums of x less own mean over the first and over the last N - k frames. Transforms stand as
 * GSL's radix-2 ones do: real parts up to the middle, imaginary parts from the end backwards. */

enum { D = 0, D_SQUARE = 1, SERIES_FRAMES = 2 };
enum { D_PRODUCT = 0, PAIR_EDGES = 1 };
enum { TRACE_HEADS = 1 };

static size_t series_edges(const tarry_film_shape *shape) {
    return SERIES_FRAMES + shape->n_frames;
}

static size_t series_power(const tarry_film_shape *shape) {
    return series_edges(shape) + shape->n_lags;
}

static size_t pair_spectrum(const tarry_film_shape *shape) {
    return PAIR_EDGES + 2 * shape->n_lags - 1;
}

static size_t trace_tails(const tarry_film_shape *shape) {
    return TRACE_HEADS + shape->n_lags;
}

static size_t trace_transform(const tarry_film_shape *shape) {
    return TRACE_HEADS + 2 * shape->n_lags;
}

tarry_film_shape tarry_film_shape_of(size_t n_frames, size_t n_lags, bool stationary) {
    tarry_film_shape shape = {n_frames, n_lags, 2, stationary, false, false};
    if (shape.n_lags > n_frames)
        shape.n_lags = n_frames;
    while (shape.n_padded + 1 < n_frames + shape.n_lags)
        shape.n_padded *= 2;
    return shape;
}

size_t tarry_series_n_sums(const tarry_film_shape *shape) {
    if (shape->gaps)
        return tarry_gaps_n_sums(shape, shape->n_lags);
    return series_power(shape) + shape->n_padded / 2 + 1;
}

size_t tarry_pair_n_sums(const tarry_film_shape *shape) {
    if (shape->gaps)
        return tarry_gaps_n_sums(shape, 2 * shape->n_lags - 1);
    return pair_spectrum(shape) + shape->n_padded;
}

size_t tarry_trace_size(const tarry_film_shape *shape) {
    return shape->gaps ? tarry_gaps_trace_size(shape) : trace_transform(shape) + shape->n_padded;
}

size_t tarry_trace_work(const tarry_film_shape *shape) {
    return shape->gaps ? shape->n_padded : 0;
}

/* ---- one cell ---- */

/* The length is a power of two, so GSL has nothing to refuse. */
static void transform(double *data, size_t n) {
    const int status = gsl_fft_real_radix2_transform(data, 1, n);
    assert(status == 0);
    (void)status;
}

static void invert(double *data, size_t n) {
    const int status = gsl_fft_halfcomplex_radix2_inverse(data, 1, n);
    assert(status == 0);
    (void)status;
}

double tarry_trace_mean(const double *trace, size_t n) {
    double sum = 0.0;
    for (size_t t = 0; t < n; t++)
        sum += trace[t] - trace[0];
    return trace[0] + sum / (double)n;
}

void tarry_trace_prepare(const tarry_film_shape *shape, const double *frames, double shift,
                         double *buffer) {
    if (shape->gaps) {
        tarry_gaps_prepare(shape, frames, shift, buffer);
        return;
    }
    const size_t n = shape->n_frames;
    double *head = buffer + TRACE_HEADS, *tail = buffer + trace_tails(shape);
    double *x = buffer + trace_transform(shape);
    const double mean = tarry_trace_mean(frames, n);
    buffer[0] = mean - shift;
    for (size_t t = 0; t < n; t++)
        x[t] = frames[t] - mean;
    memset(x + n, 0, (shape->n_padded - n) * sizeof *x);
    /* All of a trace adds up to 0, so what is left of it is less what was left out. */
    head[0] = tail[0] = 0.0;
    for (size_t k = 1; k < shape->n_lags; k++) {
        head[k] = head[k - 1] - x[n - k];
        tail[k] = tail[k - 1] - x[k - 1];
    }
    transform(x, shape->n_padded);
}

void tarry_series_add(const tarry_film_shape *shape, const double *frames, double shift,
                      const double *buffer, double *work, double *sums) {
    if (shape->gaps) {
        tarry_gaps_add(shape, buffer, buffer, 0, shape->n_lags, work, sums);
        return;
    }
    const double d = buffer[0];
    const double *head = buffer + TRACE_HEADS, *tail = buffer + trace_tails(shape);
    const double *x = buffer + trace_transform(shape);
    double *restrict by_frame = sums + SERIES_FRAMES, *restrict edges = sums + series_edges(shape);
    double *restrict power = sums + series_power(shape);
    const size_t n = shape->n_padded;
    sums[D] += d;
    sums[D_SQUARE] += d * d;
    for (size_t t = 0; t < shape->n_frames; t++)
        by_frame[t] += frames[t] - shift;
    for (size_t k = 0; k < shape->n_lags; k++)
        edges[k] += d * (head[k] + tail[k]);
    power[0] += x[0] * x[0];
    power[n / 2] += x[n / 2] * x[n / 2];
    for (size_t f = 1; f < n / 2; f++)
        power[f] += x[f] * x[f] + x[n - f] * x[n - f];
}

/* sum += conj(first) second */
static void add_product(const double *first, const double *second, size_t n, double *restrict sum) {
    sum[0] += first[0] * second[0];
    sum[n / 2] += first[n / 2] * second[n / 2];
    for (size_t f = 1; f < n / 2; f++) {
        sum[f] += first[f] * second[f] + first[n - f] * second[n - f];
        sum[n - f] += first[f] * second[n - f] - first[n - f] * second[f];
    }
}

void tarry_pair_add(const tarry_film_shape *shape, const double *first, const double *second,
                    double *work, double *sums) {
    const size_t n_lags = shape->n_lags;
    if (shape->gaps) {
        tarry_gaps_add(shape, first, second, 1 - (ptrdiff_t)n_lags, 2 * n_lags - 1, work, sums);
        return;
    }
    const double *head1 = first + TRACE_HEADS, *tail1 = first + trace_tails(shape);
    const double *head2 = second + TRACE_HEADS, *tail2 = second + trace_tails(shape);
    double *restrict middle = sums + PAIR_EDGES + n_lags - 1;
    const double d1 = first[0], d2 = second[0];
    sums[D_PRODUCT] += d1 * d2;
    for (size_t k = 1; k < n_lags; k++) {
        middle[k] += d2 * head1[k] + d1 * tail2[k];
        *(middle - k) += d1 * head2[k] + d2 * tail1[k];
    }
    add_product(first + trace_transform(shape), second + trace_transform(shape), shape->n_padded,
                sums + pair_spectrum(shape));
}

/* ---- other shifts ---- */

/* Sums over cells of head and tail at lag k, from those at lag k - 1. */
static double next_head(const tarry_film_shape *shape, const double *series, size_t k,
                        double head) {
    return head - (series[SERIES_FRAMES + shape->n_frames - k] - series[D]);
}

static double next_tail(const double *series, size_t k, double tail) {
    return tail - (series[SERIES_FRAMES + k - 1] - series[D]);
}

void tarry_series_move(const tarry_film_shape *shape, double n, double by, double *sums) {
    if (shape->gaps)
        return; /* one shift for all cells */
    double *edges = sums + series_edges(shape);
    double head = 0.0, tail = 0.0;
    for (size_t k = 1; k < shape->n_lags; k++) {
        head = next_head(shape, sums, k, head);
        tail = next_tail(sums, k, tail);
        edges[k] += by * (head + tail);
    }
    sums[D_SQUARE] += by * (2.0 * sums[D] + n * by);
    sums[D] += n * by;
    for (size_t t = 0; t < shape->n_frames; t++)
        sums[SERIES_FRAMES + t] += n * by;
}

void tarry_pair_move(const tarry_film_shape *shape, double n, const double *first, double by_first,
                     const double *second, double by_second, double *sums) {
    if (shape->gaps)
        return;
    double *middle = sums + PAIR_EDGES + shape->n_lags - 1;
    double head1 = 0.0, tail1 = 0.0, head2 = 0.0, tail2 = 0.0;
    for (size_t k = 1; k < shape->n_lags; k++) {
        head1 = next_head(shape, first, k, head1);
        tail1 = next_tail(first, k, tail1);
        head2 = next_head(shape, second, k, head2);
        tail2 = next_tail(second, k, tail2);
        middle[k] += by_second * head1 + by_first * tail2;
        *(middle - k) += by_first * head2 + by_second * tail1;
    }
    sums[D_PRODUCT] += by_first * second[D] + by_second * first[D] + n * by_first * by_second;
}

/* ---- covariances ---- */

double tarry_series_mean(const tarry_film_shape *shape, double n, const double *sums) {
    return shape->gaps ? tarry_gaps_mean(sums) : sums[D] / n;
}

double tarry_series_pairs(const tarry_film_shape *shape, double n, const double *sums, size_t lag) {
    return shape->gaps ? tarry_gaps_pairs(shape->n_lags, sums, lag)
                       : n * (double)(shape->n_frames - lag);
}

double tarry_pair_pairs(const tarry_film_shape *shape, double n, const double *sums,
                        ptrdiff_t lag) {
    if (shape->gaps)
        return tarry_gaps_pairs(2 * shape->n_lags - 1, sums,
                                (size_t)(lag + (ptrdiff_t)shape->n_lags - 1));
    return n * ((double)shape->n_frames - fabs((double)lag));
}

double tarry_series_mean_square(const tarry_film_shape *shape, double n, double shift,
                                const double *sums) {
    const double mean = shift + tarry_series_mean(shape, n, sums);
    double squares = 0.0;
    if (shape->stationary)
        return mean * mean;
    for (size_t t = 0; t < shape->n_frames; t++) {
        const double at = shift + sums[SERIES_FRAMES + t] / n;
        squares += at * at;
    }
    return squares / (double)shape->n_frames;
}

/* What one side of a covariance is made of: lags k = 0 .. n_lags - 1 by which `later` comes after
 * `earlier`. Arrays are stepped through forwards or backwards. */
typedef struct lag_side {
    const double *earlier, *later; /* sums of the series */
    double product;                /* sum of d d about the mean of all */
    const double *within;          /* [k mod n_padded]: sums of products, from the spectrum */
    const double *edges;           /* [step k] */
    const double *of_means;        /* [k mod n_padded]: the same of the sums over cells; or NULL */
    int step;
} lag_side;

static void covariance_of_side(const tarry_film_shape *shape, double n, const lag_side *side,
                               double *covariance) {
    double head = 0.0, tail = 0.0;
    for (size_t k = 0; k < shape->n_lags; k++) {
        const ptrdiff_t at = side->step * (ptrdiff_t)k;
        const size_t turned = side->step > 0 || k == 0 ? k : shape->n_padded - k;
        const double frames = (double)(shape->n_frames - k);
        if (k > 0) {
            head = next_head(shape, side->earlier, k, head);
            tail = next_tail(side->later, k, tail);
        }
        const double edges = (k > 0 ? side->edges[at] : 0.0) -
                             (side->later[D] * head + side->earlier[D] * tail) / n;
        if (side->of_means)
            covariance[at] = ((side->within[turned] + edges - side->of_means[turned] / n) / frames +
                              side->product) /
                             (n - 1.0);
        else
            covariance[at] = side->within[turned] / (n * frames) +
                             (n > 1.0 ? (edges / frames + side->product) / (n - 1.0) : 0.0);
    }
}

/* Sums over cells less n times the mean of all, transformed. */
static void transform_means(const tarry_film_shape *shape, const double *series, double *out) {
    memset(out, 0, shape->n_padded * sizeof *out);
    for (size_t t = 0; t < shape->n_frames; t++)
        out[t] = series[SERIES_FRAMES + t] - series[D];
    transform(out, shape->n_padded);
}

/* Products of the sums over cells at each lag, in place of those transformed in `first`. */
static void correlate_means(const tarry_film_shape *shape, double *first, const double *second) {
    const size_t n = shape->n_padded;
    first[0] *= second[0];
    first[n / 2] *= second[n / 2];
    for (size_t f = 1; f < n / 2; f++) {
        const double re = first[f] * second[f] + first[n - f] * second[n - f];
        const double im = first[f] * second[n - f] - first[n - f] * second[f];
        first[f] = re;
        first[n - f] = im;
    }
    invert(first, n);
}

static void fill_nan(double *out, size_t n) {
    for (size_t i = 0; i < n; i++)
        out[i] = NAN;
}

/* Is there anything to work out from n cells? */
static bool defined(const tarry_film_shape *shape, double n) {
    return n >= (shape->stationary ? 1.0 : 2.0);
}

void tarry_series_covariance(const tarry_film_shape *shape, double n, const double *sums,
                             double *work, double *covariance) {
    if (shape->gaps) {
        tarry_gaps_covariance(shape, n, shape->n_lags, sums, covariance);
        return;
    }
    if (!defined(shape, n)) {
        fill_nan(covariance, shape->n_lags);
        return;
    }
    double *within = work, *of_means = work + shape->n_padded;
    const double *power = sums + series_power(shape);
    memset(within, 0, shape->n_padded * sizeof *within);
    memcpy(within, power, (shape->n_padded / 2 + 1) * sizeof *within);
    invert(within, shape->n_padded);
    if (!shape->stationary) {
        transform_means(shape, sums, of_means);
        correlate_means(shape, of_means, of_means);
    }
    const lag_side side = {
        .earlier = sums,
        .later = sums,
        .product = sums[D_SQUARE] - sums[D] * sums[D] / n,
        .within = within,
        .edges = sums + series_edges(shape),
        .of_means = shape->stationary ? NULL : of_means,
        .step = 1,
    };
    covariance_of_side(shape, n, &side, covariance);
}

/* The sums over cells of a pair, correlated; into `out`, with as much room after it. */
static void correlate_pair_means(const tarry_film_shape *shape, const double *first,
                                 const double *second, double *out, double *room) {
    transform_means(shape, first, out);
    transform_means(shape, second, room);
    correlate_means(shape, out, room);
}

void tarry_pair_covariance(const tarry_film_shape *shape, double n, const double *first,
                           const double *second, const double *sums, double *work,
                           double *covariance) {
    const size_t n_lags = shape->n_lags;
    if (shape->gaps) {
        tarry_gaps_covariance(shape, n, 2 * n_lags - 1, sums, covariance);
        return;
    }
    if (!defined(shape, n)) {
        fill_nan(covariance, 2 * n_lags - 1);
        return;
    }
    double *within = work, *of_means = work + shape->n_padded;
    if (!shape->stationary)
        correlate_pair_means(shape, first, second, of_means, within);
    memcpy(within, sums + pair_spectrum(shape), shape->n_padded * sizeof *within);
    invert(within, shape->n_padded);
    lag_side side = {
        .earlier = first,
        .later = second,
        .product = sums[D_PRODUCT] - first[D] * second[D] / n,
        .within = within,
        .edges = sums + PAIR_EDGES + n_lags - 1,
        .of_means = shape->stationary ? NULL : of_means,
        .step = 1,
    };
    covariance_of_side(shape, n, &side, covariance + n_lags - 1);
    side.earlier = second;
    side.later = first;
    side.step = -1;
    covariance_of_side(shape, n, &side, covariance + n_lags - 1);
}

/* ---- what is read off a curve ---- */

/* The lags from this share of them on make the plateau; fewer than 4 lags make none. */
static const double plateau_from = 0.75;
enum { LEAST_LAGS = 4 };

double tarry_correlation_plateau(const double *correlation, size_t n_lags) {
    if (n_lags < LEAST_LAGS)
        return NAN;
    const size_t from = (size_t)ceil(plateau_from * (double)n_lags);
    double sum = 0.0;
    for (size_t k = from; k < n_lags; k++)
        sum += correlation[k];
    return sum / (double)(n_lags - from);
}

double tarry_correlation_decay(const double *correlation, size_t n_lags, double plateau) {
    const double level = plateau + (1.0 - plateau) * exp(-1.0);
    for (size_t k = 1; plateau < 1.0 && k < n_lags; k++)
        if (correlation[k] <= level)
            return (double)(k - 1) +
                   (correlation[k - 1] - level) / (correlation[k - 1] - correlation[k]);
    return NAN;
}

double tarry_put_back(const double *covariance) {
    return (4.0 * covariance[1] + covariance[2] - 2.0 * covariance[3]) / 3.0;
}
