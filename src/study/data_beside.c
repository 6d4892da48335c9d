/* SPDX-License-Identifier: GPL-3.0-or-later */

/* A model beside the data: its exact laws at the times, lags and names of the data, so that they
 * stand row by row beside what was measured. */
#include "study/data.h"

#include "base/error.h"
#include "base/number.h"
#include "base/text.h"
#include "study/predict.h"
#include "study/self_check.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

static const double slack = 1e-6; /* of an interval between frames */

static const tarry_override *find(const tarry_override *settings, size_t n, const char *name) {
    for (size_t i = 0; i < n; i++)
        if (!settings[i].is_parameter && strcmp(settings[i].name, name) == 0)
            return &settings[i];
    return NULL;
}

/* ---- the model's record --------------------------------------------------------------------- */

/* Options of a run that make its record that of the data, and those given with --set. */
typedef struct given {
    tarry_override *overrides;
    size_t n;
    char until[TARRY_NUMBER_SIZE], every[TARRY_NUMBER_SIZE];
    tarry_text snapshots;
} given;

static void add(given *g, const char *name, const char *value) {
    g->overrides[g->n++] = (tarry_override){"the data's", 0, name, value};
}

static int give(given *g, const tarry_data *data, const tarry_override *settings, size_t n,
                tarry_error *error) {
    const tarry_run_plan *run = &data->model->network.run;
    g->overrides = tarry_calloc(n + 3, sizeof *g->overrides);
    if (g->overrides == NULL)
        return tarry_fail_memory(error, "a model beside data");
    for (size_t i = 0; i < n; i++)
        if (settings[i].is_parameter)
            g->overrides[g->n++] = settings[i];
    tarry_number_write(run->until > 0.0 ? run->until : 1.0, g->until);
    add(g, "until", g->until);
    tarry_number_write(run->n_frames > 1  ? run->every
                       : run->until > 0.0 ? run->until
                                          : 1.0,
                       g->every);
    add(g, "every", g->every);
    for (uint32_t i = 0; i < run->n_snapshots; i++) {
        tarry_text_add_string(&g->snapshots, i > 0 ? "," : "");
        tarry_text_add_number(&g->snapshots, run->snapshots[i]);
    }
    if (run->n_snapshots > 0)
        add(g, "snapshots", g->snapshots.data);
    return g->snapshots.failed ? tarry_fail_memory(error, "a model beside data") : TARRY_OK;
}

/* Which frame of the model the first of the data is. */
static uint32_t first_frame(const tarry_data *data) {
    const tarry_run_plan *run = &data->model->network.run;
    return run->n_frames > 0 ? (uint32_t)round(data->plan.start / run->every) : 0;
}

static int check_frames(const tarry_data *data, tarry_error *error) {
    const tarry_run_plan *run = &data->model->network.run;
    const double first = data->plan.start / run->every;
    if (run->n_frames == 0 || (first > -slack && fabs(first - round(first)) < slack))
        return TARRY_OK;
    return tarry_fail(error, TARRY_INPUT,
                      "--beside: the frames of a model are at 0 and every so often after it, and "
                      "those of the data begin elsewhere; let their times begin at 0");
}

/* Frames of the data are frames of the model; the one window of the data is the model's, too. */
static int align(const tarry_data *data, tarry_model *model, tarry_error *error) {
    const tarry_run_plan *of_data = &data->model->network.run;
    tarry_run_plan *run = &model->network.run;
    tarry_window *window = tarry_arena_calloc(&model->arena, 1, sizeof *window);
    if (window == NULL)
        return tarry_fail_memory(error, "a model beside data");
    *window = of_data->windows != NULL ? *of_data->windows : (tarry_window){.name = "all"};
    window->frames.from += first_frame(data);
    window->frames.to += first_frame(data);
    run->windows = window;
    run->n_windows = of_data->n_frames > 0;
    run->n_lags = of_data->n_lags;
    run->noise_unknown = true;
    return TARRY_OK;
}

/* A file that cannot be read is a wrong setting here. */
static int read_model(const char *path, const given *g, tarry_model **model, tarry_error *error) {
    const int code = tarry_model_read(path, g->overrides, g->n, model, error);
    if (code == TARRY_FILE && error != NULL)
        error->code = TARRY_INPUT;
    return code == TARRY_FILE ? TARRY_INPUT : code;
}

/* ---- what both have -------------------------------------------------------------------------- */

static bool has_channel(const tarry_network *network, const char *name) {
    for (uint32_t i = 0; i < network->n_channels; i++)
        if (strcmp(network->channels[i].name, name) == 0)
            return true;
    return false;
}

static int check_names(const tarry_network *data, const tarry_network *model, const char *file,
                       tarry_error *error) {
    for (uint32_t i = 0; i < data->n_channels; i++)
        if (has_channel(model, data->channels[i].name))
            return TARRY_OK;
    const char *last = model->n_channels > 0 ? model->channels[model->n_channels - 1].name
                                             : "nothing";
    return tarry_fail(error, TARRY_INPUT,
                      "--beside: no column of the data is called like a signal or species of %s: "
                      "rename the column '%s' (that model has '%s', for one)",
                      file, data->channels[0].name, last);
}

static int check_unit(const tarry_network *data, const tarry_network *model, const char *file,
                      tarry_error *error) {
    return strcmp(data->time_unit, model->time_unit) == 0
               ? TARRY_OK
               : tarry_fail(error, TARRY_INPUT,
                            "--beside: the time of %s is in %s and that of the data in %s; both "
                            "must be the same",
                            file, model->time_unit, data->time_unit);
}

int tarry_data_beside_read(tarry_data *data, const tarry_override *settings, size_t n,
                           tarry_error *error) {
    const tarry_override *beside = find(settings, n, "beside");
    given g = {0};
    if (beside == NULL) {
        for (size_t i = 0; i < n; i++)
            if (settings[i].is_parameter)
                return tarry_fail(error, TARRY_INPUT,
                                  "--set %s=%s: data have no parameters; it goes with --beside "
                                  "MODEL",
                                  settings[i].name, settings[i].value);
        return TARRY_OK;
    }
    int code = check_frames(data, error);
    if (code == TARRY_OK)
        code = give(&g, data, settings, n, error);
    if (code == TARRY_OK)
        code = read_model(beside->value, &g, &data->beside, error);
    if (code == TARRY_OK)
        code = check_unit(&data->model->network, &data->beside->network, beside->value, error);
    if (code == TARRY_OK)
        code = check_names(&data->model->network, &data->beside->network, beside->value, error);
    if (code == TARRY_OK)
        code = align(data, data->beside, error);
    data->plan.beside = data->beside;
    tarry_text_release(&g.snapshots);
    free(g.overrides);
    return code;
}
