/* SPDX-License-Identifier: GPL-3.0-or-later */

/* The program: streams and signals in order, then the command. */

#include "cli/commands.h"
#include "tarry/tarry.h"

#include <fcntl.h>
#include <signal.h>
#include <string.h>
#include <unistd.h>

/* A stream that was handed over closed is opened for nothing, so that no file of ours gets its
 * number, and what is said with it. Writing to it still fails. */
static void keep_numbers_of_streams(void) {
    for (int stream = STDIN_FILENO; stream <= STDERR_FILENO; stream++)
        if (fcntl(stream, F_GETFD) < 0)
            open("/dev/null", O_RDONLY); /* takes the lowest number that is free */
}

int main(int argc, char **argv) {
    struct sigaction ignore;
    keep_numbers_of_streams();
    memset(&ignore, 0, sizeof ignore);
    ignore.sa_handler = SIG_IGN;
    sigaction(SIGPIPE, &ignore, NULL); /* writing fails instead, and is told */
    sigaction(SIGXFSZ, &ignore, NULL);
    tarry_start();
    return tarry_command_line(argc - 1, argv + 1);
}
