/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Fraction-free elimination (common practice): rows are kept as whole numbers, small by their
 * greatest common divisors; products are formed in 128 bits and checked against 64. The basis found
 * is then made readable by sums and differences of its vectors. */

#include "model/nullspace.h"

#include "base/memory.h"

#include <assert.h>
#include <stdlib.h>
#include <string.h>

__extension__ typedef __int128 wide;

/* ---- whole numbers -------------------------------------------------------------------------- */

static uint64_t magnitude(int64_t x) {
    return x < 0 ? (uint64_t)0 - (uint64_t)x : (uint64_t)x;
}

static uint64_t divisor(uint64_t a, uint64_t b) {
    while (b) {
        const uint64_t rest = a % b;
        a = b;
        b = rest;
    }
    return a;
}

/* row = a * row + b * other, over its greatest common divisor. False where a number does not fit;
 * the row is then spoilt. */
static bool combine(int64_t *row, int64_t a, const int64_t *other, int64_t b, size_t n) {
    uint64_t common = divisor(magnitude(a), magnitude(b));
    if (common > INT64_MAX)
        return false;
    a /= (int64_t)common;
    b /= (int64_t)common;
    common = 0;
    for (size_t i = 0; i < n; i++) {
        const wide value = (wide)a * row[i] + (wide)b * other[i];
        if (value > INT64_MAX || value < -INT64_MAX)
            return false;
        row[i] = (int64_t)value;
        common = divisor(magnitude(row[i]), common);
    }
    for (size_t i = 0; i < n && common > 1; i++)
        row[i] /= (int64_t)common;
    return true;
}

/* ---- elimination ------------------------------------------------------------------------------
 */

void tarry_nullspace_release(tarry_nullspace *space) {
    free(space->pivots);
    free(space->leads);
    free(space->basis);
    free(space->row);
    *space = (tarry_nullspace){0};
}

int tarry_nullspace_init(tarry_nullspace *space, size_t n) {
    *space = (tarry_nullspace){.n = n};
    space->pivots = tarry_calloc(n, n * sizeof *space->pivots);
    space->leads = tarry_calloc(n, sizeof *space->leads);
    space->basis = tarry_calloc(n, n * sizeof *space->basis);
    space->row = tarry_calloc(n, sizeof *space->row);
    return !space->pivots || !space->leads || !space->basis || !space->row;
}

/* Reduced by what is known, the equation is spent or leads in a new column. */
bool tarry_nullspace_take(tarry_nullspace *space) {
    for (size_t c = 0; c < space->n; c++) {
        if (space->row[c] == 0)
            continue;
        int64_t *pivot = space->pivots + c * space->n;
        if (!space->leads[c]) {
            memcpy(pivot, space->row, space->n * sizeof *pivot);
            space->leads[c] = true;
            return true;
        }
        if (!combine(space->row, pivot[c], pivot, -space->row[c], space->n))
            return false;
    }
    return true;
}

/* Clear every leading column above its own row. */
static bool reduce_back(tarry_nullspace *space) {
    for (size_t c = space->n; c-- > 0;) {
        if (!space->leads[c])
            continue;
        const int64_t *pivot = space->pivots + c * space->n;
        for (size_t above = 0; above < c; above++) {
            int64_t *row = space->pivots + above * space->n;
            if (space->leads[above] && row[c] != 0 &&
                !combine(row, pivot[c], pivot, -row[c], space->n))
                return false;
        }
    }
    return true;
}

/* The solution with weight in one free column and in leading ones: row[c] y[c] = -row[f] y[f]. */
static bool solve_free(const tarry_nullspace *space, size_t f, int64_t *y) {
    uint64_t scale = 1;
    for (size_t c = 0; c < f; c++) {
        const int64_t *row = space->pivots + c * space->n;
        if (!space->leads[c] || row[f] == 0)
            continue;
        const uint64_t lead = magnitude(row[c]) / divisor(magnitude(row[c]), magnitude(row[f]));
        const uint64_t factor = lead / divisor(lead, scale);
        if (scale > (uint64_t)INT32_MAX || factor > (uint64_t)INT32_MAX)
            return false;
        scale *= factor;
    }
    memset(y, 0, space->n * sizeof *y);
    if (scale > (uint64_t)INT64_MAX)
        return false;
    y[f] = (int64_t)scale;
    for (size_t c = 0; c < f; c++) {
        const int64_t *row = space->pivots + c * space->n;
        if (!space->leads[c] || row[f] == 0)
            continue;
        assert(row[c] != 0); /* a pivot */
        const wide value = -(wide)row[f] * (int64_t)scale / row[c];
        if (value > INT64_MAX || value < -INT64_MAX)
            return false;
        y[c] = (int64_t)value;
    }
    return true;
}

