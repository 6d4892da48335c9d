/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "engine/trouble.h"

#include "base/error.h"
#include "base/number.h"
#include "base/text.h"

#include <inttypes.h>
#include <math.h>

/* A message names at most this many species of the state. */
enum { MOST_NAMED = 12 };

static void name_count(tarry_text *text, const tarry_cell *cell, uint32_t species) {
    tarry_text_add_string(text, text->size > 0 ? ", " : "");
    tarry_text_printf(text, "%s = ", cell->network->species[species].name);
    tarry_text_add_number(text, cell->counts[species]);
}

/* The state as far as it fits: what is not 0. */
static void name_state(tarry_text *text, const tarry_cell *cell) {
    uint32_t n = 0;
    for (uint32_t i = 0; i < cell->network->n_species; i++) {
        if (cell->counts[i] == 0 || cell->network->species[i].role == TARRY_SPECIES_ALLELE)
            continue;
        if (n++ == MOST_NAMED) {
            tarry_text_add_string(text, ", ...");
            return;
        }
        name_count(text, cell, i);
    }
    if (n == 0)
        tarry_text_add_string(text, "every count is 0");
}

/* The first reaction whose propensity cannot be used; n_reactions where only their sum cannot. */
static uint32_t find_broken(const tarry_cell *cell) {
    uint32_t r = 0;
    for (; r < cell->network->n_reactions; r++) {
        const double a = cell->engine->sampler->propensity(cell->sampler_state, r);
        if (!(a >= 0 && a < INFINITY))
            break;
    }
    return r;
}

static tarry_code tell_propensity(tarry_text *text, const tarry_cell *cell) {
    const uint32_t r = find_broken(cell);
    if (r == cell->network->n_reactions) {
        tarry_text_add_string(text, "the propensities add up to infinity");
        return TARRY_RUN;
    }
    tarry_text_printf(text, "the propensity of \"%s\" is ", cell->network->reactions[r].name);
    tarry_text_add_number(text, cell->engine->sampler->propensity(cell->sampler_state, r));
    tarry_text_add_string(text, "; it must be 0 or more and finite");
    return TARRY_RUN;
}

static tarry_code tell_what(tarry_text *text, const tarry_cell *cell) {
    const tarry_network *network = cell->network;
    const uint32_t i = cell->stop_index;
    switch (cell->stop) {
    case TARRY_STOP_PENDING:
        tarry_text_printf(text,
                          "more than %" PRId64 " completions are under way, the last of \"%s\"; "
                          "see `limits: {pending: ...}`",
                          cell->most_pending, network->lags[i].name);
        return TARRY_LIMIT;
    case TARRY_STOP_FIRINGS:
        tarry_text_printf(text,
                          "more than %" PRId64 " firings, the last of \"%s\"; "
                          "see `limits: {firings: ...}`",
                          cell->most_firings, network->reactions[i].name);
        return TARRY_LIMIT;
    case TARRY_STOP_COUNT:
        tarry_text_printf(text,
                          "the count of \"%s\" reached 2^53, from where on counts are not exact",
                          network->species[i].name);
        return TARRY_RUN;
    case TARRY_STOP_SHORT:
        tarry_text_printf(text,
                          "a completion uses more of \"%s\" than there is; say `if_short: skip` "
                          "to drop such completions",
                          network->species[i].name);
        return TARRY_RUN;
    case TARRY_STOP_PROPENSITY:
        return tell_propensity(text, cell);
    case TARRY_STOP_MEMORY:
    case TARRY_GO:
        break;
    }
    tarry_text_add_string(text, "out of memory");
    return TARRY_MEMORY;
}

/* Where the model says the thing that went wrong. */
static tarry_place place_of(const tarry_cell *cell) {
    const tarry_network *network = cell->network;
    switch (cell->stop) {
    case TARRY_STOP_PENDING:
        return network->lags[cell->stop_index].place;
    case TARRY_STOP_FIRINGS:
        return network->reactions[cell->stop_index].place;
    case TARRY_STOP_COUNT:
    case TARRY_STOP_SHORT:
        return network->species[cell->stop_index].place;
    case TARRY_STOP_PROPENSITY:
        if (find_broken(cell) < network->n_reactions)
            return network->reactions[find_broken(cell)].place;
        break;
    case TARRY_STOP_MEMORY:
    case TARRY_GO:
        break;
    }
    return (tarry_place){0};
}

int tarry_cell_trouble(const tarry_cell *cell, tarry_error *error) {
    char now[TARRY_NUMBER_SIZE];
    tarry_number_write(cell->now, now);
    if (cell->stop == TARRY_STOP_MEMORY) /* the state as text would need some */
        return tarry_fail(error, TARRY_MEMORY,
                          "cell %" PRId64
                          ", time %s %s: there is not enough memory for what is under way",
                          cell->number, now, cell->network->time_unit);
    tarry_text what = {0};
    tarry_text state = {0};
    const tarry_code code = tell_what(&what, cell);
    name_state(&state, cell);
    tarry_fail_at(error, code, place_of(cell), "cell %" PRId64 ", time %s %s: %s (state: %s)",
                  cell->number, now, cell->network->time_unit,
                  what.failed || !what.data ? "it cannot go on" : what.data,
                  state.failed || !state.data ? "unknown" : state.data);
    tarry_text_release(&what);
    tarry_text_release(&state);
    return (int)code;
}
