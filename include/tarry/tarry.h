/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_H
#define TARRY_H

/* Everything that libtarry promises. A program calls tarry_start() once before it makes threads;
 * the library itself never prints, exits or reads the clock. */

#include "tarry/check.h"
#include "tarry/error.h"
#include "tarry/measure.h"
#include "tarry/model.h"
#include "tarry/predict.h"
#include "tarry/results.h"
#include "tarry/run.h"
#include "tarry/table.h"
#include "tarry/word.h"
#include "tarry/write.h"

#define TARRY_VERSION "0.1.0"

/* Turns GSL's aborting error handler off (every GSL status is checked). Call once, first. */
void tarry_start(void);

/* "0.1.0" */
const char *tarry_version(void);

/* Compiler, flags and library versions, for `tarry version --build`: lines of text, to be freed
 * with free(); NULL when memory is short. */
char *tarry_build(void);

#endif
