/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_REPORT_RUN_FOLDER_H
#define TARRY_REPORT_RUN_FOLDER_H

/* A run's folder while its files are written. What may be replaced or removed there is what an
 * earlier summary.json names, and of that only what a run writes: nothing else in the folder is
 * ever touched. */

#include <stdbool.h>
#include "base/memory.h"
#include "report/summary.h"

typedef struct tarry_run_folder {
    const char *path;
    char *room;        /* for the path of one file: taking back must not depend on memory */
    tarry_arena arena; /* names */
    bool has_summary;
    bool was_cut_short; /* unfinished.json is there */
    char **earlier;     /* files that an earlier run names and a run may write */
    size_t n_earlier, earlier_capacity;
    char **planned; /* files that this run may write, besides those that every run may */
    size_t n_planned, planned_capacity;
    tarry_listed_file *files; /* written by this run */
    size_t n_files, files_capacity;
} tarry_run_folder;

enum { TARRY_LONGEST_NAME = 255 }; /* of a file, with the name of a folder in the run's */

extern const char tarry_summary_name[]; /* "summary.json" */
extern const char tarry_page_name[];    /* "report.html" */
extern const char tarry_run_name[];     /* "run.json" */
extern const char tarry_figures_name[]; /* "figures" */

/* Release accepts a half-built one. */
int tarry_run_folder_init(tarry_run_folder *folder, const char *path, tarry_error *error);
void tarry_run_folder_release(tarry_run_folder *folder);

/* Look at the folder, changing nothing: refuse what cannot serve, note what an earlier run wrote.
 */
int tarry_run_folder_look(tarry_run_folder *folder, bool overwrite, tarry_error *error);

/* "FOLDER/name", until the next call. */
const char *tarry_run_folder_path(const tarry_run_folder *folder, const char *name);

int tarry_run_folder_remove(const tarry_run_folder *folder, const char *name, tarry_error *error);

/* *free_: nothing stands under this name, or what an earlier run put there. */
int tarry_run_folder_is_free(const tarry_run_folder *folder, const char *name, bool *free_,
                             tarry_error *error);

/* This run may write (or have written) a file of this name; it will be removed after a failure. */
int tarry_run_folder_plan(tarry_run_folder *folder, const char *name, tarry_error *error);

/* Write unfinished.json: which files are this run's, so that the next run may replace them if this
 * one is cut short. Before the first of them is written. */
int tarry_run_folder_announce(const tarry_run_folder *folder, tarry_error *error);

/* All is written: unfinished.json goes. */
int tarry_run_folder_close(const tarry_run_folder *folder, tarry_error *error);

/* What a run that was killed left half-written beside its files. */
void tarry_run_folder_remove_parts(const tarry_run_folder *folder);

/* Write a file; with `listed` it will stand in summary.json, and `same_bytes` says that size and
 * digest are to be listed too. */
int tarry_run_folder_write(tarry_run_folder *folder, const char *name, const tarry_text *text,
                           bool listed, bool same_bytes, tarry_error *error);

/* List a file that stands there already, with these bytes. */
int tarry_run_folder_list(tarry_run_folder *folder, const char *name, const char *bytes, size_t n,
                          bool same_bytes, tarry_error *error);

/* Remove what the earlier run wrote and this one did not. */
int tarry_run_folder_remove_leftovers(const tarry_run_folder *folder, tarry_error *error);

/* After a failure: what was written goes again, so that the same folder can be tried once more. */
void tarry_run_folder_take_back(const tarry_run_folder *folder);

#endif
