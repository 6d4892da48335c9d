/* SPDX-License-Identifier: GPL-3.0-or-later */

/* The members are made and written one after another, each gene by itself, so that thousands of
 * genes need no more memory than their text. */
#include "report/summary.h"

#include "base/error.h"
#include "model/model.h"
#include "report/groups.h"
#include "report/json.h"
#include "report/repeat.h"
#include "report/responses.h"
#include "report/snapshots.h"
#include "tarry/tarry.h"

#include <string.h>
#include <sys/utsname.h>

/* An object being written: its members go into `text` as they come. */
typedef struct json_writer {
    tarry_text *text;
    int depth;
    bool first;
} json_writer;

static json_writer begin(tarry_text *text, int depth) {
    tarry_text_add(text, "{", 1);
    return (json_writer){text, depth, true};
}

static void key(json_writer *writer, const char *name) {
    json_t *quoted = tarry_json_text(name);
    tarry_text_add_string(writer->text, writer->first ? "\n" : ",\n");
    for (int i = 0; i < writer->depth; i++)
        tarry_text_add(writer->text, "  ", 2);
    tarry_json_write(quoted, 0, writer->text);
    tarry_text_add(writer->text, ": ", 2);
    writer->first = false;
    json_decref(quoted);
}

/* A member whose value is used up. */
static void member(json_writer *writer, const char *name, json_t *value) {
    key(writer, name);
    tarry_json_write(value, writer->depth, writer->text);
    json_decref(value);
}

static void end(json_writer *writer) {
    if (!writer->first)
        tarry_text_add(writer->text, "\n", 1);
    for (int i = 0; i < writer->depth - 1 && !writer->first; i++)
        tarry_text_add(writer->text, "  ", 2);
    tarry_text_add(writer->text, "}", 1);
}

static json_t *describe_model(const tarry_model *model) {
    bool failed = false;
    char digest[TARRY_SHA256_TEXT];
    json_t *object = json_object();
    tarry_sha256(model->text, model->text_size, digest);
    tarry_json_put(object, "file", tarry_json_text(tarry_repeat_file(model)), &failed);
    tarry_json_put(object, "sha256", json_string(digest), &failed);
    tarry_json_put(object, "text", tarry_json_text(model->text), &failed);
    if (failed) {
        json_decref(object);
        return NULL;
    }
    return object;
}

/* Data are told by their head: of the file itself there is the digest. */
static json_t *describe_data(const tarry_model *model) {
    const tarry_data_plan *data = model->network.data;
    bool failed = false;
    json_t *object = json_object();
    tarry_json_put(object, "file", tarry_json_text(tarry_repeat_file(model)), &failed);
    tarry_json_put(object, "sha256", json_string(data->sha256), &failed);
    tarry_json_put(object, "kind", json_string(data->kind), &failed);
    tarry_json_put(object, "rows", json_integer((json_int_t)data->n_rows), &failed);
    if (data->resampled) {
        tarry_json_put(object, "resampled", json_string(data->resampled), &failed);
        tarry_json_put(object, "resampled_number", json_integer((json_int_t)data->n_resampled),
                       &failed);
    }
    tarry_json_put(object, "missing_share", tarry_json_number(data->missing), &failed);
    tarry_json_put(object, "head", tarry_json_text(model->text), &failed);
    if (failed) {
        json_decref(object);
        return NULL;
    }
    return object;
}

static json_t *describe_overrides(const tarry_provenance *provenance) {
    bool failed = false;
    json_t *list = json_array();
    for (size_t i = 0; i < provenance->n_overrides; i++) {
        const tarry_override *override = &provenance->overrides[i];
        json_t *object = json_object();
        tarry_json_put(object, "option", tarry_json_text(override->option), &failed);
        tarry_json_put(object, "name", tarry_json_text(override->name), &failed);
        tarry_json_put(object, "value", tarry_json_text(override->value), &failed);
        tarry_json_append(list, object, &failed);
    }
    if (failed) {
        json_decref(list);
        return NULL;
    }
    return list;
}

