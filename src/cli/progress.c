/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "cli/progress.h"

#include <inttypes.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>
#include <unistd.h>

#define LONG_WORK 3.0 /* seconds that all of it must take before a bar is worth showing */
#define FIRST_LOOK 0.5
#define BETWEEN 0.2
enum { BAR = 30 };

double tarry_clock(void) {
    struct timespec now;
    if (clock_gettime(CLOCK_MONOTONIC, &now))
        return 0;
    return (double)now.tv_sec + 1e-9 * (double)now.tv_nsec;
}

void tarry_progress_start(tarry_progress *progress, bool wanted) {
    const char *terminal = getenv("TERM");
    const bool dumb = !terminal || !strcmp(terminal, "dumb");
    progress->shows = wanted && !dumb && isatty(STDERR_FILENO);
    progress->drawn = false;
    progress->start = tarry_clock();
    progress->last = progress->start;
}

const char *tarry_progress_duration(double seconds, char out[32]) {
    const long whole = (long)(seconds + 0.5);
    if (seconds < 9.95)
        snprintf(out, 32, "%.1f s", seconds);
    else if (whole < 100)
        snprintf(out, 32, "%ld s", whole);
    else if (whole < 6000)
        snprintf(out, 32, "%ld min %ld s", whole / 60, whole % 60);
    else
        snprintf(out, 32, "%ld h %ld min", whole / 3600, whole / 60 % 60);
    return out;
}

static void draw(int64_t n_done, int64_t n_all, double left) {
    char bar[BAR + 1], duration[32];
    const double share = (double)n_done / (double)n_all;
    const int full = (int)(share * BAR);
    memset(bar, '.', BAR);
    memset(bar, '=', (size_t)full);
    bar[BAR] = '\0';
    fprintf(stderr, "\r\033[K%3.0f %% %s %" PRId64 " of %" PRId64 " cells, %s left", 100 * share,
            bar, n_done, n_all, tarry_progress_duration(left, duration));
    fflush(stderr);
}

void tarry_progress_show(void *context, int64_t n_done, int64_t n_all) {
    tarry_progress *progress = context;
    if (!progress->shows || n_done <= 0 || n_all <= 0)
        return;
    const double now = tarry_clock();
    const double spent = now - progress->start;
    if (spent < FIRST_LOOK || (progress->drawn && now - progress->last < BETWEEN))
        return;
    const double whole = spent * (double)n_all / (double)n_done;
    if (!progress->drawn && whole < LONG_WORK)
        return;
    progress->drawn = true;
    progress->last = now;
    draw(n_done, n_all, whole - spent);
}

void tarry_progress_end(tarry_progress *progress) {
    if (!progress->drawn)
        return;
    fputs("\r\033[K", stderr);
    fflush(stderr);
    progress->drawn = false;
}
