/* SPDX-License-Identifier: GPL-3.0-or-later */

/* What looks like a slip in a model. Each check is a function; what it says is a whole sentence
 * that tells what would follow. */

#include "model/analysis.h"

#include "base/error.h"
#include "base/number.h"
#include "base/text.h"

#include <math.h>
#include <stdarg.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

enum { MOST_TOLD = 10 }; /* of one kind */

typedef struct teller {
    const tarry_network *network;
    tarry_notes *notes;
    tarry_error *error;
    size_t n; /* of the kind at hand */
    int code;
} teller;

static void tell(teller *t, tarry_place place, const char *format, ...)
    __attribute__((format(printf, 3, 4)));

static void tell(teller *t, tarry_place place, const char *format, ...) {
    char text[768];
    if (t->n++ >= MOST_TOLD || t->code)
        return;
    va_list arguments;
    va_start(arguments, format);
    vsnprintf(text, sizeof text, format, arguments);
    va_end(arguments);
    t->code = tarry_notes_add(t->notes, place, t->error, "%s", text);
}

/* End one kind: say how many were not told. */
static void close_kind(teller *t, const char *what) {
    if (t->n > MOST_TOLD && !t->code)
        t->code = tarry_notes_add(t->notes, (tarry_place){0}, t->error, "and %zu more %s",
                                  t->n - MOST_TOLD, what);
    t->n = 0;
}

static const char *number(double value, char out[TARRY_NUMBER_SIZE]) {
    tarry_number_write(value, out);
    return out;
}

/* ---- what never happens --------------------------------------------------------------------- */

static void find_makers(const tarry_network *network, bool *has_maker) {
    for (uint32_t e = 0; e < network->n_effects; e++) {
        const tarry_effect *effect = &network->effects[e];
        for (uint32_t i = effect->changes.from; i < effect->changes.to; i++)
            if (network->changes[i].amount > 0)
                has_maker[network->changes[i].species] = true;
        for (uint32_t i = effect->amounts.from; i < effect->amounts.to; i++)
            has_maker[network->amounts[i].species] = true;
    }
}

static void tell_absent(teller *t, const tarry_reach *reach, const bool *has_maker) {
    const tarry_network *network = t->network;
    for (uint32_t i = 0; i < network->n_species; i++) {
        const tarry_species *species = &network->species[i];
        if (species->role == TARRY_SPECIES_ALLELE || tarry_reach_has(reach, i, 1))
            continue;
        if (species->role == TARRY_SPECIES_STATE)
            tell(t, species->place, "no promoter is ever in the state '%s'", species->name);
        else if (!has_maker[i])
            tell(t, species->place, "nothing makes '%s', and it starts at 0", species->name);
    }
    close_kind(t, "species that are never there");
}

/* The reactant of which there is never enough, or n_species. */
static uint32_t find_lacking(const tarry_network *network, const tarry_reaction *reaction,
                             const tarry_reach *reach) {
    if (reaction->kind == TARRY_RATE_LINEAR && !tarry_reach_has(reach, reaction->species, 1))
        return reaction->species;
    for (uint32_t i = reaction->factors.from; i < reaction->factors.to; i++) {
        const tarry_factor *factor = &network->factors[i];
        if (!tarry_reach_has(reach, factor->species, (double)factor->used + factor->needed))
            return factor->species;
    }
    return network->n_species;
}

static void tell_idle(teller *t, const tarry_reach *reach) {
    const tarry_network *network = t->network;
    for (uint32_t i = 0; i < network->n_reactions; i++) {
        const tarry_reaction *reaction = &network->reactions[i];
        if (reach->fires[i] || reaction->allele > 0)
            continue;
        const uint32_t lacking = find_lacking(network, reaction, reach);
        if (lacking < network->n_species)
            tell(t, reaction->place, "'%s' can never fire: there is never enough '%s'",
                 reaction->name, network->species[lacking].name);
        else
            tell(t, reaction->place, "'%s' can never fire: its rate is 0 throughout",
                 reaction->name);
    }
    close_kind(t, "reactions that can never fire");
}

