/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Numbers as text.
 *
 * Reading. A decimal of at most 2^53 with at most 22 powers of ten is one exact product or quotient
 * (Clinger 1990, PLDI 92). All else is given to strtod as digits and exponent without a point,
 * which every locale reads alike.
 *
 * Writing. The decimals that read back to x are those between its midpoints with the neighbours.
 * For 1e-11 <= x < 1e16 those midpoints, counted in units of 10^-k that give x 17 or 18 digits
 * before the point, are exact in 128 bits, since m 5^k has at most 118 of them; then the fewest
 * digits are those of the roundest whole number between the two (Steele & White 1990, PLDI 112; 17
 * digits always do). Beyond, printf and strtod are asked with one digit more each time. */
#include "base/number.h"

#include <float.h>
#include <math.h>
#include <stdbool.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

/* More digits than this cannot tell which double is nearest, but for whether any follows that is
 * not 0: the longest midpoint between two doubles has 767. */
enum { ENOUGH_DIGITS = 770, LONGEST_EXPONENT = 24, MOST_DIGITS = 17, MOST_FIVES = 27 };

__extension__ typedef unsigned __int128 wide;

static const double powers_of_ten[23] = {
    1e0,  1e1,  1e2,  1e3,  1e4,  1e5,  1e6,  1e7,  1e8,  1e9,  1e10, 1e11,
    1e12, 1e13, 1e14, 1e15, 1e16, 1e17, 1e18, 1e19, 1e20, 1e21, 1e22,
};

/* Two digits of each number below 100, to halve the divisions. */
static const char pairs[] = "00010203040506070809101112131415161718192021222324"
                            "25262728293031323334353637383940414243444546474849"
                            "50515253545556575859606162636465666768697071727374"
                            "75767778798081828384858687888990919293949596979899";

static bool is_digit(char c) {
    return c >= '0' && c <= '9';
}

static size_t count_digits(const char *text, size_t at, size_t n) {
    const size_t start = at;
    while (at < n && is_digit(text[at]))
        at++;
    return at - start;
}

size_t tarry_number_prefix(const char *text, size_t n) {
    size_t at = n > 0 && (text[0] == '+' || text[0] == '-') ? 1 : 0;
    const size_t whole = count_digits(text, at, n);
    at += whole;
    size_t fraction = 0;
    if (at < n && text[at] == '.') {
        fraction = count_digits(text, at + 1, n);
        if (whole + fraction > 0)
            at += 1 + fraction;
    }
    if (whole + fraction == 0)
        return 0;
    if (at < n && (text[at] == 'e' || text[at] == 'E')) {
        size_t exponent = at + 1;
        if (exponent < n && (text[exponent] == '+' || text[exponent] == '-'))
            exponent++;
        const size_t digits = count_digits(text, exponent, n);
        if (digits > 0)
            at = exponent + digits;
    }
    return at;
}

/* A decimal taken apart: 0.d1 d2 d3 ... times 10^exponent, without leading zeros. */
typedef struct decimal {
    char
        digits[ENOUGH_DIGITS + LONGEST_EXPONENT + 2]; /* room for "e" and an exponent behind them */
    int n;
    int64_t exponent;
    bool negative;
} decimal;

static void add_digit(decimal *d, char c) {
    if (d->n == 0 && c == '0')
        return;
    if (d->n < ENOUGH_DIGITS)
        d->digits[d->n++] = c;
    else if (c != '0')
        d->digits[ENOUGH_DIGITS] = '1';
}

/* The exponent after the 'e', held within +-10^9, beyond which all is 0 or infinite anyway. */
static int64_t read_exponent(const char *text, size_t n) {
    const bool negative = n > 0 && text[0] == '-';
    int64_t exponent = 0;
    for (size_t at = n > 0 && !is_digit(text[0]); at < n; at++) {
        exponent = 10 * exponent + (text[at] - '0');
        if (exponent > 1000000000)
            exponent = 1000000000;
    }
    return negative ? -exponent : exponent;
}

/* Take apart text that is known to be a number. */
static void take_apart(const char *text, size_t n, decimal *d) {
    d->n = 0;
    d->exponent = 0;
    d->negative = text[0] == '-';
    d->digits[ENOUGH_DIGITS] = '0';
    bool point = false;
    for (size_t at = 0; at < n; at++) {
        const char c = text[at];
        if (c == '.')
            point = true;
        else if (c == 'e' || c == 'E') {
            d->exponent += read_exponent(text + at + 1, n - at - 1);
            break;
        } else if (is_digit(c)) {
            add_digit(d, c);
            if (d->n > 0 && !point)
                d->exponent++;
            else if (d->n == 0 && point)
                d->exponent--;
        }
    }
}

