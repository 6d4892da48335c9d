/* SPDX-License-Identifier: GPL-3.0-or-later */

/* The report of `tarry check`: the expanded model as the engine sees it, what can be said of it
 * without simulating, what a run of it will take, and what looks wrong. */

#include "tarry/check.h"

#include "base/error.h"
#include "model/analysis.h"
#include "study/check_page.h"
#include "study/predict.h"
#include "study/run.h"
#include "tally/kinds.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

void tarry_page_head(tarry_page *page, const char *title, long long n) {
    tarry_text_printf(page->text, "\n%s", title);
    if (n >= 0)
        tarry_text_printf(page->text, " (%lld)", n);
    tarry_text_add_string(page->text, "\n");
}

void tarry_page_list(tarry_page *page, size_t shown, size_t all, const char *what) {
    tarry_sheet_write(&page->sheet, page->text);
    page->sheet.right = 0;
    if (shown < all)
        tarry_text_printf(page->text, "  ... and %zu more %s\n", all - shown, what);
}

static const char *short_number(double value, char out[TARRY_NUMBER_SIZE]) {
    tarry_number_short(value, 6, out);
    return out;
}

/* ---- what there is -------------------------------------------------------------------------- */

static void write_title(tarry_page *page) {
    const tarry_network *network = page->network;
    if (page->model->file && *page->model->file)
        tarry_text_printf(page->text, "%s%s", page->model->file, *network->title ? ": " : "");
    tarry_text_printf(page->text, "%s\n", network->title);
    tarry_text_printf(page->text, "Times are in %s, rates per %s.\n", network->time_unit,
                      network->time_unit);
}

/* "shut 0.897, open 0.103", or the one state. */
static void put_start(tarry_page *page, const tarry_promoter *promoter, size_t column) {
    const tarry_network *network = page->network;
    tarry_text text = {0};
    double before = 0;
    for (uint32_t i = promoter->states.from; i < promoter->states.to; i++) {
        const double share = promoter->start[i - promoter->states.from] - before;
        char number[TARRY_NUMBER_SIZE];
        before += share;
        if (!(share > 0))
            continue;
        tarry_text_printf(&text, "%s%s", text.size > 0 ? ", " : "", network->states[i].name);
        if (share < 1)
            tarry_text_printf(&text, " %s", short_number(share, number));
    }
    page->text->failed = page->text->failed || text.failed;
    tarry_sheet_cell(&page->sheet, column, "starts %s%s", promoter->steady ? "steady: " : "in ",
                     text.data ? text.data : "");
    tarry_text_release(&text);
}

static void put_active(tarry_page *page, const tarry_promoter *promoter, size_t column) {
    const tarry_network *network = page->network;
    tarry_text text = {0};
    for (uint32_t i = promoter->states.from; i < promoter->states.to; i++)
        if (network->states[i].active)
            tarry_text_printf(&text, "%s%s", text.size > 0 ? ", " : "", network->states[i].name);
    page->text->failed = page->text->failed || text.failed;
    if (text.size > 0)
        tarry_sheet_cell(&page->sheet, column, "bursts in %s", text.data);
    tarry_text_release(&text);
}

static void write_genes(tarry_page *page) {
    const tarry_network *network = page->network;
    size_t all = 0, shown = 0;
    for (uint32_t g = 0; g < network->n_genes; g++)
        all += network->genes[g].promoters.from < network->genes[g].promoters.to;
    if (all == 0)
        return;
    tarry_page_head(page, "Genes", (long long)all);
    for (uint32_t g = 0; g < network->n_genes && shown < TARRY_CHECK_MOST; g++) {
        const tarry_gene *gene = &network->genes[g];
        if (gene->promoters.from == gene->promoters.to)
            continue;
        shown++;
        tarry_sheet_row(&page->sheet);
        tarry_sheet_cell(&page->sheet, 0, "%s", gene->name);
        tarry_sheet_cell(&page->sheet, 1, "%u %s", gene->n_copies,
                         gene->n_copies == 1 ? "copy" : "copies");
        put_start(page, &network->promoters[gene->promoters.from], 2);
        if (gene->tells)
            put_active(page, &network->promoters[gene->promoters.from], 3);
    }
    tarry_page_list(page, shown, all, "genes");
}

