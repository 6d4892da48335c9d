/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "report/spread.h"

#include "base/error.h"
#include "base/memory.h"
#include "report/lines.h"
#include "report/quantities.h"
#include "report/rounding.h"

#include <gsl/gsl_sort.h>
#include <gsl/gsl_statistics_double.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

/* Columns on the terminal. */
enum { LABEL = 35, NUMBER = 9, END = 22, END_NAME = 18 };

static const char *text_of(const tarry_table *table, size_t row, int column) {
    return tarry_table_text(table, row, column);
}

static bool same_figure(const tarry_table *table, size_t one, size_t other) {
    return !strcmp(text_of(table, one, TARRY_QUANTITY_NAME),
                   text_of(table, other, TARRY_QUANTITY_NAME)) &&
           !strcmp(text_of(table, one, TARRY_QUANTITY_WINDOW),
                   text_of(table, other, TARRY_QUANTITY_WINDOW));
}

/* ---- numbers -------------------------------------------------------------------------------- */

static void meet(tarry_spread_end *end, double value, size_t row, bool beyond) {
    if (end->n == 0 || beyond)
        *end = (tarry_spread_end){value, row, 1};
    else if (value == end->value)
        end->n++;
}

/* The values of all rows with the figure of the item's, and the ends. */
static void gather(tarry_spread_item *item, const tarry_table *table, double *values) {
    for (size_t i = 0; i < tarry_table_n_rows(table); i++) {
        const double value = tarry_table_number(table, i, TARRY_QUANTITY_VALUE);
        if (isnan(value) || !same_figure(table, item->row, i))
            continue;
        values[item->n++] = value;
        meet(&item->least, value, i, value < item->least.value);
        meet(&item->most, value, i, value > item->most.value);
    }
}

static double quantile(const double *values, size_t n, double share) {
    return n ? gsl_stats_quantile_from_sorted_data(values, 1, n, share) : NAN;
}

static tarry_spread_item item_of(const tarry_table *table, size_t row, double *values) {
    tarry_spread_item item = {.row = row, .least.value = NAN, .most.value = NAN};
    gather(&item, table, values);
    gsl_sort(values, 1, item.n);
    item.median = quantile(values, item.n, 0.5);
    item.tenth = quantile(values, item.n, 0.1);
    item.nine_tenths = quantile(values, item.n, 0.9);
    return item;
}

int tarry_spread_init(tarry_spread *spread, const tarry_table *table, const tarry_groups *groups,
                      tarry_error *error) {
    const size_t n = groups->starts[1] - groups->starts[0];
    const size_t *rows = groups->rows + groups->starts[0];
    double *values = tarry_calloc(tarry_table_n_rows(table) + 1, sizeof *values);
    memset(spread, 0, sizeof *spread);
    spread->items = tarry_calloc(n, sizeof *spread->items);
    const bool there = values && spread->items;
    for (size_t i = 0; there && i < n; i++) {
        spread->items[spread->n++] = item_of(table, rows[i], values);
        spread->several_windows = spread->several_windows ||
                                  strcmp(text_of(table, rows[i], TARRY_QUANTITY_WINDOW),
                                         text_of(table, rows[0], TARRY_QUANTITY_WINDOW)) != 0;
    }
    free(values);
    return there ? 0 : tarry_fail_memory(error, "the spread over genes");
}

void tarry_spread_release(tarry_spread *spread) {
    free(spread->items);
    memset(spread, 0, sizeof *spread);
}

bool tarry_spread_has_ends(const tarry_spread_item *item) {
    return item->least.value < item->most.value && (item->least.n == 1 || item->most.n == 1);
}

/* ---- on the terminal ------------------------------------------------------------------------ */

static void write_label(const tarry_table *table, size_t row, bool several_windows,
                        tarry_text *text) {
    char words[160];
    const char *unit = text_of(table, row, TARRY_QUANTITY_UNIT);
    const bool shown = *unit && strcmp(unit, "1") != 0;
    snprintf(words, sizeof words, "  %s%s%s%s%s%s", text_of(table, row, TARRY_QUANTITY_NAME),
             shown ? " [" : "", shown ? unit : "", shown ? "]" : "", several_windows ? ", " : "",
             several_windows ? text_of(table, row, TARRY_QUANTITY_WINDOW) : "");
    tarry_lines_left(text, words, LABEL);
}

static void write_line(const tarry_table *table, const tarry_spread *spread, size_t i,
                       tarry_text *text) {
    const tarry_spread_item *item = &spread->items[i];
    const double numbers[] = {item->median, item->tenth, item->nine_tenths, item->least.value,
                              item->most.value};
    char number[TARRY_ROUNDED];
    write_label(table, item->row, spread->several_windows, text);
    for (size_t j = 0; j < sizeof numbers / sizeof *numbers; j++) {
        tarry_round_plain(numbers[j], number);
        tarry_lines_right(text, number, NUMBER);
    }
    tarry_text_add(text, "\n", 1);
}

/* The name of the one, or how many share it. */
static void write_end(const tarry_table *table, const tarry_spread_end *end, tarry_text *text) {
    char words[END_NAME + 4];
    const char *name = text_of(table, end->row, TARRY_QUANTITY_OF);
    if (end->n == 1)
        snprintf(words, sizeof words, "%.*s%s", END_NAME, name,
                 strlen(name) > END_NAME ? "..." : "");
    else
        snprintf(words, sizeof words, "%zu alike", end->n);
    tarry_lines_right(text, words, END);
}

static void write_ends(const tarry_table *table, const tarry_spread *spread, tarry_text *text) {
    bool begun = false;
    for (size_t i = 0; i < spread->n; i++) {
        const tarry_spread_item *item = &spread->items[i];
        if (!tarry_spread_has_ends(item))
            continue;
        if (!begun) {
            char head[80];
            snprintf(head, sizeof head, "%ss at the ends",
                     tarry_table_column_name(table, TARRY_QUANTITY_OF));
            head[0] = (char)(head[0] - 'a' + 'A');
            tarry_text_add(text, "\n", 1);
            tarry_lines_left(text, head, LABEL);
            tarry_lines_right(text, "least", END);
            tarry_lines_right(text, "most", END);
            tarry_text_add(text, "\n", 1);
        }
        begun = true;
        write_label(table, item->row, spread->several_windows, text);
        write_end(table, &item->least, text);
        write_end(table, &item->most, text);
        tarry_text_add(text, "\n", 1);
    }
}

int tarry_spread_write(const tarry_table *table, const tarry_groups *groups, tarry_text *text,
                       tarry_error *error) {
    const char *of = tarry_table_column_name(table, TARRY_QUANTITY_OF);
    tarry_spread spread = {0};
    const int status = tarry_spread_init(&spread, table, groups, error);
    if (!status) {
        char head[80];
        snprintf(head, sizeof head, "Spread over %zu %ss", groups->n, of);
        tarry_text_add(text, "\n", 1);
        tarry_lines_left(text, head, LABEL);
        tarry_text_printf(text, "%9s%9s%9s%9s%9s\n", "median", "10 %", "90 %", "least", "most");
        for (size_t i = 0; i < spread.n; i++)
            write_line(table, &spread, i, text);
        write_ends(table, &spread, text);
        tarry_text_printf(text, "  (each %s by itself: %s.csv)\n", of, tarry_table_name(table));
    }
    tarry_spread_release(&spread);
    return status;
}
