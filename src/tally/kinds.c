/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "tally/kinds.h"

#define ADDRESS(name) &tarry_tally_##name,
const tarry_tally_kind *const tarry_tally_kinds[] = {TARRY_TALLY_KINDS(ADDRESS)};
#undef ADDRESS

const size_t tarry_n_tally_kinds = sizeof tarry_tally_kinds / sizeof tarry_tally_kinds[0];
