/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_EXACT_TRANSLATED_H
#define TARRY_EXACT_TRANSLATED_H

/* Generating functions of what is seen of a transcript's proteins, and of itself.
 *
 * Where the transcript has been is a random way through its stages, and given that way proteins
 * begin as a Poisson process of rate k in each stage. So with first(y) and second(y) the means of
 * what is seen of a protein of age y and of its square, and alpha and beta functions of z,
 *
 *     g(z, a) = E exp(integral over the way of k (alpha first(y) + beta second(y)))
 *
 * of which V_s(r) is the part from the transcript's coming into stage s on, r ago. With K(r) the
 * integral of k (alpha first + beta second) up to r, and the dwell there being l,
 *
 *     V_s(r) = E[exp(K(r) - K(r - l)) V_{s+1}(r - l); l < r] + exp(K(r)) E[what is seen of it; l >
 * r]
 *
 * with V = 1 after a loss or decay. Where dwells are exponential that is the equation
 *
 *     V_s' = (K' - leave - loss) V_s + leave V_{s+1} + loss. */

#include "exact/fan.h"
#include "exact/glimpse.h"
#include "exact/measure.h"

/* One stage of the transcript. */
typedef struct tarry_translated_stage {
    const tarry_exact_stage *stage;
    bool flows;               /* its dwell is exponential: by the equation */
    double leave;             /* then the rate at which it goes on; else 0 */
    tarry_measure measure;    /* else of its dwell */
    tarry_curve stay;         /* P(still there) */
    tarry_curve once, square; /* what is seen of the transcript itself, since it came in */
    double *breaks;           /* at which V_s may jump or bend, ascending */
    size_t n_breaks;
    double end;       /* from here on V_s = 1 */
    tarry_fan values; /* V_s - 1 */
} tarry_translated_stage;

typedef struct tarry_translated {
    tarry_curve seen[2];   /* first, second */
    tarry_curve summed[2]; /* their integrals up to an age */
    tarry_translated_stage *stages;
    size_t n_stages;
    size_t n;
    const double *alpha_re, *alpha_im, *beta_re, *beta_im; /* [n]; beta may be NULL: 0 */
} tarry_translated;

/* `seen` has been filled before. `glimpses` of the transcript itself; may be empty. release accepts
 * a zeroed or half-built one. Errors: TARRY_MEMORY, TARRY_NUMERIC. */
int tarry_translated_init(tarry_translated *t, const tarry_exact_chain *transcript,
                          const tarry_exact_glimpses *glimpses, double horizon, tarry_error *error);
void tarry_translated_release(tarry_translated *t);

/* Work out V_0 for these alpha and beta, which stay the caller's. The transcript itself is seen as
 * 1 + alpha once + beta square. TARRY_NUMERIC where it passes the range of numbers. */
int tarry_translated_prepare(tarry_translated *t, size_t n, const double *alpha_re,
                             const double *alpha_im, const double *beta_re, const double *beta_im,
                             tarry_error *error);

/* V_0 of functions from <= j < to at age a, seen from `inside`. */
void tarry_translated_put(const tarry_translated *t, double a, double inside, size_t from,
                          size_t to, double *re, double *im);

/* What one transcript is seen as is not likely to be more. */
double tarry_translated_most(const tarry_translated *t);

/* *second (zeroed): the second derivative at 0 of V_0 by s, where alpha = s: with beta = s^2 / 2
 * that is the mean square of what is seen (`plain`); with beta = 0, of molecules that are there or
 * not, the second factorial moment. Works out V_0 for alphas of its own. */
int tarry_translated_second(tarry_translated *t, bool plain, tarry_curve *second,
                            tarry_error *error);

#endif
