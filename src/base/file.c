/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Files. Each call that can fail is looked at, the one that closes too, since a full disk or a
 * network folder may report what went wrong only then. */
#include "base/file.h"

#include "base/error.h"
#include "base/memory.h"

#include <dirent.h>
#include <errno.h>
#include <fcntl.h>
#include <nettle/sha2.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/stat.h>
#include <unistd.h>

enum { CHUNK = 1 << 16, MOST_NAMES = 100, PART_ROOM = 16 };

static int fail_errno(tarry_error *error, const char *path, const char *what, int number) {
    char reason[256];
    if (strerror_r(number, reason, sizeof reason) != 0)
        snprintf(reason, sizeof reason, "error %d", number);
    /* opendir allocates */
    return tarry_fail_at(error, number == ENOMEM ? TARRY_MEMORY : TARRY_FILE,
                         (tarry_place){path, 0, 0}, "cannot %s: %s", what, reason);
}

static int read_all(int file, const char *path, size_t limit, tarry_text *text,
                    tarry_error *error) {
    char *chunk = tarry_calloc(CHUNK, 1);
    if (chunk == NULL)
        return tarry_fail_memory(error, path);
    const size_t before = text->size;
    int status = 0;
    for (;;) {
        const ssize_t n = read(file, chunk, CHUNK);
        if (n < 0 && errno == EINTR)
            continue;
        if (n < 0)
            status = fail_errno(error, path, "read this file", errno);
        else if (n > 0 && (size_t)n > limit - (text->size - before))
            status = tarry_fail_at(error, TARRY_INPUT, (tarry_place){path, 0, 0},
                                   "this file is too large: at most %zu bytes are read", limit);
        if (n <= 0 || status != 0)
            break;
        tarry_text_add(text, chunk, (size_t)n);
        if (text->failed) {
            status = tarry_fail_memory(error, path);
            break;
        }
    }
    free(chunk);
    return status;
}

int tarry_file_read(const char *path, size_t limit, tarry_text *text, tarry_error *error) {
    const int file = open(path, O_RDONLY | O_CLOEXEC);
    if (file < 0)
        return fail_errno(error, path, "open this file", errno);
    struct stat about;
    int status = 0;
    if (fstat(file, &about) != 0)
        status = fail_errno(error, path, "read this file", errno);
    else if (S_ISDIR(about.st_mode))
        status = tarry_fail_at(error, TARRY_INPUT, (tarry_place){path, 0, 0},
                               "this is a folder, and a file was expected");
    else {
        tarry_text_add(text, "", 0); /* so that the text of an empty file is "" */
        status = text->failed ? tarry_fail_memory(error, path)
                              : read_all(file, path, limit, text, error);
    }
    close(file); /* nothing was written, so nothing can be lost here */
    return status;
}

int tarry_file_is_regular(const char *path, bool *regular, tarry_error *error) {
    struct stat about;
    if (stat(path, &about) != 0)
        return fail_errno(error, path, "open this file", errno);
    *regular = S_ISREG(about.st_mode);
    return 0;
}

/* The name of the i-th unfinished version of `path`, into room for PART_ROOM bytes more than it
 * has. */
static void name_part(char *name, const char *path, int i) {
    snprintf(name, strlen(path) + PART_ROOM, "%s.part%d", path, i);
}

/* Create a file beside `path`, whose name goes into `name`, to be freed. Returns it open, or -1. */
static int create_beside(const char *path, char **name, tarry_error *error) {
    *name = tarry_calloc(strlen(path) + PART_ROOM, 1);
    if (*name == NULL) {
        tarry_fail_memory(error, path);
        return -1;
    }
    for (int i = 0; i < MOST_NAMES; i++) {
        name_part(*name, path, i);
        const int file = open(*name, O_WRONLY | O_CREAT | O_EXCL | O_CLOEXEC, 0666);
        if (file >= 0)
            return file;
        if (errno != EEXIST) {
            fail_errno(error, path, "create this file", errno);
            return -1;
        }
    }
    tarry_fail_at(error, TARRY_FILE, (tarry_place){path, 0, 0},
                  "cannot create this file: its unfinished versions .part0 to .part%d are all "
                  "there; remove them",
                  MOST_NAMES - 1);
    return -1;
}

static int write_all(int file, const char *path, const char *bytes, size_t n, tarry_error *error) {
    while (n > 0) {
        const ssize_t written = write(file, bytes, n);
        if (written < 0 && errno == EINTR)
            continue;
        if (written < 0)
            return fail_errno(error, path, "write this file", errno);
        bytes += written;
        n -= (size_t)written;
    }
    /* Pipes and devices have nothing to flush. */
    if (fsync(file) != 0 && errno != EINVAL)
        return fail_errno(error, path, "write this file", errno);
    return 0;
}

