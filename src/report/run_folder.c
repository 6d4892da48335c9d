/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "report/run_folder.h"

#include "base/error.h"
#include "tarry/tarry.h"

#include <assert.h>
#include <jansson.h>
#include <stdlib.h>
#include <string.h>

const char tarry_summary_name[] = "summary.json";
const char tarry_page_name[] = "report.html";
const char tarry_run_name[] = "run.json";
const char tarry_figures_name[] = "figures";
static const char unfinished_name[] = "unfinished.json"; /* there while files are being written */

/* Every file that a run may write, but for summary.json and figures. */
static const char *const run_files[] = {
#define FILE_NAME(name, columns) #name ".csv",
    TARRY_RESULT_TABLES(FILE_NAME)
#undef FILE_NAME
        "cells.csv",
    "data.csv",
    tarry_page_name,
    tarry_run_name,
};

enum {
    N_RUN_FILES = sizeof run_files / sizeof *run_files,
    SUMMARY_LIMIT = 1 << 30, /* bytes of an earlier summary.json */
};

int tarry_run_folder_init(tarry_run_folder *folder, const char *path, tarry_error *error) {
    *folder = (tarry_run_folder){.path = path};
    folder->room = tarry_calloc(strlen(path) + TARRY_LONGEST_NAME + 2, 1);
    return folder->room ? 0 : tarry_fail_memory(error, "the names of files");
}

void tarry_run_folder_release(tarry_run_folder *folder) {
    free(folder->room);
    free(folder->files);
    free(folder->earlier);
    free(folder->planned);
    tarry_arena_release(&folder->arena);
    *folder = (tarry_run_folder){0};
}

const char *tarry_run_folder_path(const tarry_run_folder *folder, const char *name) {
    const size_t n = strlen(folder->path);
    assert(strlen(name) <= TARRY_LONGEST_NAME);
    memcpy(folder->room, folder->path, n);
    folder->room[n] = '/';
    strcpy(folder->room + n + (n && folder->path[n - 1] == '/' ? 0 : 1), name);
    return folder->room;
}

static int file_exists(const tarry_run_folder *folder, const char *name, bool *exists,
                       tarry_error *error) {
    return tarry_file_exists(tarry_run_folder_path(folder, name), exists, error);
}

int tarry_run_folder_remove(const tarry_run_folder *folder, const char *name, tarry_error *error) {
    return tarry_file_remove(tarry_run_folder_path(folder, name), error);
}

/* Append a copy of a name. */
static int add_name(tarry_run_folder *folder, char ***names, size_t *n, size_t *capacity,
                    const char *name, tarry_error *error) {
    char *copy = tarry_arena_text(&folder->arena, name, strlen(name));
    if (!copy || tarry_grow((void **)names, capacity, *n + 1, sizeof **names))
        return tarry_fail_memory(error, "the names of files");
    (*names)[(*n)++] = copy;
    return 0;
}

/* ---- what an earlier run wrote -------------------------------------------------------------- */

/* "figures/STEM.csv" and the like: no other folder can be reached by such a name. */
static bool is_figure(const char *name) {
    static const char letters[] =
        "abcdefghijklmnopqrstuvwxyzABCDEFGHIJKLMNOPQRSTUVWXYZ0123456789_.-";
    static const char *const endings[] = {".gp", ".csv", ".svg", ".pdf", ".png", ".log"};
    const size_t n_folder = strlen(tarry_figures_name);
    if (strncmp(name, tarry_figures_name, n_folder) || name[n_folder] != '/')
        return false;
    const char *file = name + n_folder + 1;
    const char *dot = strrchr(file, '.');
    if (!dot || dot == file || *file == '.' || file[strspn(file, letters)] ||
        strlen(name) > TARRY_LONGEST_NAME)
        return false;
    for (size_t i = 0; i < sizeof endings / sizeof *endings; i++)
        if (!strcmp(dot, endings[i]))
            return true;
    return false;
}

static bool is_ours(const char *name) {
    for (size_t i = 0; i < N_RUN_FILES; i++)
        if (!strcmp(name, run_files[i]))
            return true;
    return is_figure(name);
}

