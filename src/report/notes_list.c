/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "report/notes_list.h"

#include "report/lines.h"

#include <string.h>

/* Notes on single genes and figures: up to MOST_ALL paragraphs all are listed, else the first few.
 */
enum { MOST_ALL = 12, SHOWN_OF_MORE = 3 };

/* "vela.transcript, window all: the correlation ...": what is said, of what. */
typedef struct note {
    const char *name;
    size_t name_size; /* up to ", window"; 0 where the note is not of this form */
    const char *rest; /* ", window all: the correlation ..." */
} note;

static note note_of(const char *line) {
    const char *window = strstr(line, ", window ");
    const char *colon = strchr(line, ':');
    if (!window || !colon || colon < window)
        return (note){line, 0, line};
    return (note){line, (size_t)(window - line), window};
}

static bool say_the_same(note one, note other) {
    return one.name_size && other.name_size && !strcmp(one.rest, other.rest);
}

static bool was_said(const tarry_results *results, size_t i) {
    const note this = note_of(tarry_results_warning(results, i));
    for (size_t j = 0; j < i; j++)
        if (say_the_same(this, note_of(tarry_results_warning(results, j))))
            return true;
    return false;
}

static size_t count_named(const tarry_results *results) {
    size_t n = 0;
    for (size_t i = 0; i < tarry_results_n_warnings(results); i++)
        n += note_of(tarry_results_warning(results, i)).name_size > 0 && !was_said(results, i);
    return n;
}

/* Note i, with the names of those after it that say the same. */
static void join_names(const tarry_results *results, size_t i, tarry_text *paragraph) {
    const note this = note_of(tarry_results_warning(results, i));
    tarry_text_add(paragraph, this.name, this.name_size);
    for (size_t j = i + 1; j < tarry_results_n_warnings(results); j++) {
        const note other = note_of(tarry_results_warning(results, j));
        if (!say_the_same(this, other))
            continue;
        tarry_text_add_string(paragraph, ", ");
        tarry_text_add(paragraph, other.name, other.name_size);
    }
    tarry_text_add_string(paragraph, this.rest);
}

bool tarry_notes_each(const tarry_results *results,
                      void (*add)(void *context, const char *paragraph), void *context) {
    const size_t n = tarry_results_n_warnings(results);
    const size_t n_named = count_named(results);
    const size_t most = n_named > MOST_ALL ? SHOWN_OF_MORE : n_named;
    size_t n_shown = 0;
    bool whole = true;
    for (size_t i = 0; i <= n; i++) {
        tarry_text paragraph = {0};
        if (i == n && n_named > most)
            tarry_text_printf(&paragraph,
                              "%zu more notes of these kinds are under `warnings` in summary.json",
                              n_named - most);
        else if (i == n || was_said(results, i) ||
                 (note_of(tarry_results_warning(results, i)).name_size > 0 && n_shown++ >= most))
            continue;
        else
            join_names(results, i, &paragraph);
        whole = whole && !paragraph.failed;
        if (!paragraph.failed)
            add(context, paragraph.data);
        tarry_text_release(&paragraph);
    }
    return whole;
}

/* ---- on the terminal ------------------------------------------------------------------------ */

typedef struct note_lines {
    tarry_text *text;
    int width;
} note_lines;

static void add_lines(void *context, const char *paragraph) {
    const note_lines *lines = context;
    tarry_lines_wrap(lines->text, "- ", paragraph, lines->width);
}

void tarry_notes_list(const tarry_results *results, int width, tarry_text *text) {
    note_lines lines = {text, width};
    if (!tarry_notes_each(results, add_lines, &lines))
        text->failed = true;
}
