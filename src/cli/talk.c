/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "cli/talk.h"

#include <errno.h>
#include <stdarg.h>
#include <stdio.h>
#include <string.h>

enum { ERROR_TEXT = 2048 };

static void talk(const char *format, va_list arguments) {
    fputs("tarry: ", stderr);
    vfprintf(stderr, format, arguments);
    fputc('\n', stderr);
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
