/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "report/run_words.h"

#include "base/number.h"
#include "report/repeat.h"

#include <math.h>

/* Films have frames, fixed cells times. */
static void data_words(const tarry_network *network, const tarry_results *results,
                       tarry_text *text) {
    const tarry_run_plan *plan = &network->run;
    const tarry_data_plan *data = network->data;
    const long long n = (long long)tarry_results_n_cells(results);
    const char *unit = network->time_unit;
    char from[TARRY_NUMBER_SIZE], until[TARRY_NUMBER_SIZE], every[TARRY_NUMBER_SIZE];
    tarry_number_write_rounded(data->start, 12, from);
    tarry_number_write_rounded(plan->until, 12, until);
    tarry_number_write_rounded(plan->every, 12, every);
    if (plan->n_frames > 0)
        tarry_text_printf(text, "%lld cell%s, traces with a frame every %s %s from %s to %s %s", n,
                          n == 1 ? "" : "s", every, unit, from, until, unit);
    else
        tarry_text_printf(text, "%lld %s%s, %s at %lu time%s from %s to %s %s", n,
                          network->n_species > 0 ? "fixed cell" : "row", n == 1 ? "" : "s",
                          data->kind, (unsigned long)plan->n_snapshots,
                          plan->n_snapshots == 1 ? "" : "s", from, until, unit);
    if (data->resampled)
        tarry_text_printf(text, "; intervals by %s (%lld)", data->resampled,
                          (long long)data->n_resampled);
}

void tarry_run_words(const tarry_network *network, const tarry_results *results, tarry_text *text) {
    const tarry_run_plan *plan = &network->run;
    const int64_t n = tarry_results_n_cells(results);
    const int64_t asked = tarry_results_n_cells_asked(results);
    const char *unit = network->time_unit;
    char until[TARRY_NUMBER_SIZE], every[TARRY_NUMBER_SIZE], settle[TARRY_NUMBER_SIZE];
    if (network->data) {
        data_words(network, results, text);
        return;
    }
    tarry_number_write(plan->until, until);
    tarry_number_write(plan->every, every);
    tarry_number_write(plan->settle, settle);
    if (tarry_results_is_predicted(results))
        tarry_text_printf(text, "worked out without simulation");
    else
        tarry_text_printf(text, "%lld cell%s", (long long)n, n == 1 ? "" : "s");
    if (!tarry_results_is_predicted(results) && n < asked)
        tarry_text_printf(text, " of %lld (interrupted)", (long long)asked);
    tarry_text_printf(text, ", %s %s recorded every %s %s", until, unit, every, unit);
    if (plan->settle > 0)
        tarry_text_printf(text, " after %s %s to settle", settle, unit);
    if (!tarry_results_is_predicted(results))
        tarry_text_printf(text, ", seed %llu", (unsigned long long)plan->seed);
}

/* Of data the model and the place are told: where it differs is what is asked. */
static void beside_words(const tarry_network *network, const tarry_results *results,
                         tarry_text *text) {
    const tarry_self_check *check = tarry_results_self_check(results);
    char largest[TARRY_NUMBER_SIZE], share[TARRY_NUMBER_SIZE];
    tarry_text_printf(text, "Beside %s: ", tarry_repeat_file(network->data->beside));
    if (check->n_compared == 0) {
        tarry_text_add_string(text,
                              "no figure of the data could be compared, which takes an exact law "
                              "and 20 cells, or groups, at least");
        return;
    }
    tarry_number_write_fixed(check->largest, 1, largest);
    tarry_number_write_rounded(100 * check->share_larger, 2, share);
    tarry_text_printf(text,
                      "of %zu figure%s with an exact law the farthest is %s standard errors off "
                      "(%s); in %s%s %% of data sets of this model one is farther",
                      check->n_compared, check->n_compared > 1 ? "s" : "", largest, check->where,
                      check->alarm ? "fewer than " : "", check->alarm ? "0.01" : share);
}

static void self_check_words(const tarry_results *results, tarry_text *text) {
    const tarry_self_check *check = tarry_results_self_check(results);
    char largest[TARRY_NUMBER_SIZE], share[TARRY_NUMBER_SIZE];
    if (check->n_compared == 0)
        return;
    tarry_number_write_fixed(check->largest, 1, largest);
    tarry_number_write_rounded(100 * check->share_larger, 2, share);
    tarry_text_printf(
        text,
        "Self-check: of %zu figures that have an exact law the farthest is %s standard "
        "errors off; in %s%s %% of correct runs one is farther",
        check->n_compared, largest, check->alarm ? "fewer than " : "",
        check->alarm ? "0.01" : share);
}

static void add_rounded(tarry_text *text, const char *words, double value) {
    char number[TARRY_NUMBER_SIZE];
    tarry_number_write_rounded(value, 4, number);
    tarry_text_printf(text, "%s%s", words, number);
}

/* Names that share their thresholds stand side by side. */
static void threshold_words(const tarry_network *network, tarry_text *text) {
    const tarry_thresholds *before = NULL;
    for (uint32_t i = 0; i < network->n_channels; i++) {
        const tarry_channel *channel = &network->channels[i];
        const tarry_thresholds *t = channel->thresholds;
        if (!t)
            continue;
        tarry_text_printf(text, "%s%s", before ? ", " : "Visible: ", channel->name);
        before = t;
        if (i + 1 < network->n_channels && network->channels[i + 1].thresholds == t)
            continue;
        add_rounded(text, " above ", t->high);
        add_rounded(text, " until below ", t->low);
    }
    if (!before)
        return;
    add_rounded(text, "; changes last ", before->least);
    tarry_text_printf(text, " %s", network->time_unit);
}

static void window_words(const tarry_network *network, tarry_text *text) {
    const tarry_run_plan *plan = &network->run;
    char from[TARRY_NUMBER_SIZE], to[TARRY_NUMBER_SIZE];
    for (uint32_t w = 0; plan->n_windows > 1 && w < plan->n_windows; w++) {
        tarry_number_write(plan->windows[w].from, from);
        tarry_number_write(plan->windows[w].to, to);
        tarry_text_printf(text, "%s%s from %s to %s %s",
                          w ? ", " : "Windows: ", plan->windows[w].name, from, to,
                          network->time_unit);
    }
}

static void detection_words(const tarry_network *network, tarry_text *text) {
    const char *before = "Detected: ";
    for (uint32_t i = 0; i < network->n_signals; i++) {
        const tarry_signal *signal = &network->signals[i];
        if (isnan(signal->detects_above))
            continue;
        tarry_text_printf(text, "%s%s", before, signal->name);
        add_rounded(text, signal->from_first ? " from its first frame above " : " in frames above ",
                    signal->detects_above);
        tarry_text_add_string(text, signal->from_first ? " on" : " only");
        before = ", ";
    }
}

void tarry_run_lines(const tarry_network *network, const tarry_results *results,
                     tarry_text lines[TARRY_RUN_LINES]) {
    window_words(network, &lines[TARRY_RUN_LINE_WINDOWS]);
    if (network->data && network->data->beside)
        beside_words(network, results, &lines[TARRY_RUN_LINE_CHECK]);
    else
        self_check_words(results, &lines[TARRY_RUN_LINE_CHECK]);
    threshold_words(network, &lines[TARRY_RUN_LINE_VISIBLE]);
    detection_words(network, &lines[TARRY_RUN_LINE_DETECTED]);
}
