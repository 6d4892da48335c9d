/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Reading a gene back from the network. Only what is recognised is trusted: each effect that
 * changes one of the gene's species must be one met on the way, else what it changes is refused. */

#include "exact/gene.h"

#include "exact/chain.h"

#include "base/error.h"

#include <string.h>

const char *tarry_exact_say(tarry_exact_reader *reader, const char *format, const char *name) {
    const char *text = tarry_arena_format(reader->arena, format, name);
    if (text == NULL)
        reader->short_of_memory = true;
    return text != NULL ? text : "memory is short";
}

bool tarry_exact_rate(const tarry_exact_reader *reader, size_t segment,
                      const tarry_reaction *reaction, double *rate) {
    const tarry_segment *s = &reader->segments[segment];
    if (reaction->kind == TARRY_RATE_PROPENSITY)
        return false;
    if (reaction->kind != TARRY_RATE_EXPRESSION) {
        *rate = s->rates[reaction->rate];
        return true;
    }
    const tarry_expression *formula = &s->formulas[reaction->rate];
    if (formula->n_species > 0)
        return false;
    *rate = tarry_expression_value(formula, NULL, NULL);
    return true;
}

bool tarry_exact_law_stays(const tarry_exact_reader *reader, uint32_t delay) {
    for (size_t s = 1; s < reader->network->n_segments; s++)
        if (!tarry_law_same(&reader->segments[0].laws[delay], &reader->segments[s].laws[delay]))
            return false;
    return true;
}

void tarry_exact_generator(const tarry_exact_gene *gene, size_t regime, double *out) {
    const tarry_exact_regime *r = &gene->regimes[regime];
    for (size_t i = 0; i < gene->n_states * gene->n_states; i++)
        out[i] = r->quiet[i] + r->jump[i];
}

/* ---- effects that are the gene's own --------------------------------------------------------- */

/* What changes the species under way besides its beginning and its end, as the rest of a sentence,
 * or NULL. */
static const char *owner_name(const tarry_exact_reader *r, uint32_t effect) {
    const int32_t reaction = r->index->reaction_of[effect], lag = r->index->lag_of[effect];
    if (reaction != TARRY_NONE)
        return r->network->reactions[reaction].name;
    return lag != TARRY_NONE ? r->network->lags[lag].name : "another event";
}

static bool is_set(const tarry_exact_reader *r, uint32_t species) {
    for (size_t s = 0; s < r->network->n_segments; s++) {
        const tarry_range settings = r->segments[s].settings;
        for (uint32_t i = settings.from; i < settings.to; i++)
            if (r->network->settings[i].species == (int32_t)species)
                return true;
    }
    return false;
}

static bool is_own_reaction(const tarry_exact_reader *r, uint32_t effect) {
    const int32_t reaction = r->index->reaction_of[effect];
    return reaction != TARRY_NONE && r->network->reactions[reaction].gene == (int32_t)r->gene->gene;
}

static bool is_own_lag(const tarry_exact_reader *r, uint32_t effect) {
    const int32_t lag = r->index->lag_of[effect];
    return lag != TARRY_NONE && r->network->lags[lag].gene == (int32_t)r->gene->gene;
}

/* All that changes the species is of the gene, and nothing sets it or starts with some of it. */
static const char *check_species(tarry_exact_reader *r, uint32_t species, bool is_state) {
    const uint32_t *starts = r->index->effect_starts;
    for (uint32_t i = starts[species]; i < starts[species + 1]; i++) {
        const uint32_t effect = r->index->effects[i];
        if (!is_own_reaction(r, effect) && !is_own_lag(r, effect))
            return tarry_exact_say(r, "'%s' changes it", owner_name(r, effect));
    }
    if (is_set(r, species))
        return "the protocol sets it";
    return !is_state && r->network->species[species].start != 0 ? "it does not start from 0" : NULL;
}

