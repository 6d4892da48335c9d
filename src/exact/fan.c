/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "exact/fan.h"

#include "base/error.h"
#include "base/memory.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

enum { NODES = TARRY_FAN_NODES, INNER = TARRY_RADAU_MOST };

static double legendre(size_t n, double x) {
    double before = 1, now = x;
    for (size_t k = 1; k < n; k++) {
        const double a = (double)k, next = ((2 * a + 1) * x * now - a * before) / (a + 1);
        before = now;
        now = next;
    }
    return n == 0 ? 1 : now;
}

/* Weight of a node for integrals over a piece of length 1 (Abramowitz & Stegun 1964, 25.4.31,
 * mirrored). */
static double node_weight(const tarry_radau *rule, size_t i) {
    const double x = 2 * rule->node[i] - 1, p = INNER * legendre(INNER - 1, x);
    return 0.5 * (1 + x) / (p * p);
}

void tarry_fan_begin(tarry_fan *fan, size_t n) {
    fan->n = n;
    fan->n_pieces = 0;
    if (fan->rule.n > 0)
        return;
    tarry_radau_find(&fan->rule, INNER);
    for (size_t m = 0; m < 3; m++)
        for (size_t i = 0; i < INNER; i++) {
            const size_t degree = INNER - 3 + m;
            fan->tests[m][i] = (2 * (double)degree + 1) * node_weight(&fan->rule, i) *
                               legendre(degree, 2 * fan->rule.node[i] - 1);
        }
}

void tarry_fan_release(tarry_fan *fan) {
    free(fan->bounds);
    free(fan->re);
    free(fan->im);
    *fan = (tarry_fan){0};
}

double tarry_fan_end(const tarry_fan *fan) {
    return fan->n_pieces > 0 ? fan->bounds[fan->n_pieces] : 0;
}

int tarry_fan_add(tarry_fan *fan, double to, double **re, double **im, tarry_error *error) {
    const size_t piece = fan->n_pieces, size = NODES * fan->n;
    if (tarry_grow((void **)&fan->bounds, &fan->bounds_capacity, piece + 2, sizeof *fan->bounds) ||
        tarry_grow((void **)&fan->re, &fan->re_capacity, (piece + 1) * size, sizeof *fan->re) ||
        tarry_grow((void **)&fan->im, &fan->im_capacity, (piece + 1) * size, sizeof *fan->im))
        return tarry_fail_memory(error, "functions of age");
    fan->bounds[0] = 0;
    fan->bounds[++fan->n_pieces] = to;
    *re = fan->re + piece * size;
    *im = fan->im + piece * size;
    return 0;
}

double tarry_fan_rest(const tarry_fan *fan, const double *values, size_t stride) {
    double most = 0;
    for (size_t m = 0; m < 3; m++) {
        double sum = 0;
        for (size_t i = 0; i < INNER; i++)
            sum += fan->tests[m][i] * values[i * stride];
        most = fmax(most, fabs(sum));
    }
    return most;
}

/* The piece that holds x; at a bound, as far as rounding can tell, the one on the side of `inside`.
 */
static size_t find_piece(const tarry_fan *fan, double x, double inside) {
    const double close = 1e-14 * tarry_fan_end(fan);
    size_t low = 0, high = fan->n_pieces;
    while (high - low > 1) {
        const size_t middle = low + (high - low) / 2;
        const double bound = fan->bounds[middle];
        if (x < bound - close || (x <= bound + close && inside < bound))
            high = middle;
        else
            low = middle;
    }
    return low;
}

void tarry_fan_find(const tarry_fan *fan, double x, double inside, tarry_fan_place *place) {
    const double end = tarry_fan_end(fan), close = 1e-14 * end;
    *place = (tarry_fan_place){.beyond = !(x >= 0) || x > end + close ||
                                         (x >= end - close && !(inside < end))};
    if (place->beyond)
        return;
    const size_t low = find_piece(fan, x, inside);
    const double from = fan->bounds[low];
    const double t = fmin(fmax((x - from) / (fan->bounds[low + 1] - from), 0), 1);
    double sum = 0;
    place->piece = low;
    for (size_t i = 0; i < NODES; i++) {
        const double off = t - (i > 0 ? fan->rule.node[i - 1] : 0);
        if (off == 0) {
            memset(place->weight, 0, sizeof place->weight);
            place->weight[i] = 1;
            return;
        }
        place->weight[i] = fan->rule.weight[i] / off;
        sum += place->weight[i];
    }
    for (size_t i = 0; i < NODES; i++)
        place->weight[i] /= sum;
}

void tarry_fan_put(const tarry_fan *fan, const tarry_fan_place *place, size_t from, size_t to,
                   double *restrict re, double *restrict im) {
    const size_t n = to - from;
    memset(re, 0, n * sizeof *re);
    memset(im, 0, n * sizeof *im);
    for (size_t i = 0; i < NODES && !place->beyond; i++) {
        const double weight = place->weight[i];
        const double *restrict x = fan->re + (place->piece * NODES + i) * fan->n + from;
        const double *restrict y = fan->im + (place->piece * NODES + i) * fan->n + from;
        for (size_t j = 0; j < n; j++) {
            re[j] += weight * x[j];
            im[j] += weight * y[j];
        }
    }
}

double tarry_fan_integral(const tarry_fan *fan, size_t j) {
    double sum = 0;
    for (size_t piece = 0; piece < fan->n_pieces; piece++)
        for (size_t i = 0; i < INNER; i++)
            sum += (fan->bounds[piece + 1] - fan->bounds[piece]) * node_weight(&fan->rule, i) *
                   fan->re[(piece * NODES + i + 1) * fan->n + j];
    return sum;
}
