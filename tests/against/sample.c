/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "sample.h"

#include "base/memory.h"
#include "engine/cell.h"
#include "model/model.h"
#include "support.h"

#include <check.h>
#include <gsl/gsl_cdf.h>
#include <gsl/gsl_statistics_double.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

size_t sample_size(size_t n) {
    return getenv("TARRY_TEST_SMALL") ? n / 10 : n;
}

static tarry_model *read_model(const char *text) {
    tarry_error error;
    char line[2048];
    tarry_model *model = NULL;
    if (tarry_model_read_text(text, strlen(text), "test.yaml", NULL, 0, &model, &error))
        ck_abort_msg("%s", tarry_error_text(&error, line, sizeof line));
    return model;
}

static void keep_snapshots(sample_cells *sample, size_t cell, const tarry_record *record) {
    const size_t n = sample->n_channels * sample->n_snapshots;
    for (size_t i = 0; i < n; i++)
        sample->values[i * sample->n_cells + cell] = record->snapshots[i];
}

static void run_cells(sample_cells *sample, const tarry_engine *engine) {
    tarry_error error = {0};
    int failed = 0;
#pragma omp parallel
    {
        tarry_cell *cell = NULL;
        tarry_record record = {0};
        tarry_error own;
        int bad = tarry_cell_new(engine, &cell, &own) ||
                  tarry_record_init(&record, &sample->model->network, &own);
#pragma omp for schedule(dynamic, 16)
        for (size_t i = 0; i < sample->n_cells; i++) {
            bad = bad || tarry_cell_run(cell, (int64_t)i, &record, &own);
            if (!bad)
                keep_snapshots(sample, i, &record);
        }
#pragma omp critical
        if (bad) {
            failed = 1;
            error = own;
        }
        tarry_record_release(&record);
        tarry_cell_free(cell);
    }
    if (failed)
        ck_abort_msg("%s", error.message);
}

sample_cells *sample_new(const char *model_text, size_t n_cells) {
    tarry_start();
    tarry_error error;
    sample_cells *sample = calloc(1, sizeof *sample);
    ck_assert_ptr_nonnull(sample);
    sample->model = read_model(model_text);
    const tarry_network *network = &sample->model->network;
    sample->n_cells = sample_size(n_cells);
    sample->n_channels = network->n_channels;
    sample->n_snapshots = network->run.n_snapshots;
    sample->values = calloc(sample->n_channels * sample->n_snapshots * sample->n_cells,
                            sizeof *sample->values);
    ck_assert_ptr_nonnull(sample->values);
    tarry_engine *engine = NULL;
    if (tarry_engine_new(network, "direct", &engine, &error))
        ck_abort_msg("%s", error.message);
    run_cells(sample, engine);
    tarry_engine_free(engine);
    return sample;
}

void sample_free(sample_cells *sample) {
    if (!sample)
        return;
    tarry_model_free(sample->model);
    free(sample->values);
    free(sample);
}

const double *sample_values(const sample_cells *sample, const char *name, size_t snapshot) {
    const tarry_network *network = &sample->model->network;
    for (size_t i = 0; i < sample->n_channels; i++)
        if (strcmp(network->channels[i].name, name) == 0)
            return sample->values + (i * sample->n_snapshots + snapshot) * sample->n_cells;
    ck_abort_msg("the model has no \"%s\"", name);
    return NULL;
}

double sample_mean(const sample_cells *sample, const char *name, size_t snapshot) {
    return gsl_stats_mean(sample_values(sample, name, snapshot), 1, sample->n_cells);
}

double sample_sd(const sample_cells *sample, const char *name, size_t snapshot) {
    return gsl_stats_sd(sample_values(sample, name, snapshot), 1, sample->n_cells);
}

void check_z(const char *what, double z) {
    ck_assert_msg(fabs(z) < SAMPLE_Z_LIMIT, "%s: Z = %g", what, z);
}

void check_mean(const char *what, double mean, double exact_mean, double exact_sd, size_t n) {
    if (exact_sd == 0) {
        ck_assert_msg(mean == exact_mean, "%s: mean %.17g, not %.17g", what, mean, exact_mean);
        return;
    }
    const double z = sqrt((double)n) * (mean - exact_mean) / exact_sd;
    ck_assert_msg(fabs(z) < SAMPLE_Z_LIMIT, "%s: mean %g, exact %g, Z = %g", what, mean, exact_mean,
                  z);
}

void check_sd(const char *what, double sd, double exact_sd, double kurtosis, size_t n) {
    if (exact_sd == 0) {
        ck_assert_msg(sd == 0, "%s: sd %.17g, not 0", what, sd);
        return;
    }
    const double ratio = sd / exact_sd;
    const double y = sqrt((double)n / 2) * (ratio * ratio - 1) / sqrt(1 + kurtosis / 2);
    ck_assert_msg(fabs(y) < SAMPLE_Z_LIMIT, "%s: sd %g, exact %g, Y / sd(Y) = %g", what, sd,
                  exact_sd, y);
}

void check_mean_and_sd(const char *what, const sample_cells *sample, const char *name,
                       size_t snapshot, double exact_mean, double exact_sd, double kurtosis) {
    check_mean(what, sample_mean(sample, name, snapshot), exact_mean, exact_sd, sample->n_cells);
    check_sd(what, sample_sd(sample, name, snapshot), exact_sd, kurtosis, sample->n_cells);
}

