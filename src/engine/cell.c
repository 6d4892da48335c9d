/* SPDX-License-Identifier: GPL-3.0-or-later */

/* The loop: one cell from its start to its end, as docs/engine.md lays down.
 *
 * Exact because exponential times have no memory: a reaction time that a completion or a protocol
 * step cuts short is discarded and drawn anew (Gillespie 1977, J. Phys. Chem. 81:2340; with delays
 * Bratsun et al. 2005, PNAS 102:14593; Cai 2007, J. Chem. Phys. 126:124108). */

#include "engine/amount.h"
#include "engine/cell_state.h"
#include "engine/trouble.h"
#include "engine/vary.h"

#include "base/error.h"
#include "base/memory.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

static const double most_count = 0x1p53 - 1; /* 2^53 + 1 would be 2^53 again */

static void stop(tarry_cell *cell, tarry_stop why, uint32_t index) {
    if (cell->stop == TARRY_GO) {
        cell->stop = why;
        cell->stop_index = index;
    }
}

/* ---- lags ------------------------------------------------------------------------------------ */

static void wait_until(tarry_cell *cell, uint32_t lag, double due, bool is_fixed, bool is_lost) {
    if (tarry_pending_add(&cell->pending, is_lost ? cell->n_lags + lag : lag, due, is_fixed))
        stop(cell, TARRY_STOP_MEMORY, lag);
    else if (cell->pending.n > cell->most_pending)
        stop(cell, TARRY_STOP_PENDING, lag);
}

/* When a molecule that enters now would be lost. */
static double draw_loss(tarry_cell *cell, const tarry_lag *lag) {
    const double rate = cell->network->segments[cell->segment].rates[lag->loss_rate];
    const double wait = -tarry_log(tarry_unit(tarry_stream_next(&cell->events)));
    return rate > 0 ? cell->now + wait / rate : INFINITY;
}

/* The lag of a molecule that keeps behind the one before it, or one that may be lost: the loss
 * competes with the end that has been drawn. */
static void schedule_rare(tarry_cell *cell, uint32_t lag, double length, bool is_fixed) {
    const tarry_lag *rare = &cell->network->lags[lag];
    double due = cell->now + length;
    if (rare->in_order) {
        const double earliest = cell->last_due[lag] + rare->headway;
        if (due < earliest)
            due = earliest;
        cell->last_due[lag] = due;
    }
    const double loss = rare->may_be_lost ? draw_loss(cell, rare) : INFINITY;
    const bool is_lost = loss < due;
    const double leaves = is_lost ? loss : due;
    wait_until(cell, lag, leaves, is_fixed && !is_lost && !rare->in_order, is_lost);
    if (cell->record)
        tarry_cell_note_lag(cell, lag, length, due, leaves, true);
}

static inline void schedule(tarry_cell *cell, uint32_t lag) {
    const uint32_t delay = cell->engine->lags[lag].delay;
    const double fixed = cell->fixed[delay];
    const bool is_fixed = fixed >= 0;
    const double length = is_fixed ? fixed : tarry_draw(cell->drawers[delay], &cell->events);
    if (cell->engine->lags[lag].is_rare) {
        schedule_rare(cell, lag, length, is_fixed);
        return;
    }
    const double due = cell->now + length;
    wait_until(cell, lag, due, is_fixed, false);
    if (cell->record)
        tarry_cell_note_lag(cell, lag, length, due, due, true);
}

/* A dwell that was under way when the cell started. */
static void schedule_remaining(tarry_cell *cell, uint32_t lag, double length) {
    const double due = cell->now + length;
    wait_until(cell, lag, due, false, false);
    if (cell->record)
        tarry_cell_note_lag(cell, lag, length, due, due, false);
}

/* ---- effects --------------------------------------------------------------------------------- */

static void set_track(tarry_cell *cell, uint32_t track, bool opens) {
    const tarry_track_status status = opens ? TARRY_TRACK_OPEN : TARRY_TRACK_CLOSED;
    if (cell->status[track] == status) {
        if (cell->record)
            cell->record->ignored++;
        return;
    }
    cell->status[track] = status;
    tarry_cell_note_mark(cell, track, opens);
}

