/* SPDX-License-Identifier: GPL-3.0-or-later */

/* The two texts of a figure. What gnuplot makes of them is asked of gnuplot itself. */

#include "report/plot.h"
#include "report/plotter.h"
#include "support.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

static char *read_file(const char *path) {
    static char bytes[1 << 16];
    FILE *file = fopen(path, "rb");
    ck_assert_msg(file != NULL, "%s is missing", path);
    bytes[fread(bytes, 1, sizeof bytes - 1, file)] = '\0';
    ck_assert_int_eq(fclose(file), 0);
    return bytes;
}

static void put_file(const char *path, const char *text) {
    FILE *file = fopen(path, "wb");
    ck_assert_ptr_nonnull(file);
    ck_assert_int_ne(fputs(text, file), EOF);
    ck_assert_int_eq(fclose(file), 0);
}

/* Run gnuplot over a script in the test's folder; what it says is returned. */
static const char *gnuplot(const char *script) {
    const char *const words[] = {"gnuplot", "-d", "script.gp", NULL};
    const tarry_plotter_job job = {.program = "gnuplot",
                                   .words = words,
                                   .folder = test_folder(),
                                   .log = "said.txt",
                                   .seconds = 30};
    tarry_plotter_end end;
    int status;
    put_file(test_path("script.gp"), script);
    ck_assert_int_eq(tarry_plotter_run(&job, &end, &status, NULL), 0);
    const char *said = read_file(test_path("said.txt"));
    ck_assert_msg(end == TARRY_PLOTTER_DONE, "end %d, status %d: %s", (int)end, status, said);
    return said;
}

static const char *const hostile[] = {
    "plain",
    "it's",
    "'",
    "''quoted''",
    "`touch pwned`",
    "$(touch pwned)",
    "'.system('touch pwned').'",
    "@model @@",
    "back\\slash \\n \\",
    "\"double\" \"",
    "{/Symbol a}_3^{x} ~a{b}",
    "# no comment",
    "50 % %g %s",
    "\xc3\xa4\xe6\xbc\xa2",
    "a\tb\nc\rd\x7f",
    "a; !touch pwned",
};

enum { N_HOSTILE = sizeof hostile / sizeof *hostile };

START_TEST(gnuplot_reads_texts_as_they_are) {
    tarry_text script = {0};
    char expected[1024] = "";
    tarry_text_add_string(&script, "set encoding utf8\n");
    for (size_t i = 0; i < N_HOSTILE; i++) {
        tarry_text_add_string(&script, "print ");
        tarry_plot_quote(&script, hostile[i]);
        tarry_text_add_string(&script, "\n");
        char *end = expected + strlen(expected);
        for (const char *c = hostile[i]; *c; c++)
            if (*c == '\'')
                end = stpcpy(end, "\xe2\x80\x99");
            else
                *end++ = strchr("\t\n\r\x7f", *c) ? ' ' : *c;
        strcpy(end, "\n");
    }
    ck_assert_str_eq(gnuplot(script.data), expected);
    FILE *pwned = fopen(test_path("pwned"), "r");
    ck_assert_ptr_null(pwned);
    tarry_text_release(&script);
}
END_TEST

START_TEST(quoting) {
    tarry_text text = {0};
    tarry_plot_quote(&text, "it's `x` \\\n");
    ck_assert_str_eq(text.data, "'it\xe2\x80\x99s `x` \\ '");
    tarry_text_release(&text);
}
END_TEST

