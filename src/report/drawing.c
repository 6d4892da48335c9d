/* SPDX-License-Identifier: GPL-3.0-or-later */

/* All scripts go to one gnuplot, one after another. A picture counts once it is whole; what is not
 * is removed. Where a picture is wanted that is no SVG, a second script makes an SVG for the page;
 * both go again. */
#include "report/drawing.h"

#include "base/error.h"
#include "base/file.h"
#include "report/picture.h"
#include "report/plotter.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>

enum { MOST_BYTES = 1 << 28, SAID = 200 };

static const double usual_seconds = 60;
static const char log_name[] = "figures/gnuplot.log";

typedef struct drawing {
    tarry_run_folder *folder;
    const tarry_figure_options *options;
    tarry_figure_list *list;
    bool *skipped;      /* [figure]: another's file stands in the way */
    const char **words; /* of the command, NULL at the end */
    size_t n_words;
    tarry_arena arena;
    size_t n_missing;
} drawing;

/* Tell a sentence that was made in the arena. */
static int warn(const drawing *d, const char *sentence, tarry_error *error) {
    if (d->options->warn && sentence)
        d->options->warn(d->options->warn_context, sentence);
    return sentence ? 0 : tarry_fail_memory(error, "a warning");
}

static const char *ending(tarry_figure_format format) {
    static const char *const endings[] = {
#define ENDING(name, word) word,
        TARRY_FIGURE_FORMATS(ENDING)
#undef ENDING
    };
    return endings[format];
}

/* "figures/STEM.ending", in the arena; NULL when memory is short. */
static const char *name_of(drawing *d, const tarry_figure *figure, const char *extension) {
    return tarry_arena_format(&d->arena, "%s/%s.%s", tarry_figures_name, figure->stem, extension);
}

static int fail_name(tarry_error *error) {
    return tarry_fail_memory(error, "the name of a figure");
}

/* ---- before ---------------------------------------------------------------------------------- */

static const char *const extensions[] = {"csv", "gp", NULL, "page.gp", "page.svg"};

enum { N_EXTENSIONS = sizeof extensions / sizeof *extensions };

/* The i-th file of a figure, in the arena; NULL when memory is short. */
static const char *file_of(drawing *d, const tarry_figure *figure, size_t i) {
    return name_of(d, figure, extensions[i] ? extensions[i] : ending(d->options->format));
}

/* A figure whose files would replace what is not ours is left out. */
static int look_in_the_way(drawing *d, size_t i, tarry_error *error) {
    for (size_t e = 0; e < N_EXTENSIONS; e++) {
        bool free_ = false;
        const char *name = file_of(d, &d->list->items[i], e);
        const int code = name ? tarry_run_folder_is_free(d->folder, name, &free_, error)
                              : fail_name(error);
        if (code)
            return code;
        if (free_)
            continue;
        d->skipped[i] = true;
        return warn(d,
                    tarry_arena_format(&d->arena,
                                       "warning: %s/%s is no file of an earlier run, so it is not "
                                       "overwritten and this figure is left out",
                                       d->folder->path, name),
                    error);
    }
    return 0;
}

static int plan_figure(drawing *d, size_t i, tarry_error *error) {
    int code = look_in_the_way(d, i, error);
    for (size_t e = 0; !code && !d->skipped[i] && e < N_EXTENSIONS; e++) {
        const char *name = file_of(d, &d->list->items[i], e);
        code = name ? tarry_run_folder_plan(d->folder, name, error) : fail_name(error);
    }
    return code;
}

/* The folder, and notice of all that will be in it. */
static int prepare(drawing *d, tarry_error *error) {
    int code = tarry_folder_make(tarry_run_folder_path(d->folder, tarry_figures_name), error);
    if (!code)
        code = tarry_run_folder_plan(d->folder, log_name, error);
    for (size_t i = 0; !code && i < d->list->n; i++)
        code = plan_figure(d, i, error);
    return code ? code : tarry_run_folder_announce(d->folder, error);
}

static int write_text(drawing *d, const char *name, char *bytes, bool listed, tarry_error *error) {
    const tarry_text text = {.data = bytes, .size = strlen(bytes)};
    return name ? tarry_run_folder_write(d->folder, name, &text, listed, true, error)
                : fail_name(error);
}

static int add_word(drawing *d, const char *word, tarry_error *error) {
    d->words[d->n_words++] = word;
    return word ? 0 : fail_name(error);
}

