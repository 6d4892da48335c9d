/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Runs that end before their time: killed where they stand, or asked to stop. Moments are drawn
 * over the time that a whole run takes, half of them of a part of it: a killed run while it writes
 * its files, one that is asked to stop before. */

#include "cli/talk.h"
#include "finished.h"
#include "support.h"
#include "whole_program.h"

#include <errno.h>
#include <jansson.h>
#include <signal.h>
#include <stdbool.h>
#include <stdint.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <sys/wait.h>
#include <time.h>
#include <unistd.h>

enum { MOMENTS = 50, ROOM = 1024 };

static const char model[] =
    "tarry: 1\n"
    "time: min\n"
    "genes:\n"
    "  vela:\n"
    "    promoter: {shut: {to: {open: 0.1}}, open: {to: {shut: 0.4}, initiates: 6}}\n"
    "    transcript: {stages: {nascent: {fixed: 3}}, half_life: 10}\n"
    "signals: {spot: {of: vela.nascent, ramp: {from: 0, to: 1}, noise: 0.3}}\n"
    "run: {until: 200, every: 1, seed: 1}\n";

static void put_model(void) {
    FILE *file = fopen(test_path("model.yaml"), "w");
    ck_assert_ptr_nonnull(file);
    ck_assert_int_ne(fputs(model, file), EOF);
    ck_assert_int_eq(fclose(file), 0);
}

/* splitmix64 (Steele, Lea & Flood 2014, OOPSLA) from seed 1: a number in [0, 1). */
static double draw(void) {
    static uint64_t state = 1;
    uint64_t z = state += UINT64_C(0x9e3779b97f4a7c15);
    z = (z ^ (z >> 30)) * UINT64_C(0xbf58476d1ce4e5b9);
    z = (z ^ (z >> 27)) * UINT64_C(0x94d049bb133111eb);
    return (double)((z ^ (z >> 31)) >> 11) * 0x1p-53;
}

static double now(void) {
    struct timespec t;
    clock_gettime(CLOCK_MONOTONIC, &t);
    return (double)t.tv_sec + 1e-9 * (double)t.tv_nsec;
}

static void wait_for(double seconds) {
    struct timespec t = {(time_t)seconds, (long)(1e9 * (seconds - (double)(time_t)seconds))};
    while (nanosleep(&t, &t) && errno == EINTR)
        ;
}

/* Start `tarry run` on two threads in a process of its own, with one more option and its value. */
static pid_t start(const char *folder, const char *option, const char *value) {
    static char run[] = "run", out[] = "--out", overwrite[] = "--overwrite", keep[] = "--keep=40";
    static char threads[] = "--threads=2";
    char *words[] = {run,           (char *)test_path("model.yaml"),
                     out,           (char *)folder,
                     overwrite,     keep,
                     threads,       (char *)option,
                     (char *)value, NULL};
    const pid_t process = fork();
    ck_assert_int_ge(process, 0);
    if (process == 0) {
        char said[ROOM];
        const int status = program_call(words, said, sizeof said);
        _exit(status);
    }
    return process;
}

static int finish(pid_t process) {
    int status;
    ck_assert_int_eq(waitpid(process, &status, 0), process);
    return status;
}

/* Whether the process has ended; it can be waited for all the same. */
static bool has_ended(pid_t process) {
    siginfo_t about = {0};
    return !waitid(P_PID, (id_t)process, &about, WEXITED | WNOHANG | WNOWAIT) && about.si_pid != 0;
}

/* When unfinished.json was made, or 0 where there is none. */
static double time_of_unfinished(const char *folder) {
    char path[ROOM];
    struct stat about;
    ck_assert_int_lt(snprintf(path, sizeof path, "%s/unfinished.json", folder), ROOM);
    return stat(path, &about) ? 0
                              : (double)about.st_mtim.tv_sec + 1e-9 * (double)about.st_mtim.tv_nsec;
}

/* How long a run takes: up to the first of its files, and whole. The shortest of three. */
typedef struct duration {
    double to_files, whole;
} duration;

