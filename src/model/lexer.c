/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "model/lexer.h"

#include "base/number.h"

#include <stdbool.h>
#include <string.h>

static bool is_letter(char c) {
    return (c >= 'a' && c <= 'z') || (c >= 'A' && c <= 'Z') || c == '_' || (unsigned char)c >= 0x80;
}

static bool is_digit(char c) {
    return c >= '0' && c <= '9';
}

static size_t name_length(const char *text, size_t n) {
    size_t i = 0;
    while (i < n && (is_letter(text[i]) || is_digit(text[i]) ||
                     (text[i] == '.' && i + 1 < n && is_letter(text[i + 1]))))
        i++;
    return i;
}

tarry_token tarry_token_read(const char *text, size_t n, size_t at) {
    while (at < n && strchr(" \t\r\n", text[at]) != NULL)
        at++;
    tarry_token token = {TARRY_TOKEN_END, 0, at, 0};
    if (at == n)
        return token;
    char c = text[at];
    if (is_letter(c)) {
        token.kind = TARRY_TOKEN_NAME;
        token.n = name_length(text + at, n - at);
    } else if (is_digit(c) || (c == '.' && at + 1 < n && is_digit(text[at + 1]))) {
        token.kind = TARRY_TOKEN_NUMBER;
        token.n = tarry_number_prefix(text + at, n - at);
    } else {
        token.kind = strchr("+-*/^(),", c) != NULL ? TARRY_TOKEN_SIGN : TARRY_TOKEN_OTHER;
        token.sign = c;
        token.n = 1;
    }
    return token;
}
