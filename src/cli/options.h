/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_CLI_OPTIONS_H
#define TARRY_CLI_OPTIONS_H

/* The command line after the command: one table of options drives parsing, ranges and help. */

#include <stdbool.h>
#include <stddef.h>
#include <stdio.h>
#include "tarry/model.h"

/* Commands as bits, to say which option belongs to which. */
typedef enum tarry_command_bit {
    TARRY_FOR_RUN = 1,
    TARRY_FOR_CHECK = 2,
    TARRY_FOR_VERSION = 4,
    TARRY_FOR_PREDICT = 8,
    TARRY_FOR_HELP = 16,
    TARRY_FOR_MEASURE = 32,
    TARRY_FOR_ALL = ~0,
} tarry_command_bit;

typedef struct tarry_settings {
    const char *operand; /* the one word that is no option, or NULL */
    const char *out;
    const char *sampler;
    const char *as_data; /* form, or NULL */
    const char *figures; /* kind, or NULL */
    const char *as;      /* man, bash, zsh */
    const char *genes;   /* names with commas between them, or NULL */
    long long threads;   /* 0: all cores */
    long long keep;
    bool overwrite;
    bool quiet;
    bool help;
    bool build;
    tarry_override *overrides; /* values that beat the file, in the order given */
    size_t n_overrides;
} tarry_settings;

/* Read words[0..n) for the command `name`, whose bit is `command`. `operand` names the word that is
 * no option, for messages (NULL: there is none). Returns 0, or complains and returns the exit
 * status. Texts stay those of `words`. `settings` can be released either way. */
int tarry_options_read(tarry_settings *settings, const char *name, tarry_command_bit command,
                       const char *operand, char *const *words, int n);

void tarry_options_release(tarry_settings *settings);

/* One line or more for each option of a command. */
void tarry_options_help(tarry_command_bit command, FILE *stream);

/* Each option of a command, as in help. `value` is NULL for a flag. */
typedef struct tarry_option_words {
    const char *word; /* without the dashes */
    const char *value;
    const char *help; /* with the range of a number; lasts for the call */
} tarry_option_words;

void tarry_options_each(tarry_command_bit command,
                        void (*visit)(const tarry_option_words *option, void *context),
                        void *context);

#endif
