/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Pieces are halved until the series of each has converged: its last coefficients are small. Series
 * in Chebyshev polynomials through their own nodes are within a small factor of the best polynomial
 * (Trefethen 2013, Approximation Theory and Approximation Practice, chapter 15; from memory). */

#include "exact/curve.h"

#include "exact/gauss.h"

#include "base/error.h"
#include "base/memory.h"

#include <gsl/gsl_math.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

enum { NODES = TARRY_CURVE_NODES, MOST_PIECES = 20000, TAIL = 3 };

typedef struct follower {
    tarry_curve *curve;
    tarry_curve_function *function;
    void *context;
    double tolerance, end;
    size_t bounds_capacity, coefficients_capacity;
    double cosines[NODES][NODES]; /* [coefficient][node] */
    tarry_error *error;
} follower;

void tarry_curve_release(tarry_curve *curve) {
    free(curve->bounds);
    free(curve->coefficients);
    free(curve->breaks);
    *curve = (tarry_curve){0};
}

static void fill_cosines(follower *f) {
    for (int k = 0; k < NODES; k++)
        for (int j = 0; j < NODES; j++)
            f->cosines[k][j] = cos(M_PI * k * (j + 0.5) / NODES);
}

/* The series on [from, to]; 0, or TARRY_NUMERIC where a value is not finite. */
static int fit(const follower *f, double from, double to, double *series) {
    double values[NODES];
    for (int j = 0; j < NODES; j++) {
        const double x = from + 0.5 * (to - from) * (1 + f->cosines[1][j]);
        values[j] = f->function(f->context, x);
        if (!isfinite(values[j]))
            return tarry_fail(f->error, TARRY_NUMERIC, "a function of age is not finite");
    }
    for (int k = 0; k < NODES; k++) {
        double sum = 0;
        for (int j = 0; j < NODES; j++)
            sum += values[j] * f->cosines[k][j];
        series[k] = sum * (k == 0 ? 1.0 : 2.0) / NODES;
    }
    return 0;
}

/* No series comes closer than rounding of its largest value allows. */
static int has_converged(const double *series, double tolerance) {
    double tail = 0, largest = 0;
    for (int k = 0; k < NODES; k++)
        largest = fmax(largest, fabs(series[k]));
    for (int k = NODES - TAIL; k < NODES; k++)
        tail = fmax(tail, fabs(series[k]));
    return tail <= tolerance || tail <= 1e-14 * largest;
}

static int keep_piece(follower *f, double to, const double *series) {
    tarry_curve *curve = f->curve;
    if (tarry_grow((void **)&curve->bounds, &f->bounds_capacity, curve->n + 2,
                   sizeof *curve->bounds) != 0 ||
        tarry_grow((void **)&curve->coefficients, &f->coefficients_capacity, (curve->n + 1) * NODES,
                   sizeof *curve->coefficients) != 0)
        return tarry_fail_memory(f->error, "a function of age");
    memcpy(&curve->coefficients[curve->n * NODES], series, NODES * sizeof *series);
    curve->bounds[++curve->n] = to;
    return 0;
}

/* A piece too short to be halved is kept as it is: its part in an integral is nothing, even of a
 * density that is infinite at 0. */
static int follow(follower *f, double from, double to) {
    double series[NODES];
    const int code = fit(f, from, to, series);
    if (code != 0)
        return code;
    const double middle = 0.5 * (from + to);
    if (has_converged(series, f->tolerance) || to - from <= 1e-13 * to ||
        to - from <= 1e-40 * f->end)
        return keep_piece(f, to, series);
    if (f->curve->n >= MOST_PIECES)
        return tarry_fail(f->error, TARRY_NUMERIC, "a function of age has too many pieces");
    const int left = follow(f, from, middle);
    return left != 0 ? left : follow(f, middle, to);
}

static int compare(const void *one, const void *other) {
    const double a = *(const double *)one, b = *(const double *)other;
    return (a > b) - (a < b);
}

