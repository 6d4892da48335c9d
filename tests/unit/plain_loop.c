/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "plain_loop.h"

#include "base/error.h"
#include "base/logarithm.h"
#include "base/random.h"
#include "engine/amount.h"
#include "engine/draw.h"
#include "model/variation.h"

#include <gsl/gsl_cdf.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

enum { MOST_IN_A_SUM = 64 }; /* above this many reactions the choice goes through a tree */

typedef struct completion {
    uint32_t lag;
    double begin, due;
    double leaves; /* before it is due where the molecule is lost */
} completion;

typedef struct plain {
    const tarry_network *common;  /* of all cells */
    const tarry_network *network; /* of this one */
    tarry_cell_network own;       /* where they differ, */
    tarry_drawer_set *tables;     /* and the tables of the laws they share */
    const tarry_segment *segment; /* in force */
    uint32_t n_segments_past;     /* segments put in force, the first included */
    double now, end;
    double *counts;
    tarry_stream events;
    uint64_t noise_key;

    completion *pending; /* in the order scheduled */
    size_t n_pending;

    double *propensities; /* padded with zeros to a power of two, the tree's nodes before them */
    size_t n_leaves;

    tarry_track_status *status;
    int64_t *counters;
    double *last_due; /* [lag] */
    bool *runs_on;
    bool running_on;
    bool status_noted;

    uint32_t frame, snapshot, bound; /* next to be observed */

    tarry_drawer_set *set;
    const tarry_drawer **drawers; /* [segment][delay] */
    tarry_record *record;
} plain;

static const tarry_drawer *drawer_of(const plain *p, uint32_t lag) {
    const size_t segment = p->n_segments_past - 1;
    return p->drawers[segment * p->network->n_delays + p->network->lags[lag].delay];
}

/* ---- what is recorded ---- */

static double noise_of(const plain *p, uint32_t signal, double time) {
    uint64_t bits;
    memcpy(&bits, &time, sizeof bits);
    const uint64_t own = tarry_mix64(p->noise_key +
                                     (signal + UINT64_C(1)) * UINT64_C(0x9e3779b97f4a7c15));
    return gsl_cdf_ugaussian_Pinv(tarry_unit(tarry_mix64(own ^ bits)));
}

static double shine(const tarry_ramp *ramp, const completion *c, double time) {
    const double f = (time - c->begin) / (c->due - c->begin);
    if (ramp->from == ramp->to)
        return f >= ramp->from ? ramp->brightness * 1 : ramp->brightness * 0;
    if (f <= ramp->from)
        return ramp->brightness * 0;
    if (f >= ramp->to)
        return ramp->brightness * 1;
    return ramp->brightness * ((f - ramp->from) / (ramp->to - ramp->from));
}

static double signal_value(const plain *p, uint32_t number, double time) {
    const tarry_network *network = p->network;
    const tarry_signal *signal = &network->signals[number];
    double value = signal->background, ramps = 0;
    for (uint32_t i = signal->weights.from; i < signal->weights.to; i++)
        value += network->weights[i].weight * p->counts[network->weights[i].species];
    for (size_t i = 0; i < p->n_pending; i++) {
        const completion *c = &p->pending[i];
        for (uint32_t j = signal->ramps.from; j < signal->ramps.to; j++) {
            const tarry_ramp *ramp = &network->ramps[network->signal_ramps[j]];
            if (ramp->lag == c->lag && c->begin <= time && time < c->leaves)
                ramps += shine(ramp, c, time);
        }
    }
    value += ramps;
    const double fixed = signal->noise, share = signal->share * value;
    if (fixed > 0 || signal->share > 0)
        value += (signal->share > 0 ? sqrt(fixed * fixed + share * share) : fixed) *
                 noise_of(p, number, time);
    return value;
}

static double channel_value(const plain *p, const tarry_channel *channel, double time) {
    if (channel->signal >= 0)
        return signal_value(p, (uint32_t)channel->signal, time);
    return p->counts[channel->species];
}

static double frame_time(const tarry_run_plan *run, uint32_t i) {
    return i + 1 == run->n_frames ? run->until : i * run->every;
}

