/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "exact/arc.h"

#include "base/error.h"
#include "base/memory.h"

#include <gsl/gsl_math.h>
#include <math.h>
#include <stdlib.h>

enum { NODES = TARRY_ARC_NODES, TAIL = 3 };

static const double turns = 6; /* radians that a panel may turn by */
static const double gone = 10; /* spreads: at this angle times 1/spread a smooth law's G is gone */

static int add(tarry_arc *arc, double from, double to, size_t parts, tarry_error *error) {
    if (tarry_grow((void **)&arc->bounds, &arc->capacity, arc->n_panels + parts + 1,
                   sizeof *arc->bounds) != 0)
        return tarry_fail_memory(error, "a law of counts");
    arc->bounds[0] = 0;
    for (size_t i = 1; i <= parts; i++)
        arc->bounds[++arc->n_panels] = from + (to - from) * (double)i / (double)parts;
    return 0;
}

int tarry_arc_init(tarry_arc *arc, double most, double spread, size_t length, double fineness,
                   tarry_error *error) {
    const double finest = fmax(turns / most, 2 * M_PI / (double)length) / fineness;
    int k = 0;
    while (ldexp(M_PI, -k) > finest)
        k++;
    int code = add(arc, 0, ldexp(M_PI, -k), 1, error);
    for (; code == 0 && k > 0; k--) {
        const double from = ldexp(M_PI, -k);
        const double turned = from * spread < gone ? from * most / turns : 1;
        code = add(arc, from, 2 * from, (size_t)ceil(fmax(turned, 1) * fineness), error);
    }
    return code;
}

void tarry_arc_release(tarry_arc *arc) {
    free(arc->bounds);
    *arc = (tarry_arc){0};
}

size_t tarry_arc_n(const tarry_arc *arc) {
    return arc->n_panels * NODES;
}

double tarry_arc_angle(const tarry_arc *arc, size_t i) {
    const double from = arc->bounds[i / NODES], to = arc->bounds[i / NODES + 1];
    return from + 0.5 * (to - from) * (1 - cos(M_PI * ((double)(i % NODES) + 0.5) / NODES));
}

/* Chebyshev coefficients from the values at the nodes. */
static void expand(const double *values, double *series) {
    for (int k = 0; k < NODES; k++) {
        double sum = 0;
        for (int j = 0; j < NODES; j++) /* nodes ascend: -cos */
            sum += values[j] * cos(M_PI * k * (NODES - j - 0.5) / NODES);
        series[k] = sum * (k == 0 ? 1.0 : 2.0) / NODES;
    }
}

static double add_up(const double *series, double x) {
    double one = 0, two = 0;
    for (int k = NODES - 1; k > 0; k--) {
        const double next = 2 * x * one - two + series[k];
        two = one;
        one = next;
    }
    return x * one - two + series[0];
}

void tarry_arc_spread(const tarry_arc *arc, const double *node_re, const double *node_im,
                      size_t length, double *re, double *im, double *rest) {
    double x[NODES], y[NODES];
    const size_t half = length / 2;
    size_t k = 0;
    *rest = 0;
    for (size_t p = 0; p < arc->n_panels; p++) {
        const double from = arc->bounds[p], to = arc->bounds[p + 1];
        expand(node_re + p * NODES, x);
        expand(node_im + p * NODES, y);
        for (int i = NODES - TAIL; i < NODES; i++)
            *rest = fmax(*rest, fabs(x[i]) + fabs(y[i]));
        for (; k <= half; k++) {
            const double angle = 2 * M_PI * (double)k / (double)length;
            const double u = 2 * (angle - from) / (to - from) - 1;
            if (u > 1 && p + 1 < arc->n_panels)
                break;
            re[k] = add_up(x, fmin(u, 1));
            im[k] = add_up(y, fmin(u, 1));
        }
    }
}
