/* The program: signals in order, then the command. */

#include "cli/commands.h"
#include "tarry/tarry.h"

#include <signal.h>
#include <string.h>

int main(int argc, char **argv) {
    struct sigaction ignore;
    memset(&ignore, 0, sizeof ignore);
    ignore.sa_handler = SIG_IGN;
    sigaction(SIGPIPE, &ignore, NULL); /* writing fails instead, and is told */
    sigaction(SIGXFSZ, &ignore, NULL);
    tarry_start();
    return tarry_command_line(argc - 1, argv + 1);
}
