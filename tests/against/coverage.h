/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_TEST_COVERAGE_H
#define TARRY_TEST_COVERAGE_H

/* How often 95 % intervals hold: a small run is repeated with many seeds, and every interval of
 * every table is held against the figure of one run of many more cells, whose own error is a small
 * part of the interval's width. (Figures without bias are the business of the other tests here,
 * which know closed forms.) */

#include <stddef.h>

enum { COVERAGE_MODELS = 9, COVERAGE_MOST_CLASSES = 64 };

/* Intervals of one kind, such as "bursts: interval_mean" or "distribution: 0.01 to 0.1". */
typedef struct coverage_class {
    char name[64];
    double held, n;      /* intervals that held, and all */
    double runs, n_runs; /* sum over runs of the share that held, and runs with any */
} coverage_class;

typedef struct coverage_counts {
    coverage_class classes[COVERAGE_MOST_CLASSES];
    size_t n_classes;
} coverage_counts;

/* Short title of a model, for the head of a column. */
const char *coverage_title(size_t model);

/* Repeat a model with seeds 1 .. n_repeats against a run of n_reference times as many cells (with a
 * seed of its own). Ends the test or the program on an error. */
void coverage_run(size_t model, int n_repeats, int n_reference, coverage_counts *out);

/* Share of intervals that held, averaged over runs; NaN where there were none. */
double coverage_share(const coverage_counts *coverage, const char *name);

#endif
