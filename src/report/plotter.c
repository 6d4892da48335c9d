/* SPDX-License-Identifier: GPL-3.0-or-later */

/* The one place in the library that starts another program: figures are gnuplot's work.
 *
 * The time it may take is counted in naps between two looks, since the library reads no clock: a
 * nap takes at least as long as it was asked for, so the limit is never shorter than it says. The
 * child gets the default answers to signals, whatever ours are. SOURCE_DATE_EPOCH keeps dates out
 * of what it writes, where its own libraries heed that. */
#define _GNU_SOURCE /* posix_spawn_file_actions_addchdir_np */

#include "report/plotter.h"

#include "base/error.h"
#include "base/memory.h"

#include <errno.h>
#include <fcntl.h>
#include <signal.h>
#include <spawn.h>
#include <stdbool.h>
#include <stdlib.h>
#include <string.h>
#include <sys/wait.h>
#include <time.h>
#include <unistd.h>

static const long nap = 2000000; /* ns */

/* The variables of this process, with the date fixed unless it is already. */
static char **make_environment(void) {
    static const char date[] = "SOURCE_DATE_EPOCH=0";
    size_t n = 0;
    bool has_date = false;
    while (environ && environ[n])
        has_date = !strncmp(environ[n++], date, sizeof "SOURCE_DATE_EPOCH=" - 1) || has_date;
    char **copy = tarry_calloc(n + 2, sizeof *copy);
    for (size_t i = 0; copy && i < n; i++)
        copy[i] = environ[i];
    if (copy && !has_date)
        copy[n] = (char *)date; /* only read */
    return copy;
}

/* Where it runs, and what its standard streams are. */
static int fill_actions(posix_spawn_file_actions_t *actions, const tarry_plotter_job *job) {
    int failed = posix_spawn_file_actions_addchdir_np(actions, job->folder);
    if (!failed)
        failed = posix_spawn_file_actions_addopen(actions, STDIN_FILENO, "/dev/null", O_RDONLY, 0);
    if (!failed)
        failed = posix_spawn_file_actions_addopen(actions, STDOUT_FILENO, job->log,
                                                  O_WRONLY | O_CREAT | O_TRUNC, 0666);
    if (!failed)
        failed = posix_spawn_file_actions_adddup2(actions, STDOUT_FILENO, STDERR_FILENO);
    return failed;
}

static int fill_attributes(posix_spawnattr_t *attributes) {
    sigset_t none, usual;
    sigemptyset(&none);
    sigemptyset(&usual);
    static const int numbers[] = {SIGINT, SIGTERM, SIGHUP, SIGPIPE, SIGQUIT, SIGXFSZ};
    for (size_t i = 0; i < sizeof numbers / sizeof *numbers; i++)
        sigaddset(&usual, numbers[i]);
    int failed = posix_spawnattr_setflags(
        attributes, POSIX_SPAWN_SETPGROUP | POSIX_SPAWN_SETSIGDEF | POSIX_SPAWN_SETSIGMASK);
    if (!failed)
        failed = posix_spawnattr_setpgroup(attributes, 0);
    if (!failed)
        failed = posix_spawnattr_setsigdefault(attributes, &usual);
    if (!failed)
        failed = posix_spawnattr_setsigmask(attributes, &none);
    return failed;
}

/* Returns 0, or the error number; *ready: all was prepared, and the start itself failed. */
static int start(const tarry_plotter_job *job, char **environment, pid_t *child, bool *ready) {
    posix_spawn_file_actions_t actions;
    posix_spawnattr_t attributes;
    *ready = false;
    int failed = posix_spawn_file_actions_init(&actions);
    if (failed)
        return failed;
    failed = posix_spawnattr_init(&attributes);
    if (failed) {
        posix_spawn_file_actions_destroy(&actions);
        return failed;
    }
    failed = fill_actions(&actions, job);
    if (!failed)
        failed = fill_attributes(&attributes);
    *ready = !failed;
    if (!failed)
        failed = posix_spawnp(child, job->program, &actions, &attributes, (char *const *)job->words,
                              environment);
    posix_spawnattr_destroy(&attributes);
    posix_spawn_file_actions_destroy(&actions);
    return failed;
}

/* True once the child has ended. Where its end was thrown away (SIGCHLD ignored) it counts as done:
 * what it made is looked at anyway. */
static bool has_ended(pid_t child, int options, int *status) {
    pid_t ended;
    do
        ended = waitpid(child, status, options);
    while (ended < 0 && errno == EINTR);
    if (ended < 0)
        *status = 0;
    return ended != 0;
}

static void kill_group(pid_t child) {
    int ignored;
    kill(-child, SIGKILL);
    has_ended(child, 0, &ignored);
}

static tarry_plotter_end wait_for(const tarry_plotter_job *job, pid_t child, int *status) {
    const struct timespec pause = {.tv_nsec = nap};
    for (double waited = 0; !has_ended(child, WNOHANG, status); waited += 1e-9 * (double)nap) {
        const bool stopped = job->stop && *job->stop;
        if (stopped || waited > job->seconds) {
            kill_group(child);
            *status = SIGKILL;
            return stopped ? TARRY_PLOTTER_STOPPED : TARRY_PLOTTER_SLOW;
        }
        nanosleep(&pause, NULL);
    }
    const bool by_signal = WIFSIGNALED(*status);
    *status = by_signal ? WTERMSIG(*status) : WEXITSTATUS(*status);
    if (by_signal)
        return TARRY_PLOTTER_KILLED;
    return *status == 0 ? TARRY_PLOTTER_DONE : TARRY_PLOTTER_FAILED;
}

int tarry_plotter_run(const tarry_plotter_job *job, tarry_plotter_end *end, int *status,
                      tarry_error *error) {
    pid_t child;
    bool ready;
    char **environment = make_environment();
    if (!environment)
        return tarry_fail_memory(error, "the variables of another program");
    *status = start(job, environment, &child, &ready);
    free(environment);
    if (*status == ENOMEM && !ready)
        return tarry_fail_memory(error, "starting another program");
    *end = *status ? TARRY_PLOTTER_MISSING : wait_for(job, child, status);
    return 0;
}