/* Two panels: a line with a band and bars; a law and a shade. */
static void fill(tarry_plot *plot) {
    *plot = (tarry_plot){.heading = "Lines of vela",
                         .title = "A title that isn't `safe`",
                         .x_label = "time (min)",
                         .y_label = "mean",
                         .x_name = "time",
                         .y_name = "mean"};
    tarry_plot_add_panel(plot, "one, two");
    tarry_plot_add_series(plot, TARRY_SERIES_LINE, "line", 0);
    tarry_plot_add_row(plot, 0, 1.5, 1, 2);
    tarry_plot_add_row(plot, 1, 2.5, NAN, NAN);
    tarry_plot_add_series(plot, TARRY_SERIES_BARS, "bars", 6);
    tarry_plot_add_wide_row(plot, 0.5, 2, 0.25, 0.125, 0.5);
    tarry_plot_add_mark(plot, 0.5, false, -1);
    tarry_plot_add_mark(plot, NAN, false, -1);
    tarry_plot_add_panel(plot, "")->log_y = true;
    tarry_plot_add_series(plot, TARRY_SERIES_LAW, "law", 0);
    tarry_plot_add_wide_row(plot, 3, 1, 0.1, NAN, NAN);
    tarry_plot_add_series(plot, TARRY_SERIES_SHADE, "shade \"x\"", -1);
    tarry_plot_add_wide_row(plot, 2, 0.5, NAN, NAN, NAN);
    ck_assert(!plot->failed);
}

START_TEST(data) {
    tarry_plot plot;
    tarry_text text = {0};
    fill(&plot);
    tarry_plot_write_data(&plot, &text);
    ck_assert_str_eq(text.data, "panel,series,time,width,mean,low,high\n"
                                "\"one, two\",line,0,,1.5,1,2\n"
                                "\"one, two\",line,1,,2.5,,\n"
                                "\"one, two\",bars,0.5,2,0.25,0.125,0.5\n"
                                ",law,3,1,0.1,,\n"
                                ",\"shade \"\"x\"\"\",2,0.5,,,\n");
    tarry_text_release(&text);
    tarry_plot_release(&plot);
}
END_TEST

/* Does the script hold this text? */
static void has(const tarry_text *script, const char *text) {
    ck_assert_msg(strstr(script->data, text) != NULL, "no '%s' in\n%s", text, script->data);
}

START_TEST(script) {
    tarry_plot plot;
    tarry_text text = {0};
    fill(&plot);
    tarry_plot_write_script(&plot, "gene-vela-lines", "gene-vela-lines.pdf", TARRY_FIGURE_PDF,
                            &text);
    has(&text, "# Lines of vela, from gene-vela-lines.csv.");
    has(&text, "model = 'A title that isn\xe2\x80\x99t `safe`'\n");
    has(&text, "data = 'gene-vela-lines.csv'\n");
    has(&text, "set output 'gene-vela-lines.pdf'\n");
    has(&text, "set terminal pdfcairo noenhanced ");
    has(&text, "data every ::0::1 using 3:6:7 with filledcurves");
    has(&text, "data every ::0::1 using 3:5 with lines");
    has(&text, "data every ::2::2 using 3:($5/$4):4 with boxes");
    has(&text, "data every ::3::3 using 3:($5/$4) with lines");
    has(&text,
        "data every ::4::4 using ($3 + 0.5*$4):(foot):3:($3 + $4):(foot):(head) with boxxyerror");
    has(&text, "set label 10 'line' ");
    has(&text, "'shade \"x\"'");
    has(&text, "set arrow from first 0.5, graph 0 to first 0.5, graph 1 nohead");
    ck_assert_ptr_null(strstr(text.data, "nan"));
    ck_assert_ptr_null(strstr(text.data, "inf"));
    ck_assert_ptr_null(strchr(text.data, '\t'));
    tarry_text_release(&text);
    tarry_plot_release(&plot);
}
END_TEST

/* gnuplot counts the rows as we do: with the data beside it, each kind of series is read without a
 * word, and a picture comes of every format. */
START_TEST(gnuplot_draws_it) {
    static const struct {
        tarry_figure_format format;
        const char *output, *start;
    } kinds[] = {{TARRY_FIGURE_SVG, "p.svg", "<?xml"},
                 {TARRY_FIGURE_PDF, "p.pdf", "%PDF-"},
                 {TARRY_FIGURE_PNG, "p.png", "\x89PNG"}};
    for (size_t i = 0; i < sizeof kinds / sizeof *kinds; i++) {
        tarry_plot plot;
        tarry_text text = {0}, csv = {0};
        fill(&plot);
        tarry_plot_write_data(&plot, &csv);
        tarry_plot_write_script(&plot, "p", kinds[i].output, kinds[i].format, &text);
        put_file(test_path("p.csv"), csv.data);
        ck_assert_str_eq(gnuplot(text.data), "");
        ck_assert_int_eq(
            strncmp(read_file(test_path(kinds[i].output)), kinds[i].start, strlen(kinds[i].start)),
            0);
        tarry_text_release(&text);
        tarry_text_release(&csv);
        tarry_plot_release(&plot);
    }
}
END_TEST

