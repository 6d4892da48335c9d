/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "report/repeat.h"

#include "tarry/tarry.h"

#include <stdbool.h>
#include <stdio.h>
#include <string.h>

const char *tarry_repeat_file(const tarry_model *model) {
    const char *slash = strrchr(model->file, '/');
    return slash ? slash + 1 : model->file;
}

/* A word of the command line as a POSIX shell takes it. */
static void add_word(tarry_text *command, const char *word) {
    static const char plain[] = "abcdefghijklmnopqrstuvwxyzABCDEFGHIJKLMNOPQRSTUVWXYZ0123456789"
                                "_./:=,+-%@";
    tarry_text_add(command, " ", 1);
    if (*word && strspn(word, plain) == strlen(word)) {
        tarry_text_add_string(command, word);
        return;
    }
    tarry_text_add(command, "'", 1);
    for (const char *at = word; *at; at++)
        tarry_text_add_string(command, *at == '\'' ? "'\\''" : (char[]){*at, '\0'});
    tarry_text_add(command, "'", 1);
}

static void add_option(tarry_text *command, const char *option, const char *value) {
    add_word(command, option);
    add_word(command, value);
}

static void add_parameter(tarry_text *command, const tarry_override *override) {
    tarry_text both = {0};
    tarry_text_printf(&both, "%s=%s", override->name, override->value);
    command->failed = command->failed || both.failed;
    if (!both.failed)
        add_option(command, "--set", both.data);
    tarry_text_release(&both);
}

/* Options that were given, but for cells and seed, which are told in any case. */
static void add_given(const tarry_provenance *provenance, tarry_text *command) {
    for (size_t i = 0; i < provenance->n_overrides; i++) {
        const tarry_override *override = &provenance->overrides[i];
        if (override->is_parameter)
            add_parameter(command, override);
        else if (strcmp(override->name, "cells") != 0 && strcmp(override->name, "seed") != 0)
            add_option(command, override->option, override->value);
    }
}

/* What only a simulation has. An interrupted one equals one of the cells that were finished. */
static void add_of_simulation(const tarry_model *model, const tarry_results *results,
                              const tarry_provenance *provenance, tarry_text *command) {
    char number[32];
    snprintf(number, sizeof number, "%lld", (long long)tarry_results_n_cells(results));
    add_option(command, "--cells", number);
    snprintf(number, sizeof number, "%llu", (unsigned long long)model->network.run.seed);
    add_option(command, "--seed", number);
    add_option(command, "--sampler", provenance->sampler);
    if (provenance->keep > 0) {
        snprintf(number, sizeof number, "%lld", provenance->keep);
        add_option(command, "--keep", number);
    }
    if (provenance->as_data != TARRY_DATA_FORM_NONE)
        add_option(command, "--as-data", tarry_data_form_name(provenance->as_data));
}

/* What is drawn: nothing that numbers depend on, but the same files come of it. */
static void add_figures(const tarry_figure_options *figures, tarry_text *command) {
    static const char *const words[] = {
#define FIGURE_WORD(name, word) [TARRY_FIGURE_##name] = (word),
        TARRY_FIGURE_FORMATS(FIGURE_WORD)
#undef FIGURE_WORD
    };
    tarry_text genes = {0};
    if (figures->format != TARRY_FIGURE_SVG)
        add_option(command, "--figures", words[figures->format]);
    for (size_t i = 0; i < figures->n_genes; i++)
        tarry_text_printf(&genes, "%s%s", i ? "," : "", figures->genes[i]);
    command->failed = command->failed || genes.failed;
    if (!command->failed && genes.size)
        add_option(command, "--genes", genes.data);
    tarry_text_release(&genes);
}

void tarry_repeat_command(const tarry_model *model, const tarry_results *results,
                          const tarry_provenance *provenance, tarry_text *command) {
    const bool predicted = tarry_results_is_predicted(results);
    const bool measured = tarry_results_is_measured(results);
    tarry_text_add_string(command, predicted  ? "tarry predict"
                                   : measured ? "tarry measure"
                                              : "tarry run");
    add_word(command, tarry_repeat_file(model));
    add_given(provenance, command);
    if (!predicted && !measured)
        add_of_simulation(model, results, provenance, command);
    if (provenance->figures)
        add_figures(provenance->figures, command);
}
