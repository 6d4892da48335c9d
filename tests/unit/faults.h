/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_TESTS_FAULTS_H
#define TARRY_TESTS_FAULTS_H

/* Faults on demand. Test programs are linked so that the calls below, made by the library or by the
 * test, come here first (ld's --wrap; those made inside shared libraries do not). A test fails each
 * of them in turn and looks at what the caller makes of it:
 *
 *     for (long n = 0;; n++) {
 *         faults_arm(FAULT_MEMORY, n, 0);
 *         const int status = the_call(...);
 *         const bool struck = faults_struck();
 *         faults_clear();                 // before ck_assert, which allocates too
 *         if (!struck)
 *             break;                      // n calls were made in all, and each has failed once
 *         ck_assert_int_eq(status, TARRY_MEMORY);
 *     }
 *
 * One fault at a time is armed, for all threads together. */

#include <stdbool.h>

typedef enum fault {
    FAULT_MEMORY, /* malloc, calloc, realloc, strdup, strndup */
    FAULT_ARENA,  /* tarry_arena_calloc, _text, _format, _grow: a block seldom ends just there */
    FAULT_OPEN,
    FAULT_READ,
    FAULT_WRITE,
    FAULT_FSYNC,
    FAULT_CLOSE,
    FAULT_RENAME,
    N_FAULTS
} fault;

/* Call number `after` from now on (the next is 0) fails with `number` in errno. FAULT_READ and
 * FAULT_WRITE with number 0 do not fail but move a single byte. FAULT_MEMORY and
 * FAULT_ARENA always say ENOMEM. */
void faults_arm(fault which, long after, int number);

/* Whether the fault has come to pass since it was armed. */
bool faults_struck(void);

/* Disarm. */
void faults_clear(void);

#endif