/* The files that summary.json or unfinished.json, `list`, names. */
static int read_names(tarry_run_folder *folder, const char *list, const tarry_text *text,
                      tarry_error *error) {
    json_error_t fault = {0};
    json_t *root = json_loadb(text->data, text->size, 0, &fault);
    if (!root && !fault.text[0]) /* of wrong JSON something is said */
        return tarry_fail_memory(error, list);
    json_t *files = json_object_get(root, "files");
    json_t *file;
    size_t i;
    int status = 0;
    if (!json_is_array(files) || !json_is_string(json_object_get(root, "tarry")))
        status = tarry_fail(error, TARRY_INPUT,
                            "%s: the %s in this folder cannot be read as that of a run, so nothing "
                            "is overwritten; name another folder",
                            folder->path, list);
    json_array_foreach(files, i, file) {
        const char *name = json_string_value(json_object_get(file, "name"));
        if (!status && name && is_ours(name))
            status = add_name(folder, &folder->earlier, &folder->n_earlier,
                              &folder->earlier_capacity, name, error);
    }
    json_decref(root);
    return status;
}

static int read_list(tarry_run_folder *folder, const char *list, bool *exists, tarry_error *error) {
    int status = file_exists(folder, list, exists, error);
    if (status || !*exists)
        return status;
    tarry_text text = {0};
    status = tarry_file_read(tarry_run_folder_path(folder, list), SUMMARY_LIMIT, &text, error);
    if (!status)
        status = read_names(folder, list, &text, error);
    tarry_text_release(&text);
    return status;
}

static bool was_named(const tarry_run_folder *folder, const char *name) {
    for (size_t i = 0; i < folder->n_earlier; i++)
        if (!strcmp(folder->earlier[i], name))
            return true;
    return false;
}

/* ---- before simulating ---------------------------------------------------------------------- */

/* With `overwrite`, a file that this run might write and no earlier run named is somebody's. */
static int refuse_strangers(const tarry_run_folder *folder, tarry_error *error) {
    for (size_t i = 0; i < N_RUN_FILES; i++) {
        bool free_ = false;
        const int status = tarry_run_folder_is_free(folder, run_files[i], &free_, error);
        if (status)
            return status;
        if (!free_)
            return tarry_fail(
                error, TARRY_INPUT,
                "%s: %s in this folder is named by no summary.json of an earlier run, "
                "so it is not overwritten; move it away or name another folder",
                folder->path, run_files[i]);
    }
    return 0;
}

int tarry_run_folder_look(tarry_run_folder *folder, bool overwrite, tarry_error *error) {
    bool empty = true, no_figures;
    int status = tarry_folder_is_empty(folder->path, &empty, error);
    if (!status)
        status = tarry_folder_writable(folder->path, error);
    if (status || empty)
        return status;
    if (!overwrite)
        return tarry_fail(
            error, TARRY_INPUT,
            "%s: this folder exists and is not empty; give --overwrite to replace the "
            "results of an earlier run in it, or name another with --out",
            folder->path);
    /* What stands in the place of the folder of figures must be a folder. */
    status = tarry_folder_is_empty(tarry_run_folder_path(folder, tarry_figures_name), &no_figures,
                                   error);
    if (!status)
        status = read_list(folder, tarry_summary_name, &folder->has_summary, error);
    if (!status)
        status = read_list(folder, unfinished_name, &folder->was_cut_short, error);
    return status ? status : refuse_strangers(folder, error);
}

/* ---- files of this run ---------------------------------------------------------------------- */

static bool was_written(const tarry_run_folder *folder, const char *name) {
    for (size_t i = 0; i < folder->n_files; i++)
        if (!strcmp(folder->files[i].name, name))
            return true;
    return false;
}

int tarry_run_folder_is_free(const tarry_run_folder *folder, const char *name, bool *free_,
                             tarry_error *error) {
    bool exists = false;
    const int status = file_exists(folder, name, &exists, error);
    *free_ = !exists || was_named(folder, name) || was_written(folder, name);
    return status;
}

int tarry_run_folder_plan(tarry_run_folder *folder, const char *name, tarry_error *error) {
    return add_name(folder, &folder->planned, &folder->n_planned, &folder->planned_capacity, name,
                    error);
}

int tarry_run_folder_announce(const tarry_run_folder *folder, tarry_error *error) {
    tarry_text text = {0};
    tarry_text_printf(&text, "{\n  \"tarry\": \"%s\",\n  \"files\": [", tarry_version());
    for (size_t i = 0; i < N_RUN_FILES; i++)
        tarry_text_printf(&text, "%s\n    {\"name\": \"%s\"}", i ? "," : "", run_files[i]);
    for (size_t i = 0; i < folder->n_planned; i++)
        tarry_text_printf(&text, ",\n    {\"name\": \"%s\"}", folder->planned[i]);
    for (size_t i = 0; i < folder->n_earlier; i++)
        tarry_text_printf(&text, ",\n    {\"name\": \"%s\"}", folder->earlier[i]);
    tarry_text_add_string(&text, "\n  ]\n}\n");
    const int status = text.failed
                           ? tarry_fail_memory(error, unfinished_name)
                           : tarry_file_write(tarry_run_folder_path(folder, unfinished_name),
                                              text.data, text.size, error);
    tarry_text_release(&text);
    return status;
}