static int write_figure(drawing *d, tarry_figure *figure, tarry_error *error) {
    int code = write_text(d, name_of(d, figure, "csv"), figure->data, true, error);
    if (!code)
        code = write_text(d, name_of(d, figure, "gp"), figure->script, true, error);
    if (!code)
        code = add_word(d, tarry_arena_format(&d->arena, "%s.gp", figure->stem), error);
    if (code || !figure->page_script)
        return code;
    code = write_text(d, name_of(d, figure, "page.gp"), figure->page_script, false, error);
    if (!code)
        code = add_word(d, tarry_arena_format(&d->arena, "%s.page.gp", figure->stem), error);
    return code;
}

static int write_figures(drawing *d, tarry_error *error) {
    int code = prepare(d, error);
    for (size_t i = 0; !code && i < d->list->n; i++)
        if (!d->skipped[i])
            code = write_figure(d, &d->list->items[i], error);
    return code;
}

/* ---- gnuplot --------------------------------------------------------------------------------- */

/* Read a file that another program may have made: there is none where it cannot be read. Only
 * TARRY_MEMORY is an error. */
static int read_if_there(const drawing *d, const char *name, tarry_text *text, tarry_error *error) {
    const int code = tarry_file_read(tarry_run_folder_path(d->folder, name), MOST_BYTES, text,
                                     NULL);
    if (code)
        tarry_text_release(text);
    return code == TARRY_MEMORY ? tarry_fail_memory(error, name) : 0;
}

/* What gnuplot said, in one line: where it names the place in a script, or how it began; "" where
 * nothing was said. */
static int read_log(drawing *d, char said[SAID], tarry_error *error) {
    tarry_text text = {0};
    *said = '\0';
    if (read_if_there(d, log_name, &text, error))
        return TARRY_MEMORY;
    if (text.size > 0) {
        const char *place = strstr(text.data, ".gp\", line ");
        while (place && place > text.data && place[-1] != '\n')
            place--;
        const char *at = place ? place : text.data;
        at += strspn(at, " \t\r\n");
        snprintf(said, SAID, "%.*s", (int)strcspn(at, "\r\n"), at);
    }
    tarry_text_release(&text);
    return tarry_run_folder_remove(d->folder, log_name, error);
}

static const char *describe_trouble(drawing *d, tarry_plotter_end end, int status,
                                    const char *program, const char *said) {
    tarry_arena *arena = &d->arena;
    switch (end) {
    case TARRY_PLOTTER_MISSING:
        return tarry_arena_format(
            arena,
            "%s could not be started (%s): install gnuplot, or name it in the "
            "variable GNUPLOT",
            program, strerror(status));
    case TARRY_PLOTTER_KILLED:
        return tarry_arena_format(arena, "%s was ended by signal %d", program, status);
    case TARRY_PLOTTER_SLOW:
        return tarry_arena_format(arena, "%s took too long and was ended", program);
    case TARRY_PLOTTER_STOPPED:
        return "drawing was interrupted";
    case TARRY_PLOTTER_FAILED:
        return tarry_arena_format(arena, "%s failed with status %d%s%s", program, status,
                                  *said ? ": " : "", said);
    case TARRY_PLOTTER_DONE:
        break;
    }
    return tarry_arena_format(arena, "%s left pictures out%s%s", program, *said ? ": " : "", said);
}

static int run_gnuplot(drawing *d, tarry_plotter_end *end, int *status, char said[SAID],
                       tarry_error *error) {
    const tarry_figure_options *options = d->options;
    const bool told_before = options->stop && *options->stop;
    const tarry_plotter_job job = {
        .program = d->words[0],
        .words = d->words,
        .folder = tarry_run_folder_path(d->folder, tarry_figures_name),
        .log = strrchr(log_name, '/') + 1,
        .seconds = options->seconds > 0 ? options->seconds : usual_seconds,
        .stop = told_before ? NULL : options->stop,
    };
    const int code = tarry_plotter_run(&job, end, status, error);
    return code ? code : read_log(d, said, error);
}

/* ---- after ----------------------------------------------------------------------------------- */

/* Read a picture; *text stays empty, and the file is removed, where there is none or only a part.
 */
