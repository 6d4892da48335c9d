/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_TESTS_RESULTS_TEXT_H
#define TARRY_TESTS_RESULTS_TEXT_H

#include "tarry/results.h"

/* Everything that was found, as one text to be freed with free(): equal texts are equal results. */
char *results_text(const tarry_results *results);

#endif
