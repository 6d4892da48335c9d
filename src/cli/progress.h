/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_CLI_PROGRESS_H
#define TARRY_CLI_PROGRESS_H

/* A bar with the time left, on standard error, where that is a terminal and the work is long. */

#include <stdbool.h>
#include <stdint.h>

typedef struct tarry_progress {
    bool shows;   /* wanted, and there is a terminal to show it on */
    bool drawn;   /* there is a bar to wipe off */
    double start; /* seconds on the monotonic clock */
    double last;  /* when the bar was last drawn */
} tarry_progress;

/* Seconds on a clock that only goes forward. */
double tarry_clock(void);

void tarry_progress_start(tarry_progress *progress, bool wanted);

/* For tarry_run_options.progress; `context` is a tarry_progress. */
void tarry_progress_show(void *context, int64_t n_done, int64_t n_all);

/* Wipe the bar off. */
void tarry_progress_end(tarry_progress *progress);

/* "12 s", "3 min 20 s", "2 h 5 min": seconds in words. */
const char *tarry_progress_duration(double seconds, char out[32]);

#endif
