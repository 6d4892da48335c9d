/* SPDX-License-Identifier: GPL-3.0-or-later */

/* A gene in sentences. They say only what figures are there for: a gene that never switched on has
 * no burst size, one that is always on no bursts, one cell no intervals. */
#include "report/html.h"
#include "report/page_parts.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

/* What sentences are made of. */
typedef struct telling {
    tarry_page *page;
    const tarry_table *table;
    const tarry_quantities *quantities;
    const char *name;
    const tarry_gene *gene;
    uint32_t window;
    bool of_alleles; /* more than one */
} telling;

enum { DIGITS = 5 };

static tarry_page_value get(const telling *t, const char *quantity) {
    return tarry_page_value_of(t->table, tarry_quantities_find(t->quantities, quantity, t->window,
                                                               tarry_table_n_rows(t->table)));
}

static void say(const telling *t, const char *words) {
    tarry_html_put(t->page->text, "%s", words);
}

/* "17.05 UNIT (16.89 to 17.21)", multiplied by `factor`; the unit may be "". */
static void say_value(const telling *t, const tarry_page_value *value, double factor,
                      const char *unit) {
    tarry_rounded rounded;
    tarry_round(factor * value->value, factor * value->low, factor * value->high, DIGITS, &rounded);
    tarry_html_put(t->page->text, "<b>%s%s%s</b>", rounded.value, *unit ? "\xc2\xa0" : "", unit);
    if (rounded.low[0])
        tarry_html_put(t->page->text, " <span class=\"i\">(%s to %s)</span>", rounded.low,
                       rounded.high);
}

static void say_share(const telling *t, const tarry_page_value *value) {
    say_value(t, value, 100, "%");
}

static void say_time(const telling *t, const tarry_page_value *value) {
    say_value(t, value, 1, t->page->network->time_unit);
}

/* The largest of a quantity over windows. */
static double largest(const telling *t, const char *quantity) {
    double most = NAN;
    for (uint32_t w = 0; w < t->page->network->run.n_windows; w++) {
        const size_t row = tarry_quantities_find(t->quantities, quantity, w,
                                                 tarry_table_n_rows(t->table));
        most = fmax(most, tarry_page_value_of(t->table, row).value);
    }
    return most;
}

/* Rates are told in the shortest unit of time in which bursts (of a gene without them, initiations)
 * come to one in some window, so that all of a gene's have the same unit. */
typedef struct rate_unit {
    const char *unit, *words;
    double seconds;
} rate_unit;

static const rate_unit rate_units[] = {
    {"s", "a second", 1}, {"min", "a minute", 60}, {"h", "an hour", 3600}, {"d", "a day", 86400}};

enum { N_RATE_UNITS = sizeof rate_units / sizeof *rate_units };

static const rate_unit *find_rate_unit(const telling *t, double own_seconds) {
    double most = largest(t, "burst_frequency");
    if (!(most > 0))
        most = largest(t, "initiation_rate");
    for (size_t i = 0; i + 1 < N_RATE_UNITS; i++)
        if (most * (rate_units[i].seconds / own_seconds) >= 1)
            return &rate_units[i];
    return &rate_units[N_RATE_UNITS - 1];
}

static void say_rate(const telling *t, const tarry_page_value *value, const char *what) {
    const char *own = t->page->network->time_unit;
    double own_seconds = NAN;
    char words[64];
    for (size_t i = 0; i < N_RATE_UNITS; i++)
        if (!strcmp(own, rate_units[i].unit))
            own_seconds = rate_units[i].seconds;
    if (isnan(own_seconds)) {
        snprintf(words, sizeof words, "%s per %.32s", what, own);
        say_value(t, value, 1, words);
        return;
    }
    const rate_unit *unit = find_rate_unit(t, own_seconds);
    snprintf(words, sizeof words, "%s %s", what, unit->words);
    say_value(t, value, unit->seconds / own_seconds, words);
}

/* ---- bursts --------------------------------------------------------------------------------- */

static void say_subject(const telling *t) {
    char words[48];
    if (t->of_alleles) {
        snprintf(words, sizeof words, "Each of the %u alleles of ", (unsigned)t->gene->n_copies);
        say(t, words);
    }
    say(t, t->name);
}

/* How often, how long, how large. */
static void tell_bursts(const telling *t, const tarry_page_value *frequency) {
    const tarry_page_value active = get(t, "active_time_mean");
    const tarry_page_value size = get(t, "burst_size_mean");
    const bool promoter = tarry_gene_has_alleles(t->gene);
    say_subject(t);
    say(t, promoter ? " switches on " : " begins ");
    say_rate(t, frequency, "times");
    say(t, " on average");
    if (isnan(active.value) && isnan(size.value)) {
        say(t, ", but no burst that began here was over when the cells ended, so that nothing is "
               "known of their length and size. ");
        return;
    }
    if (!isnan(active.value)) {
        say(t, isnan(size.value) ? " and " : ", ");
        say(t, promoter ? "stays on for " : "lasts ");
        say_time(t, &active);
    }
    if (!isnan(size.value)) {
        say(t, isnan(active.value) ? " and " : ", and ");
        say(t, promoter ? "starts " : "holds ");
        say_value(t, &size, 1, promoter ? "transcripts" : "counted events");
        say(t, " each time");
    }
    say(t, ". ");
}

