/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "report/figures_table.h"

#include "report/lines.h"
#include "report/quantities.h"
#include "report/rounding.h"

#include <stdio.h>
#include <string.h>

/* Columns on the page. One window has room to spare; several are set close. */
typedef struct page_layout {
    int label;
    int value;    /* right-aligned */
    int gap;      /* between value and interval */
    int interval; /* left-aligned */
} page_layout;

static const page_layout wide = {34, 10, 2, 30};
static const page_layout close = {27, 7, 1, 18};

typedef struct figure_page {
    tarry_text *text;
    const tarry_network *network;
    const tarry_table *table;
    const page_layout *layout;
    uint32_t from, to; /* windows side by side */
    bool *marked;
} figure_page;

static void end_line(tarry_text *text) {
    while (text->size && text->data[text->size - 1] == ' ')
        text->data[--text->size] = '\0';
    tarry_text_add(text, "\n", 1);
}

/* ---- one figure ----------------------------------------------------------------------------- */

/* Value and interval as texts, with as many digits as the columns hold. */
static void round_to_fit(const figure_page *page, size_t row, bool few, char *value, char *interval,
                         size_t size) {
    const double low = tarry_table_number(page->table, row, TARRY_QUANTITY_LOW);
    const double high = tarry_table_number(page->table, row, TARRY_QUANTITY_HIGH);
    for (int digits = TARRY_ROUND_MOST; digits > 0; digits--) {
        tarry_rounded rounded;
        tarry_round(tarry_table_number(page->table, row, TARRY_QUANTITY_VALUE), low, high, digits,
                    &rounded);
        const bool bounded = rounded.low[0] != '\0';
        snprintf(value, size, "%s%s", rounded.value, few && bounded ? "*" : "");
        snprintf(interval, size, "%s%s%s", rounded.low, bounded ? " to " : "", rounded.high);
        if ((int)strlen(value) <= page->layout->value &&
            (int)strlen(interval) <= page->layout->interval)
            return;
    }
}

static void add_estimate(figure_page *page, size_t row) {
    char value[80] = "", interval[80] = "";
    const page_layout *layout = page->layout;
    if (row < tarry_table_n_rows(page->table)) {
        const bool few = tarry_table_number(page->table, row, TARRY_QUANTITY_SAMPLES) < TARRY_FEW;
        round_to_fit(page, row, few, value, interval, sizeof value);
        *page->marked = *page->marked || strchr(value, '*');
    }
    tarry_lines_right(page->text, value, layout->value);
    tarry_lines_left(page->text, "", layout->gap);
    tarry_lines_left(page->text, interval, layout->interval);
}

/* What a unit adds to the words: " [/min]", nothing where it goes without saying (counts, the
 * signal's own) or, as that of decay times, stands in the title of the section. */
static void unit_words(const tarry_quantity *quantity, char out[64]) {
    static const char *const dumb[] = {"", "initiations", "molecules", "signal"};
    char unit[48];
    out[0] = '\0';
    if (quantity->product_size && !strcmp(quantity->words, "decay time"))
        return;
    tarry_quantity_unit(quantity->unit, unit);
    for (size_t i = 0; i < sizeof dumb / sizeof *dumb; i++)
        if (!strcmp(unit, dumb[i]))
            return;
    snprintf(out, 64, " [%s]", unit);
}

/* A line for a quantity, if any of the windows has it. Returns whether it has. */
static bool add_figure(figure_page *page, const tarry_quantity *quantity, const char *words) {
    const size_t none = tarry_table_n_rows(page->table);
    bool any = false;
    char text[192], unit[64];
    for (uint32_t w = page->from; w < page->to; w++)
        any = any || quantity->rows[w] < none;
    if (!any)
        return false;
    unit_words(quantity, unit);
    snprintf(text, sizeof text, "    %s%s", words, unit);
    tarry_lines_left(page->text, text, page->layout->label);
    for (uint32_t w = page->from; w < page->to; w++)
        add_estimate(page, quantity->rows[w]);
    end_line(page->text);
    return true;
}

/* ---- sections ------------------------------------------------------------------------------- */

static void add_title(figure_page *page, tarry_quantity_section section, bool alleles) {
    if (section == TARRY_SECTION_SIGNAL)
        return;
    tarry_text_printf(page->text, "  %s", tarry_section_title(section, alleles));
    if (section == TARRY_SECTION_PRODUCTS)
        tarry_text_printf(page->text, " (decay times in %s)", page->network->time_unit);
    tarry_text_add(page->text, "\n", 1);
}

