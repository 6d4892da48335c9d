/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "cli/manual.h"

#include "cli/commands.h"
#include "cli/talk.h"
#include "tarry/tarry.h"

#include <stdio.h>
#include <string.h>

/* ---- manual page ------------------------------------------------------------------------------
 */

/* Text in roff: no line begins with a request, and dashes can be copied. */
static void put_roff(const char *text) {
    bool begins = true;
    for (; *text != '\0'; text++) {
        if (begins && (*text == '.' || *text == '\''))
            fputs("\\&", stdout);
        if (*text == '\\')
            fputs("\\e", stdout);
        else if (*text == '-')
            fputs("\\-", stdout);
        else
            putchar(*text);
        begins = *text == '\n';
    }
}

static void put_option(const tarry_option_words *option, void *context) {
    (void)context;
    printf(".TP\n\\fB\\-\\-");
    put_roff(option->word);
    printf("\\fR");
    if (option->value != NULL) {
        printf(" \\fI");
        put_roff(option->value);
        printf("\\fR");
    }
    putchar('\n');
    put_roff(option->help);
    putchar('\n');
}

static void put_command(const tarry_command *command) {
    printf(".SS tarry %s%s%s%s\n", command->name, " [\\fIOPTIONS\\fR]",
           command->operand != NULL ? " " : "", command->operand != NULL ? command->operand : "");
    if (command->about != NULL) {
        put_roff(command->about);
    } else {
        put_roff(command->summary);
        putchar('\n');
    }
    tarry_options_each(command->bit, put_option, NULL);
}

static void write_man(void) {
    printf(".TH TARRY 1 \"\" \"tarry %s\" \"tarry\"\n", tarry_version());
    printf(".SH NAME\ntarry \\- simulate gene expression with the lags of transcription and "
           "translation\n");
    printf(".SH SYNOPSIS\n.B tarry\n\\fICOMMAND\\fR [\\fIOPTIONS\\fR] [\\fIFILE\\fR]\n");
    printf(".SH DESCRIPTION\n");
    put_roff(tarry_help_preface);
    printf(
        "An option is written \\-\\-name VALUE or \\-\\-name=VALUE; a value given there beats the "
        "model file.\n.SH COMMANDS\n");
    for (size_t i = 0; i < tarry_n_commands; i++)
        if (tarry_commands[i].run != NULL)
            put_command(&tarry_commands[i]);
    printf(
        ".SH EXIT STATUS\n0 done; 1 failed while running; 2 wrong command line, model or data; 3 "
        "interrupted, with\nwhat was finished saved and marked partial.\n");
    printf(
        ".SH NOTES\nThe model file is described in model.md, the files of a run in files.md, what "
        "is estimated in\nstatistics.md; they are installed with the program.\nFor research; not "
        "for clinical decisions.\n");
}

/* ---- completion -------------------------------------------------------------------------------
 */

static void put_word(const tarry_option_words *option, void *context) {
    (void)context;
    printf(" --%s", option->word);
}

/* After the command come its options, and files where it takes one. */
static void write_bash(void) {
    printf("# Completion of tarry for bash.\n_tarry() {\n"
           "    local word=${COMP_WORDS[COMP_CWORD]} command=${COMP_WORDS[1]} options=\n"
           "    if [ \"$COMP_CWORD\" = 1 ]; then\n        COMPREPLY=($(compgen -W \"");
    for (size_t i = 0; i < tarry_n_commands; i++)
        if (tarry_commands[i].run != NULL)
            printf("%s%s", i > 0 ? " " : "", tarry_commands[i].name);
    printf("\" -- \"$word\"))\n        return\n    fi\n    case $command in\n");
    for (size_t i = 0; i < tarry_n_commands; i++) {
        if (tarry_commands[i].run == NULL)
            continue;
        printf("    %s) options=\"", tarry_commands[i].name);
        tarry_options_each(tarry_commands[i].bit, put_word, NULL);
        printf("\" ;;\n");
    }
    printf("    esac\n    case $word in\n    -*) COMPREPLY=($(compgen -W \"$options\" -- "
           "\"$word\")) ;;\n"
           "    *) COMPREPLY=($(compgen -f -- \"$word\")) ;;\n    esac\n}\n"
           "complete -o filenames -F _tarry tarry\n");
}

static void put_zsh_text(const char *text) {
    for (; *text != '\0'; text++) {
        if (*text == '[' || *text == ']' || *text == ':' || *text == '\\')
            putchar('\\');
        if (*text == '\'')
            fputs("'\\'", stdout);
        putchar(*text);
    }
}

static void put_zsh_option(const tarry_option_words *option, void *context) {
    (void)context;
    printf(" \\\n            '--%s[", option->word);
    put_zsh_text(option->help);
    putchar(']');
    if (option->value != NULL) {
        putchar(':');
        put_zsh_text(option->value);
        putchar(':');
    }
    putchar('\'');
}

static void write_zsh(void) {
    printf("#compdef tarry\n# Completion of tarry for zsh.\n_tarry() {\n    if (( CURRENT == 2 )); "
           "then\n"
           "        local -a commands=(");
    for (size_t i = 0; i < tarry_n_commands; i++) {
        if (tarry_commands[i].run == NULL)
            continue;
        printf("\n            '%s:", tarry_commands[i].name);
        put_zsh_text(tarry_commands[i].summary);
        putchar('\'');
    }
    printf(")\n        _describe command commands\n        return\n    fi\n    local "
           "command=$words[2]\n"
           "    shift words\n    (( CURRENT-- ))\n    case $command in\n");
    for (size_t i = 0; i < tarry_n_commands; i++) {
        if (tarry_commands[i].run == NULL)
            continue;
        printf("    %s)\n        _arguments", tarry_commands[i].name);
        tarry_options_each(tarry_commands[i].bit, put_zsh_option, NULL);
        printf(" \\\n            '*:file:_files'\n        ;;\n");
    }
    printf("    esac\n}\n_tarry \"$@\"\n");
}

int tarry_manual_write(const char *kind) {
    if (strcmp(kind, "man") == 0)
        write_man();
    else if (strcmp(kind, "bash") == 0)
        write_bash();
    else if (strcmp(kind, "zsh") == 0)
        write_zsh();
    else
        return tarry_complain(TARRY_EXIT_WRONG, "--as %s: one of man, bash and zsh is due here",
                              kind);
    return tarry_output("");
}