static void mark(tarry_cell *cell, const tarry_packed_effect *effect) {
    for (uint32_t i = 0; i < effect->n_marks; i++) {
        const tarry_mark_rule rule = effect->marks[i];
        if (rule.kind == TARRY_MARK_COUNT)
            cell->counters[rule.track]++;
        else if (rule.kind == TARRY_MARK_FIRST)
            tarry_cell_note_first(cell, rule.track);
        else
            set_track(cell, rule.track, rule.kind == TARRY_MARK_OPEN);
    }
}

static inline void change(tarry_cell *cell, uint32_t species, double amount) {
    const double count = cell->counts[species] += amount;
    if (count > most_count)
        stop(cell, TARRY_STOP_COUNT, species);
}

/* Demands and random amounts. Returns false where the whole effect is to be skipped. */
static bool meets_demands(tarry_cell *cell, const tarry_effect *effect) {
    const tarry_network *network = cell->network;
    for (uint32_t i = effect->demands.from; i < effect->demands.to; i++) {
        const tarry_demand demand = network->demands[i];
        if (cell->counts[demand.species] >= demand.amount)
            continue;
        if (!effect->skip_short)
            stop(cell, TARRY_STOP_SHORT, demand.species);
        return false;
    }
    return true;
}

static void make_amounts(tarry_cell *cell, const tarry_effect *effect) {
    for (uint32_t i = effect->amounts.from; i < effect->amounts.to; i++) {
        const tarry_amount *amount = &cell->network->amounts[i];
        const double mean = amount->kind == TARRY_AMOUNT_TABLE ? 0 : cell->means[amount->mean];
        change(cell, amount->species,
               tarry_amount_draw(amount, mean, tarry_stream_next(&cell->events)));
    }
}

/* Carry one effect out; false where it was skipped. */
static inline bool carry_out(tarry_cell *cell, uint32_t index) {
    const tarry_packed_effect *effect = &cell->engine->effects[index];
    if (effect->is_rare && !meets_demands(cell, effect->whole))
        return false;
    for (uint32_t i = 0; i < effect->n_changes; i++)
        change(cell, effect->changes[i].species, effect->changes[i].amount);
    if (effect->is_rare)
        make_amounts(cell, effect->whole);
    if (effect->n_marks > 0)
        mark(cell, effect);
    for (uint32_t i = 0; i < effect->n_schedules; i++)
        schedule(cell, effect->schedules[i]);
    cell->engine->sampler->changed(cell->sampler_state, cell->counts, effect->affected,
                                   effect->n_affected);
    return true;
}

/* The effect with which a lag ends, or TARRY_NONE. */
static int64_t choose_outcome(tarry_cell *cell, const tarry_packed_lag *lag) {
    const double u = tarry_unit(tarry_stream_next(&cell->events));
    for (uint32_t i = 0; i < lag->n_outcomes; i++)
        if (u < lag->outcomes[i].cumulative)
            return lag->outcomes[i].effect;
    return TARRY_NONE;
}

static void lose(tarry_cell *cell, uint32_t lag) {
    carry_out(cell, cell->network->lags[lag].loss_effect);
    tarry_cell_note_loss(cell, lag);
}

static inline void complete(tarry_cell *cell) {
    const uint32_t index = tarry_pending_take(&cell->pending);
    if (index >= cell->n_lags) {
        lose(cell, index - cell->n_lags);
        return;
    }
    const tarry_packed_lag *lag = &cell->engine->lags[index];
    cell->completions[index]++;
    const int64_t effect = lag->is_certain ? lag->effect : choose_outcome(cell, lag);
    if (effect != TARRY_NONE && !carry_out(cell, (uint32_t)effect) && cell->record)
        cell->record->skipped[index]++;
}

/* ---- start ----------------------------------------------------------------------------------- */

static const tarry_promoter_state *state_of(const tarry_cell *cell, uint32_t promoter,
                                            uint32_t state) {
    return &cell->network->states[cell->network->promoters[promoter].states.from + state];
}

