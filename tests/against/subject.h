/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TESTS_AGAINST_SUBJECT_H
#define TESTS_AGAINST_SUBJECT_H

/* The first gene of a model, as the exact laws take it. */

#include "exact/gene.h"
#include "exact/view.h"
#include "model/model.h"

typedef struct subject {
    tarry_model *model;
    tarry_flow_index index;
    tarry_arena arena;
    tarry_exact_gene gene;
} subject;

/* A model from its text without `tarry:` and `time:`. */
subject subject_read(const char *body);
void subject_release(subject *s);

/* What a channel sees of the gene; it must see something. */
tarry_exact_view subject_view(subject *s, const char *name);

#endif
