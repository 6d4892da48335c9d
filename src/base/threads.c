/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Plain POSIX threads, made anew for each piece of work (tens of microseconds each). OpenMP would
 * end the process where memory or threads run out, which is not for a library to do. */
#define _GNU_SOURCE /* sched_getaffinity */

#include "base/threads.h"

#include "base/memory.h"

#include <pthread.h>
#include <sched.h>
#include <stdlib.h>
#include <unistd.h>

typedef struct helper {
    pthread_t thread;
    tarry_part part;
    void *context;
    int index;
} helper;

static void *help(void *memory) {
    const helper *h = memory;
    h->part(h->context, h->index);
    return NULL;
}

void tarry_threads_run(int n, tarry_part part, void *context) {
    helper *helpers = n > 1 ? tarry_calloc((size_t)n, sizeof *helpers) : NULL;
    int n_started = 1;
    for (; helpers && n_started < n; n_started++) {
        helper *h = &helpers[n_started];
        *h = (helper){.part = part, .context = context, .index = n_started};
        if (pthread_create(&h->thread, NULL, help, h))
            break;
    }
    part(context, 0);
    for (int i = 1; helpers && i < n_started; i++)
        pthread_join(helpers[i].thread, NULL);
    free(helpers);
}

/* Those that the process may use, which can be fewer than the machine has (batch systems see to
 * that); all of the machine's where that cannot be known. */
int tarry_threads_available(void) {
    cpu_set_t ours;
    if (!sched_getaffinity(0, sizeof ours, &ours) && CPU_COUNT(&ours) > 0)
        return CPU_COUNT(&ours);
    const long n = sysconf(_SC_NPROCESSORS_ONLN);
    return n < 1 ? 1 : n > CPU_SETSIZE ? CPU_SETSIZE : (int)n;
}