/* A signal that must be detected: what a search for it does not find, after all is recorded. */
static void leave_out(const tarry_network *network, tarry_record *record) {
    const tarry_run_plan *run = &network->run;
    size_t row = 0;
    for (uint32_t c = 0; c < network->n_channels; c++) {
        double *frames = record->frames + row * run->n_frames;
        double *snapshots = record->snapshots + (size_t)c * run->n_snapshots;
        const int32_t number = network->channels[c].signal;
        row += network->channels[c].recorded;
        if (number < 0 || isnan(network->signals[number].detects_above))
            continue;
        const double level = network->signals[number].detects_above;
        uint32_t first = 0;
        while (network->channels[c].recorded && first < run->n_frames && !(frames[first] > level))
            first++;
        const bool never = first == run->n_frames, later = network->signals[number].from_first;
        for (uint32_t i = 0; i < run->n_snapshots; i++)
            if (later ? never || run->snapshots[i] < frame_time(run, first)
                      : !(snapshots[i] > level))
                snapshots[i] = NAN;
        for (uint32_t i = 0; network->channels[c].recorded && i < run->n_frames; i++)
            if (later ? i < first : !(frames[i] > level))
                frames[i] = NAN;
    }
}

static void observe_frame(plain *p) {
    const tarry_network *network = p->network;
    const double time = frame_time(&network->run, p->frame);
    size_t row = 0;
    for (uint32_t i = 0; i < network->n_channels; i++)
        if (network->channels[i].recorded)
            p->record->frames[row++ * network->run.n_frames + p->frame] = channel_value(
                p, &network->channels[i], time);
    p->frame++;
}

static void observe_snapshot(plain *p) {
    const tarry_network *network = p->network;
    const tarry_run_plan *run = &network->run;
    for (uint32_t i = 0; i < network->n_channels; i++)
        p->record->snapshots[(size_t)i * run->n_snapshots + p->snapshot] = channel_value(
            p, &network->channels[i], run->snapshots[p->snapshot]);
    p->snapshot++;
}

static void observe_bound(plain *p) {
    const uint32_t n = p->network->n_tracks;
    for (uint32_t i = 0; i < n; i++)
        p->record->counts[(size_t)p->bound * n + i] = p->counters[i];
    p->bound++;
}

static void note_status(plain *p) {
    for (uint32_t i = 0; i < p->network->n_tracks; i++)
        p->record->status[i] = p->status[i];
    p->status_noted = true;
}

/* Time moves on to that of an event: everything earlier is observed as things stand. */
static void move_to(plain *p, double time) {
    const tarry_run_plan *run = &p->network->run;
    if (time >= 0 && !p->status_noted)
        note_status(p);
    while (p->frame < run->n_frames && frame_time(run, p->frame) < time)
        observe_frame(p);
    while (p->snapshot < run->n_snapshots && run->snapshots[p->snapshot] < time)
        observe_snapshot(p);
    while (p->bound <= run->n_spans && run->bounds[p->bound] < time)
        observe_bound(p);
    p->now = time;
}

/* ---- tracks ---- */

static bool any_runs_on(const plain *p) {
    for (uint32_t i = 0; i < p->network->n_tracks; i++)
        if (p->runs_on[i])
            return true;
    return false;
}

static int mark(plain *p, uint32_t track, bool opens) {
    const tarry_track_status after = opens ? TARRY_TRACK_OPEN : TARRY_TRACK_CLOSED;
    tarry_record *record = p->record;
    if (p->status[track] == after) {
        record->ignored++;
        return 0;
    }
    p->status[track] = after;
    if (opens && p->running_on) {
        p->runs_on[track] = false;
        if (!any_runs_on(p))
            p->end = p->now;
    }
    if (p->now < 0)
        return 0;
    if (tarry_grow((void **)&record->marks, &record->marks_capacity, record->n_marks + 1,
                   sizeof *record->marks))
        return 1;
    record->marks[record->n_marks++] = (tarry_mark){
        .time = p->now, .track = track, .opens = opens, .count = p->counters[track]};
    return 0;
}

static void find_who_runs_on(plain *p) {
    for (size_t i = 0; i < p->record->n_marks; i++) {
        const uint32_t track = p->record->marks[i].track;
        p->runs_on[track] = p->network->tracks[track].tells;
    }
}

