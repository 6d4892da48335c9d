/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Thresholds by which traces are told to be visible or dark: given, or found from the background.
 *
 * Most frames of a spot that is seldom there show the background alone. Its level is taken as the
 * mode of all values, by the half-sample mode (Bickel & Fruehwirth 2006, Comput. Stat. Data Anal.
 * 50:3500), which spots on one side do not move; its sd from the values below that, as 1.4826 times
 * the median distance of these (the median absolute deviation of one side; for normal noise that
 * is its sd). Thresholds of 2 and 4 sd above are common practice, no source. */
#include "study/data.h"

#include "base/error.h"
#include "base/number.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

static const double low_sds = 2.0, high_sds = 4.0, least_frames = 2.0;
static const double sd_of_median = 1.4826; /* 1/quantile of |z| at a half, z standard normal */

enum { MOST_VALUES = 1000000 }; /* of more every so many is taken */

/* ---- given ----------------------------------------------------------------------------------- */

static int fail_form(const char *given, tarry_error *error) {
    return tarry_fail(error, TARRY_INPUT,
                      "--visible %s: `auto` is due here, or below which value a trace is dark, "
                      "above which it is visible, and how long a change must last to count, as in "
                      "--visible \"2,4,1 min\"",
                      given);
}

static int read_given(const tarry_data *data, tarry_thresholds *thresholds, tarry_error *error) {
    const char *text = data->options.visible;
    const char *first = strchr(text, ','), *second = first != NULL ? strchr(first + 1, ',') : NULL;
    tarry_dimension dimension;
    if (second == NULL ||
        tarry_number_read(text, (size_t)(first - text), &thresholds->low) != TARRY_NUMBER_OK ||
        tarry_number_read(first + 1, (size_t)(second - first - 1), &thresholds->high) !=
            TARRY_NUMBER_OK ||
        !tarry_quantity_read(second + 1, strlen(second + 1), data->options.units,
                             &thresholds->least, &dimension) ||
        !tarry_dimension_fits(dimension, TARRY_TIME))
        return fail_form(text, error);
    if (!(thresholds->low <= thresholds->high && thresholds->least >= 0.0))
        return tarry_fail(error, TARRY_INPUT,
                          "--visible %s: the lower threshold comes first and must not be above the "
                          "upper one, and the length is not negative",
                          text);
    return TARRY_OK;
}

/* ---- found ----------------------------------------------------------------------------------- */

static int ascending(const void *one, const void *other) {
    const double a = *(const double *)one, b = *(const double *)other;
    return (a > b) - (a < b);
}

/* Known values of a column, ascending; the heap's. */
static double *sorted_values(const tarry_data *data, size_t column, size_t *n) {
    const size_t n_rows = data->table.n_rows, step = n_rows / MOST_VALUES + 1;
    double *values = tarry_calloc(n_rows / step + 1, sizeof *values);
    *n = 0;
    for (size_t row = 0; values != NULL && row < n_rows; row += step)
        if (!isnan(data->table.values[column][row]))
            values[(*n)++] = data->table.values[column][row];
    if (values != NULL)
        qsort(values, *n, sizeof *values, ascending);
    return values;
}

double tarry_data_mode(const double *ascending_values, size_t n) {
    const double *x = ascending_values;
    while (n > 2) {
        const size_t half = (n + 1) / 2;
        size_t best = 0;
        for (size_t i = 1; i + half <= n; i++)
            if (x[i + half - 1] - x[i] < x[best + half - 1] - x[best])
                best = i;
        if (n == 3) /* the nearer pair, or the middle one */
            return x[1] - x[0] < x[2] - x[1]   ? 0.5 * (x[0] + x[1])
                   : x[2] - x[1] < x[1] - x[0] ? 0.5 * (x[1] + x[2])
                                               : x[1];
        x += best;
        n = half;
    }
    return n == 2 ? 0.5 * (x[0] + x[1]) : x[0];
}

/* Of values up to the mode. */
static double lower_sd(const double *x, size_t n, double mode) {
    size_t below = 0;
    while (below < n && x[below] <= mode)
        below++;
    if (below == 0)
        return 0.0;
    const double median = below % 2 ? x[below / 2] : 0.5 * (x[below / 2 - 1] + x[below / 2]);
    return sd_of_median * (mode - median);
}

static int find(const tarry_data *data, size_t column, tarry_thresholds *thresholds,
                tarry_error *error) {
    size_t n;
    double *values = sorted_values(data, column, &n);
    if (values == NULL)
        return tarry_fail_memory(error, "the background of traces");
    const double mode = n > 0 ? tarry_data_mode(values, n) : NAN;
    const double sd = n > 0 ? lower_sd(values, n, mode) : 0.0;
    free(values);
    if (!(sd > 0.0))
        return tarry_fail(error, TARRY_INPUT,
                          "--visible auto: the background of '%s' cannot be told, since no values "
                          "vary about the most frequent one from below; give --visible "
                          "LOW,HIGH,LENGTH",
                          data->table.names[column]);
    *thresholds = (tarry_thresholds){.low = mode + low_sds * sd,
                                     .high = mode + high_sds * sd,
                                     .least = least_frames * data->frames.every,
                                     .is_found = true,
                                     .background = mode,
                                     .background_sd = sd};
    return TARRY_OK;
}

/* ---- both ------------------------------------------------------------------------------------ */

int tarry_data_thresholds(const tarry_data *data, size_t column,
                          const tarry_thresholds **thresholds, tarry_error *error) {
    *thresholds = NULL;
    if (data->options.visible == NULL)
        return TARRY_OK;
    tarry_thresholds *made = tarry_arena_calloc(&data->model->arena, 1, sizeof *made);
    if (made == NULL)
        return tarry_fail_memory(error, "the thresholds of traces");
    *thresholds = made;
    return strcmp(data->options.visible, "auto") == 0 ? find(data, column, made, error)
                                                      : read_given(data, made, error);
}

int tarry_data_note_thresholds(const tarry_data *data, tarry_notes *notes, tarry_error *error) {
    const tarry_network *network = &data->model->network;
    int code = TARRY_OK;
    for (uint32_t i = 0; code == TARRY_OK && i < network->n_channels; i++) {
        const tarry_thresholds *t = network->channels[i].thresholds;
        char mode[TARRY_NUMBER_SIZE], sd[TARRY_NUMBER_SIZE];
        if (t == NULL || !t->is_found)
            continue;
        tarry_number_write_rounded(t->background, 4, mode);
        tarry_number_write_rounded(t->background_sd, 3, sd);
        code = tarry_notes_add(notes, (tarry_place){0}, error,
                               "%s: its background was taken to be %s with an sd of %s, the most "
                               "frequent values of all, and its thresholds are 2 and 4 sd above "
                               "(--visible auto): look whether that is what shows where there is "
                               "no spot, which it is not where spots are there most of the time",
                               network->channels[i].name, mode, sd);
    }
    return code;
}