static int read_picture(drawing *d, const char *name, tarry_figure_format format, tarry_text *text,
                        tarry_error *error) {
    if (!name)
        return fail_name(error);
    if (read_if_there(d, name, text, error))
        return TARRY_MEMORY;
    if (text->size > 0 && tarry_picture_is_whole(format, text->data, text->size))
        return 0;
    tarry_text_release(text);
    return tarry_run_folder_remove(d->folder, name, error);
}

static int keep_svg(tarry_figure *figure, const tarry_text *picture, tarry_error *error) {
    tarry_text svg = {0};
    if (picture->size == 0)
        return 0;
    tarry_picture_inline(picture->data, figure->stem, &svg);
    if (svg.failed) {
        tarry_text_release(&svg);
        return tarry_fail_memory(error, "a figure");
    }
    figure->svg = svg.data;
    return 0;
}

static int take_page_picture(drawing *d, tarry_figure *figure, tarry_error *error) {
    tarry_text picture = {0};
    const char *name = name_of(d, figure, "page.svg"), *script = name_of(d, figure, "page.gp");
    int code = read_picture(d, name, TARRY_FIGURE_SVG, &picture, error);
    if (!code)
        code = keep_svg(figure, &picture, error);
    if (!code)
        code = script ? tarry_run_folder_remove(d->folder, script, error) : fail_name(error);
    if (!code)
        code = tarry_run_folder_remove(d->folder, name, error);
    tarry_text_release(&picture);
    return code;
}

static int take_picture(drawing *d, tarry_figure *figure, tarry_error *error) {
    const tarry_figure_format format = d->options->format;
    tarry_text picture = {0};
    const char *name = name_of(d, figure, ending(format));
    int code = read_picture(d, name, format, &picture, error);
    if (code || picture.size == 0) {
        d->n_missing += !code;
        return code;
    }
    if (format == TARRY_FIGURE_PDF && tarry_picture_fix_dates(picture.data, picture.size))
        code = tarry_run_folder_write(d->folder, name, &picture, false, true, error);
    if (!code)
        code = tarry_run_folder_list(d->folder, name, picture.data, picture.size, true, error);
    if (!code && format == TARRY_FIGURE_SVG)
        code = keep_svg(figure, &picture, error);
    tarry_text_release(&picture);
    return code;
}

static int take_pictures(drawing *d, tarry_error *error) {
    int code = 0;
    for (size_t i = 0; !code && i < d->list->n; i++) {
        tarry_figure *figure = &d->list->items[i];
        if (d->skipped[i])
            continue;
        code = take_picture(d, figure, error);
        if (!code && figure->page_script)
            code = take_page_picture(d, figure, error);
    }
    return code;
}

static int draw(drawing *d, tarry_error *error) {
    char said[SAID] = "";
    tarry_plotter_end end = TARRY_PLOTTER_DONE;
    int status = 0;
    int code = write_figures(d, error);
    if (!code && d->n_words > 2)
        code = run_gnuplot(d, &end, &status, said, error);
    if (!code)
        code = take_pictures(d, error);
    if (code || (end == TARRY_PLOTTER_DONE && d->n_missing == 0))
        return code;
    const char *trouble = describe_trouble(d, end, status, d->words[0], said);
    return warn(d,
                trouble ? tarry_arena_format(
                              &d->arena,
                              "warning: %zu of %zu figures could not be drawn: %s. All numbers are "
                              "written; %s/figures has a script and data for each figure",
                              d->n_missing, d->list->n, trouble, d->folder->path)
                        : NULL,
                error);
}

int tarry_figures_draw(tarry_run_folder *folder, const tarry_figure_options *options,
                       tarry_figure_list *list, tarry_error *error) {
    drawing d = {.folder = folder, .options = options, .list = list};
    const bool named = options->gnuplot && *options->gnuplot;
    int code = 0;
    if (list->left_out)
        warn(&d, list->left_out, NULL);
    if (list->n == 0)
        return 0;
    d.skipped = tarry_calloc(list->n, sizeof *d.skipped);
    d.words = tarry_calloc(2 * list->n + 3, sizeof *d.words);
    if (d.skipped && d.words) {
        /* -d: whatever the user has set for gnuplot does not show in our figures. */
        d.words[d.n_words++] = named ? options->gnuplot : "gnuplot";
        d.words[d.n_words++] = "-d";
        code = draw(&d, error);
    } else {
        code = tarry_fail_memory(error, "figures");
    }
    free(d.skipped);
    free(d.words);
    tarry_arena_release(&d.arena);
    return code;
}
