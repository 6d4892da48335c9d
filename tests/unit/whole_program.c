/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "whole_program.h"

#include "cli/commands.h"
#include "support.h"

#include <fcntl.h>
#include <stdio.h>
#include <unistd.h>

static int said_file = -1;

int program_listen(void) {
    fflush(stdout);
    said_file = open(test_path("said"), O_RDWR | O_CREAT | O_APPEND | O_CLOEXEC, 0600);
    const int nowhere = open("/dev/null", O_WRONLY | O_CLOEXEC);
    const int before = dup(STDERR_FILENO);
    ck_assert(said_file >= 0 && nowhere >= 0 && before >= 0);
    ck_assert_int_ge(dup2(said_file, STDERR_FILENO), 0);
    ck_assert_int_ge(dup2(nowhere, STDOUT_FILENO), 0);
    return before;
}

int program_call(char *const *words, char *said, size_t size) {
    int n_words = 0;
    while (words[n_words])
        n_words++;
    if (ftruncate(said_file, 0))
        return -1;
    const int status = tarry_command_line(n_words, words);
    const ssize_t n = pread(said_file, said, size - 1, 0);
    said[n > 0 ? n : 0] = '\0';
    return status;
}
