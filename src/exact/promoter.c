/* SPDX-License-Identifier: GPL-3.0-or-later */

/* The promoter with its clearance as one Markov chain. A state of the chain is (clearance, phase):
 * clearance 0 is ready to initiate, c > 0 the phase c - 1 of a clearance under way; the phases of
 * all states of the promoter follow one another. */

#include "exact/gene.h"

#include "base/error.h"

#include <string.h>

/* How one state of the promoter is divided. */
typedef struct part {
    tarry_phases phases; /* n is 1 for a state left at rates */
    size_t at;           /* its first phase */
    bool lasts;
} part;

typedef struct expansion {
    tarry_exact_reader *reader;
    const tarry_network *network;
    const tarry_promoter *promoter;
    part *parts; /* by state of the promoter */
    size_t n_parts;
    size_t n_phases;        /* of all states together */
    const tarry_lag *pause; /* the clearance, or NULL */
    tarry_phases clearing;
} expansion;

static void refuse(expansion *x, const char *format, const char *name) {
    if (x->reader->gene->why == NULL)
        x->reader->gene->why = tarry_exact_say(x->reader, format, name);
}

/* ---- states -------------------------------------------------------------------------------- */

static int read_phases(expansion *x, const tarry_lag *lag, const char *format, const char *name,
                       tarry_phases *phases) {
    bool is_made = false;
    const tarry_exact_reader *r = x->reader;
    if (!tarry_exact_law_stays(r, lag->delay)) {
        refuse(x, "the protocol changes the delay '%s'", lag->delay_name);
        return 0;
    }
    const int code = tarry_phases_read(&r->segments[0].laws[lag->delay], r->arena, phases, &is_made,
                                       r->error);
    if (code == 0 && !is_made)
        refuse(x, format, name);
    return code;
}

static int read_parts(expansion *x) {
    static const double one_ = 1, zero_ = 0; /* only read */
    double *const one = (double *)&one_, *const zero = (double *)&zero_;
    int code = 0;
    for (size_t i = 0; code == 0 && i < x->n_parts && x->reader->gene->why == NULL; i++) {
        const tarry_promoter_state *state = &x->network->states[x->promoter->states.from + i];
        part *p = &x->parts[i];
        p->at = x->n_phases;
        p->lasts = state->lag != TARRY_NONE;
        p->phases = (tarry_phases){1, one, zero, zero, one};
        if (p->lasts)
            code = read_phases(x, &x->network->lags[state->lag],
                               "the state '%s' lasts a time that is no sum or mix of exponential "
                               "times",
                               state->name, &p->phases);
        x->n_phases += p->phases.n;
    }
    return code;
}

/* The first allele's clearance is the lag of its initiations that holds no molecule. */
static const tarry_lag *find_clearance(const expansion *x) {
    for (uint32_t i = 0; i < x->network->n_lags; i++) {
        const tarry_lag *lag = &x->network->lags[i];
        if (lag->gene == (int32_t)x->reader->gene->gene && lag->stage == TARRY_NONE &&
            lag->promoter == TARRY_NONE)
            return lag;
    }
    return NULL;
}

/* ---- moves --------------------------------------------------------------------------------- */

/* An event from state `from` of the promoter, at any phase of it or (`phase` >= 0) at one. */
typedef struct event {
    size_t from;
    int64_t phase;
    int32_t to; /* or TARRY_NONE: it stays where it is */
    bool initiates;
    double rate;
} event;

static void add_rate(const expansion *x, tarry_exact_regime *regime, size_t from, size_t to,
                     double rate, bool initiates) {
    const size_t n = x->reader->gene->n_states;
    if (from == to && !initiates)
        return;
    (initiates ? regime->jump : regime->quiet)[from * n + to] += rate;
    regime->quiet[from * n + from] -= rate;
}

/* The event at one state (clearance, phase) of the chain. */
static void add_here(const expansion *x, tarry_exact_regime *regime, const event *e, size_t c,
                     size_t phase) {
    const size_t from = c * x->n_phases + phase;
    const bool pauses = e->initiates && x->pause != NULL;
    if (pauses && c > 0)
        return;
    for (size_t k = 0; k < (pauses ? x->clearing.n : 1); k++) {
        const size_t base = (pauses ? k + 1 : c) * x->n_phases;
        const double rate = e->rate * (pauses ? x->clearing.entry[k] : 1);
        if (e->to == TARRY_NONE) {
            add_rate(x, regime, from, base + phase, rate, e->initiates);
            continue;
        }
        const part *to = &x->parts[e->to];
        for (size_t j = 0; j < to->phases.n; j++)
            add_rate(x, regime, from, base + to->at + j, rate * to->phases.entry[j], e->initiates);
    }
}

