/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_TESTS_OWN_MEMORY_H
#define TARRY_TESTS_OWN_MEMORY_H

/* An allocator whose calls fail on demand, to be included by the one file of a test program.
 *
 * malloc and its kin below stand in for the C library's in the whole process, shared libraries and
 * the C library itself included. Blocks come from a pool and are full of 0xa5; what is freed is
 * filled with 0xdd, so that what is read before it is written, or after it is freed, goes wrong at
 * once. Blocks that are out are counted, and freeing what is not out ends the process.
 *
 * Sanitizers bring an allocator of their own. There the calls of our own code fail (faults.h), and
 * leaks are the sanitizer's to find. */

#include "faults.h"

#include <errno.h>
#include <stdbool.h>
#include <stddef.h>
#include <stdint.h>
#include <stdlib.h>
#include <string.h>
#include <sys/mman.h>
#include <unistd.h>

#ifndef MAP_ANONYMOUS
#error "define _GNU_SOURCE before including anything"
#endif

#if defined __SANITIZE_ADDRESS__
#define OWN_MEMORY 0
#elif defined __has_feature
#if __has_feature(address_sanitizer)
#define OWN_MEMORY 0
#endif
#endif
#ifndef OWN_MEMORY
#define OWN_MEMORY 1
#endif

#if OWN_MEMORY

enum { N_SIZES = 40, SMALLEST = 6, POOL = 1 << 20, FRESH = 0xa5, STALE = 0xdd };

/* What stands before each block. */
typedef struct block {
    uint64_t state;
    size_t size;        /* as asked for */
    struct block *base; /* this, but where the block was asked for with an alignment */
    struct block *next; /* in the list of those of its size that are free */
    size_t which;       /* room for 2^which bytes, this head included */
    size_t filler;
} block;

static const uint64_t is_out = UINT64_C(0x6f7574206f757420), is_in = UINT64_C(0x696e20696e20696e);

static block *free_blocks[N_SIZES];
static char *pool;
static size_t pool_left;
static long n_out;
static volatile char locked;

static long countdown = -1; /* allocations before the one that fails; below 0: none fails */
static bool for_good;       /* all after it fail, too */
static long n_failed;

static void lock(void) {
    while (__atomic_test_and_set(&locked, __ATOMIC_ACQUIRE))
        ;
}

static void unlock(void) {
    __atomic_clear(&locked, __ATOMIC_RELEASE);
}

static _Noreturn void give_up(const char *why) {
    const ssize_t ignored = write(STDERR_FILENO, why, strlen(why));
    (void)ignored;
    abort();
}

static block *take_from_pool(size_t which) {
    const size_t size = (size_t)1 << which;
    if (pool_left < size) {
        const size_t mapped = size > POOL ? size : POOL;
        void *more = mmap(NULL, mapped, PROT_READ | PROT_WRITE, MAP_PRIVATE | MAP_ANONYMOUS, -1, 0);
        if (more == MAP_FAILED)
            return NULL;
        if (size > POOL / 2)
            return more;
        pool = more;
        pool_left = mapped;
    }
    block *found = (block *)(void *)pool;
    pool += size;
    pool_left -= size;
    return found;
}

static block *take(size_t size) {
    size_t which = SMALLEST;
    while (which < N_SIZES && ((size_t)1 << which) < size + sizeof(block))
        which++;
    if (which == N_SIZES)
        return NULL;
    lock();
    block *found = free_blocks[which];
    if (found)
        free_blocks[which] = found->next;
    else
        found = take_from_pool(which);
    n_out += found != NULL;
    unlock();
    if (found)
        *found = (block){.state = is_out, .size = size, .base = found, .which = which};
    return found;
}

static bool strikes(void) {
    lock();
    const bool strike = countdown == 0;
    if (countdown > 0)
        countdown--;
    else if (strike && !for_good)
        countdown = -1;
    n_failed += strike;
    unlock();
    return strike;
}

static void *hand_out(size_t size) {
    block *found = strikes() ? NULL : take(size);
    if (!found) {
        errno = ENOMEM;
        return NULL;
    }
    memset(found + 1, FRESH, size);
    return found + 1;
}

static block *head_of(void *memory) {
    block *head = (block *)memory - 1;
    if (head->state != is_out)
        give_up("something was freed that is not there to be freed\n");
    return head;
}

static void take_back(void *memory) {
    block *head = head_of(memory), *base = head->base;
    memset(memory, STALE, head->size);
    head->state = base->state = is_in;
    lock();
    base->next = free_blocks[base->which];
    free_blocks[base->which] = base;
    n_out--;
    unlock();
}

/* None of these calls another by its name: compilers know the names, and make calls of their own of
 * what they find between them. */

void *malloc(size_t size) {
    return hand_out(size);
}

void free(void *memory) {
    if (memory)
        take_back(memory);
}

void *calloc(size_t n, size_t size) {
    void *memory = size && n > SIZE_MAX / size ? NULL : hand_out(n * size);
    return memory ? memset(memory, 0, n * size) : NULL;
}

void *realloc(void *memory, size_t size) {
    void *moved = hand_out(size);
    if (moved && memory) {
        const size_t before = head_of(memory)->size;
        memcpy(moved, memory, before < size ? before : size);
        take_back(memory);
    }
    return moved;
}

static void *hand_out_aligned(size_t alignment, size_t size) {
    if (size > SIZE_MAX / 2 || alignment > SIZE_MAX / 4)
        return NULL;
    if (alignment <= sizeof(max_align_t))
        return hand_out(size);
    char *memory = hand_out(size + alignment + sizeof(block));
    if (!memory)
        return NULL;
    const uintptr_t first = (uintptr_t)memory + sizeof(block);
    block *head = (block *)(void *)(memory + (alignment - first % alignment) % alignment);
    *head = (block){.state = is_out, .size = size, .base = (block *)(void *)memory - 1};
    return head + 1;
}

void *memalign(size_t alignment, size_t size);
void *memalign(size_t alignment, size_t size) {
    return hand_out_aligned(alignment, size);
}

void *aligned_alloc(size_t alignment, size_t size) {
    return hand_out_aligned(alignment, size);
}

int posix_memalign(void **memory, size_t alignment, size_t size) {
    void *found = hand_out_aligned(alignment, size);
    if (found)
        *memory = found;
    return found ? 0 : ENOMEM;
}

/* Flushing to a real disk would take longer than all the rest; other tests look at it. */
int fsync(int file) {
    (void)file;
    return 0;
}

static void own_memory_arm(long after, bool lasting) {
    n_failed = 0;
    for_good = lasting;
    countdown = after;
}

static bool own_memory_disarm(void) {
    countdown = -1;
    return n_failed > 0;
}

static long own_memory_out(void) {
    return n_out;
}

#else

static void own_memory_arm(long after, bool lasting) {
    (void)lasting;
    faults_arm(FAULT_MEMORY, after, 0);
}

static bool own_memory_disarm(void) {
    const bool struck = faults_struck();
    faults_clear();
    return struck;
}

static long own_memory_out(void) {
    return 0;
}

#endif

#endif
