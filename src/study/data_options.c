/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Options of `tarry measure`: each is a row of one table, by the name that the command line has for
 * it. */
#include "study/data.h"

#include "base/error.h"
#include "base/number.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

const char *const tarry_data_kind_names[] = {"traces", "counts", "means"};

static int fail_choice(const tarry_override *setting, const char *what, tarry_error *error) {
    return tarry_fail(error, TARRY_INPUT, "%s %s: %s is due here", setting->option, setting->value,
                      what);
}

/* Index of the value among words, or -1. */
static int find_word(const char *value, const char *const *words, int n) {
    for (int i = 0; i < n; i++)
        if (strcmp(value, words[i]) == 0)
            return i;
    return -1;
}

static int read_unit(const tarry_override *setting, tarry_data_options *options,
                     tarry_error *error) {
    options->unit = setting->value;
    options->units.time_unit = tarry_time_unit_seconds(setting->value);
    return options->units.time_unit > 0.0
               ? TARRY_OK
               : fail_choice(setting, "the unit of the column `time`, one of s, min, h and d,",
                             error);
}

static int read_kind(const tarry_override *setting, tarry_data_options *options,
                     tarry_error *error) {
    const int i = find_word(setting->value, tarry_data_kind_names, TARRY_DATA_UNKNOWN);
    options->kind = (tarry_data_kind)i;
    return i >= 0 ? TARRY_OK : fail_choice(setting, "one of traces, counts and means", error);
}

static int read_mean(const tarry_override *setting, tarry_data_options *options,
                     tarry_error *error) {
    static const char *const words[] = {"all", "frame", "cell"};
    const int i = find_word(setting->value, words, 3);
    options->mean = (tarry_film_mean)i;
    return i >= 0 ? TARRY_OK
                  : fail_choice(setting,
                                "one of all (the mean over cells and frames), frame (over cells at "
                                "each frame) and cell (each cell's own)",
                                error);
}

static int read_gaps(const tarry_override *setting, tarry_data_options *options,
                     tarry_error *error) {
    static const char *const words[] = {"ask", "dark", "missing"};
    const int i = find_word(setting->value, words, 3);
    options->gaps = (tarry_data_gaps)i;
    return i > 0 ? TARRY_OK : fail_choice(setting, "one of dark and missing", error);
}

static int read_counted(const tarry_override *setting, tarry_data_options *options,
                        tarry_error *error) {
    (void)error;
    options->counted = setting->value;
    return TARRY_OK;
}

static int read_visible(const tarry_override *setting, tarry_data_options *options,
                        tarry_error *error) {
    (void)error;
    options->visible = setting->value;
    return TARRY_OK;
}

static int read_background(const tarry_override *setting, tarry_data_options *options,
                           tarry_error *error) {
    return tarry_number_read(setting->value, strlen(setting->value), &options->background) ==
                   TARRY_NUMBER_OK
               ? TARRY_OK
               : fail_choice(setting, "a number, what is read where nothing shines,", error);
}

static int read_time(const tarry_override *setting, const char *text, size_t n,
                     const tarry_data_options *options, double *out, tarry_error *error) {
    tarry_dimension dimension;
    if (!tarry_quantity_read(text, n, options->units, out, &dimension) ||
        !tarry_dimension_fits(dimension, TARRY_TIME))
        return fail_choice(setting, "a time, as in 20 or '20 min',", error);
    return TARRY_OK;
}

static int read_whole_time(const tarry_override *setting, const tarry_data_options *options,
                           double *out, tarry_error *error) {
    return read_time(setting, setting->value, strlen(setting->value), options, out, error);
}

static int read_from(const tarry_override *setting, tarry_data_options *options,
                     tarry_error *error) {
    return read_whole_time(setting, options, &options->from, error);
}

static int read_to(const tarry_override *setting, tarry_data_options *options, tarry_error *error) {
    return read_whole_time(setting, options, &options->to, error);
}

static int read_every(const tarry_override *setting, tarry_data_options *options,
                      tarry_error *error) {
    const int code = read_whole_time(setting, options, &options->every, error);
    if (code == TARRY_OK && !(options->every > 0.0))
        return fail_choice(setting, "the time between frames, above 0,", error);
    return code;
}

static int read_lags(const tarry_override *setting, tarry_data_options *options,
                     tarry_error *error) {
    const int code = read_whole_time(setting, options, &options->lags, error);
    if (code == TARRY_OK && !(options->lags >= 0.0))
        return fail_choice(setting, "the longest lag, not below 0,", error);
    return code;
}

static int ascending(const void *one, const void *other) {
    const double a = *(const double *)one, b = *(const double *)other;
    return (a > b) - (a < b);
}

/* Times with commas between them. */
static int read_snapshots(const tarry_override *setting, tarry_data_options *options,
                          tarry_error *error) {
    size_t n = 0;
    for (const char *at = setting->value; at != NULL; n++) {
        const char *comma = strchr(at, ',');
        const size_t length = comma != NULL ? (size_t)(comma - at) : strlen(at);
        const int code = read_time(setting, at, length, options, &options->snapshots[n], error);
        if (code != TARRY_OK)
            return code;
        at = comma != NULL ? comma + 1 : NULL;
    }
    qsort(options->snapshots, n, sizeof *options->snapshots, ascending);
    options->n_snapshots = n;
    return TARRY_OK;
}

typedef int (*reader)(const tarry_override *, tarry_data_options *, tarry_error *);

/* In the order in which they are read: times need the unit. */
static const struct {
    const char *name;
    reader read;
    bool of_traces; /* only */
} readers[] = {
    {"time", read_unit, false},          {"kind", read_kind, false},
    {"from", read_from, false},          {"to", read_to, false},
    {"counted", read_counted, true},     {"mean", read_mean, true},
    {"gaps", read_gaps, true},           {"background", read_background, true},
    {"every", read_every, true},         {"lags", read_lags, true},
    {"snapshots", read_snapshots, true}, {"visible", read_visible, true},
};

enum { N_READERS = sizeof readers / sizeof *readers };

static int read_named(size_t which, const tarry_override *settings, size_t n,
                      tarry_data_options *options, tarry_error *error) {
    for (size_t i = 0; i < n; i++) {
        if (settings[i].is_parameter || strcmp(settings[i].name, readers[which].name) != 0)
            continue;
        if (readers[which].of_traces)
            options->of_traces = settings[i].option;
        return readers[which].read(&settings[i], options, error);
    }
    return TARRY_OK;
}

int tarry_data_options_read(const tarry_override *settings, size_t n, tarry_arena *arena,
                            tarry_data_options *options, tarry_error *error) {
    *options = (tarry_data_options){
        .kind = TARRY_DATA_UNKNOWN, .from = NAN, .to = NAN, .every = NAN, .lags = NAN};
    size_t length = 1;
    for (size_t i = 0; i < n; i++)
        length += strlen(settings[i].value);
    options->snapshots = tarry_arena_calloc(arena, length, sizeof *options->snapshots);
    if (options->snapshots == NULL)
        return tarry_fail_memory(error, "the options of a measurement");
    for (size_t i = 0; i < N_READERS; i++) {
        const int code = read_named(i, settings, n, options, error);
        if (code != TARRY_OK)
            return code;
        if (i == 0 && options->unit == NULL)
            return tarry_fail(error, TARRY_INPUT,
                              "--time is missing: name the unit of the column `time`, one of s, "
                              "min, h and d, as in --time min");
    }
    if (options->from >= options->to)
        return tarry_fail(error, TARRY_INPUT,
                          "--from must lie before --to, so that some time is left between them");
    return TARRY_OK;
}
