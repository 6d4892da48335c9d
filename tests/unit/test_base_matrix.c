/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Against GSL's own functions (which are all right while there is memory) and closed forms. */
#include "base/matrix.h"

#include "support.h"

#include <gsl/gsl_linalg.h>
#include <gsl/gsl_rng.h>
#include <math.h>

enum { MOST = 12 };

static gsl_matrix *random_matrix(gsl_rng *rng, size_t n) {
    gsl_matrix *a = gsl_matrix_alloc(n, n);
    for (size_t i = 0; i < n; i++)
        for (size_t j = 0; j < n; j++)
            gsl_matrix_set(a, i, j, 2 * gsl_rng_uniform(rng) - 1);
    return a;
}

START_TEST(new_is_zero_and_free) {
    gsl_matrix *a = tarry_matrix_new(3, 5);
    ck_assert_ptr_nonnull(a);
    ck_assert_uint_eq(a->size1, 3);
    ck_assert_uint_eq(a->size2, 5);
    ck_assert(gsl_matrix_isnull(a));
    gsl_matrix_set(a, 2, 4, 7);
    ck_assert_double_eq(gsl_matrix_get(a, 2, 4), 7);
    gsl_matrix_free(a);
    ck_assert_ptr_null(tarry_matrix_new((size_t)1 << 40, (size_t)1 << 40));
}
END_TEST

/* exp of a random matrix times lengths from tiny to 40, beside gsl_linalg_exponential_ss; both lose
 * digits as the norm grows, so the limit is 1e-13 times the norm of the result and of the exponent.
 */
START_TEST(exponential_beside_gsl) {
    gsl_rng *rng = gsl_rng_alloc(gsl_rng_mt19937);
    gsl_rng_set(rng, 1);
    for (size_t n = 1; n <= MOST; n++)
        for (int k = 0; k < 6; k++) {
            static const double lengths[] = {0, 1e-9, 0.3, 1, 6, 40};
            gsl_matrix *a = random_matrix(rng, n), *scaled = gsl_matrix_alloc(n, n);
            gsl_matrix *theirs = gsl_matrix_alloc(n, n), *ours = tarry_matrix_new(n, n);
            gsl_matrix *work = tarry_matrix_new(n, n);
            gsl_matrix_memcpy(scaled, a);
            gsl_matrix_scale(scaled, lengths[k]);
            ck_assert_int_eq(gsl_linalg_exponential_ss(scaled, theirs, GSL_PREC_DOUBLE), 0);
            ck_assert_int_eq(tarry_matrix_exponential(a, lengths[k], ours, work), 0);
            const double size = gsl_matrix_norm1(theirs);
            gsl_matrix_sub(theirs, ours);
            const double off = gsl_matrix_norm1(theirs) / size;
            ck_assert_msg(off < 1e-13 * (1 + (double)n * lengths[k]), "n = %zu, length %g: %g", n,
                          lengths[k], off);
            gsl_matrix_free(a);
            gsl_matrix_free(scaled);
            gsl_matrix_free(theirs);
            gsl_matrix_free(ours);
            gsl_matrix_free(work);
        }
    gsl_rng_free(rng);
}
END_TEST

/* exp of ((0, t), (-t, 0)) is the rotation by t; and of ((0, 1), (0, 0)) it is 1 plus itself. */
START_TEST(exponential_in_closed_form) {
    gsl_matrix *a = tarry_matrix_new(2, 2), *e = tarry_matrix_new(2, 2);
    gsl_matrix *work = tarry_matrix_new(2, 2);
    gsl_matrix_set(a, 0, 1, 1);
    ck_assert_int_eq(tarry_matrix_exponential(a, 3, e, work), 0);
    ck_assert_double_eq(gsl_matrix_get(e, 0, 1), 3);
    ck_assert_double_eq(gsl_matrix_get(e, 0, 0), 1);
    gsl_matrix_set(a, 1, 0, -1);
    for (int i = 0; i < 40; i++) {
        const double t = 0.25 * i;
        ck_assert_int_eq(tarry_matrix_exponential(a, t, e, work), 0);
        ck_assert_double_eq_tol(gsl_matrix_get(e, 0, 0), cos(t), 1e-14);
        ck_assert_double_eq_tol(gsl_matrix_get(e, 0, 1), sin(t), 1e-14);
    }
    gsl_matrix_set(a, 0, 0, NAN);
    ck_assert_int_ne(tarry_matrix_exponential(a, 1, e, work), 0);
    gsl_matrix_set(a, 0, 0, INFINITY);
    ck_assert_int_ne(tarry_matrix_exponential(a, 1, e, work), 0);
    gsl_matrix_free(a);
    gsl_matrix_free(e);
    gsl_matrix_free(work);
}
END_TEST

/* Random systems beside gsl_linalg_LU_solve; the first pivot is 0, so that rows must be swapped. */
START_TEST(solving_beside_gsl) {
    gsl_rng *rng = gsl_rng_alloc(gsl_rng_mt19937);
    gsl_rng_set(rng, 1);
    for (size_t n = 2; n <= MOST; n++) {
        gsl_matrix *a = random_matrix(rng, n), *lu = gsl_matrix_alloc(n, n);
        gsl_permutation *p = gsl_permutation_alloc(n);
        gsl_vector *b = gsl_vector_alloc(n), *x = gsl_vector_alloc(n);
        int sign = 0;
        gsl_matrix_set(a, 0, 0, 0);
        for (size_t i = 0; i < n; i++)
            gsl_vector_set(b, i, gsl_rng_uniform(rng));
        gsl_matrix_memcpy(lu, a);
        ck_assert_int_eq(gsl_linalg_LU_decomp(lu, p, &sign), 0);
        ck_assert_int_eq(gsl_linalg_LU_solve(lu, p, b, x), 0);
        ck_assert_int_eq(tarry_matrix_solve(a, b->data), 0);
        for (size_t i = 0; i < n; i++)
            ck_assert_double_eq_tol(gsl_vector_get(b, i), gsl_vector_get(x, i), 1e-11);
        gsl_matrix_free(a);
        gsl_matrix_free(lu);
        gsl_permutation_free(p);
        gsl_vector_free(b);
        gsl_vector_free(x);
    }
    gsl_rng_free(rng);
}
END_TEST

START_TEST(what_cannot_be_solved) {
    gsl_matrix *a = tarry_matrix_new(2, 2);
    double b[2] = {1, 1};
    ck_assert_int_ne(tarry_matrix_solve(a, b), 0);
    gsl_matrix_set_all(a, 1);
    ck_assert_int_ne(tarry_matrix_solve(a, b), 0);
    gsl_matrix_set_all(a, NAN);
    ck_assert_int_ne(tarry_matrix_solve(a, b), 0);
    gsl_matrix_free(a);
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"new is zero and free", new_is_zero_and_free},
        {"exponential beside GSL", exponential_beside_gsl},
        {"exponential in closed form", exponential_in_closed_form},
        {"solving beside GSL", solving_beside_gsl},
        {"what cannot be solved", what_cannot_be_solved},
    };
    return run_tests("matrices", tests, sizeof tests / sizeof *tests);
}
