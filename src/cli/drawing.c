/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "cli/drawing.h"

#include "cli/talk.h"

#include <stdlib.h>
#include <string.h>
#include <unistd.h>

static int read_format(const char *word, tarry_figure_format *format) {
    static const char *const words[] = {
#define WORD(name, word) word,
        TARRY_FIGURE_FORMATS(WORD)
#undef WORD
    };
    *format = TARRY_FIGURE_SVG;
    if (!word)
        return 0;
    for (size_t i = 0; i < sizeof words / sizeof *words; i++) {
        if (!strcmp(word, words[i])) {
            *format = (tarry_figure_format)i;
            return 0;
        }
    }
    return tarry_complain(TARRY_EXIT_WRONG,
                          "--figures %s: one of svg, pdf, png and none is due here", word);
}

static void show_warning(void *context, const char *sentence) {
    const tarry_settings *settings = context;
    if (!settings->quiet)
        tarry_talk("%s", sentence);
}

/* The program that draws, as named in the variable GNUPLOT: from the root where it is a path, since
 * it will run in another folder. NULL where it is not named; to be freed. */
static char *find_gnuplot(void) {
    const char *named = getenv("GNUPLOT");
    char here[4096];
    if (!named || !*named)
        return NULL;
    if (*named == '/' || !strchr(named, '/') || !getcwd(here, sizeof here))
        return strdup(named);
    char *path = malloc(strlen(here) + strlen(named) + 2);
    if (path)
        sprintf(path, "%s/%s", here, named);
    return path;
}

/* "a,b" -> names, in a text of the drawing's own. */
static int split_genes(const char *list, tarry_drawing *d) {
    if (!list)
        return 0;
    d->genes = strdup(list);
    d->names = calloc(strlen(list) + 1, sizeof *d->names);
    if (!d->genes || !d->names)
        return tarry_complain(TARRY_EXIT_FAILED, "out of memory for the names of genes");
    for (char *at = d->genes, *next; at; at = next) {
        char *comma = strchr(at, ',');
        next = comma ? comma + 1 : NULL;
        if (comma)
            *comma = '\0';
        at += strspn(at, " ");
        at[strcspn(at, " ")] = '\0';
        if (!*at)
            return tarry_complain(TARRY_EXIT_WRONG,
                                  "--genes %s: names with commas between them are due here", list);
        d->names[d->figures.n_genes++] = at;
    }
    return 0;
}

int tarry_drawing_read(const tarry_settings *settings, tarry_drawing *drawing) {
    *drawing = (tarry_drawing){.gnuplot = find_gnuplot()};
    drawing->figures = (tarry_figure_options){
        .gnuplot = drawing->gnuplot, .warn = show_warning, .warn_context = (void *)settings};
    int status = read_format(settings->figures, &drawing->figures.format);
    if (!status)
        status = split_genes(settings->genes, drawing);
    drawing->figures.genes = drawing->names;
    return status;
}

void tarry_drawing_release(tarry_drawing *drawing) {
    free(drawing->gnuplot);
    free(drawing->genes);
    free(drawing->names);
}
