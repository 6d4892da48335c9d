/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Data in the place of a model: a network that holds names, times and one window, and nothing that
 * reacts. Each column of values is a signal; one that holds counts is a species, too. */
#include "study/data.h"

#include "base/error.h"
#include "base/file.h"
#include "base/memory.h"
#include "base/number.h"
#include "base/random.h"
#include "tally/tally.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

/* Without `lags` the longest lag is this share of the longest trace. */
static const double lag_share = 0.25;

/* Above this share of missing frames somebody must say what they are. */
static const double most_missing = 0.02;

static const double slack = 0.05; /* of a frame interval, in which a snapshot is at a frame */

enum { LEAST_GROUPS = 4, LINES_SHOWN = 12, MOST_TRACES = 24 };

static int fail_data(const tarry_data *data, tarry_error *error, const char *message) {
    return tarry_fail_at(error, TARRY_INPUT, (tarry_place){data->table.path, 0, 0}, "%s", message);
}

/* ---- names ----------------------------------------------------------------------------------- */

/* Is the name in the list of --counted? */
static bool is_listed(const char *list, const char *name) {
    const size_t n = strlen(name);
    if (list == NULL)
        return false;
    if (strcmp(list, "all") == 0)
        return true;
    for (const char *at = list; at != NULL;) {
        if (strncmp(at, name, n) == 0 && (at[n] == ',' || at[n] == '\0'))
            return true;
        at = strchr(at, ',');
        at = at != NULL ? at + 1 : NULL;
    }
    return false;
}

/* Every name of --counted must be there. */
static int check_counted(const tarry_data *data, tarry_error *error) {
    const char *list = data->options.counted;
    for (const char *at = list; at != NULL && strcmp(list, "all") != 0;) {
        const size_t n = strcspn(at, ",");
        bool found = false;
        for (size_t k = 0; k < data->table.n_names; k++)
            found = found ||
                    (strlen(data->table.names[k]) == n && !memcmp(data->table.names[k], at, n));
        if (!found)
            return tarry_fail(error, TARRY_INPUT,
                              "--counted %s: there is no column %.*s; the first is %s", list,
                              (int)n, at, data->table.names[0]);
        at = at[n] == ',' ? at + n + 1 : NULL;
    }
    return TARRY_OK;
}

static bool is_counted(const tarry_data *data, size_t k) {
    return data->table.kind == TARRY_DATA_COUNTS ||
           (data->table.kind == TARRY_DATA_TRACES &&
            is_listed(data->options.counted, data->table.names[k]));
}

static int check_whole(const tarry_data *data, size_t k, tarry_error *error) {
    for (size_t row = 0; row < data->table.n_rows; row++) {
        const double value = data->table.values[k][row];
        char text[TARRY_NUMBER_SIZE];
        if (isnan(value) || (value >= 0.0 && value == floor(value) && value <= 0x1p53))
            continue;
        tarry_number_write(value, text);
        return tarry_fail_at(error, TARRY_INPUT,
                             tarry_data_table_place(&data->table, row, data->table.field_of[k]),
                             "%s: --counted says that %s holds counts of molecules, whole numbers "
                             "from 0 on",
                             text, data->table.names[k]);
    }
    return TARRY_OK;
}

static int make_names(tarry_data *data, tarry_error *error) {
    tarry_network *network = &data->model->network;
    tarry_arena *arena = &data->model->arena;
    const size_t n = data->table.n_names;
    tarry_channel *channels = tarry_arena_calloc(arena, n, sizeof *channels);
    tarry_signal *signals = tarry_arena_calloc(arena, n, sizeof *signals);
    tarry_species *species = tarry_arena_calloc(arena, n, sizeof *species);
    if (channels == NULL || signals == NULL || species == NULL)
        return tarry_fail_memory(error, "the names of data");
    int code = check_counted(data, error);
    if (code == TARRY_OK && data->table.kind == TARRY_DATA_TRACES && n > MOST_TRACES)
        code = fail_data(data, error,
                         "traces have at most 24 columns of values, since each pair of them is "
                         "correlated; give some of the columns at a time");
    for (size_t k = 0; code == TARRY_OK && k < n; k++) {
        const char *name = data->table.names[k];
        const bool counted = is_counted(data, k);
        const bool film = data->table.kind == TARRY_DATA_TRACES;
        channels[k] = (tarry_channel){.name = name,
                                      .species = TARRY_NONE,
                                      .signal = TARRY_NONE,
                                      .recorded = true,
                                      .correlates = film};
        if (film)
            code = tarry_data_thresholds(data, k, &channels[k].thresholds, error);
        if (code == TARRY_OK && counted) {
            channels[k].species = (int32_t)network->n_species;
            species[network->n_species++] = (tarry_species){
                .name = name, .role = TARRY_SPECIES_PLAIN, .gene = TARRY_NONE};
            code = check_whole(data, k, error);
        }
        if (!counted || film) {
            channels[k].signal = (int32_t)network->n_signals;
            signals[network->n_signals++] = (tarry_signal){.name = name,
                                                           .background = data->options.background,
                                                           .responds_above = NAN,
                                                           .detects_above = NAN};
        }
    }
    network->channels = channels;
    network->n_channels = (uint32_t)n;
    network->signals = signals;
    network->species = species;
    return code;
}

