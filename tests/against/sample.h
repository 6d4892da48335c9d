/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_TEST_SAMPLE_H
#define TARRY_TEST_SAMPLE_H

/* Simulated cells for the tests against outside sources, and the limits that they must keep.
 *
 * Limits: the suite may fail a correct program once in 1,000 reshuffles; with at most 1,700 checks
 * that is |Z| < 5 and a p-value above 1e-3 / 1,700 each. Seeds are 1. Where TARRY_TEST_SMALL is set
 * in the environment (slow sanitizer builds) a tenth of the cells are run; the limits stay. */

#include <stddef.h>
#include <stdint.h>
#include "tarry/tarry.h"

#define SAMPLE_Z_LIMIT 5.0
#define SAMPLE_P_LIMIT (1e-3 / 1700)

/* The snapshots of every cell of a run. */
typedef struct sample_cells {
    tarry_model *model;
    size_t n_cells, n_channels, n_snapshots;
    double *values; /* [channel][snapshot][cell] */
} sample_cells;

/* Run n cells (n / 10 when small) of a model text; ends the test on an error. */
sample_cells *sample_new(const char *model_text, size_t n_cells);
void sample_free(sample_cells *sample);

/* Values of the named channel at a snapshot: n_cells numbers. */
const double *sample_values(const sample_cells *sample, const char *name, size_t snapshot);

double sample_mean(const sample_cells *sample, const char *name, size_t snapshot);
double sample_sd(const sample_cells *sample, const char *name, size_t snapshot);

/* n, or what is run of it in a small build. */
size_t sample_size(size_t n);

/* Mean and sd of n values against exact ones (Evans, Gillespie & Wilkinson 2008, Bioinformatics
 * 24:285): Z = sqrt(n) (mean - exact) / sd and Y = sqrt(n / 2) (sd^2 / exact sd^2 - 1), Y divided
 * by its own sd, sqrt(1 + kurtosis / 2), with the law's excess kurtosis. */
void check_mean(const char *what, double mean, double exact_mean, double exact_sd, size_t n);
void check_sd(const char *what, double sd, double exact_sd, double kurtosis, size_t n);
void check_mean_and_sd(const char *what, const sample_cells *sample, const char *name,
                       size_t snapshot, double exact_mean, double exact_sd, double kurtosis);

/* A Z that has been worked out elsewhere. */
void check_z(const char *what, double z);

/* Whole-number values against a law on 0 .. n_probabilities - 1 (the rest of the probability beyond
 * it): chi-square with neighbouring bins pooled until 10 are expected in each. */
void check_counts(const char *what, const double *values, size_t n, const double *probabilities,
                  size_t n_probabilities);

/* Continuous values against a cdf, by Kolmogorov and Smirnov's statistic (asymptotic p-value). */
void check_continuous(const char *what, const double *values, size_t n,
                      double (*cdf)(double x, void *context), void *context);

/* All results of a run of the model text, by tarry_run; ends the test on an error. */
tarry_results *run_results(const char *model_text, tarry_model **model);

/* A figure with its interval out of bursts.csv (or signals.csv): the row with these labels. */
typedef struct sample_figure {
    double value, low, high, samples;
} sample_figure;
sample_figure burst_figure(const tarry_results *results, const char *gene, const char *window,
                           const char *quantity);
sample_figure signal_figure(const tarry_results *results, const char *signal, const char *window,
                            const char *quantity);

/* Value against exact by the figure's own interval: Z from its standard error, taken as the width
 * of the 95 % interval on the log scale (positive figures) over 2 x 1.998. */
void check_figure(const char *what, sample_figure figure, double exact);

#endif
