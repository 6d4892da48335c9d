/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Are frames missing where a signal is dark? What stands beside a gap is compared with all other
 * values by ranks. Values of one cell are alike, so that the test is too sure of itself: the reader
 * of its result asks for a clear difference, too. */
#include "study/data.h"

#include "base/error.h"
#include "base/memory.h"

#include <math.h>
#include <stdlib.h>

enum { MOST_VALUES = 1000000 }; /* others than those beside gaps are thinned out to so many */

typedef struct ranked {
    double value;
    bool beside;
} ranked;

static int by_value(const void *one, const void *other) {
    const double a = ((const ranked *)one)->value, b = ((const ranked *)other)->value;
    return (a > b) - (a < b);
}

typedef struct gathering {
    ranked *items; /* NULL: they are only counted */
    size_t n, n_other, step;
} gathering;

static void take(gathering *g, double value, bool beside) {
    if (!beside && g->n_other++ % g->step != 0)
        return;
    if (g->items != NULL)
        g->items[g->n] = (ranked){value, beside};
    g->n++;
}

/* Values of one cell; one is beside a gap where the frame before or after it is missing. */
static void gather_cell(gathering *g, const tarry_data_frames *frames, const double *values,
                        size_t from, size_t to) {
    size_t first, last;
    if (!tarry_data_known(frames, values, from, to, &first, &last))
        return;
    size_t held = first; /* the known value before */
    bool behind_gap = false;
    for (size_t i = first + 1; i <= last; i++) {
        if (isnan(values[frames->rows[i]]))
            continue;
        const bool gap = frames->frame[frames->rows[i]] != frames->frame[frames->rows[held]] + 1;
        take(g, values[frames->rows[held]], behind_gap || gap);
        held = i;
        behind_gap = gap;
    }
    take(g, values[frames->rows[held]], behind_gap);
}

static void gather(gathering *g, const tarry_data_frames *frames, const double *values) {
    for (size_t c = 0; c < frames->n_cells; c++)
        gather_cell(g, frames, values, frames->cell_at[c], frames->cell_at[c + 1]);
}

static void compare(ranked *items, size_t n, tarry_gap_test *test) {
    double rank_sum = 0.0, ties = 0.0, beside = 0.0;
    qsort(items, n, sizeof *items, by_value);
    for (size_t i = 0, j; i < n; i = j) {
        double here = 0.0;
        for (j = i; j < n && items[j].value <= items[i].value; j++)
            here += items[j].beside;
        const double size = (double)(j - i);
        rank_sum += here * ((double)i + 0.5 * (size + 1.0));
        ties += size * (size * size - 1.0);
        beside += here;
    }
    const double all = (double)n, other = all - beside;
    const double above = rank_sum - 0.5 * beside * (beside + 1.0); /* U of those beside gaps */
    const double variance = beside * other / 12.0 * (all + 1.0 - ties / (all * (all - 1.0)));
    *test = (tarry_gap_test){.n_beside = beside,
                             .n_other = other,
                             .below = 1.0 - above / (beside * other),
                             .z = (above - 0.5 * beside * other) / sqrt(variance)};
}

int tarry_data_gap_test(const tarry_data_frames *frames, const double *values, tarry_gap_test *test,
                        tarry_error *error) {
    gathering g = {.step = 1};
    gather(&g, frames, values);
    g.step = g.n_other / MOST_VALUES + 1;
    g.items = tarry_calloc(g.n, sizeof *g.items);
    if (g.items == NULL)
        return tarry_fail_memory(error, "the test of gaps");
    g.n = g.n_other = 0;
    gather(&g, frames, values);
    compare(g.items, g.n, test);
    free(g.items);
    return TARRY_OK;
}
