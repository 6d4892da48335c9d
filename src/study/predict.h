/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_STUDY_PREDICT_H
#define TARRY_STUDY_PREDICT_H

/* The parts of a prediction, one for each group of tables; all take and give the same. */

#include "exact/gene.h"
#include "exact/view.h"
#include "model/variation.h"
#include "tally/results.h"
#include "tarry/predict.h"

/* One of the cells that stand for all: the whole network's where all cells are alike. */
typedef struct tarry_predict_cell {
    double weight; /* they add up to 1 */
    tarry_cell_network own;
    tarry_flow_index index;
    tarry_exact_gene *genes; /* [n_genes] */
} tarry_predict_cell;

typedef struct tarry_prediction {
    const tarry_network *network;
    tarry_flow_index index;
    tarry_arena arena;
    tarry_predict_cell *cells;
    size_t n_cells;
    tarry_exact_gene *genes; /* those of the first cell; of named bursts only `why` is there */
    double horizon;          /* the greatest age of a molecule: settling and record */
    bool is_quick;           /* leave out what takes long: wide laws, first responses of proteins */
    tarry_results *results;
} tarry_prediction;

/* As tarry_predict. `is_quick`: what takes long is left out, laws of more than 1024 counts and
 * first responses of proteins. */
int tarry_predict_network(const tarry_network *network, bool is_quick, tarry_results **results,
                          tarry_error *error);

/* Genes that have exact laws (`why` NULL) and those that have none, then products and signals that
 * have none though their gene has. What `tell` returns, if not 0, ends it and is returned. */
typedef int tarry_predict_tell(void *context, const char *name, const char *why);
int tarry_predict_covered(const tarry_network *network, tarry_predict_tell *tell, void *context,
                          tarry_error *error);

/* The first part: cells and genes. */
int tarry_predict_read_genes(tarry_prediction *prediction, tarry_error *error);

/* Release all but the results. */
void tarry_predict_release(tarry_prediction *prediction);

/* means.csv, distribution.csv, and the moments in bursts.csv and signals.csv. */
int tarry_predict_counts(tarry_prediction *prediction, tarry_error *error);

/* Burst figures in bursts.csv; burst_sizes.csv, dwells.csv. */
int tarry_predict_bursts(tarry_prediction *prediction, tarry_error *error);

/* autocorrelation.csv, and decay times in bursts.csv and signals.csv. */
int tarry_predict_films(tarry_prediction *prediction, tarry_error *error);

/* first.csv. */
int tarry_predict_first(tarry_prediction *prediction, tarry_error *error);

/* A note "NAME WHAT: left out, since WHY". `what` may be "". */
int tarry_predict_leave_out(tarry_prediction *prediction, const char *name, const char *what,
                            const char *why, tarry_error *error);

/* What a channel sees of each gene: views[n_genes] in the arena, and why it cannot be worked out
 * (*why NULL: it can). A channel that looks at a species of no gene is refused. */
int tarry_predict_views(tarry_prediction *prediction, const tarry_channel *channel,
                        tarry_exact_view **views, const char **why, tarry_error *error);

/* Times at which survival curves are told: 0, and ends of bins of a run's curves (tally/dwells.h)
 * up to `longest`, the last. */
enum { TARRY_PREDICT_BINS = 4, TARRY_PREDICT_POINTS = 121 };
void tarry_predict_grid(double longest, double times[TARRY_PREDICT_POINTS]);

#endif
