/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_REPORT_RUN_WORDS_H
#define TARRY_REPORT_RUN_WORDS_H

/* What was run, in words, for the terminal and the page. */

#include "base/text.h"
#include "model/network.h"
#include "tarry/results.h"

/* Append "1000 cells, 600 min recorded every 1 min after 2400 min to settle, seed 1". */
void tarry_run_words(const tarry_network *network, const tarry_results *results, tarry_text *text);

/* Append "Self-check: of 758 figures that have an exact law the farthest is 2.8 standard errors
 * off,
 * ..." where a run was compared with its laws. */
void tarry_self_check_words(const tarry_results *results, tarry_text *text);

/* Append "Visible: spot above 4 until below 2; changes last 1 min" where names have thresholds. */
void tarry_threshold_words(const tarry_network *network, tarry_text *text);

/* Append "Windows: before from 0 to 60 min, ..." where there are several. */
void tarry_window_words(const tarry_network *network, tarry_text *text);

#endif
