/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Sections of single genes and signals: sentences, then all figures with intervals. */
#include "base/number.h"
#include "report/html.h"
#include "report/page_parts.h"

#include <stdio.h>
#include <string.h>

/* Windows that stand in one table. */
typedef struct window_range {
    uint32_t from, to;
} window_range;

static void add_heads(tarry_page *page, window_range windows) {
    const tarry_run_plan *plan = &page->network->run;
    tarry_html_put(page->text, "<thead><tr><th scope=\"col\">quantity</th>");
    for (uint32_t w = windows.from; w < windows.to; w++)
        tarry_page_add_value_head(page, plan->n_windows > 1 ? plan->windows[w].name : "value", "");
    tarry_html_put(page->text, "</tr></thead>\n");
}

static void add_section_title(tarry_page *page, const tarry_quantity *quantity, bool alleles,
                              window_range windows) {
    const char *title = tarry_section_title(quantity->section, alleles);
    char span[16];
    if (!*title)
        return;
    snprintf(span, sizeof span, "%u",
             1 + (page->exact ? 1 : 2) * (unsigned)(windows.to - windows.from));
    tarry_html_put(page->text,
                   "<tr class=\"part\"><th scope=\"rowgroup\" colspan=\"%s\">%s</th></tr>\n", span,
                   title);
}

/* "transcript Fano factor", the product standing out where it is told of first. */
static void add_label(tarry_page *page, const tarry_quantity *quantity, bool again) {
    char product[64], unit[48];
    snprintf(product, sizeof product, "%.*s", (int)quantity->product_size, quantity->name);
    tarry_html_put(page->text, "<th scope=\"row\">");
    if (product[0])
        tarry_html_put(page->text, again ? "<span class=\"again\">%s</span> " : "<b>%s</b> ",
                       product);
    tarry_html_put(page->text, "%s", quantity->words);
    if (*tarry_quantity_unit(quantity->unit, unit))
        tarry_html_put(page->text, " <span class=\"unit\">%s</span>", unit);
    tarry_html_put(page->text, "</th>");
}

static bool is_told(const tarry_quantity *quantity, window_range windows, size_t none) {
    for (uint32_t w = windows.from; w < windows.to; w++)
        if (quantity->rows[w] < none)
            return true;
    return false;
}

static void add_row(tarry_page *page, const tarry_table *table, const tarry_quantity *quantity,
                    bool again, window_range windows) {
    const size_t none = tarry_table_n_rows(table);
    tarry_html_put(page->text, again ? "<tr>" : "<tr class=\"first\">");
    add_label(page, quantity, again);
    for (uint32_t w = windows.from; w < windows.to; w++) {
        const tarry_page_value value = tarry_page_value_of(table, quantity->rows[w]);
        if (quantity->rows[w] < none)
            tarry_page_add_value(page, &value);
        else
            tarry_html_put(page->text, page->exact ? "<td></td>" : "<td></td><td></td>");
    }
    tarry_html_put(page->text, "</tr>\n");
}

static void add_rows(tarry_page *page, const tarry_table *table, const tarry_quantities *quantities,
                     bool alleles, window_range windows) {
    const tarry_quantity *before = NULL;
    for (size_t i = 0; i < quantities->n; i++) {
        const tarry_quantity *quantity = &quantities->items[i];
        if (!is_told(quantity, windows, tarry_table_n_rows(table)))
            continue;
        const bool begins = !before || before->section != quantity->section;
        if (begins) {
            tarry_html_put(page->text, before ? "</tbody>\n<tbody>\n" : "<tbody>\n");
            add_section_title(page, quantity, alleles, windows);
        }
        const bool again = !begins &&
                           (quantity->section != TARRY_SECTION_PRODUCTS ||
                            (before->product_size == quantity->product_size &&
                             !memcmp(before->name, quantity->name, quantity->product_size)));
        add_row(page, table, quantity, again, windows);
        before = quantity;
    }
    tarry_html_put(page->text, before ? "</tbody>\n" : "<tbody></tbody>\n");
}

static void add_tables(tarry_page *page, const tarry_table *table,
                       const tarry_quantities *quantities, const char *name, bool alleles) {
    const uint32_t n = page->network->run.n_windows;
    char caption[192];
    snprintf(caption, sizeof caption, "Numbers of %.128s%s", name,
             n > 1 ? ", window by window" : "");
    for (uint32_t w = 0; w < n; w += TARRY_PAGE_ABREAST) {
        const window_range windows = {
            w, n - w < TARRY_PAGE_ABREAST ? n : w + (uint32_t)TARRY_PAGE_ABREAST};
        const bool wide = windows.to - windows.from > 1;
        tarry_page_begin_table(page, caption, wide);
        add_heads(page, windows);
        add_rows(page, table, quantities, alleles, windows);
        tarry_page_end_table(page, wide);
    }
}

/* ---- genes ---------------------------------------------------------------------------------- */

