/* A short tour of libtarry, with nothing but its public headers: read a model, look at it, simulate
 * it, and read figures from the tables of results. Built and run with the tests. */

#include <tarry/tarry.h>

#include <stdio.h>
#include <stdlib.h>
#include <string.h>

static const char model_text[] =
    "tarry: 1\n"
    "title: A gene that fires in bursts\n"
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
    char text[2048];
    fprintf(stderr, "%s\n", tarry_error_text(error, text, (int)sizeof text));
    return tarry_code_status(error->code);
}

/* Called after each finished cell, by one thread at a time. */
static void count_cells(void *context, int64_t n_done, int64_t n_cells) {
    (void)n_cells;
    *(int64_t *)context = n_done;
}

/* The value of a quantity of a gene: tables have named columns of text or numbers. */
static int find_figure(const tarry_results *results, const char *gene, const char *quantity,
                       double *value, double *low, double *high) {
    const tarry_table *bursts = tarry_results_table(results, TARRY_TABLE_bursts);
    const int gene_column = tarry_table_column(bursts, "gene");
    const int quantity_column = tarry_table_column(bursts, "quantity");
    for (size_t row = 0; row < tarry_table_n_rows(bursts); row++) {
        if (strcmp(tarry_table_text(bursts, row, gene_column), gene) ||
            strcmp(tarry_table_text(bursts, row, quantity_column), quantity))
            continue;
        *value = tarry_table_number(bursts, row, tarry_table_column(bursts, "value"));
        *low = tarry_table_number(bursts, row, tarry_table_column(bursts, "low"));
        *high = tarry_table_number(bursts, row, tarry_table_column(bursts, "high"));
        return 1;
    }
    return 0;
}

static int run_with(const char *k_open, double *mean, tarry_error *error) {
    /* What a command line would give as --set k_open=... beats the text. */
    const tarry_override override = {"--set", 1, "k_open", k_open};
    tarry_model *model = NULL;
    tarry_results *results = NULL;
    int64_t n_seen = 0;
    const tarry_run_options options = {
        .threads = 0, .progress = count_cells, .progress_context = &n_seen};
    double low, high;

    int code = tarry_model_read_text(model_text, strlen(model_text), "example", &override, 1,
                                     &model, error);
    if (!code)
        code = tarry_run(model, &options, &results, error);
    if (!code && find_figure(results, "vela", "transcript_mean", mean, &low, &high))
        printf("k_open = %s: %g transcripts a cell, 95 %% interval %g to %g, %lld cells\n", k_open,
               *mean, low, high, (long long)n_seen);
    tarry_results_free(results); /* NULL is fine for both */
    tarry_model_free(model);
    return code;
}

static int show_check(tarry_error *error) {
    tarry_model *model = NULL;
    char *report = NULL;
    int code = tarry_model_read_text(model_text, strlen(model_text), "example", NULL, 0, &model,
                                     error);
    if (!code)
        code = tarry_check(model, &report, error);
    if (!code)
        puts(report);
    free(report);
    tarry_model_free(model);
    return code;
}

int main(void) {
    tarry_error error = {0};
    double rare = 0, often = 0;
    tarry_start(); /* once, before threads are made */
    printf("tarry %s\n\n", tarry_version());
    if (show_check(&error) || run_with("0.05", &rare, &error) || run_with("0.2", &often, &error))
        return fail(&error);
    return often > rare ? EXIT_SUCCESS : EXIT_FAILURE;
}
