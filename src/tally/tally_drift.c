/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Drift: does a product's mean, or one of data, move within a window? It only warns.
 *
 * Each cell gives the difference between its means over the frames of the second and of the first
 * half of the window; cells are independent, so that Student's paired test asks whether the mean
 * difference is 0 (Student 1908, Biometrika 6:1). All products and windows of a run are judged
 * together by Holm's procedure (1979, Scand. J. Stat. 6:65): a run in which nothing drifts warns
 * once in a thousand. Formulas: docs/statistics.md, "Drift". */
#include "base/error.h"
#include "base/memory.h"
#include "base/number.h"
#include "tally/channels.h"
#include "tally/kinds.h"
#include "tally/results.h"

#include <gsl/gsl_cdf.h>
#include <math.h>
#include <stdlib.h>

static const double level = 1e-3; /* of all tests of a run together */
enum { MOST_NOTES = 10 };

enum { FIRST, SECOND, SQUARES, CELLS, N_SUMS }; /* means of halves, squared differences, cells */

static bool is_tested(const tarry_network *network, const tarry_channel *channel) {
    return network->data || tarry_channel_is_product(network, channel);
}

/* Every recorded channel has room for its sums; those that are not tested leave it unused. */
static size_t drift_size(const tarry_network *network) {
    return (size_t)tarry_channels_recorded(network) * network->run.n_windows * N_SUMS;
}

/* Frames in each half of a window; of an odd number the middle one is left out. */
static uint32_t half_of(const tarry_window *window) {
    const tarry_range range = window->frames;
    return range.to > range.from ? (range.to - range.from) / 2 : 0;
}

/* Of those that are known; NaN where none is. */
static double mean_of(const double *values, uint32_t n) {
    double sum = 0.0;
    uint32_t known = 0;
    for (uint32_t i = 0; i < n; i++) {
        const bool is_known = !isnan(values[i]);
        sum += is_known ? values[i] : 0.0;
        known += is_known;
    }
    return sum / known;
}

static void add_window(const tarry_window *window, const double *frames, double *sums) {
    const uint32_t half = half_of(window);
    if (half == 0)
        return;
    const double first = mean_of(frames + window->frames.from, half);
    const double second = mean_of(frames + window->frames.to - half, half);
    if (isnan(first) || isnan(second))
        return;
    sums[CELLS] += 1.0;
    sums[FIRST] += first;
    sums[SECOND] += second;
    sums[SQUARES] += (second - first) * (second - first);
}

static void drift_add(const tarry_network *network, const tarry_record *record, double *sums,
                      double *scratch) {
    (void)scratch;
    const tarry_run_plan *run = &network->run;
    const double *frames = record->frames;
    for (uint32_t i = 0; i < network->n_channels; i++) {
        const tarry_channel *channel = &network->channels[i];
        if (!channel->recorded)
            continue;
        for (uint32_t w = 0; w < run->n_windows; w++, sums += N_SUMS)
            if (is_tested(network, channel))
                add_window(&run->windows[w], frames, sums);
        frames += run->n_frames;
    }
}

/* ---- the tests ------------------------------------------------------------------------------- */

typedef struct drift_test {
    uint32_t channel, window;
    double first, second; /* mean over cells */
    double p;             /* of this test alone, then as Holm adjusts it */
} drift_test;

/* The paired test's two-sided p-value from sums over n >= 2 cells. */
static double p_value(const double sums[N_SUMS]) {
    const double n = sums[CELLS];
    const double mean = (sums[SECOND] - sums[FIRST]) / n;
    const double variance = (sums[SQUARES] - n * mean * mean) / (n - 1.0);
    if (mean == 0.0)
        return 1.0;
    if (!(variance > 0.0))
        return 0.0;
    return 2.0 * gsl_cdf_tdist_Q(fabs(mean) / sqrt(variance / n), n - 1.0);
}

