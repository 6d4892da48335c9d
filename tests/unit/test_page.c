/* SPDX-License-Identifier: GPL-3.0-or-later */

/* report.html from results that were put together here. Expected sentences and numbers are worked
 * out by hand; markup is escaped as the HTML Living Standard has it (13.1.2, 13.1.4) and so that
 * XML 1.0 (2.2, 2.4) takes it too. How a browser shows the page: tests/cli/page.sh. */
#include "base/table.h"
#include "model/model.h"
#include "report/html.h"
#include "report/page.h"
#include "tally/results.h"
#include "tarry/tarry.h"

#include "faults.h"
#include "support.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

static char model_text[] = "tarry: 1\r\ntitle: \"<b>\"\n# \xe2\x80\xae turned\n";

/* A gene with two alleles, one always on, a named burst; one or two windows. */
static void fill_model(tarry_model *model, uint32_t n_windows) {
    static const double snapshots[] = {600};
    static const tarry_window windows[] = {
        {.name = "before", .from = 0, .to = 60},
        {.name = "after", .from = 120, .to = 600},
    };
    static const tarry_window all = {.name = "all", .from = 0, .to = 600};
    static const tarry_gene genes[] = {
        {.name = "vela", .n_copies = 2, .promoters = {0, 2}, .tells = true},
        {.name = "rigel", .n_copies = 1, .promoters = {2, 3}, .tells = false},
        {.name = "pulse", .n_copies = 1, .tells = true}};
    memset(model, 0, sizeof *model);
    model->text = model_text;
    model->text_size = strlen(model_text);
    model->file = "some/where/it's vela.yaml";
    tarry_network *network = &model->network;
    network->title = "A <title> & \"more\"";
    network->time_unit = "min";
    network->n_genes = 3;
    network->genes = genes;
    network->run = (tarry_run_plan){
        .cells = 200,
        .seed = 7,
        .until = 600,
        .every = 1,
        .n_frames = 601,
        .n_snapshots = 1,
        .snapshots = snapshots,
        .n_windows = n_windows,
        .windows = n_windows > 1 ? windows : &all,
    };
}

static void add(tarry_results *results, const char *gene, const char *window, const char *quantity,
                const char *unit, double value, double spread, double samples) {
    ck_assert_int_eq(tarry_table_add(results->tables[TARRY_TABLE_bursts], NULL, gene, window,
                                     quantity, unit, value, value - spread, value + spread,
                                     samples),
                     0);
}

static tarry_results *new_results(void) {
    tarry_results *results = NULL;
    ck_assert_int_eq(tarry_results_new(&results, NULL), 0);
    results->n_cells = results->n_cells_asked = 200;
    return results;
}

static const tarry_override overrides[] = {
    {"--set", 1, "k_open", "2 * it's"},
    {"--until", 0, "until", "10 h"},
    {"--cells", 0, "cells", "500"},
};

static const tarry_provenance provenance = {.sampler = "direct",
                                            .keep = 2,
                                            .overrides = overrides,
                                            .n_overrides = 3,
                                            .seconds = 1.5,
                                            .threads = 2};

static char *write_page(const tarry_model *model, const tarry_results *results,
                        const tarry_provenance *how, const tarry_figure_list *figures) {
    tarry_text text = {0};
    tarry_error error = {0};
    ck_assert_msg(tarry_page_write(model, results, how, figures, &text, &error) == 0, "%s",
                  error.message);
    return text.data;
}

/* The page of results without pictures, without its tags. */
static char *read_page(const tarry_model *model, const tarry_results *results) {
    const tarry_figure_list none = {0};
    char *page = write_page(model, results, &provenance, &none);
    char *out = page;
    bool inside = false;
    for (const char *at = page; *at; at++) {
        if (*at == '<' || *at == '>')
            inside = *at == '<';
        else if (!inside)
            *out++ = *at;
    }
    *out = '\0';
    return page;
}

static void check_says(const char *page, const char *text) {
    ck_assert_msg(strstr(page, text) != NULL, "the page does not say: %s", text);
}

#define NBSP "\xc2\xa0"

