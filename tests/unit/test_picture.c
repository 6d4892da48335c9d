/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Pictures after gnuplot. Expected texts are written out by hand. */

#include "report/picture.h"
#include "support.h"

#include <stdlib.h>
#include <string.h>

START_TEST(wholeness) {
    static const struct {
        tarry_figure_format format;
        const char *bytes;
    } whole[] = {
        {TARRY_FIGURE_SVG, "<svg>\n</svg>\n\n"},
        {TARRY_FIGURE_PDF, "%PDF-1.5\nstartxref\n12\n%%EOF\n"},
        {TARRY_FIGURE_PNG, "\x89PNG....IEND\xae\x42\x60\x82"},
    };
    for (size_t i = 0; i < sizeof whole / sizeof *whole; i++) {
        size_t n = strlen(whole[i].bytes);
        while (n > 0 && strchr("\n", whole[i].bytes[n - 1]))
            n--;
        ck_assert(tarry_picture_is_whole(whole[i].format, whole[i].bytes, strlen(whole[i].bytes)));
        ck_assert(tarry_picture_is_whole(whole[i].format, whole[i].bytes, n));
        for (size_t part = 0; part < n; part++)
            ck_assert(!tarry_picture_is_whole(whole[i].format, whole[i].bytes, part));
        for (size_t j = 0; j < sizeof whole / sizeof *whole; j++)
            ck_assert_int_eq(tarry_picture_is_whole(whole[j].format, whole[i].bytes, n), i == j);
    }
    ck_assert(!tarry_picture_is_whole(TARRY_FIGURE_NONE, "", 0));
}
END_TEST

START_TEST(dates) {
    char pdf[] = "1 0 obj\n<< /Producer (x)\n   /CreationDate (D:20261201090810Z)\n"
                 "   /ModDate (D:20261201090811+01'00)\n>>\n/CreationDate (D:2026";
    const size_t n = strlen(pdf);
    ck_assert(tarry_picture_fix_dates(pdf, n));
    ck_assert_str_eq(pdf, "1 0 obj\n<< /Producer (x)\n   /CreationDate (D:19700101000000Z)\n"
                          "   /ModDate (D:19700101000000+01'00)\n>>\n/CreationDate (D:2026");
    char none[] = "/CreationDate (D";
    ck_assert(!tarry_picture_fix_dates(none, strlen(none)));
    ck_assert_str_eq(none, "/CreationDate (D");
}
END_TEST

START_TEST(inlining) {
    static const char file[] =
        "<?xml version=\"1.0\"?>\n"
        "<svg \n viewBox=\"0 0 322 240\"\n xmlns=\"http://www.w3.org/2000/svg\"\n>\n\n"
        "<title>Gnuplot</title>\n<desc>Produced by</desc>\n"
        "<g id=\"gnuplot_canvas\">\n"
        "<rect x=\"0\" y=\"0\" width=\"322\" height=\"240\" fill=\"#ffffff\"/>\n"
        "<defs>\n\t<circle id='gpDot' r='0.5'/>\n"
        "\t<filter id='textbox' x='0'>\n\t <feFlood/>\n\t</filter>\n</defs>\n"
        "<g fill=\"none\" color=\"black\" stroke=\"currentColor\">\n</g>\n"
        "<g fill=\"none\" color=\"black\" stroke=\"black\">\n"
        "\t<path stroke='black'  d='M1,2'/>\t<g fill=\"black\">\n"
        "\t\t<text> id=\"black\" a  &lt; b</text>\n\t</g>\n"
        "<use xlink:href='#gpDot' color='rgb( 26, 114, 143)'/></g>\n</g>\n</svg>\n\n";
    tarry_text text = {0};
    tarry_picture_inline(file, "gene-a", &text);
    ck_assert_str_eq(text.data,
                     "<svg \n viewBox=\"0 0 322 240\"\n xmlns=\"http://www.w3.org/2000/svg\"\n>\n"
                     "<g id=\"gene-a-gnuplot_canvas\">\n"
                     "<defs>\t<circle id='gene-a-gpDot' r='0.5'/>\t</defs>\n"
                     "<g fill=\"none\" color=\"inherit\" stroke=\"currentColor\">"
                     "\t<path stroke='currentColor'  d='M1,2'/>\t<g fill=\"currentColor\">"
                     "\t<text> id=\"black\" a &lt; b</text>\t</g>\n"
                     "<use xlink:href='#gene-a-gpDot' color='rgb( 26, 114, 143)'/></g>\n</g>\n"
                     "</svg>\n");
    tarry_text_release(&text);
}
END_TEST

START_TEST(what_is_no_svg) {
    static const char *const files[] = {"",          "no tag", "<svg", "<svg ><title>open",
                                        "<svg <g <", "<"};
    for (size_t i = 0; i < sizeof files / sizeof *files; i++) {
        tarry_text text = {0};
        tarry_picture_inline(files[i], "s", &text);
        ck_assert(!text.failed);
        tarry_text_release(&text);
    }
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"wholeness", wholeness},
        {"dates", dates},
        {"inlining", inlining},
        {"what is no SVG", what_is_no_svg},
    };
    return run_tests("picture", tests, sizeof tests / sizeof *tests);
}
