/* SPDX-License-Identifier: GPL-3.0-or-later */

#define _GNU_SOURCE /* sched_getaffinity */

#include "base/threads.h"

#include "support.h"

#include <sched.h>
#include <stdatomic.h>
#include <stdlib.h>
#include <sys/resource.h>

enum { MOST = 8 };

typedef struct seen {
    atomic_int parts[MOST];
    atomic_int left; /* of what is to be done */
    atomic_int done;
} seen;

static void take_part(void *context, int index) {
    seen *s = context;
    atomic_fetch_add(&s->parts[index], 1);
    while (atomic_fetch_sub(&s->left, 1) > 0)
        atomic_fetch_add(&s->done, 1);
}

START_TEST(every_part_once) {
    for (int n = 1; n <= MOST; n++) {
        seen s = {.left = 1000};
        tarry_threads_run(n, take_part, &s);
        for (int i = 0; i < MOST; i++)
            ck_assert_int_eq(atomic_load(&s.parts[i]), i < n);
        ck_assert_int_eq(atomic_load(&s.done), 1000);
    }
}
END_TEST

/* A thread's stack is megabytes of addresses: without room for one more, all is done by the caller.
 */
START_TEST(without_room_for_threads) {
    struct rlimit limit;
    seen s = {.left = 1000};
    ck_assert_int_eq(getrlimit(RLIMIT_AS, &limit), 0);
    limit.rlim_cur = 1;
    void *spare = malloc(1 << 16); /* the heap grows no more after this */
    free(spare);
    ck_assert_int_eq(setrlimit(RLIMIT_AS, &limit), 0);
    tarry_threads_run(MOST, take_part, &s);
    limit.rlim_cur = limit.rlim_max;
    ck_assert_int_eq(setrlimit(RLIMIT_AS, &limit), 0);
    ck_assert_int_eq(atomic_load(&s.done), 1000);
    ck_assert_int_eq(atomic_load(&s.parts[0]), 1);
    ck_assert_int_eq(atomic_load(&s.parts[MOST - 1]), 0);
}
END_TEST

/* A process bound to one core has one, however many the machine has (sched_setaffinity(2)). */
START_TEST(cores_of_this_process) {
    const int all = tarry_threads_available();
    ck_assert_int_ge(all, 1);
    cpu_set_t ours, one;
    ck_assert_int_eq(sched_getaffinity(0, sizeof ours, &ours), 0);
    ck_assert_int_eq(all, CPU_COUNT(&ours));
    CPU_ZERO(&one);
    for (int i = 0; i < CPU_SETSIZE && !CPU_COUNT(&one); i++)
        if (CPU_ISSET((size_t)i, &ours))
            CPU_SET((size_t)i, &one);
    ck_assert_int_eq(sched_setaffinity(0, sizeof one, &one), 0);
    ck_assert_int_eq(tarry_threads_available(), 1);
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"every part once", every_part_once},
        {"without room for threads", without_room_for_threads},
        {"cores of this process", cores_of_this_process},
    };
    return run_tests("threads", tests, sizeof tests / sizeof *tests);
}
