/* A run's folder. What may be replaced there is what an earlier summary.json names, and of that
 * only what a run writes: nothing else in the folder is ever touched. */
#include "tarry/write.h"

#include "base/error.h"
#include "base/file.h"
#include "base/memory.h"
#include "base/table.h"
#include "report/summary.h"
#include "tarry/tarry.h"

#include <assert.h>
#include <jansson.h>
#include <stdlib.h>
#include <string.h>

static const char summary_name[] = "summary.json";
static const char run_name[] = "run.json";
static const char unfinished_name[] = "unfinished.json"; /* there while files are being written */

/* Every file that a run may write, but for summary.json. */
static const char *const run_files[] = {
#define FILE_NAME(name, columns) #name ".csv",
    TARRY_RESULT_TABLES(FILE_NAME)
#undef FILE_NAME
        "cells.csv",
    run_name,
};

enum {
    N_RUN_FILES = sizeof run_files / sizeof *run_files,
    SUMMARY_LIMIT = 1 << 30, /* bytes of an earlier summary.json */
};

typedef struct run_folder {
    const char *path;
    char *room; /* for the path of one file: taking back must not depend on memory */
    bool has_summary;
    bool named[N_RUN_FILES];   /* by the earlier summary.json */
    bool written[N_RUN_FILES]; /* by this run */
    tarry_listed_file files[N_RUN_FILES];
    size_t n_files;
} run_folder;

enum { LONGEST_NAME = 255 };

static int folder_init(run_folder *folder, const char *path, tarry_error *error) {
    folder->path = path;
    folder->room = tarry_calloc(strlen(path) + LONGEST_NAME + 2, 1);
    return folder->room ? 0 : tarry_fail_memory(error, "the names of files");
}

static void folder_release(run_folder *folder) {
    free(folder->room);
}

/* "folder/name", until the next call. */
static const char *path_in(const run_folder *folder, const char *name) {
    const size_t n = strlen(folder->path);
    assert(strlen(name) <= LONGEST_NAME);
    memcpy(folder->room, folder->path, n);
    folder->room[n] = '/';
    strcpy(folder->room + n + (n && folder->path[n - 1] == '/' ? 0 : 1), name);
    return folder->room;
}

static int file_exists(const run_folder *folder, const char *name, bool *exists,
                       tarry_error *error) {
    return tarry_file_exists(path_in(folder, name), exists, error);
}

static int remove_file(const run_folder *folder, const char *name, tarry_error *error) {
    return tarry_file_remove(path_in(folder, name), error);
}

/* Mark the files that summary.json or unfinished.json, `list`, names. */
static int read_names(run_folder *folder, const char *list, const tarry_text *text,
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
        for (size_t j = 0; name && j < N_RUN_FILES; j++)
            if (!strcmp(name, run_files[j]))
                folder->named[j] = true;
    }
    json_decref(root);
    return status;
}

static int read_list(run_folder *folder, const char *list, bool *exists, tarry_error *error) {
    int status = file_exists(folder, list, exists, error);
    if (status || !*exists)
        return status;
    tarry_text text = {0};
    status = tarry_file_read(path_in(folder, list), SUMMARY_LIMIT, &text, error);
    if (!status)
        status = read_names(folder, list, &text, error);
    tarry_text_release(&text);
    return status;
}

/* With `overwrite`, a file that this run might write and no earlier run named is somebody's. */
static int refuse_strangers(const run_folder *folder, tarry_error *error) {
    for (size_t i = 0; i < N_RUN_FILES; i++) {
        bool exists = false;
        const int status = file_exists(folder, run_files[i], &exists, error);
        if (status)
            return status;
        if (exists && !folder->named[i])
            return tarry_fail(
                error, TARRY_INPUT,
                "%s: %s in this folder is named by no summary.json of an earlier run, "
                "so it is not overwritten; move it away or name another folder",
                folder->path, run_files[i]);
    }
    return 0;
}

static int look_at_folder(run_folder *folder, bool overwrite, tarry_error *error) {
    bool empty = true, was_cut_short = false;
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
    status = read_list(folder, summary_name, &folder->has_summary, error);
    if (!status)
        status = read_list(folder, unfinished_name, &was_cut_short, error);
    return status ? status : refuse_strangers(folder, error);
}

int tarry_write_check(const char *path, bool overwrite, tarry_error *error) {
    run_folder folder = {0};
    int status = folder_init(&folder, path, error);
    if (!status)
        status = look_at_folder(&folder, overwrite, error);
    folder_release(&folder);
    /* A folder that cannot serve is a wrong setting here, where nothing is lost yet. */
    if (status == TARRY_FILE && error)
        error->code = TARRY_INPUT;
    return status == TARRY_FILE ? TARRY_INPUT : status;
}

static int write_bytes(const run_folder *folder, const char *name, const tarry_text *text,
                       tarry_error *error) {
    if (text->failed)
        return tarry_fail_memory(error, name);
    return tarry_file_write(path_in(folder, name), text->data, text->size, error);
}

