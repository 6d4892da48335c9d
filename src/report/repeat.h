/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_REPORT_REPEAT_H
#define TARRY_REPORT_REPEAT_H

/* The command that gives the same numbers again. */

#include "base/text.h"
#include "model/model.h"
#include "tarry/results.h"
#include "tarry/write.h"

/* The name of the model's file, or of the data's, without its folders: results do not depend on
 * where it lay. */
const char *tarry_repeat_file(const tarry_model *model);

/* Append "tarry run pulses.yaml --cells 500 --seed 1 ...", words as a POSIX shell takes them. */
void tarry_repeat_command(const tarry_model *model, const tarry_results *results,
                          const tarry_provenance *provenance, tarry_text *command);

#endif
