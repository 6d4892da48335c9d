/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Reading a gene back from the network.
 *
 * Only what is recognised is trusted: every effect that changes a product must be an initiation, an
 * end of a stage, a decay or a translation of this gene, else the product's mean is not worked out
 * and the flow says why. So a plain reaction that uses a gene's protein never goes unseen. */

#include "model/analysis_flow.h"

#include "base/error.h"

#include <stdlib.h>
#include <string.h>

/* ---- the index ------------------------------------------------------------------------------ */

void tarry_flow_index_release(tarry_flow_index *index) {
    free(index->reaction_starts);
    free(index->reactions);
    free(index->effect_starts);
    free(index->effects);
    free(index->reaction_of);
    free(index->lag_of);
    free(index->product_of);
    *index = (tarry_flow_index){0};
}

static void index_reactions(tarry_flow_index *index) {
    const tarry_network *network = index->network;
    uint32_t *starts = index->reaction_starts;
    for (uint32_t i = 0; i < network->n_reactions; i++)
        if (network->reactions[i].gene != TARRY_NONE)
            starts[network->reactions[i].gene + 1]++;
    for (uint32_t g = 0; g < network->n_genes; g++)
        starts[g + 1] += starts[g];
    for (uint32_t i = network->n_reactions; i-- > 0;)
        if (network->reactions[i].gene != TARRY_NONE)
            index->reactions[--starts[network->reactions[i].gene + 1]] = i;
    /* each start now stands one gene too far to the right, but for the last */
    memmove(starts, starts + 1, network->n_genes * sizeof *starts);
    starts[network->n_genes] = 0;
    for (uint32_t i = 0; i < network->n_reactions; i++)
        starts[network->n_genes] += network->reactions[i].gene != TARRY_NONE;
}

/* Pass 0 counts the effects that change each species, pass 1 puts them down. */
static void index_effects(tarry_flow_index *index, int pass) {
    const tarry_network *network = index->network;
    uint32_t *starts = index->effect_starts;
    for (uint32_t e = network->n_effects; e-- > 0;) {
        const tarry_effect *effect = &network->effects[e];
        for (uint32_t i = effect->changes.from; i < effect->changes.to; i++) {
            const uint32_t species = network->changes[i].species;
            if (pass == 0)
                starts[species]++;
            else
                index->effects[--starts[species]] = e;
        }
        for (uint32_t i = effect->amounts.from; i < effect->amounts.to; i++) {
            const uint32_t species = network->amounts[i].species;
            if (pass == 0)
                starts[species]++;
            else
                index->effects[--starts[species]] = e;
        }
    }
    for (uint32_t s = 1; s <= network->n_species && pass == 0; s++)
        starts[s] += starts[s - 1];
}

static void index_owners(tarry_flow_index *index) {
    const tarry_network *network = index->network;
    for (uint32_t e = 0; e < network->n_effects; e++)
        index->reaction_of[e] = index->lag_of[e] = TARRY_NONE;
    for (uint32_t i = 0; i < network->n_reactions; i++)
        index->reaction_of[network->reactions[i].effect] = (int32_t)i;
    for (uint32_t i = 0; i < network->n_lags; i++) {
        const tarry_range outcomes = network->lags[i].outcomes;
        for (uint32_t k = outcomes.from; k < outcomes.to; k++)
            index->lag_of[network->outcomes[k].effect] = (int32_t)i;
        if (network->lags[i].may_be_lost)
            index->lag_of[network->lags[i].loss_effect] = (int32_t)i;
    }
    for (uint32_t s = 0; s < network->n_species; s++)
        index->product_of[s] = TARRY_NONE;
    for (uint32_t g = 0; g < network->n_genes; g++) {
        const tarry_range products = network->genes[g].products;
        for (uint32_t i = products.from; i < products.to; i++)
            index->product_of[network->products[i]] = (int32_t)(i - products.from);
    }
}