/* ---- first responses ---- */

/* The response whose stretch is on, by its step; none in the run-on. */
static int32_t response_of(const plain *p) {
    int32_t response = TARRY_NONE;
    for (uint32_t i = 1; i < p->n_segments_past; i++)
        if (p->network->segments[i].moment == TARRY_MOMENT_STEP)
            response = p->network->segments[i].response;
    return p->running_on ? TARRY_NONE : response;
}

static void note_first(plain *p, uint32_t first) {
    const int32_t response = response_of(p);
    if (response < 0)
        return;
    double *time = &p->record->firsts[(uint32_t)response * p->network->n_firsts + first];
    if (isnan(*time))
        *time = p->now - p->network->responses[response].from;
}

static void note_under_way(plain *p) {
    const tarry_network *network = p->network;
    const int32_t response = response_of(p);
    if (p->segment->moment != TARRY_MOMENT_STEP || response < 0)
        return;
    for (uint32_t i = 0; i < network->n_firsts; i++) {
        const tarry_range before = network->firsts[i].before;
        double *n = &p->record->under_way[(uint32_t)response * network->n_firsts + i];
        for (uint32_t j = before.from; j < before.to; j++)
            *n += p->counts[network->products[j]];
    }
}

/* ---- lags ---- */

/* Add the overlap of [from, to) with every span, `sign` times. */
static void add_overlap(plain *p, uint32_t lag, double from, double to, double sign) {
    const tarry_run_plan *run = &p->network->run;
    for (uint32_t i = 0; i < run->n_spans; i++) {
        const double start = fmax(from, run->bounds[i]), stop = fmin(to, run->bounds[i + 1]);
        if (stop > start)
            p->record->lags[(size_t)lag * run->n_spans + i].pending += sign * (stop - start);
    }
}

/* Sums of the span that `now` lies in, or NULL. */
static tarry_lag_sums *span_sums(const plain *p, uint32_t lag) {
    const tarry_run_plan *run = &p->network->run;
    for (uint32_t i = 0; i < run->n_spans; i++)
        if (run->bounds[i] <= p->now && p->now < run->bounds[i + 1])
            return &p->record->lags[(size_t)lag * run->n_spans + i];
    return NULL;
}

static int put_pending(plain *p, uint32_t lag, double due, double leaves, tarry_error *error) {
    completion *more = realloc(p->pending, (p->n_pending + 1) * sizeof *more);
    if (!more)
        return tarry_fail_memory(error, "pending completions");
    p->pending = more;
    p->pending[p->n_pending] = (completion){lag, p->now, due, leaves};
    add_overlap(p, lag, p->now, leaves, 1);
    p->n_pending++;
    if ((double)p->n_pending > p->network->run.limit_pending)
        return tarry_fail(error, TARRY_LIMIT, "too many pending");
    return 0;
}

static int schedule(plain *p, uint32_t lag, tarry_error *error) {
    const double length = tarry_draw(drawer_of(p, lag), &p->events);
    tarry_lag_sums *sums = span_sums(p, lag);
    if (sums) {
        sums->drawn += 1;
        sums->sum += length;
        sums->squares += length * length;
        if (p->record->lag_bins)
            p->record->lag_bins[(size_t)lag * TARRY_LAG_BINS + tarry_lag_bin(length)]++;
    }
    const tarry_lag *row = &p->network->lags[lag];
    double due = p->now + length;
    if (row->in_order && p->last_due[lag] + row->headway > due)
        due = p->last_due[lag] + row->headway;
    p->last_due[lag] = due;
    double leaves = due;
    if (row->may_be_lost) {
        const double u = tarry_unit(tarry_stream_next(&p->events));
        const double rate = p->segment->rates[row->loss_rate];
        if (rate > 0)
            leaves = fmin(due, p->now + -tarry_log(u) / rate);
    }
    return put_pending(p, lag, due, leaves, error);
}

static void remove_pending(plain *p, size_t i) {
    memmove(&p->pending[i], &p->pending[i + 1], (p->n_pending - i - 1) * sizeof *p->pending);
    p->n_pending--;
}

