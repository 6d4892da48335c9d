/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Which figures are made: for each gene that is shown all that has to do with it, then the signals,
 * then species of no gene. What is drawn and how stands in the files figure_*.c. */
#include "report/figure.h"

#include "base/error.h"
#include "report/figure_parts.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>

/* ---- the list ------------------------------------------------------------------------------- */

static void release(tarry_figure *figure) {
    free(figure->stem);
    free(figure->title);
    free(figure->caption);
    free(figure->alternative);
    free(figure->script);
    free(figure->page_script);
    free(figure->data);
    free(figure->svg);
}

void tarry_figure_list_release(tarry_figure_list *list) {
    for (size_t i = 0; i < list->n; i++)
        release(&list->items[i]);
    free(list->items);
    free(list->left_out);
    *list = (tarry_figure_list){0};
}

/* ---- subjects ------------------------------------------------------------------------------- */

static int make_all(tarry_figure_work *work, const tarry_figure_subject *subject,
                    tarry_error *error) {
    int code = 0;
#define MAKE(name)                                                                                 \
    if (!code)                                                                                     \
        code = tarry_figure_##name(work, subject, error);
    TARRY_FIGURE_MAKERS(MAKE)
#undef MAKE
    return code;
}

static bool is_plain(const tarry_network *network, const tarry_channel *channel) {
    return channel->species != TARRY_NONE && channel->signal == TARRY_NONE &&
           network->species[channel->species].role == TARRY_SPECIES_PLAIN;
}

/* Channels of a gene's products (in the gene's order), or of signals, or of plain species. */
static size_t choose_channels(const tarry_figure_work *work, const tarry_figure_subject *subject,
                              uint32_t *channels) {
    const tarry_network *network = work->network;
    size_t n = 0;
    if (subject->gene) {
        for (uint32_t p = subject->gene->products.from; p < subject->gene->products.to; p++)
            for (uint32_t c = 0; c < network->n_channels; c++)
                if (work->shown.channels[c] &&
                    network->channels[c].species == (int32_t)network->products[p])
                    channels[n++] = c;
        return n;
    }
    for (uint32_t c = 0; c < network->n_channels; c++) {
        const tarry_channel *channel = &network->channels[c];
        const bool fits = subject->of_signals ? channel->signal != TARRY_NONE
                                              : is_plain(network, channel);
        if (work->shown.channels[c] && fits)
            channels[n++] = c;
    }
    return n;
}

static int make_subject(tarry_figure_work *work, tarry_figure_subject *subject, uint32_t *channels,
                        tarry_error *error) {
    subject->channels = channels;
    subject->n_channels = choose_channels(work, subject, channels);
    if (subject->of_signals && subject->n_channels == 1)
        subject->signal = work->network->channels[channels[0]].name;
    return make_all(work, subject, error);
}

static int make_genes(tarry_figure_work *work, uint32_t *channels, tarry_error *error) {
    int code = 0;
    for (uint32_t g = 0; !code && g < work->network->n_genes; g++) {
        const tarry_gene *gene = &work->network->genes[g];
        if (!work->shown.genes[g])
            continue;
        const char *prefix = tarry_arena_format(&work->arena, "gene-%s", gene->name);
        tarry_figure_subject subject = {
            .prefix = prefix, .words = gene->name, .gene = gene, .index = g};
        code = prefix ? make_subject(work, &subject, channels, error)
                      : tarry_fail_memory(error, "a figure");
    }
    return code;
}

static int make_others(tarry_figure_work *work, uint32_t *channels, tarry_error *error) {
    tarry_figure_subject signals = {
        .prefix = "signals", .words = "the signals", .of_signals = true};
    tarry_figure_subject species = {.prefix = "species", .words = "the species"};
    int code = make_subject(work, &signals, channels, error);
    if (!code)
        code = make_subject(work, &species, channels, error);
    return code;
}

static int say_left_out(tarry_figure_work *work, tarry_error *error) {
    const tarry_shown *shown = &work->shown;
    tarry_text text = {0};
    if (work->list->n == 0 && work->network->n_channels > 0)
        tarry_text_add_string(&text, "there are no figures, since nothing that could be shown is "
                                     "recorded: name it under run: record");
    else if (shown->n_genes_left)
        tarry_text_printf(&text, "figures show %zu of %zu genes; --genes NAME,NAME names others",
                          shown->n_genes, shown->n_genes + shown->n_genes_left);
    if (text.failed)
        return tarry_fail_memory(error, "a figure");
    work->list->left_out = text.data;
    return 0;
}

/* ---- all ------------------------------------------------------------------------------------ */

static int work_init(tarry_figure_work *work, const tarry_figure_options *options,
                     tarry_error *error) {
    static const struct {
        tarry_result_table table;
        const char *column;
    } looked_up[] = {
#define LOOK_UP(name, column) {TARRY_TABLE_##name, column},
        TARRY_FIGURE_TABLES(LOOK_UP)
#undef LOOK_UP
    };
    const char *unit = work->network->time_unit;
    int code = tarry_shown_init(&work->shown, work->network, options->genes, options->n_genes,
                                error);
    for (size_t i = 0; !code && i < sizeof looked_up / sizeof *looked_up; i++)
        code = tarry_groups_init(&work->groups[looked_up[i].table],
                                 tarry_results_table(work->results, looked_up[i].table),
                                 looked_up[i].column, error);
    const tarry_results *exact = tarry_results_exact(work->results);
    for (size_t i = 0; !code && exact && i < sizeof looked_up / sizeof *looked_up; i++)
        code = tarry_groups_init(&work->exact_groups[looked_up[i].table],
                                 tarry_results_table(exact, looked_up[i].table),
                                 looked_up[i].column, error);
    if (!code)
        code = tarry_flow_index_init(&work->flows, work->network, error);
    work->time_label = tarry_arena_format(&work->arena, "time (%s)", unit);
    work->lag_label = tarry_arena_format(&work->arena, "lag (%s)", unit);
    work->length_label = tarry_arena_format(&work->arena, "length (%s)", unit);
    work->since_label = tarry_arena_format(&work->arena, "time since the step (%s)", unit);
    if (!code &&
        (!work->time_label || !work->lag_label || !work->length_label || !work->since_label))
        code = tarry_fail_memory(error, "the labels of figures");
    return code;
}

static void work_release(tarry_figure_work *work) {
    tarry_shown_release(&work->shown);
    tarry_flow_index_release(&work->flows);
    for (int i = 0; i < TARRY_N_RESULT_TABLES; i++) {
        tarry_groups_release(&work->groups[i]);
        tarry_groups_release(&work->exact_groups[i]);
    }
    tarry_arena_release(&work->arena);
}

int tarry_figures_make(const tarry_model *model, const tarry_results *results,
                       const tarry_figure_options *options, tarry_figure_list *list,
                       tarry_error *error) {
    tarry_figure_work work = {
        .network = &model->network, .results = results, .format = options->format, .list = list};
    int code = work_init(&work, options, error);
    uint32_t *channels = tarry_calloc(model->network.n_channels, sizeof *channels);
    if (!code && !channels)
        code = tarry_fail_memory(error, "the list of what is drawn");
    if (!code)
        code = make_genes(&work, channels, error);
    if (!code)
        code = make_others(&work, channels, error);
    if (!code)
        code = say_left_out(&work, error);
    free(channels);
    work_release(&work);
    return code;
}
