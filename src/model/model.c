/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "model/model.h"

/* Reading a model from its first byte to the finished network. */

#include "base/error.h"
#include "base/file.h"
#include "base/memory.h"
#include "base/text.h"
#include "model/builder.h"
#include "model/expect.h"

#include <stdlib.h>
#include <string.h>

enum { LARGEST_FILE = 64 << 20 };

static const char *const KEYS[] = {"tarry",    "title",   "time",      "parameters", "delays",
                                   "genes",    "species", "reactions", "bursts",     "signals",
                                   "protocol", "run",     "limits",    "fit"};
static const char *const LATER[] = {"fit"};

/* In this order; see builder.h. */
static int (*const READERS[])(tarry_builder *builder, tarry_error *error) = {
    tarry_read_parameters, tarry_read_delays,    tarry_declare_genes, tarry_declare_species,
    tarry_read_genes,      tarry_read_reactions, tarry_read_bursts,   tarry_read_signals,
    tarry_read_protocol,   tarry_read_run,       tarry_finish,        tarry_settle,
};

/* ---- the head of the file -----------------------------------------------------------------------
 */

static int read_version(const tarry_node *root, tarry_error *error) {
    const tarry_node *version = tarry_node_get(root, "tarry");
    int code = tarry_expect_map(root, "a model", error);
    if (code == 0 && version == NULL)
        return tarry_fail_at(error, TARRY_INPUT, root->place,
                             "the version of the format is missing: a model begins with the line "
                             "'tarry: 1'");
    if (code == 0)
        code = tarry_expect_scalar(version, "'tarry', the version of the format,", error);
    if (code == 0 && strcmp(version->text, "1") != 0)
        return tarry_fail_at(error, TARRY_INPUT, version->place,
                             "the model is in version '%s' of the format; this program reads "
                             "version 1, written 'tarry: 1'",
                             version->text);
    return code;
}

static int read_title(const tarry_node *root, const char **title, tarry_error *error) {
    const tarry_node *node = tarry_node_get(root, "title");
    *title = "";
    if (node == NULL)
        return 0;
    const int code = tarry_expect_scalar(node, "'title'", error);
    *title = node->text;
    return code;
}

static int read_time_unit(const tarry_node *root, const char **name, tarry_units *units,
                          tarry_error *error) {
    const tarry_node *node = tarry_node_get(root, "time");
    if (node == NULL)
        return tarry_fail_at(error, TARRY_INPUT, root->place,
                             "a model needs 'time', the unit of its bare numbers: time: s, min, h "
                             "or d");
    const int code = tarry_expect_scalar(node, "'time', the unit of time,", error);
    if (code != 0)
        return code;
    *name = node->text;
    units->time_unit = tarry_time_unit_seconds(node->text);
    if (!(units->time_unit > 0))
        return tarry_fail_at(error, TARRY_INPUT, node->place,
                             "the unit of time must be s, min, h or d, not '%s'", node->text);
    return 0;
}

/* ---- reading ------------------------------------------------------------------------------------
 */

static int build(tarry_model *model, const tarry_node *root, const tarry_override *overrides,
                 size_t n_overrides, tarry_error *error) {
    tarry_network *network = &model->network;
    tarry_units units = {0};
    tarry_builder builder;
    int code = tarry_expect_keys(root, "a model", KEYS, sizeof KEYS / sizeof *KEYS, error);
    if (code == 0)
        code = read_version(root, error);
    if (code == 0)
        code = tarry_expect_not_yet(root, "a model", LATER, 1, error);
    if (code == 0)
        code = read_title(root, &network->title, error);
    if (code == 0)
        code = read_time_unit(root, &network->time_unit, &units, error);
    if (code != 0)
        return code;
    tarry_builder_init(&builder, model, root, units);
    builder.overrides = overrides;
    builder.n_overrides = n_overrides;
    for (size_t i = 0; code == 0 && i < sizeof READERS / sizeof *READERS; i++)
        code = READERS[i](&builder, error);
    tarry_builder_release(&builder);
    return code;
}

static int read_into(tarry_model *model, const char *text, size_t size, const char *name,
                     const tarry_override *overrides, size_t n_overrides, tarry_error *error) {
    const tarry_node *root = NULL;
    model->text = tarry_arena_text(&model->arena, text, size);
    model->file = tarry_arena_text(&model->arena, name, strlen(name));
    if (model->text == NULL || model->file == NULL)
        return tarry_fail_memory(error, "the model");
    model->text_size = size;
    const int code = tarry_yaml_read(model->text, size, model->file, &model->arena, &root, error);
    return code == 0 ? build(model, root, overrides, n_overrides, error) : code;
}

int tarry_model_read_text(const char *text, size_t size, const char *name,
                          const tarry_override *overrides, size_t n_overrides, tarry_model **model,
                          tarry_error *error) {
    *model = NULL;
    if (size > LARGEST_FILE)
        return tarry_fail_at(error, TARRY_INPUT, (tarry_place){name, 0, 0},
                             "this model is too large: at most %d bytes are read", LARGEST_FILE);
    tarry_model *made = tarry_calloc(1, sizeof *made);
    if (made == NULL)
        return tarry_fail_memory(error, "the model");
    const int code = read_into(made, text, size, name, overrides, n_overrides, error);
    if (code == 0)
        *model = made;
    else
        tarry_model_free(made);
    return code;
}

int tarry_model_read(const char *path, const tarry_override *overrides, size_t n_overrides,
                     tarry_model **model, tarry_error *error) {
    tarry_text text = {0};
    *model = NULL;
    int code = tarry_file_read(path, LARGEST_FILE, &text, error);
    if (code == 0)
        code = tarry_model_read_text(text.size > 0 ? text.data : "", text.size, path, overrides,
                                     n_overrides, model, error);
    tarry_text_release(&text);
    return code;
}

/* ---- looking at a model -------------------------------------------------------------------------
 */

void tarry_model_free(tarry_model *model) {
    if (model == NULL)
        return;
    tarry_notes_release(&model->notes);
    tarry_arena_release(&model->arena);
    free(model);
}

size_t tarry_model_n_warnings(const tarry_model *model) {
    return model->notes.n;
}

const char *tarry_model_warning(const tarry_model *model, size_t i) {
    return i < model->notes.n ? model->notes.lines[i] : NULL;
}

const char *tarry_model_text(const tarry_model *model, size_t *size) {
    if (size != NULL)
        *size = model->text_size;
    return model->text;
}
