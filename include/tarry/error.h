/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_ERROR_H
#define TARRY_ERROR_H

/* Errors: one struct on the caller's stack, the last argument of every function that can fail.
 *
 * Such a function returns 0, or the code that it has put into the error. The struct is filled once,
 * where the fault is known, and is untouched on success. Any `tarry_error *` may be NULL. */

/* X(name, exit status of the program, text) */
#define TARRY_CODES(X)                                                                             \
    X(OK, 0, "no error")                                                                           \
    X(MEMORY, 1, "out of memory")                                                                  \
    X(FILE, 1, "a file could not be read or written")                                              \
    X(INPUT, 2, "a model, data file or setting is wrong")                                          \
    X(NOT_YET, 2, "asked for something that this version cannot do yet")                           \
    X(RUN, 1, "the simulation met a state it must not go on from")                                 \
    X(LIMIT, 1, "a limit of the run was passed")                                                   \
    X(NUMERIC, 1, "a numerical method failed")                                                     \
    X(INTERRUPTED, 3, "interrupted")

typedef enum tarry_code {
#define TARRY_CODE_ENUM(name, status, text) TARRY_##name,
    TARRY_CODES(TARRY_CODE_ENUM)
#undef TARRY_CODE_ENUM
} tarry_code;

/* A place in a text: lines and columns count from 1, columns in characters; line 0: no place. */
typedef struct tarry_place {
    const char *file; /* borrowed; may be NULL */
    int line;
    int column;
} tarry_place;

typedef struct tarry_error {
    tarry_code code;
    int line;           /* 0: no place */
    int column;         /* 0: no place */
    char file[512];     /* "" where the fault is in no file; cut at the front where too long */
    char message[1024]; /* complete enough to print: what is wrong and what would be right */
} tarry_error;

/* Short text for a code; never NULL. */
const char *tarry_code_text(tarry_code code);

/* Exit status a program should end with after this code. */
int tarry_code_status(tarry_code code);

/* Write "file:line:column: message" (or what there is of it) into `out`; returns `out`. */
const char *tarry_error_text(const tarry_error *error, char *out, int size);

#endif
