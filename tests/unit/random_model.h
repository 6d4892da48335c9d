/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_TESTS_RANDOM_MODEL_H
#define TARRY_TESTS_RANDOM_MODEL_H

/* Small models made at random over what the format can say, as YAML, and made smaller while they
 * still show something. */

#include <stdbool.h>
#include <stdint.h>

/* Model `number`; the same text for the same number. Most are accepted, some are refused (a steady
 * start without a steady law, say). To be freed with free(). */
char *random_model(uint64_t number);

/* Drop lines with all that is indented below them, one after another, as long as `shows` says that
 * what is left still shows the fault. To be freed with free(). */
char *shrink_model(const char *text, bool (*shows)(const char *text, void *context), void *context);

#endif
