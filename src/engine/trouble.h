/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_ENGINE_TROUBLE_H
#define TARRY_ENGINE_TROUBLE_H

#include "engine/cell_state.h"

/* Say why a cell stopped: what, in which cell, when, and in what state. Returns the code. */
int tarry_cell_trouble(const tarry_cell *cell, tarry_error *error);

#endif