/* Mean number of alleles that start in this state; *drawn: it is not the same in every cell. */
static double start_of_state(const tarry_network *network, uint32_t species, bool *drawn) {
    const tarry_gene *gene = &network->genes[network->species[species].gene];
    double mean = 0;
    for (uint32_t p = gene->promoters.from; p < gene->promoters.to; p++) {
        const tarry_promoter *promoter = &network->promoters[p];
        double before = 0;
        for (uint32_t i = promoter->states.from; i < promoter->states.to; i++) {
            const double share = promoter->start[i - promoter->states.from] - before;
            before += share;
            if (network->states[i].sum != species)
                continue;
            mean += share;
            *drawn = *drawn || (share > 0 && share < 1);
        }
    }
    return mean;
}

static void write_species(tarry_page *page) {
    const tarry_network *network = page->network;
    size_t all = 0, shown = 0;
    for (uint32_t i = 0; i < network->n_species; i++)
        all += network->species[i].role != TARRY_SPECIES_ALLELE;
    tarry_page_head(page, "Species", (long long)all);
    tarry_sheet_row(&page->sheet);
    tarry_sheet_cell(&page->sheet, 1, "at the start");
    page->sheet.right = 1u << 1;
    for (uint32_t i = 0; i < network->n_species && shown < TARRY_CHECK_MOST; i++) {
        const tarry_species *species = &network->species[i];
        char number[TARRY_NUMBER_SIZE];
        bool drawn = false;
        if (species->role == TARRY_SPECIES_ALLELE)
            continue;
        shown++;
        double start = species->start;
        if (species->role == TARRY_SPECIES_STATE)
            start += start_of_state(network, i, &drawn);
        tarry_sheet_row(&page->sheet);
        tarry_sheet_cell(&page->sheet, 0, "%s", species->name);
        if (drawn) {
            tarry_sheet_cell(&page->sheet, 1, "%s", short_number(start, number));
            tarry_sheet_cell(&page->sheet, 2, "on average");
        } else {
            tarry_number_write(start, number);
            tarry_sheet_cell(&page->sheet, 1, "%s", number);
        }
    }
    tarry_page_list(page, shown, all, "species");
}

/* ---- conserved sums ------------------------------------------------------------------------- */

static void put_term(tarry_text *text, const tarry_network *network, const tarry_sum_term *term,
                     bool first) {
    const long long weight = term->weight;
    const bool negative = weight < 0;
    tarry_text_add_string(text, first ? (negative ? "-" : "") : negative ? " - " : " + ");
    if (weight != 1 && weight != -1)
        tarry_text_printf(text, "%lld ", negative ? -weight : weight);
    if (term->species != TARRY_NONE)
        tarry_text_add_string(text, network->species[term->species].name);
    else
        tarry_text_printf(text, "(under way in %s)", network->lags[term->lag].name);
}

/* The most terms of a sum that are written out. */
enum { MOST_TERMS = 24 };

static void write_sum(tarry_page *page, const tarry_sum *sum) {
    const tarry_network *network = page->network;
    char number[TARRY_NUMBER_SIZE];
    tarry_text_add_string(page->text, "  ");
    for (uint32_t i = 0; i < sum->n_terms && i < MOST_TERMS; i++)
        put_term(page->text, network, &sum->terms[i], i == 0);
    if (sum->n_terms > MOST_TERMS)
        tarry_text_printf(page->text, " + %u more terms", sum->n_terms - MOST_TERMS);
    if (sum->known) {
        tarry_number_write(sum->value, number);
        tarry_text_printf(page->text, " = %s", number);
    } else {
        tarry_text_add_string(page->text, " stays as drawn at the start");
    }
    if (isfinite(sum->until))
        tarry_text_printf(page->text, ", until the step at %s %s", short_number(sum->until, number),
                          network->time_unit);
    tarry_text_add_string(page->text, "\n");
}