int tarry_flow_index_init(tarry_flow_index *index, const tarry_network *network,
                          tarry_error *error) {
    *index = (tarry_flow_index){.network = network};
    size_t n_changes = 0;
    for (uint32_t e = 0; e < network->n_effects; e++) {
        const tarry_effect *effect = &network->effects[e];
        n_changes += effect->changes.to - effect->changes.from;
        n_changes += effect->amounts.to - effect->amounts.from;
    }
    index->reaction_starts = tarry_calloc((size_t)network->n_genes + 1, sizeof(uint32_t));
    index->reactions = tarry_calloc(network->n_reactions, sizeof(uint32_t));
    index->effect_starts = tarry_calloc((size_t)network->n_species + 1, sizeof(uint32_t));
    index->effects = tarry_calloc(n_changes, sizeof(uint32_t));
    index->reaction_of = tarry_calloc(network->n_effects, sizeof(int32_t));
    index->lag_of = tarry_calloc(network->n_effects, sizeof(int32_t));
    index->product_of = tarry_calloc(network->n_species, sizeof(int32_t));
    if (!index->reaction_starts || !index->reactions || !index->effect_starts || !index->effects ||
        !index->reaction_of || !index->lag_of || !index->product_of) {
        tarry_flow_index_release(index);
        return tarry_fail_memory(error, "the index of a network");
    }
    index_reactions(index);
    index_effects(index, 0);
    index_effects(index, 1);
    index_owners(index);
    return 0;
}

/* ---- what reactions and effects are --------------------------------------------------------- */

bool tarry_flow_linear(const tarry_network *network, const tarry_reaction *reaction,
                       uint32_t *species, double *rate, bool *reads) {
    const tarry_segment *segment = &network->segments[0];
    const tarry_range factors = reaction->factors;
    *reads = false;
    if (reaction->kind == TARRY_RATE_LINEAR) {
        *species = reaction->species;
        *rate = segment->rates[reaction->rate];
        return true;
    }
    if (factors.to - factors.from != 1)
        return false;
    const tarry_factor *factor = &network->factors[factors.from];
    *species = factor->species;
    if (factor->used + factor->needed != 1)
        return false;
    if (reaction->kind == TARRY_RATE_WAYS) {
        *rate = segment->rates[reaction->rate];
        return true;
    }
    if (reaction->kind != TARRY_RATE_EXPRESSION)
        return false;
    const tarry_expression *formula = &segment->formulas[reaction->rate];
    *reads = formula->n_species > 0;
    *rate = *reads ? 0 : tarry_expression_value(formula, NULL, NULL);
    return true;
}

int32_t tarry_flow_change(const tarry_network *network, uint32_t effect, uint32_t species) {
    const tarry_range changes = network->effects[effect].changes;
    for (uint32_t i = changes.from; i < changes.to; i++)
        if (network->changes[i].species == species)
            return network->changes[i].amount;
    return 0;
}

static bool draws_amounts(const tarry_network *network, uint32_t effect) {
    return network->effects[effect].amounts.from < network->effects[effect].amounts.to;
}

bool tarry_flow_initiates(const tarry_network *network, uint32_t effect, uint32_t gene) {
    const tarry_range marks = network->effects[effect].marks;
    const tarry_range tracks = network->genes[gene].tracks;
    for (uint32_t i = marks.from; i < marks.to; i++) {
        const tarry_mark_rule *rule = &network->marks[i];
        if (rule->kind == TARRY_MARK_COUNT && rule->track >= tracks.from && rule->track < tracks.to)
            return true;
    }
    return false;
}

bool tarry_flow_only_removes(const tarry_network *network, uint32_t effect, uint32_t species) {
    const tarry_effect *e = &network->effects[effect];
    return e->changes.to - e->changes.from == 1 &&
           tarry_flow_change(network, effect, species) == -1 && !draws_amounts(network, effect) &&
           e->schedules.from == e->schedules.to;
}

int32_t tarry_flow_stage_lag(const tarry_network *network, uint32_t effect, uint32_t species) {
    const tarry_range schedules = network->effects[effect].schedules;
    for (uint32_t i = schedules.from; i < schedules.to; i++)
        if (network->lags[network->schedules[i]].stage == (int32_t)species)
            return (int32_t)network->schedules[i];
    return TARRY_NONE;
}

