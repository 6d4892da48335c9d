/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_BASE_FILE_H
#define TARRY_BASE_FILE_H

/* All opening, reading, writing and renaming of files. Errors carry the path and the reason. */

#include <stdbool.h>
#include <stdint.h>
#include "base/text.h"
#include "tarry/error.h"

enum { TARRY_SHA256_TEXT = 65 };

/* Read a whole file of at most `limit` bytes behind what `text` holds (TARRY_INPUT when larger or a
 * folder). */
int tarry_file_read(const char *path, size_t limit, tarry_text *text, tarry_error *error);

/* Write n bytes to `path` whole or not at all: into a file beside it, flushed to disk, closed,
 * renamed. On failure nothing new is left; a file that stood under `path` before stays as it was.
 */
int tarry_file_write(const char *path, const char *bytes, size_t n, tarry_error *error);

/* Create a folder; fine when it is there already. */
int tarry_folder_make(const char *path, tarry_error *error);

/* Have the names of its files on the disk before anything that comes after; fine when there is no
 * such folder. */
int tarry_folder_flush(const char *path, tarry_error *error);

/* *empty: the folder does not exist or holds nothing. TARRY_FILE when `path` is something else. */
int tarry_folder_is_empty(const char *path, bool *empty, tarry_error *error);

/* *exists: there is something of this name. */
int tarry_file_exists(const char *path, bool *exists, tarry_error *error);

/* *regular: a file on a disk, that has a size, and no folder, pipe or device. */
int tarry_file_is_regular(const char *path, bool *regular, tarry_error *error);

/* Remove a folder that holds nothing; any other stays as it is, and so does what is no folder. */
void tarry_folder_remove_empty(const char *path);

/* Ask, creating nothing, whether files could be made in this folder: it can be written to, or is
 * missing and its parent can be. TARRY_FILE where not. */
int tarry_folder_writable(const char *path, tarry_error *error);

/* Remove what tarry_file_write left beside `path` where its process was killed: PATH.part0 and on.
 */
void tarry_file_remove_parts(const char *path);

/* Remove a file; fine when there is none. */
int tarry_file_remove(const char *path, tarry_error *error);

/* Lower-case hex SHA-256 of n bytes (FIPS 180-4, by nettle). */
void tarry_sha256(const char *bytes, size_t n, char out[TARRY_SHA256_TEXT]);

#endif
