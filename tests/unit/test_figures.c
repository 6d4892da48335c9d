/* SPDX-License-Identifier: GPL-3.0-or-later */

/* The data of figures against the tables that they are drawn from, and which figures there are.
 * What is not in a table is checked against GSL (Student's t, the gamma law) and a closed form. */

#include "model/model.h"
#include "report/figure.h"
#include "support.h"
#include "tally/results.h"
#include "tarry/tarry.h"

#include <gsl/gsl_cdf.h>
#include <gsl/gsl_randist.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

static const char model_text[] =
    "tarry: 1\n"
    "title: Two genes\n"
    "time: min\n"
    "genes:\n"
    "  vela:\n"
    "    promoter:\n"
    "      shut: {to: {open: 0.2}}\n"
    "      open: {to: {shut: 0.5}, initiates: 3}\n"
    "    transcript:\n"
    "      stages: {nascent: 2 min, nuclear: {gamma: {mean: 3 min, sd: 1 min}}}\n"
    "      half_life: 10 min\n"
    "  lyra:\n"
    "    promoter:\n"
    "      shut: {to: {open: 0.3}}\n"
    "      open: {to: {shut: k_shut}, initiates: 2}\n"
    "    transcript: {half_life: 5 min}\n"
    "parameters: {k_shut: 0.6}\n"
    "signals:\n"
    "  spot: {of: vela.nascent, noise: 0.2}\n"
    "  light: {sum: {lyra.transcript: 1}}\n"
    "protocol:\n"
    "  - {at: 20 min, set: {k_shut: 0.1}}\n"
    "run: {cells: 100, settle: 20 min, until: 40 min, every: 0.5 min, snapshots: [0 min, 40 min], "
    "seed: 1}\n";

static tarry_model *model;
static tarry_results *results;
static tarry_figure_list list;

static int make(const char *const *genes, size_t n, tarry_error *error) {
    const tarry_figure_options options = {.genes = genes, .n_genes = n};
    return tarry_figures_make(model, results, &options, &list, error);
}

static void set_up(void) {
    const tarry_run_options options = {.threads = 1, .keep = 3, .traced = 3};
    tarry_error error = {0};
    tarry_start();
    ck_assert_msg(
        !tarry_model_read_text(model_text, strlen(model_text), "m.yaml", NULL, 0, &model, &error),
        "%s", error.message);
    ck_assert_msg(!tarry_run(model, &options, &results, &error), "%s", error.message);
    ck_assert_msg(!make(NULL, 0, &error), "%s", error.message);
}

static void tear_down(void) {
    tarry_figure_list_release(&list);
    tarry_results_free(results);
    tarry_model_free(model);
}

/* ---- reading a figure's data ----------------------------------------------------------------- */

enum { MOST_FIELDS = 8, MOST_ROWS = 8192 };

typedef struct csv {
    char *text;
    size_t n_rows;                              /* without the header */
    const char *fields[MOST_ROWS][MOST_FIELDS]; /* row 0 is the header */
    size_t n_fields;
} csv;

static csv *read_data(const char *stem) {
    csv *data = calloc(1, sizeof *data);
    ck_assert_ptr_nonnull(data);
    for (size_t i = 0; i < list.n; i++)
        if (!strcmp(list.items[i].stem, stem))
            data->text = strdup(list.items[i].data);
    ck_assert_msg(data->text != NULL, "there is no figure %s", stem);
    size_t n = 0;
    for (char *line = data->text; *line; n++) {
        char *end = strchr(line, '\n');
        ck_assert_ptr_nonnull(end);
        ck_assert_uint_lt(n, MOST_ROWS);
        *end = '\0';
        size_t f = 0;
        for (char *at = line; at; f++) {
            char *quote = *at == '"' ? strchr(at + 1, '"') : NULL; /* none is within */
            char *comma = strchr(quote ? quote : at, ',');
            ck_assert_uint_lt(f, MOST_FIELDS);
            data->fields[n][f] = quote ? at + 1 : at;
            if (quote)
                *quote = '\0';
            if (comma)
                *comma++ = '\0';
            at = comma;
        }
        ck_assert(n == 0 || f == data->n_fields);
        data->n_fields = f;
        line = end + 1;
    }
    data->n_rows = n - 1;
    return data;
}

static void free_data(csv *data) {
    free(data->text);
    free(data);
}

static const char *text_at(const csv *data, size_t row, const char *column) {
    for (size_t f = 0; f < data->n_fields; f++)
        if (!strcmp(data->fields[0][f], column))
            return data->fields[row + 1][f];
    ck_abort_msg("there is no column %s", column);
}

static double number_at(const csv *data, size_t row, const char *column) {
    const char *text = text_at(data, row, column);
    return *text ? strtod(text, NULL) : NAN;
}

static bool same(double one, double other) {
    return one == other || (isnan(one) && isnan(other));
}