/* ---- times ----------------------------------------------------------------------------------- */

static int make_window(tarry_data *data, double from, double to, uint32_t n_frames,
                       tarry_error *error) {
    tarry_run_plan *run = &data->model->network.run;
    tarry_arena *arena = &data->model->arena;
    tarry_window *window = tarry_arena_calloc(arena, 1, sizeof *window);
    double *bounds = tarry_arena_calloc(arena, 2, sizeof *bounds);
    tarry_segment *segment = tarry_arena_calloc(arena, 1, sizeof *segment);
    if (window == NULL || bounds == NULL || segment == NULL)
        return tarry_fail_memory(error, "the times of data");
    *window = (tarry_window){"all", from, to, {0, 1}, {0, n_frames}};
    bounds[0] = from;
    bounds[1] = to;
    segment->start = from;
    segment->response = TARRY_NONE;
    run->until = to;
    run->n_frames = n_frames;
    run->windows = window;
    run->n_windows = 1;
    run->bounds = bounds;
    run->n_spans = 1;
    data->model->network.segments = segment;
    data->model->network.n_segments = 1;
    data->plan.start = from;
    return TARRY_OK;
}

/* Snapshots of films, which must be at frames. */
static int check_snapshots(const tarry_data *data, tarry_error *error) {
    const tarry_data_frames *frames = &data->frames;
    for (size_t i = 0; i < data->options.n_snapshots; i++) {
        const double at = (data->options.snapshots[i] - frames->start) / frames->every;
        char time[TARRY_NUMBER_SIZE];
        if (at > -slack && at < (double)frames->n_frames - 1.0 + slack &&
            fabs(at - round(at)) <= slack)
            continue;
        tarry_number_write(data->options.snapshots[i], time);
        return tarry_fail(error, TARRY_INPUT, "--snapshots: there is no frame at %s", time);
    }
    return TARRY_OK;
}

static int make_film(tarry_data *data, tarry_error *error) {
    const tarry_data_frames *frames = &data->frames;
    tarry_run_plan *run = &data->model->network.run;
    const double to = frames->start + (double)(frames->n_frames - 1) * frames->every;
    int code = make_window(data, frames->start, to, frames->n_frames, error);
    if (code == TARRY_OK)
        code = check_snapshots(data, error);
    run->every = frames->every;
    run->snapshots = data->options.snapshots;
    run->n_snapshots = (uint32_t)data->options.n_snapshots;
    const double longest = (double)(frames->longest - 1);
    double lags = isnan(data->options.lags) ? lag_share * longest : data->options.lags / run->every;
    lags = floor(fmin(lags, longest) * (1.0 + 1e-9));
    run->n_lags = (uint32_t)lags + 1;
    return code;
}

static int ascending(const void *one, const void *other) {
    const double a = *(const double *)one, b = *(const double *)other;
    return (a > b) - (a < b);
}

static bool is_within(const tarry_data_options *options, double time) {
    return !(time < options->from) && !(time > options->to);
}

/* The times that stand in the table, ascending; returns how many. */
static size_t distinct_times(const tarry_data *data, double *times) {
    size_t n = 0, kept = 0;
    for (size_t row = 0; row < data->table.n_rows; row++)
        if (is_within(&data->options, data->table.times[row]) &&
            (n == 0 || data->table.times[row] != times[n - 1]))
            times[n++] = data->table.times[row];
    qsort(times, n, sizeof *times, ascending);
    for (size_t i = 0; i < n; i++)
        if (kept == 0 || times[i] > times[kept - 1])
            times[kept++] = times[i];
    return kept;
}

