/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_CHECK_H
#define TARRY_CHECK_H

/* What `tarry check` shows: the expanded model, and what looks wrong with it. */

#include "tarry/error.h"
#include "tarry/model.h"

/* The whole report as NUL-ended text (species, reactions, delays with mean and sd, conserved sums,
 * distances from the steady means, bytes and rows, warnings), to be freed with free(). */
int tarry_check(const tarry_model *model, char **report, tarry_error *error);

#endif
