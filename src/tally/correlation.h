/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_TALLY_CORRELATION_H
#define TARRY_TALLY_CORRELATION_H

/* Auto- and cross-covariances of films, one a cell, from sums over cells.
 *
 * For each series and cell the trace less its own mean goes through a Fourier transform, padded so
 * that nothing wraps round; power and cross spectra are added up and inverted once, at the end
 * (Wiener & Khinchin; common practice). What the own means took away is put back from sums of their
 * products with the sums of the first and the last frames. So the mean that counts is chosen at the
 * end, over all cells, and the result is free of bias for any number of frames:
 *
 *   stationary: with d the deviations of own means from the mean of all, h and g the means of a
 *   trace's first and last N - k frames,
 *     C(k) = 1/n sum over cells of sum x'(t) y'(t+k) / (N - k)
 *          + 1/(n-1) sum over cells of [dx g(y') + dy h(x') + dx dy],
 *   which is the covariance about the common mean with the bias of that mean (of order 1/n) taken
 *   off; for one cell only the first line is left, and it is biased as its own mean makes it.
 *
 *   otherwise: 1/(N-k) sum over t of the sample covariance of x(t) and y(t+k) over cells; undefined
 *   for one cell.
 *
 * Sums of own means are about a shift, so that large means lose no digits.
 *
 * Where frames may be missing these functions do the same with what is there:
 * tally/correlation_gaps.h. */

#include <stdbool.h>
#include <stddef.h>

typedef struct tarry_film_shape {
    size_t n_frames; /* N, at least 1 */
    size_t n_lags;   /* lags 0 .. n_lags - 1, at most N */
    size_t n_padded; /* a power of two, at least N + n_lags - 1 */
    bool stationary;
    bool gaps;     /* frames may be NaN, at the ends too; stationary */
    bool own_mean; /* with gaps: of each trace its own mean is taken off, and stays off */
} tarry_film_shape;

/* n_lags is cut to n_frames. */
tarry_film_shape tarry_film_shape_of(size_t n_frames, size_t n_lags, bool stationary);

/* Sums of one series, in this order. */
size_t tarry_series_n_sums(const tarry_film_shape *shape);
/* ... of one pair of series. */
size_t tarry_pair_n_sums(const tarry_film_shape *shape);

/* One trace made ready in a buffer of tarry_trace_size() doubles. */
size_t tarry_trace_size(const tarry_film_shape *shape);
/* Doubles that adding one takes to work with. */
size_t tarry_trace_work(const tarry_film_shape *shape);
double tarry_trace_mean(const double *trace, size_t n);
void tarry_trace_prepare(const tarry_film_shape *shape, const double *frames, double shift,
                         double *buffer);

/* Add a trace, and a pair of them, that were made ready. `frames` as above. */
void tarry_series_add(const tarry_film_shape *shape, const double *frames, double shift,
                      const double *buffer, double *work, double *sums);
void tarry_pair_add(const tarry_film_shape *shape, const double *first, const double *second,
                    double *work, double *sums);

/* Sums over n cells for shifts lower by `by` (a pair's before those of its series). */
void tarry_series_move(const tarry_film_shape *shape, double n, double by, double *sums);
void tarry_pair_move(const tarry_film_shape *shape, double n, const double *first, double by_first,
                     const double *second, double by_second, double *sums);

/* Mean less the shift, over n cells and all frames. */
double tarry_series_mean(const tarry_film_shape *shape, double n, const double *sums);

/* Pairs of frames at a lag, and of a pair of series at one from -(n_lags - 1) on. */
double tarry_series_pairs(const tarry_film_shape *shape, double n, const double *sums, size_t lag);
double tarry_pair_pairs(const tarry_film_shape *shape, double n, const double *sums, ptrdiff_t lag);

/* Its square; where the series is not stationary the mean over frames of that of each frame. */
double tarry_series_mean_square(const tarry_film_shape *shape, double n, double shift,
                                const double *sums);

/* Covariances from sums over n cells: covariance[0 .. n_lags) of one series; of a pair
 * covariance[0 .. 2 n_lags - 1), from the lag -(n_lags - 1) on, the second series that much later.
 * `work` holds 2 n_padded doubles. */
void tarry_series_covariance(const tarry_film_shape *shape, double n, const double *sums,
                             double *work, double *covariance);
void tarry_pair_covariance(const tarry_film_shape *shape, double n, const double *first,
                           const double *second, const double *sums, double *work,
                           double *covariance);

/* Mean of a correlation over the last quarter of its n_lags lags; NaN where there are fewer than 4.
 */
double tarry_correlation_plateau(const double *correlation, size_t n_lags);

/* Where the curve first falls to plateau + (1 - plateau)/e, in frames; NaN where it does not. */
double tarry_correlation_decay(const double *correlation, size_t n_lags, double plateau);

/* The line through lags 1 to 3 of a covariance, put back to 0: noise of single frames is in lag 0
 * alone. Needs TARRY_LAGS_PUT_BACK lags. */
enum { TARRY_LAGS_PUT_BACK = 4 };
double tarry_put_back(const double *covariance);

#endif
