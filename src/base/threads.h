/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_BASE_THREADS_H
#define TARRY_BASE_THREADS_H

/* Threads that share out a piece of work. */

/* One thread's part of the work. The parts take what is to be done from a common store, so that all
 * is done whichever of them take part. */
typedef void (*tarry_part)(void *context, int index);

/* Run part(context, i) for i in 0 .. n - 1, each on a thread of its own, 0 on the caller's, and
 * wait for all. Where the system has no room for so many threads, those with the highest i are left
 * out: only 0 always takes part. */
void tarry_threads_run(int n, tarry_part part, void *context);

/* How many can work at the same time: the cores that this process may use. */
int tarry_threads_available(void);

#endif