START_TEST(test_escapes) {
    static const struct {
        const char *text, *html;
    } cases[] = {
        {"<a href=\"x\">&'</a>", "&lt;a href=&quot;x&quot;&gt;&amp;&#39;&lt;/a&gt;"},
        {"\xc3\xa4 \xe6\xb0\xb4 \xf0\x9f\x8c\xbf", "\xc3\xa4 \xe6\xb0\xb4 \xf0\x9f\x8c\xbf"},
        {"a\x1b[1m\n\tb\x7f", "a[U+001B][1m[U+000A][U+0009]b[U+007F]"},
        {"\xe2\x80\xaetxt.\xe2\x80\x8b", "[U+202E]txt.[U+200B]"},
        {"\xff\xc3(\xed\xa0\x80", "\xef\xbf\xbd\xef\xbf\xbd(\xef\xbf\xbd\xef\xbf\xbd\xef\xbf\xbd"},
        {"\xef\xbf\xbf\xc2\x85", "[U+FFFF][U+0085]"},
        {"", ""},
    };
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        tarry_text out = {0};
        tarry_text_add(&out, "", 0);
        tarry_html_text(&out, cases[i].text);
        ck_assert_str_eq(out.data, cases[i].html);
        tarry_text_release(&out);
    }
}
END_TEST

START_TEST(test_lines) {
    tarry_text out = {0};
    tarry_html_lines(&out, "a\r\n\tb\rc\n\0d", 10);
    ck_assert_str_eq(out.data, "a\n\tb[U+000D]c\n[U+0000]d");
    tarry_text_release(&out);
    tarry_html_put(&out, "<i title=\"%s\">5 %% of %s</i>", "\"", "<");
    ck_assert_str_eq(out.data, "<i title=\"&quot;\">5 % of &lt;</i>");
    tarry_text_release(&out);
}
END_TEST

static void add_vela(tarry_results *results, const char *window, double frequency, double samples) {
    add(results, "vela", window, "burst_frequency", "/min per allele", frequency, 0.002, samples);
    add(results, "vela", window, "burst_size_mean", "initiations", 17, 1, samples);
    add(results, "vela", window, "silent_fraction", "1", 0.05, 0.01, samples);
    add(results, "vela", window, "active_time_mean", "min", 2.9, 0.1, samples);
    add(results, "vela", window, "inactive_time_mean", "min", 25, 1, samples);
    add(results, "vela", window, "active_fraction", "1", 0.1, 0.012, 200);
    add(results, "vela", window, "initiation_rate", "/min per allele", 0.5, 0.1, 200);
    add(results, "vela", window, "transcript_mean", "molecules per cell", 62, 1, 200);
    add(results, "vela", window, "transcript_fano", "1", 13, 1, 200);
    add(results, "vela", window, "transcript_decay_time", "min", 47, 3, 200);
}

/* 0.035 a minute are 2.1 an hour. */
START_TEST(test_bursting_gene) {
    tarry_model model;
    tarry_results *results = new_results();
    fill_model(&model, 1);
    add_vela(results, "all", 0.035, 400);
    char *page = read_page(&model, results);
    check_says(page,
               "Each of the 2 alleles of vela switches on 2.10" NBSP "times an hour (1.98 to 2.22) "
               "on average, stays on for 2.90" NBSP "min (2.80 to 3.00), and starts 17.0" NBSP
               "transcripts (16.0 to 18.0) each time. 5.0" NBSP "% (4.0 to 6.0) of its bursts are "
               "silent: they end without a transcript being started. Between bursts it is off for "
               "25.0" NBSP "min (24.0 to 26.0) on average; it is on 10.0" NBSP "% (8.8 to 11.2) of "
               "the time. All in all each allele starts 30.0" NBSP "transcripts an hour (24.0 to "
               "36.0). \nA cell holds 62.0" NBSP "finished transcripts (61.0 to 63.0) on average, "
               "with a Fano factor of 13.0 (12.0 to 14.0), more than the 1 of a Poisson law; their "
               "number stays correlated for about 47.0" NBSP "min (44.0 to 50.0). ");
    ck_assert_ptr_null(strstr(page, "rest on"));
    free(page);
    tarry_results_free(results);
}
END_TEST

/* Both windows have the unit in which the larger rate comes to one. */
START_TEST(test_two_windows) {
    tarry_model model;
    tarry_results *results = new_results();
    fill_model(&model, 2);
    add_vela(results, "before", 0.01, 12);
    add_vela(results, "after", 0.035, 400);
    char *page = read_page(&model, results);
    check_says(page,
               "Window before (0 to 60 min). Each of the 2 alleles of vela switches on 0.60" NBSP
               "times an hour (0.48 to 0.72)");
    check_says(page, "These numbers rest on 12 bursts only, so that their intervals are rough.");
    check_says(page, "Window after (120 to 600 min). Each of the 2 alleles of vela switches on "
                     "2.10" NBSP "times an hour");
    check_says(page, "before95 % intervalafter95 % interval");
    check_says(page, "size, mean initiations17.0*16.0 to 18.017.016.0 to 18.0");
    free(page);
    tarry_results_free(results);
}
END_TEST