/* A line of a product; its name stands before the first one. */
static void add_of_product(figure_page *page, const tarry_quantity *quantity, bool *named) {
    enum { NAME_WIDTH = 11 };
    const int n = (int)quantity->product_size;
    char line[128];
    if (n >= NAME_WIDTH && !*named) {
        tarry_text_printf(page->text, "    %.*s\n", n, quantity->name);
        *named = true;
    }
    snprintf(line, sizeof line, "%-*.*s%s", n ? NAME_WIDTH : 0, *named ? 0 : n, quantity->name,
             quantity->words);
    *named = add_figure(page, quantity, line) || *named;
}

static bool same_product(const tarry_quantity *one, const tarry_quantity *other) {
    return one->product_size == other->product_size &&
           !memcmp(one->name, other->name, one->product_size);
}

static void add_quantities(figure_page *page, const tarry_quantities *quantities, bool alleles) {
    bool named = false;
    for (size_t i = 0; i < quantities->n; i++) {
        const tarry_quantity *quantity = &quantities->items[i];
        const tarry_quantity *before = i ? quantity - 1 : NULL;
        if (!before || before->section != quantity->section)
            add_title(page, quantity->section, alleles);
        if (!before || !same_product(before, quantity))
            named = false;
        if (quantity->section == TARRY_SECTION_PRODUCTS)
            add_of_product(page, quantity, &named);
        else
            add_figure(page, quantity, quantity->words);
    }
}

/* ---- blocks --------------------------------------------------------------------------------- */

static void add_head(figure_page *page, const char *name, const tarry_gene *gene) {
    const tarry_run_plan *plan = &page->network->run;
    const page_layout *layout = page->layout;
    char words[160];
    if (gene && gene->n_copies > 1)
        snprintf(words, sizeof words, "%s (%u alleles)", name, (unsigned)gene->n_copies);
    else
        snprintf(words, sizeof words, "%s", name);
    tarry_text_add(page->text, "\n", 1);
    tarry_lines_left(page->text, words, layout->label);
    for (uint32_t w = page->from; w < page->to; w++) {
        tarry_lines_right(page->text, plan->n_windows > 1 ? plan->windows[w].name : "value",
                          layout->value);
        tarry_lines_left(page->text, "", layout->gap);
        tarry_lines_left(page->text, "95 % interval", layout->interval);
    }
    end_line(page->text);
}

/* Blocks of one gene or signal, each with as many windows as stand side by side. */
static int add_blocks(figure_page *page, const tarry_groups *groups, size_t g, uint32_t a_block,
                      tarry_error *error) {
    const uint32_t n_windows = page->network->run.n_windows;
    const bool is_signal = !strcmp(tarry_table_column_name(page->table, TARRY_QUANTITY_OF),
                                   "signal");
    const tarry_gene *gene = is_signal ? NULL : tarry_network_gene(page->network, groups->names[g]);
    tarry_quantities quantities = {0};
    const int status = tarry_quantities_init(&quantities, page->network, page->table,
                                             groups->rows + groups->starts[g],
                                             groups->starts[g + 1] - groups->starts[g], error);
    for (uint32_t w = 0; !status && w < n_windows; w += a_block) {
        page->from = w;
        page->to = n_windows - w < a_block ? n_windows : w + a_block;
        add_head(page, groups->names[g], gene);
        add_quantities(page, &quantities, tarry_gene_has_alleles(gene));
    }
    tarry_quantities_release(&quantities);
    return status;
}

int tarry_figures_write(const tarry_network *network, const tarry_table *table,
                        const tarry_groups *groups, int width, bool *marked, tarry_text *text,
                        tarry_error *error) {
    const page_layout *layout = network->run.n_windows > 1 ? &close : &wide;
    const int fit = (width - layout->label) / (layout->value + layout->gap + layout->interval);
    figure_page page = {
        .text = text, .network = network, .table = table, .layout = layout, .marked = marked};
    int status = 0;
    for (size_t g = 0; !status && g < groups->n; g++)
        status = add_blocks(&page, groups, g, fit < 1 ? 1 : (uint32_t)fit, error);
    return status;
}
