/* SPDX-License-Identifier: GPL-3.0-or-later */

/* A short tour of libtarry, with nothing but its public headers: read a model, simulate it, and
 * print a figure from the tables of results. Built and run with the tests, and against an installed
 * copy. */

#include <tarry/tarry.h>

#include <stdio.h>
#include <stdlib.h>
#include <string.h>

static const char text[] =
    "tarry: 1\n"
    "time: min\n"
    "parameters: {k_open: 0.05}\n"
    "genes:\n"
    "  vela:\n"
    "    start: steady\n"
    "    promoter:\n"
    "      shut: {to: {open: k_open}}\n"
    "      open: {to: {shut: 0.5}, initiates: 5}\n"
    "    transcript: {stages: {nascent: {fixed: 3 min}}, half_life: 20 min}\n"
    "run: {cells: 500, settle: 4 h, until: 4 h, every: 1 min}\n";

/* Every function that can fail fills an error and returns its code, 0 for none. */
static int fail(const tarry_error *error) {
    char words[2048];
    fprintf(stderr, "%s\n", tarry_error_text(error, words, (int)sizeof words));
    return tarry_code_status(error->code);
}

/* The row of a quantity: tables have named columns of text or numbers. Rows where there is none. */
static size_t find_row(const tarry_table *table, const char *quantity) {
    const int column = tarry_table_column(table, "quantity");
    size_t row = 0;
    while (row < tarry_table_n_rows(table) &&
           strcmp(tarry_table_text(table, row, column), quantity) != 0)
        row++;
    return row;
}

int main(void) {
    /* What a command line would give as --set k_open=0.1 beats the text. */
    const tarry_override override = {"--set", 1, "k_open", "0.1"};
    const tarry_run_options options = {.threads = 0}; /* all cores */
    tarry_model *model = NULL;
    tarry_results *results = NULL;
    tarry_error error = {0};

    tarry_start(); /* once, before threads are made */
    if (tarry_model_read_text(text, strlen(text), "example", &override, 1, &model, &error) ||
        tarry_run(model, &options, &results, &error)) {
        tarry_model_free(model); /* NULL is fine */
        return fail(&error);
    }
    const tarry_table *bursts = tarry_results_table(results, TARRY_TABLE_bursts);
    const size_t row = find_row(bursts, "burst_size_mean");
    const double size = tarry_table_number(bursts, row, tarry_table_column(bursts, "value"));
    printf("tarry %s: %g initiations in a burst, 95 %% interval %g to %g\n", tarry_version(), size,
           tarry_table_number(bursts, row, tarry_table_column(bursts, "low")),
           tarry_table_number(bursts, row, tarry_table_column(bursts, "high")));
    tarry_results_free(results);
    tarry_model_free(model);
    return size > 9 && size < 11 ? EXIT_SUCCESS : EXIT_FAILURE; /* 5 / 0.5 */
}
