/* SPDX-License-Identifier: GPL-3.0-or-later */

/* tarry check: what a model comes down to. */

#include "cli/commands.h"
#include "cli/talk.h"
#include "tarry/tarry.h"

#include <stdlib.h>

int tarry_command_check(const tarry_settings *settings) {
    if (!settings->operand)
        return tarry_complain(TARRY_EXIT_WRONG, "check needs a model file: tarry check MODEL");
    tarry_error error = {0};
    tarry_model *model = NULL;
    char *report = NULL;
    int status = tarry_command_read_model(settings, &model);
    if (status)
        return status;
    if (tarry_check(model, &report, &error))
        status = tarry_complain_error(&error);
    else
        status = tarry_output(report);
    free(report);
    tarry_model_free(model);
    return status;
}
