/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "agree.h"

#include <check.h>
#include <math.h>
#include <stdbool.h>
#include <stdio.h>
#include <string.h>

typedef struct pairing {
    const tarry_table *one, *other;
    int keys[8];
    int n_keys;
    const char *from, *to;
} pairing;

static bool same_text(const pairing *p, const char *a, const char *b) {
    if (p->from != NULL && strcmp(a, p->from) == 0)
        return strcmp(b, p->to) == 0;
    return strcmp(a, b) == 0;
}

static bool same_row(const pairing *p, size_t i, size_t j) {
    for (int k = 0; k < p->n_keys; k++) {
        const double x = tarry_table_number(p->one, i, p->keys[k]);
        const double y = tarry_table_number(p->other, j, p->keys[k]);
        if (!same_text(p, tarry_table_text(p->one, i, p->keys[k]),
                       tarry_table_text(p->other, j, p->keys[k])))
            return false;
        if (isnan(x) != isnan(y) || fabs(x - y) > 1e-9)
            return false;
    }
    return true;
}

static void add_z(agree_score *s, double z, const tarry_table *table, size_t row) {
    s->n++;
    s->sum += z * z;
    if (fabs(z) <= s->most)
        return;
    s->most = fabs(z);
    snprintf(s->where, sizeof s->where, "%s row %zu (%s)", tarry_table_name(table), row,
             tarry_table_text(table, row, 0));
}

double agree_interval(const tarry_table *table, size_t row) {
    return (tarry_table_number(table, row, tarry_table_column(table, "high")) -
            tarry_table_number(table, row, tarry_table_column(table, "low"))) /
           3.92;
}

double agree_mean_error(const tarry_table *table, size_t row) {
    return tarry_table_number(table, row, tarry_table_column(table, "mean_se"));
}

/* Of a promoter's state (a Fano factor below 1) the sd hardly changes with p near 1/2, and its
 * error is no normal one. */
double agree_sd_error(const tarry_table *table, size_t row) {
    if (tarry_table_number(table, row, tarry_table_column(table, "fano")) < 0.95)
        return 0;
    return tarry_table_number(table, row, tarry_table_column(table, "sd_se"));
}

agree_score agree_compare(const tarry_results *one, const tarry_results *other,
                          const agree_figure *figure, const char *from, const char *to) {
    agree_score s = {0};
    pairing p = {.one = tarry_results_table(one, figure->table),
                 .other = tarry_results_table(other, figure->table),
                 .from = from,
                 .to = to};
    for (; figure->keys[p.n_keys] != NULL; p.n_keys++)
        p.keys[p.n_keys] = tarry_table_column(p.one, figure->keys[p.n_keys]);
    const int column = tarry_table_column(p.one, figure->value);
    size_t start = 0;
    for (size_t j = 0; j < tarry_table_n_rows(p.other); j++) {
        size_t i = start;
        while (i < tarry_table_n_rows(p.one) && !same_row(&p, i, j))
            i++;
        if (i == tarry_table_n_rows(p.one))
            continue; /* nothing was found there, or at another time */
        start = i;
        const double x = tarry_table_number(p.one, i, column);
        const double y = tarry_table_number(p.other, j, column);
        const double error = figure->error(p.one, i), second = figure->error(p.other, j);
        if (error > 0 && x > figure->least && isfinite(y))
            add_z(&s, (x - y) / hypot(error, second > 0 ? second : 0), p.one, i);
    }
    return s;
}

void agree_hold(const agree_score *score, const char *what, size_t n_least) {
    ck_assert_msg(score->n >= n_least, "%s: %zu figures only of %s", what, score->n, score->where);
    ck_assert_msg(score->most < 6, "%s: Z is %.2f at %s", what, score->most, score->where);
    if (score->n >= 100)
        ck_assert_msg(score->sum / (double)score->n < 4, "%s: mean square of Z is %.2f", what,
                      score->sum / (double)score->n);
}

static const char *const by_name[] = {"name", "time", NULL};
static const char *const by_count[] = {"name", "window", "time", "count", NULL};
static const char *const by_gene[] = {"gene", "window", "quantity", NULL};
static const char *const by_signal[] = {"signal", "window", "quantity", NULL};
static const char *const by_size[] = {"gene", "window", "size", NULL};
static const char *const by_period[] = {"gene", "window", "period", "time", NULL};
static const char *const by_lag[] = {"window", "first", "second", "lag", NULL};
static const char *const by_step[] = {"name", "step", "time", NULL};

const agree_figure agree_figures[AGREE_KINDS] = {
    [AGREE_MEANS] = {TARRY_TABLE_means, by_name, "mean", agree_mean_error, -INFINITY},
    [AGREE_SDS] = {TARRY_TABLE_means, by_name, "sd", agree_sd_error, -INFINITY},
    [AGREE_DISTRIBUTION] = {TARRY_TABLE_distribution, by_count, "probability", agree_interval,
                            0.02},
    [AGREE_BURSTS] = {TARRY_TABLE_bursts, by_gene, "value", agree_interval, -INFINITY},
    [AGREE_SIGNALS] = {TARRY_TABLE_signals, by_signal, "value", agree_interval, -INFINITY},
    [AGREE_SIZES] = {TARRY_TABLE_burst_sizes, by_size, "probability", agree_interval, 0.02},
    [AGREE_DWELLS] = {TARRY_TABLE_dwells, by_period, "survival", agree_interval, 0.02},
    [AGREE_CORRELATION] = {TARRY_TABLE_autocorrelation, by_lag, "correlation", agree_interval,
                           -INFINITY},
    [AGREE_FIRST] = {TARRY_TABLE_first, by_step, "survival", agree_interval, 0.02},
};
