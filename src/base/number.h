/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_BASE_NUMBER_H
#define TARRY_BASE_NUMBER_H

#include <stddef.h>
#include <stdint.h>

/* Numbers as text, always in the C locale whatever the process has set. */

enum { TARRY_NUMBER_SIZE = 32 };

typedef enum tarry_number_status {
    TARRY_NUMBER_OK,
    TARRY_NUMBER_BAD,   /* not a number as a whole */
    TARRY_NUMBER_RANGE, /* too large for a double */
} tarry_number_status;

/* Read all n bytes as one decimal number (optional sign, digits, point, exponent; no hex, no inf,
 * no nan, no blanks). *out is set on OK only. */
tarry_number_status tarry_number_read(const char *text, size_t n, double *out);

/* The same for whole numbers, exactly. */
tarry_number_status tarry_integer_read(const char *text, size_t n, int64_t *out);

/* Length of the longest prefix of text[0..n) that is a number by the rule above; 0 if none. */
size_t tarry_number_prefix(const char *text, size_t n);

/* Write with the fewest significant digits that read back to the same double, plain from 0.00001 up
 * to 17 digits before the point and with an exponent beyond ("nan", "inf", "-inf" for the rest; -0
 * is "0"). Returns the length; `out` is NUL-ended. */
size_t tarry_number_write(double value, char out[TARRY_NUMBER_SIZE]);

/* The same, rounded to `digits` significant digits (1 to 17), those that are 0 at the end left out:
 * for messages. */
size_t tarry_number_write_rounded(double value, int digits, char out[TARRY_NUMBER_SIZE]);

/* With `decimals` digits (0 to 17) after the point, or with one digit before the point and a power
 * of ten: what printf's %.*f and %.*e write in the C locale, for tables that people read. Up to 1e9
 * with %f; larger values are written with a power. */
size_t tarry_number_write_fixed(double value, int decimals, char out[TARRY_NUMBER_SIZE]);
size_t tarry_number_write_power(double value, int decimals, char out[TARRY_NUMBER_SIZE]);

#endif