/* The next completion or loss by (time, kind, order scheduled); n_pending if there is none. */
static size_t next_pending(const plain *p) {
    size_t best = p->n_pending;
    const uint32_t n_lags = p->network->n_lags;
    for (size_t i = 0; i < p->n_pending; i++) {
        const completion *c = &p->pending[i], *b = &p->pending[best];
        if (best == p->n_pending) {
            best = i;
            continue;
        }
        const uint32_t kind = c->lag + (c->leaves < c->due ? n_lags : 0);
        const uint32_t best_kind = b->lag + (b->leaves < b->due ? n_lags : 0);
        if (c->leaves < b->leaves || (c->leaves == b->leaves && kind < best_kind))
            best = i;
    }
    return best;
}

/* ---- effects ---- */

static int add_count(plain *p, uint32_t species, double amount, tarry_error *error) {
    p->counts[species] += amount;
    if (p->counts[species] >= 0x1p53)
        return tarry_fail(error, TARRY_RUN, "too many");
    return 0;
}

/* *short_of: the effect was dropped since something was lacking. */
static int carry_out(plain *p, const tarry_effect *effect, bool *short_of, tarry_error *error) {
    const tarry_network *network = p->network;
    *short_of = false;
    for (uint32_t i = effect->demands.from; i < effect->demands.to; i++) {
        const tarry_demand *demand = &network->demands[i];
        if (p->counts[demand->species] < demand->amount)
            *short_of = true;
    }
    if (*short_of)
        return effect->skip_short ? 0 : tarry_fail(error, TARRY_RUN, "something is lacking");
    for (uint32_t i = effect->changes.from; i < effect->changes.to; i++)
        if (add_count(p, network->changes[i].species, network->changes[i].amount, error))
            return TARRY_RUN;
    for (uint32_t i = effect->amounts.from; i < effect->amounts.to; i++) {
        const tarry_amount *amount = &network->amounts[i];
        const double mean = amount->kind == TARRY_AMOUNT_TABLE ? 0
                                                               : p->segment->means[amount->mean];
        const double drawn = tarry_amount_draw(amount, mean, tarry_stream_next(&p->events));
        if (add_count(p, amount->species, drawn, error))
            return TARRY_RUN;
    }
    for (uint32_t i = effect->marks.from; i < effect->marks.to; i++) {
        const tarry_mark_rule *rule = &network->marks[i];
        if (rule->kind == TARRY_MARK_COUNT)
            p->counters[rule->track]++;
        else if (rule->kind == TARRY_MARK_FIRST)
            note_first(p, rule->track);
        else if (mark(p, rule->track, rule->kind == TARRY_MARK_OPEN))
            return tarry_fail_memory(error, "marks");
    }
    for (uint32_t i = effect->schedules.from; i < effect->schedules.to; i++) {
        const int code = schedule(p, network->schedules[i], error);
        if (code)
            return code;
    }
    return 0;
}

static int complete(plain *p, size_t i, tarry_error *error) {
    const uint32_t number = p->pending[i].lag;
    const tarry_lag *lag = &p->network->lags[number];
    const tarry_outcome *outcomes = p->network->outcomes + lag->outcomes.from;
    const uint32_t n = lag->outcomes.to - lag->outcomes.from;
    bool short_of = false;
    uint32_t chosen = 0;
    const bool lost = p->pending[i].leaves < p->pending[i].due;
    remove_pending(p, i);
    if (lost) {
        tarry_lag_sums *sums = span_sums(p, number);
        if (sums)
            sums->lost += 1;
        return carry_out(p, &p->network->effects[lag->loss_effect], &short_of, error);
    }
    p->record->completions[number]++;
    if (n > 1 || (n == 1 && outcomes[0].cumulative < 1)) {
        const double u = tarry_unit(tarry_stream_next(&p->events));
        while (chosen < n && !(u < outcomes[chosen].cumulative))
            chosen++;
    }
    if (chosen >= n)
        return 0;
    const int code = carry_out(p, &p->network->effects[outcomes[chosen].effect], &short_of, error);
    if (short_of)
        p->record->skipped[number]++;
    return code;
}

/* ---- the protocol ---- */

