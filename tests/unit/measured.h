/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_TESTS_MEASURED_H
#define TARRY_TESTS_MEASURED_H

/* Data given as text, measured. */

#include "base/text.h"
#include "study/data.h"
#include "tarry/tarry.h"

/* What came of reading and measuring; to be released either way. */
typedef struct measured {
    tarry_data *data;
    tarry_results *results;
    tarry_error error;
} measured;

/* `options` as on the command line: "--time", "min", "--mean", "cell", NULL. Returns the code. */
int measured_try(measured *m, const char *text, const char *const *options);
void measured_release(measured *m);

/* The same of a file that is there; allocates nothing of its own. */
int measured_file(measured *m, const char *path, const char *const *options);

/* The same, which must succeed. */
void measured_pass(measured *m, const char *text, const char *const *options);

/* Append a row of `cell,time,values` with as many values; NaN is written as NaN. */
void measured_row(tarry_text *text, size_t cell, double time, const double *values, size_t n);

#endif
