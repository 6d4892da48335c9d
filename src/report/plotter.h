/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_REPORT_PLOTTER_H
#define TARRY_REPORT_PLOTTER_H

/* Another program at work for us, in a folder, for so long at most. */

#include "base/text.h"
#include "tarry/error.h"

typedef enum tarry_plotter_end {
    TARRY_PLOTTER_DONE,    /* it ended by itself with status 0 */
    TARRY_PLOTTER_MISSING, /* it could not be started */
    TARRY_PLOTTER_FAILED,  /* another status */
    TARRY_PLOTTER_KILLED,  /* by a signal that was not ours */
    TARRY_PLOTTER_SLOW,    /* the time was over, and it was killed */
    TARRY_PLOTTER_STOPPED, /* `stop` was set, and it was killed */
} tarry_plotter_end;

typedef struct tarry_plotter_job {
    const char *program;      /* sought by PATH where it holds no slash; else from the root */
    const char *const *words; /* its arguments, the program's name first, NULL at the end */
    const char *folder;       /* where it runs */
    const char *log;          /* file there that takes what it says, made anew */
    double seconds;           /* how long it may take */
    const volatile int *stop; /* it is killed once this is not 0; may be NULL */
} tarry_plotter_job;

/* Run it and wait. No shell is involved; its standard input is empty; it is the head of a process
 * group of its own, all of which is killed where it must be. `*status` is its exit status, its
 * signal, or for MISSING the error number. Only TARRY_MEMORY is an error. */
int tarry_plotter_run(const tarry_plotter_job *job, tarry_plotter_end *end, int *status,
                      tarry_error *error);

#endif