/* ---- a readable basis ----------------------------------------------------------------------- */

static bool is_positive(const int64_t *y, size_t n) {
    for (size_t i = 0; i < n; i++)
        if (y[i] < 0)
            return false;
    return true;
}

/* Add vectors without negative weights to space->row (which is number `index`, or its negative)
 * until it has none either. False where that cannot be done. */
static bool lift_row(tarry_nullspace *space, size_t index) {
    const size_t n = space->n;
    for (size_t i = 0; i < n; i++) {
        if (space->row[i] >= 0)
            continue;
        size_t k = 0;
        while (k < space->n_basis && (k == index || space->basis[k * n + i] <= 0 ||
                                      !is_positive(space->basis + k * n, n)))
            k++;
        if (k == space->n_basis)
            return false;
        const int64_t *other = space->basis + k * n;
        if (!combine(space->row, other[i], other, -space->row[i], n))
            return false;
    }
    return true;
}

/* Rid a vector of negative weights, where that can be done by adding others to it or taking it off
 * others. */
static void lift(tarry_nullspace *space, size_t index) {
    int64_t *y = space->basis + index * space->n;
    bool done = is_positive(y, space->n);
    for (int sign = 1; sign >= -1 && !done; sign -= 2) {
        for (size_t i = 0; i < space->n; i++)
            space->row[i] = sign * y[i];
        done = lift_row(space, index);
        if (done)
            memcpy(y, space->row, space->n * sizeof *y);
    }
}

/* Take another vector off as often as it fits. */
static void take_off(tarry_nullspace *space, size_t index, size_t k) {
    int64_t *y = space->basis + index * space->n;
    const int64_t *other = space->basis + k * space->n;
    int64_t times = INT64_MAX;
    for (size_t i = 0; i < space->n; i++)
        if (other[i] > 0 && y[i] / other[i] < times)
            times = y[i] / other[i];
    if (times > 0)
        combine(y, 1, other, -times, space->n);
}

/* The first weight is positive; a vector without a positive weight changes its sign. */
static void orient(int64_t *y, size_t n) {
    bool negative = false, seen = false;
    for (size_t i = 0; i < n && !seen; i++) {
        seen = y[i] != 0;
        negative = y[i] < 0;
    }
    for (size_t i = 0; i < n && negative; i++)
        y[i] = -y[i];
}

static size_t first_weight(const int64_t *y, size_t n) {
    size_t i = 0;
    while (i < n && y[i] == 0)
        i++;
    return i;
}

/* By the first unknown in them. */
static void sort_basis(tarry_nullspace *space) {
    const size_t n = space->n, size = n * sizeof *space->row;
    for (size_t b = 1; b < space->n_basis; b++)
        for (size_t k = b; k > 0; k--) {
            int64_t *one = space->basis + (k - 1) * n, *two = space->basis + k * n;
            if (first_weight(one, n) <= first_weight(two, n))
                break;
            memcpy(space->row, one, size);
            memcpy(one, two, size);
            memcpy(two, space->row, size);
        }
}

/* Two rounds settle all but contrived cases; every step keeps the basis a basis. */
static void tidy_basis(tarry_nullspace *space) {
    const size_t n = space->n;
    for (int round = 0; round < 2; round++) {
        for (size_t b = 0; b < space->n_basis; b++) {
            orient(space->basis + b * n, n);
            lift(space, b);
        }
        for (size_t b = 0; b < space->n_basis; b++)
            for (size_t k = 0; k < space->n_basis; k++)
                if (k != b && is_positive(space->basis + b * n, n) &&
                    is_positive(space->basis + k * n, n))
                    take_off(space, b, k);
    }
    sort_basis(space);
}

bool tarry_nullspace_solve(tarry_nullspace *space) {
    if (!reduce_back(space))
        return false;
    for (size_t f = 0; f < space->n; f++)
        if (!space->leads[f] && !solve_free(space, f, space->basis + space->n_basis++ * space->n))
            return false;
    tidy_basis(space);
    return true;
}