static json_t *describe_windows(const tarry_run_plan *plan) {
    bool failed = false;
    json_t *list = json_array();
    for (uint32_t i = 0; i < plan->n_windows; i++) {
        json_t *object = json_object();
        tarry_json_put(object, "name", tarry_json_text(plan->windows[i].name), &failed);
        tarry_json_put(object, "from", tarry_json_number(plan->windows[i].from), &failed);
        tarry_json_put(object, "to", tarry_json_number(plan->windows[i].to), &failed);
        tarry_json_append(list, object, &failed);
    }
    if (failed) {
        json_decref(list);
        return NULL;
    }
    return list;
}

/* Names with thresholds, or NULL where none has. */
static json_t *describe_thresholds(const tarry_network *network, bool *failed) {
    json_t *list = NULL;
    for (uint32_t i = 0; i < network->n_channels; i++) {
        const tarry_thresholds *t = network->channels[i].thresholds;
        if (!t)
            continue;
        list = list ? list : json_array();
        json_t *object = json_object();
        tarry_json_put(object, "name", tarry_json_text(network->channels[i].name), failed);
        tarry_json_put(object, "low", tarry_json_number(t->low), failed);
        tarry_json_put(object, "high", tarry_json_number(t->high), failed);
        tarry_json_put(object, "length", tarry_json_number(t->least), failed);
        tarry_json_append(list, object, failed);
    }
    return list;
}

/* The plan as it was carried out: file, options and defaults taken together. */
static json_t *describe_plan(const tarry_network *network) {
    const tarry_run_plan *plan = &network->run;
    const tarry_data_plan *data = network->data;
    bool failed = false;
    json_t *object = json_object();
    json_t *snapshots = json_array();
    for (uint32_t i = 0; i < plan->n_snapshots; i++)
        tarry_json_append(snapshots, tarry_json_number(plan->snapshots[i]), &failed);
    const double lags = plan->n_lags ? (plan->n_lags - 1) * plan->every : 0;
    if (data)
        tarry_json_put(object, "from", tarry_json_number(data->start), &failed);
    else
        tarry_json_put(object, "settle", tarry_json_number(plan->settle), &failed);
    tarry_json_put(object, "until", tarry_json_number(plan->until), &failed);
    tarry_json_put(object, "every", tarry_json_number(plan->every), &failed);
    tarry_json_put(object, "lags", tarry_json_number(lags), &failed);
    tarry_json_put(object, "snapshots", snapshots, &failed);
    tarry_json_put(object, "windows", describe_windows(plan), &failed);
    json_t *visible = describe_thresholds(network, &failed);
    if (visible)
        tarry_json_put(object, "visible", visible, &failed);
    if (failed) {
        json_decref(object);
        return NULL;
    }
    return object;
}

static json_t *describe_warnings(const tarry_model *model, const tarry_results *results) {
    bool failed = false;
    json_t *list = json_array();
    for (size_t i = 0; i < tarry_model_n_warnings(model); i++)
        tarry_json_append(list, tarry_json_text(tarry_model_warning(model, i)), &failed);
    for (size_t i = 0; i < tarry_results_n_warnings(results); i++)
        tarry_json_append(list, tarry_json_text(tarry_results_warning(results, i)), &failed);
    if (failed) {
        json_decref(list);
        return NULL;
    }
    return list;
}

/* Every number of a row, named by its column. */
static json_t *describe_numbers(const tarry_table *table, size_t row, int first_column,
                                bool *failed) {
    json_t *object = json_object();
    for (int j = first_column; j < (int)tarry_table_n_columns(table); j++)
        tarry_json_put(object, tarry_table_column_name(table, (size_t)j),
                       tarry_json_number(tarry_table_number(table, row, j)), failed);
    return object;
}

/* {"all": {"burst_frequency": {"unit": ..., "value": ..., ...}, ...}, ...} from the rows of a gene
 * or a signal: name, window, quantity, unit, numbers. */