/* ---- reading one gene ----------------------------------------------------------------------- */

typedef struct reader {
    const tarry_flow_index *index;
    const tarry_network *network;
    uint32_t gene;
    tarry_arena *arena;
    tarry_flow *flow;
    double *start, *moves, *initiation; /* the flow's, while they are filled */
    double *decay;                      /* [product] sum of decay rates */
    bool short_of_memory;
} reader;

static const char *say(reader *r, const char *format, const char *name) {
    const char *text = tarry_arena_format(r->arena, format, name);
    if (!text)
        r->short_of_memory = true;
    return text ? text : "memory is short";
}

static const char *owner_name(const reader *r, uint32_t effect) {
    const int32_t reaction = r->index->reaction_of[effect];
    const int32_t lag = r->index->lag_of[effect];
    if (reaction != TARRY_NONE)
        return r->network->reactions[reaction].name;
    return lag != TARRY_NONE ? r->network->lags[lag].name : "another event";
}

static bool is_product(const reader *r, uint32_t species) {
    return r->index->product_of[species] != TARRY_NONE &&
           r->network->species[species].gene == (int32_t)r->gene;
}

static const tarry_promoter *first_promoter(const reader *r) {
    return &r->network->promoters[r->network->genes[r->gene].promoters.from];
}

/* The number of a state of the first promoter, or TARRY_NONE. */
static int32_t state_of(const reader *r, uint32_t species) {
    const tarry_range states = first_promoter(r)->states;
    for (uint32_t i = states.from; i < states.to; i++)
        if (r->network->states[i].species == species)
            return (int32_t)(i - states.from);
    return TARRY_NONE;
}

/* The state that the effect moves the first promoter to, or TARRY_NONE. */
static int32_t state_entered(const reader *r, uint32_t effect) {
    const tarry_range changes = r->network->effects[effect].changes;
    for (uint32_t i = changes.from; i < changes.to; i++)
        if (r->network->changes[i].amount == 1) {
            const int32_t state = state_of(r, r->network->changes[i].species);
            if (state != TARRY_NONE)
                return state;
        }
    return TARRY_NONE;
}

/* A reaction of the gene that starts from a state of the first promoter. */
static void read_move(reader *r, const tarry_reaction *reaction) {
    uint32_t species = 0;
    double rate = 0;
    bool reads = false;
    const bool linear = tarry_flow_linear(r->network, reaction, &species, &rate, &reads);
    if (reaction->factors.to - reaction->factors.from > 1) {
        r->flow->why = say(r, "'%s' waits for the clearance", reaction->name);
        return;
    }
    if (!linear || reads) {
        r->flow->why = say(r, "the rate of '%s' reads counts of species", reaction->name);
        return;
    }
    const int32_t from = state_of(r, species);
    if (from == TARRY_NONE)
        return;
    const int32_t to = state_entered(r, reaction->effect);
    if (to != TARRY_NONE)
        r->moves[(size_t)from * r->flow->n_states + (size_t)to] += rate;
    if (tarry_flow_initiates(r->network, reaction->effect, r->gene))
        r->initiation[from] += rate;
}

/* Initiations by moves that end a lasting state, in the steady state. */
static void read_dwell(reader *r, const tarry_promoter_state *state, double probability) {
    const tarry_lag *lag = &r->network->lags[state->lag];
    const double mean = tarry_law_mean(&r->network->segments[0].laws[lag->delay]);
    double before = 0;
    for (uint32_t i = lag->outcomes.from; i < lag->outcomes.to; i++) {
        const tarry_outcome *outcome = &r->network->outcomes[i];
        if (mean > 0 && tarry_flow_initiates(r->network, outcome->effect, r->gene))
            r->flow->dwell_initiation += probability * (outcome->cumulative - before) / mean;
        before = outcome->cumulative;
    }
}

