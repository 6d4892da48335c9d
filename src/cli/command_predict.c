/* SPDX-License-Identifier: GPL-3.0-or-later */

/* tarry predict: what a run would find with endlessly many cells, by the mathematics. */

#include "cli/commands.h"
#include "cli/drawing.h"
#include "cli/interrupt.h"
#include "cli/progress.h"
#include "cli/talk.h"
#include "tarry/tarry.h"

#include <stdlib.h>

enum { TABLE_WIDTH = 80 };

static int hand_out(const tarry_settings *settings, const char *folder, const tarry_model *model,
                    const tarry_results *results, const tarry_provenance *provenance) {
    tarry_error error = {0};
    char *table = NULL;
    int status = TARRY_EXIT_DONE, table_status;
    if (tarry_write_run(folder, settings->overwrite, model, results, provenance, &error))
        status = tarry_complain_error(&error);
    const bool written = !status;
    if (tarry_write_summary_table(model, results, TABLE_WIDTH, &table, &error))
        table_status = tarry_complain_error(&error);
    else
        table_status = tarry_output(table);
    free(table);
    if (written && !settings->quiet) {
        tarry_talk("exact values in %s", folder);
        tarry_command_say_page(folder);
    }
    return status ? status : table_status;
}

static int predict_model(const tarry_settings *settings, const char *folder,
                         tarry_figure_options *figures, const tarry_model *model) {
    tarry_error error = {0};
    tarry_results *results = NULL;
    tarry_provenance provenance = {
        .overrides = settings->overrides,
        .n_overrides = settings->n_overrides,
        .threads = 1,
        .figures = figures,
    };
    if (tarry_write_check(folder, settings->overwrite, &error))
        return tarry_complain_error(&error);
    for (size_t i = 0; i < tarry_model_n_warnings(model); i++)
        tarry_talk("warning: %s", tarry_model_warning(model, i));
    const double start = tarry_clock();
    if (tarry_predict(model, &results, &error))
        return tarry_complain_error(&error);
    provenance.seconds = tarry_clock() - start;
    figures->stop = tarry_interrupt_watch(!settings->quiet); /* before that, a signal ends it */
    const int status = hand_out(settings, folder, model, results, &provenance);
    tarry_results_free(results);
    return status;
}

static int predict(const tarry_settings *settings, tarry_figure_options *figures) {
    tarry_model *model = NULL;
    int status = tarry_command_read_model(settings, &model);
    if (status)
        return status;
    char *made = settings->out ? NULL : tarry_command_folder(settings->operand, ".exact");
    const char *folder = settings->out ? settings->out : made;
    if (folder)
        status = predict_model(settings, folder, figures, model);
    else
        status = tarry_complain(TARRY_EXIT_FAILED, "out of memory for the folder's name");
    free(made);
    tarry_model_free(model);
    return status;
}

int tarry_command_predict(const tarry_settings *settings) {
    tarry_drawing drawing;
    int status = tarry_drawing_read(settings, &drawing);
    if (!status)
        status = predict(settings, &drawing.figures);
    tarry_drawing_release(&drawing);
    return status;
}
