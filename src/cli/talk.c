/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "cli/talk.h"

#include <errno.h>
#include <stdarg.h>
#include <stdio.h>
#include <string.h>

enum { ERROR_TEXT = 2048, LINE_TEXT = 4096 };

/* One line: what is quoted from a file may hold characters that would move a terminal's cursor. */
static void talk(const char *format, va_list arguments) {
    char line[LINE_TEXT];
    vsnprintf(line, sizeof line, format, arguments);
    for (char *at = line; *at != '\0'; at++)
        if ((unsigned char)*at < ' ' || *at == 127)
            *at = '?';
    fprintf(stderr, "tarry: %s\n", line);
}

void tarry_talk(const char *format, ...) {
    va_list arguments;
    va_start(arguments, format);
    talk(format, arguments);
    va_end(arguments);
}

int tarry_complain(int status, const char *format, ...) {
    va_list arguments;
    va_start(arguments, format);
    talk(format, arguments);
    va_end(arguments);
    return status;
}

int tarry_complain_error(const tarry_error *error) {
    char text[ERROR_TEXT];
    return tarry_complain(tarry_code_status(error->code), "%s",
                          tarry_error_text(error, text, (int)sizeof text));
}

int tarry_output(const char *text) {
    if (fputs(text, stdout) == EOF || fflush(stdout) == EOF)
        return tarry_complain(TARRY_EXIT_FAILED, "standard output could not be written: %s",
                              strerror(errno));
    return TARRY_EXIT_DONE;
}
