/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "exact/chain.h"

#include "base/error.h"
#include "base/matrix.h"
#include "base/memory.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

typedef struct workspace {
    gsl_matrix *generator, *exponential, *room;
    double *next;
} workspace;

static void release(workspace *w) {
    gsl_matrix_free(w->generator);
    gsl_matrix_free(w->exponential);
    gsl_matrix_free(w->room);
    free(w->next);
}

static int make_workspace(workspace *w, size_t n, tarry_error *error) {
    *w = (workspace){tarry_matrix_new(n, n), tarry_matrix_new(n, n), tarry_matrix_new(n, n),
                     tarry_calloc(n, sizeof(double))};
    if (w->generator == NULL || w->exponential == NULL || w->room == NULL || w->next == NULL)
        return tarry_fail_memory(error, "the states of a promoter");
    return 0;
}

/* p exp(generator length), made to add up to 1 again. */
static int move_on(const tarry_exact_gene *gene, size_t regime, double length, double *p,
                   workspace *w, tarry_error *error) {
    const size_t n = gene->n_states;
    tarry_exact_generator(gene, regime, w->generator->data);
    if (tarry_matrix_exponential(w->generator, length, w->exponential, w->room))
        return tarry_fail(error, TARRY_NUMERIC, "the exponential of a generator failed");
    double sum = 0;
    for (size_t j = 0; j < n; j++) {
        w->next[j] = 0;
        for (size_t i = 0; i < n; i++)
            w->next[j] += p[i] * gsl_matrix_get(w->exponential, i, j);
        sum += w->next[j];
    }
    if (!(fabs(sum - 1) < 1e-6))
        return tarry_fail(error, TARRY_NUMERIC, "the exponential of a generator is not exact");
    for (size_t j = 0; j < n; j++)
        p[j] = w->next[j] / sum;
    return 0;
}

int tarry_exact_begin_regimes(tarry_exact_gene *gene, tarry_error *error) {
    const size_t n = gene->n_states;
    workspace w;
    int code = make_workspace(&w, n, error);
    memcpy(gene->regimes[0].begin, gene->start, n * sizeof(double));
    for (size_t i = 1; code == 0 && i < gene->n_regimes; i++) {
        memcpy(gene->regimes[i].begin, gene->regimes[i - 1].begin, n * sizeof(double));
        code = move_on(gene, i - 1, gene->regimes[i].from - gene->regimes[i - 1].from,
                       gene->regimes[i].begin, &w, error);
    }
    release(&w);
    return code;
}

int tarry_exact_states(const tarry_exact_gene *gene, double time, double *p, tarry_error *error) {
    const size_t n = gene->n_states, regime = tarry_exact_regime_before(gene, time);
    const double length = time - gene->regimes[regime].from;
    workspace w = {0};
    int code = 0;
    memcpy(p, gene->regimes[regime].begin, n * sizeof *p);
    if (length > 0)
        code = make_workspace(&w, n, error);
    if (code == 0 && length > 0)
        code = move_on(gene, regime, length, p, &w, error);
    release(&w);
    return code;
}

size_t tarry_exact_regime_before(const tarry_exact_gene *gene, double time) {
    size_t i = gene->n_regimes - 1;
    while (i > 0 && !(gene->regimes[i].from < time))
        i--;
    return i;
}

double tarry_exact_highest_rate(const tarry_exact_gene *gene) {
    double most = 0;
    for (size_t k = 0; k < gene->n_regimes; k++)
        for (size_t i = 0; i < gene->n_states; i++) {
            double sum = 0;
            for (size_t j = 0; j < gene->n_states; j++)
                sum += gene->regimes[k].jump[i * gene->n_states + j];
            most = fmax(most, sum);
        }
    return most * gene->n_copies;
}
