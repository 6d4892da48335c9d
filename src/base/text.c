/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "base/text.h"

#include "base/memory.h"
#include "base/number.h"

#include <stdarg.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

/* Room for n more bytes and a NUL; false, and `failed` set, where memory is short. */
static bool make_room(tarry_text *text, size_t n) {
    if (text->failed)
        return false;
    if (n > SIZE_MAX - text->size - 1) {
        text->failed = true;
        return false;
    }
    void *data = text->data;
    if (tarry_grow(&data, &text->capacity, text->size + n + 1, 1) != 0) {
        text->failed = true;
        return false;
    }
    text->data = data;
    return true;
}

void tarry_text_add(tarry_text *text, const char *bytes, size_t n) {
    if (!make_room(text, n))
        return;
    if (n > 0)
        memcpy(text->data + text->size, bytes, n);
    text->size += n;
    text->data[text->size] = '\0';
}

void tarry_text_add_string(tarry_text *text, const char *string) {
    tarry_text_add(text, string, strlen(string));
}

void tarry_text_add_number(tarry_text *text, double value) {
    if (make_room(text, TARRY_NUMBER_SIZE))
        text->size += tarry_number_write(value, text->data + text->size);
}

void tarry_text_printf(tarry_text *text, const char *format, ...) {
    va_list arguments, again;
    va_start(arguments, format);
    va_copy(again, arguments);
    const int n = vsnprintf(NULL, 0, format, arguments);
    if (n < 0) {
        text->failed = true;
    } else if (make_room(text, (size_t)n)) {
        vsnprintf(text->data + text->size, (size_t)n + 1, format, again);
        text->size += (size_t)n;
    }
    va_end(again);
    va_end(arguments);
}

void tarry_text_release(tarry_text *text) {
    free(text->data);
    *text = (tarry_text){NULL, 0, 0, false};
}

enum { LONGEST_WORD = 63 };

static int least(int a, int b) {
    return a < b ? a : b;
}

/* Letters put in, left out, changed, or two neighbours swapped: the fewest that turn a into b, both
 * of at most LONGEST_WORD bytes (Wagner & Fischer 1974, J. ACM 21:168, with swaps after Damerau
 * 1964, Commun. ACM 7:171; no letter is touched twice). */
static int edit_distance(const char *a, int n_a, const char *b, int n_b) {
    int rows[3][LONGEST_WORD + 1];
    int *before = rows[0], *last = rows[1], *now = rows[2];
    for (int j = 0; j <= n_b; j++)
        last[j] = j;
    for (int i = 1; i <= n_a; i++) {
        now[0] = i;
        for (int j = 1; j <= n_b; j++) {
            const int changed = last[j - 1] + (a[i - 1] != b[j - 1]);
            now[j] = least(changed, least(last[j], now[j - 1]) + 1);
            if (i > 1 && j > 1 && a[i - 1] == b[j - 2] && a[i - 2] == b[j - 1])
                now[j] = least(now[j], before[j - 2] + 1);
        }
        int *const oldest = before;
        before = last;
        last = now;
        now = oldest;
    }
    return last[n_b];
}

const char *tarry_nearest_word(const char *word, const char *const *candidates, size_t n) {
    const size_t length = strlen(word);
    if (length > LONGEST_WORD)
        return NULL;
    const int limit = length >= 6 ? (int)(length / 3) : 1;
    int nearest = limit + 1;
    const char *found = NULL;
    for (size_t i = 0; i < n; i++) {
        const size_t other = strlen(candidates[i]);
        if (other > LONGEST_WORD)
            continue;
        const int distance = edit_distance(word, (int)length, candidates[i], (int)other);
        /* A word of which no letter is left was not meant. */
        if (distance < nearest && distance < (int)(length > other ? length : other)) {
            nearest = distance;
            found = candidates[i];
        }
    }
    return found;
}