/* The value where one operation on exact numbers gives it; false where not. */
static bool read_exactly(const decimal *d, double *out) {
#if FLT_EVAL_METHOD == 0
    if (d->n > 18)
        return false;
    uint64_t whole = 0;
    for (int i = 0; i < d->n; i++)
        whole = 10 * whole + (uint64_t)(d->digits[i] - '0');
    const int64_t exponent = d->exponent - d->n;
    if (whole > UINT64_C(1) << 53 || exponent < -22 || exponent > 22)
        return false;
    *out = exponent < 0 ? (double)whole / powers_of_ten[-exponent]
                        : (double)whole * powers_of_ten[exponent];
    return true;
#else
    (void)d;
    (void)out;
    return false;
#endif
}

tarry_number_status tarry_number_read(const char *text, size_t n, double *out) {
    if (n == 0 || tarry_number_prefix(text, n) != n)
        return TARRY_NUMBER_BAD;
    decimal d;
    take_apart(text, n, &d);
    double value = 0;
    if (d.n > 0 && !read_exactly(&d, &value)) {
        if (d.n == ENOUGH_DIGITS)
            d.n++;
        snprintf(d.digits + d.n, LONGEST_EXPONENT, "e%lld", (long long)(d.exponent - d.n));
        value = strtod(d.digits, NULL);
    }
    if (isinf(value))
        return TARRY_NUMBER_RANGE;
    *out = d.negative ? -value : value;
    return TARRY_NUMBER_OK;
}

tarry_number_status tarry_integer_read(const char *text, size_t n, int64_t *out) {
    const bool negative = n > 0 && text[0] == '-';
    size_t at = n > 0 && (text[0] == '-' || text[0] == '+') ? 1 : 0;
    if (at == n || count_digits(text, at, n) != n - at)
        return TARRY_NUMBER_BAD;
    const uint64_t largest = negative ? UINT64_C(1) << 63 : (UINT64_C(1) << 63) - 1;
    uint64_t value = 0;
    for (; at < n; at++) {
        const uint64_t digit = (uint64_t)(text[at] - '0');
        if (value > (largest - digit) / 10)
            return TARRY_NUMBER_RANGE;
        value = 10 * value + digit;
    }
    /* -2^63 has no positive twin, so it is reached from -1 below. */
    *out = !negative ? (int64_t)value : value == 0 ? 0 : -(int64_t)(value - 1) - 1;
    return TARRY_NUMBER_OK;
}

/* Digits of `value` in decimal; returns how many. */
static int write_digits(uint64_t value, char out[20]) {
    char buffer[20];
    int at = 20;
    while (value >= 100) {
        at -= 2;
        memcpy(buffer + at, pairs + 2 * (value % 100), 2);
        value /= 100;
    }
    if (value >= 10) {
        at -= 2;
        memcpy(buffer + at, pairs + 2 * value, 2);
    } else {
        buffer[--at] = (char)('0' + value);
    }
    memcpy(out, buffer + at, (size_t)(20 - at));
    return 20 - at;
}

/* A whole number and a power of ten: what is written. */
typedef struct shortest {
    uint64_t digits;
    int exponent;
} shortest;

static uint64_t power_of(uint64_t base, int n) {
    uint64_t power = 1;
    while (n-- > 0)
        power *= base;
    return power;
}

/* The roundest whole number in [low, high], of those the nearest to value / 2^shift. */
static shortest roundest(uint64_t low, uint64_t high, wide value, int shift) {
    uint64_t unit = 1;
    int zeros = 0;
    while (high / (10 * unit) * (10 * unit) >= low) {
        unit *= 10;
        zeros++;
    }
    uint64_t n = (uint64_t)(value >> shift) / unit;
    const wide size = (wide)unit << shift;
    const wide rest = value - n * size;
    if (2 * rest > size || (2 * rest == size && n % 2 == 1))
        n++;
    if (n * unit > high)
        n--;
    if (n * unit < low)
        n++;
    return (shortest){n, zeros};
}

/* x in [1e-11, 1e16), exactly, as told at the top. */
static shortest shorten_exactly(double x) {
    uint64_t bits;
    memcpy(&bits, &x, sizeof bits);
    const uint64_t fraction = bits & ((UINT64_C(1) << 52) - 1);
    const uint64_t m = fraction | UINT64_C(1) << 52; /* x = m 2^binary; never subnormal here */
    const int binary = (int)(bits >> 52) - 1075;

    int k = 16 - (int)floor((binary + 52) * 0.30102999566398120);
    if (k > MOST_FIVES)
        k = MOST_FIVES;
    const uint64_t fives = power_of(5, k);
    const int shift = -(binary - 2 + k); /* 0 to 64 */

    /* Four times m, so that midpoints are whole; below a power of two the gap is half as wide. */
    const wide value = (wide)(4 * m) * fives;
    const wide above = (wide)(4 * m + 2) * fives;
    const wide below = (wide)(4 * m - (fraction == 0 ? 1 : 2)) * fives;
    /* The ends read as the even neighbour, but none is ever the roundest: where one is whole in
     * these units shift is at most 1, and x is whole and rounder. So both may be left out. */
    const uint64_t high = (uint64_t)((above - 1) >> shift);
    const uint64_t low = (uint64_t)(below >> shift) + 1;
    shortest result = roundest(low, high, value, shift);
    result.exponent -= k;
    return result;
}