enum { MOST_TIMES = 10000 };

/* Fixed cells: each time is a snapshot. */
static int make_snapshots(tarry_data *data, tarry_error *error) {
    tarry_run_plan *run = &data->model->network.run;
    const tarry_data_table *table = &data->table;
    double *times = tarry_calloc(table->n_rows, sizeof *times);
    if (times == NULL)
        return tarry_fail_memory(error, "the times of data");
    const size_t n = distinct_times(data, times);
    double *kept = tarry_arena_calloc(&data->model->arena, n, sizeof *kept);
    data->snapshot = tarry_calloc(table->n_rows, sizeof *data->snapshot);
    int code = TARRY_OK;
    if (kept == NULL || data->snapshot == NULL)
        code = tarry_fail_memory(error, "the times of data");
    else if (n == 0)
        code = fail_data(data, error, "no row is within --from and --to");
    else if (n > MOST_TIMES)
        code = fail_data(data, error, "more than 10000 different times are not taken");
    if (code == TARRY_OK && kept != NULL) {
        memcpy(kept, times, n * sizeof *kept);
        for (size_t row = 0; row < table->n_rows; row++) {
            const double *at = bsearch(&table->times[row], kept, n, sizeof *kept, ascending);
            data->snapshot[row] = at != NULL ? (uint32_t)(at - kept) : UINT32_MAX;
        }
        run->snapshots = kept;
        run->n_snapshots = (uint32_t)n;
        code = make_window(data, kept[0], kept[n - 1], 0, error);
        run->n_windows = 0;
    }
    free(times);
    return code;
}

/* ---- who is left out with whom --------------------------------------------------------------- */

static bool by_group(const tarry_data *data) {
    return data->table.groups != NULL && data->table.n_groups >= LEAST_GROUPS;
}

static int make_units_of_films(tarry_data *data, tarry_error *error) {
    data->n_units = data->frames.n_cells;
    data->unit_group = tarry_calloc(data->n_units, sizeof *data->unit_group);
    if (data->unit_group == NULL)
        return tarry_fail_memory(error, "the groups of cells");
    for (size_t i = 0; i < data->n_units; i++)
        data->unit_group[i] = (by_group(data) ? data->table.group_of[data->frames.cell[i]]
                                              : (uint32_t)i) %
                              TARRY_GROUPS;
    return TARRY_OK;
}

/* Cells of one time are dealt to groups in an order that has nothing to do with that of the file:
 * tables are often sorted, and neighbours in such a table are more alike than cells are. */
static int make_units_of_rows(tarry_data *data, tarry_error *error) {
    const tarry_data_table *table = &data->table;
    const uint32_t n_times = data->model->network.run.n_snapshots;
    uint32_t *order = tarry_calloc(table->n_rows, sizeof *order);
    uint32_t *dealt = tarry_calloc(n_times, sizeof *dealt);
    data->unit_group = tarry_calloc(table->n_rows, sizeof *data->unit_group);
    if (order == NULL || dealt == NULL || data->unit_group == NULL) {
        free(order);
        free(dealt);
        return tarry_fail_memory(error, "the groups of cells");
    }
    tarry_stream stream;
    tarry_stream_init(&stream, 1, 0, TARRY_STREAM_START);
    data->n_units = table->n_rows;
    for (size_t i = 0; i < table->n_rows; i++) {
        const size_t j = (size_t)(tarry_unit(tarry_stream_next(&stream)) * (double)(i + 1));
        order[i] = order[j];
        order[j] = (uint32_t)i;
    }
    for (size_t i = 0; i < table->n_rows; i++) {
        const uint32_t row = order[i], time = data->snapshot[row];
        if (by_group(data))
            data->unit_group[row] = table->groups[row] % TARRY_GROUPS;
        else if (time != UINT32_MAX)
            data->unit_group[row] = dealt[time]++ % TARRY_GROUPS;
    }
    free(order);
    free(dealt);
    return TARRY_OK;
}

/* ---- gaps ------------------------------------------------------------------------------------ */

