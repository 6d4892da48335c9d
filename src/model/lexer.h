/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_MODEL_LEXER_H
#define TARRY_MODEL_LEXER_H

/* The words of an expression. */

#include <stddef.h>

typedef enum tarry_token_kind {
    TARRY_TOKEN_END,
    TARRY_TOKEN_NUMBER, /* without a sign */
    TARRY_TOKEN_NAME,   /* letters, digits, _ and dots inside; characters beyond ASCII go along */
    TARRY_TOKEN_SIGN,   /* one of + - * / ^ ( ) , */
    TARRY_TOKEN_OTHER,  /* one character that has no meaning */
} tarry_token_kind;

typedef struct tarry_token {
    tarry_token_kind kind;
    char sign;
    size_t at, n; /* bytes of the text */
} tarry_token;

/* The token at or after byte `at` of text[0..n). */
tarry_token tarry_token_read(const char *text, size_t n, size_t at);

#endif
