/* SPDX-License-Identifier: GPL-3.0-or-later */

/* The files of a run, in their order: tables, figures, page, run.json, and summary.json last. */
#include "tarry/write.h"

#include "base/error.h"
#include "base/file.h"
#include "base/table.h"
#include "report/drawing.h"
#include "report/page.h"
#include "report/repeat.h"
#include "report/run_folder.h"
#include "tarry/tarry.h"

#include <stdio.h>
#include <string.h>

int tarry_write_check(const char *path, bool overwrite, tarry_error *error) {
    tarry_run_folder folder;
    int status = tarry_run_folder_init(&folder, path, error);
    if (!status)
        status = tarry_run_folder_look(&folder, overwrite, error);
    tarry_run_folder_release(&folder);
    /* A folder that cannot serve is a wrong setting here, where nothing is lost yet. */
    if (status == TARRY_FILE && error)
        error->code = TARRY_INPUT;
    return status == TARRY_FILE ? TARRY_INPUT : status;
}

/* Tables without rows give no file. */
static int write_table(tarry_run_folder *folder, const tarry_table *table, tarry_error *error) {
    char name[80];
    if (!table || !tarry_table_n_rows(table))
        return 0;
    snprintf(name, sizeof name, "%s.csv", tarry_table_name(table));
    tarry_text text = {0};
    tarry_table_write_csv(table, &text);
    const int status = tarry_run_folder_write(folder, name, &text, true, true, error);
    tarry_text_release(&text);
    return status;
}

static void add_comment(const char *mark, const char *line, size_t size, tarry_text *text) {
    const char *end = line + size;
    while (line < end) {
        const char *next = memchr(line, '\n', (size_t)(end - line));
        tarry_text_add_string(text, mark);
        tarry_text_add(text, line, (size_t)((next ? next : end) - line));
        tarry_text_add_string(text, "\n");
        line = next ? next + 1 : end;
    }
}

/* Of a run told as data: what it is, so that nobody takes it for the work of a laboratory, and what
 * made it. The command has nothing that numbers do not depend on, as the figures. */
static void add_data_head(const tarry_model *model, const tarry_results *results,
                          const tarry_provenance *provenance, tarry_text *text) {
    const char *title = model->network.title[0] ? model->network.title : tarry_repeat_file(model);
    tarry_provenance of_numbers = *provenance;
    of_numbers.figures = NULL;
    add_comment("# Simulated data, not measured: ", title, strlen(title), text);
    tarry_text_printf(text, "# Time in %s. Made by: ", model->network.time_unit);
    tarry_repeat_command(model, results, &of_numbers, text);
    tarry_text_printf(text, " (tarry %s). The model:\n", tarry_version());
    add_comment("#   ", model->text, model->text_size, text);
}

static int write_data(tarry_run_folder *folder, const tarry_model *model,
                      const tarry_results *results, const tarry_provenance *provenance,
                      tarry_error *error) {
    const tarry_table *table = tarry_results_data(results);
    tarry_text text = {0};
    if (!table)
        return 0;
    add_data_head(model, results, provenance, &text);
    tarry_table_write_csv(table, &text);
    const int status = tarry_run_folder_write(folder, "data.csv", &text, true, true, error);
    tarry_text_release(&text);
    return status;
}

static int write_tables(tarry_run_folder *folder, const tarry_model *model,
                        const tarry_results *results, const tarry_provenance *provenance,
                        tarry_error *error) {
    for (size_t i = 0; i < TARRY_N_RESULT_TABLES; i++) {
        const tarry_table *table = tarry_results_table(results, (tarry_result_table)i);
        const int status = write_table(folder, table, error);
        if (status)
            return status;
    }
    const int status = write_table(folder, tarry_results_cells(results), error);
    return status ? status : write_data(folder, model, results, provenance, error);
}

/* Figures, and the page that has those that could be drawn. */
static int write_figures(tarry_run_folder *folder, const tarry_model *model,
                         const tarry_results *results, const tarry_provenance *provenance,
                         tarry_error *error) {
    const tarry_figure_options *options = provenance->figures;
    tarry_figure_list figures = {0};
    tarry_text text = {0};
    int status = 0;
    if (options && options->format != TARRY_FIGURE_NONE) {
        status = tarry_figures_make(model, results, options, &figures, error);
        if (!status)
            status = tarry_figures_draw(folder, options, &figures, error);
    }
    if (!status)
        status = tarry_page_write(model, results, provenance, &figures, &text, error);
    if (!status)
        status = tarry_run_folder_write(folder, tarry_page_name, &text, true, true, error);
    tarry_text_release(&text);
    tarry_figure_list_release(&figures);
    return status;
}

static int write_run_json(tarry_run_folder *folder, const tarry_provenance *provenance,
                          tarry_error *error) {
    tarry_text text = {0};
    int status = tarry_summary_write_run(provenance, &text, error);
    if (!status)
        status = tarry_run_folder_write(folder, tarry_run_name, &text, true, false, error);
    tarry_text_release(&text);
    return status;
}

static int write_summary(tarry_run_folder *folder, const tarry_model *model,
                         const tarry_results *results, const tarry_provenance *provenance,
                         tarry_error *error) {
    tarry_text text = {0};
    int status = tarry_summary_write(model, results, provenance, folder->files, folder->n_files,
                                     &text, error);
    if (!status)
        status = tarry_run_folder_write(folder, tarry_summary_name, &text, false, false, error);
    tarry_text_release(&text);
    return status;
}

/* A summary.json that outlives a power failure must not outlive what it lists. */
static int flush_names(const tarry_run_folder *folder, tarry_error *error) {
    const int status = tarry_folder_flush(tarry_run_folder_path(folder, tarry_figures_name), error);
    return status ? status : tarry_folder_flush(folder->path, error);
}

/* Everything but unfinished.json, which is there meanwhile. */
static int write_all(tarry_run_folder *folder, const tarry_model *model,
                     const tarry_results *results, const tarry_provenance *provenance,
                     tarry_error *error) {
    int status = folder->has_summary ? tarry_run_folder_remove(folder, tarry_summary_name, error)
                                     : 0;
    if (!status)
        status = write_tables(folder, model, results, provenance, error);
    if (!status)
        status = write_figures(folder, model, results, provenance, error);
    if (!status)
        status = write_run_json(folder, provenance, error);
    if (!status)
        status = tarry_run_folder_remove_leftovers(folder, error);
    if (!status)
        status = flush_names(folder, error);
    if (!status)
        status = write_summary(folder, model, results, provenance, error);
    return status;
}

int tarry_write_run(const char *path, bool overwrite, const tarry_model *model,
                    const tarry_results *results, const tarry_provenance *provenance,
                    tarry_error *error) {
    tarry_run_folder folder;
    int status = tarry_run_folder_init(&folder, path, error);
    if (!status)
        status = tarry_run_folder_look(&folder, overwrite, error);
    if (!status)
        status = tarry_folder_make(path, error);
    if (!status && overwrite)
        tarry_run_folder_remove_parts(&folder);
    if (!status && !(status = tarry_run_folder_announce(&folder, error))) {
        status = write_all(&folder, model, results, provenance, error);
        if (status)
            tarry_run_folder_take_back(&folder);
        else
            status = tarry_run_folder_close(&folder, error);
    }
    tarry_run_folder_release(&folder);
    return status;
}
