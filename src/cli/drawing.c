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

int tarry_drawing_read(const tarry_settings *settings, tarry_figure_options *figures,
                       char **gnuplot) {
    *gnuplot = find_gnuplot();
    *figures = (tarry_figure_options){
        .gnuplot = *gnuplot, .warn = show_warning, .warn_context = (void *)settings};
    return read_format(settings->figures, &figures->format);
}
