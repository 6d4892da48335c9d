/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "base/matrix.h"

#include "base/memory.h"

#include <gsl/gsl_blas.h>
#include <math.h>
#include <stdint.h>
#include <stdlib.h>

enum { TERMS = 17 }; /* of the series: 2^-18 / 18! is below the last digit of 1 */

gsl_matrix *tarry_matrix_new(size_t n_rows, size_t n_columns) {
    gsl_matrix *matrix = NULL;
    if (n_columns == 0 || n_rows <= (SIZE_MAX - sizeof *matrix) / sizeof(double) / n_columns)
        matrix = tarry_calloc(1, sizeof *matrix + n_rows * n_columns * sizeof(double));
    if (matrix != NULL)
        *matrix = (gsl_matrix){.size1 = n_rows,
                               .size2 = n_columns,
                               .tda = n_columns,
                               .data = (double *)(void *)(matrix + 1)};
    return matrix;
}

/* The largest sum of a row's absolute values. */
static double norm_of(const gsl_matrix *a) {
    double most = 0;
    for (size_t i = 0; i < a->size1; i++) {
        const gsl_vector_const_view row = gsl_matrix_const_row(a, i);
        const double sum = gsl_blas_dasum(&row.vector);
        if (!(sum <= most))
            most = sum;
        if (isnan(sum))
            break;
    }
    return most;
}

static void swap(gsl_matrix **one, gsl_matrix **other) {
    gsl_matrix *kept = *one;
    *one = *other;
    *other = kept;
}

int tarry_matrix_exponential(const gsl_matrix *a, double length, gsl_matrix *out,
                             gsl_matrix *work) {
    const double norm = norm_of(a) * fabs(length);
    gsl_matrix *sum = out, *next = work;
    int halvings = 0, status = 0;
    if (!isfinite(norm))
        return 1;
    frexp(2 * norm, &halvings);
    halvings = halvings > 0 ? halvings : 0;
    const double step = ldexp(length, -halvings);
    gsl_matrix_set_identity(sum);
    for (int term = TERMS; term > 0; term--) {
        status |= gsl_blas_dgemm(CblasNoTrans, CblasNoTrans, step / term, a, sum, 0, next);
        for (size_t i = 0; i < a->size1; i++)
            *gsl_matrix_ptr(next, i, i) += 1;
        swap(&sum, &next);
    }
    for (; halvings > 0; halvings--) {
        status |= gsl_blas_dgemm(CblasNoTrans, CblasNoTrans, 1, sum, sum, 0, next);
        swap(&sum, &next);
    }
    if (sum != out)
        status |= gsl_matrix_memcpy(out, sum);
    return status != 0;
}

/* The row at or below k with the largest entry in column k. */
static size_t find_pivot(const gsl_matrix *a, size_t k) {
    size_t pivot = k;
    for (size_t i = k + 1; i < a->size1; i++)
        if (fabs(gsl_matrix_get(a, i, k)) > fabs(gsl_matrix_get(a, pivot, k)))
            pivot = i;
    return pivot;
}

int tarry_matrix_solve(gsl_matrix *a, double *b) {
    const size_t n = a->size1;
    for (size_t k = 0; k < n; k++) {
        const size_t pivot = find_pivot(a, k);
        const double head = gsl_matrix_get(a, pivot, k), kept = b[k];
        if (!(head != 0 && isfinite(head)))
            return 1;
        gsl_matrix_swap_rows(a, k, pivot);
        b[k] = b[pivot];
        b[pivot] = pivot == k ? b[k] : kept;
        for (size_t i = k + 1; i < n; i++) {
            const double share = gsl_matrix_get(a, i, k) / head;
            for (size_t j = k + 1; share != 0 && j < n; j++)
                *gsl_matrix_ptr(a, i, j) -= share * gsl_matrix_get(a, k, j);
            b[i] -= share * b[k];
        }
    }
    for (size_t k = n; k-- > 0;) {
        for (size_t j = k + 1; j < n; j++)
            b[k] -= gsl_matrix_get(a, k, j) * b[j];
        b[k] /= gsl_matrix_get(a, k, k);
    }
    return 0;
}
