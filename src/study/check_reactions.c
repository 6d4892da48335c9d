/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Reactions, completions and delays as a reader would write them down. */

#include "study/check_page.h"

#include "base/memory.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

/* What reactions of one allele do is told once, for the sums over alleles. */
typedef struct writer {
    tarry_page *page;
    const tarry_network *network;
    uint32_t *name_of; /* [species] the species whose name stands for it: itself, or its sum */
} writer;

/* One side of an equation while it is gathered. */
typedef struct side {
    tarry_text text;
    bool any;
} side;

static int writer_init(writer *w, tarry_page *page) {
    const tarry_network *network = page->network;
    *w = (writer){.page = page, .network = network};
    w->name_of = tarry_calloc(network->n_species, sizeof *w->name_of);
    if (!w->name_of)
        return 1;
    for (uint32_t i = 0; i < network->n_species; i++)
        w->name_of[i] = i;
    for (uint32_t p = 0; p < network->n_promoters; p++)
        for (uint32_t i = network->promoters[p].states.from; i < network->promoters[p].states.to;
             i++)
            w->name_of[network->states[i].species] = network->states[i].sum;
    return 0;
}

static void add_amount(const writer *w, side *s, uint32_t species, int64_t n) {
    if (n <= 0)
        return;
    tarry_text_add_string(&s->text, s->any ? " + " : "");
    if (n > 1)
        tarry_text_printf(&s->text, "%lld ", (long long)n);
    tarry_text_add_string(&s->text, w->network->species[w->name_of[species]].name);
    s->any = true;
}

static bool is_sum(const writer *w, uint32_t species) {
    const tarry_species *s = &w->network->species[species];
    return s->role == TARRY_SPECIES_STATE && s->gene != TARRY_NONE &&
           w->network->genes[s->gene].n_copies > 1;
}

/* ---- equations ------------------------------------------------------------------------------ */

static int64_t change_of(const tarry_network *network, const tarry_effect *effect,
                         uint32_t species) {
    for (uint32_t i = effect->changes.from; i < effect->changes.to; i++)
        if (network->changes[i].species == species)
            return network->changes[i].amount;
    return 0;
}

static bool has_factor(const tarry_network *network, const tarry_reaction *reaction,
                       uint32_t species) {
    if (reaction->kind == TARRY_RATE_LINEAR && reaction->species == species)
        return true;
    for (uint32_t i = reaction->factors.from; i < reaction->factors.to; i++)
        if (network->factors[i].species == species)
            return true;
    return false;
}

/* A reactant: what is taken of it, and what is there of it afterwards. */
static void add_reactant(const writer *w, const tarry_effect *effect, uint32_t species, int64_t n,
                         side *left, side *right) {
    add_amount(w, left, species, n);
    add_amount(w, right, species, n + change_of(w->network, effect, species));
}

static void add_reactants(const writer *w, const tarry_reaction *reaction, side *left,
                          side *right) {
    const tarry_network *network = w->network;
    const tarry_effect *effect = &network->effects[reaction->effect];
    for (uint32_t i = reaction->factors.from; i < reaction->factors.to; i++) {
        const tarry_factor *factor = &network->factors[i];
        add_reactant(w, effect, factor->species, (int64_t)factor->used + factor->needed, left,
                     right);
    }
    if (reaction->kind == TARRY_RATE_LINEAR && reaction->factors.from == reaction->factors.to)
        add_reactant(w, effect, reaction->species, 1, left, right);
}

static const char *amount_word(tarry_amount_kind kind) {
    switch (kind) {
    case TARRY_AMOUNT_GEOMETRIC:
        return "geometric";
    case TARRY_AMOUNT_POISSON:
        return "poisson";
    case TARRY_AMOUNT_TABLE:
        break;
    }
    return "table";
}

static void add_random(const writer *w, const tarry_amount *amount, side *right) {
    char mean[TARRY_NUMBER_SIZE];
    double value = 0, before = 0;
    if (amount->kind != TARRY_AMOUNT_TABLE)
        value = w->network->segments[0].means[amount->mean];
    for (uint32_t i = 0; i < amount->n && amount->kind == TARRY_AMOUNT_TABLE; i++) {
        value += amount->values[i] * (amount->cumulative[i] - before);
        before = amount->cumulative[i];
    }
    tarry_number_short(value, 6, mean);
    tarry_text_printf(&right->text, "%s(%s, mean %s) %s", right->any ? " + " : "",
                      amount_word(amount->kind), mean, w->network->species[amount->species].name);
    right->any = true;
}

