/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "report/rounding.h"

#include "base/number.h"

#include <math.h>
#include <string.h>

enum { PLAIN_DIGITS = 4 };

/* What rounding to PLAIN_DIGITS may add at most: 0.09999996 leads with the 1 of 0.1000. */
#define ROUNDS_UP (1 + 5e-5)

/* Outside these a power of ten is written. */
#define SMALLEST 1e-4
#define LARGEST 1e7

/* The place of the leading digit: 0 for 1 to 9.9, -1 for 0.1 to 0.99. */
static int leading_place(double x) {
    return (int)floor(log10(fabs(x)));
}

static void put(double x, int decimals, int digits, int with_power, char out[TARRY_ROUNDED]) {
    if (with_power)
        tarry_number_write_power(x, digits > 1 ? digits - 1 : 0, out);
    else
        tarry_number_write_fixed(x, decimals > 0 ? decimals : 0, out);
    /* "-0.00" says nothing that "0.00" does not. */
    if (out[0] == '-' && strspn(out + 1, "0.") == strlen(out + 1))
        memmove(out, out + 1, strlen(out));
}

void tarry_round_plain(double value, char out[TARRY_ROUNDED]) {
    const double size = fabs(value);
    if (isnan(value))
        strcpy(out, "-");
    else if (isinf(value) || (value == floor(value) && size < LARGEST))
        tarry_number_write(value, out);
    else
        put(value, PLAIN_DIGITS - 1 - leading_place(value * ROUNDS_UP), PLAIN_DIGITS,
            size < SMALLEST || size >= LARGEST, out);
}

void tarry_round(double value, double low, double high, int most, tarry_rounded *out) {
    out->low[0] = out->high[0] = '\0';
    const double half = (high - low) / 2;
    if (!(half > 0) || !isfinite(half) || !isfinite(value)) {
        tarry_round_plain(value, out->value);
        if (half == 0) {
            tarry_round_plain(low, out->low);
            tarry_round_plain(high, out->high);
        }
        return;
    }
    const double largest = fmax(fabs(value), fmax(fabs(low), fabs(high)));
    const int leading = leading_place(largest);
    int last = leading_place(half) - 1; /* the place of the last digit shown */
    if (last < leading - most + 1)
        last = leading - most + 1;
    if (last > leading)
        last = leading;
    const int with_power = largest < SMALLEST || largest >= LARGEST;
    put(value, -last, leading - last + 1, with_power, out->value);
    put(low, -last, leading - last + 1, with_power, out->low);
    put(high, -last, leading - last + 1, with_power, out->high);
}