static void check_promoter(tarry_exact_reader *r) {
    const tarry_network *network = r->network;
    const tarry_range promoters = network->genes[r->gene->gene].promoters;
    for (size_t s = 0; s < network->n_segments; s++) {
        const tarry_range settings = r->segments[s].settings;
        for (uint32_t i = settings.from; i < settings.to; i++)
            if (network->settings[i].species == TARRY_NONE &&
                network->settings[i].promoter >= promoters.from &&
                network->settings[i].promoter < promoters.to)
                r->gene->why = "the protocol sets its promoter";
    }
    const tarry_range states = network->promoters[promoters.from].states;
    for (uint32_t i = states.from; i < states.to && r->gene->why == NULL; i++)
        if (check_species(r, network->states[i].species, true) != NULL)
            r->gene->why = tarry_exact_say(r, "other events move its state '%s'",
                                           network->states[i].name);
}

/* ---- molecules ------------------------------------------------------------------------------- */

/* The product of this gene that the effect makes one of, but for `except`; or TARRY_NONE. */
static int32_t made_by(const tarry_exact_reader *r, uint32_t effect, int64_t except) {
    const tarry_range changes = r->network->effects[effect].changes;
    for (uint32_t i = changes.from; i < changes.to; i++) {
        const tarry_change *change = &r->network->changes[i];
        if (change->amount > 0 && (int64_t)change->species != except &&
            r->index->product_of[change->species] != TARRY_NONE &&
            r->network->species[change->species].gene == (int32_t)r->gene->gene)
            return (int32_t)change->species;
    }
    return TARRY_NONE;
}

/* The same in all segments; else false. *rate is that of the first. */
static bool rate_stays(const tarry_exact_reader *r, const tarry_reaction *reaction, double *rate,
                       bool *reads) {
    bool stays = true;
    *reads = !tarry_exact_rate(r, 0, reaction, rate);
    for (size_t s = 1; s < r->network->n_segments && !*reads; s++) {
        double other = 0;
        *reads = !tarry_exact_rate(r, s, reaction, &other);
        stays = stays && other == *rate;
    }
    return stays && !*reads;
}

/* One molecule of the species is what the reaction needs. */
static bool acts_on(const tarry_network *network, const tarry_reaction *reaction,
                    uint32_t species) {
    const tarry_range factors = reaction->factors;
    if (reaction->kind == TARRY_RATE_LINEAR)
        return reaction->species == species;
    return factors.to - factors.from == 1 && network->factors[factors.from].species == species &&
           network->factors[factors.from].used + network->factors[factors.from].needed == 1;
}

/* Decays and translations of the stage's molecules, from the gene's reactions. *translated: an
 * effect that begins a protein, or TARRY_NONE. */
static void read_fate(tarry_exact_reader *r, tarry_exact_stage *stage, int64_t *translated) {
    const uint32_t *starts = r->index->reaction_starts;
    const uint32_t gene = r->gene->gene;
    for (uint32_t i = starts[gene]; i < starts[gene + 1]; i++) {
        const tarry_reaction *reaction = &r->network->reactions[r->index->reactions[i]];
        double rate = 0;
        bool reads = false;
        if (!acts_on(r->network, reaction, stage->species))
            continue;
        const bool stays = rate_stays(r, reaction, &rate, &reads);
        const bool decay = tarry_flow_only_removes(r->network, reaction->effect, stage->species);
        const char **why = decay ? &stage->why : &r->gene->why_translation;
        if (decay)
            stage->rate += rate;
        else
            stage->translation += rate;
        if (!decay)
            *translated = reaction->effect;
        if (*why == NULL && !stays)
            *why = tarry_exact_say(r,
                                   reads ? "the rate of '%s' reads counts of species"
                                         : "the protocol changes the rate of '%s'",
                                   reaction->name);
    }
}

