/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_BASE_MATRIX_H
#define TARRY_BASE_MATRIX_H

/* GSL's matrices in memory that is looked after. GSL itself loses memory where gsl_matrix_alloc
 * fails half-way, and gsl_linalg_LU_decomp and gsl_linalg_exponential_ss write to what they did not
 * get: none of them is called. */

#include <gsl/gsl_matrix.h>

/* Zeros, to be freed with gsl_matrix_free; NULL when memory is short. */
gsl_matrix *tarry_matrix_new(size_t n_rows, size_t n_columns);

/* exp(a length) into `out`; `work` is room. All are square, of one size, and distinct. Returns 0,
 * or 1 where the exponent is not finite. By its series after halving it until its norm is at most
 * 1/2, then squared as often (Moler & Van Loan 1978, SIAM Rev. 20:801, method 3). */
int tarry_matrix_exponential(const gsl_matrix *a, double length, gsl_matrix *out, gsl_matrix *work);

/* Solve a x = b, in place of b[a->size1]; a is used up. Returns 0, or 1 where it cannot be done. By
 * elimination with partial pivoting (Golub & Van Loan 1996, Matrix Computations, 3.4). */
int tarry_matrix_solve(gsl_matrix *a, double *b);

#endif
