/* SPDX-License-Identifier: GPL-3.0-or-later */

/* tarry version: which program this is, and with --build how it was made. */

#include "cli/commands.h"
#include "cli/talk.h"
#include "tarry/tarry.h"

#include <stdio.h>
#include <stdlib.h>

int tarry_command_version(const tarry_settings *settings) {
    char line[64];
    snprintf(line, sizeof line, "tarry %s\n", tarry_version());
    int status = tarry_output(line);
    if (status || !settings->build)
        return status;
    char *build = tarry_build();
    status = build ? tarry_output(build)
                   : tarry_complain(TARRY_EXIT_FAILED,
                                    "out of memory for what is known of the build");
    free(build);
    return status;
}
