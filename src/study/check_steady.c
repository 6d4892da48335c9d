/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Means when the record begins against the steady ones: a table, and warnings where they are far
 * apart. */

#include "study/check_page.h"

#include "base/error.h"
#include "model/analysis.h"

#include <math.h>
#include <stdio.h>

enum {
    MOST_TOLD = 10,      /* genes */
    MOST_FOR_REMEDY = 12 /* products for which a time to settle is sought */
};

static const double far_from_steady = 0.005; /* warned of */
static const double steady_enough = 0.001;   /* what a longer settle should reach */

static const char *short_number(double value, char out[TARRY_NUMBER_SIZE]) {
    tarry_number_short(value, 6, out);
    return out;
}

static void put_percent(tarry_page *page, double relative, size_t column) {
    char number[TARRY_NUMBER_SIZE];
    if (isnan(relative)) {
        tarry_sheet_cell(&page->sheet, column, "-");
    } else if (fabs(relative) < 5e-7) {
        tarry_sheet_cell(&page->sheet, column, "0 %%");
    } else {
        tarry_number_short(100 * relative, 2, number);
        tarry_sheet_cell(&page->sheet, column, "%s%s %%", relative > 0 ? "+" : "", number);
    }
}

static void put_distance(tarry_page *page, const tarry_distance *d) {
    char number[TARRY_NUMBER_SIZE];
    tarry_sheet_row(&page->sheet);
    tarry_sheet_cell(&page->sheet, 0, "%s", page->network->species[d->species].name);
    if (d->why) {
        tarry_sheet_cell(&page->sheet, 4, "cannot be worked out: %s", d->why);
        return;
    }
    tarry_sheet_cell(&page->sheet, 1, "%s", short_number(d->steady, number));
    tarry_sheet_cell(&page->sheet, 2, "%s", short_number(d->mean, number));
    put_percent(page, d->relative, 3);
}

/* ---- warnings ------------------------------------------------------------------------------- */

static bool is_far(const tarry_distance *d) {
    return !d->why && fabs(d->relative) > far_from_steady;
}

/* One gene's products, items[0 .. n), some of them far off: the one that is furthest off is named.
 */
static int note_gene(const tarry_network *network, const tarry_distance *items, size_t n,
                     size_t n_far, size_t n_like, tarry_notes *notes, tarry_error *error) {
    const tarry_distance *worst = items;
    for (size_t i = 1; i < n; i++)
        if (is_far(&items[i]) &&
            (!is_far(worst) || fabs(items[i].relative) > fabs(worst->relative)))
            worst = &items[i];
    char number[TARRY_NUMBER_SIZE], others[64] = "", like[64] = "";
    tarry_number_short(100 * fabs(worst->relative), 2, number);
    if (n_far > 1)
        snprintf(others, sizeof others, ", the furthest off of %zu products of its gene", n_far);
    if (n_like > 0)
        snprintf(like, sizeof like, "; the same holds of %zu gene%s after it", n_like,
                 n_like == 1 ? "" : "s");
    return tarry_notes_add(
        notes, network->species[worst->species].place, error,
        "when the record begins the mean of '%s' is %s %% %s its steady mean%s%s",
        network->species[worst->species].name, number, worst->relative < 0 ? "below" : "above",
        others, like);
}

/* How long to settle, where that takes little to find out. */
static int note_remedy(const tarry_network *network, const tarry_distances *distances,
                       tarry_notes *notes, tarry_error *error) {
    char number[TARRY_NUMBER_SIZE];
    double settle = 0;
    size_t n_unknown = 0;
    if (distances->n > MOST_FOR_REMEDY || distances->n_left_out > 0)
        return tarry_notes_add(notes, (tarry_place){0}, error,
                               "where a steady start is meant, settle for longer");
    tarry_error unsettled;
    const int code = tarry_analysis_settle(network, steady_enough, &settle, &n_unknown, &unsettled);
    if (code == TARRY_NUMERIC)
        return 0;
    if (code)
        return tarry_fail_memory(error, "the time to settle");
    tarry_number_short(1.05 * settle, 2, number); /* not below it, however it is rounded */
    return tarry_notes_add(notes, (tarry_place){0}, error,
                           "where a steady start is meant, settle for some %s %s: that brings "
                           "every mean%s within 0.1 %% of its steady value",
                           number, network->time_unit,
                           n_unknown > 0 ? " that can be worked out" : "");
}

/* The end of the gene whose items begin at `from`. */
static size_t end_of_gene(const tarry_distances *d, size_t from) {
    size_t to = from;
    while (to < d->n && d->items[to].gene == d->items[from].gene)
        to++;
    return to;
}

/* The next gene, from `to` on, is as far off in each of its products as the one before. */
static bool goes_on(const tarry_distances *d, size_t from, size_t to) {
    const size_t n = to - from;
    if (to == d->n || end_of_gene(d, to) - to != n)
        return false;
    for (size_t i = 0; i < n; i++)
        if (d->items[from + i].why != NULL || d->items[to + i].why != NULL ||
            !(d->items[from + i].relative == d->items[to + i].relative))
            return false;
    return true;
}

static int note_far(const tarry_network *network, const tarry_distances *distances,
                    tarry_notes *notes, tarry_error *error) {
    size_t n_genes = 0, from = 0;
    int code = 0;
    while (from < distances->n && !code) {
        const size_t first = from, n = end_of_gene(distances, from) - from;
        size_t n_far = 0, n_like = 0;
        for (size_t i = 0; i < n; i++)
            n_far += is_far(&distances->items[first + i]);
        for (; goes_on(distances, from, from + n); from += n)
            n_like++;
        from += n;
        if (n_far > 0 && n_genes++ < MOST_TOLD)
            code = note_gene(network, distances->items + first, n, n_far, n_like, notes, error);
    }
    if (!code && n_genes > MOST_TOLD)
        code = tarry_notes_add(notes, (tarry_place){0}, error,
                               "and %zu more genes whose means are not steady when the record "
                               "begins",
                               n_genes - MOST_TOLD);
    return code || n_genes == 0 ? code : note_remedy(network, distances, notes, error);
}

/* ---- the table ------------------------------------------------------------------------------ */

int tarry_page_distances(tarry_page *page, tarry_notes *notes, tarry_error *error) {
    tarry_arena arena = {0};
    tarry_distances d;
    int code = tarry_analysis_distances(page->network, page->network->run.settle, &arena, &d,
                                        error);
    if (!code && d.n + d.n_left_out > 0) {
        tarry_page_head(page, "Means when the record begins, against the steady state", -1);
        tarry_sheet_row(&page->sheet);
        tarry_sheet_cell(&page->sheet, 1, "steady");
        tarry_sheet_cell(&page->sheet, 2, "at 0 %s", page->network->time_unit);
        tarry_sheet_cell(&page->sheet, 3, "off by");
        page->sheet.right = 1u << 1 | 1u << 2 | 1u << 3;
        for (size_t i = 0; i < d.n && i < TARRY_CHECK_MOST; i++)
            put_distance(page, &d.items[i]);
        tarry_page_list(page, d.n < TARRY_CHECK_MOST ? d.n : TARRY_CHECK_MOST, d.n, "means");
        if (d.n_left_out > 0)
            tarry_text_printf(
                page->text, "  Not worked out for %zu genes: only the first %d that differ are.\n",
                d.n_left_out, TARRY_DISTANCES_MOST);
        code = note_far(page->network, &d, notes, error);
    }
    tarry_arena_release(&arena);
    return code;
}
