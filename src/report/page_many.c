/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Where genes are many: how figures spread over them, and a line for each. */
#include "report/html.h"
#include "report/page_parts.h"
#include "report/spread.h"

#include <stdio.h>
#include <string.h>

/* The words of the figure that a row tells of, with its unit. */
static void add_name(tarry_page *page, const tarry_quantities *quantities, const char *name) {
    for (size_t i = 0; i < quantities->n; i++) {
        const tarry_quantity *quantity = &quantities->items[i];
        char unit[48];
        if (strcmp(quantity->name, name) != 0)
            continue;
        tarry_html_put(page->text, "<th scope=\"row\">");
        if (quantity->product_size) {
            char product[64];
            snprintf(product, sizeof product, "%.*s", (int)quantity->product_size, name);
            tarry_html_put(page->text, "%s ", product);
        }
        tarry_html_put(page->text, "%s", quantity->words);
        if (*tarry_quantity_unit(quantity->unit, unit))
            tarry_html_put(page->text, " <span class=\"unit\">%s</span>", unit);
        tarry_html_put(page->text, "</th>");
        return;
    }
}

/* The number at an end, and whose it is. */
static void add_end(tarry_page *page, const tarry_table *table, const tarry_spread_item *item,
                    const tarry_spread_end *end) {
    char alike[32];
    tarry_page_add_number(page, end->value);
    snprintf(alike, sizeof alike, "%zu alike", end->n);
    if (tarry_spread_has_ends(item))
        tarry_html_put(page->text, "<td class=\"i\">%s</td>",
                       end->n == 1 ? tarry_table_text(table, end->row, TARRY_QUANTITY_OF) : alike);
    else
        tarry_html_put(page->text, "<td></td>");
}

static void add_spread_row(tarry_page *page, const tarry_table *table, const tarry_spread *spread,
                           const tarry_spread_item *item, const tarry_quantities *quantities) {
    tarry_html_put(page->text, "<tr>");
    add_name(page, quantities, tarry_table_text(table, item->row, TARRY_QUANTITY_NAME));
    if (spread->several_windows)
        tarry_html_put(page->text, "<td>%s</td>",
                       tarry_table_text(table, item->row, TARRY_QUANTITY_WINDOW));
    tarry_page_add_number(page, item->median);
    tarry_page_add_number(page, item->tenth);
    tarry_page_add_number(page, item->nine_tenths);
    add_end(page, table, item, &item->least);
    add_end(page, table, item, &item->most);
    tarry_html_put(page->text, "</tr>\n");
}

int tarry_page_spread(tarry_page *page, const tarry_table *table, const tarry_groups *groups,
                      tarry_error *error) {
    const char *of = tarry_table_column_name(table, TARRY_QUANTITY_OF);
    tarry_spread spread = {0};
    tarry_quantities quantities = {0};
    char caption[96];
    int status = tarry_spread_init(&spread, table, groups, error);
    if (!status)
        status = tarry_quantities_init(&quantities, page->network, table, groups->rows,
                                       groups->starts[1], error);
    if (!status) {
        snprintf(caption, sizeof caption, "Spread of each quantity over %zu %ss", groups->n, of);
        tarry_page_begin_table(page, caption, true);
        tarry_html_put(page->text, "<thead><tr><th scope=\"col\">quantity</th>");
        if (spread.several_windows)
            tarry_html_put(page->text, "<th scope=\"col\">window</th>");
        tarry_html_put(page->text, "<th scope=\"col\" class=\"n\">median</th>"
                                   "<th scope=\"col\" class=\"n\">10 %%</th>"
                                   "<th scope=\"col\" class=\"n\">90 %%</th>"
                                   "<th scope=\"col\" class=\"n\">least</th>"
                                   "<th scope=\"col\" class=\"i\">of</th>"
                                   "<th scope=\"col\" class=\"n\">most</th>"
                                   "<th scope=\"col\" class=\"i\">of</th></tr></thead>\n<tbody>\n");
        for (size_t i = 0; i < spread.n; i++)
            add_spread_row(page, table, &spread, &spread.items[i], &quantities);
        tarry_html_put(page->text, "</tbody>\n");
        tarry_page_end_table(page, true);
    }
    tarry_quantities_release(&quantities);
    tarry_spread_release(&spread);
    return status;
}

/* ---- all genes ------------------------------------------------------------------------------ */

static const struct {
    const char *quantity, *head;
} columns[] = {
    {"burst_frequency", "bursts"},       {"burst_size_mean", "size"},
    {"silent_fraction", "silent share"}, {"active_time_mean", "active"},
    {"inactive_time_mean", "inactive"},  {"initiation_rate", "initiations"},
    {"transcript_mean", "transcripts"},  {"protein_mean", "proteins"},
};