static void tell_silent(const telling *t) {
    const tarry_page_value silent = get(t, "silent_fraction");
    const char *without = tarry_gene_has_alleles(t->gene) ? "a transcript being started"
                                                          : "any counted event";
    if (isnan(silent.value))
        return;
    if (silent.value > 0) {
        say_share(t, &silent);
        say(t, " of its bursts are silent: they end without ");
        say(t, without);
        say(t, ". ");
        return;
    }
    say(t, "None of its bursts was silent, ending without ");
    say(t, without);
    if (!isnan(silent.high)) {
        tarry_rounded rounded;
        tarry_round(100 * silent.value, 100 * silent.low, 100 * silent.high, 2, &rounded);
        say(t, " (95 % interval up to ");
        say(t, rounded.high);
        say(t, " %)");
    }
    say(t, ". ");
}

static void tell_pauses(const telling *t) {
    const tarry_page_value inactive = get(t, "inactive_time_mean");
    const tarry_page_value share = get(t, "active_fraction");
    if (!isnan(inactive.value)) {
        say(t, "Between bursts it is off for ");
        say_time(t, &inactive);
        say(t, " on average");
        say(t, isnan(share.value) ? ". " : "; ");
    }
    if (!isnan(share.value)) {
        say(t, isnan(inactive.value) ? "It is on " : "it is on ");
        say_share(t, &share);
        say(t, " of the time. ");
    }
}

/* On how much the burst figures rest, where that is little. */
static void tell_few(const telling *t) {
    const tarry_page_value size = get(t, "burst_size_mean");
    char number[TARRY_ROUNDED];
    if (!(size.samples > 0) || size.samples >= TARRY_FEW)
        return;
    tarry_round_plain(size.samples, number);
    tarry_html_put(t->page->text,
                   "<strong>These numbers rest on %s burst%s only, so that their intervals are "
                   "rough.</strong> ",
                   number, size.samples > 1 ? "s" : "");
}

static void tell_initiations(const telling *t) {
    const tarry_page_value rate = get(t, "initiation_rate");
    const bool promoter = tarry_gene_has_alleles(t->gene);
    if (isnan(rate.value))
        return;
    if (!(rate.value > 0)) {
        say(t, promoter ? "No transcript is started. " : "No event is counted. ");
        return;
    }
    say(t, promoter ? (t->of_alleles ? "All in all each allele starts " : "All in all it starts ")
                    : "All in all there are ");
    say_rate(t, &rate, promoter ? "transcripts" : "counted events");
    say(t, ". ");
}

static void tell_activity(const telling *t) {
    const tarry_page_value frequency = get(t, "burst_frequency");
    if (t->gene && !t->gene->tells) {
        say(t, t->name);
        say(t, " is always on: every state of its promoter initiates, so that one burst cannot be "
               "told from the next and numbers on bursts are left out. ");
    } else if (frequency.value > 0) {
        tell_bursts(t, &frequency);
        tell_silent(t);
        tell_pauses(t);
        tell_few(t);
    } else if (!isnan(frequency.value)) {
        tarry_html_put(t->page->text,
                       "<strong>No burst of %s %s</strong>, so that there is no "
                       "size, length or interval of bursts. ",
                       t->name, t->page->exact ? "ever begins" : "began here in any cell");
    }
    tell_initiations(t);
}

/* ---- molecules ------------------------------------------------------------------------------ */

/* What a Fano factor says beside that of a Poisson law, as far as its interval goes. */
static const char *against_poisson(const tarry_page_value *fano) {
    if (!(fano->high > fano->low))
        return "";
    if (fano->low > 1)
        return ", more than the 1 of a Poisson law";
    if (fano->high < 1)
        return ", less than the 1 of a Poisson law";
    return ", not told apart from the 1 of a Poisson law";
}

/* "A cell holds ...", of one product. */
static void tell_product(const telling *t, const char *product, const char *words) {
    char quantity[160];
    snprintf(quantity, sizeof quantity, "%.120s_mean", product);
    const tarry_page_value mean = get(t, quantity);
    if (isnan(mean.value))
        return;
    say(t, "A cell holds ");
    say_value(t, &mean, 1, words);
    say(t, " on average");
    snprintf(quantity, sizeof quantity, "%.120s_fano", product);
    const tarry_page_value fano = get(t, quantity);
    if (!isnan(fano.value)) {
        say(t, ", with a Fano factor of ");
        say_value(t, &fano, 1, "");
        say(t, against_poisson(&fano));
    }
    snprintf(quantity, sizeof quantity, "%.120s_decay_time", product);
    const tarry_page_value decay = get(t, quantity);
    if (!isnan(decay.value)) {
        say(t, "; their number stays correlated for about ");
        say_time(t, &decay);
    }
    say(t, ". ");
}

/* A paragraph on its activity, one on its molecules; the caller opens and closes them. */
void tarry_page_tell_gene(tarry_page *page, const tarry_table *table,
                          const tarry_quantities *quantities, const char *name, uint32_t window) {
    telling t = {.page = page,
                 .table = table,
                 .quantities = quantities,
                 .name = name,
                 .gene = tarry_network_gene(page->network, name),
                 .window = window};
    t.of_alleles = t.gene && t.gene->n_copies > 1;
    tell_activity(&t);
    tarry_html_put(page->text, "</p>\n<p class=\"told\">");
    tell_product(&t, "transcript", "finished transcripts");
    tell_product(&t, "protein", "proteins");
    if (!page->exact && tarry_results_n_cells(page->results) == 1)
        say(&t, "One cell gives no intervals.");
}
