/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Pictures, gene by gene, with captions and a text for those who cannot see them. */
#include "report/html.h"
#include "report/page_parts.h"

#include <string.h>

static bool same(const char *one, const char *other) {
    return one == other || (one && other && !strcmp(one, other));
}

bool tarry_page_has_picture(const tarry_page *page, const char *gene, const char *signal) {
    for (size_t i = 0; i < page->figures->n; i++) {
        const tarry_figure *figure = &page->figures->items[i];
        if (figure->svg && same(figure->gene, gene) && same(figure->signal, signal))
            return true;
    }
    return false;
}

/* What follows is of another gene or signal than what came before. */
static void add_head(tarry_page *page, const tarry_figure *figure) {
    if (figure->gene)
        tarry_html_put(page->text, "<h3 id=\"figures-%s\">%s</h3>\n", figure->gene, figure->gene);
    else if (figure->signal)
        tarry_html_put(page->text, "<h3 id=\"figures-of-%s\">%s</h3>\n", figure->signal,
                       figure->signal);
    else
        tarry_html_put(page->text, "<h3>Several together</h3>\n");
}

/* The picture itself is markup of ours. */
static void add_figure(tarry_page *page, const tarry_figure *figure) {
    tarry_html_put(page->text,
                   "<figure id=\"%s\">\n<div class=\"picture\" role=\"img\" aria-label=\"%s\">\n",
                   figure->stem, figure->alternative);
    tarry_text_add_string(page->text, figure->svg);
    tarry_html_put(page->text, "\n</div>\n<figcaption><b>%s.</b> %s</figcaption>\n</figure>\n",
                   figure->title, figure->caption);
}

static size_t count_drawn(const tarry_figure_list *figures) {
    size_t n = 0;
    for (size_t i = 0; i < figures->n; i++)
        n += figures->items[i].svg != NULL;
    return n;
}

/* Why there are none, or not all. */
static void add_missing(tarry_page *page, size_t n_drawn) {
    const tarry_figure_options *options = page->provenance->figures;
    if (!options)
        tarry_html_put(page->text,
                       "<p>No figures were made. The tables above and the files have all "
                       "numbers.</p>\n");
    else if (options->format == TARRY_FIGURE_NONE)
        tarry_html_put(page->text, "<p>No figures were made (--figures none). The tables above and "
                                   "the files of the run have all numbers.</p>\n");
    else if (!page->figures->n)
        tarry_html_put(page->text, page->network->data
                                       ? "<p>There is nothing to draw.</p>\n"
                                       : "<p>Nothing was recorded that could be drawn: see "
                                         "<code>record</code> in the model.</p>\n");
    else if (n_drawn < page->figures->n)
        tarry_html_put(page->text,
                       "<p><strong>%s could not be drawn</strong>, since gnuplot is missing or "
                       "failed. What they are drawn from is in the folder figures, and the tables "
                       "above and the files of the run have all numbers.</p>\n",
                       n_drawn ? "Some figures" : "Figures");
}

void tarry_page_figures(tarry_page *page) {
    const size_t n_drawn = count_drawn(page->figures);
    const tarry_figure *before = NULL;
    tarry_html_put(page->text, "<section id=\"figures\">\n<h2>Figures</h2>\n");
    add_missing(page, n_drawn);
    for (size_t i = 0; i < page->figures->n; i++) {
        const tarry_figure *figure = &page->figures->items[i];
        if (!figure->svg)
            continue;
        if (!before || !same(before->gene, figure->gene) || !same(before->signal, figure->signal)) {
            tarry_html_put(page->text, before ? "</div>\n" : "");
            add_head(page, figure);
            tarry_html_put(page->text, "<div class=\"pictures\">\n");
        }
        add_figure(page, figure);
        before = figure;
    }
    tarry_html_put(page->text, before ? "</div>\n" : "");
    if (page->figures->left_out)
        tarry_html_put(page->text, "<p>%s</p>\n", page->figures->left_out);
    tarry_html_put(page->text, "</section>\n");
}
