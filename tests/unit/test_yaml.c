/* SPDX-License-Identifier: GPL-3.0-or-later */

/* The tree of a model file: what is read, every refusal with its place, and sizes. What is right is
 * YAML 1.1 (yaml.org/spec/1.1) where the text is accepted, and design.md's list of refusals. Places
 * are counted by hand. */
#include "base/memory.h"
#include "base/text.h"
#include "model/mend.h"
#include "model/yaml.h"
#include "support.h"

#include <check.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>

static tarry_arena arena;
static tarry_error error;

static void set_up(void) {
    arena = (tarry_arena){0};
    memset(&error, 0, sizeof error);
}

static void tear_down(void) {
    tarry_arena_release(&arena);
}

static const tarry_node *read_text(const char *text) {
    const tarry_node *root = NULL;
    int code = tarry_yaml_read(text, strlen(text), "m.yaml", &arena, &root, &error);
    ck_assert_msg(code == 0, "%d:%d: %s", error.line, error.column, error.message);
    ck_assert_ptr_nonnull(root);
    return root;
}

static void check_refused_bytes(const char *text, size_t size, int line, int column,
                                const char *words) {
    const tarry_node *root = NULL;
    memset(&error, 0, sizeof error);
    int code = tarry_yaml_read(text, size, "m.yaml", &arena, &root, &error);
    ck_assert_msg(code == TARRY_INPUT, "accepted: %s", text);
    ck_assert_msg(error.line == line && error.column == column && strstr(error.message, words),
                  "%s\nexpected %d:%d: ...%s...\ngot      %d:%d: %s", text, line, column, words,
                  error.line, error.column, error.message);
    ck_assert_str_eq(error.file, "m.yaml");
    ck_assert_ptr_null(root);
}

static void check_refused(const char *text, int line, int column, const char *words) {
    check_refused_bytes(text, strlen(text), line, column, words);
}

static void check_scalar(const tarry_node *node, const char *text, bool quoted, int line,
                         int column) {
    ck_assert_ptr_nonnull(node);
    ck_assert_int_eq(node->kind, TARRY_NODE_SCALAR);
    ck_assert_str_eq(node->text, text);
    ck_assert_int_eq(node->quoted, quoted);
    ck_assert_int_eq(node->place.line, line);
    ck_assert_int_eq(node->place.column, column);
}

START_TEST(maps_lists_and_scalars) {
    const tarry_node *root = read_text("a: 1\n"
                                       "b:\n"
                                       "  - x y\n"
                                       "  - {on: off, n: \"q # r\"}\n"
                                       "  - []\n"
                                       "c:\n"
                                       "d: 'it''s'\n"
                                       "e: |\n"
                                       "  two\n"
                                       "  lines\n");
    ck_assert_int_eq(root->kind, TARRY_NODE_MAP);
    ck_assert_uint_eq(root->n, 5);
    ck_assert_str_eq(root->entries[1].key, "b");
    ck_assert_int_eq(root->entries[1].place.line, 2);
    ck_assert_int_eq(root->entries[1].place.column, 1);
    check_scalar(tarry_node_get(root, "a"), "1", false, 1, 4);
    const tarry_node *list = tarry_node_get(root, "b");
    ck_assert_int_eq(list->kind, TARRY_NODE_LIST);
    ck_assert_uint_eq(list->n, 3);
    ck_assert_ptr_null(list->entries[0].key);
    check_scalar(list->entries[0].node, "x y", false, 3, 5);
    const tarry_node *map = list->entries[1].node;
    check_scalar(tarry_node_get(map, "on"), "off", false, 4, 10);
    check_scalar(tarry_node_get(map, "n"), "q # r", true, 4, 19);
    ck_assert_uint_eq(list->entries[2].node->n, 0);
    check_scalar(tarry_node_get(root, "c"), "", false, 6, 3);
    check_scalar(tarry_node_get(root, "d"), "it's", true, 7, 5);
    ck_assert_str_eq(tarry_node_get(root, "e")->text, "two\nlines\n");
    ck_assert_ptr_null(tarry_node_get(root, "f"));
}
END_TEST

