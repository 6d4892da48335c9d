/* SPDX-License-Identifier: GPL-3.0-or-later */

/* tarry run: simulate, write the files of the run, print the table per gene. */

#include "cli/commands.h"
#include "cli/drawing.h"
#include "cli/interrupt.h"
#include "cli/progress.h"
#include "cli/talk.h"
#include "tarry/tarry.h"

#include <inttypes.h>
#include <stdlib.h>
#include <string.h>

/* The demonstration: a model of models/ that the build puts into the program. */
extern const char tarry_demo_model[];
extern const size_t tarry_demo_model_size;
static const char demo_name[] = "two_state.yaml";

enum {
    TABLE_WIDTH = 80,
    TRACED = 3, /* cells whose traces are drawn */
};

static int read_model(const tarry_settings *settings, tarry_model **model) {
    tarry_error error = {0};
    if (settings->operand)
        return tarry_command_read_model(settings, model);
    tarry_talk("no MODEL was given: this is the built-in demonstration, models/%s", demo_name);
    if (tarry_model_read_text(tarry_demo_model, tarry_demo_model_size, demo_name,
                              settings->overrides, settings->n_overrides, model, &error))
        return tarry_complain_error(&error);
    return TARRY_EXIT_DONE;
}

static int simulate(const tarry_settings *settings, const tarry_model *model,
                    tarry_figure_options *figures, tarry_results **results,
                    tarry_provenance *provenance) {
    tarry_error error = {0};
    tarry_progress progress;
    figures->stop = tarry_interrupt_watch(!settings->quiet);
    const tarry_run_options options = {
        .threads = provenance->threads,
        .sampler = provenance->sampler,
        .keep = settings->keep,
        .as_data = provenance->as_data,
        .self_check = true,
        .traced = figures->format == TARRY_FIGURE_NONE ? 0 : TRACED,
        .genes = figures->genes,
        .n_genes = figures->n_genes,
        .stop = figures->stop,
        .progress = tarry_progress_show,
        .progress_context = &progress,
    };
    tarry_progress_start(&progress, !settings->quiet);
    const int code = tarry_run(model, &options, results, &error);
    provenance->seconds = tarry_clock() - progress.start;
    tarry_progress_end(&progress);
    if (code == TARRY_INTERRUPTED)
        return tarry_complain(TARRY_EXIT_INTERRUPTED,
                              "interrupted before a cell was finished; nothing was written");
    if (code)
        return tarry_complain_error(&error);
    provenance->partial = tarry_results_n_cells(*results) < tarry_results_n_cells_asked(*results);
    return TARRY_EXIT_DONE;
}

static void say_what_was_done(const tarry_results *results, const tarry_provenance *provenance,
                              const char *folder) {
    char duration[32];
    const int64_t n = tarry_results_n_cells(results);
    tarry_progress_duration(provenance->seconds, duration);
    if (provenance->partial)
        tarry_talk("interrupted: %" PRId64 " of %" PRId64 " cells in %s; results, marked partial, "
                   "in %s",
                   n, tarry_results_n_cells_asked(results), duration, folder);
    else
        tarry_talk("%" PRId64 " cell%s in %s; results in %s", n, n == 1 ? "" : "s", duration,
                   folder);
    tarry_command_say_page(folder);
}

/* Files first; the table comes in any case, since the work is done. */
static int hand_out(const tarry_settings *settings, const char *folder, const tarry_model *model,
                    const tarry_results *results, const tarry_provenance *provenance) {
    tarry_error error = {0};
    char *table = NULL;
    int status = TARRY_EXIT_DONE;
    if (tarry_write_run(folder, settings->overwrite, model, results, provenance, &error))
        status = tarry_complain_error(&error);
    const bool written = !status;
    int table_status;
    if (tarry_write_summary_table(model, results, TABLE_WIDTH, &table, &error))
        table_status = tarry_complain_error(&error);
    else
        table_status = tarry_output(table);
    free(table);
    if (written && !settings->quiet)
        say_what_was_done(results, provenance, folder);
    return status ? status : table_status;
}

static int read_form(const char *word, tarry_data_form *form) {
    const int found = word ? tarry_data_form_of(word) : TARRY_DATA_FORM_NONE;
    if (found < 0 || (word && found == TARRY_DATA_FORM_NONE))
        return tarry_complain(TARRY_EXIT_WRONG,
                              "--as-data %s: one of traces, counts and means is due here", word);
    *form = (tarry_data_form)found;
    return TARRY_EXIT_DONE;
}

static int run_model(const tarry_settings *settings, const char *folder,
                     tarry_figure_options *figures, const tarry_model *model) {
    tarry_error error = {0};
    tarry_results *results = NULL;
    tarry_provenance provenance = {
        .sampler = settings->sampler ? settings->sampler : "direct",
        .overrides = settings->overrides,
        .n_overrides = settings->n_overrides,
        .keep = settings->keep,
        .threads = tarry_run_n_threads(model, (int)settings->threads),
        .figures = figures,
    };
    int status = read_form(settings->as_data, &provenance.as_data);
    if (status)
        return status;
    if (tarry_write_check(folder, settings->overwrite, &error))
        return tarry_complain_error(&error);
    for (size_t i = 0; i < tarry_model_n_warnings(model); i++)
        tarry_talk("warning: %s", tarry_model_warning(model, i));
    status = simulate(settings, model, figures, &results, &provenance);
    if (!status)
        status = hand_out(settings, folder, model, results, &provenance);
    if (!status && provenance.partial)
        status = TARRY_EXIT_INTERRUPTED;
    tarry_results_free(results);
    return status;
}

static int run(const tarry_settings *settings, tarry_figure_options *figures) {
    tarry_model *model = NULL;
    int status = read_model(settings, &model);
    if (status)
        return status;
    char *made = settings->out ? NULL
                               : tarry_command_folder(
                                     settings->operand ? settings->operand : demo_name, ".out");
    const char *folder = settings->out ? settings->out : made;
    if (folder)
        status = run_model(settings, folder, figures, model);
    else
        status = tarry_complain(TARRY_EXIT_FAILED, "out of memory for the folder's name");
    free(made);
    tarry_model_free(model);
    return status;
}

int tarry_command_run(const tarry_settings *settings) {
    tarry_drawing drawing;
    int status = tarry_drawing_read(settings, &drawing);
    if (!status)
        status = run(settings, &drawing.figures);
    tarry_drawing_release(&drawing);
    return status;
}
