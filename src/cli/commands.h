/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_CLI_COMMANDS_H
#define TARRY_CLI_COMMANDS_H

/* The commands: a table, and a file for each that works. */

#include <stddef.h>
#include "cli/options.h"

typedef struct tarry_command {
    const char *name;
    const char *operand; /* the word it takes, as in help: "MODEL", "[MODEL]"; NULL: none */
    tarry_command_bit bit;
    const char *summary; /* one line */
    const char *about;   /* what help says between usage and options */
    /* Returns the exit status. NULL: its place is kept, this version does not have it. */
    int (*run)(const tarry_settings *settings);
} tarry_command;

extern const tarry_command tarry_commands[];
extern const size_t tarry_n_commands;

/* What the program is, in a paragraph. */
extern const char tarry_help_preface[];

/* By name, or NULL. */
const tarry_command *tarry_command_find(const char *name);

/* Complain about a word that is no command, with the nearest one; returns the exit status. */
int tarry_command_unknown(const char *word);

/* Do what the command line says; returns the exit status. */
int tarry_command_line(int n_words, char *const *words);

/* Help on one command, or on all (NULL). Returns the exit status. */
int tarry_command_help_on(const tarry_command *command);

int tarry_command_run(const tarry_settings *settings);
int tarry_command_check(const tarry_settings *settings);
int tarry_command_predict(const tarry_settings *settings);
int tarry_command_measure(const tarry_settings *settings);
int tarry_command_help(const tarry_settings *settings);
int tarry_command_version(const tarry_settings *settings);

/* Read a model file, and complain where that fails. Returns the exit status. */
int tarry_command_read_model(const tarry_settings *settings, tarry_model **model);

/* The folder for results where none is named: "models/vela.yaml" and ".out" give "vela.out". To be
 * freed; NULL when memory is short. */
char *tarry_command_folder(const char *path, const char *ending);

/* Say where the page of a run is. */
void tarry_command_say_page(const char *folder);

#endif