static double read_back(shortest s) {
    char text[48];
    snprintf(text, sizeof text, "%llue%d", (unsigned long long)s.digits, s.exponent);
    return strtod(text, NULL);
}

/* x > 0 to n significant digits. */
static shortest round_digits(double x, int n) {
    shortest s = {0, 0};
    char text[64];
    snprintf(text, sizeof text, "%.*e", n - 1, x);
    const char *at = text;
    for (; *at != 'e'; at++) /* whatever the locale puts for the point is skipped */
        if (is_digit(*at))
            s.digits = 10 * s.digits + (uint64_t)(*at - '0');
    s.exponent = (int)strtol(at + 1, NULL, 10) - (n - 1);
    return s;
}

/* Any x > 0, by trial. The next number up is tried too, because above a power of two numbers lie
 * twice as far apart as below it, so that the nearest decimal may be out and the next one in. */
static shortest shorten_by_trial(double x) {
    shortest s = {0, 0};
    for (int n = 1; n <= MOST_DIGITS; n++) {
        s = round_digits(x, n);
        if (read_back(s) == x)
            return s;
        s.digits++;
        if (read_back(s) == x)
            return s;
        s.digits--;
    }
    return s;
}

static char *put(char *at, const char *text, int n) {
    memcpy(at, text, (size_t)n);
    return at + n;
}

static char *put_zeros(char *at, int n) {
    memset(at, '0', (size_t)n);
    return at + n;
}

/* Digits, point and exponent: plain from 0.00001 up to 17 digits before the point. */
static char *lay_out(char *at, shortest s) {
    char digits[20];
    int n = write_digits(s.digits, digits);
    const int point = n + s.exponent; /* 0.digits times 10^point */
    while (n > 1 && digits[n - 1] == '0')
        n--;
    if (point > 17 || point < -4) {
        at = put(at, digits, 1);
        if (n > 1) {
            *at++ = '.';
            at = put(at, digits + 1, n - 1);
        }
        *at++ = 'e';
        if (point < 1)
            *at++ = '-';
        char exponent[20];
        const int length = write_digits((uint64_t)abs(point - 1), exponent);
        return put(at, exponent, length);
    }
    if (point <= 0) {
        at = put(at, "0.", 2);
        at = put_zeros(at, -point);
        return put(at, digits, n);
    }
    if (point >= n) {
        at = put(at, digits, n);
        return put_zeros(at, point - n);
    }
    at = put(at, digits, point);
    *at++ = '.';
    return put(at, digits + point, n - point);
}

/* The sign, and all that is not a finite number above 0; false where digits are still to come. */
static bool put_special(char **at, double value) {
    if (value < 0)
        *(*at)++ = '-';
    if (isnan(value))
        *at = put(*at, "nan", 3);
    else if (isinf(value))
        *at = put(*at, "inf", 3);
    else if (value == 0)
        *at = put(*at, "0", 1);
    else
        return false;
    return true;
}

static size_t finish(char *at, char *out) {
    *at = '\0';
    return (size_t)(at - out);
}

size_t tarry_number_write(double value, char out[TARRY_NUMBER_SIZE]) {
    char *at = out;
    if (put_special(&at, value))
        return finish(at, out);
    const double x = fabs(value);
    if (x < 0x1p53 && x == (double)(uint64_t)x)
        at = lay_out(at, (shortest){(uint64_t)x, 0});
    else if (x >= 1e-11 && x < 1e16)
        at = lay_out(at, shorten_exactly(x));
    else
        at = lay_out(at, shorten_by_trial(x));
    return finish(at, out);
}

size_t tarry_number_write_rounded(double value, int digits, char out[TARRY_NUMBER_SIZE]) {
    char *at = out;
    if (!put_special(&at, value))
        at = lay_out(at, round_digits(fabs(value), digits));
    return finish(at, out);
}

/* Digits, the locale's point if there is one, and the rest, with "." for that point. */
static size_t put_point(const char *text, char out[TARRY_NUMBER_SIZE]) {
    char *at = out;
    bool point = false;
    for (; *text != '\0'; text++) {
        const bool usual = is_digit(*text) || strchr("+-einfa", *text) != NULL;
        if (usual)
            *at++ = *text;
        else if (!point)
            *at++ = '.';
        point = point || !usual;
    }
    return finish(at, out);
}

size_t tarry_number_write_power(double value, int decimals, char out[TARRY_NUMBER_SIZE]) {
    char text[64];
    snprintf(text, sizeof text, "%.*e", decimals, value);
    return put_point(text, out);
}

size_t tarry_number_write_fixed(double value, int decimals, char out[TARRY_NUMBER_SIZE]) {
    if (!(fabs(value) < 1e9))
        return tarry_number_write_power(value, decimals, out);
    char text[64];
    snprintf(text, sizeof text, "%.*f", decimals, value);
    return put_point(text, out);
}