int tarry_file_write(const char *path, const char *bytes, size_t n, tarry_error *error) {
    char *name = NULL;
    const int file = create_beside(path, &name, error);
    if (file < 0) {
        free(name);
        return error != NULL ? (int)error->code : TARRY_FILE;
    }
    int status = write_all(file, path, bytes, n, error);
    if (close(file) != 0 && status == 0)
        status = fail_errno(error, path, "write this file", errno);
    if (status == 0 && rename(name, path) != 0)
        status = fail_errno(error, path, "put this file in its place", errno);
    if (status != 0)
        unlink(name); /* as well as can be: the first fault is what is told */
    free(name);
    return status;
}

void tarry_file_remove_parts(const char *path) {
    char *name = tarry_calloc(strlen(path) + PART_ROOM, 1);
    for (int i = 0; name != NULL && i < MOST_NAMES; i++) {
        name_part(name, path, i);
        if (unlink(name) != 0)
            break;
    }
    free(name);
}

void tarry_folder_remove_empty(const char *path) {
    /* It failing is no fault: there is something in it, or there is none. */
    if (rmdir(path) != 0)
        errno = 0;
}

int tarry_folder_make(const char *path, tarry_error *error) {
    if (mkdir(path, 0777) == 0)
        return 0;
    const int number = errno;
    struct stat about;
    if (number == EEXIST && stat(path, &about) == 0) {
        if (S_ISDIR(about.st_mode))
            return 0;
        return tarry_fail_at(error, TARRY_FILE, (tarry_place){path, 0, 0},
                             "cannot create this folder: a file of that name is there");
    }
    return fail_errno(error, path, "create this folder", number);
}

int tarry_folder_flush(const char *path, tarry_error *error) {
    const int folder = open(path, O_RDONLY | O_DIRECTORY | O_CLOEXEC);
    if (folder < 0)
        return errno == ENOENT ? 0 : fail_errno(error, path, "open this folder", errno);
    int status = 0;
    if (fsync(folder) != 0 && errno != EINVAL)
        status = fail_errno(error, path, "write into this folder", errno);
    if (close(folder) != 0 && status == 0)
        status = fail_errno(error, path, "write into this folder", errno);
    return status;
}

int tarry_folder_is_empty(const char *path, bool *empty, tarry_error *error) {
    DIR *folder = opendir(path);
    if (folder == NULL && errno == ENOENT) {
        *empty = true;
        return 0;
    }
    if (folder == NULL && errno == ENOTDIR)
        return tarry_fail_at(error, TARRY_FILE, (tarry_place){path, 0, 0},
                             "this is a file, and a folder was expected");
    if (folder == NULL)
        return fail_errno(error, path, "look into this folder", errno);

    bool found = false;
    int number = 0;
    while (!found) {
        errno = 0;
        const struct dirent *entry = readdir(folder);
        if (entry == NULL) {
            number = errno;
            break;
        }
        found = strcmp(entry->d_name, ".") != 0 && strcmp(entry->d_name, "..") != 0;
    }
    closedir(folder);
    if (number != 0)
        return fail_errno(error, path, "look into this folder", number);
    *empty = !found;
    return 0;
}

int tarry_file_exists(const char *path, bool *exists, tarry_error *error) {
    struct stat about;
    *exists = lstat(path, &about) == 0;
    if (!*exists && errno != ENOENT)
        return fail_errno(error, path, "look for this file", errno);
    return 0;
}

/* "a/b/c/" -> "a/b"; "c" -> ".". To be freed; NULL when memory is short. */
static char *parent_of(const char *path) {
    size_t n = strlen(path);
    while (n > 1 && path[n - 1] == '/')
        n--;
    while (n > 0 && path[n - 1] != '/')
        n--;
    while (n > 1 && path[n - 1] == '/')
        n--;
    return n == 0 ? strdup(".") : strndup(path, n);
}

int tarry_folder_writable(const char *path, tarry_error *error) {
    if (access(path, W_OK | X_OK) == 0)
        return 0;
    if (errno != ENOENT)
        return fail_errno(error, path, "write into this folder", errno);
    char *parent = parent_of(path);
    if (parent == NULL)
        return tarry_fail_memory(error, path);
    int status = 0;
    if (access(parent, W_OK | X_OK) != 0)
        status = fail_errno(error, path, "create this folder", errno);
    free(parent);
    return status;
}

int tarry_file_remove(const char *path, tarry_error *error) {
    if (unlink(path) != 0 && errno != ENOENT)
        return fail_errno(error, path, "remove this file", errno);
    return 0;
}

void tarry_sha256(const char *bytes, size_t n, char out[TARRY_SHA256_TEXT]) {
    static const char hex[] = "0123456789abcdef";
    struct sha256_ctx context;
    uint8_t digest[SHA256_DIGEST_SIZE];
    sha256_init(&context);
    sha256_update(&context, n, (const uint8_t *)bytes);
    sha256_digest(&context, sizeof digest, digest);
    for (size_t i = 0; i < sizeof digest; i++) {
        out[2 * i] = hex[digest[i] >> 4];
        out[2 * i + 1] = hex[digest[i] & 15];
    }
    out[2 * sizeof digest] = '\0';
}