/* Only reactions and dwells of the gene may move its promoter. */
static void check_movers(reader *r, uint32_t species) {
    const uint32_t *starts = r->index->effect_starts;
    for (uint32_t i = starts[species]; i < starts[species + 1] && !r->flow->why; i++) {
        const uint32_t effect = r->index->effects[i];
        const int32_t reaction = r->index->reaction_of[effect];
        const int32_t lag = r->index->lag_of[effect];
        const bool own = (reaction != TARRY_NONE &&
                          r->network->reactions[reaction].gene == (int32_t)r->gene) ||
                         (lag != TARRY_NONE && r->network->lags[lag].promoter != TARRY_NONE);
        if (!own)
            r->flow->why = say(r, "'%s' moves its promoter", owner_name(r, effect));
    }
}

static void read_promoter(reader *r) {
    const tarry_promoter *promoter = first_promoter(r);
    tarry_flow *flow = r->flow;
    flow->steady = promoter->steady;
    double before = 0;
    for (size_t i = 0; i < flow->n_states && !flow->why; i++) {
        const tarry_promoter_state *state = &r->network->states[promoter->states.from + i];
        r->start[i] = promoter->start[i] - before;
        before = promoter->start[i];
        check_movers(r, state->species);
        if (state->lag == TARRY_NONE)
            continue;
        if (promoter->steady)
            read_dwell(r, state, r->start[i]);
        else
            flow->why = say(r, "the state '%s' lasts a drawn time and the start is not steady",
                            state->name);
    }
    const uint32_t *starts = r->index->reaction_starts;
    for (uint32_t i = starts[r->gene]; i < starts[r->gene + 1] && !flow->why; i++) {
        const tarry_reaction *reaction = &r->network->reactions[r->index->reactions[i]];
        if (reaction->allele == (int32_t)promoter->allele)
            read_move(r, reaction);
    }
}

/* ---- products ------------------------------------------------------------------------------- */

/* A reaction that takes away or makes a product: a decay, or a translation from another product. */
static const char *check_reaction(reader *r, size_t product, uint32_t effect) {
    const uint32_t species = r->flow->products[product].species;
    const tarry_reaction *reaction = &r->network->reactions[r->index->reaction_of[effect]];
    uint32_t reactant = 0;
    double rate = 0;
    bool reads = false;
    if (tarry_flow_initiates(r->network, effect, r->gene) &&
        tarry_flow_change(r->network, effect, species) > 0)
        return NULL;
    const bool linear = tarry_flow_linear(r->network, reaction, &reactant, &rate, &reads);
    const bool decay = linear && reactant == species &&
                       tarry_flow_only_removes(r->network, effect, species);
    const bool own = reaction->gene == (int32_t)r->gene; /* no other is followed */
    const bool translation = own && linear && reactant != species && is_product(r, reactant) &&
                             tarry_flow_change(r->network, effect, reactant) == 0 &&
                             tarry_flow_change(r->network, effect, species) > 0;
    if (!decay && !translation)
        return say(r, "'%s' changes it", reaction->name);
    if (reads)
        return say(r, "the rate of '%s' reads counts of species", reaction->name);
    if (decay)
        r->decay[product] += rate;
    return NULL;
}

/* A completion that changes a product: the end of its own stage, or of the stage before. */
static const char *check_completion(reader *r, size_t product, uint32_t effect) {
    const uint32_t species = r->flow->products[product].species;
    const tarry_lag *lag = &r->network->lags[r->index->lag_of[effect]];
    if (tarry_flow_initiates(r->network, effect, r->gene) &&
        tarry_flow_change(r->network, effect, species) > 0)
        return NULL;
    const bool ends = lag->stage == (int32_t)species &&
                      tarry_flow_change(r->network, effect, species) == -1;
    const bool enters = lag->stage != TARRY_NONE && lag->stage != (int32_t)species &&
                        is_product(r, (uint32_t)lag->stage) &&
                        tarry_flow_change(r->network, effect, species) > 0;
    return ends || enters ? NULL : say(r, "'%s' changes it", lag->name);
}