/* The breaks within (0, end), with 0 and end, ascending, each once. */
static int order_breaks(tarry_curve *curve, double end, const double *breaks, size_t n) {
    curve->breaks = tarry_calloc(n + 2, sizeof *curve->breaks);
    if (curve->breaks == NULL)
        return 1;
    curve->breaks[curve->n_breaks++] = 0;
    for (size_t i = 0; i < n; i++)
        if (breaks[i] > 0 && breaks[i] < end)
            curve->breaks[curve->n_breaks++] = breaks[i];
    curve->breaks[curve->n_breaks++] = end;
    qsort(curve->breaks, curve->n_breaks, sizeof *curve->breaks, compare);
    size_t kept = 1;
    for (size_t i = 1; i < curve->n_breaks; i++) /* what rounding parts is one break */
        if (curve->breaks[i] - curve->breaks[kept - 1] > 1e-14 * end)
            curve->breaks[kept++] = curve->breaks[i];
    curve->breaks[kept - 1] = end;
    curve->n_breaks = kept;
    return 0;
}

int tarry_curve_init(tarry_curve *curve, double end, const double *breaks, size_t n_breaks,
                     double tolerance, tarry_curve_function *function, void *context,
                     tarry_error *error) {
    follower f = {.curve = curve,
                  .function = function,
                  .context = context,
                  .tolerance = tolerance,
                  .end = end,
                  .error = error};
    fill_cosines(&f);
    if (order_breaks(curve, end, breaks, n_breaks) != 0 ||
        tarry_grow((void **)&curve->bounds, &f.bounds_capacity, 2, sizeof *curve->bounds) != 0)
        return tarry_fail_memory(error, "a function of age");
    curve->bounds[0] = 0;
    int code = 0;
    for (size_t i = 0; code == 0 && i + 1 < curve->n_breaks; i++)
        code = follow(&f, curve->breaks[i], curve->breaks[i + 1]);
    return code;
}

double tarry_curve_end(const tarry_curve *curve) {
    return curve->n > 0 ? curve->bounds[curve->n] : 0;
}

/* The piece that holds x, 0 <= x <= end; at a bound the one on the side of `inside`. */
static size_t find(const tarry_curve *curve, double x, double inside) {
    size_t low = 0, high = curve->n;
    while (high - low > 1) {
        const size_t middle = low + (high - low) / 2;
        if (x < curve->bounds[middle] || (x == curve->bounds[middle] && inside < x))
            high = middle;
        else
            low = middle;
    }
    return low;
}

/* Clenshaw's recurrence for the sum of c[k] T_k(u), -1 <= u <= 1. */
static double sum_series(const double *c, double u) {
    double one = 0, two = 0;
    for (int k = NODES - 1; k > 0; k--) {
        const double next = 2 * u * one - two + c[k];
        two = one;
        one = next;
    }
    return u * one - two + c[0];
}

static double place(const tarry_curve *curve, size_t piece, double x) {
    const double from = curve->bounds[piece], to = curve->bounds[piece + 1];
    return 2 * (x - from) / (to - from) - 1;
}

double tarry_curve_value(const tarry_curve *curve, double x, double inside) {
    const double end = tarry_curve_end(curve);
    if (x < 0 || x > end || (x == 0 && inside < 0) || (x == end && !(inside < end)))
        return 0;
    const size_t piece = find(curve, x, inside);
    return sum_series(&curve->coefficients[piece * NODES], place(curve, piece, x));
}

/* The integral of T_k from -1 to u: T_{k+1}(u)/(2(k+1)) - T_{k-1}(u)/(2(k-1)), and its value at -1
 * taken off. */
static double integrate_series(const double *c, double u) {
    double before = 1, now = u; /* T_0, T_1 */
    double sum = c[0] * (u + 1) + c[1] * 0.5 * (u * u - 1);
    for (int k = 2; k < NODES; k++) {
        const double next = 2 * u * now - before;    /* T_k */
        const double after = 2 * u * next - now;     /* T_{k+1} */
        const double sign = k % 2 == 0 ? -1.0 : 1.0; /* T_{k+1}(-1) = T_{k-1}(-1) */
        sum += c[k] * 0.5 * ((after - sign) / (k + 1) - (now - sign) / (k - 1));
        before = now;
        now = next;
    }
    return sum;
}

