/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_TALLY_CORRELATION_GAPS_H
#define TARRY_TALLY_CORRELATION_GAPS_H

/* Covariances of films in which frames are missing, or which differ in length. Used by
 * tally/correlation.c alone, which has the same for films without gaps.
 *
 * Of each cell c and lag k there are the n_c(k) pairs of frames that both are known, with the sum
 * P_c(k) of their products, H_c(k) of the earlier values and L_c(k) of the later ones; S_c is the
 * sum of all its N_c known values. All are about one shift, the same for all cells, which lies amid
 * the values. With c and d two different cells,
 *
 *     C(k) = sum P_c / sum n_c - sum Sy_d H_c / sum Ny_d n_c - sum Sx_d L_c / sum Nx_d n_c
 *            + sum Sx_c Sy_d / sum Nx_c Ny_d,
 *
 * that is, products of what different cells show are taken off, whose expectation is the product of
 * the means: for cells that are independent and stationary C(k) has no bias, however short traces
 * are and wherever frames are missing at random (a U-statistic: Hoeffding 1948, Ann. Math. Stat.
 * 19:293). With whole films it is what tally/correlation.c works out. Sums over different cells are
 * those over all pairs less those over one cell, so that everything is kept as sums over cells.
 *
 * With own means each trace's own mean is taken off, and C(k) = sum P_c / sum n_c: biased by about
 * the variance of that mean. One cell alone has no other mean. */

#include "tally/correlation.h"

/* Sums of a pair of series (or of one with itself) at so many lags. */
size_t tarry_gaps_n_sums(const tarry_film_shape *shape, size_t n_lags);

/* A trace made ready, in a buffer of so many doubles. A trace without a known frame is fine. */
size_t tarry_gaps_trace_size(const tarry_film_shape *shape);
void tarry_gaps_prepare(const tarry_film_shape *shape, const double *frames, double shift,
                        double *buffer);

/* Add a cell: lags from `least` on by which the second comes later. `work` holds n_padded doubles.
 */
void tarry_gaps_add(const tarry_film_shape *shape, const double *first, const double *second,
                    ptrdiff_t least, size_t n_lags, double *work, double *sums);

/* Mean of the first series less the shift. */
double tarry_gaps_mean(const double *sums);

/* Pairs at lag number i. */
double tarry_gaps_pairs(size_t n_lags, const double *sums, size_t i);

/* Covariances from the sums of n cells; NaN where there are no pairs. */
void tarry_gaps_covariance(const tarry_film_shape *shape, double n, size_t n_lags,
                           const double *sums, double *covariance);

#endif
