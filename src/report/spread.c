#include "report/spread.h"

#include "base/error.h"
#include "base/memory.h"
#include "report/lines.h"
#include "report/rounding.h"

#include <gsl/gsl_sort.h>
#include <gsl/gsl_statistics_double.h>
#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

enum {
    NAME,
    WINDOW,
    QUANTITY,
    UNIT,
    FIGURE_VALUE,
    LABEL = 35,
    NUMBER = 9,
    END = 22,
    END_NAME = 18
};

static bool same_figure(const tarry_table *table, size_t one, size_t other) {
    return !strcmp(tarry_table_text(table, one, QUANTITY),
                   tarry_table_text(table, other, QUANTITY)) &&
           !strcmp(tarry_table_text(table, one, WINDOW), tarry_table_text(table, other, WINDOW));
}

/* The values of all rows with the figure of `row`; returns how many. */
static size_t gather(const tarry_table *table, size_t row, double *values) {
    size_t n = 0;
    for (size_t i = 0; i < tarry_table_n_rows(table); i++) {
        const double value = tarry_table_number(table, i, FIGURE_VALUE);
        if (!isnan(value) && same_figure(table, row, i))
            values[n++] = value;
    }
    return n;
}

static void write_label(const tarry_table *table, size_t row, bool several_windows,
                        tarry_text *text) {
    char words[160];
    const char *unit = tarry_table_text(table, row, UNIT);
    const bool shown = *unit && strcmp(unit, "1") != 0;
    snprintf(words, sizeof words, "  %s%s%s%s%s%s", tarry_table_text(table, row, QUANTITY),
             shown ? " [" : "", shown ? unit : "", shown ? "]" : "", several_windows ? ", " : "",
             several_windows ? tarry_table_text(table, row, WINDOW) : "");
    tarry_lines_left(text, words, LABEL);
}

static void write_line(const tarry_table *table, size_t row, double *values, size_t n,
                       bool several_windows, tarry_text *text) {
    static const double shares[] = {0.5, 0.1, 0.9, 0, 1};
    char number[TARRY_ROUNDED];
    write_label(table, row, several_windows, text);
    gsl_sort(values, 1, n);
    for (size_t i = 0; i < sizeof shares / sizeof *shares; i++) {
        tarry_round_plain(n ? gsl_stats_quantile_from_sorted_data(values, 1, n, shares[i]) : NAN,
                          number);
        tarry_lines_right(text, number, NUMBER);
    }
    tarry_text_add(text, "\n", 1);
}

/* ---- who is at the ends -----------------------------------------------------------------------
 */

/* The genes whose figure is the least or the most of all. */
typedef struct spread_end {
    double value;
    size_t row; /* of the first of them */
    size_t n;
} spread_end;

static void meet(spread_end *end, double value, size_t row, bool beyond) {
    if (end->n == 0 || beyond)
        *end = (spread_end){value, row, 1};
    else if (value == end->value)
        end->n++;
}

static void find_ends(const tarry_table *table, size_t row, spread_end *least, spread_end *most) {
    for (size_t i = 0; i < tarry_table_n_rows(table); i++) {
        const double value = tarry_table_number(table, i, FIGURE_VALUE);
        if (isnan(value) || !same_figure(table, row, i))
            continue;
        meet(least, value, i, value < least->value);
        meet(most, value, i, value > most->value);
    }
}

/* The name of the one, or how many share it. */
static void write_end(const tarry_table *table, const spread_end *end, tarry_text *text) {
    char words[END_NAME + 4];
    const char *name = tarry_table_text(table, end->row, NAME);
    if (end->n == 1)
        snprintf(words, sizeof words, "%.*s%s", END_NAME, name,
                 strlen(name) > END_NAME ? "..." : "");
    else
        snprintf(words, sizeof words, "%zu alike", end->n);
    tarry_lines_right(text, words, END);
}

/* Figures of which one gene alone has the least or the most. */
static void write_ends(const tarry_table *table, const tarry_groups *groups, bool several_windows,
                       tarry_text *text) {
    bool begun = false;
    for (size_t i = groups->starts[0]; i < groups->starts[1]; i++) {
        spread_end least = {0}, most = {0};
        find_ends(table, groups->rows[i], &least, &most);
        if (!(least.value < most.value) || (least.n > 1 && most.n > 1))
            continue;
        if (!begun) {
            char head[80];
            snprintf(head, sizeof head, "%ss at the ends", tarry_table_column_name(table, NAME));
            head[0] = (char)(head[0] - 'a' + 'A');
            tarry_text_add(text, "\n", 1);
            tarry_lines_left(text, head, LABEL);
            tarry_lines_right(text, "least", END);
            tarry_lines_right(text, "most", END);
            tarry_text_add(text, "\n", 1);
        }
        begun = true;
        write_label(table, groups->rows[i], several_windows, text);
        write_end(table, &least, text);
        write_end(table, &most, text);
        tarry_text_add(text, "\n", 1);
    }
}

/* Rows of the first group name the figures; a gene without some of them just adds nothing. */
int tarry_spread_write(const tarry_table *table, const tarry_groups *groups, tarry_text *text,
                       tarry_error *error) {
    double *values = tarry_calloc(tarry_table_n_rows(table) + 1, sizeof *values);
    if (!values)
        return tarry_fail_memory(error, "the spread over genes");
    const size_t first = groups->rows[groups->starts[0]];
    bool several_windows = false;
    for (size_t i = groups->starts[0]; i < groups->starts[1]; i++)
        several_windows = several_windows ||
                          strcmp(tarry_table_text(table, groups->rows[i], WINDOW),
                                 tarry_table_text(table, first, WINDOW)) != 0;
    char head[80];
    snprintf(head, sizeof head, "Spread over %zu %ss", groups->n,
             tarry_table_column_name(table, NAME));
    tarry_text_add(text, "\n", 1);
    tarry_lines_left(text, head, LABEL);
    tarry_text_printf(text, "%9s%9s%9s%9s%9s\n", "median", "10 %", "90 %", "least", "most");
    for (size_t i = groups->starts[0]; i < groups->starts[1]; i++) {
        const size_t row = groups->rows[i];
        const size_t n = gather(table, row, values);
        write_line(table, row, values, n, several_windows, text);
    }
    write_ends(table, groups, several_windows, text);
    tarry_text_printf(text, "  (each %s by itself: %s.csv)\n", tarry_table_column_name(table, NAME),
                      tarry_table_name(table));
    free(values);
    return 0;
}
