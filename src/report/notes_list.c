#include "report/notes_list.h"

#include "report/lines.h"

#include <string.h>

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

void tarry_notes_list(const tarry_results *results, int width, tarry_text *text) {
    const size_t n = tarry_results_n_warnings(results);
    for (size_t i = 0; i < n; i++) {
        const note this = note_of(tarry_results_warning(results, i));
        tarry_text paragraph = {0};
        if (was_said(results, i))
            continue;
        tarry_text_add(&paragraph, this.name, this.name_size);
        for (size_t j = i + 1; j < n; j++) {
            const note other = note_of(tarry_results_warning(results, j));
            if (!say_the_same(this, other))
                continue;
            tarry_text_add_string(&paragraph, ", ");
            tarry_text_add(&paragraph, other.name, other.name_size);
        }
        tarry_text_add_string(&paragraph, this.rest);
        text->failed = text->failed || paragraph.failed;
        if (!paragraph.failed)
            tarry_lines_wrap(text, "- ", paragraph.data, width);
        tarry_text_release(&paragraph);
    }
}