static void check_product(reader *r, size_t product) {
    tarry_flow_product *p = &r->flow->products[product];
    const uint32_t *starts = r->index->effect_starts;
    for (uint32_t i = starts[p->species]; i < starts[p->species + 1] && !p->why; i++) {
        const uint32_t effect = r->index->effects[i];
        if (draws_amounts(r->network, effect) ||
            (r->index->reaction_of[effect] == TARRY_NONE && r->index->lag_of[effect] == TARRY_NONE))
            p->why = say(r, "'%s' changes it", owner_name(r, effect));
        else if (r->index->reaction_of[effect] != TARRY_NONE)
            p->why = check_reaction(r, product, effect);
        else
            p->why = check_completion(r, product, effect);
    }
}

/* ---- paths ---------------------------------------------------------------------------------- */

/* The way from initiation to a molecule's present place. */
typedef struct trail {
    tarry_flow_step steps[TARRY_FLOW_STEPS];
    size_t n_steps;
    size_t depth; /* products on the way */
    double weight;
    const char *tainted; /* a product on the way whose mean cannot be worked out, or NULL */
} trail;

static void enter(reader *r, size_t product, uint32_t effect, trail way);

/* What an effect makes of the gene's products, but for `except`. */
static void enter_made(reader *r, uint32_t effect, int32_t except, const trail *way) {
    const tarry_range changes = r->network->effects[effect].changes;
    for (uint32_t i = changes.from; i < changes.to; i++) {
        const tarry_change *change = &r->network->changes[i];
        if ((int32_t)change->species == except || change->amount <= 0 ||
            !is_product(r, change->species))
            continue;
        trail next = *way;
        next.weight *= change->amount;
        enter(r, (size_t)r->index->product_of[change->species], effect, next);
    }
}

/* Proteins started by the molecules of a species. */
static void enter_translated(reader *r, uint32_t species, const trail *way) {
    const uint32_t *starts = r->index->reaction_starts;
    for (uint32_t i = starts[r->gene]; i < starts[r->gene + 1]; i++) {
        const tarry_reaction *reaction = &r->network->reactions[r->index->reactions[i]];
        uint32_t reactant = 0;
        double rate = 0;
        bool reads = false;
        if (!tarry_flow_linear(r->network, reaction, &reactant, &rate, &reads) ||
            reactant != species || tarry_flow_change(r->network, reaction->effect, species) != 0)
            continue;
        trail next = *way;
        next.weight *= rate;
        enter_made(r, reaction->effect, TARRY_NONE, &next);
    }
}

/* The dwell in a product entered by this effect: a step that is met, and its mean length. */
static const char *dwell_in(reader *r, size_t product, int32_t lag, tarry_flow_step *step,
                            double *mean) {
    const double decay = r->decay[product];
    if (lag != TARRY_NONE && (decay > 0 || r->network->lags[lag].may_be_lost))
        return "its molecules are lost while they are under way";
    if (lag != TARRY_NONE && r->network->lags[lag].in_order)
        return "its molecules wait for those before them";
    if (lag == TARRY_NONE && !(decay > 0))
        return "nothing removes it";
    if (lag == TARRY_NONE) {
        *step = (tarry_flow_step){TARRY_FLOW_DECAY, NULL, decay};
        *mean = 1 / decay;
        return NULL;
    }
    const tarry_law *law = &r->network->segments[0].laws[r->network->lags[lag].delay];
    *step = (tarry_flow_step){TARRY_FLOW_REMAINING, law, 0};
    *mean = tarry_law_mean(law);
    return NULL;
}

static void leave_stage(reader *r, uint32_t species, const tarry_lag *lag, const trail *way) {
    double before = 0;
    for (uint32_t i = lag->outcomes.from; i < lag->outcomes.to; i++) {
        const tarry_outcome *outcome = &r->network->outcomes[i];
        trail next = *way;
        next.weight *= outcome->cumulative - before;
        before = outcome->cumulative;
        next.steps[next.n_steps++] = (tarry_flow_step){
            TARRY_FLOW_WHOLE, &r->network->segments[0].laws[lag->delay], 0};
        enter_made(r, outcome->effect, (int32_t)species, &next);
    }
}

/* A molecule becomes one of this product by this effect. Where the product's mean cannot be worked
 * out, those of what is made from it cannot either. */
