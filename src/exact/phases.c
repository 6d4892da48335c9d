/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "exact/phases.h"

#include "base/error.h"
#include "base/matrix.h"

#include <math.h>
#include <string.h>

/* How many phases the law has; above the most where it has none. */
static size_t count(const tarry_law *law) {
    size_t n = 0;
    switch (law->kind) {
    case TARRY_LAW_EXPONENTIAL:
        return 1;
    case TARRY_LAW_ERLANG:
        return law->b <= TARRY_PHASES_MOST ? (size_t)law->b : TARRY_PHASES_MOST + 1;
    case TARRY_LAW_MIX:
    case TARRY_LAW_TOTAL:
        for (size_t i = 0; i < law->n && n <= TARRY_PHASES_MOST; i++)
            n += count(&law->parts[i]);
        return n;
    default:
        return TARRY_PHASES_MOST + 1;
    }
}

/* Fill from phase `at` on. `share`: the probability that the law begins in it at all, put into
 * `entry`. Returns the first phase that is free. */
static size_t fill(const tarry_law *law, tarry_phases *phases, size_t at, double share);

static size_t fill_steps(tarry_phases *phases, size_t at, size_t n_steps, double rate,
                         double share) {
    phases->entry[at] = share;
    for (size_t i = 0; i + 1 < n_steps; i++)
        phases->moves[(at + i) * phases->n + at + i + 1] = rate;
    phases->exit[at + n_steps - 1] = rate;
    return at + n_steps;
}

/* What would leave one part enters the next one. */
static void join(tarry_phases *phases, size_t from, size_t next, size_t to) {
    for (size_t i = from; i < next; i++) {
        for (size_t j = next; j < to; j++)
            phases->moves[i * phases->n + j] += phases->exit[i] * phases->entry[j];
        phases->exit[i] = 0;
    }
    for (size_t j = next; j < to; j++)
        phases->entry[j] = 0;
}

static size_t fill_total(const tarry_law *law, tarry_phases *phases, size_t at, double share) {
    size_t from = at, next = fill(&law->parts[0], phases, at, share);
    for (size_t i = 1; i < law->n; i++) {
        const size_t to = fill(&law->parts[i], phases, next, 1);
        join(phases, from, next, to);
        from = next;
        next = to;
    }
    return next;
}

static size_t fill(const tarry_law *law, tarry_phases *phases, size_t at, double share) {
    switch (law->kind) {
    case TARRY_LAW_ERLANG:
        return fill_steps(phases, at, (size_t)law->b, law->b / law->a, share);
    case TARRY_LAW_MIX:
        for (size_t i = 0; i < law->n; i++)
            at = fill(&law->parts[i], phases, at, share * law->weights[i]);
        return at;
    case TARRY_LAW_TOTAL:
        return fill_total(law, phases, at, share);
    default:
        return fill_steps(phases, at, 1, 1 / law->a, share);
    }
}

/* Time spent in each phase in the mean, from x (diag(out) - moves) = entry, made to add up to 1. */
static int meet(tarry_phases *phases, tarry_error *error) {
    const size_t n = phases->n;
    gsl_matrix *a = tarry_matrix_new(n, n);
    int status = 0;
    double sum = 0;
    if (a == NULL)
        status = tarry_fail_memory(error, "the phases of a delay");
    for (size_t i = 0; status == 0 && i < n; i++) {
        double out = phases->exit[i];
        for (size_t j = 0; j < n; j++) {
            out += phases->moves[i * n + j];
            gsl_matrix_set(a, j, i, -phases->moves[i * n + j]);
        }
        gsl_matrix_set(a, i, i, out);
        phases->met[i] = phases->entry[i];
    }
    if (status == 0 && tarry_matrix_solve(a, phases->met))
        status = tarry_fail(error, TARRY_NUMERIC, "the phases of a delay cannot be solved");
    for (size_t i = 0; i < n; i++)
        sum += phases->met[i];
    for (size_t i = 0; status == 0 && i < n; i++)
        phases->met[i] /= sum;
    gsl_matrix_free(a);
    return status;
}

int tarry_phases_read(const tarry_law *law, tarry_arena *arena, tarry_phases *phases, bool *is_made,
                      tarry_error *error) {
    const size_t n = count(law);
    *is_made = n <= TARRY_PHASES_MOST;
    if (!*is_made)
        return 0;
    *phases = (tarry_phases){.n = n,
                             .entry = tarry_arena_calloc(arena, n, sizeof(double)),
                             .moves = tarry_arena_calloc(arena, n, n * sizeof(double)),
                             .exit = tarry_arena_calloc(arena, n, sizeof(double)),
                             .met = tarry_arena_calloc(arena, n, sizeof(double))};
    if (!phases->entry || !phases->moves || !phases->exit || !phases->met)
        return tarry_fail_memory(error, "the phases of a delay");
    fill(law, phases, 0, 1);
    return meet(phases, error);
}
