/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "coverage.h"

#include "tarry/tarry.h"

#include <gsl/gsl_cdf.h>
#include <math.h>
#include <stdbool.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <uthash.h>

/* ---- the models -------------------------------------------------------------------------------
 */

#define TWO_STATES                                                                                 \
    "    promoter:\n      shut: {to: {open: 0.1}}\n      open: {to: {shut: 0.3}, initiates: 2}\n"  \
    "    transcript: {stages: {nascent: {fixed: 4 min}}, half_life: 6 min}\n"
#define SPOT "signals: {spot: {of: vela.nascent, ramp: {from: 0.1, to: 0.4}, noise: 0.3}}\n"
#define HEAD "tarry: 1\ntime: min\n"
#define STEADY HEAD "genes:\n  vela:\n    start: steady\n" TWO_STATES SPOT

static const struct {
    const char *title;
    const char *text;
    int cells;
} models[COVERAGE_MODELS] = {
    {"short record, 30 cells", STEADY "run: {settle: 60, until: 30, every: 1, lags: 10}\n", 30},
    {"short record, 300 cells", STEADY "run: {settle: 60, until: 30, every: 2, lags: 10}\n", 300},
    {"long record, 20 cells", STEADY "run: {settle: 60, until: 300, every: 2, lags: 30}\n", 20},
    {"induced, 100 cells",
     HEAD
     "parameters: {k: 0.01}\ngenes:\n  vela:\n    promoter:\n      shut: {to: {open: k}}\n"
     "      open: {to: {shut: 0.3}, initiates: 2}\n"
     "    transcript: {stages: {nascent: {gamma: {mean: 4 min, sd: 1 min}}}, half_life: 6}\n" SPOT
     "protocol: [{at: 20 min, set: {k: 0.2}}]\n"
     "run: {settle: 60, until: 60, every: 2, snapshots: [10, 30, 60], lags: 8}\n",
     100},
    {"one state, 100 cells",
     HEAD "genes:\n  vela:\n    promoter: {on: {initiates: 0.7}}\n"
          "    transcript: {stages: {nascent: {fixed: 4 min}}, half_life: 6 min}\n" SPOT
          "run: {settle: 60, until: 30, every: 2, lags: 10}\n",
     100},
    {"three states, 100 cells",
     HEAD "genes:\n  vela:\n    start: steady\n    promoter:\n"
          "      shut: {to: {low: 0.10, high: 0.05}}\n"
          "      low: {to: {high: 0.2, shut: 0.4}, initiates: 1}\n"
          "      high: {to: {low: 0.5, shut: 0.1}, initiates: 6}\n"
          "    transcript: {half_life: 5 min}\n"
          "run: {settle: 60, until: 60, every: 2, lags: 10}\n",
     100},
    {"two alleles, two colours, 64 cells",
     HEAD "genes:\n  vela:\n    copies: 2\n    start: steady\n" TWO_STATES
          "signals:\n  head: {of: vela.nascent, ramp: {from: 0, to: 0.2}, noise: 0.2}\n"
          "  tail: {of: vela.nascent, ramp: {from: 0.7, to: 0.9}, noise: 0.2}\n"
          "run: {settle: 60, until: 60, every: 1, lags: 10}\n",
     64},
    {"reporter protein, 100 cells",
     HEAD "genes:\n  vela:\n    start: steady\n" TWO_STATES
          "    protein: {translation: 0.5, stages: {immature: {gamma: {mean: 8, sd: 3}}}, "
          "half_life: 20 min}\n"
          "run: {settle: 300, until: 120, every: 4, lags: 40}\n",
     100},
    {"unlike cells, 100 cells",
     HEAD
     "parameters: {k: {value: 2, varies: {lognormal: {cv: 0.5}}}, lag: {value: 4, varies: {gamma: "
     "{cv: "
     "0.2}}}}\ngenes:\n  vela:\n    start: steady\n    promoter:\n      shut: {to: {open: 0.1}}\n"
     "      open: {to: {shut: 0.3}, initiates: k}\n"
     "    transcript: {stages: {nascent: {fixed: lag}}, half_life: 6 min}\n" SPOT
     "run: {settle: 60, until: 60, every: 2, lags: 15}\n",
     100},
};

const char *coverage_title(size_t model) {
    return models[model].title;
}

static tarry_results *run(size_t model, int cells, unsigned seed, int threads) {
    char n_cells[32], seed_text[32];
    snprintf(n_cells, sizeof n_cells, "%d", cells);
    snprintf(seed_text, sizeof seed_text, "%u", seed);
    const tarry_override overrides[] = {{"--cells", 0, "cells", n_cells},
                                        {"--seed", 0, "seed", seed_text}};
    tarry_error error;
    tarry_model *read = NULL;
    tarry_results *results = NULL;
    const tarry_run_options options = {.threads = threads};
    if (tarry_model_read_text(models[model].text, strlen(models[model].text), "coverage.yaml",
                              overrides, 2, &read, &error) ||
        tarry_run(read, &options, &results, &error)) {
        fprintf(stderr, "%s: %s\n", models[model].title, error.message);
        abort();
    }
    tarry_model_free(read);
    return results;
}

