/* SPDX-License-Identifier: GPL-3.0-or-later */

/* The table of docs/statistics.md: how often each 95 % interval holds, in nine models.
 *
 *   slow_coverage [REPEATS]    default 1,000
 *
 * Prints Markdown: a row for each kind of interval, a column for each model, shares in %; those
 * outside 92.5 to 97.5 in bold. */

#include "coverage.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

static int compare(const void *one, const void *other) {
    return strcmp(*(const char *const *)one, *(const char *const *)other);
}

/* Names of all classes that any model has, each once. */
static size_t list_names(const coverage_counts *all, const char **names) {
    size_t n = 0;
    for (size_t m = 0; m < COVERAGE_MODELS; m++)
        for (size_t i = 0; i < all[m].n_classes; i++)
            names[n++] = all[m].classes[i].name;
    qsort(names, n, sizeof *names, compare);
    size_t kept = 0;
    for (size_t i = 0; i < n; i++)
        if (kept == 0 || strcmp(names[kept - 1], names[i]) != 0)
            names[kept++] = names[i];
    return kept;
}

static void print_share(double share) {
    const double percent = 100 * share;
    if (isnan(share))
        printf(" |");
    else if (percent < 92.5 || percent > 97.5)
        printf(" **%.1f** |", percent);
    else
        printf(" %.1f |", percent);
}

int main(int argc, char **argv) {
    const int repeats = argc > 1 ? atoi(argv[1]) : 1000;
    static coverage_counts all[COVERAGE_MODELS];
    static const char *names[COVERAGE_MODELS * COVERAGE_MOST_CLASSES];
    if (repeats < 1)
        return 2;
    for (size_t m = 0; m < COVERAGE_MODELS; m++) {
        coverage_run(m, repeats, 500, &all[m]);
        fprintf(stderr, "%s: done\n", coverage_title(m));
    }
    printf("%d repeats\n\n| interval |", repeats);
    for (size_t m = 0; m < COVERAGE_MODELS; m++)
        printf(" %s |", coverage_title(m));
    printf("\n| --- |");
    for (size_t m = 0; m < COVERAGE_MODELS; m++)
        printf(" --- |");
    printf("\n");
    const size_t n = list_names(all, names);
    for (size_t i = 0; i < n; i++) {
        printf("| %s |", names[i]);
        for (size_t m = 0; m < COVERAGE_MODELS; m++)
            print_share(coverage_share(&all[m], names[i]));
        printf("\n");
    }
    return 0;
}