static int move_promoter(plain *p, const tarry_setting *setting, tarry_error *error) {
    const tarry_promoter *promoter = &p->network->promoters[setting->promoter];
    const tarry_promoter_state *states = p->network->states + promoter->states.from;
    const tarry_promoter_state *to = &states[setting->state], *from = states;
    while (p->counts[from->species] < 1)
        from++;
    p->counts[from->species] -= 1;
    if (from->sum != from->species)
        p->counts[from->sum] -= 1;
    p->counts[to->species] += 1;
    if (to->sum != to->species)
        p->counts[to->sum] += 1;
    for (size_t i = p->n_pending; i-- > 0;) {
        const completion c = p->pending[i];
        if (p->network->lags[c.lag].promoter != (int32_t)setting->promoter)
            continue;
        add_overlap(p, c.lag, p->now, c.due, -1);
        tarry_lag_sums *sums = span_sums(p, c.lag);
        if (sums)
            sums->lost += 1;
        remove_pending(p, i);
    }
    if (to->active != from->active && mark(p, promoter->track, to->active))
        return tarry_fail_memory(error, "marks");
    return to->lag >= 0 ? schedule(p, (uint32_t)to->lag, error) : 0;
}

static int start_segment(plain *p, tarry_error *error) {
    p->segment = &p->network->segments[p->n_segments_past++];
    for (uint32_t i = p->segment->settings.from; i < p->segment->settings.to; i++) {
        const tarry_setting *setting = &p->network->settings[i];
        if (setting->species >= 0) {
            p->counts[setting->species] = setting->value;
            continue;
        }
        const int code = move_promoter(p, setting, error);
        if (code)
            return code;
    }
    note_under_way(p);
    return 0;
}

static double next_segment_start(const plain *p) {
    return p->n_segments_past < p->network->n_segments
               ? p->network->segments[p->n_segments_past].start
               : INFINITY;
}

/* ---- reactions ---- */

static double choose_from(double x, uint32_t n) {
    double ways = 1;
    if (x < n)
        return 0;
    for (uint32_t j = 0; j < n; j++)
        ways *= (x - j) / (j + 1);
    return ways;
}

static double propensity(const plain *p, const tarry_reaction *reaction) {
    double ways = 1;
    bool lacks = false;
    for (uint32_t i = reaction->factors.from; i < reaction->factors.to; i++) {
        const tarry_factor *factor = &p->network->factors[i];
        const double x = p->counts[factor->species];
        ways *= choose_from(x, factor->used) * choose_from(x - factor->used, factor->needed);
        lacks = lacks || x < (double)factor->used + factor->needed;
    }
    switch (reaction->kind) {
    case TARRY_RATE_CONSTANT:
        return p->segment->rates[reaction->rate];
    case TARRY_RATE_LINEAR:
        return p->segment->rates[reaction->rate] * p->counts[reaction->species];
    case TARRY_RATE_WAYS:
        return p->segment->rates[reaction->rate] * ways;
    case TARRY_RATE_EXPRESSION:
        if (ways == 0)
            return 0;
        return tarry_expression_value(&p->segment->formulas[reaction->rate], NULL, p->counts) *
               ways;
    default:
        if (lacks)
            return 0;
        return tarry_expression_value(&p->segment->formulas[reaction->rate], NULL, p->counts);
    }
}

/* The sum of all propensities, in a row or up a tree: node i has the children 2i and 2i + 1. */
static int sum_propensities(plain *p, double *total, tarry_error *error) {
    const uint32_t n = p->network->n_reactions;
    double *leaves = p->propensities + p->n_leaves;
    *total = 0;
    for (uint32_t i = 0; i < n; i++) {
        leaves[i] = propensity(p, &p->network->reactions[i]);
        if (!(leaves[i] >= 0) || isinf(leaves[i]))
            return tarry_fail(error, TARRY_RUN, "a propensity is %g", leaves[i]);
        *total += leaves[i];
    }
    if (n > MOST_IN_A_SUM) {
        for (size_t i = p->n_leaves - 1; i >= 1; i--)
            p->propensities[i] = p->propensities[2 * i] + p->propensities[2 * i + 1];
        *total = p->propensities[1];
    }
    return isfinite(*total) ? 0 : tarry_fail(error, TARRY_RUN, "the total is not finite");
}