/* The rows of a panel and series, in order, against those of a table that have these texts (column
 * and text in turn, NULL ends the list), column by column ("of the data", "of the table", ...). */
static size_t compare(const csv *data, const char *panel, const char *series,
                      tarry_result_table which, const char *const *texts,
                      const char *const *columns) {
    const tarry_table *table = tarry_results_table(results, which);
    size_t row = 0, n = 0;
    for (size_t r = 0; r < tarry_table_n_rows(table); r++) {
        bool fits = true;
        for (size_t i = 0; texts[i]; i += 2)
            fits = fits && !strcmp(tarry_table_text(table, r, tarry_table_column(table, texts[i])),
                                   texts[i + 1]);
        if (!fits)
            continue;
        while (row < data->n_rows && (strcmp(text_at(data, row, "panel"), panel) ||
                                      strcmp(text_at(data, row, "series"), series)))
            row++;
        ASSERT_FAST(row < data->n_rows, "%s, %s: row %zu is missing", panel, series, n);
        for (size_t c = 0; columns[c]; c += 2) {
            const double there = tarry_table_number(table, r,
                                                    tarry_table_column(table, columns[c + 1]));
            ASSERT_FAST(same(number_at(data, row, columns[c]), there), "%s, %s, row %zu: %s is %s",
                        panel, series, n, columns[c], text_at(data, row, columns[c]));
        }
        row++;
        n++;
    }
    for (; row < data->n_rows; row++)
        ASSERT_FAST(strcmp(text_at(data, row, "panel"), panel) ||
                        strcmp(text_at(data, row, "series"), series),
                    "%s, %s: more rows than %zu", panel, series, n);
    return n;
}

/* ---- data are those of the tables ------------------------------------------------------------ */

START_TEST(burst_sizes) {
    static const char *const columns[] = {"size",        "size",        "width", "width",
                                          "probability", "probability", "low",   "low",
                                          "high",        "high",        NULL};
    static const char *const windows[] = {"w1", "w2"};
    csv *data = read_data("gene-vela-burst-sizes");
    for (int w = 0; w < 2; w++) {
        const char *const texts[] = {"gene", "vela", "window", windows[w], NULL};
        ck_assert_uint_gt(
            compare(data, windows[w], "simulated", TARRY_TABLE_burst_sizes, texts, columns), 10);
    }
    free_data(data);
}
END_TEST

/* Initiations in an active period that ends at rate k_off and initiates at rate v are geometric
 * from 0 on: (1 - q) q^n, q = v / (v + k_off) (from memory; competing exponential times). */
START_TEST(exact_burst_sizes) {
    static const struct {
        const char *stem, *panel;
        double q;
    } cases[] = {{"gene-vela-burst-sizes", "w1", 3 / 3.5},
                 {"gene-vela-burst-sizes", "w2", 3 / 3.5},
                 {"gene-lyra-burst-sizes", "w2", 2 / 2.1},
                 {"gene-lyra-burst-sizes", "w1", NAN}}; /* a step comes: there is no one law */
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        csv *data = read_data(cases[i].stem);
        size_t n = 0;
        for (size_t r = 0; r < data->n_rows; r++) {
            if (strcmp(text_at(data, r, "panel"), cases[i].panel) ||
                strcmp(text_at(data, r, "series"), "exact law (geometric)"))
                continue;
            const double law = (1 - cases[i].q) * pow(cases[i].q, (double)n);
            ck_assert_double_eq(number_at(data, r, "size"), (double)n);
            ck_assert_double_eq_tol(number_at(data, r, "probability"), law, 1e-12);
            n++;
        }
        ck_assert(isnan(cases[i].q) ? n == 0 : n > 10);
        free_data(data);
    }
}
END_TEST

START_TEST(dwells) {
    static const char *const columns[] = {"time", "time", "survival", "survival", "low",
                                          "low",  "high", "high",     NULL};
    csv *data = read_data("gene-lyra-dwells");
    for (int i = 0; i < 4; i++) {
        const char *window = i / 2 ? "w2" : "w1", *period = i % 2 ? "inactive" : "active";
        const char *const texts[] = {"gene", "lyra", "window", window, "period", period, NULL};
        ck_assert_uint_gt(compare(data, period, window, TARRY_TABLE_dwells, texts, columns), 10);
    }
    free_data(data);
}
END_TEST

static const char *const correlations[] = {"lag", "lag",  "correlation", "correlation", "low",
                                           "low", "high", "high",        NULL};