START_TEST(test_missing_figures) {
    tarry_model model;
    tarry_results *results = new_results();
    fill_model(&model, 1);
    add(results, "vela", "all", "burst_frequency", "/min per allele", 0, NAN, 0);
    add(results, "vela", "all", "burst_size_mean", "initiations", NAN, NAN, 0);
    add(results, "vela", "all", "silent_fraction", "1", NAN, NAN, 0);
    add(results, "vela", "all", "initiation_rate", "/min per allele", 0, NAN, 200);
    add(results, "rigel", "all", "initiation_rate", "/min per allele", 2, 0.1, 200);
    add(results, "rigel", "all", "transcript_mean", "molecules per cell", 20, 1, 200);
    add(results, "rigel", "all", "transcript_fano", "1", 1.01, 0.1, 200);
    add(results, "pulse", "all", "burst_frequency", "/min per cell", 3, 0.1, 900);
    add(results, "pulse", "all", "burst_size_mean", "initiations", 4, 0.12, 900);
    add(results, "pulse", "all", "silent_fraction", "1", 0, NAN, 900);
    char *page = read_page(&model, results);
    check_says(page, "No burst of vela began here in any cell, so that there is no size, length or "
                     "interval of bursts. No transcript is started. ");
    check_says(page, "rigel is always on: every state of its promoter initiates, so that one burst "
                     "cannot be told from the next and numbers on bursts are left out. All in all "
                     "it starts 2.00" NBSP "transcripts a minute (1.90 to 2.10). \nA cell holds "
                     "20.0" NBSP "finished transcripts (19.0 to 21.0) on average, with a Fano "
                     "factor of 1.01 (0.91 to 1.11), not told apart from the 1 of a Poisson law. ");
    check_says(page, "pulse begins 3.00" NBSP "times a minute (2.90 to 3.10) on average and holds "
                     "4.00" NBSP "counted events (3.88 to 4.12) each time. None of its bursts was "
                     "silent, ending without any counted event. ");
    free(page);
    tarry_results_free(results);
}
END_TEST

/* Bursts began, but all were under way when the cells ended. */
START_TEST(test_open_bursts) {
    tarry_model model;
    tarry_results *results = new_results();
    fill_model(&model, 1);
    results->n_cells = results->n_cells_asked = 1;
    add(results, "vela", "all", "burst_frequency", "/min per allele", 0.0005, NAN, 1);
    add(results, "vela", "all", "burst_size_mean", "initiations", NAN, NAN, 0);
    char *page = read_page(&model, results);
    check_says(page,
               "vela switches on 0.7200" NBSP "times a day on average, but no burst that began "
               "here was over when the cells ended, so that nothing is known of their length "
               "and size. ");
    check_says(page, "One cell gives no intervals.");
    free(page);
    tarry_results_free(results);
}
END_TEST

START_TEST(test_frame) {
    tarry_model model;
    tarry_results *results = new_results();
    fill_model(&model, 1);
    results->n_cells = 120;
    add_vela(results, "all", 0.035, 400);
    tarry_provenance partial = provenance;
    partial.partial = true;
    char svg[] = "<svg id=\"gene-vela-sizes\"></svg>";
    tarry_figure items[] = {{.stem = "gene-vela-sizes",
                             .title = "Sizes & such",
                             .caption = "Of <400> bursts.",
                             .alternative = "Falls \"at once\".",
                             .gene = "vela",
                             .svg = svg},
                            {.stem = "gene-vela-dwells", .gene = "vela"}};
    const tarry_figure_options drawn = {.format = TARRY_FIGURE_SVG};
    const tarry_figure_list figures = {.n = 2, .items = items};
    partial.figures = &drawn;
    char *page = write_page(&model, results, &partial, &figures);
    check_says(page, "<h1>A &lt;title&gt; &amp; &quot;more&quot;</h1>");
    check_says(page, "<span class=\"state partial\">Partial run.</span> 120 cells of 200 "
                     "(interrupted), 600 min recorded every 1 min, seed 7; tarry ");
    check_says(page, "<strong>This run was interrupted.</strong>");
    check_says(page, "<figure id=\"gene-vela-sizes\">\n<div class=\"picture\" role=\"img\" "
                     "aria-label=\"Falls &quot;at once&quot;.\">\n<svg id=\"gene-vela-sizes\">"
                     "</svg>\n</div>\n<figcaption><b>Sizes &amp; such.</b> Of &lt;400&gt; bursts."
                     "</figcaption>");
    check_says(page, "<strong>Some figures could not be drawn</strong>");
    check_says(page, "<code>tarry: 1\ntitle: &quot;&lt;b&gt;&quot;\n# [U+202E] turned\n</code>");
    /* Quoted as a POSIX shell has it (2.2.2), then escaped. */
    check_says(page, "<code>tarry run &#39;it&#39;\\&#39;&#39;s vela.yaml&#39; --set &#39;k_open=2 "
                     "* it&#39;\\&#39;&#39;s&#39; --until &#39;10 h&#39; --cells 120 --seed 7 "
                     "--sampler direct --keep 2</code>");
    ck_assert_ptr_null(strstr(page, "some/where"));
    ck_assert_ptr_null(strstr(page, "<script"));
    free(page);
    tarry_results_free(results);
}
END_TEST