static size_t make_tests(const tarry_network *network, const double *sums, drift_test *tests) {
    const tarry_run_plan *run = &network->run;
    size_t n = 0;
    for (uint32_t i = 0; i < network->n_channels; i++) {
        const tarry_channel *channel = &network->channels[i];
        for (uint32_t w = 0; channel->recorded && w < run->n_windows; w++, sums += N_SUMS) {
            const double cells = sums[CELLS];
            if (!is_tested(network, channel) || half_of(&run->windows[w]) == 0 || cells < 2.0)
                continue;
            tests[n++] = (drift_test){i, w, sums[FIRST] / cells, sums[SECOND] / cells,
                                      p_value(sums)};
        }
    }
    return n;
}

/* By p, then by place, so that the order is one only. */
static int compare(const void *one, const void *other) {
    const drift_test *a = one, *b = other;
    if (a->p < b->p || a->p > b->p)
        return a->p < b->p ? -1 : 1;
    if (a->channel != b->channel)
        return a->channel < b->channel ? -1 : 1;
    return a->window < b->window ? -1 : a->window > b->window;
}

/* Sort and adjust; returns how many are below the level. */
static size_t judge(drift_test *tests, size_t n) {
    double least = 0.0;
    size_t n_drift = 0;
    qsort(tests, n, sizeof *tests, compare);
    for (size_t i = 0; i < n; i++) {
        tests[i].p = fmin(1.0, fmax(least, tests[i].p * (double)(n - i)));
        least = tests[i].p;
        n_drift += tests[i].p < level;
    }
    return n_drift;
}

/* ---- the warnings ---------------------------------------------------------------------------- */

/* Three significant digits. */
static const char *show(double x, char out[TARRY_NUMBER_SIZE]) {
    double step = 1.0;
    if (isfinite(x) && fabs(x) > 1e-300)
        step = pow(10.0, floor(log10(fabs(x))) - 2.0);
    tarry_number_write(step < 1.0 ? round(x / step) / round(1.0 / step) : round(x / step) * step,
                       out);
    return out;
}

static int warn(const tarry_network *network, const drift_test *test, tarry_notes *notes,
                tarry_error *error) {
    const tarry_channel *channel = &network->channels[test->channel];
    tarry_place place = {0};
    if (!network->data)
        place = network->genes[network->species[channel->species].gene].place;
    char first[TARRY_NUMBER_SIZE], second[TARRY_NUMBER_SIZE], p[TARRY_NUMBER_SIZE + 2] = "= ";
    show(test->p, p + 2);
    return tarry_notes_add(
        notes, place, error,
        "%s drifts in window %s: its mean is %s in the first half and %s in the "
        "second (paired test over cells, p %s after Holm), so figures pooled "
        "over the window mix the two; %s",
        channel->name, network->run.windows[test->window].name, show(test->first, first),
        show(test->second, second), test->p < 1e-12 ? "< 1e-12" : p,
        network->data ? "cut the time in which it is steady (--from, --to), or "
                        "take off the mean at each frame (--mean frame)"
                      : "settle longer (run: settle), or choose windows in which "
                        "it is steady");
}

static int drift_report(const tarry_network *network, const tarry_tally_set *set,
                        const tarry_tally_kind *kind, tarry_results *results, tarry_error *error) {
    const double cells = tarry_tally_cells(set);
    if (cells < 2.0)
        return TARRY_OK;
    drift_test *tests = tarry_calloc(drift_size(network) / N_SUMS, sizeof *tests);
    if (!tests)
        return tarry_fail_memory(error, "the tests for drift");
    const size_t n = make_tests(network, tarry_tally_sums(set, kind), tests);
    const size_t n_drift = judge(tests, n);
    int code = TARRY_OK;
    for (size_t i = 0; !code && i < n_drift && i < MOST_NOTES; i++)
        code = warn(network, &tests[i], &results->notes, error);
    if (!code && n_drift > MOST_NOTES)
        code = tarry_notes_add(&results->notes, (tarry_place){0}, error,
                               "%zu more means drift within a window", n_drift - MOST_NOTES);
    free(tests);
    return code;
}

const tarry_tally_kind tarry_tally_drift = {
    .name = "drift",
    .size = drift_size,
    .add = drift_add,
    .report = drift_report,
};