/* The dwell of a molecule that the effect puts into the stage. *end: the effect at its end. */
static void read_dwell(tarry_exact_reader *r, tarry_exact_stage *stage, uint32_t effect,
                       int64_t *end) {
    const int32_t index = tarry_flow_stage_lag(r->network, effect, stage->species);
    *end = TARRY_NONE;
    if (index == TARRY_NONE)
        return;
    const tarry_lag *lag = &r->network->lags[index];
    stage->law = &r->segments[0].laws[lag->delay];
    if (lag->outcomes.to - lag->outcomes.from == 1)
        *end = r->network->outcomes[lag->outcomes.from].effect;
    if (stage->why == NULL && lag->in_order)
        stage->why = "its molecules keep in order";
    if (stage->why == NULL && !tarry_exact_law_stays(r, lag->delay))
        stage->why = tarry_exact_say(r, "the protocol changes the delay '%s'", lag->delay_name);
    if (!lag->may_be_lost)
        return;
    stage->rate += r->segments[0].rates[lag->loss_rate];
    for (size_t s = 1; s < r->network->n_segments && stage->why == NULL; s++)
        if (r->segments[s].rates[lag->loss_rate] != r->segments[0].rates[lag->loss_rate])
            stage->why = "the protocol changes the rate at which it is lost";
}

/* The stages of what `effect` makes; none of them can be worked out where `why` is not NULL.
 * *translated: an effect that begins a protein. */
static int read_chain(tarry_exact_reader *r, int64_t effect, const char *why,
                      tarry_exact_chain *chain, int64_t *translated) {
    int64_t made_before = TARRY_NONE;
    *translated = TARRY_NONE;
    chain->why = why;
    chain->stages = tarry_arena_calloc(r->arena, TARRY_EXACT_MOST_STAGES, sizeof *chain->stages);
    if (chain->stages == NULL)
        return tarry_fail_memory(r->error, "a gene");
    while (effect != TARRY_NONE && chain->n < TARRY_EXACT_MOST_STAGES) {
        const int32_t species = made_by(r, (uint32_t)effect, made_before);
        if (species == TARRY_NONE)
            break;
        tarry_exact_stage *stage = &chain->stages[chain->n++];
        stage->species = (uint32_t)species;
        stage->why = why;
        if (stage->why == NULL)
            stage->why = check_species(r, stage->species, false);
        const uint32_t begins = (uint32_t)effect;
        read_dwell(r, stage, begins, &effect);
        read_fate(r, stage, translated);
        why = stage->why;
        made_before = species;
    }
    return 0;
}

/* All initiations make the same: the first one stands for them. */
static int64_t first_initiation(const tarry_exact_reader *r) {
    const uint32_t *starts = r->index->reaction_starts;
    const uint32_t gene = r->gene->gene;
    for (uint32_t i = starts[gene]; i < starts[gene + 1]; i++) {
        const uint32_t effect = r->network->reactions[r->index->reactions[i]].effect;
        if (tarry_flow_initiates(r->network, effect, gene))
            return effect;
    }
    return TARRY_NONE;
}

/* Proteins need all that is known of the transcript, and the rates of translation. */
static const char *why_no_proteins(const tarry_exact_gene *gene) {
    for (size_t i = 0; i < gene->transcript.n; i++)
        if (gene->transcript.stages[i].why != NULL)
            return gene->transcript.stages[i].why;
    return gene->why_translation;
}

int tarry_exact_gene_read(const tarry_flow_index *index, const tarry_segment *segments,
                          uint32_t gene, tarry_arena *arena, tarry_exact_gene *out,
                          tarry_error *error) {
    tarry_exact_reader r = {.index = index,
                            .network = index->network,
                            .segments = segments,
                            .arena = arena,
                            .gene = out,
                            .error = error};
    int64_t begins = TARRY_NONE, none = TARRY_NONE;
    *out = (tarry_exact_gene){.gene = gene, .n_copies = index->network->genes[gene].n_copies};
    check_promoter(&r);
    int code = out->why == NULL ? tarry_exact_read_promoter(&r) : 0;
    if (code == 0)
        code = read_chain(&r, first_initiation(&r), NULL, &out->transcript, &begins);
    if (code == 0 && out->why == NULL)
        code = tarry_exact_begin_regimes(out, error);
    if (code == 0)
        code = read_chain(&r, begins, why_no_proteins(out), &out->protein, &none);
    if (code == 0 && r.short_of_memory)
        code = tarry_fail_memory(error, "a gene");
    return code;
}