static int write_sums(tarry_page *page, tarry_error *error) {
    tarry_arena arena = {0};
    tarry_sums sums;
    const int code = tarry_analysis_sums(page->network, &arena, &sums, error);
    if (!code && (sums.n_sums > 0 || sums.n_large > 0 || sums.n_overflow > 0)) {
        tarry_page_head(page, "Sums that never change", (long long)sums.n_sums);
        for (uint32_t i = 0; i < sums.n_sums && i < TARRY_CHECK_MOST; i++)
            write_sum(page, &sums.sums[i]);
        if (sums.n_sums > TARRY_CHECK_MOST)
            tarry_text_printf(page->text, "  ... and %u more\n", sums.n_sums - TARRY_CHECK_MOST);
        if (sums.n_large > 0)
            tarry_text_printf(page->text,
                              "  Not looked for among %u group%s of more than %d connected "
                              "species.\n",
                              sums.n_large, sums.n_large > 1 ? "s" : "", TARRY_SUMS_LARGEST);
        if (sums.n_overflow > 0)
            tarry_text_printf(page->text,
                              "  Skipped for %u group%s of species: the weights grow past 64 bits."
                              "\n",
                              sums.n_overflow, sums.n_overflow > 1 ? "s" : "");
    }
    tarry_arena_release(&arena);
    return code;
}

/* ---- the run -------------------------------------------------------------------------------- */

static void write_protocol(tarry_page *page) {
    const tarry_network *network = page->network;
    size_t all = 0, shown = 0;
    for (uint32_t k = 1; k < network->n_segments; k++)
        all += network->segments[k].moment != TARRY_MOMENT_RAMP_PART;
    if (all == 0)
        return;
    tarry_page_head(page, "Protocol", (long long)all);
    for (uint32_t k = 1; k < network->n_segments && shown < TARRY_CHECK_MOST; k++) {
        if (network->segments[k].moment == TARRY_MOMENT_RAMP_PART)
            continue;
        shown++;
        char at[TARRY_NUMBER_SIZE];
        tarry_sheet_row(&page->sheet);
        tarry_sheet_cell(&page->sheet, 0, "at %s %s", short_number(network->segments[k].start, at),
                         network->time_unit);
        if (network->segments[k].text)
            tarry_sheet_cell(&page->sheet, 1, "%s", network->segments[k].text);
    }
    tarry_page_list(page, shown, all, "steps");
}

/* The level of a signal that is seen to respond, or NaN. */
static double level_of(const tarry_network *network, const tarry_channel *channel) {
    return channel->recorded && channel->signal != TARRY_NONE
               ? network->signals[channel->signal].responds_above
               : NAN;
}

static void write_firsts(tarry_page *page) {
    const tarry_network *network = page->network;
    size_t all = network->n_firsts, shown = 0;
    for (uint32_t i = 0; i < network->n_channels; i++)
        all += isnan(level_of(network, &network->channels[i])) ? 0 : 1;
    if (network->n_responses == 0 || all == 0)
        return;
    tarry_page_head(page, "First after a step", (long long)all);
    for (uint32_t i = 0; i < network->n_firsts && shown < TARRY_CHECK_MOST; i++, shown++) {
        tarry_sheet_row(&page->sheet);
        tarry_sheet_cell(&page->sheet, 0, "%s", network->firsts[i].name);
        tarry_sheet_cell(&page->sheet, 1, "%s",
                         network->firsts[i].species == TARRY_NONE ? "since the step"
                                                                  : "finished, whenever begun");
    }
    for (uint32_t i = 0; i < network->n_channels && shown < TARRY_CHECK_MOST; i++) {
        const double level = level_of(network, &network->channels[i]);
        char text[TARRY_NUMBER_SIZE];
        if (isnan(level))
            continue;
        shown++;
        tarry_sheet_row(&page->sheet);
        tarry_sheet_cell(&page->sheet, 0, "%s", network->channels[i].name);
        tarry_sheet_cell(&page->sheet, 1, "a frame above %s", short_number(level, text));
    }
    tarry_page_list(page, shown, all, "names");
}

static void write_windows(tarry_page *page) {
    const tarry_run_plan *run = &page->network->run;
    size_t shown = 0;
    for (uint32_t i = 0; i < run->n_windows && shown < TARRY_CHECK_MOST; i++, shown++) {
        const tarry_window *window = &run->windows[i];
        char from[TARRY_NUMBER_SIZE], to[TARRY_NUMBER_SIZE];
        tarry_sheet_row(&page->sheet);
        tarry_sheet_cell(&page->sheet, 0, "window %s", window->name);
        tarry_sheet_cell(&page->sheet, 1, "%s to %s %s, %u frames",
                         short_number(window->from, from), short_number(window->to, to),
                         page->network->time_unit, window->frames.to - window->frames.from);
    }
    tarry_page_list(page, shown, run->n_windows, "windows");
}