static json_t *describe_figures(const tarry_table *table, const tarry_groups *groups, size_t g) {
    enum { WINDOW = 1, QUANTITY = 2, UNIT = 3, FIRST_NUMBER = 4 };
    bool failed = false;
    json_t *windows = json_object();
    for (size_t i = groups->starts[g]; i < groups->starts[g + 1]; i++) {
        const size_t row = groups->rows[i];
        const char *name = tarry_table_text(table, row, WINDOW);
        json_t *window = json_object_get(windows, name);
        if (!window) {
            tarry_json_put(windows, name, json_object(), &failed);
            window = json_object_get(windows, name);
        }
        json_t *figure = json_object();
        tarry_json_put(figure, "unit", tarry_json_text(tarry_table_text(table, row, UNIT)),
                       &failed);
        json_t *numbers = describe_numbers(table, row, FIRST_NUMBER, &failed);
        if (json_object_update(figure, numbers))
            failed = true;
        json_decref(numbers);
        tarry_json_put(window, tarry_table_text(table, row, QUANTITY), figure, &failed);
    }
    if (failed) {
        json_decref(windows);
        return NULL;
    }
    return windows;
}

/* A run of very many genes has its figures in its CSV files; here stand the first of them, and how
 * many do not. */
enum { MOST_NAMES = 1000 };

static void tell_left_out(json_writer *writer, const char *name, size_t n, const char *file) {
    if (n <= MOST_NAMES)
        return;
    bool failed = false;
    json_t *object = json_object();
    tarry_json_put(object, "names", json_integer((json_int_t)(n - MOST_NAMES)), &failed);
    tarry_json_put(object, "stand_in", json_string(file), &failed);
    if (failed) {
        json_decref(object);
        object = NULL;
    }
    member(writer, name, object);
}

static int write_figures(json_writer *writer, const char *name, const char *column,
                         const char *left_out, const char *file, const tarry_table *table,
                         tarry_error *error) {
    tarry_groups groups = {0};
    const int status = tarry_groups_init(&groups, table, column, error);
    if (!status) {
        key(writer, name);
        json_writer inner = begin(writer->text, writer->depth + 1);
        for (size_t g = 0; g < groups.n && g < MOST_NAMES; g++)
            member(&inner, groups.names[g], describe_figures(table, &groups, g));
        end(&inner);
        tell_left_out(writer, left_out, groups.n, file);
    }
    tarry_groups_release(&groups);
    return status;
}

static json_t *describe_snapshots(const tarry_table *means, const tarry_snapshot *snapshots,
                                  size_t n) {
    enum { TIME = 1 };
    bool failed = false;
    json_t *list = json_array();
    for (size_t i = 0; i < n; i++)
        tarry_json_append(list, describe_numbers(means, snapshots[i].row, TIME, &failed), &failed);
    if (failed) {
        json_decref(list);
        return NULL;
    }
    return list;
}

/* {"vela.transcript": [{"time": 0, "mean": ...}, ...], ...}: moments at the snapshots. */
static int write_species(json_writer *writer, const tarry_model *model,
                         const tarry_results *results, tarry_error *error) {
    const tarry_table *means = tarry_results_table(results, TARRY_TABLE_means);
    tarry_snapshots snapshots = {0};
    const int status = tarry_snapshots_init(&snapshots, &model->network.run, means, error);
    if (!status) {
        key(writer, "species");
        json_writer inner = begin(writer->text, writer->depth + 1);
        size_t n = 0;
        for (size_t i = 0, j; i < snapshots.n; i = j) {
            for (j = i; j < snapshots.n && snapshots.items[j].name == snapshots.items[i].name; j++)
                ;
            if (n++ >= MOST_NAMES)
                continue;
            member(&inner, snapshots.items[i].name,
                   describe_snapshots(means, snapshots.items + i, j - i));
        }
        end(&inner);
        tell_left_out(writer, "species_left_out", n, "means.csv");
    }
    tarry_snapshots_release(&snapshots);
    return status;
}

