/* SPDX-License-Identifier: GPL-3.0-or-later */

/* The table that a run prints: the figures of genes and of signals, counts at the snapshots, lags
 * in transit, notes. Above GENES_SHOWN genes their spread stands for them. */
#include "tarry/write.h"

#include "base/error.h"
#include "model/model.h"
#include "report/figures_table.h"
#include "report/lines.h"
#include "report/notes_list.h"
#include "report/responses.h"
#include "report/rounding.h"
#include "report/run_words.h"
#include "report/snapshots.h"
#include "report/spread.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

enum {
    GENES_SHOWN = 20,
    LINES_SHOWN = 40, /* of the sections after the genes */
    LABEL = 30,       /* of those sections */
    COLUMN = 9,
};

typedef struct table_page {
    tarry_text *text;
    const tarry_network *network;
    const tarry_results *results;
    int width;
    bool marked_few;
} table_page;

#define COUNT(array) (sizeof(array) / sizeof *(array))

/* ---- head ----------------------------------------------------------------------------------- */

static void add_line(table_page *page, tarry_text *line) {
    page->text->failed = page->text->failed || line->failed;
    if (!page->text->failed && line->size)
        tarry_lines_wrap(page->text, "", line->data, page->width);
    tarry_text_release(line);
}

static void add_top(table_page *page) {
    tarry_text run = {0}, lines[TARRY_RUN_LINES] = {{0}};
    if (page->network->title[0])
        tarry_lines_wrap(page->text, "", page->network->title, page->width);
    tarry_run_words(page->network, page->results, &run);
    tarry_run_lines(page->network, page->results, lines);
    add_line(page, &run);
    for (int i = 0; i < TARRY_RUN_LINES; i++)
        add_line(page, &lines[i]);
}

/* ---- genes and signals ---------------------------------------------------------------------- */

static int add_figures(table_page *page, tarry_result_table which, tarry_error *error) {
    const tarry_table *table = tarry_results_table(page->results, which);
    tarry_groups groups = {0};
    int status = tarry_groups_init(&groups, table, tarry_table_column_name(table, 0), error);
    if (!status && groups.n > GENES_SHOWN)
        status = tarry_spread_write(table, &groups, page->text, error);
    else if (!status)
        status = tarry_figures_write(page->network, table, &groups, page->width, &page->marked_few,
                                     page->text, error);
    tarry_groups_release(&groups);
    return status;
}

/* ---- counts at the snapshots ---------------------------------------------------------------- */

/* A name before its numbers; one that is too long has a line of its own. */
static void add_name(tarry_text *text, const char *name, int width) {
    if (tarry_lines_characters(name) < width) {
        tarry_lines_left(text, name, width);
        return;
    }
    tarry_lines_add(text, name);
    tarry_text_add(text, "\n", 1);
    tarry_lines_left(text, "", width);
}

static void add_numbers(tarry_text *text, const tarry_table *table, size_t row,
                        const char *const *columns, size_t n, int width) {
    for (size_t i = 0; i < n; i++) {
        char number[TARRY_ROUNDED];
        tarry_round_plain(tarry_table_number(table, row, tarry_table_column(table, columns[i])),
                          number);
        tarry_lines_right(text, number, width);
    }
    tarry_text_add(text, "\n", 1);
}

static void add_counts_head(table_page *page) {
    char time[32];
    snprintf(time, sizeof time, "time [%s]", page->network->time_unit);
    tarry_text_add(page->text, "\n", 1);
    tarry_lines_left(page->text, tarry_snapshots_title(page->network), LABEL);
    tarry_lines_right(page->text, time, COLUMN + 2);
    tarry_text_printf(page->text, "%9s%9s%9s%9s\n", "mean", "s.e.", "sd", "Fano");
}

static int add_counts(table_page *page, tarry_error *error) {
    static const char *const columns[] = {"time", "mean", "mean_se", "sd", "fano"};
    const tarry_table *means = tarry_results_table(page->results, TARRY_TABLE_means);
    tarry_snapshots snapshots = {0};
    uint32_t at = 0;
    size_t n = 0;
    const int status = tarry_snapshots_init(&snapshots, &page->network->run, means, error);
    for (size_t i = 0; !status && i < snapshots.n && n <= LINES_SHOWN; i++) {
        const tarry_snapshot *item = &snapshots.items[i];
        if (!tarry_snapshots_tell(page->network, item->name, &at))
            continue;
        if (!n)
            add_counts_head(page);
        if (n++ == LINES_SHOWN) {
            tarry_text_add_string(page->text, "  ... and more in means.csv\n");
            break;
        }
        tarry_text_add(page->text, "  ", 2);
        add_name(page->text, item->name, LABEL);
        add_numbers(page->text, means, item->row, columns, COUNT(columns), COLUMN);
    }
    tarry_snapshots_release(&snapshots);
    return status;
}

/* ---- first responses ------------------------------------------------------------------------- */

