/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_CLI_TALK_H
#define TARRY_CLI_TALK_H

/* What the program says. Results go to standard output; everything else to standard error, each
 * line with the program's name before it. */

#include "tarry/error.h"

/* Exit statuses, as `tarry help` tells them. */
enum {
    TARRY_EXIT_DONE = 0,
    TARRY_EXIT_FAILED = 1,
    TARRY_EXIT_WRONG = 2, /* command line, model or data */
    TARRY_EXIT_INTERRUPTED = 3,
};

/* One line on standard error. */
void tarry_talk(const char *format, ...) __attribute__((format(printf, 1, 2)));

/* The same, returning `status`, so that a caller can write `return tarry_complain(...)`. */
int tarry_complain(int status, const char *format, ...) __attribute__((format(printf, 2, 3)));

/* Say what an error says; returns the exit status that belongs to it. */
int tarry_complain_error(const tarry_error *error);

/* Put text on standard output and flush it. A failure (full disk, closed pipe) is complained about
 * and gives TARRY_EXIT_FAILED. */
int tarry_output(const char *text);

#endif