START_TEST(columns_count_characters) {
    /* U+00B5 and U+1F9EC take two and four bytes; U+FEFF before all else is a byte order mark. */
    const tarry_node *root = read_text("\xef\xbb\xbf{\xc2\xb5\xf0\x9f\xa7\xac: x}\r\n");
    check_scalar(root->entries[0].node, "x", false, 1, 6);
    ck_assert_str_eq(root->entries[0].key, "\xc2\xb5\xf0\x9f\xa7\xac");
    check_refused("a: '\xc2\xb5\xc2\xb5' x\n", 1, 9, "in a map every line is 'key: value'");
    check_refused("{\xc2\xb5: *x}\n", 1, 5, "aliases ('*x')");
    check_refused("\xc2\xb5: 1\n\xc2\xb5\xc2\xb5: {\xc2\xb5: f(1, 2}\n", 2, 9, "f(1");
}
END_TEST

START_TEST(what_is_refused) {
    check_refused("", 1, 1, "nothing in this file");
    check_refused("# only a remark\n", 1, 1, "nothing in this file");
    check_refused("---\n...\n", 1, 1, "nothing in this file");
    check_refused("a: &x 1\nb: 2\n", 1, 4, "anchors");
    check_refused("a: &x {b: 1}\n", 1, 4, "anchors");
    check_refused("a: &x [b]\n", 1, 4, "anchors");
    check_refused("a: *x\n", 1, 4, "aliases ('*x')");
    check_refused("a: !!str 1\n", 1, 4, "tags");
    check_refused("a: ! 1\n", 1, 4, "tags");
    check_refused("a: !t {b: 1}\n", 1, 4, "tags");
    check_refused("a: !t [b]\n", 1, 4, "tags");
    check_refused("%TAG ! tag:x,2000:\n---\na: 1\n", 1, 1, "tags");
    check_refused("a: 1\nb:\n  <<: {c: 1}\n", 3, 3, "merge keys");
    check_refused("a: 1\n---\nb: 1\n", 2, 1, "a second document");
    check_refused("a: 1\nb: 2\n'a': 3\n", 3, 2,
                  "the key 'a' stands twice in this map, first in "
                  "line 1");
    check_refused("? [a]\n: 1\n", 1, 3, "where a key is due");
    check_refused("{{a: b}: c}\n", 1, 2, "where a key is due");
    check_refused("a: {\"\": 2}\n", 1, 6, "a key is missing before ':'");
}
END_TEST

START_TEST(bytes_that_are_refused) {
    check_refused_bytes("a: b\0c\n", 7, 1, 5, "a NUL character");
    check_refused("a: \"b\\0c\"\n", 1, 5, "a control character");
    check_refused("a: \"b\\x1bc\"\n", 1, 5, "a control character");
    check_refused("a: 1\nb: \x1b\n", 2, 4, "U+001B");
    check_refused("a: 1\rb: \x1b\n", 2, 4, "U+001B");
    check_refused("a: 1\r\nb: \xc2\x9b\n", 2, 4, "U+009B");
    check_refused("a: \xef\xbb\xbf\n", 1, 4, "U+FEFF");
    check_refused("a: 1\nb: \xb5m\n", 2, 4, "the byte 0xb5 here is not UTF-8");
    /* RFC 3629: no overlong forms, no surrogates, nothing above U+10FFFF, no cut sequences. */
    check_refused("a: \xc0\xaf\n", 1, 4, "not UTF-8");
    check_refused("a: \xe0\x9f\xbf\n", 1, 4, "not UTF-8");
    check_refused("a: \xed\xa0\x80\n", 1, 4, "not UTF-8");
    check_refused("a: \xf4\x90\x80\x80\n", 1, 4, "not UTF-8");
    check_refused("a: \xe2\x82", 1, 4, "not UTF-8");
    check_refused("a: \xc2\x41\n", 1, 4, "not UTF-8");
    check_refused("a: \xe2\x82\x41\n", 1, 4, "not UTF-8");
    check_refused("a: \x7f\n", 1, 4, "U+007F");
    check_refused("a: \xef\xbf\xbe\n", 1, 4, "U+FFFE");
    check_refused("a: \xef\xbf\xbf\n", 1, 4, "U+FFFF");
    check_refused_bytes("\xfe\xff\0a", 4, 1, 1, "UTF-16");
    check_refused_bytes("\xff\xfe"
                        "a\0:\0",
                        6, 1, 1, "UTF-16");
}
END_TEST

