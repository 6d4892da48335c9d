/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Options are rows of one table: how a value is read, what it may be, where it goes and what help
 * says all follow from the row. Values of the model's own keys are only carried along: the reader
 * of models checks them, with units, as it checks the file. */

#include "cli/options.h"

#include "cli/talk.h"
#include "tarry/tarry.h"

#include <errno.h>
#include <stdlib.h>
#include <string.h>

typedef enum value_kind {
    VALUE_NONE,    /* a flag */
    VALUE_TEXT,    /* any word */
    VALUE_WHOLE,   /* a whole number within a range */
    VALUE_KEY,     /* beats the key of the same name under `run:` */
    VALUE_NUMBER,  /* the same, and a whole number within a range */
    VALUE_SETTING, /* NAME=VALUE */
} value_kind;

typedef struct option_row {
    const char *word; /* without the dashes; the key's name for VALUE_KEY and VALUE_NUMBER */
    const char *value;
    value_kind kind;
    int commands;
    size_t field; /* of tarry_settings */
    long long least, most;
    const char *help;
} option_row;

#define FIELD(name) offsetof(tarry_settings, name)
#define MODEL_COMMANDS (TARRY_FOR_RUN | TARRY_FOR_CHECK | TARRY_FOR_PREDICT)
#define WRITING_COMMANDS (TARRY_FOR_RUN | TARRY_FOR_PREDICT | TARRY_FOR_MEASURE)
#define WORKING_COMMANDS (TARRY_FOR_RUN | TARRY_FOR_MEASURE)
#define MOST_CELLS 1000000000000
#define MOST_SEED 9223372036854775807

static const option_row options[] = {
    {"out", "DIR", VALUE_TEXT, WRITING_COMMANDS, FIELD(out), 0, 0,
     "folder for results; default: NAME.out (.exact, .measured)"},
    {"overwrite", NULL, VALUE_NONE, WRITING_COMMANDS, FIELD(overwrite), 0, 0,
     "replace the results of an earlier run in that folder"},
    {"time", "UNIT", VALUE_KEY, TARRY_FOR_MEASURE, 0, 0, 0,
     "unit of the column `time` (s, min, h or d); must be given"},
    {"kind", "KIND", VALUE_KEY, TARRY_FOR_MEASURE, 0, 0, 0,
     "traces, counts or means; default: told from the columns"},
    {"counted", "A,B,...", VALUE_KEY, TARRY_FOR_MEASURE, 0, 0, 0,
     "columns of traces that are counts, not brightness (or all)"},
    {"gaps", "HOW", VALUE_KEY, TARRY_FOR_MEASURE, 0, 0, 0,
     "frames that are not there were `dark` or are `missing`"},
    {"background", "X", VALUE_KEY, TARRY_FOR_MEASURE, 0, 0, 0,
     "what is read where nothing shines; default: 0"},
    {"mean", "WHICH", VALUE_KEY, TARRY_FOR_MEASURE, 0, 0, 0,
     "taken off to correlate: of all (default), frame or cell"},
    {"from", "T", VALUE_KEY, TARRY_FOR_MEASURE, 0, 0, 0, "leave out what comes before"},
    {"to", "T", VALUE_KEY, TARRY_FOR_MEASURE, 0, 0, 0, "leave out what comes after"},
    {"lags", "T", VALUE_KEY, TARRY_FOR_MEASURE, 0, 0, 0,
     "longest lag; default: a quarter of the longest trace"},
    {"beside", "MODEL", VALUE_KEY, TARRY_FOR_MEASURE, 0, 0, 0,
     "lay exact laws of that model over the data"},
    {"cells", "N", VALUE_NUMBER, MODEL_COMMANDS, 0, 1, MOST_CELLS, "cells to simulate"},
    {"settle", "T", VALUE_KEY, MODEL_COMMANDS, 0, 0, 0,
     "time simulated before the record, or `auto`"},
    {"until", "T", VALUE_KEY, MODEL_COMMANDS, 0, 0, 0, "length of the record"},
    {"every", "T", VALUE_KEY, MODEL_COMMANDS | TARRY_FOR_MEASURE, 0, 0, 0, "time between frames"},
    {"snapshots", "T,T,...", VALUE_KEY, MODEL_COMMANDS | TARRY_FOR_MEASURE, 0, 0, 0,
     "times at which distributions are taken"},
    {"seed", "N", VALUE_NUMBER, MODEL_COMMANDS, 0, 0, MOST_SEED,
     "the same seed gives the same results"},
    {"set", "NAME=VALUE", VALUE_SETTING, MODEL_COMMANDS | TARRY_FOR_MEASURE, 0, 0, 0,
     "give a parameter another value; may be repeated"},
    {"visible", "L,H,T", VALUE_KEY, WORKING_COMMANDS | TARRY_FOR_CHECK, 0, 0, 0,
     "signals visible from above H till below L, for T or more"},
    {"threads", "N", VALUE_WHOLE, WORKING_COMMANDS, FIELD(threads), 1, 4096,
     "threads to work with; default: all cores"},
    {"sampler", "NAME", VALUE_TEXT, TARRY_FOR_RUN, FIELD(sampler), 0, 0,
     "how the next reaction is drawn; default: direct"},
    {"keep", "N", VALUE_WHOLE, TARRY_FOR_RUN, FIELD(keep), 0, MOST_CELLS,
     "write traces of the first N cells"},
    {"as-data", "FORM", VALUE_TEXT, TARRY_FOR_RUN, FIELD(as_data), 0, 0,
     "write data.csv too: traces, counts or means"},
    {"figures", "KIND", VALUE_TEXT, WRITING_COMMANDS, FIELD(figures), 0, 0,
     "svg (default), pdf, png or none"},
    {"genes", "A,B,...", VALUE_TEXT, TARRY_FOR_RUN | TARRY_FOR_PREDICT, FIELD(genes), 0, 0,
     "genes that figures show; default: the first 6"},
    {"quiet", NULL, VALUE_NONE, WRITING_COMMANDS, FIELD(quiet), 0, 0,
     "no progress and no remarks on standard error"},
    {"as", "KIND", VALUE_TEXT, TARRY_FOR_HELP, FIELD(as), 0, 0,
     "as a manual page (man) or completion (bash, zsh)"},
    {"build", NULL, VALUE_NONE, TARRY_FOR_VERSION, FIELD(build), 0, 0,
     "also how the program was built"},
    {"help", NULL, VALUE_NONE, TARRY_FOR_ALL, FIELD(help), 0, 0, "this text"},
};

