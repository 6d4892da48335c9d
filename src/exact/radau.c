/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "exact/radau.h"

#include <math.h>
#include <stdbool.h>

/* Legendre polynomials P_n(x) - P_(n-1)(x): 0 at the nodes 2c - 1. */
static double node_function(size_t n, double x) {
    double before = 1, now = x;
    for (size_t k = 1; k < n; k++) {
        const double a = (double)k;
        const double next = ((2 * a + 1) * x * now - a * before) / (a + 1);
        before = now;
        now = next;
    }
    return now - before;
}

static double find_node(size_t n, double low, double high) {
    const bool rises = node_function(n, low) < 0;
    for (int i = 0; i < 100; i++) {
        const double middle = 0.5 * (low + high);
        if ((node_function(n, middle) < 0) == rises)
            low = middle;
        else
            high = middle;
    }
    return 0.5 * (low + high);
}

static void find_nodes(tarry_radau *r) {
    enum { GRID = 1000 };
    size_t n = 0;
    for (int i = 0; i < GRID - 1 && n < r->n - 1; i++) {
        const double a = 2.0 * i / GRID - 1, b = 2.0 * (i + 1) / GRID - 1;
        if ((node_function(r->n, a) < 0) != (node_function(r->n, b) < 0))
            r->node[n++] = 0.5 * (1 + find_node(r->n, a, b));
    }
    r->node[r->n - 1] = 1;
}

/* Of the Legendre polynomial of degree n on [0, 1]: the middle binomial coefficient of 2n. */
static double leading(size_t n) {
    double product = 1;
    for (size_t k = 1; k <= n; k++)
        product *= (double)(n + k) / (double)k;
    return product;
}

/* Derivatives of Lagrange's polynomials by barycentric weights (Berrut & Trefethen 2004, SIAM Rev.
 * 46:501). */
void tarry_radau_find(tarry_radau *r, size_t n) {
    double x[TARRY_RADAU_MOST + 1] = {0};
    r->n = n;
    r->scale[0] = 1 / leading(n - 1);
    r->scale[1] = 1 / leading(n);
    find_nodes(r);
    for (size_t i = 0; i < n; i++)
        x[i + 1] = r->node[i];
    for (size_t i = 0; i <= n; i++) {
        r->weight[i] = 1;
        for (size_t k = 0; k <= n; k++)
            if (k != i)
                r->weight[i] /= x[i] - x[k];
    }
    for (size_t i = 1; i <= n; i++) {
        double sum = 0;
        for (size_t k = 0; k <= n; k++) {
            if (k == i)
                continue;
            const double d = r->weight[k] / r->weight[i] / (x[i] - x[k]);
            sum += d;
            if (k == 0)
                r->begin[i - 1] = -d;
            else
                r->derive[i - 1][k - 1] = d;
        }
        r->derive[i - 1][i - 1] = -sum;
    }
}

/* Divided differences of all values, and of all but the first: the weights of the nodes by
 * themselves lack the factor of their distance from 0. */
double tarry_radau_rest(const tarry_radau *r, const double *values) {
    double last = r->weight[0] * values[0], before = 0;
    for (size_t i = 0; i < r->n; i++) {
        last += r->weight[i + 1] * values[i + 1];
        before += r->weight[i + 1] * r->node[i] * values[i + 1];
    }
    return fmax(fabs(last * r->scale[1]), 0.1 * fabs(before * r->scale[0]));
}

double tarry_radau_rest_of_decay(const tarry_radau *r, double x) {
    double product = 1;
    for (size_t k = 1; k <= r->n; k++)
        product *= x / (double)(r->n + k);
    return fmin(product, 1);
}