START_TEST(what_is_no_yaml) {
    check_refused("a: b: c\n", 1, 5, "a ':' does not fit here");
    check_refused("a: 1\n b: 2\n", 2, 3, "a ':' does not fit here");
    check_refused("a: - b\n", 1, 4, "a '- ' does not fit here");
    check_refused("a:\n\t b: 1\n", 2, 1, "a tab cannot indent");
    check_refused("a: @x\n", 1, 4, "a text cannot begin with '@'");
    check_refused("a: `x\n", 1, 4, "a text cannot begin with '`'");
    check_refused("a: %x\n", 1, 4, "a text cannot begin with '%'");
    check_refused("a: 1\nb\n", 3, 1, "a ':' is missing");
    check_refused("a: [1, 2\nb: 3\n", 2, 2, "a ',' or ']' is missing");
    check_refused("a: {b: 1\nc: [}\n", 2, 2, "a ',' or '}' is missing");
    check_refused("a: \"x\n", 2, 1, "close the quotes");
    check_refused("a: \"\\q\"\n", 1, 5, "'\\' means nothing");
    check_refused("a: \"\\xg\"\n", 1, 7, "hexadecimal");
    check_refused("a: \"\\ud800\"\n", 1, 7, "no Unicode character");
    check_refused("- a\nb: 1\n", 2, 1, "in a list every item");
    check_refused("a: 1\n- b\n", 2, 1, "in a map every line");
    check_refused("a: | x\n", 1, 6, "begins on the next");
    check_refused("a: 'x\n--- y\n'", 2, 1, "inside a text in quotes");
    check_refused("a: * b\n", 1, 5, "stands in quotes");
    check_refused("%NOT 1\n---\na: 1\n", 1, 5, "a line cannot begin with '%'");
}
END_TEST

/* A call inside { } or [ ] is parted by YAML at its commas. */
START_TEST(calls_that_yaml_split) {
    check_refused("genes:\n  vela:\n    to: {open: k_open * repress(deneb.protein, 40, 2)}\n", 3,
                  16, "to: {open: \"k_open * repress(deneb.protein, 40, 2)\"}");
    check_refused("a: [x, min(b, c) + 2, y]\n", 1, 8, "a: [x, \"min(b, c) + 2\", y]");
    check_refused("a: {b: hill(x, 2, 2) * hill(y, 2, 2), c: 'q, r(', d: max(1, 2) , e: 3}\n", 1, 8,
                  "a: {b: \"hill(x, 2, 2) * hill(y, 2, 2)\", c: 'q, r(', d: \"max(1, 2)\" , e: 3}");
    check_refused("a: {b: min(c,\n        d), e: 1}\n", 1, 8, "a: {b: \"min(c, d)\", e: 1}");
    check_refused("a:\n  {b: 1,\n   c: max(min(1, 2), 3)}\n", 3, 7, "c: \"max(min(1, 2), 3)\"}");
    check_refused("a: {b: min(c, d}\n", 1, 8, "a '(' that is not closed");
    check_refused("a: {b: min(1, 2), c: 'x(\\', d: max(3, 4), e: max(5}\n", 1, 8,
                  "a: {b: \"min(1, 2)\", c: 'x(\\', d: \"max(3, 4)\", e: max(5}");
    check_refused("a: {b: min(c\n", 1, 8, "a '(' that is not closed");
    const tarry_node *root = read_text("a: {b: (c + d) * 2, e: \"min(1, 2)\"}\nf: min(1, 2)\n"
                                       "title: seen (once, twice\n");
    ck_assert_str_eq(tarry_node_get(root, "f")->text, "min(1, 2)");
    ck_assert_str_eq(tarry_node_get(tarry_node_get(root, "a"), "e")->text, "min(1, 2)");
}
END_TEST