/* A figure and its interval; a side without a bound has a dash. */
static void add_response(tarry_text *text, const tarry_response_figure *figure) {
    enum { VALUE = 8, INTERVAL = 17 };
    char interval[2 * TARRY_ROUNDED + 8] = "";
    tarry_rounded rounded;
    tarry_response_round(figure, &rounded);
    if (rounded.low[0])
        snprintf(interval, sizeof interval, " %s to %s", rounded.low, rounded.high);
    tarry_lines_right(text, rounded.value, VALUE);
    tarry_lines_left(text, interval, INTERVAL);
}

static void add_response_line(table_page *page, const tarry_response_item *item) {
    enum { NAME_WIDTH = 24 };
    char step[TARRY_ROUNDED];
    tarry_text line = {0};
    tarry_round_plain(item->step, step);
    tarry_text_add(page->text, "  ", 2);
    add_name(page->text, item->name, NAME_WIDTH - 2);
    tarry_lines_right(page->text, step, 6);
    add_response(&line, &item->responders);
    add_response(&line, &item->median);
    while (line.size && line.data[line.size - 1] == ' ')
        line.data[--line.size] = '\0';
    page->text->failed = page->text->failed || line.failed;
    if (!line.failed)
        tarry_text_add(page->text, line.data, line.size);
    tarry_text_add(page->text, "\n", 1);
    tarry_text_release(&line);
}

static int add_responses(table_page *page, tarry_error *error) {
    char words[64];
    tarry_responses responses = {0};
    const int status = tarry_responses_init(
        &responses, tarry_results_table(page->results, TARRY_TABLE_first), error);
    snprintf(words, sizeof words, "First after a step [%s]", page->network->time_unit);
    if (!status && responses.n > 0) {
        tarry_text_add(page->text, "\n", 1);
        tarry_lines_left(page->text, words, 24);
        tarry_text_printf(page->text, "%6s%8s%-17s%8s%s\n", "step", "share", " 95 % interval",
                          "median", " 95 % interval");
    }
    for (size_t i = 0; !status && i < responses.n && i < LINES_SHOWN; i++)
        add_response_line(page, &responses.items[i]);
    if (!status && responses.n > LINES_SHOWN)
        tarry_text_add_string(page->text, "  ... and more in first.csv\n");
    tarry_responses_release(&responses);
    return status;
}

/* ---- lags in transit ------------------------------------------------------------------------ */

static void add_transit(table_page *page) {
    static const char *const columns[] = {"mean_pending", "mean_drawn", "sd_drawn", "lost"};
    const tarry_table *transit = tarry_results_table(page->results, TARRY_TABLE_transit);
    const bool one_window = page->network->run.n_windows < 2;
    const size_t n = tarry_table_n_rows(transit);
    char words[160];
    if (!n || page->network->n_genes > GENES_SHOWN)
        return;
    snprintf(words, sizeof words, "Lags in transit [%s]", page->network->time_unit);
    tarry_text_add(page->text, "\n", 1);
    tarry_lines_left(page->text, words, LABEL);
    tarry_text_printf(page->text, "%14s%12s%12s%12s\n", "under way", "mean lag", "sd of lag",
                      "lost");
    for (size_t row = 0; row < n && row < LINES_SHOWN; row++) {
        snprintf(words, sizeof words, "  %s%s%s", tarry_table_text(transit, row, 0),
                 one_window ? "" : ", ", one_window ? "" : tarry_table_text(transit, row, 2));
        add_name(page->text, words, LABEL + 2);
        add_numbers(page->text, transit, row, columns, COUNT(columns), 12);
    }
    if (n > LINES_SHOWN)
        tarry_text_add_string(page->text, "  ... and more in transit.csv\n");
}

/* ---- notes ---------------------------------------------------------------------------------- */

static void add_notes(table_page *page) {
    const size_t n = tarry_results_n_warnings(page->results);
    if (!n && !page->marked_few)
        return;
    tarry_text_add_string(page->text, "\nNotes\n");
    if (page->marked_few)
        tarry_lines_wrap(page->text, "* ", "from fewer than 20 periods or events", page->width);
    tarry_notes_list(page->results, page->width, page->text);
}

int tarry_write_summary_table(const tarry_model *model, const tarry_results *results, int width,
                              char **text, tarry_error *error) {
    tarry_text out = {0};
    table_page page = {&out, &model->network, results, width, false};
    add_top(&page);
    int status = add_figures(&page, TARRY_TABLE_bursts, error);
    if (!status)
        status = add_figures(&page, TARRY_TABLE_signals, error);
    if (!status)
        status = add_counts(&page, error);
    if (!status)
        status = add_responses(&page, error);
    if (!status) {
        add_transit(&page);
        add_notes(&page);
        if (out.failed)
            status = tarry_fail_memory(error, "the table of results");
    }
    if (status)
        tarry_text_release(&out);
    *text = out.data;
    return status;
}
