/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_REPORT_DRAWING_H
#define TARRY_REPORT_DRAWING_H

/* Figures into the run's folder: scripts and data written, gnuplot run over them, pictures read. */

#include "report/figure.h"
#include "report/run_folder.h"

/* Write the figures and list their files; `svg` of each is filled where it could be drawn. Trouble
 * with gnuplot is told to options->warn and is no error: scripts and data stay. */
int tarry_figures_draw(tarry_run_folder *folder, const tarry_figure_options *options,
                       tarry_figure_list *list, tarry_error *error);

#endif
