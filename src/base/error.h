/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_BASE_ERROR_H
#define TARRY_BASE_ERROR_H

#include "tarry/error.h"

/* Fill `error` (may be NULL) and return `code`, so that a caller can write `return
 * tarry_fail(...)`. */
int tarry_fail(tarry_error *error, tarry_code code, const char *format, ...)
    __attribute__((format(printf, 3, 4)));

/* The same with a place in the input. */
int tarry_fail_at(tarry_error *error, tarry_code code, tarry_place place, const char *format, ...)
    __attribute__((format(printf, 4, 5)));

/* The usual error for an allocation that failed. `what` names what was to be stored. */
int tarry_fail_memory(tarry_error *error, const char *what);

/* Put "context: " before the message of an error on its way up. Returns the error's code
 * (TARRY_RUN where `error` is NULL, since the code is not known then). */
int tarry_error_context(tarry_error *error, const char *format, ...)
    __attribute__((format(printf, 2, 3)));

#endif