static duration measure(const char *cells) {
    duration least = {1e9, 1e9};
    char folder[ROOM];
    for (int i = 0; i < 3; i++) {
        snprintf(folder, sizeof folder, "%s/measured%d", test_folder(), i);
        const double from = now();
        const pid_t process = start(folder, "--cells", cells);
        while (count_files_in(folder) < 1 && !has_ended(process))
            wait_for(1e-4);
        const double to_files = now() - from;
        const int status = finish(process);
        const double whole = now() - from;
        ck_assert_int_eq(status, 0);
        least.to_files = to_files < least.to_files ? to_files : least.to_files;
        least.whole = whole < least.whole ? whole : least.whole;
    }
    return least;
}

/* Kill it at a moment of its whole time, or of the time in which it writes its files. */
static int kill_at_random(const char *folder, const duration *run, int i) {
    const bool writing = i % 2;
    char seed[32];
    snprintf(seed, sizeof seed, "%d", i + 2);
    const double before = time_of_unfinished(folder);
    const pid_t process = start(folder, "--seed", seed);
    while (writing && time_of_unfinished(folder) == before && !has_ended(process))
        wait_for(1e-4);
    wait_for(draw() * (writing ? run->whole - run->to_files : run->whole));
    kill(process, SIGKILL);
    return finish(process);
}

static int n_moments(void) {
    return test_small() ? MOMENTS / 5 : MOMENTS;
}

/* One folder serves all, so that each run finds what the last one left; and each has a seed of its
 * own, so that no file can be taken for that of another run. */
START_TEST(killed) {
    put_model();
    program_listen();
    const duration run = measure("1000");
    char folder[ROOM];
    snprintf(folder, sizeof folder, "%s/out", test_folder());
    int n_killed = 0, n_writing = 0;
    for (int i = 0; i < n_moments(); i++) {
        if (i % 4 == 1) /* over finished results */
            ck_assert_int_eq(finish(start(folder, "--seed", "1")), 0);
        const int status = kill_at_random(folder, &run, i);
        ck_assert_msg(WIFSIGNALED(status) || WEXITSTATUS(status) == 0, "moment %d: status %d", i,
                      WEXITSTATUS(status));
        ck_assert_msg(look_at_folder(folder) != FOLDER_BROKEN, "moment %d", i);
        n_killed += WIFSIGNALED(status);
        n_writing += WIFSIGNALED(status) && time_of_unfinished(folder) > 0;
    }
    ck_assert_int_ge(n_killed, n_moments() / 3);
    ck_assert_int_ge(n_writing, 1);
    ck_assert_int_eq(finish(start(folder, "--seed", "1")), 0);
    ck_assert_int_eq(look_at_folder(folder), FOLDER_FINISHED);
    ck_assert_int_eq(count_files_in(folder), count_files_in(test_path("measured0")));
    ck_assert_int_eq(count_listed(folder), count_listed(test_path("measured0")));
    ck_assert_int_eq(count_files_in(test_path("out/figures")),
                     count_files_in(test_path("measured0/figures")));
}
END_TEST

/* ---- asked to stop --------------------------------------------------------------------------- */

static FILE *open_in(const char *folder, const char *name) {
    char path[ROOM];
    ck_assert_int_lt(snprintf(path, sizeof path, "%s/%s", folder, name), ROOM);
    FILE *file = fopen(path, "r");
    ck_assert_msg(file != NULL, "%s", path);
    return file;
}

static json_t *load(const char *folder) {
    char path[ROOM];
    snprintf(path, sizeof path, "%s/summary.json", folder);
    json_t *summary = json_load_file(path, 0, NULL);
    ck_assert_msg(summary != NULL, "%s", path);
    return summary;
}

/* The next line of a page that does not say whether the run was interrupted; false at the end. */
static bool next_line(FILE *page, char **line, size_t *size) {
    static const char *const marks[] = {"interrupted", "class=\"run\""};
    while (getline(line, size, page) > 0)
        if (!strstr(*line, marks[0]) && !strstr(*line, marks[1]))
            return true;
    return false;
}

