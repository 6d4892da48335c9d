/* The program: standard streams and signals in order, then the command. */

#include "cli/commands.h"
#include "cli/talk.h"
#include "tarry/tarry.h"

#include <errno.h>
#include <fcntl.h>
#include <signal.h>
#include <string.h>
#include <unistd.h>

/* A standard stream that was closed would be the next file opened, and results would be mixed with
 * talk. Put something there that gives an error when written to. */
static int hold_standard_streams(void) {
    for (int stream = STDIN_FILENO; stream <= STDERR_FILENO; stream++)
        if (fcntl(stream, F_GETFD) == -1 && errno == EBADF && open("/dev/null", O_RDONLY) != stream)
            return 1;
    return 0;
}

int main(int argc, char **argv) {
    if (hold_standard_streams())
        return TARRY_EXIT_FAILED;
    struct sigaction ignore;
    memset(&ignore, 0, sizeof ignore);
    ignore.sa_handler = SIG_IGN;
    sigaction(SIGPIPE, &ignore, NULL); /* writing fails instead, and is told */
    sigaction(SIGXFSZ, &ignore, NULL);
    tarry_start();
    return tarry_command_line(argc - 1, argv + 1);
}
