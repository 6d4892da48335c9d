/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "same_cells.h"

#include "engine/cell.h"
#include "model/model.h"
#include "plain_loop.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>

typedef struct comparison {
    const tarry_network *network;
    tarry_engine *engine;
    tarry_cell *cell;
    tarry_record fast, plain;
    char *where;
    double n_firings;
} comparison;

/* One array of both records; says where it differs. */
static int differs(comparison *c, const char *what, const void *one, const void *other, size_t n,
                   size_t size) {
    const char *a = one, *b = other;
    for (size_t i = 0; i < n; i++) {
        if (memcmp(a + i * size, b + i * size, size) == 0)
            continue;
        double x = 0, y = 0;
        memcpy(&x, a + i * size, size < sizeof x ? size : sizeof x);
        memcpy(&y, b + i * size, size < sizeof y ? size : sizeof y);
        int64_t k, l;
        memcpy(&k, &x, sizeof k);
        memcpy(&l, &y, sizeof l);
        snprintf(c->where, SAME_CELLS_TEXT,
                 "cell %lld: %s[%zu] of %zu is %.17g (%lld), plainly %.17g (%lld)",
                 (long long)c->fast.cell, what, i, n, x, (long long)k, y, (long long)l);
        return 1;
    }
    return 0;
}

static int records_differ(comparison *c) {
    const tarry_network *network = c->network;
    const tarry_run_plan *run = &network->run;
    const tarry_record *a = &c->fast, *b = &c->plain;
    const size_t n_marks = a->n_marks < b->n_marks ? a->n_marks : b->n_marks;
    const size_t n_bins = a->lag_bins ? (size_t)network->n_lags * TARRY_LAG_BINS : 0;
#define DIFFERS(name, n) differs(c, #name, a->name, b->name, n, sizeof *a->name)
    return differs(c, "cell", &a->cell, &b->cell, 1, sizeof a->cell) || DIFFERS(marks, n_marks) ||
           differs(c, "n_marks", &a->n_marks, &b->n_marks, 1, sizeof a->n_marks) ||
           differs(c, "end", &a->end, &b->end, 1, sizeof a->end) ||
           DIFFERS(firings, network->n_reactions) || DIFFERS(completions, network->n_lags) ||
           DIFFERS(skipped, network->n_lags) || DIFFERS(status, network->n_tracks) ||
           DIFFERS(counts, (size_t)(run->n_spans + 1) * network->n_tracks) ||
           DIFFERS(lags, (size_t)network->n_lags * run->n_spans) || DIFFERS(lag_bins, n_bins) ||
           differs(c, "ignored", &a->ignored, &b->ignored, 1, sizeof a->ignored) ||
           DIFFERS(firsts, (size_t)network->n_responses * network->n_firsts) ||
           DIFFERS(under_way, (size_t)network->n_responses * network->n_firsts) ||
           DIFFERS(snapshots, (size_t)network->n_channels * run->n_snapshots) ||
           DIFFERS(frames, (size_t)a->n_recorded * run->n_frames);
#undef DIFFERS
}

static same_cells compare_one(comparison *c, int64_t number) {
    tarry_error fast = {0}, plain = {0};
    const int fast_code = tarry_cell_run(c->cell, number, &c->fast, &fast);
    const int plain_code = plain_cell_run(c->network, number, &c->plain, &plain);
    if (fast_code != plain_code) {
        snprintf(c->where, SAME_CELLS_TEXT, "cell %lld: \"%.200s\", plainly \"%.200s\"",
                 (long long)number, fast.message, plain.message);
        return CELLS_DIFFER;
    }
    if (fast_code) {
        snprintf(c->where, SAME_CELLS_TEXT, "%.300s", fast.message);
        return CELLS_NONE;
    }
    for (uint32_t i = 0; i < c->network->n_reactions; i++)
        c->n_firings += (double)c->plain.firings[i];
    return records_differ(c) ? CELLS_DIFFER : CELLS_SAME;
}

static same_cells compare_all(comparison *c, int64_t n_cells) {
    tarry_error error = {0};
    same_cells result = CELLS_NONE;
    if (tarry_engine_new(c->network, "direct", &c->engine, &error) ||
        tarry_cell_new(c->engine, &c->cell, &error) ||
        tarry_record_init(&c->fast, c->network, &error) ||
        tarry_record_init(&c->plain, c->network, &error)) {
        snprintf(c->where, SAME_CELLS_TEXT, "%.300s", error.message);
    } else {
        result = CELLS_SAME;
        for (int64_t i = 0; i < n_cells && result == CELLS_SAME; i++)
            result = compare_one(c, i);
    }
    tarry_record_release(&c->fast);
    tarry_record_release(&c->plain);
    tarry_cell_free(c->cell);
    tarry_engine_free(c->engine);
    return result;
}

same_cells compare_cells(const tarry_network *network, int64_t n_cells,
                         char where[SAME_CELLS_TEXT]) {
    comparison c = {.network = network, .where = where};
    where[0] = '\0';
    return compare_all(&c, n_cells);
}

same_cells compare_text(const char *text, int64_t n_cells, double *n_firings,
                        char where[SAME_CELLS_TEXT]) {
    tarry_model *model = NULL;
    tarry_error error = {0};
    where[0] = '\0';
    if (tarry_model_read_text(text, strlen(text), "random.yaml", NULL, 0, &model, &error)) {
        tarry_error_text(&error, where, SAME_CELLS_TEXT);
        return CELLS_NONE;
    }
    comparison c = {.network = &model->network, .where = where};
    const same_cells result = compare_all(&c, n_cells);
    if (n_firings)
        *n_firings = c.n_firings;
    tarry_model_free(model);
    return result;
}
