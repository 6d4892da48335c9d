/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Counts at the snapshots, first responses, lags in transit. */
#include "report/html.h"
#include "report/page_parts.h"
#include "report/responses.h"
#include "report/snapshots.h"

#include <stdio.h>
#include <string.h>

static void add_more(tarry_page *page, const char *file) {
    tarry_html_put(page->text, "<p>More of these are in %s.</p>\n", file);
}

/* ---- counts --------------------------------------------------------------------------------- */

static void begin_counts(tarry_page *page) {
    tarry_html_put(page->text,
                   "<section id=\"counts\">\n<h2>%s</h2>\n"
                   "<p>Over cells, at the times at which all cells are looked at (s.e.: standard "
                   "error of the mean; sd: standard deviation between cells).</p>\n",
                   tarry_snapshots_title(page->network));
    tarry_page_begin_table(page, tarry_snapshots_title(page->network), true);
    tarry_html_put(page->text,
                   "<thead><tr><th scope=\"col\">name</th>"
                   "<th scope=\"col\" class=\"n\">time <span class=\"unit\">%s</span></th>"
                   "<th scope=\"col\" class=\"n\">mean</th><th scope=\"col\" class=\"n\">s.e.</th>"
                   "<th scope=\"col\" class=\"n\">sd</th><th scope=\"col\" class=\"n\">Fano "
                   "factor</th></tr></thead>\n<tbody>\n",
                   page->network->time_unit);
}

static void add_count(tarry_page *page, const tarry_table *means, const tarry_snapshot *item,
                      bool again) {
    static const char *const columns[] = {"time", "mean", "mean_se", "sd", "fano"};
    tarry_html_put(page->text,
                   again ? "<tr><th scope=\"row\"><span class=\"again\">%s</span></th>"
                         : "<tr class=\"first\"><th scope=\"row\">%s</th>",
                   item->name);
    for (size_t i = 0; i < sizeof columns / sizeof *columns; i++)
        tarry_page_add_number(
            page, tarry_table_number(means, item->row, tarry_table_column(means, columns[i])));
    tarry_html_put(page->text, "</tr>\n");
}

int tarry_page_counts(tarry_page *page, tarry_error *error) {
    const tarry_table *means = tarry_results_table(page->results, TARRY_TABLE_means);
    tarry_snapshots snapshots = {0};
    const char *before = NULL;
    uint32_t at = 0;
    size_t n = 0;
    const int status = tarry_snapshots_init(&snapshots, &page->network->run, means, error);
    for (size_t i = 0; !status && i < snapshots.n && n <= TARRY_PAGE_ROWS; i++) {
        const tarry_snapshot *item = &snapshots.items[i];
        if (!tarry_page_shows_of(page, item->name) ||
            !tarry_snapshots_tell(page->network, item->name, &at))
            continue;
        if (n == 0)
            begin_counts(page);
        if (n++ < TARRY_PAGE_ROWS)
            add_count(page, means, item, before == item->name);
        before = item->name;
    }
    if (n > 0) {
        tarry_html_put(page->text, "</tbody>\n");
        tarry_page_end_table(page, true);
        if (n > TARRY_PAGE_ROWS)
            add_more(page, "means.csv");
        tarry_html_put(page->text, "</section>\n");
    }
    tarry_snapshots_release(&snapshots);
    return status;
}

/* ---- first responses ------------------------------------------------------------------------ */

static void begin_responses(tarry_page *page) {
    tarry_html_put(page->text,
                   "<section id=\"responses\">\n<h2>First responses</h2>\n"
                   "<p>After each step of the protocol: the share of cells in which something came "
                   "before the next step or the end, and the time after the step by which it had "
                   "come in half of all cells. A transcript or protein counts whenever it was "
                   "begun.</p>\n");
    tarry_page_begin_table(page, "First responses after each step", true);
    tarry_html_put(page->text,
                   "<thead><tr><th scope=\"col\">first</th>"
                   "<th scope=\"col\" class=\"n\">step at <span class=\"unit\">%s</span></th>",
                   page->network->time_unit);
    tarry_page_add_value_head(page, "share", "");
    tarry_page_add_value_head(page, "median", page->network->time_unit);
    tarry_html_put(page->text, "</tr></thead>\n<tbody>\n");
}

