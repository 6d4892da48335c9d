/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_TESTS_HAND_H
#define TARRY_TESTS_HAND_H

/* Networks and records written by hand, for tests of estimators: no model is read, no cell is run.
 * Names, recorded channels, tracks and windows are all that estimators look at. */

#include "engine/record.h"
#include "model/network.h"
#include "tally/results.h"
#include "tally/tally.h"

enum { HAND_MOST = 16 };

typedef struct hand {
    tarry_network network;
    tarry_gene genes[HAND_MOST];
    tarry_track tracks[HAND_MOST];
    tarry_promoter promoters[HAND_MOST];
    tarry_species species[HAND_MOST];
    tarry_signal signals[HAND_MOST];
    tarry_channel channels[HAND_MOST];
    tarry_window windows[HAND_MOST];
    double bounds[HAND_MOST];
    tarry_segment segments[HAND_MOST];
    tarry_response responses[HAND_MOST];
    tarry_first firsts[HAND_MOST];
    double snapshots[1];
} hand;

/* Times in minutes, one snapshot at `until`, one segment from -settle, as many lags as frames. One
 * span and one window, `all`. */
void hand_init(hand *h, double settle, double until, uint32_t n_frames);

/* In the place of the one window: spans between these bounds (n + 1, from 0 to until), each a
 * window w1, w2, ... */
void hand_windows(hand *h, const double *bounds, uint32_t n);

/* A protocol step. */
void hand_step(hand *h, double at);

/* The stretch after a step, and what is waited for (of gene 0). */
void hand_response(hand *h, double from, double to);
void hand_first(hand *h, const char *name);

/* Genes first, then named bursts; both return their index. */
uint32_t hand_gene(hand *h, const char *name, uint32_t copies, bool tells);
uint32_t hand_named(hand *h, const char *name);

/* Channels, recorded and correlating: species first, then signals. `gene` may be TARRY_NONE. */
void hand_species(hand *h, const char *name, int32_t gene);
void hand_signal(hand *h, const char *name, double background, double noise);

/* An empty record of the network: tracks closed, end at `until`. */
void hand_record(const hand *h, tarry_record *record, int64_t cell);
void hand_mark(tarry_record *record, double time, uint32_t track, bool opens, int64_t count);
/* A track's counters at each bound. */
void hand_counts(const hand *h, tarry_record *record, uint32_t track, const int64_t *counts);

/* What one kind of estimator finds in the records, given in order of cells. */
tarry_results *hand_results(const hand *h, const tarry_tally_kind *kind,
                            const tarry_record *records, size_t n);

/* The same, returning its code; *results is to be freed whatever that is. */
int hand_try(const hand *h, const tarry_tally_kind *kind, const tarry_record *records, size_t n,
             tarry_results **results);

/* The first row in which the first text columns hold these texts (as many as there are, NULL ends
 * the list); the test fails where there is none. */
size_t hand_row(const tarry_table *table, const char *first, const char *second, const char *third);

/* A number by row and name of the column. */
double hand_number(const tarry_table *table, size_t row, const char *column);

/* Is there a note with this text in it? */
bool hand_noted(const tarry_results *results, const char *text);

#endif