double tarry_curve_integral(const tarry_curve *curve, double x) {
    double sum = 0;
    for (size_t i = 0; i < curve->n && curve->bounds[i] < x; i++) {
        const double u = x >= curve->bounds[i + 1] ? 1 : place(curve, i, x);
        sum += 0.5 * (curve->bounds[i + 1] - curve->bounds[i]) *
               integrate_series(&curve->coefficients[i * NODES], u);
    }
    return sum;
}

/* ---- sums and products ----------------------------------------------------------------------- */

typedef struct term_list {
    const tarry_curve_term *terms;
    size_t n;
} term_list;

static double add_terms(void *context, double x) {
    const term_list *list = context;
    double sum = 0;
    for (size_t i = 0; i < list->n; i++) {
        const double at = x - list->terms[i].shift;
        sum += list->terms[i].factor * tarry_curve_value(list->terms[i].curve, at, at);
    }
    return sum;
}

int tarry_curve_sum(const tarry_curve_term *terms, size_t n, double end, double tolerance,
                    tarry_curve *out, tarry_error *error) {
    term_list list = {terms, n};
    size_t n_breaks = 0, k = 0;
    double last = 0;
    for (size_t i = 0; i < n; i++) {
        n_breaks += terms[i].curve->n_breaks;
        if (terms[i].curve->n > 0)
            last = fmax(last, terms[i].shift + tarry_curve_end(terms[i].curve));
    }
    end = fmin(end, last);
    if (!(end > 0))
        return 0;
    double *breaks = tarry_calloc(n_breaks, sizeof *breaks);
    if (breaks == NULL)
        return tarry_fail_memory(error, "a function of age");
    for (size_t i = 0; i < n; i++)
        for (size_t j = 0; j < terms[i].curve->n_breaks; j++)
            breaks[k++] = terms[i].shift + terms[i].curve->breaks[j];
    const int code = tarry_curve_init(out, end, breaks, n_breaks, tolerance, add_terms, &list,
                                      error);
    free(breaks);
    return code;
}

/* The first of the curve's bounds above x, or its end. */
static double bound_after(const tarry_curve *curve, double x) {
    size_t low = 0, high = curve->n;
    while (low < high) {
        const size_t middle = low + (high - low) / 2;
        if (curve->bounds[middle] > x)
            high = middle;
        else
            low = middle + 1;
    }
    return curve->bounds[low];
}

/* The last of the curve's bounds below x, or 0. */
static double bound_before(const tarry_curve *curve, double x) {
    size_t low = 0, high = curve->n;
    while (low < high) {
        const size_t middle = low + (high - low + 1) / 2;
        if (curve->bounds[middle] < x)
            low = middle;
        else
            high = middle - 1;
    }
    return curve->bounds[low];
}

double tarry_curve_product(const tarry_curve *one, const tarry_curve *other, double shift, int sign,
                           double from, double to) {
    const double end = tarry_curve_end(other);
    double sum = 0;
    if (one->n == 0 || other->n == 0)
        return 0;
    from = fmax(fmax(from, 0), sign > 0 ? -shift : shift - end);
    to = fmin(fmin(to, tarry_curve_end(one)), sign > 0 ? end - shift : shift);
    while (from < to) {
        const double y = shift + sign * from; /* where `other` is looked at */
        double next = fmin(to, bound_after(one, from));
        if (sign > 0)
            next = fmin(next, bound_after(other, y) - shift);
        else
            next = fmin(next, shift - bound_before(other, y));
        if (!(next > from)) /* rounding: the bound is where we are */
            next = fmin(to, from + 1e-15 * fmax(fabs(to), fabs(shift)));
        if (!(next > from))
            break;
        const double half = 0.5 * (next - from), middle = 0.5 * (next + from);
        for (int i = 0; i < TARRY_GAUSS; i++) {
            const double x = middle + half * tarry_gauss_node[i], at = shift + sign * x;
            sum += half * tarry_gauss_weight[i] * tarry_curve_value(one, x, x) *
                   tarry_curve_value(other, at, at);
        }
        from = next;
    }
    return sum;
}
