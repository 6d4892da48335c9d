/* SPDX-License-Identifier: GPL-3.0-or-later */

/* tarry help: from the tables of commands and options. */

#include "cli/commands.h"
#include "cli/manual.h"
#include "cli/talk.h"
#include "tarry/tarry.h"

#include <stdio.h>

const char tarry_help_preface[] =
    "tarry simulates gene expression one molecule and one cell at a time, with the\n"
    "lags of transcription and translation, and gives burst statistics, distributions\n"
    "and autocorrelations with error bars.\n\n";

static const char ending[] =
    "\n`tarry help COMMAND` tells more. docs/model.md describes the model file.\n"
    "Exit status: 0 done; 1 failed while running; 2 wrong command line, model or\n"
    "data; 3 interrupted, with what was finished saved and marked partial.\n"
    "For research; not for clinical decisions.\n";

static void help_on_all(void) {
    fputs(tarry_help_preface, stdout);
    for (size_t i = 0; i < tarry_n_commands; i++) {
        const tarry_command *command = &tarry_commands[i];
        char left[40];
        snprintf(left, sizeof left, "tarry %s %s", command->name,
                 command->operand ? command->operand : "");
        printf("  %-23s %s%s\n", left, command->summary, command->run ? "" : " (not yet)");
    }
    fputs(ending, stdout);
}

static void help_on_one(const tarry_command *command) {
    const bool has_operand = command->operand != NULL;
    printf("tarry %s%s%s%s\n\n", command->name, command->run ? " [OPTIONS]" : "",
           has_operand ? " " : "", has_operand ? command->operand : "");
    if (command->about)
        fputs(command->about, stdout);
    else
        printf("%s%s\n", command->summary, command->run ? "" : " (not yet)");
    if (!command->run)
        return;
    fputs("\nOptions, as --name VALUE or --name=VALUE:\n", stdout);
    tarry_options_help(command->bit, stdout);
}

int tarry_command_help_on(const tarry_command *command) {
    if (command)
        help_on_one(command);
    else
        help_on_all();
    return tarry_output("");
}

int tarry_command_help(const tarry_settings *settings) {
    const tarry_command *command = NULL;
    if (settings->as)
        return tarry_manual_write(settings->as);
    if (settings->operand && !(command = tarry_command_find(settings->operand)))
        return tarry_command_unknown(settings->operand);
    return tarry_command_help_on(command);
}
