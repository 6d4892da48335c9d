/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_TESTS_RANDOM_CELLS_H
#define TARRY_TESTS_RANDOM_CELLS_H

#include <stdint.h>

/* Compare the engine with the plain loop on random models from .. to - 1; ends the test on a
 * difference, with the model made as small as still shows it, or where too few of them run. */
void check_random_models(uint64_t from, uint64_t to);

#endif