/* ---- rates below 0 -------------------------------------------------------------------------- */

enum { N_PROBES = 9 };

static const double probes[N_PROBES] = {0, 1, 2, 5, 10, 100, 1e3, 1e4, 1e6};

/* Counts at which the formula is negative, sought with all species alike and with one at a time
 * away from its least. False where none is found. */
static bool find_negative(const tarry_expression *formula, const double *least, double *counts,
                          double *value) {
    for (uint32_t odd = 0; odd <= formula->n_species; odd++)
        for (size_t all = 0; all < N_PROBES; all++)
            for (size_t one = 0; one < (odd > 0 ? N_PROBES : 1); one++) {
                for (uint32_t i = 0; i < formula->n_species; i++) {
                    const uint32_t s = formula->species[i];
                    counts[s] = least[s] + probes[i + 1 == odd ? one : all];
                }
                *value = tarry_expression_value(formula, NULL, counts);
                if (*value < 0)
                    return true;
            }
    return false;
}

static void say_counts(const tarry_network *network, const tarry_expression *formula,
                       const double *counts, tarry_text *text) {
    for (uint32_t i = 0; i < formula->n_species && i < 6; i++) {
        tarry_text_printf(text, "%s'%s' = ", i > 0 ? ", " : "",
                          network->species[formula->species[i]].name);
        tarry_text_add_number(text, counts[formula->species[i]]);
    }
}

static void set_least(const tarry_network *network, const tarry_reaction *reaction, double *least,
                      bool clear) {
    for (uint32_t i = reaction->factors.from; i < reaction->factors.to; i++) {
        const tarry_factor *factor = &network->factors[i];
        least[factor->species] = clear ? 0 : (double)factor->used + factor->needed;
    }
}

/* Tell once a reaction, by the first segment that shows it. */
static void tell_one_negative(teller *t, const tarry_reaction *reaction, double *least,
                              double *counts) {
    const tarry_network *network = t->network;
    for (uint32_t k = 0; k < network->n_segments; k++) {
        const tarry_expression *formula = &network->segments[k].formulas[reaction->rate];
        const char *kind = reaction->kind == TARRY_RATE_PROPENSITY ? "propensity" : "rate";
        double value = 0;
        char out[TARRY_NUMBER_SIZE];
        if (tarry_analysis_range(formula, least).low >= 0 ||
            !find_negative(formula, least, counts, &value))
            continue;
        tarry_text where = {0};
        say_counts(network, formula, counts, &where);
        tell(t, reaction->place,
             "the %s of '%s' (%s) would be %s with %s, which stops the run; max(0, ...) keeps it "
             "from going below 0",
             kind, reaction->name, formula->text, number(value, out),
             where.data ? where.data : "some counts");
        tarry_text_release(&where);
        return;
    }
}

static void tell_negative(teller *t) {
    const tarry_network *network = t->network;
    double *least = tarry_calloc(network->n_species, sizeof *least);
    double *counts = tarry_calloc(network->n_species, sizeof *counts);
    if (!least || !counts)
        t->code = tarry_fail_memory(t->error, "the bounds of rates");
    for (uint32_t i = 0; i < network->n_reactions && !t->code; i++) {
        const tarry_reaction *reaction = &network->reactions[i];
        const bool formula = reaction->kind == TARRY_RATE_EXPRESSION ||
                             reaction->kind == TARRY_RATE_PROPENSITY;
        if (!formula || reaction->allele > 0)
            continue;
        set_least(network, reaction, least, false);
        tell_one_negative(t, reaction, least, counts);
        set_least(network, reaction, least, true);
    }
    free(least);
    free(counts);
    close_kind(t, "rates that would go below 0");
}

/* ---- waits ---------------------------------------------------------------------------------- */