static void add_event(const expansion *x, tarry_exact_regime *regime, const event *e) {
    const part *p = &x->parts[e->from];
    const size_t n_clearings = x->pause != NULL ? x->clearing.n + 1 : 1;
    for (size_t c = 0; c < n_clearings; c++)
        for (size_t j = 0; j < p->phases.n; j++)
            if (e->phase < 0 || e->phase == (int64_t)j)
                add_here(x, regime, e, c, p->at + j);
}

/* The number of one of the promoter's states by its species, or TARRY_NONE. */
static int32_t state_of(const expansion *x, uint32_t species) {
    for (size_t i = 0; i < x->n_parts; i++)
        if (x->network->states[x->promoter->states.from + i].species == species)
            return (int32_t)i;
    return TARRY_NONE;
}

static int32_t state_entered(const expansion *x, uint32_t effect) {
    const tarry_range changes = x->network->effects[effect].changes;
    for (uint32_t i = changes.from; i < changes.to; i++)
        if (x->network->changes[i].amount == 1 &&
            state_of(x, x->network->changes[i].species) != TARRY_NONE)
            return state_of(x, x->network->changes[i].species);
    return TARRY_NONE;
}

/* The state that a reaction of the allele starts from. */
static int32_t state_left(const expansion *x, const tarry_reaction *reaction) {
    if (reaction->kind == TARRY_RATE_LINEAR)
        return state_of(x, reaction->species);
    for (uint32_t i = reaction->factors.from; i < reaction->factors.to; i++) {
        const int32_t state = state_of(x, x->network->factors[i].species);
        if (state != TARRY_NONE)
            return state;
    }
    return TARRY_NONE;
}

static void add_reactions(expansion *x, tarry_exact_regime *regime, size_t segment) {
    const tarry_exact_reader *r = x->reader;
    const uint32_t *starts = r->index->reaction_starts;
    for (uint32_t i = starts[r->gene->gene]; i < starts[r->gene->gene + 1]; i++) {
        const tarry_reaction *reaction = &x->network->reactions[r->index->reactions[i]];
        if (reaction->allele != (int32_t)x->promoter->allele)
            continue;
        const int32_t from = state_left(x, reaction);
        event e = {.phase = -1,
                   .to = state_entered(x, reaction->effect),
                   .initiates = tarry_flow_initiates(x->network, reaction->effect, r->gene->gene)};
        if (from == TARRY_NONE || !tarry_exact_rate(r, segment, reaction, &e.rate)) {
            refuse(x, "the rate of '%s' reads counts of species", reaction->name);
            return;
        }
        e.from = (size_t)from;
        add_event(x, regime, &e);
    }
}

/* From phase to phase of a state that lasts, and out of it. */
static void add_dwell(const expansion *x, tarry_exact_regime *regime, size_t state) {
    const part *p = &x->parts[state];
    const size_t n_clearings = x->pause != NULL ? x->clearing.n + 1 : 1;
    const tarry_lag *lag =
        &x->network->lags[x->network->states[x->promoter->states.from + state].lag];
    for (size_t c = 0; c < n_clearings; c++)
        for (size_t i = 0; i < p->phases.n; i++)
            for (size_t j = 0; j < p->phases.n; j++)
                add_rate(x, regime, c * x->n_phases + p->at + i, c * x->n_phases + p->at + j,
                         p->phases.moves[i * p->phases.n + j], false);
    double before = 0;
    for (uint32_t k = lag->outcomes.from; k < lag->outcomes.to; k++) {
        const tarry_outcome *outcome = &x->network->outcomes[k];
        for (size_t i = 0; i < p->phases.n; i++) {
            const event e = {
                state, (int64_t)i, state_entered(x, outcome->effect),
                tarry_flow_initiates(x->network, outcome->effect, x->reader->gene->gene),
                p->phases.exit[i] * (outcome->cumulative - before)};
            add_event(x, regime, &e);
        }
        before = outcome->cumulative;
    }
}

static void add_clearance(const expansion *x, tarry_exact_regime *regime) {
    const tarry_phases *c = &x->clearing;
    for (size_t i = 0; i < c->n; i++)
        for (size_t phase = 0; phase < x->n_phases; phase++) {
            const size_t from = (i + 1) * x->n_phases + phase;
            add_rate(x, regime, from, phase, c->exit[i], false);
            for (size_t j = 0; j < c->n; j++)
                add_rate(x, regime, from, (j + 1) * x->n_phases + phase, c->moves[i * c->n + j],
                         false);
        }
}

/* ---- the whole ----------------------------------------------------------------------------- */