/* ---- which intervals there are ------------------------------------------------------------------
 */

/* How a table's rows are told apart (columns parted by blanks) and where an interval stands: value
 * with low and high, or value with a standard error (high NULL), taken with Student's t. */
typedef struct interval_kind {
    tarry_result_table table;
    const char *keys;
    const char *value, *low, *high;
    const char *title;
    enum { BY_QUANTITY, BY_SIZE, WHOLE } classes;
} interval_kind;

static const interval_kind kinds[] = {
    {TARRY_TABLE_bursts, "gene window quantity", "value", "low", "high", "bursts", BY_QUANTITY},
    {TARRY_TABLE_signals, "signal window quantity", "value", "low", "high", "signals", BY_QUANTITY},
    {TARRY_TABLE_burst_sizes, "gene window size", "probability", "low", "high", "burst sizes",
     BY_SIZE},
    {TARRY_TABLE_distribution, "name window time count width", "probability", "low", "high",
     "distribution", BY_SIZE},
    {TARRY_TABLE_dwells, "gene window period time", "survival", "low", "high", "dwells", BY_SIZE},
    {TARRY_TABLE_autocorrelation, "window first second lag", "correlation", "low", "high",
     "correlation", WHOLE},
    {TARRY_TABLE_autocorrelation, "window first second lag", "per_mean_squared", "pms_low",
     "pms_high", "per mean squared", WHOLE},
    {TARRY_TABLE_first, "name step time", "survival", "low", "high", "first", BY_SIZE},
    {TARRY_TABLE_means, "name time", "mean", "mean_se", NULL, "means: mean", WHOLE},
    {TARRY_TABLE_means, "name time", "sd", "sd_se", NULL, "means: sd", WHOLE},
    {TARRY_TABLE_means, "name time", "fano", "fano_se", NULL, "means: fano", WHOLE},
    {TARRY_TABLE_means, "name time", "cv2", "cv2_se", NULL, "means: cv2", WHOLE},
};

enum { KINDS = sizeof kinds / sizeof *kinds };

static void write_key(const interval_kind *kind, const tarry_table *table, size_t row,
                      char key[256]) {
    char columns[128];
    size_t n = (size_t)snprintf(key, 256, "%s", kind->value);
    snprintf(columns, sizeof columns, "%s", kind->keys);
    char *rest = NULL;
    for (char *name = strtok_r(columns, " ", &rest); name; name = strtok_r(NULL, " ", &rest)) {
        const int column = tarry_table_column(table, name);
        const char *text = tarry_table_text(table, row, column);
        if (*text)
            n += (size_t)snprintf(key + n, 256 - n, "|%s", text);
        else
            n += (size_t)snprintf(key + n, 256 - n, "|%.12g",
                                  tarry_table_number(table, row, column));
        if (n >= 256)
            abort();
    }
}

/* "nascent_mean" and "protein_mean" are of one class. */
static const char *general_name(const char *quantity, char out[32]) {
    static const char *const endings[] = {"_mean", "_fano", "_cv2", "_decay_time"};
    static const char *const bursts[] = {"burst_",    "loud_",     "active_",
                                         "inactive_", "interval_", "signal_"};
    for (size_t i = 0; i < sizeof bursts / sizeof *bursts; i++)
        if (strncmp(quantity, bursts[i], strlen(bursts[i])) == 0)
            return quantity;
    for (size_t i = 0; i < sizeof endings / sizeof *endings; i++) {
        const char *at = strstr(quantity, endings[i]);
        if (at && at > quantity && strcmp(at, endings[i]) == 0) {
            snprintf(out, 32, "P%s", endings[i]);
            return out;
        }
    }
    return quantity;
}

static const char *size_name(double value) {
    if (value >= 0.9)
        return "above 0.9";
    if (value >= 0.1)
        return "0.1 to 0.9";
    return value >= 0.01 ? "0.01 to 0.1" : "below 0.01";
}

static void name_class(const interval_kind *kind, const tarry_table *table, size_t row,
                       double exact, char name[64]) {
    char general[32];
    if (kind->classes == BY_QUANTITY)
        snprintf(name, 64, "%s: %s", kind->title,
                 general_name(tarry_table_text(table, row, tarry_table_column(table, "quantity")),
                              general));
    else if (kind->classes == BY_SIZE)
        snprintf(name, 64, "%s: %s", kind->title, size_name(exact));
    else
        snprintf(name, 64, "%s", kind->title);
}

/* ---- the reference
 * -------------------------------------------------------------------------------- */

