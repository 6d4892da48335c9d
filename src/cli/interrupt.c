/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "cli/interrupt.h"

#include <errno.h>
#include <signal.h>
#include <stddef.h>
#include <string.h>
#include <unistd.h>

static volatile sig_atomic_t asked_to_stop;
static volatile sig_atomic_t answers;

static const char answer[] =
    "\ntarry: stopping; cells under way are finished and saved (once more: stop at once)\n";

/* Only what is safe in a signal handler. */
static void on_signal(int number) {
    if (__atomic_load_n(&asked_to_stop, __ATOMIC_RELAXED)) {
        struct sigaction usual;
        memset(&usual, 0, sizeof usual);
        usual.sa_handler = SIG_DFL;
        sigaction(number, &usual, NULL);
        raise(number);
        return;
    }
    __atomic_store_n(&asked_to_stop, 1, __ATOMIC_RELAXED);
    if (answers) {
        const int kept = errno;
        const ssize_t ignored = write(STDERR_FILENO, answer, sizeof answer - 1);
        (void)ignored; /* nothing could be done about a failure here */
        errno = kept;
    }
}

const volatile int *tarry_interrupt_watch(bool say) {
    static const int numbers[] = {SIGINT, SIGTERM, SIGHUP};
    answers = say;
    for (size_t i = 0; i < sizeof numbers / sizeof *numbers; i++) {
        struct sigaction action;
        if (sigaction(numbers[i], NULL, &action) || action.sa_handler == SIG_IGN)
            continue;
        memset(&action, 0, sizeof action);
        action.sa_handler = on_signal;
        action.sa_flags = SA_RESTART;
        sigaction(numbers[i], &action, NULL);
    }
    return &asked_to_stop;
}
