/* SPDX-License-Identifier: GPL-3.0-or-later */

/* The page from top to bottom: what was run, warnings, contents, the parts. */
#include "report/page.h"

#include "base/error.h"
#include "report/html.h"
#include "report/notes_list.h"
#include "report/page_parts.h"
#include "report/repeat.h"
#include "report/run_words.h"
#include "tarry/tarry.h"

#include <stdio.h>
#include <string.h>

static bool is_named(const tarry_figure_options *options, const char *name) {
    for (size_t i = 0; options && i < options->n_genes; i++)
        if (!strcmp(options->genes[i], name))
            return true;
    return false;
}

bool tarry_page_shows(const tarry_page *page, const tarry_groups *groups, const char *name) {
    const bool genes = groups == &page->genes;
    return groups->n <= TARRY_PAGE_GENES || (genes && is_named(page->provenance->figures, name)) ||
           tarry_page_has_picture(page, genes ? name : NULL, genes ? NULL : name);
}

/* The gene whose name is the first n bytes, or NULL. Names come in the order of genes: the search
 * goes on from the last one found. */
static const tarry_gene *find_owner(tarry_page *page, const char *name, size_t n) {
    const tarry_network *network = page->network;
    for (uint32_t i = 0; i < network->n_genes; i++) {
        const uint32_t at = (page->owner + i) % network->n_genes;
        const char *gene = network->genes[at].name;
        if (!strncmp(gene, name, n) && !gene[n]) {
            page->owner = at;
            return &network->genes[at];
        }
    }
    return NULL;
}

bool tarry_page_shows_of(tarry_page *page, const char *name) {
    const size_t n = strcspn(name, ". ");
    if (page->genes.n <= TARRY_PAGE_GENES || !name[n])
        return true;
    const tarry_gene *owner = find_owner(page, name, n);
    return !owner || tarry_page_shows(page, &page->genes, owner->name);
}

/* ---- top ------------------------------------------------------------------------------------ */

static void add_escaped(tarry_page *page, const char *before, tarry_text *words,
                        const char *after) {
    page->text->failed = page->text->failed || words->failed;
    if (!words->failed && words->size) {
        tarry_text_add_string(page->text, before);
        tarry_html_text(page->text, words->data);
        tarry_text_add_string(page->text, after);
    }
    tarry_text_release(words);
}

static const char *title_of(const tarry_page *page) {
    return page->network->title[0] ? page->network->title : tarry_repeat_file(page->model);
}

static void add_head(tarry_page *page) {
    const bool sorts = page->genes.n > TARRY_PAGE_GENES;
    tarry_text_add_string(page->text,
                          "<!DOCTYPE html>\n<html lang=\"en\">\n<head>\n<meta charset=\"utf-8\"/>\n"
                          "<meta http-equiv=\"Content-Security-Policy\" content=\"");
    tarry_page_policy(sorts, page->text);
    tarry_html_put(page->text,
                   "\"/>\n<meta name=\"viewport\" content=\"width=device-width, "
                   "initial-scale=1\"/>\n<title>%s (tarry)</title>\n<style>\n",
                   title_of(page));
    tarry_text_add_string(page->text, tarry_page_style);
    tarry_html_put(page->text, "</style>\n</head>\n<body>\n<main>\n<h1>%s</h1>\n", title_of(page));
}

static void add_verdict(tarry_page *page) {
    tarry_text run = {0}, lines[TARRY_RUN_LINES] = {{0}};
    tarry_run_words(page->network, page->results, &run);
    tarry_run_lines(page->network, page->results, lines);
    tarry_html_put(page->text, "<p class=\"run\"><span class=\"%s\">%s.</span> ",
                   page->provenance->partial ? "state partial" : "state",
                   page->exact                 ? "Exact values"
                   : page->network->data       ? "Measured data"
                   : page->provenance->partial ? "Partial run"
                                               : "Complete run");
    add_escaped(page, "", &run, "; ");
    tarry_html_put(page->text, "tarry %s.", tarry_version());
    for (int i = 0; i < TARRY_RUN_LINES; i++)
        add_escaped(page, "<br/>", &lines[i], ".");
    tarry_html_put(page->text, "</p>\n");
}

