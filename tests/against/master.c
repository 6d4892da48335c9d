/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "master.h"

#include <check.h>
#include <gsl/gsl_errno.h>
#include <gsl/gsl_linalg.h>
#include <gsl/gsl_odeiv2.h>
#include <math.h>
#include <string.h>

typedef struct chain {
    size_t n;
    const master_move *moves;
    size_t n_moves;
} chain;

static int flow(double t, const double *p, double *change, void *context) {
    (void)t;
    const chain *c = context;
    memset(change, 0, c->n * sizeof *change);
    for (size_t i = 0; i < c->n_moves; i++) {
        const double flux = c->moves[i].rate * p[c->moves[i].from];
        change[c->moves[i].from] -= flux;
        change[c->moves[i].to] += flux;
    }
    return GSL_SUCCESS;
}

void master_solve(size_t n, const master_move *moves, size_t n_moves, double *p, double t) {
    chain c = {n, moves, n_moves};
    gsl_odeiv2_system system = {flow, NULL, n, &c};
    gsl_odeiv2_driver *driver = gsl_odeiv2_driver_alloc_y_new(&system, gsl_odeiv2_step_rk8pd, 1e-3,
                                                              1e-13, 0);
    ck_assert_ptr_nonnull(driver);
    double now = 0;
    ck_assert_int_eq(gsl_odeiv2_driver_apply(driver, &now, t, p), GSL_SUCCESS);
    gsl_odeiv2_driver_free(driver);
}

void master_stationary(size_t n, const master_move *moves, size_t n_moves, double *p) {
    gsl_matrix *a = gsl_matrix_calloc(n, n);
    gsl_vector *b = gsl_vector_calloc(n);
    gsl_permutation *order = gsl_permutation_alloc(n);
    ck_assert(a && b && order);
    for (size_t i = 0; i < n_moves; i++) {
        const master_move move = moves[i];
        *gsl_matrix_ptr(a, move.to, move.from) += move.rate;
        *gsl_matrix_ptr(a, move.from, move.from) -= move.rate;
    }
    /* One balance follows from the others: the last gives way to the sum of all probabilities. */
    for (size_t j = 0; j < n; j++)
        gsl_matrix_set(a, n - 1, j, 1);
    gsl_vector_set(b, n - 1, 1);
    int sign;
    ck_assert_int_eq(gsl_linalg_LU_decomp(a, order, &sign), GSL_SUCCESS);
    ck_assert_int_eq(gsl_linalg_LU_svx(a, order, b), GSL_SUCCESS);
    for (size_t j = 0; j < n; j++)
        p[j] = gsl_vector_get(b, j);
    gsl_permutation_free(order);
    gsl_vector_free(b);
    gsl_matrix_free(a);
}

master_moments master_moments_of(size_t n, const double *p, const double *values) {
    double mean = 0, m2 = 0, m4 = 0;
    for (size_t i = 0; i < n; i++)
        mean += p[i] * values[i];
    for (size_t i = 0; i < n; i++) {
        const double d = values[i] - mean;
        m2 += p[i] * d * d;
        m4 += p[i] * d * d * d * d;
    }
    return (master_moments){mean, sqrt(m2), m4 / (m2 * m2) - 3};
}