START_TEST(correlation) {
    csv *data = read_data("gene-vela-autocorrelation");
    const char *const texts[] = {"window", "w2",           "first", "vela.nuclear",
                                 "second", "vela.nuclear", NULL};
    ck_assert_uint_gt(
        compare(data, "nuclear", "w2", TARRY_TABLE_autocorrelation, texts, correlations), 10);
    free_data(data);
    data = read_data("signals-cross-correlation");
    const char *const pair[] = {"window", "w1", "first", "spot", "second", "light", NULL};
    ck_assert_uint_gt(
        compare(data, "spot, then light", "w1", TARRY_TABLE_autocorrelation, pair, correlations),
        20);
    free_data(data);
}
END_TEST

START_TEST(first_responses) {
    static const char *const columns[] = {"time", "time", "survival", "survival", "low",
                                          "low",  "high", "high",     NULL};
    static const char *const texts[] = {"name", "lyra.transcript", NULL};
    csv *data = read_data("gene-lyra-first-responses");
    ck_assert_uint_gt(
        compare(data, "step at 20 min", "transcript", TARRY_TABLE_first, texts, columns), 3);
    free_data(data);
}
END_TEST

/* Mean -+ t s.e., Student's t with as many degrees of freedom as there are groups (64) less one. */
START_TEST(means) {
    static const char *const columns[] = {"time", "time", "mean", "mean", NULL};
    static const struct {
        const char *stem, *panel, *name;
    } cases[] = {{"gene-vela-time-course", "transcript", "vela.transcript"},
                 {"gene-vela-in-transit", "nuclear", "vela.nuclear"},
                 {"signals-time-course", "spot", "spot"}};
    const double t = gsl_cdf_tdist_Pinv(0.975, 63);
    const tarry_table *table = tarry_results_table(results, TARRY_TABLE_means);
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        const char *const texts[] = {"name", cases[i].name, NULL};
        csv *data = read_data(cases[i].stem);
        ck_assert_uint_ge(compare(data, cases[i].panel, "", TARRY_TABLE_means, texts, columns), 81);
        size_t r = 0;
        while (strcmp(tarry_table_text(table, r, 0), cases[i].name))
            r++;
        for (size_t d = 0; d < data->n_rows; d++) {
            if (strcmp(text_at(data, d, "panel"), cases[i].panel))
                continue;
            const double mean = tarry_table_number(table, r, tarry_table_column(table, "mean"));
            const double half = t * tarry_table_number(table, r++,
                                                       tarry_table_column(table, "mean_se"));
            ASSERT_FAST(fabs(number_at(data, d, "low") - (mean - half)) < 1e-9 * (1 + mean),
                        "low in row %zu", d);
            ASSERT_FAST(fabs(number_at(data, d, "high") - (mean + half)) < 1e-9 * (1 + mean),
                        "high in row %zu", d);
        }
        free_data(data);
    }
}
END_TEST

/* Every line is a kept trace; what is grey is where the promoter was open. */
START_TEST(traces) {
    const tarry_table *cells = tarry_results_cells(results);
    csv *data = read_data("gene-vela-traces");
    static const char *const names[] = {"cell 0", "cell 1", "cell 2"};
    size_t n = 0, n_open = 0;
    for (size_t r = 0; r < data->n_rows; r++) {
        const char *panel = text_at(data, r, "panel"), *series = text_at(data, r, "series");
        const double x = number_at(data, r, "time"), until = x + number_at(data, r, "width");
        for (size_t k = 0; k < tarry_table_n_rows(cells); k++) {
            const char *name = names[(size_t)tarry_table_number(cells, k, 0)];
            const double time = tarry_table_number(cells, k, 1);
            const bool shade = !strcmp(series, "active") && !strcmp(panel, name);
            const char *column = !strcmp(panel, name) && !strcmp(series, "spot") ? "spot"
                                 : !strcmp(panel, "transcript") && !strcmp(series, name)
                                     ? "vela.transcript"
                                     : NULL;
            if (shade && time > x && time < until) {
                ASSERT_FAST(tarry_table_number(cells, k, tarry_table_column(cells, "vela.open")) ==
                                1,
                            "%s is not active at %g", name, time);
                n_open++;
            }
            if (!column || time != x)
                continue;
            ASSERT_FAST(number_at(data, r, "value") ==
                            tarry_table_number(cells, k, tarry_table_column(cells, column)),
                        "%s at %g", name, x);
            n++;
        }
    }
    ck_assert_uint_eq(n, 2 * 3 * 81);
    double open = 0;
    for (size_t k = 0; k < tarry_table_n_rows(cells); k++)
        open += tarry_table_number(cells, k, tarry_table_column(cells, "vela.open"));
    ck_assert_double_eq((double)n_open, open);
    free_data(data);
}
END_TEST