enum { N_COLUMNS = sizeof columns / sizeof *columns };

/* The row of a gene with a quantity in a window, or NULL's place: the table's number of rows. */
static size_t find_row(const tarry_page *page, const tarry_table *table, size_t g,
                       const char *quantity, const char *window) {
    const tarry_groups *groups = &page->genes;
    for (size_t i = groups->starts[g]; i < groups->starts[g + 1]; i++)
        if (!strcmp(tarry_table_text(table, groups->rows[i], TARRY_QUANTITY_NAME), quantity) &&
            !strcmp(tarry_table_text(table, groups->rows[i], TARRY_QUANTITY_WINDOW), window))
            return groups->rows[i];
    return tarry_table_n_rows(table);
}

/* Which columns any of the first gene's windows has, with their units. */
static void find_units(const tarry_page *page, const tarry_table *table,
                       const char *units[N_COLUMNS]) {
    for (size_t c = 0; c < N_COLUMNS; c++)
        for (uint32_t w = 0; w < page->network->run.n_windows && !units[c]; w++) {
            const size_t row = find_row(page, table, 0, columns[c].quantity,
                                        page->network->run.windows[w].name);
            if (row < tarry_table_n_rows(table))
                units[c] = tarry_table_text(table, row, TARRY_QUANTITY_UNIT);
        }
}

static void add_all_heads(tarry_page *page, const char *const units[N_COLUMNS]) {
    tarry_html_put(page->text, "<thead><tr><th scope=\"col\">gene</th>");
    if (page->network->run.n_windows > 1)
        tarry_html_put(page->text, "<th scope=\"col\">window</th>");
    for (size_t c = 0; c < N_COLUMNS; c++) {
        char unit[48];
        if (!units[c])
            continue;
        tarry_html_put(page->text, "<th scope=\"col\" class=\"n\">%s", columns[c].head);
        if (*tarry_quantity_unit(units[c], unit) && strcmp(unit, "molecules") != 0 &&
            strcmp(unit, "initiations") != 0)
            tarry_html_put(page->text, " <span class=\"unit\">%s</span>", unit);
        tarry_html_put(page->text, "</th>");
    }
    tarry_html_put(page->text, "</tr></thead>\n<tbody>\n");
}

static void add_all_row(tarry_page *page, const tarry_table *table, size_t g, uint32_t w,
                        const char *const units[N_COLUMNS]) {
    const char *window = page->network->run.windows[w].name;
    const char *name = page->genes.names[g];
    if (tarry_page_shows(page, &page->genes, name))
        tarry_html_put(page->text, "<tr><th scope=\"row\"><a href=\"#gene-%s\">%s</a></th>", name,
                       name);
    else
        tarry_html_put(page->text, "<tr><th scope=\"row\">%s</th>", name);
    if (page->network->run.n_windows > 1)
        tarry_html_put(page->text, "<td>%s</td>", window);
    for (size_t c = 0; c < N_COLUMNS; c++) {
        const size_t row = find_row(page, table, g, columns[c].quantity, window);
        if (units[c])
            tarry_page_add_number(page, tarry_page_value_of(table, row).value);
    }
    tarry_html_put(page->text, "</tr>\n");
}

/* Folded away, so that the page stays short; a click on a head sorts it where scripts run. */
void tarry_page_all_genes(tarry_page *page) {
    const tarry_table *table = tarry_results_table(page->results, TARRY_TABLE_bursts);
    const uint32_t n_windows = page->network->run.n_windows;
    const size_t n_told = page->genes.n * n_windows > TARRY_PAGE_ALL
                              ? (TARRY_PAGE_ALL + n_windows - 1) / n_windows
                              : page->genes.n;
    const char *units[N_COLUMNS] = {NULL};
    char caption[128];
    find_units(page, table, units);
    if (n_told < page->genes.n)
        snprintf(caption, sizeof caption,
                 "The first %zu of %zu genes, a line each (all are in bursts.csv)", n_told,
                 page->genes.n);
    else
        snprintf(caption, sizeof caption, "All %zu genes, a line each", n_told);
    tarry_html_put(page->text, "<details>\n<summary>%s</summary>\n", caption);
    tarry_html_put(page->text, "<p>Intervals are in bursts.csv.</p>\n<div class=\"scroll tall\" "
                               "role=\"region\" tabindex=\"0\" aria-label=\"All genes\">\n"
                               "<table id=\"all-genes\">\n");
    add_all_heads(page, units);
    for (size_t g = 0; g < n_told; g++)
        for (uint32_t w = 0; w < n_windows; w++)
            add_all_row(page, table, g, w, units);
    tarry_html_put(page->text, "</tbody>\n</table>\n</div>\n</details>\n");
}