static json_t *describe_figure(const tarry_response_figure *figure) {
    bool failed = false;
    json_t *object = json_object();
    tarry_json_put(object, "value", tarry_json_number(figure->value), &failed);
    tarry_json_put(object, "low", tarry_json_number(figure->low), &failed);
    tarry_json_put(object, "high", tarry_json_number(figure->high), &failed);
    if (failed) {
        json_decref(object);
        return NULL;
    }
    return object;
}

static json_t *describe_responses(const tarry_response_item *items, size_t n) {
    bool failed = false;
    json_t *list = json_array();
    for (size_t i = 0; i < n; i++) {
        json_t *object = json_object();
        tarry_json_put(object, "step", tarry_json_number(items[i].step), &failed);
        tarry_json_put(object, "length", tarry_json_number(items[i].length), &failed);
        tarry_json_put(object, "responders", describe_figure(&items[i].responders), &failed);
        tarry_json_put(object, "median", describe_figure(&items[i].median), &failed);
        tarry_json_append(list, object, &failed);
    }
    if (failed) {
        json_decref(list);
        return NULL;
    }
    return list;
}

/* {"vela.transcript": [{"step": 60, "responders": ..., "median": ...}, ...], ...} */
static int write_responses(json_writer *writer, const tarry_results *results, tarry_error *error) {
    tarry_responses responses = {0};
    const int status = tarry_responses_init(&responses,
                                            tarry_results_table(results, TARRY_TABLE_first), error);
    if (!status && responses.n > 0) {
        key(writer, "first");
        json_writer inner = begin(writer->text, writer->depth + 1);
        for (size_t i = 0, j; i < responses.n; i = j) {
            for (j = i; j < responses.n && responses.items[j].name == responses.items[i].name; j++)
                ;
            member(&inner, responses.items[i].name, describe_responses(responses.items + i, j - i));
        }
        end(&inner);
    }
    tarry_responses_release(&responses);
    return status;
}

static json_t *describe_files(const tarry_listed_file *files, size_t n_files) {
    bool failed = false;
    json_t *list = json_array();
    for (size_t i = 0; i < n_files; i++) {
        json_t *object = json_object();
        tarry_json_put(object, "name", tarry_json_text(files[i].name), &failed);
        if (files[i].digest[0]) {
            tarry_json_put(object, "size", json_integer((json_int_t)files[i].size), &failed);
            tarry_json_put(object, "sha256", json_string(files[i].digest), &failed);
        }
        tarry_json_append(list, object, &failed);
    }
    if (failed) {
        json_decref(list);
        return NULL;
    }
    return list;
}

static void write_simulation(json_writer *writer, const tarry_network *network,
                             const tarry_results *results, const tarry_provenance *provenance) {
    member(writer, "cells", json_integer(tarry_results_n_cells(results)));
    member(writer, "cells_asked", json_integer(tarry_results_n_cells_asked(results)));
    member(writer, "seed", json_integer((json_int_t)network->run.seed));
    member(writer, "sampler", tarry_json_text(provenance->sampler));
    member(writer, "keep", json_integer(provenance->keep));
    if (provenance->as_data != TARRY_DATA_FORM_NONE)
        member(writer, "as_data", tarry_json_text(tarry_data_form_name(provenance->as_data)));
    member(writer, "firings", tarry_json_number(tarry_results_firings(results)));
    member(writer, "completions", tarry_json_number(tarry_results_completions(results)));
}

/* The model beside data: none of a run, which has its own. */
static void describe_beside(const tarry_model *model, json_t *object, bool *failed) {
    char digest[TARRY_SHA256_TEXT];
    tarry_sha256(model->text, model->text_size, digest);
    tarry_json_put(object, "file", tarry_json_text(tarry_repeat_file(model)), failed);
    tarry_json_put(object, "sha256", json_string(digest), failed);
    tarry_json_put(object, "model", tarry_json_text(model->text), failed);
}