static void name_states(const expansion *x) {
    tarry_exact_gene *gene = x->reader->gene;
    for (size_t s = 0; s < gene->n_states; s++)
        for (size_t i = 0; i < x->n_parts; i++) {
            const size_t phase = s % x->n_phases;
            if (phase < x->parts[i].at || phase >= x->parts[i].at + x->parts[i].phases.n)
                continue;
            gene->state_of[s] = (uint32_t)i;
            gene->active[s] = x->network->states[x->promoter->states.from + i].active;
        }
}

/* Ready to initiate; a lasting state is met on its way where the start is steady. */
static void fill_start(const expansion *x) {
    double before = 0;
    for (size_t i = 0; i < x->n_parts; i++) {
        const part *p = &x->parts[i];
        const double *within = x->promoter->steady ? p->phases.met : p->phases.entry;
        const double share = x->promoter->start[i] - before;
        before = x->promoter->start[i];
        for (size_t j = 0; j < p->phases.n; j++)
            x->reader->gene->start[p->at + j] = share * within[j];
    }
}

static int make_room(const expansion *x) {
    const tarry_exact_reader *r = x->reader;
    tarry_exact_gene *gene = r->gene;
    const size_t n = gene->n_states, n_segments = r->network->n_segments;
    gene->state_of = tarry_arena_calloc(r->arena, n, sizeof *gene->state_of);
    gene->active = tarry_arena_calloc(r->arena, n, sizeof *gene->active);
    gene->start = tarry_arena_calloc(r->arena, n, sizeof *gene->start);
    gene->regimes = tarry_arena_calloc(r->arena, n_segments, sizeof *gene->regimes);
    if (!gene->state_of || !gene->active || !gene->start || !gene->regimes)
        return tarry_fail_memory(r->error, "a gene");
    return 0;
}

static bool same_rates(const tarry_exact_gene *gene, const tarry_exact_regime *one,
                       const tarry_exact_regime *other) {
    const size_t size = gene->n_states * gene->n_states * sizeof(double);
    return memcmp(one->quiet, other->quiet, size) == 0 && memcmp(one->jump, other->jump, size) == 0;
}

/* A regime for each segment, but for those that go on as the one before. */
static int fill_regimes(expansion *x) {
    const tarry_exact_reader *r = x->reader;
    tarry_exact_gene *gene = r->gene;
    for (size_t s = 0; s < r->network->n_segments && gene->why == NULL; s++) {
        tarry_exact_regime *regime = &gene->regimes[gene->n_regimes];
        regime->from = r->segments[s].start;
        regime->quiet = tarry_arena_calloc(r->arena, gene->n_states,
                                           gene->n_states * sizeof(double));
        regime->jump = tarry_arena_calloc(r->arena, gene->n_states,
                                          gene->n_states * sizeof(double));
        regime->begin = tarry_arena_calloc(r->arena, gene->n_states, sizeof(double));
        if (!regime->quiet || !regime->jump || !regime->begin)
            return tarry_fail_memory(r->error, "a gene");
        add_reactions(x, regime, s);
        for (size_t i = 0; i < x->n_parts; i++)
            if (x->parts[i].lasts)
                add_dwell(x, regime, i);
        if (x->pause != NULL)
            add_clearance(x, regime);
        if (gene->n_regimes == 0 || !same_rates(gene, regime, regime - 1))
            gene->n_regimes++;
    }
    return 0;
}

int tarry_exact_read_promoter(tarry_exact_reader *reader) {
    const tarry_network *network = reader->network;
    tarry_exact_gene *gene = reader->gene;
    expansion x = {.reader = reader,
                   .network = network,
                   .promoter = &network->promoters[network->genes[gene->gene].promoters.from]};
    x.n_parts = x.promoter->states.to - x.promoter->states.from;
    x.parts = tarry_arena_calloc(reader->arena, x.n_parts, sizeof *x.parts);
    if (x.parts == NULL)
        return tarry_fail_memory(reader->error, "a gene");
    int code = read_parts(&x);
    x.pause = find_clearance(&x);
    if (code == 0 && x.pause != NULL && gene->why == NULL)
        code = read_phases(&x, x.pause,
                           "'%s' lasts a time that is no sum or mix of exponential times",
                           x.pause->name, &x.clearing);
    gene->n_states = x.n_phases * (x.pause != NULL ? x.clearing.n + 1 : 1);
    if (gene->n_states > TARRY_EXACT_MOST_STATES)
        refuse(&x, "the promoter has too many phases%s", "");
    if (code != 0 || gene->why != NULL)
        return code;
    code = make_room(&x);
    if (code == 0) {
        name_states(&x);
        fill_start(&x);
        code = fill_regimes(&x);
    }
    return code;
}
