/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_REPORT_RUN_WORDS_H
#define TARRY_REPORT_RUN_WORDS_H

/* What was run, in words, for the terminal and the page. */

#include "base/text.h"
#include "model/network.h"
#include "tarry/results.h"

/* Append "1000 cells, 600 min recorded every 1 min after 2400 min to settle, seed 1". */
void tarry_run_words(const tarry_network *network, const tarry_results *results, tarry_text *text);

/* Lines that follow it, each empty where it has nothing to tell. */
enum {
    TARRY_RUN_LINE_WINDOWS,  /* "Windows: before from 0 to 60 min, ...": where there are several */
    TARRY_RUN_LINE_CHECK,    /* "Self-check: of 758 figures that have an exact law ..." */
    TARRY_RUN_LINE_VISIBLE,  /* "Visible: spot above 4 until below 2; changes last 1 min" */
    TARRY_RUN_LINE_DETECTED, /* "Detected: spot in frames above 1 only" */
    TARRY_RUN_LINES
};
void tarry_run_lines(const tarry_network *network, const tarry_results *results,
                     tarry_text lines[TARRY_RUN_LINES]);

#endif