static void tell_one_long(teller *t, const tarry_lag *lag) {
    const tarry_network *network = t->network;
    for (uint32_t k = 0; k < network->n_segments; k++) {
        const double mean = tarry_law_mean(&network->segments[k].laws[lag->delay]);
        char long_text[TARRY_NUMBER_SIZE], until[TARRY_NUMBER_SIZE];
        if (!(mean > network->run.until))
            continue;
        tell(t, lag->place,
             "the delay '%s' of '%s' is %s %s long on average, longer than the record of %s %s",
             lag->delay_name, lag->name, number(mean, long_text), network->time_unit,
             number(network->run.until, until), network->time_unit);
        return;
    }
}

static void tell_long(teller *t, const tarry_reach *reach) {
    bool *told = tarry_calloc(t->network->n_delays, sizeof *told);
    if (!told)
        t->code = tarry_fail_memory(t->error, "the delays of a model");
    for (uint32_t i = 0; i < t->network->n_lags && !t->code; i++) {
        const tarry_lag *lag = &t->network->lags[i];
        if (reach->runs[i] && !told[lag->delay])
            tell_one_long(t, lag);
        told[lag->delay] = true;
    }
    free(told);
    close_kind(t, "delays longer than the record");
}

static void tell_changed_delays(teller *t, const tarry_segment *before, const tarry_segment *after,
                                const tarry_lag *const *lag_of) {
    char at[TARRY_NUMBER_SIZE];
    if (before->laws == after->laws)
        return;
    for (uint32_t d = 0; d < t->network->n_delays; d++)
        if (lag_of[d] && !tarry_law_same(&before->laws[d], &after->laws[d]))
            tell(t, lag_of[d]->place,
                 "the step at %s %s changes the delay '%s': what waits already keeps the length "
                 "it was drawn with",
                 number(after->start, at), t->network->time_unit, lag_of[d]->delay_name);
}

static void tell_changed_losses(teller *t, const tarry_segment *before,
                                const tarry_segment *after) {
    char at[TARRY_NUMBER_SIZE];
    if (before->rates == after->rates)
        return;
    for (uint32_t i = 0; i < t->network->n_lags; i++) {
        const tarry_lag *lag = &t->network->lags[i];
        if (lag->may_be_lost && lag->allele == 0 &&
            before->rates[lag->loss_rate] != after->rates[lag->loss_rate])
            tell(t, lag->place,
                 "the step at %s %s changes the rate of loss in '%s': what is there already keeps "
                 "the "
                 "time to loss it was drawn with",
                 number(after->start, at), t->network->time_unit, lag->name);
    }
}

static void tell_changed_lags(teller *t) {
    const tarry_network *network = t->network;
    const tarry_lag **lag_of = tarry_calloc(network->n_delays, sizeof *lag_of);
    if (!lag_of) {
        t->code = tarry_fail_memory(t->error, "the delays of a model");
        return;
    }
    for (uint32_t i = network->n_lags; i-- > 0;)
        lag_of[network->lags[i].delay] = &network->lags[i];
    for (uint32_t k = 1; k < network->n_segments && !t->code; k++)
        if (network->segments[k].moment == TARRY_MOMENT_STEP) {
            tell_changed_delays(t, &network->segments[k - 1], &network->segments[k], lag_of);
            tell_changed_losses(t, &network->segments[k - 1], &network->segments[k]);
        }
    free(lag_of);
    close_kind(t, "steps that change a delay");
}

/* ---- all ------------------------------------------------------------------------------------ */

int tarry_analysis_slips(const tarry_network *network, tarry_notes *notes, tarry_error *error) {
    teller t = {.network = network, .notes = notes, .error = error};
    tarry_reach reach = {0};
    bool *has_maker = tarry_calloc(network->n_species, sizeof *has_maker);
    t.code = has_maker ? tarry_analysis_reach(network, &reach, error)
                       : tarry_fail_memory(error, "the makers of species");
    if (!t.code) {
        find_makers(network, has_maker);
        tell_absent(&t, &reach, has_maker);
        tell_idle(&t, &reach);
        tell_negative(&t);
        tell_long(&t, &reach);
        tell_changed_lags(&t);
    }
    tarry_reach_release(&reach);
    free(has_maker);
    return t.code;
}