/* What an effect changes, but for the reactants of `reaction` (may be NULL), told already. */
static void add_changes(const writer *w, const tarry_effect *effect, const tarry_reaction *reaction,
                        side *left, side *right) {
    const tarry_network *network = w->network;
    for (uint32_t i = effect->changes.from; i < effect->changes.to; i++) {
        const tarry_change *change = &network->changes[i];
        if (is_sum(w, change->species) ||
            (reaction && has_factor(network, reaction, change->species)))
            continue;
        add_amount(w, left, change->species, -(int64_t)change->amount);
        add_amount(w, right, change->species, change->amount);
    }
    for (uint32_t i = effect->amounts.from; i < effect->amounts.to; i++)
        add_random(w, &network->amounts[i], right);
}

/* "clasp + pin -> pair" into a column of the sheet. */
static void put_equation(const writer *w, const tarry_effect *effect,
                         const tarry_reaction *reaction, size_t column) {
    side left = {0}, right = {0};
    tarry_text_add(&left.text, "", 0);
    if (reaction)
        add_reactants(w, reaction, &left, &right);
    add_changes(w, effect, reaction, &left, &right);
    const bool failed = left.text.failed || right.text.failed;
    w->page->text->failed = w->page->text->failed || failed;
    tarry_sheet_cell(&w->page->sheet, column, "%s -> %s", left.any ? left.text.data : "nothing",
                     right.any ? right.text.data : "nothing");
    tarry_text_release(&left.text);
    tarry_text_release(&right.text);
}

/* ---- reactions ------------------------------------------------------------------------------ */

/* "; 0.4 from 60 min" for each step that changes a rate, up to two; of a ramp the first value
 * and the last. */
static void add_steps(const writer *w, uint32_t rate, tarry_text *text) {
    const tarry_network *network = w->network;
    int n = 0;
    double before = network->segments[0].rates[rate];
    for (uint32_t k = 1; k < network->n_segments; k++) {
        const double value = network->segments[k].rates[rate];
        if (value == before || network->segments[k].moment == TARRY_MOMENT_RAMP_PART)
            continue;
        before = value;
        if (++n > 2) {
            tarry_text_add_string(text, ", ...");
            return;
        }
        char number[TARRY_NUMBER_SIZE], at[TARRY_NUMBER_SIZE];
        tarry_number_short(value, 6, number);
        tarry_number_short(network->segments[k].start, 6, at);
        tarry_text_printf(text, ", from %s %s on %s", at, network->time_unit, number);
    }
}

static void put_rate(const writer *w, const tarry_reaction *reaction, size_t column) {
    const tarry_network *network = w->network;
    tarry_text text = {0};
    if (reaction->kind == TARRY_RATE_EXPRESSION || reaction->kind == TARRY_RATE_PROPENSITY) {
        tarry_text_printf(&text, "%s %s",
                          reaction->kind == TARRY_RATE_EXPRESSION ? "rate" : "propensity",
                          network->segments[0].formulas[reaction->rate].text);
    } else {
        char number[TARRY_NUMBER_SIZE];
        tarry_number_short(network->segments[0].rates[reaction->rate], 6, number);
        tarry_text_printf(&text, "rate %s /%s", number, network->time_unit);
        add_steps(w, reaction->rate, &text);
    }
    if (reaction->allele != TARRY_NONE && network->genes[reaction->gene].n_copies > 1)
        tarry_text_printf(&text, " (each of %u alleles)", network->genes[reaction->gene].n_copies);
    w->page->text->failed = w->page->text->failed || text.failed;
    tarry_sheet_cell(&w->page->sheet, column, "%s", text.data ? text.data : "");
    tarry_text_release(&text);
}

/* Lags that begin, other than the dwell in a stage or a state, which the equation shows. */
static void put_lags(const writer *w, const tarry_effect *effect, size_t column) {
    tarry_text text = {0};
    for (uint32_t i = effect->schedules.from; i < effect->schedules.to; i++) {
        const tarry_lag *lag = &w->network->lags[w->network->schedules[i]];
        if (lag->stage == TARRY_NONE && lag->promoter == TARRY_NONE)
            tarry_text_printf(&text, "%s%s", text.size > 0 ? ", " : "starts ", lag->name);
    }
    w->page->text->failed = w->page->text->failed || text.failed;
    if (text.size > 0)
        tarry_sheet_cell(&w->page->sheet, column, "%s", text.data);
    tarry_text_release(&text);
}

void tarry_page_reactions(tarry_page *page) {
    const tarry_network *network = page->network;
    writer w;
    size_t all = 0, shown = 0;
    for (uint32_t i = 0; i < network->n_reactions; i++)
        all += network->reactions[i].allele <= 0;
    if (all == 0)
        return;
    tarry_page_head(page, "Reactions", (long long)all);
    if (writer_init(&w, page))
        page->text->failed = true;
    for (uint32_t i = 0; i < network->n_reactions && shown < TARRY_CHECK_MOST && w.name_of; i++) {
        const tarry_reaction *reaction = &network->reactions[i];
        if (reaction->allele > 0)
            continue;
        shown++;
        tarry_sheet_row(&page->sheet);
        tarry_sheet_cell(&page->sheet, 0, "%s", reaction->name);
        put_equation(&w, &network->effects[reaction->effect], reaction, 1);
        put_rate(&w, reaction, 2);
        put_lags(&w, &network->effects[reaction->effect], 3);
    }
    free(w.name_of);
    tarry_page_list(page, shown, all, "reactions");
}