static void start_promoter(tarry_cell *cell, uint32_t index, tarry_stream *start) {
    const tarry_promoter *promoter = &cell->network->promoters[index];
    const uint32_t n_states = promoter->states.to - promoter->states.from;
    const double u = tarry_unit(tarry_stream_next(start));
    uint32_t i = 0;
    while (i + 1 < n_states && !(u < promoter->start[i]))
        i++;
    const tarry_promoter_state *state = state_of(cell, index, i);
    cell->counts[state->species] += 1;
    if (state->sum != state->species)
        cell->counts[state->sum] += 1;
    cell->status[promoter->track] = state->active ? TARRY_TRACK_OPEN : TARRY_TRACK_CLOSED;
    if (state->lag == TARRY_NONE)
        return;
    const uint32_t lag = (uint32_t)state->lag;
    if (!promoter->steady) {
        schedule(cell, lag);
        return;
    }
    const tarry_drawer *drawer = cell->drawers[cell->network->lags[lag].delay];
    schedule_remaining(cell, lag, tarry_draw_remaining(drawer, start));
}

static void use_segment(tarry_cell *cell, uint32_t segment) {
    const tarry_network *network = cell->network;
    cell->segment = segment;
    cell->drawers = cell->engine->drawers + (size_t)segment * network->n_delays;
    cell->fixed = cell->engine->fixed + (size_t)segment * network->n_delays;
    cell->means = network->segments[segment].means;
    cell->next_segment = segment + 1 < network->n_segments ? network->segments[segment + 1].start
                                                           : INFINITY;
}

static void start(tarry_cell *cell) {
    const tarry_network *network = cell->network;
    const uint64_t seed = network->run.seed;
    tarry_stream start;
    tarry_stream_init(&cell->events, seed, (uint64_t)cell->number, TARRY_STREAM_EVENTS);
    tarry_stream_init(&start, seed, (uint64_t)cell->number, TARRY_STREAM_START);
    cell->now = 0 - network->run.settle; /* not -0, which sorts before 0 */
    cell->end = network->run.until;
    cell->stop = TARRY_GO;
    cell->n_firings = 0;
    tarry_pending_clear(&cell->pending);
    tarry_cell_begin_record(cell);
    for (uint32_t i = 0; i < network->n_species; i++)
        cell->counts[i] = network->species[i].start;
    for (uint32_t i = 0; i < network->n_tracks; i++) {
        cell->status[i] = TARRY_TRACK_UNKNOWN;
        cell->counters[i] = 0;
    }
    for (uint32_t i = 0; i < network->n_lags; i++)
        cell->last_due[i] = -INFINITY;
    use_segment(cell, 0);
    for (uint32_t i = 0; i < network->n_promoters; i++)
        start_promoter(cell, i, &start);
    cell->engine->sampler->reset(cell->sampler_state, cell->counts, 0);
}

/* ---- protocol -------------------------------------------------------------------------------- */

static uint32_t current_state(const tarry_cell *cell, uint32_t promoter) {
    uint32_t i = 0;
    while (cell->counts[state_of(cell, promoter, i)->species] == 0)
        i++;
    return i;
}

static void count_state(tarry_cell *cell, const tarry_promoter_state *state, double amount) {
    cell->counts[state->species] += amount;
    if (state->sum != state->species)
        cell->counts[state->sum] += amount;
}

static void move_promoter(tarry_cell *cell, const tarry_setting *setting) {
    const uint32_t promoter = setting->promoter;
    const tarry_promoter_state *from = state_of(cell, promoter, current_state(cell, promoter));
    const tarry_promoter_state *to = state_of(cell, promoter, setting->state);
    count_state(cell, from, -1);
    count_state(cell, to, 1);
    if (from->lag != TARRY_NONE) {
        const double due = tarry_pending_cancel(&cell->pending, (uint32_t)from->lag);
        if (due < INFINITY)
            tarry_cell_note_cancel(cell, (uint32_t)from->lag, due);
    }
    if (from->active != to->active)
        set_track(cell, cell->network->promoters[promoter].track, to->active);
    if (to->lag != TARRY_NONE)
        schedule(cell, (uint32_t)to->lag);
}

/* Lags that change their length, or cease or begin to be fixed, leave their rings. */
static void pour_rings(tarry_cell *cell, const double *before) {
    for (uint32_t lag = 0; lag < cell->network->n_lags; lag++) {
        const uint32_t delay = cell->network->lags[lag].delay;
        if (before[delay] >= 0 && before[delay] != cell->fixed[delay] &&
            tarry_pending_pour(&cell->pending, lag))
            stop(cell, TARRY_STOP_MEMORY, lag);
    }
}

