/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "cli/commands.h"

#include "cli/talk.h"
#include "tarry/tarry.h"

#include <errno.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

static const char about_run[] =
    "Simulates MODEL cell by cell, prints the table per gene and writes the results\n"
    "to a folder as CSV and JSON. Without MODEL a built-in demonstration is run.\n"
    "A value given here beats the file; times take units, as in --until '10 h'.\n"
    "Interrupted (Ctrl-C), it saves the cells that are finished.\n";

static const char about_check[] =
    "Reads MODEL and prints what it comes down to: species, reactions, delays with\n"
    "mean and standard deviation, how far from steady the record begins, the size of\n"
    "the run, and everything that looks wrong. Nothing is simulated.\n";

static const char about_predict[] =
    "Works out what a run of MODEL would find with endlessly many cells, without\n"
    "simulating any, and writes the same files. What the mathematics does not cover\n"
    "is left out, and said why.\n";

static const char about_measure[] =
    "Measures laboratory data by the estimators of a run and writes the same files.\n"
    "DATA.csv holds traces of single cells (cell,time,NAME...), counts in fixed cells\n"
    "(time,NAME..., a row a cell; or time,count,cells) or means (time,NAME,NAME_se).\n"
    "A column `group` (dish, embryo, day) is what intervals come from, where there\n"
    "are 4 groups or more. --time names the unit of the column `time`.\n";

const tarry_command tarry_commands[] = {
    {"check", "MODEL", TARRY_FOR_CHECK, "read and check a model, print what it comes down to",
     about_check, tarry_command_check},
    {"run", "[MODEL]", TARRY_FOR_RUN, "simulate a model, print its table, write results", about_run,
     tarry_command_run},
    {"predict", "MODEL", TARRY_FOR_PREDICT, "the same without simulation, where known",
     about_predict, tarry_command_predict},
    {"measure", "DATA.csv", TARRY_FOR_MEASURE, "the same figures from laboratory data",
     about_measure, tarry_command_measure},
    {"fit", "MODEL", TARRY_FOR_ALL, "rates and delays from data, with intervals", NULL, NULL},
    {"compare", "MODEL", TARRY_FOR_ALL, "which of several models the data favour", NULL, NULL},
    {"plan", "MODEL", TARRY_FOR_ALL, "which experiment would tell most", NULL, NULL},
    {"sweep", "MODEL", TARRY_FOR_ALL, "which parameter matters for what", NULL, NULL},
    {"help", "[COMMAND]", TARRY_FOR_HELP, "this text, or help on one command", NULL,
     tarry_command_help},
    {"version", NULL, TARRY_FOR_VERSION, "the version of the program", NULL, tarry_command_version},
};

const size_t tarry_n_commands = sizeof tarry_commands / sizeof *tarry_commands;

const tarry_command *tarry_command_find(const char *name) {
    for (size_t i = 0; i < tarry_n_commands; i++)
        if (!strcmp(tarry_commands[i].name, name))
            return &tarry_commands[i];
    return NULL;
}

int tarry_command_unknown(const char *word) {
    const char *names[sizeof tarry_commands / sizeof *tarry_commands];
    for (size_t i = 0; i < tarry_n_commands; i++)
        names[i] = tarry_commands[i].name;
    const char *nearest = tarry_nearest_word(word, names, tarry_n_commands);
    if (nearest)
        return tarry_complain(TARRY_EXIT_WRONG, "there is no command '%s'; did you mean '%s'?",
                              word, nearest);
    if (!access(word, R_OK))
        return tarry_complain(TARRY_EXIT_WRONG,
                              "there is no command '%s'; to simulate that file: tarry run %s", word,
                              word);
    return tarry_complain(TARRY_EXIT_WRONG, "there is no command '%s'; `tarry help` lists them",
                          word);
}

/* Words that many programs take in place of a command. */
static const char *usual_name(const char *word) {
    if (!strcmp(word, "--help") || !strcmp(word, "-h"))
        return "help";
    if (!strcmp(word, "--version"))
        return "version";
    return word;
}

int tarry_command_line(int n_words, char *const *words) {
    if (n_words < 1)
        return tarry_complain(TARRY_EXIT_WRONG,
                              "a command is due: `tarry run` simulates a demonstration, `tarry "
                              "help` lists the commands");
    const tarry_command *command = tarry_command_find(usual_name(words[0]));
    if (!command)
        return tarry_command_unknown(words[0]);
    if (!command->run) {
        if (n_words > 1 && (!strcmp(words[1], "--help") || !strcmp(words[1], "-h")))
            return tarry_command_help_on(command);
        return tarry_complain(TARRY_EXIT_WRONG, "not yet: version %s cannot `%s`", tarry_version(),
                              command->name);
    }
    tarry_settings settings;
    int status = tarry_options_read(&settings, command->name, command->bit, command->operand,
                                    words + 1, n_words - 1);
    if (!status && settings.help)
        status = tarry_command_help_on(command);
    else if (!status)
        status = command->run(&settings);
    tarry_options_release(&settings);
    return status;
}

int tarry_command_read_model(const tarry_settings *settings, tarry_model **model) {
    tarry_error error = {0};
    const char *path = settings->operand;
    if (access(path, R_OK))
        return tarry_complain(TARRY_EXIT_WRONG, "the model file '%s' cannot be read: %s", path,
                              strerror(errno));
    if (tarry_model_read(path, settings->overrides, settings->n_overrides, model, &error))
        return tarry_complain_error(&error);
    return TARRY_EXIT_DONE;
}

char *tarry_command_folder(const char *path, const char *ending) {
    const char *slash = strrchr(path, '/');
    const char *name = slash ? slash + 1 : path;
    const char *dot = strrchr(name, '.');
    const bool known = dot && dot != name &&
                       (!strcmp(dot, ".yaml") || !strcmp(dot, ".yml") || !strcmp(dot, ".csv"));
    const size_t n = known ? (size_t)(dot - name) : strlen(name);
    char *folder = malloc(n + strlen(ending) + 1);
    if (folder) {
        memcpy(folder, name, n);
        strcpy(folder + n, ending);
    }
    return folder;
}

void tarry_command_say_page(const char *folder) {
    const size_t n = strlen(folder);
    tarry_talk("page: %s%sreport.html", folder, n && folder[n - 1] == '/' ? "" : "/");
}
