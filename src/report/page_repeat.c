/* SPDX-License-Identifier: GPL-3.0-or-later */

/* What somebody else needs to get the same numbers: model, command, version. */
#include "base/file.h"
#include "report/html.h"
#include "report/page_parts.h"
#include "report/repeat.h"
#include "tarry/tarry.h"

static void add_command(tarry_page *page) {
    tarry_text command = {0};
    tarry_repeat_command(page->model, page->results, page->provenance, &command);
    page->text->failed = page->text->failed || command.failed;
    if (!command.failed) {
        tarry_html_put(page->text, "<pre class=\"command\"><code>");
        tarry_html_lines(page->text, command.data, command.size);
        tarry_html_put(page->text, "</code></pre>\n");
    }
    tarry_text_release(&command);
}

static void add_model(tarry_page *page, const tarry_model *model) {
    tarry_html_put(
        page->text,
        "<section id=\"model\">\n<h2>Model</h2>\n<p>The text of %s, as it was read.</p>\n"
        "<pre class=\"model\" tabindex=\"0\"><code>",
        tarry_repeat_file(model));
    tarry_html_lines(page->text, model->text, model->text_size);
    tarry_html_put(page->text, "</code></pre>\n</section>\n");
}

/* Of data the head, and what tells the file from any other. */
static void add_data(tarry_page *page) {
    tarry_html_put(page->text,
                   "<section id=\"data\">\n<h2>Data</h2>\n<p>The first lines of %s:</p>\n"
                   "<pre class=\"model\" tabindex=\"0\"><code>",
                   tarry_repeat_file(page->model));
    tarry_html_lines(page->text, page->model->text, page->model->text_size);
    tarry_html_put(page->text, "</code></pre>\n</section>\n");
    if (page->network->data->beside)
        add_model(page, page->network->data->beside);
    tarry_html_put(page->text,
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
    add_model(page, page->model);
    tarry_html_put(page->text,
                   "<section id=\"repeat\">\n<h2>How to repeat this run</h2>\n"
                   "<p>Keep the model's text as %s (it stands under <code>model</code> in "
                   "summary.json too), beside it any tables of lags that it names. With version %s "
                   "of tarry this command gives the same numbers%s:</p>\n",
                   tarry_repeat_file(page->model), tarry_version(),
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