static int check_gaps(const tarry_data *data, tarry_error *error) {
    const tarry_data_frames *frames = &data->frames;
    if (data->options.gaps != TARRY_DATA_GAPS_ASK ||
        !(frames->missing > most_missing * frames->expected))
        return TARRY_OK;
    char percent[TARRY_NUMBER_SIZE];
    tarry_number_write_rounded(100.0 * frames->missing / frames->expected, 3, percent);
    return tarry_fail_at(
        error, TARRY_INPUT, tarry_data_table_place(&data->table, frames->gap_row, 0),
        "%s %% of the frames between a cell's first and last are missing (here the frame "
        "before). "
        "Trackers often leave out frames in which a spot is dark; taken as missing, these would "
        "raise the mean and shorten the correlation. --gaps dark: take them as dark, with the "
        "value "
        "of --background (0). --gaps missing: they are missing for reasons that have nothing to do "
        "with brightness, and are left out",
        percent);
}

/* ---- what the values are like ---------------------------------------------------------------- */

static int make_ranges(tarry_data *data, tarry_error *error) {
    const size_t n = data->table.n_names;
    double *shifts = tarry_arena_calloc(&data->model->arena, n, sizeof *shifts);
    double *ranges = tarry_arena_calloc(&data->model->arena, n, sizeof *ranges);
    if (shifts == NULL || ranges == NULL)
        return tarry_fail_memory(error, "the ranges of data");
    for (size_t k = 0; k < n; k++) {
        const double *values = data->table.values[k];
        double least = INFINITY, most = -INFINITY, sum = 0.0, known = 0.0;
        for (size_t row = 0; row < data->table.n_rows; row++) {
            const bool within = is_within(&data->options, data->table.times[row]);
            least = fmin(least, within ? values[row] : NAN); /* fmin passes NaN over */
            most = fmax(most, within ? values[row] : NAN);
            known += within && !isnan(values[row]);
        }
        for (size_t row = 0; row < data->table.n_rows; row++)
            if (is_within(&data->options, data->table.times[row]) && !isnan(values[row]))
                sum += values[row] - least;
        if (!(known > 0.0))
            return tarry_fail_at(error, TARRY_INPUT, (tarry_place){data->table.path, 0, 0},
                                 "the column %s has no value at all", data->table.names[k]);
        shifts[k] = least + sum / known;
        ranges[k] = most - least;
    }
    data->plan.shifts = shifts;
    data->plan.ranges = ranges;
    return TARRY_OK;
}

/* ---- text ------------------------------------------------------------------------------------ */

/* What is kept of the file: its comments, names and first rows. The first comment is the title. */
static int make_text(tarry_data *data, tarry_error *error) {
    tarry_model *model = data->model;
    tarry_csv csv = tarry_csv_of(data->table.path, &data->text);
    tarry_csv_field line;
    const char *begin = csv.at;
    int rows = 0;
    model->network.title = "";
    while (rows < LINES_SHOWN && tarry_csv_line(&csv, &line)) {
        const bool comment = line.n > 0 && line.text[0] == '#';
        rows += !comment;
        if (comment && csv.line == 1) {
            const char *words = line.text + 1;
            size_t n = line.n - 1;
            while (n > 0 && *words == ' ')
                words++, n--;
            model->network.title = tarry_arena_text(&model->arena, words, n);
        }
    }
    model->text_size = (size_t)(csv.at - begin);
    model->text = tarry_arena_text(&model->arena, begin, model->text_size);
    model->file = tarry_arena_text(&model->arena, data->table.path, strlen(data->table.path));
    model->network.time_unit = tarry_arena_text(&model->arena, data->options.unit,
                                                strlen(data->options.unit));
    char *digest = tarry_arena_calloc(&model->arena, TARRY_SHA256_TEXT, 1);
    if (model->text == NULL || model->file == NULL || model->network.title == NULL ||
        model->network.time_unit == NULL || digest == NULL)
        return tarry_fail_memory(error, "the head of the data");
    tarry_sha256(data->text.data, data->text.size, digest);
    data->plan.sha256 = digest;
    return TARRY_OK;
}

/* ---- the whole ------------------------------------------------------------------------------- */

