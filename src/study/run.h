/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_STUDY_RUN_H
#define TARRY_STUDY_RUN_H

/* Running a network (tarry_run does it for a model), and the memory that takes. */

#include "model/network.h"
#include "tarry/run.h"

/* As tarry_run. */
int tarry_run_network(const tarry_network *network, const tarry_run_options *options,
                      tarry_results **results, tarry_error *error);

/* Threads that a run takes: those asked for, or all cores for 0; no more than there are cells. */
int tarry_run_threads(const tarry_network *network, int asked);

/* Bytes. */
typedef struct tarry_run_memory {
    double tallies; /* sums of all estimators in all groups */
    double thread;  /* record and scratch of one thread */
    double threads; /* of all */
    double kept;    /* what is kept of single cells */
    double all;
} tarry_run_memory;

/* `kept`: bytes of what is kept of single cells. */
tarry_run_memory tarry_run_memory_of(const tarry_network *network, int threads, double kept);

#endif