/* ---- warnings ------------------------------------------------------------------------------- */

static void add_warning(void *context, const char *words) {
    tarry_page *page = context;
    const size_t folders = (size_t)(tarry_repeat_file(page->model) - page->model->file);
    /* Where the model lay is nobody's concern: its name will do. */
    if (!strncmp(words, page->model->file, strlen(page->model->file)))
        words += folders;
    tarry_html_put(page->text, "<li>%s</li>\n", words);
}

static void add_warnings(tarry_page *page) {
    const size_t n_model = tarry_model_n_warnings(page->model);
    if (!n_model && !tarry_results_n_warnings(page->results) && !page->provenance->partial) {
        tarry_html_put(page->text, "<section id=\"warnings\"><p>No warnings.</p></section>\n");
        return;
    }
    tarry_html_put(page->text, "<section id=\"warnings\" class=\"warnings\">\n<h2>Warnings</h2>\n"
                               "<ul>\n");
    if (page->provenance->partial)
        tarry_html_put(page->text,
                       "<li><strong>This run was interrupted.</strong> All figures rest "
                       "on the cells that were finished by then; they equal those of a "
                       "run of so many cells.</li>\n");
    for (size_t i = 0; i < n_model; i++)
        add_warning(page, tarry_model_warning(page->model, i));
    if (!tarry_notes_each(page->results, add_warning, page))
        page->text->failed = true;
    tarry_html_put(page->text, "</ul>\n</section>\n");
}

/* ---- contents ------------------------------------------------------------------------------- */

static void add_entries(tarry_page *page, const tarry_groups *groups, const char *title,
                        const char *id, const char *kind) {
    bool any = false;
    if (!groups->n)
        return;
    tarry_html_put(page->text, "<li><a href=\"#%s\">%s</a>", id, title);
    for (size_t g = 0; g < groups->n; g++) {
        const char *name = groups->names[g];
        if (!tarry_page_shows(page, groups, name))
            continue;
        tarry_html_put(page->text, any ? "" : "\n<ul>\n");
        any = true;
        tarry_html_put(page->text, "<li><a href=\"#%s-%s\">%s</a></li>\n", kind, name, name);
    }
    tarry_html_put(page->text, any ? "</ul></li>\n" : "</li>\n");
}

/* The parts that came of it stand in the page's text already. */
static void add_contents(tarry_page *page, const char *parts) {
    static const char *const entries[][2] = {
        {"counts", "Counts at the snapshots"},
        {"responses", "First responses"},
        {"transit", "Lags in transit"},
        {"figures", "Figures"},
        {"words", "Words used here"},
        {"model", "Model"},
        {"data", "Data"},
        {"repeat", "How to repeat this"},
        {"cite", "How to cite it"},
    };
    tarry_html_put(page->text, "<nav aria-label=\"Contents\">\n<ul>\n");
    add_entries(page, &page->genes, "Genes", "genes", "gene");
    add_entries(page, &page->signals, "Signals", "signals", "signal");
    for (size_t i = 0; i < sizeof entries / sizeof *entries; i++) {
        char section[64];
        snprintf(section, sizeof section, "<section id=\"%s\">", entries[i][0]);
        if (strstr(parts, section))
            tarry_html_put(page->text, "<li><a href=\"#%s\">%s</a></li>\n", entries[i][0],
                           entries[i][1]);
    }
    tarry_html_put(page->text, "</ul>\n</nav>\n");
}

/* ---- bottom --------------------------------------------------------------------------------- */