/* The corner cases of an axis: nothing to show, one point, zeros on a logarithm, a flat curve. */
START_TEST(axes) {
    static const struct {
        double y[3];
        bool log_y;
        const char *range;
    } cases[] = {
        {{NAN, NAN, NAN}, false, "set yrange [0:1]\n"},
        {{NAN, NAN, NAN}, true, "set yrange [0.1:1]\n"},
        {{0, 0, 0}, false, "set yrange [0:1.06]\n"},
        {{0, 0, 0}, true, "set yrange [0.1:1]\n"},
        {{4, 4, 4}, false, "set yrange [0:4.24]\n"},
        {{-1, 0, 0}, false, "set yrange [-1.06:0]\n"},
        {{1, 0.5, 0}, true, "set yrange [0.1:1]\n"},
        {{20, 1e-9, 0}, true, "set yrange [0.00316228:100]\n"},
    };
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        tarry_plot plot = {.heading = "h",
                           .title = "",
                           .x_label = "",
                           .y_label = "",
                           .x_name = "x",
                           .y_name = "y"};
        tarry_text text = {0};
        tarry_plot_add_panel(&plot, "")->log_y = cases[i].log_y;
        tarry_plot_add_series(&plot, TARRY_SERIES_LINE, "", 0);
        for (int j = 0; j < 3; j++)
            tarry_plot_add_row(&plot, 2, cases[i].y[j], NAN, NAN);
        tarry_plot_write_script(&plot, "s", "s.svg", TARRY_FIGURE_SVG, &text);
        has(&text, cases[i].range);
        has(&text, "set xrange [1.5:2.5]\n");
        tarry_text_release(&text);
        tarry_plot_release(&plot);
    }
}
END_TEST

START_TEST(long_legends_go_on_in_the_next_line) {
    tarry_plot plot = {
        .heading = "h", .title = "", .x_label = "", .y_label = "", .x_name = "x", .y_name = "y"};
    static const char *const names[] = {"a name of some length", "another of some length",
                                        "a name of some length", "a third one"};
    tarry_plot_add_panel(&plot, "");
    const int empty = tarry_plot_height(&plot);
    for (int i = 0; i < 4; i++) {
        tarry_plot_add_series(&plot, TARRY_SERIES_LINE, names[i], i);
        tarry_plot_add_row(&plot, i, i, NAN, NAN);
    }
    ck_assert_int_eq(tarry_plot_height(&plot), empty + 2 * 13);
    tarry_plot_release(&plot);
}
END_TEST

START_TEST(dropping) {
    tarry_plot plot;
    fill(&plot);
    tarry_plot_drop_zeros(&plot);
    ck_assert_uint_eq(plot.n_rows, 4); /* the shade has no y */
    ck_assert_uint_eq(plot.series[3].n_rows, 0);
    tarry_plot_drop_empty_series(&plot);
    ck_assert_uint_eq(plot.n_series, 3);
    tarry_plot_drop_empty_panel(&plot);
    ck_assert_uint_eq(plot.n_panels, 2);
    tarry_plot_add_panel(&plot, "empty");
    tarry_plot_add_mark(&plot, 1, true, 0);
    tarry_plot_drop_empty_panel(&plot);
    ck_assert_uint_eq(plot.n_panels, 2);
    ck_assert_uint_eq(plot.n_marks, 1);
    tarry_plot_release(&plot);
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"quoting", quoting},
        {"gnuplot reads texts as they are", gnuplot_reads_texts_as_they_are},
        {"data", data},
        {"script", script},
        {"gnuplot draws it", gnuplot_draws_it},
        {"axes", axes},
        {"long legends", long_legends_go_on_in_the_next_line},
        {"dropping", dropping},
    };
    return run_tests("plot", tests, sizeof tests / sizeof *tests);
}