enum { N_OPTIONS = sizeof options / sizeof *options };

static const option_row *find(const char *word, size_t n) {
    for (size_t i = 0; i < N_OPTIONS; i++)
        if (strlen(options[i].word) == n && !memcmp(options[i].word, word, n))
            return &options[i];
    return NULL;
}

static int complain_unknown(const char *command, int bit, const char *word, size_t n) {
    char given[64];
    const char *known[N_OPTIONS];
    size_t n_known = 0;
    for (size_t i = 0; i < N_OPTIONS; i++)
        if (options[i].commands & bit)
            known[n_known++] = options[i].word;
    snprintf(given, sizeof given, "%.*s", (int)(n < sizeof given ? n : sizeof given - 1), word);
    const char *nearest = tarry_nearest_word(given, known, n_known);
    if (nearest)
        return tarry_complain(TARRY_EXIT_WRONG, "%s has no option --%s; did you mean --%s?",
                              command, given, nearest);
    return tarry_complain(TARRY_EXIT_WRONG, "%s has no option --%s; `tarry help %s` lists them",
                          command, given, command);
}

/* The whole word as a whole number in the option's range. */
static int read_whole(const option_row *option, const char *text, long long *out) {
    char *end;
    errno = 0;
    const bool digits = *text && strspn(text, "0123456789") == strlen(text);
    const long long value = strtoll(text, &end, 10);
    if (!digits || *end || errno || value < option->least || value > option->most)
        return tarry_complain(TARRY_EXIT_WRONG,
                              "--%s %s: a whole number from %lld to %lld is due here", option->word,
                              text, option->least, option->most);
    *out = value;
    return 0;
}

/* Keep a value that beats the file. The last one given for a key or a parameter counts, in the
 * place of the first. */
static int add_override(tarry_settings *settings, const option_row *option, const char *name,
                        const char *value) {
    const int is_parameter = option->kind == VALUE_SETTING;
    for (size_t i = 0; i < settings->n_overrides; i++) {
        tarry_override *earlier = &settings->overrides[i];
        if (earlier->is_parameter == is_parameter && !strcmp(earlier->name, name)) {
            earlier->value = value;
            return 0;
        }
    }
    char *kept = strdup(name);
    char *given = malloc(strlen(option->word) + 3);
    tarry_override *more = realloc(settings->overrides, (settings->n_overrides + 1) * sizeof *more);
    if (more)
        settings->overrides = more;
    if (!kept || !given || !more) {
        free(kept);
        free(given);
        return tarry_complain(TARRY_EXIT_FAILED, "out of memory for the command line");
    }
    strcpy(given, "--");
    strcat(given, option->word);
    more[settings->n_overrides++] = (tarry_override){
        .option = given, .is_parameter = is_parameter, .name = kept, .value = value};
    return 0;
}

static int read_setting(tarry_settings *settings, const option_row *option, const char *text) {
    const char *equals = strchr(text, '=');
    if (!equals || equals == text || !equals[1])
        return tarry_complain(TARRY_EXIT_WRONG,
                              "--set %s: NAME=VALUE is due here, as in --set k_open=0.1", text);
    char *name = strndup(text, (size_t)(equals - text));
    if (!name)
        return tarry_complain(TARRY_EXIT_FAILED, "out of memory for the command line");
    const int status = add_override(settings, option, name, equals + 1);
    free(name);
    return status;
}

