/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_MODEL_SHOWN_GENES_H
#define TARRY_MODEL_SHOWN_GENES_H

/* Which genes are drawn: those that were named, or the first few of which anything is recorded. */

#include "model/network.h"

enum { TARRY_SHOWN_MOST = 6 }; /* genes or signals, where none are named */

typedef struct tarry_shown {
    bool *genes;    /* [n_genes], named bursts included */
    bool *channels; /* [n_channels]: recorded, and of a gene shown or a signal that sees one; where
                       no gene is named also a few species of no gene, and signals of these */
    size_t n_genes, n_genes_left; /* shown, and recorded but left out */
    size_t n_signals, n_signals_left;
} tarry_shown;

/* TARRY_INPUT where a name is that of no gene or named burst. Release accepts a half-built one. */
int tarry_shown_init(tarry_shown *shown, const tarry_network *network, const char *const *names,
                     size_t n_names, tarry_error *error);
void tarry_shown_release(tarry_shown *shown);

#endif