/* ---- completions ---------------------------------------------------------------------------- */

/* What an allele of its own has is told for the first. */
static bool is_told(const tarry_lag *lag) {
    return lag->allele == 0;
}

/* "with probability 0.9", "what lacks is skipped". */
static void put_remarks(const writer *w, double probability, bool skips) {
    char number[TARRY_NUMBER_SIZE];
    if (probability < 1) {
        tarry_number_short(probability, 6, number);
        tarry_sheet_cell(&w->page->sheet, 3, "probability %s%s", number,
                         skips ? ", skipped where short" : "");
    } else if (skips) {
        tarry_sheet_cell(&w->page->sheet, 3, "skipped where short");
    }
}

/* "or lost  vela.nuclear -> nothing  rate 0.01 /min" */
static void put_loss(const writer *w, const tarry_lag *lag) {
    tarry_text text = {0};
    char number[TARRY_NUMBER_SIZE];
    tarry_number_short(w->network->segments[0].rates[lag->loss_rate], 6, number);
    tarry_text_printf(&text, "rate %s /%s", number, w->network->time_unit);
    add_steps(w, lag->loss_rate, &text);
    w->page->text->failed = w->page->text->failed || text.failed;
    tarry_sheet_row(&w->page->sheet);
    tarry_sheet_cell(&w->page->sheet, 1, "or lost");
    put_equation(w, &w->network->effects[lag->loss_effect], NULL, 2);
    tarry_sheet_cell(&w->page->sheet, 3, "%s", text.data ? text.data : "");
    tarry_text_release(&text);
}

/* "after gamma", "after gamma, none overtakes (headway 0.1 min)" */
static void put_after(const writer *w, const tarry_lag *lag) {
    char number[TARRY_NUMBER_SIZE];
    tarry_number_short(lag->headway, 6, number);
    if (lag->in_order)
        tarry_sheet_cell(&w->page->sheet, 1, "after %s, none overtakes (headway %s %s)",
                         lag->delay_name, number, w->network->time_unit);
    else
        tarry_sheet_cell(&w->page->sheet, 1, "after %s", lag->delay_name);
}

static void put_lag(const writer *w, const tarry_lag *lag) {
    const tarry_network *network = w->network;
    double before = 0;
    for (uint32_t i = lag->outcomes.from; i < lag->outcomes.to; i++) {
        const tarry_outcome *outcome = &network->outcomes[i];
        const tarry_effect *effect = &network->effects[outcome->effect];
        tarry_sheet_row(&w->page->sheet);
        if (i == lag->outcomes.from) {
            tarry_sheet_cell(&w->page->sheet, 0, "%s", lag->name);
            put_after(w, lag);
        }
        put_equation(w, effect, NULL, 2);
        put_remarks(w, outcome->cumulative - before,
                    effect->skip_short && effect->demands.from < effect->demands.to);
        put_lags(w, effect, 4);
        before = outcome->cumulative;
    }
    if (lag->may_be_lost)
        put_loss(w, lag);
}

void tarry_page_completions(tarry_page *page) {
    const tarry_network *network = page->network;
    writer w;
    size_t all = 0, shown = 0;
    for (uint32_t i = 0; i < network->n_lags; i++)
        all += is_told(&network->lags[i]);
    if (all == 0)
        return;
    tarry_page_head(page, "Completions", (long long)all);
    if (writer_init(&w, page))
        page->text->failed = true;
    for (uint32_t i = 0; i < network->n_lags && shown < TARRY_CHECK_MOST && w.name_of; i++) {
        if (!is_told(&network->lags[i]))
            continue;
        shown++;
        put_lag(&w, &network->lags[i]);
    }
    free(w.name_of);
    tarry_page_list(page, shown, all, "completions");
}

/* ---- delays --------------------------------------------------------------------------------- */

static void add_parameter(tarry_text *text, const char *name, double value) {
    char number[TARRY_NUMBER_SIZE];
    tarry_number_short(value, 6, number);
    tarry_text_printf(text, "%s%s %s", text->size > 0 ? ", " : "", name, number);
}