static uint32_t choose(const plain *p, double u, double total) {
    const double *leaves = p->propensities + p->n_leaves;
    double target = u * total, sum = 0;
    if (p->network->n_reactions <= MOST_IN_A_SUM) {
        for (uint32_t i = 0;; i++) {
            sum += leaves[i];
            if (target < sum)
                return i;
        }
    }
    size_t node = 1;
    while (node < p->n_leaves) {
        const double left = p->propensities[2 * node], right = p->propensities[2 * node + 1];
        if (target < left || right == 0) {
            node = 2 * node;
        } else {
            target -= left;
            node = 2 * node + 1;
        }
    }
    return (uint32_t)(node - p->n_leaves);
}

/* ---- the loop ---- */

static int start_cell(plain *p, int64_t cell, tarry_error *error) {
    const tarry_network *network = p->network;
    const uint64_t seed = network->run.seed;
    tarry_stream start;
    tarry_stream_init(&p->events, seed, (uint64_t)cell, TARRY_STREAM_EVENTS);
    tarry_stream_init(&start, seed, (uint64_t)cell, TARRY_STREAM_START);
    p->noise_key = tarry_stream_key(seed, (uint64_t)cell, TARRY_STREAM_NOISE);
    p->now = 0 - network->run.settle;
    for (uint32_t i = 0; i < network->n_species; i++)
        p->counts[i] = network->species[i].start;
    for (uint32_t i = 0; i < network->n_promoters; i++) {
        const tarry_promoter *promoter = &network->promoters[i];
        const double u = tarry_unit(tarry_stream_next(&start));
        uint32_t number = 0;
        while (!(u < promoter->start[number]))
            number++;
        const tarry_promoter_state *state = &network->states[promoter->states.from + number];
        p->counts[state->species] += 1;
        if (state->sum != state->species)
            p->counts[state->sum] += 1;
        p->status[promoter->track] = state->active ? TARRY_TRACK_OPEN : TARRY_TRACK_CLOSED;
        if (state->lag < 0)
            continue;
        const uint32_t lag = (uint32_t)state->lag;
        int code;
        if (promoter->steady) {
            const double due = p->now + tarry_draw_remaining(drawer_of(p, lag), &start);
            code = put_pending(p, lag, due, due, error);
        } else {
            code = schedule(p, lag, error);
        }
        if (code)
            return code;
    }
    if (network->run.settle == 0)
        note_status(p);
    return 0;
}

/* Steps 1 and 2 of a pass. */
static int catch_up(plain *p, tarry_error *error) {
    for (;;) {
        const size_t i = next_pending(p);
        int code;
        if (i < p->n_pending && p->pending[i].leaves <= p->now)
            code = complete(p, i, error);
        else if (next_segment_start(p) <= p->now)
            code = start_segment(p, error);
        else
            return 0;
        if (code)
            return code;
    }
}

/* Step 4. */
static int go_on(plain *p, double *n_firings, tarry_error *error) {
    double total;
    const size_t i = next_pending(p);
    double limit = fmin(p->end, next_segment_start(p));
    if (i < p->n_pending)
        limit = fmin(limit, p->pending[i].leaves);
    int code = sum_propensities(p, &total, error);
    if (code)
        return code;
    const double u1 = tarry_unit(tarry_stream_next(&p->events));
    const double u2 = tarry_unit(tarry_stream_next(&p->events));
    const double time = total > 0 ? p->now + -tarry_log(u1) / total : INFINITY;
    if (!(time < limit)) {
        move_to(p, limit);
        return 0;
    }
    const uint32_t reaction = choose(p, u2, total);
    bool short_of;
    move_to(p, time);
    p->record->firings[reaction]++;
    if (++*n_firings > p->network->run.limit_firings)
        return tarry_fail(error, TARRY_LIMIT, "too many firings");
    return carry_out(p, &p->network->effects[p->network->reactions[reaction].effect], &short_of,
                     error);
}

static int run(plain *p, tarry_error *error) {
    double n_firings = 0;
    p->end = p->network->run.until;
    for (;;) {
        int code = catch_up(p, error);
        if (code)
            return code;
        if (p->now == p->end && !p->running_on) {
            find_who_runs_on(p);
            if (!any_runs_on(p))
                break;
            p->running_on = true;
            p->end = 2 * p->network->run.until;
        }
        if (p->now == p->end)
            break;
        code = go_on(p, &n_firings, error);
        if (code)
            return code;
    }
    p->record->end = p->now;
    move_to(p, INFINITY);
    leave_out(p->network, p->record);
    return 0;
}