static json_t *describe_self_check(const tarry_self_check *check, const tarry_model *beside) {
    bool failed = false;
    json_t *object = json_object();
    if (beside)
        describe_beside(beside, object, &failed);
    tarry_json_put(object, "compared", json_integer((json_int_t)check->n_compared), &failed);
    if (check->n_compared > 0) {
        tarry_json_put(object, "largest", tarry_json_number(check->largest), &failed);
        tarry_json_put(object, "share_larger", tarry_json_number(check->share_larger), &failed);
        tarry_json_put(object, "alarm", json_boolean(check->alarm), &failed);
        tarry_json_put(object, "where", tarry_json_text(check->where), &failed);
    }
    if (failed) {
        json_decref(object);
        return NULL;
    }
    return object;
}

static void write_head(json_writer *writer, const tarry_model *model, const tarry_results *results,
                       const tarry_provenance *provenance) {
    const tarry_network *network = &model->network;
    const bool predicted = tarry_results_is_predicted(results);
    member(writer, "tarry", json_string(tarry_version()));
    member(writer, "status", json_string(provenance->partial ? "partial" : "complete"));
    member(writer, "title", tarry_json_text(network->title));
    member(writer, "time_unit", tarry_json_text(network->time_unit));
    member(writer, "method",
           json_string(predicted       ? "exact"
                       : network->data ? "measurement"
                                       : "simulation"));
    if (network->data)
        member(writer, "cells", json_integer(tarry_results_n_cells(results)));
    else if (!predicted)
        write_simulation(writer, network, results, provenance);
    member(writer, "options", describe_overrides(provenance));
    member(writer, "run", describe_plan(network));
    member(writer, "warnings", describe_warnings(model, results));
    const tarry_model *beside = network->data ? network->data->beside : NULL;
    const tarry_self_check *check = tarry_results_self_check(results);
    if (beside || check->n_compared > 0)
        member(writer, beside ? "beside" : "self_check", describe_self_check(check, beside));
}

int tarry_summary_write(const tarry_model *model, const tarry_results *results,
                        const tarry_provenance *provenance, const tarry_listed_file *files,
                        size_t n_files, tarry_text *text, tarry_error *error) {
    json_writer writer = begin(text, 1);
    write_head(&writer, model, results, provenance);
    int status = write_figures(&writer, "genes", "gene", "genes_left_out", "bursts.csv",
                               tarry_results_table(results, TARRY_TABLE_bursts), error);
    if (!status)
        status = write_figures(&writer, "signals", "signal", "signals_left_out", "signals.csv",
                               tarry_results_table(results, TARRY_TABLE_signals), error);
    if (!status)
        status = write_species(&writer, model, results, error);
    if (!status)
        status = write_responses(&writer, results, error);
    if (status)
        return status;
    member(&writer, "files", describe_files(files, n_files));
    if (model->network.data)
        member(&writer, "data", describe_data(model));
    else
        member(&writer, "model", describe_model(model));
    end(&writer);
    tarry_text_add(text, "\n", 1);
    return text->failed ? tarry_fail_memory(error, "summary.json") : 0;
}

int tarry_summary_write_run(const tarry_provenance *provenance, tarry_text *text,
                            tarry_error *error) {
    struct utsname host;
    const bool known = uname(&host) >= 0;
    json_writer writer = begin(text, 1);
    member(&writer, "seconds", tarry_json_number(provenance->seconds));
    member(&writer, "threads", json_integer(provenance->threads));
    member(&writer, "ranks", json_integer(1));
    member(&writer, "lanes", json_integer(1));
    member(&writer, "host", tarry_json_text(known ? host.nodename : "unknown"));
    char *build = tarry_build();
    member(&writer, "build", build ? tarry_json_text(build) : NULL);
    free(build);
    end(&writer);
    tarry_text_add(text, "\n", 1);
    return text->failed ? tarry_fail_memory(error, "run.json") : 0;
}