static void write_run(tarry_page *page) {
    const tarry_run_plan *run = &page->network->run;
    const char *unit = page->network->time_unit;
    char one[TARRY_NUMBER_SIZE], other[TARRY_NUMBER_SIZE];
    tarry_page_head(page, "Run", -1);
    tarry_sheet_row(&page->sheet);
    tarry_sheet_cell(&page->sheet, 0, "cells");
    tarry_sheet_cell(&page->sheet, 1, "%lld, seed %llu", (long long)run->cells,
                     (unsigned long long)run->seed);
    tarry_sheet_row(&page->sheet);
    tarry_sheet_cell(&page->sheet, 0, "settle");
    tarry_sheet_cell(&page->sheet, 1, "%s %s before the record%s", short_number(run->settle, one),
                     unit, run->settle_auto ? " (auto: means within 0.1 % of steady)" : "");
    tarry_sheet_row(&page->sheet);
    tarry_sheet_cell(&page->sheet, 0, "record");
    tarry_sheet_cell(&page->sheet, 1, "%s %s, a frame every %s %s (%u frames), %u snapshot%s",
                     short_number(run->until, one), unit, short_number(run->every, other), unit,
                     run->n_frames, run->n_snapshots, run->n_snapshots == 1 ? "" : "s");
    write_windows(page);
}

/* ---- files and memory ------------------------------------------------------------------------ */

typedef struct channel_counts {
    double all, recorded, correlating, signals, visible;
} channel_counts;

static channel_counts count_channels(const tarry_network *network) {
    channel_counts n = {0};
    for (uint32_t i = 0; i < network->n_channels; i++) {
        const tarry_channel *channel = &network->channels[i];
        n.all++;
        n.recorded += channel->recorded;
        n.correlating += channel->correlates;
        n.signals += channel->correlates && channel->signal != TARRY_NONE;
        n.visible += channel->thresholds != NULL;
    }
    return n;
}

/* Snapshots that fall between frames. */
static double count_off_frames(const tarry_run_plan *run) {
    double n = 0;
    for (uint32_t i = 0; i < run->n_snapshots; i++) {
        const double frame = round(run->snapshots[i] / run->every);
        n += frame * run->every != run->snapshots[i] && run->snapshots[i] != run->until;
    }
    return n;
}

static void put_rows(tarry_page *page, const char *file, double rows, const char *remark) {
    tarry_sheet_row(&page->sheet);
    tarry_sheet_cell(&page->sheet, 0, "%s", file);
    tarry_sheet_cell(&page->sheet, 1, "%.0f rows", rows);
    if (remark)
        tarry_sheet_cell(&page->sheet, 2, "%s", remark);
}

static void write_files(tarry_page *page) {
    const tarry_network *network = page->network;
    const tarry_run_plan *run = &network->run;
    const channel_counts n = count_channels(network);
    const double pairs = n.signals * (n.signals - 1) / 2;
    const double lags = run->n_lags;
    double burst_figures = 0;
    for (uint32_t i = 0; i < network->n_genes; i++)
        burst_figures += network->genes[i].tells ? TARRY_BURST_FIGURES : 1;
    tarry_page_head(page, "Files", -1);
    page->sheet.right = 1u << 1;
    put_rows(page, "means.csv",
             n.recorded * (run->n_frames + count_off_frames(run)) +
                 (n.all - n.recorded) * run->n_snapshots,
             NULL);
    put_rows(page, "bursts.csv",
             run->n_windows * (burst_figures + TARRY_PRODUCT_FIGURES * (n.correlating - n.signals)),
             NULL);
    put_rows(page, "signals.csv",
             run->n_windows *
                 (TARRY_SIGNAL_FIGURES * n.signals + TARRY_VISIBLE_FIGURES * n.visible),
             NULL);
    put_rows(page, "autocorrelation.csv",
             run->n_windows * (n.correlating * lags + pairs * (2 * lags - 1)), "at most");
    put_rows(page, "transit.csv", (double)network->n_lags * run->n_windows, NULL);
    put_rows(page, "cells.csv", run->n_frames, "for each cell kept (--keep)");
    tarry_page_list(page, 4, 4, "files");
    tarry_text_add_string(page->text,
                          "  distribution.csv, burst_sizes.csv, dwells.csv, lags.csv and first.csv "
                          "hold a\n  row for each bin or step that is found.\n");
}