/* At each snapshot the bins hold nearly all cells; single counts have the table's own interval. */
START_TEST(counts) {
    csv *data = read_data("gene-vela-counts");
    const tarry_table *table = tarry_results_table(results, TARRY_TABLE_distribution);
    double all = 0;
    size_t n = 0;
    for (size_t d = 0; d < data->n_rows; d++) {
        if (strcmp(text_at(data, d, "panel"), "nuclear") ||
            strcmp(text_at(data, d, "series"), "at 40 min"))
            continue;
        all += number_at(data, d, "probability");
        if (number_at(data, d, "width") != 1 || number_at(data, d, "probability") == 0)
            continue;
        for (size_t r = 0; r < tarry_table_n_rows(table); r++) {
            if (strcmp(tarry_table_text(table, r, 0), "vela.nuclear") ||
                tarry_table_number(table, r, 2) != 40 ||
                tarry_table_number(table, r, 3) != number_at(data, d, "count"))
                continue;
            ck_assert_double_eq(number_at(data, d, "probability"), tarry_table_number(table, r, 5));
            ck_assert(same(number_at(data, d, "low"), tarry_table_number(table, r, 6)));
            ck_assert(same(number_at(data, d, "high"), tarry_table_number(table, r, 7)));
            n++;
        }
    }
    ck_assert_uint_gt(n, 3);
    ck_assert_double_ge(all, 0.99);
    ck_assert_double_le(all, 1 + 1e-12);
    free_data(data);
}
END_TEST

/* The line is the density of the gamma law of this mean and sd (GSL), averaged over 1/200 of the
 * picture; the bars hold all lags. */
START_TEST(lags) {
    csv *data = read_data("gene-vela-lags");
    double drawn = 0;
    size_t n = 0;
    for (size_t r = 0; r < data->n_rows; r++) {
        ck_assert_str_eq(text_at(data, r, "panel"), "nuclear"); /* the fixed one needs no picture */
        const double x = number_at(data, r, "length"), width = number_at(data, r, "width");
        const double share = number_at(data, r, "share");
        if (!strcmp(text_at(data, r, "series"), "drawn")) {
            drawn += share;
            continue;
        }
        ck_assert_str_eq(text_at(data, r, "series"), "law asked for");
        ck_assert_double_eq_tol(share / width, gsl_ran_gamma_pdf(x, 9, 1.0 / 3), 1e-3);
        n++;
    }
    ck_assert_uint_eq(n, 200);
    ck_assert_double_eq_tol(drawn, 1, 1e-12);
    free_data(data);
}
END_TEST

/* ---- which figures there are ----------------------------------------------------------------- */

START_TEST(stems) {
    static const char letters[] =
        "abcdefghijklmnopqrstuvwxyzABCDEFGHIJKLMNOPQRSTUVWXYZ0123456789_.-";
    for (size_t i = 0; i < list.n; i++) {
        const tarry_figure *figure = &list.items[i];
        ck_assert_uint_eq(strspn(figure->stem, letters), strlen(figure->stem));
        for (size_t j = 0; j < i; j++)
            ck_assert_str_ne(figure->stem, list.items[j].stem);
        ck_assert(*figure->title && *figure->caption && *figure->alternative && *figure->script);
        ck_assert(!figure->page_script && !figure->svg);
        ck_assert_int_gt(figure->height, 100);
    }
    ck_assert_ptr_null(list.left_out);
}
END_TEST

START_TEST(named_genes) {
    static const char *const lyra[] = {"lyra"}, *const wrong[] = {"lyra", "vola"};
    tarry_error error = {0};
    tarry_figure_list_release(&list);
    ck_assert_int_eq(make(lyra, 1, &error), 0);
    for (size_t i = 0; i < list.n; i++) {
        const tarry_figure *figure = &list.items[i];
        ck_assert(figure->gene ? !strcmp(figure->gene, "lyra") : !strcmp(figure->signal, "light"));
    }
    ck_assert_uint_gt(list.n, 8);
    tarry_figure_list_release(&list);
    ck_assert_int_eq(make(wrong, 2, &error), TARRY_INPUT);
    ck_assert_str_eq(error.message, "there is no gene 'vola'; did you mean 'vela'?");
}
END_TEST

int main(void) {
    const test_entry tests[] = {{"burst sizes", burst_sizes},
                                {"exact burst sizes", exact_burst_sizes},
                                {"dwells", dwells},
                                {"correlation", correlation},
                                {"first responses", first_responses},
                                {"means", means},
                                {"traces", traces},
                                {"counts", counts},
                                {"lags", lags},
                                {"stems", stems},
                                {"named genes", named_genes}};
    Suite *suite = suite_create("figures");
    for (size_t i = 0; i < sizeof tests / sizeof *tests; i++) {
        TCase *test = tcase_create(tests[i].name);
        tcase_add_checked_fixture(test, set_up, tear_down);
        tcase_add_test(test, tests[i].test);
        suite_add_tcase(suite, test);
    }
    SRunner *runner = srunner_create(suite);
    srunner_run_all(runner, CK_ENV);
    const int failed = srunner_ntests_failed(runner);
    srunner_free(runner);
    return failed != 0;
}
