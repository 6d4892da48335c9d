/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_CLI_DRAWING_H
#define TARRY_CLI_DRAWING_H

/* How figures are drawn, from --figures and the variable GNUPLOT. */

#include "cli/options.h"
#include "tarry/write.h"

/* Returns 0, or complains and returns the exit status. `*gnuplot` holds the name of the program; it
 * is to be freed either way, after the last use of `figures`. */
int tarry_drawing_read(const tarry_settings *settings, tarry_figure_options *figures,
                       char **gnuplot);

#endif