static void check_pages(const char *folder, const char *other_folder) {
    FILE *page = open_in(folder, "report.html"), *other = open_in(other_folder, "report.html");
    char *line = NULL, *other_line = NULL;
    size_t size = 0, other_size = 0, n = 0;
    bool more, other_more;
    do {
        more = next_line(page, &line, &size);
        other_more = next_line(other, &other_line, &other_size);
        ck_assert_int_eq(more, other_more);
        ASSERT_FAST(!more || !strcmp(line, other_line), "%s", line);
        n += more;
    } while (more);
    ck_assert_uint_gt(n, 100);
    free(line);
    free(other_line);
    fclose(page);
    fclose(other);
}

/* The page bears the mark, too, and is looked at by itself. */
static void strip_page(json_t *files) {
    for (size_t i = json_array_size(files); i-- > 0;) {
        const char *name = json_string_value(json_object_get(json_array_get(files, i), "name"));
        if (!strcmp(name, "report.html"))
            json_array_remove(files, i);
    }
}

/* Take off what tells a partial run from a whole one of as many cells, having looked at it. */
static void strip(json_t *summary, bool is_partial) {
    const char *status = json_string_value(json_object_get(summary, "status"));
    json_t *warnings = json_object_get(summary, "warnings");
    ck_assert_str_eq(status, is_partial ? "partial" : "complete");
    if (is_partial) {
        const size_t last = json_array_size(warnings) - 1;
        const char *text = json_string_value(json_array_get(warnings, 0));
        size_t i = 0;
        while (i < last && strncmp(text, "interrupted: ", 13) != 0)
            text = json_string_value(json_array_get(warnings, ++i));
        ck_assert_int_eq(strncmp(text, "interrupted: ", 13), 0);
        json_array_remove(warnings, i);
    }
    strip_page(json_object_get(summary, "files"));
    json_object_del(summary, "status");
    json_object_del(summary, "cells_asked");
    json_object_del(summary, "options"); /* --cells */
}

/* Files are compared by what the summaries list of them. */
static void check_partial(const char *folder) {
    char cells[32];
    const char *whole = test_path("whole");
    ck_assert_int_eq(look_at_folder(folder), FOLDER_FINISHED);
    snprintf(cells, sizeof cells, "%lld", number_in_summary(folder, "cells"));
    ck_assert_int_eq(finish(start(whole, "--cells", cells)), 0);
    ck_assert_int_eq(look_at_folder(whole), FOLDER_FINISHED);
    json_t *one = load(folder), *other = load(whole);
    strip(one, true);
    strip(other, false);
    ck_assert_msg(json_equal(one, other), "%s cells: not as a run of so many", cells);
    json_decref(one);
    json_decref(other);
    ck_assert_int_eq(count_files_in(folder), count_files_in(whole));
    check_pages(folder, whole);
}

START_TEST(asked_to_stop) {
    put_model();
    program_listen();
    static const char cells[] = "6000"; /* the greater part of its time goes into them */
    const duration run = measure(cells);
    int n_partial = 0;
    for (int i = 0; i < n_moments(); i++) {
        char folder[ROOM];
        snprintf(folder, sizeof folder, "%s/out%d", test_folder(), i);
        const int number = i % 5 == 3 ? SIGTERM : i % 5 == 4 ? SIGHUP : SIGINT;
        const pid_t process = start(folder, "--cells", cells);
        wait_for(draw() * (i % 2 ? run.whole : run.to_files));
        kill(process, number);
        const int status = finish(process);
        if (WIFSIGNALED(status)) { /* while it read the model */
            ck_assert_int_eq(WTERMSIG(status), number);
            ck_assert_int_eq(count_files_in(folder), -1);
        } else if (WEXITSTATUS(status) == TARRY_EXIT_INTERRUPTED && count_files_in(folder) > 0) {
            check_partial(folder);
            n_partial++;
        } else if (WEXITSTATUS(status) == 0) { /* all cells were finished */
            ck_assert_int_eq(look_at_folder(folder), FOLDER_FINISHED);
        } else { /* none was */
            ck_assert_int_eq(WEXITSTATUS(status), TARRY_EXIT_INTERRUPTED);
            ck_assert_int_eq(count_files_in(folder), -1);
        }
    }
    ck_assert_int_ge(n_partial, n_moments() / 10);
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"killed", killed},
        {"asked to stop", asked_to_stop},
    };
    return run_tests("killed", tests, sizeof tests / sizeof *tests);
}
