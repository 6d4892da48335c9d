/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "network_text.h"

#include "base/text.h"
#include "reading.h"

#include <check.h>
#include <string.h>

static reading in;
static bool reading_on;
static tarry_text text;

/* ---- reading ------------------------------------------------------------------------------------
 */

static int one_segment(tarry_builder *builder, tarry_error *error) {
    (void)error;
    const tarry_segment segment = {.parameters = builder->values, .text = ""};
    return TARRY_APPEND(&builder->segments, segment);
}

static reader *const readers[] = {
    tarry_read_parameters, tarry_read_delays, tarry_declare_genes,
    tarry_declare_species, tarry_read_genes,  tarry_read_reactions,
    tarry_read_bursts,     one_segment,       tarry_finish,
};

enum { N_READERS = sizeof readers / sizeof *readers };

const tarry_network *network_of(const char *model) {
    network_end();
    reading_start(&in, model, NULL, 0);
    reading_on = true;
    reading_pass(&in, readers, N_READERS);
    return &in.model.network;
}

const char *network_notes(void) {
    text.size = 0;
    tarry_text_add_string(&text, "");
    for (size_t i = 0; i < in.model.notes.n; i++)
        tarry_text_printf(&text, "%s\n", in.model.notes.lines[i]);
    return text.data;
}

void network_refused(const char *model, int line, int column, const char *words) {
    network_refused_as(model, TARRY_INPUT, line, column, words);
}

void network_refused_as(const char *model, tarry_code code, int line, int column,
                        const char *words) {
    reading_refused(model, NULL, 0, readers, N_READERS, code, line, column, words);
}

void network_end(void) {
    if (reading_on)
        reading_end(&in);
    reading_on = false;
    tarry_text_release(&text);
}

/* ---- lines --------------------------------------------------------------------------------------
 */

static void start_text(void) {
    text.size = 0;
    tarry_text_add_string(&text, "");
}

const char *species_text(const tarry_network *network) {
    static const char *const roles[] = {"plain", "state", "allele", "stage", "product"};
    start_text();
    for (uint32_t i = 0; i < network->n_species; i++) {
        const tarry_species *species = &network->species[i];
        tarry_text_printf(&text, "%s %s of %d", roles[species->role], species->name, species->gene);
        if (species->start != 0) {
            tarry_text_add_string(&text, " from ");
            tarry_text_add_number(&text, species->start);
        }
        tarry_text_add_string(&text, "\n");
    }
    return text.data;
}

static void add_amount(const tarry_network *network, const tarry_amount *amount) {
    const char *name = network->species[amount->species].name;
    const double mean = amount->kind == TARRY_AMOUNT_TABLE
                            ? 0
                            : network->segments[0].means[amount->mean];
    if (amount->kind == TARRY_AMOUNT_GEOMETRIC)
        tarry_text_printf(&text, ", geometric %s %u ", name, amount->least);
    else
        tarry_text_printf(&text, ", %s %s ",
                          amount->kind == TARRY_AMOUNT_POISSON ? "poisson" : "table", name);
    if (amount->kind != TARRY_AMOUNT_TABLE)
        tarry_text_add_number(&text, mean);
    for (uint32_t i = 0; i < amount->n; i++) {
        tarry_text_add_number(&text, amount->values[i]);
        tarry_text_add_string(&text, ":");
        tarry_text_add_number(&text, amount->cumulative[i]);
        tarry_text_add_string(&text, i + 1 < amount->n ? " " : "");
    }
}

static void add_effect(const tarry_network *network, uint32_t index) {
    static const char *const marks[] = {"open", "close", "count"};
    const tarry_effect *effect = &network->effects[index];
    for (uint32_t i = effect->demands.from; i < effect->demands.to; i++)
        tarry_text_printf(&text, ", %s %u %s", effect->skip_short ? "skip without" : "needs",
                          network->demands[i].amount,
                          network->species[network->demands[i].species].name);
    for (uint32_t i = effect->changes.from; i < effect->changes.to; i++)
        tarry_text_printf(&text, ", %+d %s", network->changes[i].amount,
                          network->species[network->changes[i].species].name);
    for (uint32_t i = effect->amounts.from; i < effect->amounts.to; i++)
        add_amount(network, &network->amounts[i]);
    for (uint32_t i = effect->marks.from; i < effect->marks.to; i++)
        tarry_text_printf(&text, ", %s %u", marks[network->marks[i].kind], network->marks[i].track);
    for (uint32_t i = effect->schedules.from; i < effect->schedules.to; i++)
        tarry_text_printf(&text, ", lag %u", network->schedules[i]);
    for (uint32_t i = effect->affected.from; i < effect->affected.to; i++)
        tarry_text_printf(&text, "%s%u", i == effect->affected.from ? "; affects " : " ",
                          network->affected[i]);
}

const char *reactions_text(const tarry_network *network) {
    static const char *const kinds[] = {"constant", "linear", "ways", "expression", "propensity"};
    start_text();
    for (uint32_t i = 0; i < network->n_reactions; i++) {
        const tarry_reaction *reaction = &network->reactions[i];
        tarry_text_printf(&text, "%u. %s: %s ", i, reaction->name, kinds[reaction->kind]);
        if (reaction->kind == TARRY_RATE_EXPRESSION || reaction->kind == TARRY_RATE_PROPENSITY)
            tarry_text_add_string(&text, network->segments[0].formulas[reaction->rate].text);
        else
            tarry_text_add_number(&text, network->segments[0].rates[reaction->rate]);
        for (uint32_t j = reaction->factors.from; j < reaction->factors.to; j++) {
            const tarry_factor *factor = &network->factors[j];
            tarry_text_printf(&text, " %s(%u+%u)", network->species[factor->species].name,
                              factor->used, factor->needed);
        }
        add_effect(network, reaction->effect);
        tarry_text_add_string(&text, "\n");
    }
    return text.data;
}

const char *lags_text(const tarry_network *network) {
    start_text();
    for (uint32_t i = 0; i < network->n_lags; i++) {
        const tarry_lag *lag = &network->lags[i];
        tarry_text_printf(&text, "%u. %s %s ", i, lag->name, lag->delay_name);
        tarry_text_add_number(&text, tarry_law_mean(&network->segments[0].laws[lag->delay]));
        tarry_text_printf(&text, " in %s",
                          lag->stage == TARRY_NONE ? "-" : network->species[lag->stage].name);
        for (uint32_t j = lag->outcomes.from; j < lag->outcomes.to; j++) {
            tarry_text_add_string(&text, " | ");
            tarry_text_add_number(&text, network->outcomes[j].cumulative);
            add_effect(network, network->outcomes[j].effect);
        }
        tarry_text_add_string(&text, "\n");
    }
    return text.data;
}