static void add_response(tarry_page *page, const tarry_response_item *item, bool again) {
    tarry_rounded rounded;
    tarry_html_put(page->text,
                   again ? "<tr><th scope=\"row\"><span class=\"again\">%s</span></th>"
                         : "<tr class=\"first\"><th scope=\"row\">%s</th>",
                   item->name);
    tarry_page_add_number(page, item->step);
    tarry_response_round(&item->responders, &rounded);
    tarry_page_add_rounded(page, &rounded, false);
    tarry_response_round(&item->median, &rounded);
    tarry_page_add_rounded(page, &rounded, false);
    tarry_html_put(page->text, "</tr>\n");
}

int tarry_page_responses(tarry_page *page, tarry_error *error) {
    tarry_responses responses = {0};
    const char *before = NULL;
    size_t n = 0;
    const int status = tarry_responses_init(
        &responses, tarry_results_table(page->results, TARRY_TABLE_first), error);
    for (size_t i = 0; !status && i < responses.n && n <= TARRY_PAGE_ROWS; i++) {
        const tarry_response_item *item = &responses.items[i];
        if (!tarry_page_shows_of(page, item->name))
            continue;
        if (n == 0)
            begin_responses(page);
        if (n++ < TARRY_PAGE_ROWS)
            add_response(page, item, before == item->name);
        before = item->name;
    }
    if (n > 0) {
        tarry_html_put(page->text, "</tbody>\n");
        tarry_page_end_table(page, true);
        if (n > TARRY_PAGE_ROWS)
            add_more(page, "first.csv");
        tarry_html_put(page->text, "</section>\n");
    }
    tarry_responses_release(&responses);
    return status;
}

/* ---- lags in transit ------------------------------------------------------------------------ */

static void begin_transit(tarry_page *page) {
    tarry_html_put(
        page->text,
        "<section id=\"transit\">\n<h2>Lags in transit</h2>\n"
        "<p>Molecules under way at a time in a cell, and the lags that were drawn.</p>\n");
    tarry_page_begin_table(page, "Lags in transit", true);
    tarry_html_put(page->text, "<thead><tr><th scope=\"col\">name</th>");
    if (page->network->run.n_windows > 1)
        tarry_html_put(page->text, "<th scope=\"col\">window</th>");
    tarry_html_put(page->text,
                   "<th scope=\"col\" class=\"n\">under way</th>"
                   "<th scope=\"col\" class=\"n\">mean lag <span class=\"unit\">%s</span></th>"
                   "<th scope=\"col\" class=\"n\">sd of lag <span class=\"unit\">%s</span></th>"
                   "<th scope=\"col\" class=\"n\">lost</th></tr></thead>\n<tbody>\n",
                   page->network->time_unit, page->network->time_unit);
}

static void add_transit_row(tarry_page *page, const tarry_table *transit, size_t row) {
    static const char *const columns[] = {"mean_pending", "mean_drawn", "sd_drawn", "lost"};
    tarry_html_put(page->text, "<tr><th scope=\"row\">%s</th>",
                   tarry_table_text(transit, row, tarry_table_column(transit, "name")));
    if (page->network->run.n_windows > 1)
        tarry_html_put(page->text, "<td>%s</td>",
                       tarry_table_text(transit, row, tarry_table_column(transit, "window")));
    for (size_t i = 0; i < sizeof columns / sizeof *columns; i++)
        tarry_page_add_number(
            page, tarry_table_number(transit, row, tarry_table_column(transit, columns[i])));
    tarry_html_put(page->text, "</tr>\n");
}

void tarry_page_transit(tarry_page *page) {
    const tarry_table *transit = tarry_results_table(page->results, TARRY_TABLE_transit);
    size_t n = 0;
    for (size_t row = 0; row < tarry_table_n_rows(transit) && n <= TARRY_PAGE_ROWS; row++) {
        if (!tarry_page_shows_of(page, tarry_table_text(transit, row, 0)))
            continue;
        if (n == 0)
            begin_transit(page);
        if (n++ < TARRY_PAGE_ROWS)
            add_transit_row(page, transit, row);
    }
    if (!n)
        return;
    tarry_html_put(page->text, "</tbody>\n");
    tarry_page_end_table(page, true);
    if (n > TARRY_PAGE_ROWS)
        add_more(page, "transit.csv");
    tarry_html_put(page->text, "</section>\n");
}