typedef struct reference {
    char key[256];
    double value;
    UT_hash_handle hh;
} reference;

static void keep(reference **all, const interval_kind *kind, const tarry_table *table, size_t row) {
    const double value = tarry_table_number(table, row, tarry_table_column(table, kind->value));
    reference *entry = calloc(1, sizeof *entry);
    if (!entry)
        abort();
    write_key(kind, table, row, entry->key);
    entry->value = value;
    HASH_ADD_STR(*all, key, entry);
}

static reference *make_reference(size_t model, int n_reference) {
    reference *all = NULL;
    tarry_results *results = run(model, models[model].cells * n_reference, 1000003, 0);
    for (size_t k = 0; k < KINDS; k++) {
        const tarry_table *table = tarry_results_table(results, kinds[k].table);
        for (size_t row = 0; row < tarry_table_n_rows(table); row++)
            keep(&all, &kinds[k], table, row);
    }
    tarry_results_free(results);
    return all;
}

static void free_reference(reference *all) {
    reference *entry, *next;
    HASH_ITER(hh, all, entry, next) {
        HASH_DEL(all, entry);
        free(entry);
    }
}

/* ---- one repeat
 * ------------------------------------------------------------------------------------ */

static coverage_class *class_of(coverage_counts *all, const char *name) {
    for (size_t i = 0; i < all->n_classes; i++)
        if (strcmp(all->classes[i].name, name) == 0)
            return &all->classes[i];
    if (all->n_classes == COVERAGE_MOST_CLASSES)
        abort();
    coverage_class *added = &all->classes[all->n_classes++];
    snprintf(added->name, sizeof added->name, "%s", name);
    return added;
}

/* What docs/statistics.md, "Moments", says: a mean plain, other figures on the log scale. *low
 * comes in as the standard error. */
static void from_error(const interval_kind *kind, double value, int n_cells, double *low,
                       double *high) {
    const int n_groups = n_cells < 64 ? n_cells : 64;
    const double half = *low * gsl_cdf_tdist_Pinv(0.975, n_groups - 1);
    const bool plain = strcmp(kind->value, "mean") == 0;
    *low = plain ? value - half : value * exp(-half / value);
    *high = plain ? value + half : value * exp(half / value);
}

static void judge_row(const interval_kind *kind, const tarry_table *table, size_t row, int n_cells,
                      reference *exact, coverage_counts *one) {
    char key[256], name[64];
    double low = tarry_table_number(table, row, tarry_table_column(table, kind->low)), high;
    if (kind->high)
        high = tarry_table_number(table, row, tarry_table_column(table, kind->high));
    else
        from_error(kind, tarry_table_number(table, row, tarry_table_column(table, kind->value)),
                   n_cells, &low, &high);
    /* No interval, or one of no width where the figure is certain (correlation at lag 0). */
    if (!(low < high))
        return;
    write_key(kind, table, row, key);
    reference *entry;
    HASH_FIND_STR(exact, key, entry);
    if (!entry || isnan(entry->value))
        return;
    name_class(kind, table, row, entry->value, name);
    coverage_class *class = class_of(one, name);
    class->held += low <= entry->value && entry->value <= high;
    class->n++;
}

static void add_repeat(size_t model, unsigned seed, reference *exact, coverage_counts *one) {
    tarry_results *results = run(model, models[model].cells, seed, 1);
    for (size_t k = 0; k < KINDS; k++) {
        const tarry_table *table = tarry_results_table(results, kinds[k].table);
        for (size_t row = 0; row < tarry_table_n_rows(table); row++)
            judge_row(&kinds[k], table, row, models[model].cells, exact, one);
    }
    tarry_results_free(results);
}

static void add_up(coverage_counts *all, const coverage_counts *one) {
    for (size_t i = 0; i < one->n_classes; i++) {
        coverage_class *class = class_of(all, one->classes[i].name);
        class->held += one->classes[i].held;
        class->n += one->classes[i].n;
        class->runs += one->classes[i].held / one->classes[i].n;
        class->n_runs++;
    }
}

void coverage_run(size_t model, int n_repeats, int n_reference, coverage_counts *out) {
    tarry_start();
    *out = (coverage_counts){0};
    reference *exact = make_reference(model, n_reference);
#pragma omp parallel for schedule(dynamic)
    for (int i = 0; i < n_repeats; i++) {
        coverage_counts one = {0};
        add_repeat(model, (unsigned)i + 1, exact, &one);
#pragma omp critical
        add_up(out, &one);
    }
    free_reference(exact);
}

double coverage_share(const coverage_counts *coverage, const char *name) {
    for (size_t i = 0; i < coverage->n_classes; i++)
        if (strcmp(coverage->classes[i].name, name) == 0)
            return coverage->classes[i].runs / coverage->classes[i].n_runs;
    return NAN;
}
