/* SPDX-License-Identifier: GPL-3.0-or-later */

/* What somebody else needs to get the same numbers: model, command, version. */
#include "base/file.h"
#include "base/number.h"
#include "report/html.h"
#include "report/page_parts.h"
#include "tarry/tarry.h"

#include <stdio.h>
#include <string.h>

const char *tarry_page_file(const tarry_page *page) {
    const char *slash = strrchr(page->model->file, '/');
    return slash ? slash + 1 : page->model->file;
}

/* A word of the command line as a POSIX shell takes it. */
static void add_word(tarry_text *command, const char *word) {
    static const char plain[] = "abcdefghijklmnopqrstuvwxyzABCDEFGHIJKLMNOPQRSTUVWXYZ0123456789"
                                "_./:=,+-%@";
    tarry_text_add(command, " ", 1);
    if (*word && strspn(word, plain) == strlen(word)) {
        tarry_text_add_string(command, word);
        return;
    }
    tarry_text_add(command, "'", 1);
    for (const char *at = word; *at; at++)
        tarry_text_add_string(command, *at == '\'' ? "'\\''" : (char[]){*at, '\0'});
    tarry_text_add(command, "'", 1);
}

static void add_option(tarry_text *command, const char *option, const char *value) {
    add_word(command, option);
    add_word(command, value);
}

static void add_parameter(tarry_text *command, const tarry_override *override) {
    tarry_text both = {0};
    tarry_text_printf(&both, "%s=%s", override->name, override->value);
    command->failed = command->failed || both.failed;
    if (!both.failed)
        add_option(command, "--set", both.data);
    tarry_text_release(&both);
}

/* Options that were given, but for cells and seed, which are told in any case. */
static void add_given(const tarry_page *page, tarry_text *command) {
    const tarry_provenance *provenance = page->provenance;
    for (size_t i = 0; i < provenance->n_overrides; i++) {
        const tarry_override *override = &provenance->overrides[i];
        if (override->is_parameter)
            add_parameter(command, override);
        else if (strcmp(override->name, "cells") != 0 && strcmp(override->name, "seed") != 0)
            add_option(command, override->option, override->value);
    }
}

/* What only a simulation has. An interrupted one equals one of the cells that were finished. */
static void add_of_simulation(const tarry_page *page, tarry_text *command) {
    char number[32];
    snprintf(number, sizeof number, "%lld", (long long)tarry_results_n_cells(page->results));
    add_option(command, "--cells", number);
    snprintf(number, sizeof number, "%llu", (unsigned long long)page->network->run.seed);
    add_option(command, "--seed", number);
    add_option(command, "--sampler", page->provenance->sampler);
    if (page->provenance->keep > 0) {
        snprintf(number, sizeof number, "%lld", page->provenance->keep);
        add_option(command, "--keep", number);
    }
}

/* What is drawn: nothing that numbers depend on, but the same files come of it. */
static void add_figures(const tarry_figure_options *figures, tarry_text *command) {
    static const char *const words[] = {
#define FIGURE_WORD(name, word) [TARRY_FIGURE_##name] = (word),
        TARRY_FIGURE_FORMATS(FIGURE_WORD)
#undef FIGURE_WORD
    };
    tarry_text genes = {0};
    if (figures->format != TARRY_FIGURE_SVG)
        add_option(command, "--figures", words[figures->format]);
    for (size_t i = 0; i < figures->n_genes; i++)
        tarry_text_printf(&genes, "%s%s", i ? "," : "", figures->genes[i]);
    command->failed = command->failed || genes.failed;
    if (!command->failed && genes.size)
        add_option(command, "--genes", genes.data);
    tarry_text_release(&genes);
}

static void write_command(const tarry_page *page, tarry_text *command) {
    tarry_text_add_string(command, page->exact           ? "tarry predict"
                                   : page->network->data ? "tarry measure"
                                                         : "tarry run");
    add_word(command, tarry_page_file(page));
    add_given(page, command);
    if (!page->exact && !page->network->data)
        add_of_simulation(page, command);
    if (page->provenance->figures)
        add_figures(page->provenance->figures, command);
}

static void add_command(tarry_page *page) {
    tarry_text command = {0};
    write_command(page, &command);
    page->text->failed = page->text->failed || command.failed;
    if (!command.failed) {
        tarry_html_put(page->text, "<pre class=\"command\"><code>");
        tarry_html_lines(page->text, command.data, command.size);
        tarry_html_put(page->text, "</code></pre>\n");
    }
    tarry_text_release(&command);
}

static void add_model(tarry_page *page) {
    tarry_html_put(
        page->text,
        "<section id=\"model\">\n<h2>Model</h2>\n<p>The text of %s, as it was read.</p>\n"
        "<pre class=\"model\" tabindex=\"0\"><code>",
        tarry_page_file(page));
    tarry_html_lines(page->text, page->model->text, page->model->text_size);
    tarry_html_put(page->text, "</code></pre>\n</section>\n");
}

/* Of data the head, and what tells the file from any other. */
static void add_data(tarry_page *page) {
    tarry_html_put(page->text,
                   "<section id=\"data\">\n<h2>Data</h2>\n<p>The first lines of %s:</p>\n"
                   "<pre class=\"model\" tabindex=\"0\"><code>",
                   tarry_page_file(page));
    tarry_html_lines(page->text, page->model->text, page->model->text_size);
    tarry_html_put(page->text,
                   "</code></pre>\n</section>\n"
                   "<section id=\"repeat\">\n<h2>How to repeat this</h2>\n"
                   "<p>With version %s of tarry this command gives the same numbers from the same "
                   "data, on any number of threads:</p>\n",
                   tarry_version());
    add_command(page);
    tarry_html_put(
        page->text,
        "</section>\n<section id=\"cite\">\n<h2>How to cite it</h2>\n"
        "<p>tarry, version %s: the same estimators for simulated and laboratory data. The "
        "measurement is identified by the command above and by its data, a file whose SHA-256 is"
        "</p>\n<p class=\"digest\"><code>%s</code></p>\n</section>\n",
        tarry_version(), page->network->data->sha256);
}

void tarry_page_repeat(tarry_page *page) {
    if (page->network->data) {
        add_data(page);
        return;
    }
    char digest[TARRY_SHA256_TEXT];
    tarry_sha256(page->model->text, page->model->text_size, digest);
    add_model(page);
    tarry_html_put(page->text,
                   "<section id=\"repeat\">\n<h2>How to repeat this run</h2>\n"
                   "<p>Keep the model's text as %s (it stands under <code>model</code> in "
                   "summary.json too), beside it any tables of lags that it names. With version %s "
                   "of tarry this command gives the same numbers%s:</p>\n",
                   tarry_page_file(page), tarry_version(),
                   page->exact ? "" : ", on any number of threads");
    add_command(page);
    tarry_html_put(
        page->text,
        "</section>\n<section id=\"cite\">\n<h2>How to cite it</h2>\n"
        "<p>tarry, version %s: simulation of gene expression, molecule by molecule and "
        "cell by cell. The run is identified by the command above and by its model, whose "
        "text has the SHA-256</p>\n<p class=\"digest\"><code>%s</code></p>\n</section>\n",
        tarry_version(), digest);
}
