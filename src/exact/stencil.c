/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "exact/stencil.h"

#include "base/error.h"
#include "base/memory.h"

#include <stdlib.h>
#include <string.h>

static void eliminate(tarry_stencil *s) {
    const size_t n = s->n_states;
    memcpy(s->meets, s->moves, n * n * sizeof *s->meets);
    for (size_t p = 0; p < n; p++)
        for (size_t q = p + 1; q < n; q++)
            for (size_t c = p + 1; s->meets[q * n + p] && c < n; c++)
                s->meets[q * n + c] = s->meets[q * n + c] || s->meets[p * n + c];
}

/* The columns that row p meets from p on, and the right-hand side after the last. */
static size_t list_runs(const tarry_stencil *s, size_t p, tarry_stencil_run *runs) {
    const size_t n = s->n_states;
    size_t k = 0;
    for (size_t c = p; c <= n; c++) {
        if (c < n && !s->meets[p * n + c])
            continue;
        if (k > 0 && runs[k - 1].to == c)
            runs[k - 1].to = c + 1;
        else
            runs[k++] = (tarry_stencil_run){c, c + 1};
    }
    return k;
}

static void list(tarry_stencil *s) {
    const size_t n = s->n_states;
    size_t n_rows = 0, n_runs = 0;
    for (size_t p = 0; p < n; p++) {
        s->row_starts[p] = n_rows;
        s->run_starts[p] = n_runs;
        for (size_t q = p; q < n; q++)
            if (s->meets[q * n + p])
                s->rows[n_rows++] = q;
        n_runs += list_runs(s, p, &s->runs[n_runs]);
    }
    s->row_starts[n] = n_rows;
    s->run_starts[n] = n_runs;
}

int tarry_stencil_init(tarry_stencil *s, size_t n_states, tarry_error *error) {
    *s = (tarry_stencil){.n_states = n_states,
                         .moves = tarry_calloc(n_states, n_states * sizeof(bool)),
                         .meets = tarry_calloc(n_states, n_states * sizeof(bool)),
                         .rows = tarry_calloc(n_states, n_states * sizeof(size_t)),
                         .row_starts = tarry_calloc(n_states + 1, sizeof(size_t)),
                         .runs = tarry_calloc(n_states + 1, n_states * sizeof(tarry_stencil_run)),
                         .run_starts = tarry_calloc(n_states + 1, sizeof(size_t))};
    if (!s->moves || !s->meets || !s->rows || !s->row_starts || !s->runs || !s->run_starts) {
        tarry_stencil_release(s);
        return tarry_fail_memory(error, "the equations of a promoter");
    }
    for (size_t p = 0; p < n_states; p++)
        s->moves[p * n_states + p] = true;
    eliminate(s);
    list(s);
    return 0;
}

void tarry_stencil_release(tarry_stencil *s) {
    free(s->moves);
    free(s->meets);
    free(s->rows);
    free(s->row_starts);
    free(s->runs);
    free(s->run_starts);
    *s = (tarry_stencil){0};
}

void tarry_stencil_cover(tarry_stencil *s, const double *quiet, const double *jump) {
    const size_t size = s->n_states * s->n_states;
    bool more = false;
    for (size_t i = 0; i < size; i++)
        if (!s->moves[i] && (quiet[i] != 0 || jump[i] != 0))
            s->moves[i] = more = true;
    if (!more)
        return;
    eliminate(s);
    list(s);
}