static void add_words(tarry_page *page) {
    static const char *const words[][2] = {
        {"95 % interval",
         "From leaving out each of at most 64 groups of cells in turn. It tells what other "
         "cells of the same model would give, not whether the model is right. "
         "Intervals are point by point: of 100, about 5 miss."},
        {"burst", "A time in which an allele is active without a break. Its size is the number of "
                  "transcripts started in it; it is silent where that is 0, loud otherwise."},
        {"interval of bursts", "From one switching on of an allele to the next."},
        {"Fano factor", "Variance of a count over its mean: 1 where molecules come and go "
                        "independently (Poisson), more where they come in bursts."},
        {"CV squared", "Variance over the mean squared."},
        {"decay time", "The lag at which the correlation of a count or signal with itself has "
                       "fallen to 1/e of the way down to its plateau."},
    };
    tarry_html_put(page->text, "<section id=\"words\">\n<h2>Words used here</h2>\n<dl>\n");
    if (page->network->data)
        tarry_html_put(page->text, "<dt>95 %% interval</dt><dd>From leaving out each of at most 64 "
                                   "groups of cells in turn (or each dish, embryo or day, where "
                                   "they are named). Intervals are point by point: of 100, about 5 "
                                   "miss.</dd>\n");
    for (size_t i = page->exact || page->network->data ? 1 : 0; i < sizeof words / sizeof *words;
         i++)
        tarry_html_put(page->text, "<dt>%s</dt><dd>%s</dd>\n", words[i][0], words[i][1]);
    if (page->marked)
        tarry_html_put(page->text,
                       "<dt>*</dt><dd>Rests on fewer than 20 periods or events, so that "
                       "its interval is rough.</dd>\n");
    tarry_html_put(page->text, "</dl>\n</section>\n");
}

static void add_end(tarry_page *page) {
    tarry_html_put(page->text,
                   page->network->data
                       ? "</main>\n<footer>\n<p>For research use only. Not for clinical "
                         "decisions.</p>\n</footer>\n"
                       : "</main>\n<footer>\n<p>For research use only: a simulation says what "
                         "a model implies. Not for clinical decisions.</p>\n</footer>\n");
    if (page->genes.n > TARRY_PAGE_GENES) {
        tarry_text_add_string(page->text, "<script>");
        tarry_text_add_string(page->text, tarry_page_script);
        tarry_text_add_string(page->text, "</script>\n");
    }
    tarry_html_put(page->text, "</body>\n</html>\n");
}

/* ---- the whole ------------------------------------------------------------------------------ */

static int add_parts(tarry_page *page, tarry_error *error) {
    int status = tarry_page_genes(page, error);
    if (!status)
        status = tarry_page_signals(page, error);
    if (!status)
        status = tarry_page_counts(page, error);
    if (!status)
        status = tarry_page_responses(page, error);
    if (status)
        return status;
    tarry_page_transit(page);
    tarry_page_figures(page);
    add_words(page);
    tarry_page_repeat(page);
    return 0;
}

/* The parts are written first, since the contents list those that are there. */
static int write_page(tarry_page *page, tarry_text *text, tarry_error *error) {
    tarry_text parts = {0};
    page->text = &parts;
    const int status = add_parts(page, error);
    page->text = text;
    text->failed = text->failed || parts.failed;
    if (!status && !text->failed) {
        add_head(page);
        add_verdict(page);
        add_warnings(page);
        add_contents(page, parts.data);
        tarry_text_add(text, parts.data, parts.size);
        add_end(page);
    }
    tarry_text_release(&parts);
    return status;
}

int tarry_page_write(const tarry_model *model, const tarry_results *results,
                     const tarry_provenance *provenance, const tarry_figure_list *figures,
                     tarry_text *text, tarry_error *error) {
    tarry_page page = {.model = model,
                       .network = &model->network,
                       .results = results,
                       .provenance = provenance,
                       .exact = tarry_results_is_predicted(results) != 0,
                       .figures = figures};
    const tarry_table *bursts = tarry_results_table(results, TARRY_TABLE_bursts);
    const tarry_table *signals = tarry_results_table(results, TARRY_TABLE_signals);
    int status = tarry_groups_init(&page.genes, bursts,
                                   tarry_table_column_name(bursts, TARRY_QUANTITY_OF), error);
    if (!status)
        status = tarry_groups_init(&page.signals, signals,
                                   tarry_table_column_name(signals, TARRY_QUANTITY_OF), error);
    if (!status)
        status = write_page(&page, text, error);
    tarry_groups_release(&page.genes);
    tarry_groups_release(&page.signals);
    if (!status && text->failed)
        status = tarry_fail_memory(error, "report.html");
    return status;
}