static void count(const double *values, size_t n, double *counts, size_t n_bins) {
    for (size_t i = 0; i < n; i++) {
        ASSERT_FAST(values[i] >= 0 && values[i] == floor(values[i]), "%g is no count", values[i]);
        counts[values[i] < (double)n_bins ? (size_t)values[i] : n_bins]++;
    }
}

void check_counts(const char *what, const double *values, size_t n, const double *probabilities,
                  size_t n_probabilities) {
    double *counts = calloc(n_probabilities + 1, sizeof *counts);
    ck_assert_ptr_nonnull(counts);
    count(values, n, counts, n_probabilities);
    double beyond = 1;
    for (size_t i = 0; i < n_probabilities; i++)
        beyond -= probabilities[i];
    const double least = 10;
    double chi2 = 0, expected = 0, observed = 0, left = (double)n;
    int bins = 0;
    for (size_t i = 0; i <= n_probabilities; i++) {
        expected += (double)n * (i < n_probabilities ? probabilities[i] : fmax(beyond, 0));
        observed += counts[i];
        const double after = left - expected;
        /* A bin is closed only if the rest can fill another one. */
        if (expected < least || (after < least && i < n_probabilities))
            continue;
        chi2 += (observed - expected) * (observed - expected) / expected;
        left = after;
        expected = observed = 0;
        bins++;
    }
    free(counts);
    ck_assert_msg(bins > 1, "%s: only %d bins", what, bins);
    const double p = gsl_cdf_chisq_Q(chi2, bins - 1);
    ck_assert_msg(p > SAMPLE_P_LIMIT, "%s: chi-square %g on %d bins, p = %g", what, chi2, bins, p);
}

static int compare(const void *one, const void *other) {
    const double a = *(const double *)one, b = *(const double *)other;
    return (a > b) - (a < b);
}

void check_continuous(const char *what, const double *values, size_t n,
                      double (*cdf)(double x, void *context), void *context) {
    double *sorted = malloc(n * sizeof *sorted);
    ck_assert_ptr_nonnull(sorted);
    memcpy(sorted, values, n * sizeof *sorted);
    qsort(sorted, n, sizeof *sorted, compare);
    double d = 0;
    for (size_t i = 0; i < n; i++) {
        const double f = cdf(sorted[i], context);
        d = fmax(d, fmax((double)(i + 1) / (double)n - f, f - (double)i / (double)n));
    }
    free(sorted);
    /* P(sqrt(n) D > x) is below 2 exp(-2 x^2) (Massart 1990, Ann. Probab. 18:1269). */
    const double p = 2 * exp(-2 * d * d * (double)n);
    ck_assert_msg(p > SAMPLE_P_LIMIT, "%s: D = %g with n = %zu, p < %g", what, d, n, p);
}

tarry_results *run_results(const char *model_text, tarry_model **model) {
    tarry_start();
    tarry_error error;
    tarry_results *results = NULL;
    *model = read_model(model_text);
    const tarry_run_options options = {0};
    if (tarry_run(*model, &options, &results, &error))
        ck_abort_msg("%s", error.message);
    return results;
}

static sample_figure find_figure(const tarry_table *table, const char *first_column,
                                 const char *name, const char *window, const char *quantity) {
    const int first = tarry_table_column(table, first_column);
    const int windows = tarry_table_column(table, "window");
    const int quantities = tarry_table_column(table, "quantity");
    for (size_t row = 0; row < tarry_table_n_rows(table); row++) {
        if (strcmp(tarry_table_text(table, row, first), name) != 0 ||
            strcmp(tarry_table_text(table, row, windows), window) != 0 ||
            strcmp(tarry_table_text(table, row, quantities), quantity) != 0)
            continue;
        return (sample_figure){
            tarry_table_number(table, row, tarry_table_column(table, "value")),
            tarry_table_number(table, row, tarry_table_column(table, "low")),
            tarry_table_number(table, row, tarry_table_column(table, "high")),
            tarry_table_number(table, row, tarry_table_column(table, "samples")),
        };
    }
    ck_abort_msg("there is no %s of %s in window %s", quantity, name, window);
    return (sample_figure){0};
}

sample_figure burst_figure(const tarry_results *results, const char *gene, const char *window,
                           const char *quantity) {
    return find_figure(tarry_results_table(results, TARRY_TABLE_bursts), "gene", gene, window,
                       quantity);
}

sample_figure signal_figure(const tarry_results *results, const char *signal, const char *window,
                            const char *quantity) {
    return find_figure(tarry_results_table(results, TARRY_TABLE_signals), "signal", signal, window,
                       quantity);
}

void check_figure(const char *what, sample_figure figure, double exact) {
    ck_assert_msg(figure.low < figure.value && figure.value < figure.high, "%s: %g has no interval",
                  what, figure.value);
    const double se = log(figure.high / figure.low) / (2 * gsl_cdf_tdist_Pinv(0.975, 63));
    const double z = log(figure.value / exact) / se;
    /* 63 degrees of freedom: Student's t with the same tail as |Z| < 5. */
    const double limit = gsl_cdf_tdist_Qinv(gsl_cdf_ugaussian_Q(SAMPLE_Z_LIMIT), 63);
    ck_assert_msg(fabs(z) < limit, "%s: %g (%g to %g), exact %g, t = %g", what, figure.value,
                  figure.low, figure.high, exact, z);
}
