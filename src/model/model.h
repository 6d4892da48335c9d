/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_MODEL_MODEL_H
#define TARRY_MODEL_MODEL_H

#include "base/notes.h"
#include "model/network.h"
#include "tarry/model.h"

/* A model that has been read and checked. Everything but notes lives in the arena. */
struct tarry_model {
    tarry_arena arena;
    char *text; /* the file as read */
    size_t text_size;
    const char *file; /* name for messages */
    tarry_network network;
    tarry_notes notes; /* warnings made while reading */
};

#endif