/* A thousand genes: one line each, and no sections but for the one that is asked for. */
/* Lags are told of genes that have a section, and of what is no gene. */
START_TEST(test_thousand_genes) {
    tarry_model model;
    static char names[1000][24];
    static tarry_gene genes[1000];
    static const char *const lags[] = {"vela_7.nascent", "vela_8.nascent", "lock.later"};
    tarry_results *results = new_results();
    tarry_provenance named = provenance;
    const char *const wanted[] = {"vela_7"};
    const tarry_figure_options options = {
        .format = TARRY_FIGURE_NONE, .genes = wanted, .n_genes = 1};
    const tarry_figure_list none = {0};
    fill_model(&model, 1);
    named.figures = &options;
    for (int i = 1; i <= 1000; i++) {
        char *name = names[i - 1];
        snprintf(name, sizeof *names, "vela_%d", i);
        genes[i - 1] = (tarry_gene){
            .name = name, .n_copies = 1, .promoters = {0, 1}, .tells = true};
        add(results, name, "all", "burst_frequency", "/min per allele", i, 0.5, 200);
        add(results, name, "all", "burst_size_mean", "initiations", 17, 1, 200);
        add(results, name, "all", "silent_fraction", "1", 0.05, 0.01, 200);
        add(results, name, "all", "transcript_mean", "molecules per cell", 62, 1, 200);
    }
    model.network.n_genes = 1000;
    model.network.genes = genes;
    for (size_t i = 0; i < sizeof lags / sizeof *lags; i++)
        ck_assert_int_eq(tarry_table_add(results->tables[TARRY_TABLE_transit], NULL, lags[i], "",
                                         "all", 1.0, 2.0, 3.0, 4.0, 0.0),
                         0);
    char *page = write_page(&model, results, &named, &none);
    ck_assert_uint_lt(strlen(page), 1000000);
    check_says(page, "<summary>All 1000 genes, a line each</summary>");
    check_says(page, "<tr><th scope=\"row\">vela_1000</th><td class=\"n\">1000</td>"
                     "<td class=\"n\">17</td><td class=\"n\">0.05000</td><td class=\"n\">62</td>");
    check_says(page, "<th scope=\"row\"><a href=\"#gene-vela_7\">vela_7</a></th>");
    check_says(page, "<section id=\"gene-vela_7\">");
    check_says(page, "; script-src 'sha256-");
    ck_assert_ptr_null(strstr(page, "<section id=\"gene-vela_8\">"));
    check_says(page, "<th scope=\"row\">vela_7.nascent</th>");
    check_says(page, "<th scope=\"row\">lock.later</th>");
    ck_assert_ptr_null(strstr(page, "vela_8.nascent"));
    free(page);
    tarry_results_free(results);
}
END_TEST

START_TEST(test_faults_of_page) {
    tarry_model model;
    const tarry_figure_list none = {0};
    fill_model(&model, 2);
    for (int many = 0; many < 2; many++) {
        tarry_results *results = new_results();
        add_vela(results, "before", 0.01, 12);
        for (int i = 0; many && i < 30; i++) {
            char name[24];
            snprintf(name, sizeof name, "vela_%d", i);
            add(results, name, "after", "burst_frequency", "/min per allele", i, 0.5, 200);
        }
        long n = 0;
        for (;; n++) {
            tarry_text text = {0};
            tarry_error error = {0};
            faults_arm(FAULT_MEMORY, n, 0);
            const int status = tarry_page_write(&model, results, &provenance, &none, &text, &error);
            const bool struck = faults_struck();
            faults_clear();
            tarry_text_release(&text);
            if (!struck) {
                ck_assert_int_eq(status, 0);
                break;
            }
            ck_assert_int_eq(status, TARRY_MEMORY);
            ck_assert_int_eq((int)error.code, TARRY_MEMORY);
        }
        ck_assert_int_ge(n, 10);
        tarry_results_free(results);
    }
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"escapes", test_escapes},
        {"lines", test_lines},
        {"bursting gene", test_bursting_gene},
        {"two windows", test_two_windows},
        {"missing figures", test_missing_figures},
        {"open bursts", test_open_bursts},
        {"frame", test_frame},
        {"thousand genes", test_thousand_genes},
        {"faults of the page", test_faults_of_page},
    };
    return run_tests("page", tests, sizeof tests / sizeof *tests);
}
