/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "faults.h"

#include "base/memory.h"

#include <errno.h>
#include <fcntl.h>
#include <stdarg.h>
#include <stdatomic.h>
#include <stdio.h>
#include <stdlib.h>
#include <unistd.h>

void *__real_malloc(size_t size);
void *__real_calloc(size_t n, size_t size);
void *__real_realloc(void *memory, size_t size);
char *__real_strdup(const char *text);
char *__real_strndup(const char *text, size_t n);
int __real_open(const char *path, int flags, ...);
ssize_t __real_read(int file, void *bytes, size_t n);
ssize_t __real_write(int file, const void *bytes, size_t n);
int __real_fsync(int file);
int __real_close(int file);
int __real_rename(const char *from, const char *to);
void *__real_tarry_arena_calloc(tarry_arena *arena, size_t n, size_t size);
char *__real_tarry_arena_text(tarry_arena *arena, const char *text, size_t n);
int __real_tarry_arena_grow(tarry_arena *arena, void **array, size_t *capacity, size_t needed,
                            size_t size);

void *__wrap_malloc(size_t size);
void *__wrap_calloc(size_t n, size_t size);
void *__wrap_realloc(void *memory, size_t size);
char *__wrap_strdup(const char *text);
char *__wrap_strndup(const char *text, size_t n);
int __wrap_open(const char *path, int flags, ...);
ssize_t __wrap_read(int file, void *bytes, size_t n);
ssize_t __wrap_write(int file, const void *bytes, size_t n);
int __wrap_fsync(int file);
int __wrap_close(int file);
int __wrap_rename(const char *from, const char *to);
void *__wrap_tarry_arena_calloc(tarry_arena *arena, size_t n, size_t size);
char *__wrap_tarry_arena_text(tarry_arena *arena, const char *text, size_t n);
char *__wrap_tarry_arena_format(tarry_arena *arena, const char *format, ...)
    __attribute__((format(printf, 2, 3)));
int __wrap_tarry_arena_grow(tarry_arena *arena, void **array, size_t *capacity, size_t needed,
                            size_t size);

static atomic_int armed = N_FAULTS;
static atomic_long countdown;
static atomic_int error_number;
static atomic_bool struck;

void faults_arm(fault which, long after, int number) {
    atomic_store(&armed, N_FAULTS);
    atomic_store(&countdown, after);
    atomic_store(&error_number, number);
    atomic_store(&struck, false);
    atomic_store(&armed, (int)which);
}

bool faults_struck(void) {
    return atomic_load(&struck);
}

void faults_clear(void) {
    atomic_store(&armed, N_FAULTS);
}

/* Whether this call is the one to fail; errno is set then. */
static bool strikes(fault which) {
    if (atomic_load(&armed) != (int)which || atomic_fetch_sub(&countdown, 1) != 0)
        return false;
    atomic_store(&struck, true);
    errno = which == FAULT_MEMORY || which == FAULT_ARENA ? ENOMEM : atomic_load(&error_number);
    return true;
}

void *__wrap_malloc(size_t size) {
    return strikes(FAULT_MEMORY) ? NULL : __real_malloc(size);
}

void *__wrap_calloc(size_t n, size_t size) {
    return strikes(FAULT_MEMORY) ? NULL : __real_calloc(n, size);
}

void *__wrap_realloc(void *memory, size_t size) {
    return strikes(FAULT_MEMORY) ? NULL : __real_realloc(memory, size);
}

char *__wrap_strdup(const char *text) {
    return strikes(FAULT_MEMORY) ? NULL : __real_strdup(text);
}

char *__wrap_strndup(const char *text, size_t n) {
    return strikes(FAULT_MEMORY) ? NULL : __real_strndup(text, n);
}

int __wrap_open(const char *path, int flags, ...) {
    unsigned mode = 0;
    if ((flags & O_CREAT) != 0) {
        va_list arguments;
        va_start(arguments, flags);
        mode = va_arg(arguments, unsigned);
        va_end(arguments);
    }
    return strikes(FAULT_OPEN) ? -1 : __real_open(path, flags, mode);
}

ssize_t __wrap_read(int file, void *bytes, size_t n) {
    if (!strikes(FAULT_READ))
        return __real_read(file, bytes, n);
    return errno != 0 ? -1 : __real_read(file, bytes, n < 1 ? n : 1);
}

ssize_t __wrap_write(int file, const void *bytes, size_t n) {
    if (!strikes(FAULT_WRITE))
        return __real_write(file, bytes, n);
    return errno != 0 ? -1 : __real_write(file, bytes, n < 1 ? n : 1);
}

int __wrap_fsync(int file) {
    return strikes(FAULT_FSYNC) ? -1 : __real_fsync(file);
}

/* The file is closed all the same, as systems do. */
int __wrap_close(int file) {
    if (!strikes(FAULT_CLOSE))
        return __real_close(file);
    __real_close(file);
    errno = atomic_load(&error_number);
    return -1;
}

int __wrap_rename(const char *from, const char *to) {
    return strikes(FAULT_RENAME) ? -1 : __real_rename(from, to);
}

void *__wrap_tarry_arena_calloc(tarry_arena *arena, size_t n, size_t size) {
    return strikes(FAULT_ARENA) ? NULL : __real_tarry_arena_calloc(arena, n, size);
}

char *__wrap_tarry_arena_text(tarry_arena *arena, const char *text, size_t n) {
    return strikes(FAULT_ARENA) ? NULL : __real_tarry_arena_text(arena, text, n);
}

/* The text is made here, since arguments of no fixed number cannot be handed on. */
char *__wrap_tarry_arena_format(tarry_arena *arena, const char *format, ...) {
    if (strikes(FAULT_ARENA))
        return NULL;
    va_list arguments, again;
    va_start(arguments, format);
    va_copy(again, arguments);
    const int n = vsnprintf(NULL, 0, format, arguments);
    char *text = n < 0 ? NULL : __real_tarry_arena_calloc(arena, (size_t)n + 1, 1);
    if (text)
        vsnprintf(text, (size_t)n + 1, format, again);
    va_end(again);
    va_end(arguments);
    return text;
}

int __wrap_tarry_arena_grow(tarry_arena *arena, void **array, size_t *capacity, size_t needed,
                            size_t size) {
    return strikes(FAULT_ARENA) ? 1 : __real_tarry_arena_grow(arena, array, capacity, needed, size);
}