/* Before anything is changed: which files are this run's, so that the next run may replace them if
 * this one is cut short. */
static int write_unfinished(const run_folder *folder, tarry_error *error) {
    tarry_text text = {0};
    tarry_text_printf(&text, "{\n  \"tarry\": \"%s\",\n  \"files\": [", tarry_version());
    for (size_t i = 0; i < N_RUN_FILES; i++)
        tarry_text_printf(&text, "%s\n    {\"name\": \"%s\"}", i ? "," : "", run_files[i]);
    tarry_text_add_string(&text, "\n  ]\n}\n");
    const int status = write_bytes(folder, unfinished_name, &text, error);
    tarry_text_release(&text);
    return status;
}

/* What a run that was killed left half-written beside its files. */
static void remove_parts(const run_folder *folder) {
    tarry_file_remove_parts(path_in(folder, summary_name));
    tarry_file_remove_parts(path_in(folder, unfinished_name));
    for (size_t i = 0; i < N_RUN_FILES; i++)
        tarry_file_remove_parts(path_in(folder, run_files[i]));
}

static int write_listed(run_folder *folder, size_t which, const tarry_text *text, bool same_bytes,
                        tarry_error *error) {
    const int status = write_bytes(folder, run_files[which], text, error);
    if (status)
        return status;
    tarry_listed_file *file = &folder->files[folder->n_files++];
    file->name = run_files[which];
    file->size = text->size;
    if (same_bytes)
        tarry_sha256(text->data, text->size, file->digest);
    folder->written[which] = true;
    return 0;
}

/* Tables without rows give no file. */
static int write_table(run_folder *folder, size_t which, const tarry_table *table,
                       tarry_error *error) {
    if (!table || !tarry_table_n_rows(table))
        return 0;
    tarry_text text = {0};
    tarry_table_write_csv(table, &text);
    const int status = write_listed(folder, which, &text, true, error);
    tarry_text_release(&text);
    return status;
}

static int write_tables(run_folder *folder, const tarry_results *results, tarry_error *error) {
    for (size_t i = 0; i < TARRY_N_RESULT_TABLES; i++) {
        const tarry_table *table = tarry_results_table(results, (tarry_result_table)i);
        const int status = write_table(folder, i, table, error);
        if (status)
            return status;
    }
    return write_table(folder, TARRY_N_RESULT_TABLES, tarry_results_cells(results), error);
}

static int write_run_json(run_folder *folder, const tarry_provenance *provenance,
                          tarry_error *error) {
    tarry_text text = {0};
    int status = tarry_summary_write_run(provenance, &text, error);
    if (!status)
        status = write_listed(folder, N_RUN_FILES - 1, &text, false, error);
    tarry_text_release(&text);
    return status;
}

static int write_summary(const run_folder *folder, const tarry_model *model,
                         const tarry_results *results, const tarry_provenance *provenance,
                         tarry_error *error) {
    tarry_text text = {0};
    int status = tarry_summary_write(model, results, provenance, folder->files, folder->n_files,
                                     &text, error);
    if (!status)
        status = write_bytes(folder, summary_name, &text, error);
    tarry_text_release(&text);
    return status;
}

static int remove_leftovers(const run_folder *folder, tarry_error *error) {
    for (size_t i = 0; i < N_RUN_FILES; i++) {
        const int status = folder->named[i] && !folder->written[i]
                               ? remove_file(folder, run_files[i], error)
                               : 0;
        if (status)
            return status;
    }
    return 0;
}

/* After a failure: what was written goes again, so that the same folder can be tried once more. */
static void take_back(const run_folder *folder) {
    for (size_t i = 0; i < N_RUN_FILES; i++)
        if (folder->written[i] || folder->named[i])
            remove_file(folder, run_files[i], NULL);
    remove_file(folder, unfinished_name, NULL);
}

/* Everything but unfinished.json, which is there meanwhile. */
static int write_all(run_folder *folder, const tarry_model *model, const tarry_results *results,
                     const tarry_provenance *provenance, tarry_error *error) {
    int status = folder->has_summary ? remove_file(folder, summary_name, error) : 0;
    if (!status)
        status = write_tables(folder, results, error);
    if (!status)
        status = write_run_json(folder, provenance, error);
    if (!status)
        status = remove_leftovers(folder, error);
    if (!status)
        status = write_summary(folder, model, results, provenance, error);
    return status;
}

int tarry_write_run(const char *path, bool overwrite, const tarry_model *model,
                    const tarry_results *results, const tarry_provenance *provenance,
                    tarry_error *error) {
    run_folder folder = {0};
    int status = folder_init(&folder, path, error);
    if (!status)
        status = look_at_folder(&folder, overwrite, error);
    if (!status)
        status = tarry_folder_make(path, error);
    if (!status && overwrite)
        remove_parts(&folder);
    if (!status && !(status = write_unfinished(&folder, error))) {
        status = write_all(&folder, model, results, provenance, error);
        if (status)
            take_back(&folder);
        else
            status = remove_file(&folder, unfinished_name, error);
    }
    folder_release(&folder);
    return status;
}