/* Tables are those of the laws that all cells share; a cell's own laws take them where they fit. */
static int make_drawers(plain *p, tarry_error *error) {
    const tarry_network *network = p->network;
    int code = p->common->variation ? tarry_drawer_set_new_from(p->tables, &p->set, error)
                                    : tarry_drawer_set_new(&p->set, error);
    for (uint32_t s = 0; s < network->n_segments && !code; s++)
        for (uint32_t d = 0; d < network->n_delays && !code; d++)
            code = tarry_drawer_set_add(p->set, &network->segments[s].laws[d],
                                        &p->drawers[(size_t)s * network->n_delays + d], error);
    return code;
}

/* The cell's own parameters, where cells differ: one factor after another from a stream of their
 * own.
 */
static int vary(plain *p, int64_t cell, tarry_error *error) {
    const tarry_variation *variation = p->common->variation;
    tarry_stream stream;
    int code = tarry_cell_network_init(&p->own, p->common, error);
    if (!code)
        code = tarry_drawer_set_new(&p->tables, error);
    for (uint32_t s = 0; s < p->common->n_segments && !code; s++)
        for (uint32_t d = 0; d < p->common->n_delays && !code; d++) {
            const tarry_drawer *unused;
            code = tarry_drawer_set_add(p->tables, &p->common->segments[s].laws[d], &unused, error);
        }
    tarry_stream_init(&stream, p->common->run.seed, (uint64_t)cell, TARRY_STREAM_PARAMETERS);
    for (uint32_t i = 0; i < variation->n && !code; i++) {
        const tarry_drawer *factor;
        code = tarry_drawer_set_add(p->tables, &variation->varied[i].law, &factor, error);
        if (!code)
            p->own.factors[i] = tarry_draw(factor, &stream);
    }
    if (!code)
        code = tarry_cell_network_set(&p->own, cell, error);
    p->network = &p->own.network;
    p->segment = p->network->segments;
    return code;
}

static int make(plain *p, tarry_error *error) {
    const tarry_network *network = p->network;
    p->n_leaves = 1;
    while (p->n_leaves < network->n_reactions)
        p->n_leaves *= 2;
    p->counts = calloc(network->n_species + 1, sizeof *p->counts);
    p->propensities = calloc(2 * p->n_leaves, sizeof *p->propensities);
    p->status = calloc(network->n_tracks + 1, sizeof *p->status);
    p->counters = calloc(network->n_tracks + 1, sizeof *p->counters);
    p->last_due = calloc(network->n_lags + 1, sizeof *p->last_due);
    for (uint32_t i = 0; p->last_due && i < network->n_lags; i++)
        p->last_due[i] = -INFINITY;
    p->runs_on = calloc(network->n_tracks + 1, sizeof *p->runs_on);
    p->drawers = calloc((size_t)network->n_segments * network->n_delays + 1, sizeof *p->drawers);
    if (!p->counts || !p->propensities || !p->status || !p->counters || !p->runs_on ||
        !p->last_due || !p->drawers)
        return tarry_fail_memory(error, "the plain loop");
    return make_drawers(p, error);
}

int plain_cell_run(const tarry_network *network, int64_t cell, tarry_record *record,
                   tarry_error *error) {
    plain p = {
        .common = network, .network = network, .segment = network->segments, .n_segments_past = 1};
    p.record = record;
    tarry_record_reset(record, network);
    record->cell = cell;
    int code = network->variation ? vary(&p, cell, error) : 0;
    if (!code)
        code = make(&p, error);
    if (!code)
        code = start_cell(&p, cell, error);
    if (!code)
        code = run(&p, error);
    tarry_drawer_set_free(p.set);
    tarry_drawer_set_free(p.tables);
    tarry_cell_network_release(&p.own);
    free(p.counts);
    free(p.pending);
    free(p.propensities);
    free(p.status);
    free(p.counters);
    free(p.runs_on);
    free(p.last_due);
    free(p.drawers);
    return code;
}
