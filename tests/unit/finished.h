/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_TESTS_FINISHED_H
#define TARRY_TESTS_FINISHED_H

/* Looking at a run's folder as somebody does who has to trust it. */

#include <stddef.h>

typedef enum folder_state {
    FOLDER_UNFINISHED, /* there is no summary.json */
    FOLDER_FINISHED,   /* there is one, and size and SHA-256 of all that it lists are right */
    FOLDER_BROKEN,     /* there is one, and they are not */
} folder_state;

folder_state look_at_folder(const char *folder);

/* Files in the folder, or -1 where there is none. */
int count_files_in(const char *folder);

/* Files that summary.json lists, or -1. */
int count_listed(const char *folder);

/* A number of the top level of summary.json, or -1. */
long long number_in_summary(const char *folder, const char *key);

#endif
