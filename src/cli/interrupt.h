/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_CLI_INTERRUPT_H
#define TARRY_CLI_INTERRUPT_H

/* Being told to stop. */

#include <stdbool.h>

/* From now on the first SIGINT, SIGTERM or SIGHUP sets a flag, and a second one ends the program at
 * once. A signal that was ignored when the program started stays ignored (nohup, and commands that
 * a script put into the background). With `say` the first signal is answered on standard error.
 * Returns the flag, which is 0 until then. */
const volatile int *tarry_interrupt_watch(bool say);

#endif
