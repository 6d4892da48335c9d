/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_TESTS_WHOLE_PROGRAM_H
#define TARRY_TESTS_WHOLE_PROGRAM_H

/* The program as the shell calls it, inside the test's process, so that faults can strike it. Test
 * programs that use this are linked with src/cli (Makefile: WHOLE_PROGRAM_TESTS). */

#include <stddef.h>

/* From now on standard output goes nowhere and standard error into a file. Returns a file
 * descriptor for what was standard error. */
int program_listen(void);

/* `tarry` with these words, up to NULL. Returns the exit status; `said` gets what went to standard
 * error. Nothing is allocated here. */
int program_call(char *const *words, char *said, size_t size);

#endif
