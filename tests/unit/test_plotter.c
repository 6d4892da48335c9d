/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Another program at work: how it may end, and what it is given. The programs are those that POSIX
 * has everywhere. */

#include "report/plotter.h"
#include "support.h"

#include <errno.h>
#include <signal.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>
#include <unistd.h>

static char said[4096];

/* `sh -c command` in the test's folder, or another program without arguments. */
static tarry_plotter_end run(const char *program, const char *command, double seconds,
                             const volatile int *stop, int *status) {
    const char *const words[] = {program, command ? "-c" : NULL, command, NULL};
    const tarry_plotter_job job = {.program = program,
                                   .words = words,
                                   .folder = test_folder(),
                                   .log = "said.txt",
                                   .seconds = seconds,
                                   .stop = stop};
    tarry_plotter_end end;
    ck_assert_int_eq(tarry_plotter_run(&job, &end, status, NULL), 0);
    FILE *file = fopen(test_path("said.txt"), "rb");
    said[file ? fread(said, 1, sizeof said - 1, file) : 0] = '\0';
    if (file)
        ck_assert_int_eq(fclose(file), 0);
    return end;
}

START_TEST(ends) {
    int status;
    ck_assert_int_eq(run("sh", "exit 0", 20, NULL, &status), TARRY_PLOTTER_DONE);
    ck_assert_int_eq(run("sh", "exit 7", 20, NULL, &status), TARRY_PLOTTER_FAILED);
    ck_assert_int_eq(status, 7);
    ck_assert_int_eq(run("sh", "kill -SEGV $$", 20, NULL, &status), TARRY_PLOTTER_KILLED);
    ck_assert_int_eq(status, SIGSEGV);
    ck_assert_int_eq(run("no-such-program-anywhere", NULL, 20, NULL, &status),
                     TARRY_PLOTTER_MISSING);
    ck_assert_int_eq(status, ENOENT);
    ck_assert_int_eq(run("/dev/null", NULL, 20, NULL, &status), TARRY_PLOTTER_MISSING);
    ck_assert_int_eq(status, EACCES);
}
END_TEST

/* Streams, folder, environment, and signals as usual though ours are not. */
START_TEST(what_it_is_given) {
    int status;
    char here[4096];
    ck_assert_ptr_nonnull(getcwd(here, sizeof here));
    signal(SIGPIPE, SIG_IGN);
    signal(SIGINT, SIG_IGN);
    ck_assert_int_eq(run("sh", "cat; echo out; echo err >&2; pwd; echo $SOURCE_DATE_EPOCH; trap",
                         20, NULL, &status),
                     TARRY_PLOTTER_DONE);
    char expected[4200];
    ck_assert_int_eq(chdir(test_folder()), 0);
    char folder[4096];
    ck_assert_ptr_nonnull(getcwd(folder, sizeof folder));
    ck_assert_int_eq(chdir(here), 0);
    snprintf(expected, sizeof expected, "out\nerr\n%s\n0\n", folder);
    ck_assert_str_eq(said, expected);
    ck_assert_int_eq(run("sh", "kill -INT $$; kill -PIPE $$", 20, NULL, &status),
                     TARRY_PLOTTER_KILLED);
    ck_assert_int_eq(status, SIGINT);
    ck_assert_int_eq(setenv("SOURCE_DATE_EPOCH", "12", 1), 0);
    run("sh", "echo $SOURCE_DATE_EPOCH", 20, NULL, &status);
    ck_assert_str_eq(said, "12\n");
}
END_TEST

/* A process that has ended may still be there, unasked for. */
static bool is_alive(const char *number) {
    char path[64], line[256];
    bool alive = false;
    snprintf(path, sizeof path, "/proc/%ld/status", strtol(number, NULL, 10));
    FILE *file = fopen(path, "r");
    while (file && fgets(line, sizeof line, file))
        alive = alive || (!strncmp(line, "State:", 6) && !strchr(line, 'Z') && !strchr(line, 'X'));
    if (file)
        ck_assert_int_eq(fclose(file), 0);
    return alive;
}

/* Killed with all that it started, though it does not heed other signals: after its time, and when
 * told to stop. */
START_TEST(killing) {
    const volatile int stop = 1;
    int status;
    const time_t start = time(NULL);
    ck_assert_int_eq(run("sh", "trap '' TERM INT; sleep 60 & echo $!; wait", 0.3, NULL, &status),
                     TARRY_PLOTTER_SLOW);
    ck_assert_int_eq(status, SIGKILL);
    nanosleep(&(struct timespec){.tv_nsec = 100000000}, NULL);
    ck_assert(!is_alive(said));
    ck_assert_int_eq(run("sh", "sleep 60", 50, &stop, &status), TARRY_PLOTTER_STOPPED);
    ck_assert_int_eq(status, SIGKILL);
    ck_assert_int_lt(time(NULL) - start, 20);
}
END_TEST

/* Where nobody is told how children end, the end is taken for a good one. */
START_TEST(ends_that_are_thrown_away) {
    int status;
    signal(SIGCHLD, SIG_IGN);
    ck_assert_int_eq(run("sh", "exit 3", 20, NULL, &status), TARRY_PLOTTER_DONE);
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"ends", ends},
        {"what it is given", what_it_is_given},
        {"killing", killing},
        {"ends that are thrown away", ends_that_are_thrown_away},
    };
    return run_tests("plotter", tests, sizeof tests / sizeof *tests);
}
