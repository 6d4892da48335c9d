/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_EXACT_COVARIANCE_H
#define TARRY_EXACT_COVARIANCE_H

/* Means and covariances of what channels see of a gene in its steady state. */

#include "exact/view.h"

/* Two views of one gene; they may be the same. */
typedef struct tarry_exact_covariance {
    double n_copies;    /* alleles that both see */
    double initiations; /* a copy's mean rate */
    double mean[2];
    tarry_curve contribution[2];
    tarry_curve overlap[2]; /* the second view later by tau, and the first */
    tarry_curve joint[2];   /* at y: integral of m1(u) m2(u + y) du, and with the views exchanged */
    tarry_curve pulse;      /* at h: covariance of initiations h apart, but for one with itself */
} tarry_exact_covariance;

/* *why: NULL, or why it cannot be worked out (rest of a sentence), as where the promoter is not
 * steady from `horizon` before `from` up to `to`. Zero-initialise ({0}). Errors: TARRY_MEMORY,
 * TARRY_NUMERIC. */
int tarry_exact_covariance_init(const tarry_exact_gene *gene, const tarry_exact_view *one,
                                const tarry_exact_view *other, double from, double to,
                                double horizon, tarry_arena *arena,
                                tarry_exact_covariance *covariance, const char **why,
                                tarry_error *error);
void tarry_exact_covariance_release(tarry_exact_covariance *covariance);

/* The covariance of the first view with the second one `lag` later (lag may be negative).
 *
 * Initiations make a stationary point process with covariance C(h) = pi jump exp(Q h) jump 1 -
 * (mean rate)^2; each is seen as r1 and r2, independent of all others: cov = rate * integral of
 * E[r1(a) r2(a + lag)] da + double integral of C(|lag + u - v|) m1(u) m2(v) (shot noise; Daley &
 * Vere-Jones 2003, An Introduction to the Theory of Point Processes, chapter 6; from memory). */
double tarry_exact_covariance_at(const tarry_exact_covariance *covariance, double lag);

/* The age beyond which no more than 1e-7 of a contribution lies. */
double tarry_exact_memory(const tarry_curve *contribution);

#endif
