/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "report/html.h"
#include "report/page_parts.h"

#include <math.h>

/* A wide table scrolls by itself, so that the page does not: then it can be reached by keyboard. */
void tarry_page_begin_table(tarry_page *page, const char *caption, bool wide) {
    if (wide)
        tarry_html_put(page->text,
                       "<div class=\"scroll\" role=\"region\" tabindex=\"0\" aria-label=\"%s\">\n",
                       caption);
    tarry_html_put(page->text, "<table>\n<caption>%s</caption>\n", caption);
}

void tarry_page_end_table(tarry_page *page, bool wide) {
    tarry_html_put(page->text, wide ? "</table>\n</div>\n" : "</table>\n");
}

void tarry_page_add_value_head(tarry_page *page, const char *words, const char *unit) {
    tarry_html_put(page->text, "<th scope=\"col\" class=\"n\">%s", words);
    if (*unit)
        tarry_html_put(page->text, " <span class=\"unit\">%s</span>", unit);
    tarry_html_put(page->text, page->exact
                                   ? "</th>"
                                   : "</th><th scope=\"col\" class=\"i\">95 %% interval</th>");
}

void tarry_page_add_rounded(tarry_page *page, const tarry_rounded *rounded, bool few) {
    const bool bounded = rounded->low[0] != '\0';
    tarry_html_put(page->text, "<td class=\"n\">%s%s</td>", rounded->value,
                   few && bounded ? "*" : "");
    if (!page->exact)
        tarry_html_put(page->text, "<td class=\"i\">%s%s%s</td>", rounded->low,
                       bounded ? " to " : "", rounded->high);
    page->marked = page->marked || (few && bounded);
}

void tarry_page_add_value(tarry_page *page, const tarry_page_value *value) {
    tarry_rounded rounded;
    tarry_round(value->value, value->low, value->high, TARRY_ROUND_MOST, &rounded);
    tarry_page_add_rounded(page, &rounded, value->samples < TARRY_FEW);
}

void tarry_page_add_number(tarry_page *page, double value) {
    char number[TARRY_ROUNDED];
    tarry_round_plain(value, number);
    tarry_html_put(page->text, "<td class=\"n\">%s</td>", number);
}

tarry_page_value tarry_page_value_of(const tarry_table *table, size_t row) {
    if (row >= tarry_table_n_rows(table))
        return (tarry_page_value){NAN, NAN, NAN, NAN};
    return (tarry_page_value){tarry_table_number(table, row, TARRY_QUANTITY_VALUE),
                              tarry_table_number(table, row, TARRY_QUANTITY_LOW),
                              tarry_table_number(table, row, TARRY_QUANTITY_HIGH),
                              tarry_table_number(table, row, TARRY_QUANTITY_SAMPLES)};
}
