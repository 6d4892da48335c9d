/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "fuzz.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>

void fuzz_must(int holds, const char *words) {
    if (holds)
        return;
    fprintf(stderr, "fuzz: it does not hold that %s\n", words);
    abort();
}

char *fuzz_text(const uint8_t *data, size_t size) {
    const void *end = size > 0 ? memchr(data, 0, size) : NULL;
    const size_t n = end != NULL ? (size_t)((const uint8_t *)end - data) : size;
    char *text = malloc(n + 1);
    if (text == NULL)
        abort();
    if (n > 0)
        memcpy(text, data, n);
    text[n] = '\0';
    return text;
}