static int read_value(tarry_settings *settings, const option_row *option, const char *text) {
    char *field = (char *)settings + option->field;
    long long whole;
    int status = 0;
    if (!*text)
        return tarry_complain(TARRY_EXIT_WRONG, "--%s needs %s", option->word, option->value);
    switch (option->kind) {
    case VALUE_NONE:
        break;
    case VALUE_TEXT:
        memcpy(field, &text, sizeof text);
        break;
    case VALUE_WHOLE:
        if (!(status = read_whole(option, text, &whole)))
            memcpy(field, &whole, sizeof whole);
        break;
    case VALUE_NUMBER:
        if (!(status = read_whole(option, text, &whole)))
            status = add_override(settings, option, option->word, text);
        break;
    case VALUE_KEY:
        status = add_override(settings, option, option->word, text);
        break;
    case VALUE_SETTING:
        status = read_setting(settings, option, text);
        break;
    }
    return status;
}

/* One option, which may take the next word as its value; *i is left at the last word used. */
static int read_option(tarry_settings *settings, const char *command, int bit, char *const *words,
                       int n, int *i) {
    const char *word = words[*i] + 2;
    const char *equals = strchr(word, '=');
    const size_t size = equals ? (size_t)(equals - word) : strlen(word);
    const option_row *option = find(word, size);
    if (!option || !(option->commands & bit))
        return complain_unknown(command, bit, word, size);
    if (option->kind == VALUE_NONE) {
        if (equals)
            return tarry_complain(TARRY_EXIT_WRONG, "--%s takes no value", option->word);
        const bool yes = true;
        memcpy((char *)settings + option->field, &yes, sizeof yes);
        return 0;
    }
    if (equals)
        return read_value(settings, option, equals + 1);
    if (*i + 1 >= n || !strncmp(words[*i + 1], "--", 2))
        return tarry_complain(TARRY_EXIT_WRONG, "--%s needs %s after it", option->word,
                              option->value);
    return read_value(settings, option, words[++*i]);
}

static int read_operand(tarry_settings *settings, const char *command, const char *operand,
                        const char *word) {
    if (!operand)
        return tarry_complain(TARRY_EXIT_WRONG, "%s takes no word such as '%s'", command, word);
    if (settings->operand)
        return tarry_complain(TARRY_EXIT_WRONG, "%s takes one %s; both '%s' and '%s' were given",
                              command, operand, settings->operand, word);
    settings->operand = word;
    return 0;
}

int tarry_options_read(tarry_settings *settings, const char *name, tarry_command_bit command,
                       const char *operand, char *const *words, int n) {
    bool only_operands = false;
    memset(settings, 0, sizeof *settings);
    for (int i = 0; i < n; i++) {
        const char *word = words[i];
        int status = 0;
        if (!only_operands && !strcmp(word, "--"))
            only_operands = true;
        else if (!only_operands && !strcmp(word, "-h"))
            settings->help = true;
        else if (!only_operands && !strncmp(word, "--", 2))
            status = read_option(settings, name, command, words, n, &i);
        else if (!only_operands && word[0] == '-' && word[1])
            status = tarry_complain(
                TARRY_EXIT_WRONG, "%s has no option %s; options begin with two dashes", name, word);
        else
            status = read_operand(settings, name, operand, word);
        if (status)
            return status;
    }
    return 0;
}

void tarry_options_release(tarry_settings *settings) {
    for (size_t i = 0; i < settings->n_overrides; i++) {
        free((void *)settings->overrides[i].name);
        free((void *)settings->overrides[i].option);
    }
    free(settings->overrides);
    memset(settings, 0, sizeof *settings);
}

/* What help says of an option, its range included. */
static void tell(const option_row *option, char *out, size_t size) {
    if (option->most == MOST_SEED)
        snprintf(out, size, "%s (0 to 2^63-1)", option->help);
    else if (option->most)
        snprintf(out, size, "%s (%lld to %lld)", option->help, option->least, option->most);
    else
        snprintf(out, size, "%s", option->help);
}

void tarry_options_each(tarry_command_bit command,
                        void (*visit)(const tarry_option_words *option, void *context),
                        void *context) {
    for (size_t i = 0; i < N_OPTIONS; i++) {
        char help[160];
        if (!(options[i].commands & command))
            continue;
        tell(&options[i], help, sizeof help);
        const tarry_option_words words = {options[i].word, options[i].value, help};
        visit(&words, context);
    }
}

static void write_line(const tarry_option_words *option, void *context) {
    char left[40];
    snprintf(left, sizeof left, "--%s%s%s", option->word, option->value ? " " : "",
             option->value ? option->value : "");
    fprintf(context, "  %-19s  %s\n", left, option->help);
}

void tarry_options_help(tarry_command_bit command, FILE *stream) {
    tarry_options_each(command, write_line, stream);
}
