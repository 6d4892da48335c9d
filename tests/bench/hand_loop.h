/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_BENCH_HAND_LOOP_H
#define TARRY_BENCH_HAND_LOOP_H

/* What a good programmer would write for one model: a two-state gene with a lag on its transcripts
 * and one on its proteins, and nothing else. Reviewed once and then left as it is: the bench prints
 * the hash of hand_loop.c. */

#include <stdint.h>

typedef struct hand_model {
    double k_open, k_shut, k_init, transcript_decay, k_translate, protein_decay;
    double transcript_lag, protein_lag;       /* means */
    double transcript_lag_sd, protein_lag_sd; /* of the gamma laws; unused where lags are fixed */
} hand_model;

typedef struct hand_result {
    int64_t firings, completions;
    double transcripts, proteins; /* at the end */
} hand_result;

/* One cell from an inactive, empty start to `until`; returns 0, or 1 when memory is short. */
int hand_loop_fixed(const hand_model *model, double until, uint64_t seed, hand_result *result);
int hand_loop_fixed_rings(const hand_model *model, double until, uint64_t seed,
                          hand_result *result);
int hand_loop_gamma(const hand_model *model, double until, uint64_t seed, hand_result *result);

/* Fill the ziggurat tables; call once, first. */
void hand_loop_set_up(void);

#endif