static void add_gene_head(tarry_page *page, const char *name, const tarry_gene *gene) {
    char alleles[32] = "";
    if (gene && gene->n_copies > 1)
        snprintf(alleles, sizeof alleles, "%u alleles", (unsigned)gene->n_copies);
    tarry_html_put(page->text, "<section id=\"gene-%s\">\n<h3>%s", name, name);
    if (alleles[0])
        tarry_html_put(page->text, " <small>%s</small>", alleles);
    tarry_html_put(page->text, "</h3>\n");
}

/* Sentences for a window each. Of very many windows the first few are told, the table has all. */
static void tell(tarry_page *page, const tarry_table *table, const tarry_quantities *quantities,
                 const char *name) {
    const tarry_run_plan *plan = &page->network->run;
    for (uint32_t w = 0; w < plan->n_windows && w < TARRY_PAGE_ABREAST; w++) {
        tarry_html_put(page->text, "<p class=\"told\">");
        if (plan->n_windows > 1) {
            char from[TARRY_NUMBER_SIZE], to[TARRY_NUMBER_SIZE];
            tarry_number_write(plan->windows[w].from, from);
            tarry_number_write(plan->windows[w].to, to);
            tarry_html_put(page->text, "<b>Window %s (%s to %s %s).</b> ", plan->windows[w].name,
                           from, to, page->network->time_unit);
        }
        tarry_page_tell_gene(page, table, quantities, name, w);
        tarry_html_put(page->text, "</p>\n");
    }
    if (plan->n_windows > TARRY_PAGE_ABREAST)
        tarry_html_put(page->text, "<p>Further windows are in the table only.</p>\n");
}

static int add_gene(tarry_page *page, const tarry_table *table, size_t g, tarry_error *error) {
    const tarry_groups *groups = &page->genes;
    const char *name = groups->names[g];
    const tarry_gene *gene = tarry_network_gene(page->network, name);
    tarry_quantities quantities = {0};
    const int status = tarry_quantities_init(&quantities, page->network, table,
                                             groups->rows + groups->starts[g],
                                             groups->starts[g + 1] - groups->starts[g], error);
    if (!status) {
        add_gene_head(page, name, gene);
        tarry_html_put(page->text, "<div class=\"beside\">\n<div class=\"telling\">\n");
        tell(page, table, &quantities, name);
        if (tarry_page_has_picture(page, name, NULL))
            tarry_html_put(page->text, "<p><a href=\"#figures-%s\">Pictures of %s</a></p>\n", name,
                           name);
        tarry_html_put(page->text, "</div>\n<div class=\"numbers\">\n");
        add_tables(page, table, &quantities, name, tarry_gene_has_alleles(gene));
        tarry_html_put(page->text, "</div>\n</div>\n</section>\n");
    }
    tarry_quantities_release(&quantities);
    return status;
}

int tarry_page_genes(tarry_page *page, tarry_error *error) {
    const tarry_table *table = tarry_results_table(page->results, TARRY_TABLE_bursts);
    const bool many = page->genes.n > TARRY_PAGE_GENES;
    int status = 0;
    if (!page->genes.n)
        return 0;
    tarry_html_put(page->text, "<section id=\"genes\">\n<h2>Genes</h2>\n");
    if (many)
        status = tarry_page_spread(page, table, &page->genes, error);
    if (!status && many)
        tarry_page_all_genes(page);
    for (size_t g = 0; !status && g < page->genes.n; g++)
        if (tarry_page_shows(page, &page->genes, page->genes.names[g]))
            status = add_gene(page, table, g, error);
    tarry_html_put(page->text, "</section>\n");
    return status;
}

/* ---- signals -------------------------------------------------------------------------------- */

static int add_signal(tarry_page *page, const tarry_table *table, size_t g, tarry_error *error) {
    const tarry_groups *groups = &page->signals;
    const char *name = groups->names[g];
    tarry_quantities quantities = {0};
    const int status = tarry_quantities_init(&quantities, page->network, table,
                                             groups->rows + groups->starts[g],
                                             groups->starts[g + 1] - groups->starts[g], error);
    if (!status) {
        tarry_html_put(page->text, "<section id=\"signal-%s\">\n<h3>%s</h3>\n", name, name);
        add_tables(page, table, &quantities, name, false);
        tarry_html_put(page->text, "</section>\n");
    }
    tarry_quantities_release(&quantities);
    return status;
}

int tarry_page_signals(tarry_page *page, tarry_error *error) {
    const tarry_table *table = tarry_results_table(page->results, TARRY_TABLE_signals);
    int status = 0;
    if (!page->signals.n)
        return 0;
    tarry_html_put(page->text,
                   "<section id=\"signals\">\n<h2>Signals</h2>\n"
                   "<p>What an instrument %s, in units of its own. Plateau and "
                   "amplitude are those of the autocorrelation.</p>\n",
                   page->network->data ? "saw" : "would see");
    if (page->signals.n > TARRY_PAGE_GENES)
        status = tarry_page_spread(page, table, &page->signals, error);
    for (size_t g = 0; !status && g < page->signals.n; g++)
        if (tarry_page_shows(page, &page->signals, page->signals.names[g]))
            status = add_signal(page, table, g, error);
    tarry_html_put(page->text, "</section>\n");
    return status;
}
