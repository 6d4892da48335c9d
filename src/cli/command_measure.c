/* SPDX-License-Identifier: GPL-3.0-or-later */

/* tarry measure: the figures of a run from laboratory data. */

#include "cli/commands.h"
#include "cli/drawing.h"
#include "cli/interrupt.h"
#include "cli/progress.h"
#include "cli/talk.h"
#include "tarry/tarry.h"

#include <errno.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

enum {
    TABLE_WIDTH = 80,
    TRACED = 3, /* cells whose traces are drawn */
};

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
        tarry_talk("results in %s", folder);
        tarry_command_say_page(folder);
    }
    return status ? status : table_status;
}

static int measure_data(const tarry_settings *settings, const char *folder,
                        tarry_figure_options *figures, const tarry_data *data, double start) {
    tarry_error error = {0};
    tarry_results *results = NULL;
    const tarry_measure_options options = {
        .threads = (int)settings->threads,
        .traced = figures->format == TARRY_FIGURE_NONE ? 0 : TRACED,
        .stop = figures->stop,
    };
    tarry_provenance provenance = {
        .overrides = settings->overrides,
        .n_overrides = settings->n_overrides,
        .threads = tarry_measure_n_threads(data, (int)settings->threads),
        .figures = figures,
    };
    if (tarry_measure(data, &options, &results, &error))
        return tarry_complain_error(&error);
    provenance.seconds = tarry_clock() - start;
    const int status = hand_out(settings, folder, tarry_data_model(data), results, &provenance);
    tarry_results_free(results);
    return status;
}

static int read_and_measure(const tarry_settings *settings, const char *folder,
                            tarry_figure_options *figures) {
    const double start = tarry_clock();
    tarry_error error = {0};
    tarry_data *data = NULL;
    figures->stop = tarry_interrupt_watch(false);
    if (access(settings->operand, R_OK))
        return tarry_complain(TARRY_EXIT_WRONG, "the data file '%s' cannot be read: %s",
                              settings->operand, strerror(errno));
    if (tarry_write_check(folder, settings->overwrite, &error) ||
        tarry_data_read(settings->operand, settings->overrides, settings->n_overrides, &data,
                        &error))
        return tarry_complain_error(&error);
    const int status = measure_data(settings, folder, figures, data, start);
    tarry_data_free(data);
    return status;
}

int tarry_command_measure(const tarry_settings *settings) {
    tarry_drawing drawing;
    if (!settings->operand)
        return tarry_complain(TARRY_EXIT_WRONG, "measure needs DATA.csv, a file of data");
    int status = tarry_drawing_read(settings, &drawing);
    char *made = settings->out ? NULL : tarry_command_folder(settings->operand, ".measured");
    const char *folder = settings->out ? settings->out : made;
    if (!status && !folder)
        status = tarry_complain(TARRY_EXIT_FAILED, "out of memory for the folder's name");
    if (!status)
        status = read_and_measure(settings, folder, &drawing.figures);
    free(made);
    tarry_drawing_release(&drawing);
    return status;
}