/* The value in which a call is split begins at the first "m". */
START_TEST(mended_lines) {
    static const struct {
        const char *text, *mended; /* NULL: it cannot be told how */
    } cases[] = {
        {"a: {b: min(c,\r\n d), e: 1}\r\nf: 2", "a: {b: \"min(c, d)\", e: 1}"},
        {"a: {b: min(c,\n\n  d), e: 1}", "a: {b: \"min(c, d)\", e: 1}"},
        {"x: 1\n\t a: [min(1, 2),\t3]", "a: [\"min(1, 2)\",\t3]"},
        {"a: {b: min(1, 2) , c: \"x \\\" (\", d: max(3, 4)}",
         "a: {b: \"min(1, 2)\" , c: \"x \\\" (\", d: \"max(3, 4)\"}"},
        {"a: {b: min(1, 2), c: 'open (", "a: {b: \"min(1, 2)\", c: 'open ("},
        {"a: {b: min(1, 2), c: \"open \\", "a: {b: \"min(1, 2)\", c: \"open \\"},
        {"a: {b: min(1, 2), c: x:y, d: {e: 3}}", "a: {b: \"min(1, 2)\", c: x:y, d: {e: 3}}"},
        {"a: {b: min(1, 2)} # and (so", "a: {b: \"min(1, 2)\"} # and (so"},
        {"a: {b: min(1, 2), c: (3, d: 4", "a: {b: \"min(1, 2)\", c: (3, d: 4"},
        {"a: {b: min(1 # 2)}", NULL},
        {"a: {b: min(1, {2)}", NULL},
        {"a: {b: min(1, [2)}", NULL},
        {"a: {b: min(1, 2", NULL},
        {"a: {b: min(1, 2]", NULL},
    };
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        const char *text = cases[i].text;
        tarry_text out = {0};
        const size_t at = (size_t)(strstr(text, "min") - text);
        const bool told = tarry_mend_line(text, strlen(text), at, &out);
        ck_assert_msg(told == (cases[i].mended != NULL), "%s", text);
        if (told)
            ck_assert_str_eq(out.data, cases[i].mended);
        tarry_text_release(&out);
    }
    ck_assert(tarry_mend_is_split("min(1", 5));
    ck_assert(!tarry_mend_is_split("min(1)", 6));
    ck_assert(!tarry_mend_is_split("1)", 2));
}
END_TEST

static char *repeat(const char *piece, size_t n) {
    size_t length = strlen(piece);
    char *text = malloc(n * length + 1);
    ck_assert_ptr_nonnull(text);
    for (size_t i = 0; i < n; i++)
        memcpy(text + i * length, piece, length);
    text[n * length] = '\0';
    return text;
}

START_TEST(nesting) {
    static const char *const pieces[] = {"[", "{", "- ", "{a: ", "[{a: "};
    for (size_t i = 0; i < sizeof pieces / sizeof *pieces; i++) {
        char *text = repeat(pieces[i], 100000);
        const tarry_node *root = NULL;
        ck_assert_int_eq(tarry_yaml_read(text, strlen(text), "m.yaml", &arena, &root, &error),
                         TARRY_INPUT);
        free(text);
    }
    char *open = repeat("[", 64), *close = repeat("]", 64), text[200];
    snprintf(text, sizeof text, "%s%s", open, close);
    const tarry_node *node = read_text(text);
    int depth = 1;
    for (; node->n > 0; node = node->entries[0].node)
        depth++;
    ck_assert_int_eq(depth, 64);
    snprintf(text, sizeof text, "[%s%s]", open, close);
    check_refused(text, 1, 65, "nested deeper than 64");
    free(open);
    free(close);
}
END_TEST

