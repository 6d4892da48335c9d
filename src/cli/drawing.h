/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_CLI_DRAWING_H
#define TARRY_CLI_DRAWING_H

/* What is drawn and how, from --figures, --genes and the variable GNUPLOT. */

#include "cli/options.h"
#include "tarry/write.h"

typedef struct tarry_drawing {
    tarry_figure_options figures;
    char *gnuplot, *genes; /* what the options point to */
    const char **names;
} tarry_drawing;

/* Returns 0, or complains and returns the exit status; to be released either way, after the last
 * use of `figures`. */
int tarry_drawing_read(const tarry_settings *settings, tarry_drawing *drawing);
void tarry_drawing_release(tarry_drawing *drawing);

#endif