static void enter(reader *r, size_t product, uint32_t effect, trail way) {
    tarry_flow_product *p = &r->flow->products[product];
    tarry_flow_step step = {TARRY_FLOW_DECAY, NULL, 0};
    double mean = 0;
    const int32_t lag = tarry_flow_stage_lag(r->network, effect, p->species);
    if (!p->why && way.tainted)
        p->why = say(r, "it is made from '%s', whose mean cannot be worked out", way.tainted);
    if (!p->why && way.depth + 2 > TARRY_FLOW_STEPS)
        p->why = "it is made in too many steps";
    if (!p->why)
        p->why = dwell_in(r, product, lag, &step, &mean);
    if (++way.depth + 1 > TARRY_FLOW_STEPS || r->short_of_memory)
        return;
    if (p->why)
        way.tainted = r->network->species[p->species].name;
    trail met = way;
    if (!p->why) {
        met.steps[met.n_steps++] = step;
        met.weight *= mean;
        r->short_of_memory |= tarry_flow_add_path(p, met.steps, met.n_steps, met.weight, r->arena);
    }
    if (lag != TARRY_NONE)
        leave_stage(r, p->species, &r->network->lags[lag], &way);
    enter_translated(r, p->species, &met);
}

/* All initiations of the gene make the same: the first one stands for them. */
static uint32_t first_initiation(const reader *r) {
    const tarry_network *network = r->network;
    const uint32_t *starts = r->index->reaction_starts;
    for (uint32_t i = starts[r->gene]; i < starts[r->gene + 1]; i++) {
        const uint32_t effect = network->reactions[r->index->reactions[i]].effect;
        if (tarry_flow_initiates(network, effect, r->gene))
            return effect;
    }
    const tarry_range states = first_promoter(r)->states;
    for (uint32_t s = states.from; s < states.to; s++) {
        if (network->states[s].lag == TARRY_NONE)
            continue;
        const tarry_range outcomes = network->lags[network->states[s].lag].outcomes;
        for (uint32_t k = outcomes.from; k < outcomes.to; k++)
            if (tarry_flow_initiates(network, network->outcomes[k].effect, r->gene))
                return network->outcomes[k].effect;
    }
    return network->n_effects;
}

/* ---- the whole ------------------------------------------------------------------------------ */

static int make_room(reader *r) {
    tarry_flow *flow = r->flow;
    const size_t n = flow->n_states;
    r->start = tarry_arena_calloc(r->arena, n, sizeof *r->start);
    r->moves = tarry_arena_calloc(r->arena, n, n * sizeof *r->moves);
    r->initiation = tarry_arena_calloc(r->arena, n, sizeof *r->initiation);
    r->decay = tarry_arena_calloc(r->arena, flow->n_products, sizeof *r->decay);
    flow->products = tarry_arena_calloc(r->arena, flow->n_products, sizeof *flow->products);
    flow->start = r->start;
    flow->moves = r->moves;
    flow->initiation = r->initiation;
    return !r->start || !r->moves || !r->initiation || !r->decay || !flow->products;
}

int tarry_flow_read(const tarry_flow_index *index, uint32_t gene, tarry_arena *arena,
                    tarry_flow *flow, tarry_error *error) {
    const tarry_network *network = index->network;
    const tarry_gene *g = &network->genes[gene];
    reader r = {.index = index, .network = network, .gene = gene, .arena = arena, .flow = flow};
    const tarry_range states = first_promoter(&r)->states;
    *flow = (tarry_flow){.n_states = states.to - states.from,
                         .n_copies = g->n_copies,
                         .n_products = g->products.to - g->products.from};
    if (make_room(&r))
        return tarry_fail_memory(error, "the flow of a gene");
    for (size_t i = 0; i < flow->n_products; i++)
        flow->products[i].species = network->products[g->products.from + i];
    read_promoter(&r);
    if (!flow->why) {
        for (size_t i = 0; i < flow->n_products; i++)
            check_product(&r, i);
        const uint32_t effect = first_initiation(&r);
        const trail way = {.weight = 1};
        if (effect < network->n_effects)
            enter_made(&r, effect, TARRY_NONE, &way);
    }
    return r.short_of_memory ? tarry_fail_memory(error, "the flow of a gene") : 0;
}