static const char *const parameter_names[TARRY_N_LAWS][2] = {
    [TARRY_LAW_FIXED] = {"length", NULL},
    [TARRY_LAW_EXPONENTIAL] = {NULL, NULL},
    [TARRY_LAW_ERLANG] = {NULL, "steps"},
    [TARRY_LAW_GAMMA] = {NULL, NULL},
    [TARRY_LAW_LOGNORMAL] = {NULL, NULL},
    [TARRY_LAW_NORMAL] = {"before truncation at 0: mean", "sd"},
    [TARRY_LAW_UNIFORM] = {"from", "to"},
    [TARRY_LAW_WEIBULL] = {"scale", "shape"},
};

/* What mean and sd do not say of a law. */
static void put_parameters(tarry_page *page, const tarry_law *law, size_t column) {
    tarry_text text = {0};
    if (parameter_names[law->kind][0])
        add_parameter(&text, parameter_names[law->kind][0], law->a);
    if (parameter_names[law->kind][1])
        add_parameter(&text, parameter_names[law->kind][1], law->b);
    if (law->kind == TARRY_LAW_BINS || law->kind == TARRY_LAW_VALUES)
        tarry_text_printf(&text, "%zu %s", law->n, law->kind == TARRY_LAW_BINS ? "bins" : "values");
    for (size_t i = 0; i < law->n && (law->kind == TARRY_LAW_MIX || law->kind == TARRY_LAW_TOTAL);
         i++) {
        char number[TARRY_NUMBER_SIZE];
        tarry_text_add_string(&text, i == 0 ? "" : law->kind == TARRY_LAW_MIX ? ", " : ", then ");
        if (law->kind == TARRY_LAW_MIX) {
            tarry_number_short(law->weights[i], 6, number);
            tarry_text_printf(&text, "%s ", number);
        }
        tarry_text_add_string(&text, tarry_law_family_of(law->parts[i].kind)->word);
    }
    page->text->failed = page->text->failed || text.failed;
    if (text.size > 0)
        tarry_sheet_cell(&page->sheet, column, "%s", text.data);
    tarry_text_release(&text);
}

static void put_delay(tarry_page *page, const tarry_segment *segment, uint32_t delay,
                      const char *name) {
    const tarry_law *law = &segment->laws[delay];
    char mean[TARRY_NUMBER_SIZE], sd[TARRY_NUMBER_SIZE];
    tarry_number_short(tarry_law_mean(law), 6, mean);
    tarry_number_short(tarry_law_sd(law), 6, sd);
    tarry_sheet_row(&page->sheet);
    tarry_sheet_cell(&page->sheet, 0, "%s", name);
    tarry_sheet_cell(&page->sheet, 1, "%s", tarry_law_family_of(law->kind)->word);
    tarry_sheet_cell(&page->sheet, 2, "%s", mean);
    tarry_sheet_cell(&page->sheet, 3, "%s", sd);
    put_parameters(page, law, 4);
}

/* A delay in every segment in which it differs from the one shown before; of a ramp the first value
 * and the last. */
static void put_delay_steps(tarry_page *page, uint32_t delay, const char *name) {
    const tarry_network *network = page->network;
    put_delay(page, &network->segments[0], delay, name);
    const tarry_segment *before = &network->segments[0];
    for (uint32_t k = 1; k < network->n_segments; k++) {
        const tarry_segment *segment = &network->segments[k];
        if (segment->moment == TARRY_MOMENT_RAMP_PART ||
            tarry_law_same(&before->laws[delay], &segment->laws[delay]))
            continue;
        before = segment;
        char at[TARRY_NUMBER_SIZE];
        tarry_number_short(segment->start, 6, at);
        put_delay(page, segment, delay, "");
        tarry_sheet_cell(&page->sheet, 0, "  from %s %s", at, network->time_unit);
    }
}

void tarry_page_delays(tarry_page *page) {
    const tarry_network *network = page->network;
    const char **names = tarry_calloc(network->n_delays, sizeof *names);
    size_t all = 0, shown = 0;
    if (!names)
        page->text->failed = true;
    for (uint32_t i = network->n_lags; names && i-- > 0;) {
        all += names[network->lags[i].delay] == NULL;
        names[network->lags[i].delay] = network->lags[i].delay_name;
    }
    if (all > 0) {
        tarry_page_head(page, "Delays", (long long)all);
        tarry_sheet_row(&page->sheet);
        tarry_sheet_cell(&page->sheet, 2, "mean [%s]", network->time_unit);
        tarry_sheet_cell(&page->sheet, 3, "sd [%s]", network->time_unit);
        page->sheet.right = 1u << 2 | 1u << 3;
    }
    for (uint32_t d = 0; d < network->n_delays && shown < TARRY_CHECK_MOST && all > 0; d++) {
        if (!names[d])
            continue;
        shown++;
        put_delay_steps(page, d, names[d]);
    }
    free(names);
    if (all > 0)
        tarry_page_list(page, shown, all, "delays");
}