static double seconds(void) {
    return (double)clock() / CLOCKS_PER_SEC;
}

static double time_to_read(const char *text, size_t size) {
    const tarry_node *root = NULL;
    double start = seconds();
    int code = tarry_yaml_read(text, size, "m.yaml", &arena, &root, &error);
    ck_assert_msg(code == 0, "%d:%d: %s", error.line, error.column, error.message);
    return seconds() - start;
}

/* Ten thousand genes written out, and shapes that cost a careless reader a square: one map of many
 * keys, one long text, one line of many entries. Well under a second each (0.1 to 0.3 s here, five
 * times as much is allowed for slow machines). */
START_TEST(large_files) {
    tarry_text text = {0};
    tarry_text_add_string(&text, "genes:\n");
    for (int i = 0; i < 10000; i++)
        tarry_text_printf(&text,
                          "  gene_%d:\n    promoter:\n      shut: {to: {open: k_%d}}\n"
                          "      open: {to: {shut: 0.3 /min}, initiates: 2 /min}\n"
                          "    transcript:\n      half_life: 35 min\n",
                          i, i);
    double genes = time_to_read(text.data, text.size);
    const double slack = test_small() ? 10 : 1; /* sanitizers slow it down */
    ck_assert_msg(genes < slack, "%g s for 10,000 genes", genes);
    text.size = 0;
    for (int i = 0; i < 200000; i++)
        tarry_text_printf(&text, "k_%d: 1\n", i);
    double keys = time_to_read(text.data, text.size);
    ck_assert_msg(keys < 1.5 * slack, "%g s for 200,000 keys", keys);
    text.size = 0;
    tarry_text_add_string(&text, "a: {");
    for (int i = 0; i < 200000; i++)
        tarry_text_printf(&text, "\xc2\xb5%d: 1, ", i);
    tarry_text_add_string(&text, "b: \"");
    for (int i = 0; i < 2000000; i++)
        tarry_text_add_string(&text, "x");
    tarry_text_add_string(&text, "\"}\n");
    double line = time_to_read(text.data, text.size);
    ck_assert_msg(line < 1.5 * slack, "%g s for one line of 200,000 entries", line);
    ck_assert(!text.failed);
    printf("10,000 genes %.3f s, 200,000 keys %.3f s, on one line %.3f s\n", genes, keys, line);
    tarry_text_release(&text);
}
END_TEST

static Suite *yaml_suite(void) {
    Suite *suite = suite_create("yaml");
    TCase *tests = tcase_create("yaml");
    tcase_add_checked_fixture(tests, set_up, tear_down);
    tcase_set_timeout(tests, 60);
    tcase_add_test(tests, maps_lists_and_scalars);
    tcase_add_test(tests, columns_count_characters);
    tcase_add_test(tests, what_is_refused);
    tcase_add_test(tests, bytes_that_are_refused);
    tcase_add_test(tests, what_is_no_yaml);
    tcase_add_test(tests, calls_that_yaml_split);
    tcase_add_test(tests, mended_lines);
    tcase_add_test(tests, nesting);
    tcase_add_test(tests, large_files);
    suite_add_tcase(suite, tests);
    return suite;
}

int main(void) {
    SRunner *runner = srunner_create(yaml_suite());
    srunner_run_all(runner, CK_ENV);
    int failed = srunner_ntests_failed(runner);
    srunner_free(runner);
    return failed == 0 ? EXIT_SUCCESS : EXIT_FAILURE;
}