int tarry_run_folder_close(const tarry_run_folder *folder, tarry_error *error) {
    return tarry_run_folder_remove(folder, unfinished_name, error);
}

/* A drawing program that outlived its killed run may still write into the folder of figures. Once
 * that folder is gone it cannot, and the one that is made anew is ours alone. */
static void remove_earlier_figures(const tarry_run_folder *folder) {
    for (size_t i = 0; i < folder->n_earlier; i++)
        if (is_figure(folder->earlier[i]))
            tarry_run_folder_remove(folder, folder->earlier[i], NULL);
    tarry_folder_remove_empty(tarry_run_folder_path(folder, tarry_figures_name));
}

void tarry_run_folder_remove_parts(const tarry_run_folder *folder) {
    tarry_file_remove_parts(tarry_run_folder_path(folder, tarry_summary_name));
    tarry_file_remove_parts(tarry_run_folder_path(folder, unfinished_name));
    for (size_t i = 0; i < N_RUN_FILES; i++)
        tarry_file_remove_parts(tarry_run_folder_path(folder, run_files[i]));
    for (size_t i = 0; i < folder->n_earlier; i++)
        if (is_figure(folder->earlier[i]))
            tarry_file_remove_parts(tarry_run_folder_path(folder, folder->earlier[i]));
    if (folder->was_cut_short)
        remove_earlier_figures(folder);
}

/* Room for one more in the list, with its name. */
static tarry_listed_file *next_listed(tarry_run_folder *folder, const char *name) {
    char *copy = tarry_arena_text(&folder->arena, name, strlen(name));
    if (!copy || tarry_grow((void **)&folder->files, &folder->files_capacity, folder->n_files + 1,
                            sizeof *folder->files))
        return NULL;
    tarry_listed_file *file = &folder->files[folder->n_files];
    *file = (tarry_listed_file){.name = copy};
    return file;
}

int tarry_run_folder_list(tarry_run_folder *folder, const char *name, const char *bytes, size_t n,
                          bool same_bytes, tarry_error *error) {
    tarry_listed_file *file = next_listed(folder, name);
    if (!file)
        return tarry_fail_memory(error, "the names of files");
    file->size = n;
    if (same_bytes)
        tarry_sha256(bytes, n, file->digest);
    folder->n_files++;
    return 0;
}

/* It is listed first: what is written is known to be so whatever memory is left. */
int tarry_run_folder_write(tarry_run_folder *folder, const char *name, const tarry_text *text,
                           bool listed, bool same_bytes, tarry_error *error) {
    if (text->failed)
        return tarry_fail_memory(error, name);
    const int status = listed ? tarry_run_folder_list(folder, name, text->data, text->size,
                                                      same_bytes, error)
                              : 0;
    return status ? status
                  : tarry_file_write(tarry_run_folder_path(folder, name), text->data, text->size,
                                     error);
}

int tarry_run_folder_remove_leftovers(const tarry_run_folder *folder, tarry_error *error) {
    for (size_t i = 0; i < folder->n_earlier; i++) {
        const int status = was_written(folder, folder->earlier[i])
                               ? 0
                               : tarry_run_folder_remove(folder, folder->earlier[i], error);
        if (status)
            return status;
    }
    tarry_folder_remove_empty(tarry_run_folder_path(folder, tarry_figures_name));
    return 0;
}

void tarry_run_folder_take_back(const tarry_run_folder *folder) {
    for (size_t i = 0; i < folder->n_files; i++)
        tarry_run_folder_remove(folder, folder->files[i].name, NULL);
    for (size_t i = 0; i < folder->n_planned; i++)
        tarry_run_folder_remove(folder, folder->planned[i], NULL);
    for (size_t i = 0; i < folder->n_earlier; i++)
        tarry_run_folder_remove(folder, folder->earlier[i], NULL);
    tarry_folder_remove_empty(tarry_run_folder_path(folder, tarry_figures_name));
    tarry_run_folder_remove(folder, unfinished_name, NULL);
}