static void enter_segment(tarry_cell *cell) {
    const double *before = cell->fixed;
    use_segment(cell, cell->segment + 1);
    pour_rings(cell, before);
    const tarry_segment *segment = &cell->network->segments[cell->segment];
    for (uint32_t i = segment->settings.from; i < segment->settings.to; i++) {
        const tarry_setting *setting = &cell->network->settings[i];
        if (setting->species != TARRY_NONE)
            cell->counts[setting->species] = setting->value;
        else
            move_promoter(cell, setting);
    }
    if (segment->moment == TARRY_MOMENT_STEP)
        tarry_cell_begin_response(cell);
    cell->engine->sampler->reset(cell->sampler_state, cell->counts, cell->segment);
}

/* ---- the loop -------------------------------------------------------------------------------- */

static inline double earliest_limit(const tarry_cell *cell) {
    double limit = tarry_pending_due(&cell->pending);
    if (cell->next_segment < limit)
        limit = cell->next_segment;
    if (cell->end < limit)
        limit = cell->end;
    return limit;
}

static inline void go_to(tarry_cell *cell, double t) {
    if (t > cell->watch)
        tarry_cell_observe(cell, t);
    cell->now = t;
}

static inline void fire(tarry_cell *cell, uint32_t reaction) {
    cell->firings[reaction]++;
    if (++cell->n_firings > cell->most_firings)
        stop(cell, TARRY_STOP_FIRINGS, reaction);
    carry_out(cell, cell->engine->reaction_effects[reaction]);
}

/* Step to the next reaction or to whatever falls before it. */
static inline void step(tarry_cell *cell) {
    const double limit = earliest_limit(cell);
    double t = limit;
    const int32_t reaction = cell->engine->sampler->next(cell->sampler_state, &cell->events,
                                                         cell->now, limit, &t);
    if (reaction >= 0) {
        go_to(cell, t);
        fire(cell, (uint32_t)reaction);
    } else if (reaction == TARRY_NONE) {
        go_to(cell, limit);
    } else {
        stop(cell, TARRY_STOP_PROPENSITY, 0);
    }
}

/* Run until `end`; what happens at `end` itself is carried out. */
static void run_to_end(tarry_cell *cell) {
    for (;;) {
        while (tarry_pending_due(&cell->pending) <= cell->now && cell->stop == TARRY_GO)
            complete(cell);
        if (cell->stop != TARRY_GO)
            return;
        if (cell->next_segment <= cell->now) {
            enter_segment(cell);
            continue;
        }
        if (cell->now >= cell->end)
            return;
        step(cell);
    }
}

/* Tracks with a period or an interval that began in the record wait for their next opening. */
static void begin_run_on(tarry_cell *cell) {
    const tarry_network *network = cell->network;
    for (uint32_t i = 0; i < network->n_tracks; i++)
        cell->runs_on[i] = false;
    cell->firsts = NULL;
    for (size_t i = 0; i < cell->record->n_marks; i++) {
        const uint32_t track = cell->record->marks[i].track;
        if (network->tracks[track].tells && !cell->runs_on[track]) {
            cell->runs_on[track] = true;
            cell->n_running_on++;
        }
    }
    if (cell->n_running_on > 0)
        cell->end = 2 * network->run.until;
}

static int run_cell(tarry_cell *cell, tarry_error *error) {
    const int code = cell->vary ? tarry_vary_set(cell->vary, cell->number, error) : TARRY_OK;
    if (code)
        return code;
    start(cell);
    if (cell->record && cell->now >= 0) /* no settling: what happens at 0 is an event at 0 */
        tarry_cell_observe(cell, cell->now);
    run_to_end(cell);
    if (cell->stop == TARRY_GO && cell->record) {
        tarry_cell_observe(cell, INFINITY);
        tarry_cell_miss(cell);
        begin_run_on(cell);
        run_to_end(cell);
        cell->record->end = cell->now;
    }
    return cell->stop == TARRY_GO ? TARRY_OK : tarry_cell_trouble(cell, error);
}

int tarry_cell_run(tarry_cell *cell, int64_t number, tarry_record *record, tarry_error *error) {
    tarry_record_reset(record, cell->network);
    record->cell = number;
    cell->number = number;
    cell->record = record;
    cell->firings = record->firings;
    cell->completions = record->completions;
    const int code = run_cell(cell, error);
    cell->record = NULL;
    return code;
}