static int check_cells(const tarry_data *data, tarry_error *error) {
    if (data->n_units > 1 || data->options.mean == TARRY_FILM_MEAN_CELL ||
        data->table.kind == TARRY_DATA_MEANS)
        return TARRY_OK;
    return fail_data(data, error,
                     data->table.kind == TARRY_DATA_TRACES
                         ? "one cell only: intervals come from how cells differ, and the mean of "
                           "one cell cannot be told from its slow changes; give two cells or more, "
                           "or --mean cell to take off its own mean, without intervals"
                         : "one row only: intervals come from how cells differ; give two or more");
}

static int build_film(tarry_data *data, tarry_error *error) {
    const tarry_data_frames *frames = &data->frames;
    tarry_data_plan *plan = &data->plan;
    int code = check_gaps(data, error);
    if (code == TARRY_OK)
        code = make_film(data, error);
    if (code == TARRY_OK)
        code = make_units_of_films(data, error);
    plan->missing = frames->expected > 0.0 ? frames->missing / frames->expected : 0.0;
    plan->mean = data->options.mean;
    data->model->network.gaps = !frames->whole || plan->mean == TARRY_FILM_MEAN_CELL;
    plan->longest = frames->longest;
    plan->n_resampled = (int64_t)frames->n_cells;
    plan->resampled = "cell";
    if (code == TARRY_OK && plan->mean == TARRY_FILM_MEAN_FRAME && data->model->network.gaps)
        code = fail_data(data, error,
                         "--mean frame needs traces in which no frame is missing and which all "
                         "begin and end together; cut them with --from and --to");
    return code;
}

/* Means that come with their errors are told as they are: one of them a time. */
static int check_errors(const tarry_data *data, size_t k, tarry_error *error) {
    const tarry_data_table *table = &data->table;
    const double *errors = table->errors[k];
    for (size_t row = 0; errors != NULL && row < table->n_rows; row++)
        if (errors[row] < 0.0)
            return tarry_fail_at(error, TARRY_INPUT, tarry_data_table_place(table, row, 0),
                                 "%s_se: a standard error is not negative", table->names[k]);
    for (size_t row = 1; errors != NULL && row < table->n_rows; row++)
        if (!(table->times[row] > table->times[row - 1]))
            return tarry_fail_at(error, TARRY_INPUT,
                                 tarry_data_table_place(table, row, table->time_field),
                                 "means with standard errors stand in one row a time, and times "
                                 "ascend; replicates come without %s_se",
                                 table->names[k]);
    return TARRY_OK;
}

static int build_rows(tarry_data *data, tarry_error *error) {
    int code = TARRY_OK;
    if (data->options.of_traces != NULL)
        return tarry_fail(error, TARRY_INPUT, "%s is for traces, and %s holds %s",
                          data->options.of_traces, data->table.path, data->plan.kind);
    for (size_t k = 0; code == TARRY_OK && k < data->table.n_names; k++)
        code = check_errors(data, k, error);
    if (code == TARRY_OK)
        code = make_snapshots(data, error);
    if (code == TARRY_OK)
        code = make_units_of_rows(data, error);
    data->model->network.gaps = true;
    data->plan.n_resampled = (int64_t)data->n_units;
    data->plan.resampled = data->table.kind == TARRY_DATA_MEANS ? "replicate" : "cell";
    for (size_t k = 0; k < data->table.n_names; k++)
        if (data->table.errors[k] != NULL)
            data->plan.resampled = NULL; /* errors come with the data */
    return code;
}

int tarry_data_network_build(tarry_data *data, tarry_error *error) {
    tarry_network *network = &data->model->network;
    data->plan.kind = tarry_data_kind_names[data->table.kind];
    data->plan.n_rows = (int64_t)data->table.n_rows;
    network->arena = &data->model->arena;
    int code = make_text(data, error);
    if (code == TARRY_OK)
        code = make_names(data, error);
    if (code == TARRY_OK)
        code = data->table.kind == TARRY_DATA_TRACES ? build_film(data, error)
                                                     : build_rows(data, error);
    if (code == TARRY_OK)
        code = check_cells(data, error);
    if (code == TARRY_OK)
        code = make_ranges(data, error);
    if (by_group(data) && data->plan.resampled != NULL) {
        data->plan.resampled = "group";
        data->plan.n_resampled = data->table.n_groups;
    }
    network->data = &data->plan;
    network->run.cells = (int64_t)data->n_units;
    network->run.limit_memory = INFINITY;
    return code;
}