static int write_memory(tarry_page *page, tarry_notes *notes, tarry_error *error) {
    const int threads = tarry_run_threads(page->network, 0);
    const tarry_run_memory memory = tarry_run_memory_of(page->network, threads, 0.0);
    const double limit = page->network->run.limit_memory;
    char one[TARRY_BYTES_SIZE], other[TARRY_BYTES_SIZE];
    tarry_page_head(page, "Memory", -1);
    tarry_text_printf(page->text, "  %s for the sums of the estimators, %s for each thread",
                      tarry_bytes_text(memory.tallies, one),
                      tarry_bytes_text(memory.thread, other));
    tarry_text_printf(page->text, "; the limit is %s.\n", tarry_bytes_text(limit, one));
    if (memory.all <= limit)
        return 0;
    return tarry_notes_add(notes, (tarry_place){0}, error,
                           "a run would need %s of memory with %d threads, and the limit is %s: "
                           "record fewer names, take frames less often, use fewer windows or raise "
                           "limits: memory",
                           tarry_bytes_text(memory.all, one), threads,
                           tarry_bytes_text(limit, other));
}

/* ---- warnings -------------------------------------------------------------------------------- */

static void write_warnings(tarry_page *page, const tarry_notes *notes) {
    const tarry_notes *first = &page->model->notes;
    if (first->n + notes->n == 0) {
        tarry_text_add_string(page->text, "\nNo warnings.\n");
        return;
    }
    tarry_page_head(page, "Warnings", (long long)first->n + (long long)notes->n);
    for (size_t i = 0; i < first->n; i++)
        tarry_text_printf(page->text, "  %s\n", first->lines[i]);
    for (size_t i = 0; i < notes->n; i++)
        tarry_text_printf(page->text, "  %s\n", notes->lines[i]);
}

/* ---- exact laws ------------------------------------------------------------------------------ */

typedef struct laws {
    tarry_page *page;
    size_t n, n_told;
} laws;

static int tell_law(void *context, const char *name, const char *why) {
    laws *l = context;
    l->n++;
    if (l->n_told == TARRY_CHECK_MOST)
        return 0;
    l->n_told++;
    tarry_sheet_row(&l->page->sheet);
    tarry_sheet_cell(&l->page->sheet, 0, "%s", name);
    tarry_sheet_cell(&l->page->sheet, 1, "%s%s", why ? "none: " : "yes", why ? why : "");
    return 0;
}

static int write_laws(tarry_page *page, tarry_error *error) {
    laws l = {.page = page};
    tarry_page_head(page, "Exact laws, without simulation (tarry predict)", -1);
    const int code = tarry_predict_covered(page->network, tell_law, &l, error);
    tarry_page_list(page, l.n_told, l.n, "genes, products and signals");
    if (l.n == 0)
        tarry_text_add_string(page->text, "  none: they are laws of genes, and there are none\n");
    return code;
}

static int write_page(tarry_page *page, tarry_notes *notes, tarry_error *error) {
    write_title(page);
    write_genes(page);
    write_species(page);
    tarry_page_reactions(page);
    tarry_page_completions(page);
    tarry_page_delays(page);
    int code = tarry_page_varied(page, error);
    if (!code)
        code = write_sums(page, error);
    if (!code)
        code = tarry_page_distances(page, notes, error);
    if (code)
        return code;
    write_protocol(page);
    write_firsts(page);
    write_run(page);
    write_files(page);
    code = write_memory(page, notes, error);
    if (!code)
        code = write_laws(page, error);
    if (!code)
        code = tarry_analysis_slips(page->network, notes, error);
    if (!code)
        write_warnings(page, notes);
    return code;
}

int tarry_check(const tarry_model *model, char **report, tarry_error *error) {
    tarry_text text = {0};
    tarry_notes notes = {0};
    tarry_page page = {.model = model, .network = &model->network, .text = &text};
    *report = NULL;
    int code = write_page(&page, &notes, error);
    if (!code && text.failed)
        code = tarry_fail_memory(error, "the report");
    if (code)
        tarry_text_release(&text);
    else
        *report = text.data;
    tarry_sheet_release(&page.sheet);
    tarry_notes_release(&notes);
    return code;
}