static int64_t sum(const int64_t *counts, uint32_t n) {
    int64_t total = 0;
    for (uint32_t i = 0; i < n; i++)
        total += counts[i];
    return total;
}

int tarry_cell_run_bare(tarry_cell *cell, int64_t number, int64_t *firings, int64_t *completions,
                        tarry_error *error) {
    const tarry_network *network = cell->network;
    cell->number = number;
    cell->record = NULL;
    cell->firings = cell->own_counts;
    cell->completions = cell->own_counts + network->n_reactions;
    memset(cell->own_counts, 0,
           ((size_t)network->n_reactions + network->n_lags + 1) * sizeof *cell->own_counts);
    const int code = run_cell(cell, error);
    *firings = sum(cell->firings, network->n_reactions);
    *completions = sum(cell->completions, network->n_lags);
    return code;
}

/* ---- making ---------------------------------------------------------------------------------- */

static int allocate(tarry_cell *cell, tarry_error *error) {
    const tarry_network *network = cell->network;
    const size_t n_signals = network->n_signals;
    cell->counts = tarry_calloc((size_t)network->n_species + 1, sizeof *cell->counts);
    cell->status = tarry_calloc((size_t)network->n_tracks + 1, sizeof *cell->status);
    cell->counters = tarry_calloc((size_t)network->n_tracks + 1, sizeof *cell->counters);
    cell->runs_on = tarry_calloc((size_t)network->n_tracks + 1, sizeof *cell->runs_on);
    cell->frame_ramps = tarry_calloc(n_signals * network->run.n_frames + 1,
                                     sizeof *cell->frame_ramps);
    cell->snapshot_ramps = tarry_calloc(n_signals * network->run.n_snapshots + 1,
                                        sizeof *cell->snapshot_ramps);
    cell->last_due = tarry_calloc(network->n_lags, sizeof *cell->last_due);
    cell->own_counts = tarry_calloc((size_t)network->n_reactions + network->n_lags + 1,
                                    sizeof *cell->own_counts);
    if (!cell->counts || !cell->status || !cell->counters || !cell->runs_on || !cell->frame_ramps ||
        !cell->snapshot_ramps || !cell->last_due || !cell->own_counts)
        return tarry_fail_memory(error, "a cell");
    return TARRY_OK;
}

static int64_t whole_limit(double limit) {
    return limit < 0x1p38 ? (int64_t)limit : INT64_C(1) << 38;
}

/* Kinds of completions: one a lag, and where any molecule may be lost as many for losses. */
static uint32_t n_kinds(const tarry_network *network) {
    for (uint32_t i = 0; i < network->n_lags; i++)
        if (network->lags[i].may_be_lost)
            return 2 * network->n_lags;
    return network->n_lags;
}

int tarry_cell_new(const tarry_engine *engine, tarry_cell **out, tarry_error *error) {
    tarry_cell *cell = tarry_calloc(1, sizeof *cell);
    if (!cell)
        return tarry_fail_memory(error, "a cell");
    int code = engine->network->variation ? tarry_vary_new(engine, &cell->vary, error) : TARRY_OK;
    if (cell->vary)
        engine = &cell->vary->engine;
    cell->engine = engine;
    cell->network = engine->network;
    cell->n_lags = engine->network->n_lags;
    cell->most_firings = whole_limit(engine->network->run.limit_firings);
    cell->most_pending = whole_limit(engine->network->run.limit_pending);
    if (code || (code = allocate(cell, error)) ||
        (code = tarry_pending_init(&cell->pending, n_kinds(engine->network), error)) ||
        (code = engine->sampler->set_up(&engine->propensities, &cell->sampler_state, error))) {
        tarry_cell_free(cell);
        return code;
    }
    *out = cell;
    return TARRY_OK;
}

void tarry_cell_free(tarry_cell *cell) {
    if (!cell)
        return;
    cell->engine->sampler->release(cell->sampler_state);
    tarry_pending_release(&cell->pending);
    free(cell->counts);
    free(cell->status);
    free(cell->counters);
    free(cell->runs_on);
    free(cell->last_due);
    free(cell->frame_ramps);
    free(cell->snapshot_ramps);
    free(cell->own_counts);
    tarry_vary_free(cell->vary);
    free(cell);
}
