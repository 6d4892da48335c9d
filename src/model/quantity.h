/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_MODEL_QUANTITY_H
#define TARRY_MODEL_QUANTITY_H

/* Numbers with units. A dimension is a pair of exponents; bare numbers have none and go with all.
 */

#include <stdbool.h>
#include <stddef.h>
#include "tarry/error.h"

typedef struct tarry_dimension {
    bool known; /* false: a bare number, which fits wherever it stands */
    signed char time;
    signed char length;
} tarry_dimension;

#define TARRY_ANY ((tarry_dimension){false, 0, 0})
#define TARRY_PURE ((tarry_dimension){true, 0, 0})
#define TARRY_TIME ((tarry_dimension){true, 1, 0})
#define TARRY_RATE ((tarry_dimension){true, -1, 0})
#define TARRY_LENGTH ((tarry_dimension){true, 0, 1})

/* Lengths are kept in bp (= nt); times in the model's unit, `time_unit` seconds long. */
typedef struct tarry_units {
    double time_unit; /* seconds in the model's unit of time */
} tarry_units;

/* Seconds in "s", "min", "h" or "d"; 0 for any other text. */
double tarry_time_unit_seconds(const char *name);

/* A unit as a fraction of whole numbers, so that value * up / down rounds once. */
typedef struct tarry_unit_fraction {
    double up, down;
    tarry_dimension dimension;
} tarry_unit_fraction;

/* The simple unit called text[0..n) (`min`, `kb`); false for any other text. */
bool tarry_unit_find(const char *text, size_t n, tarry_units units, tarry_unit_fraction *unit);

/* TARRY_INPUT (no place) with what is wrong with text[0..n) as a unit and what would be right; a
 * unit of concentration is named as such. */
int tarry_unit_fail(const char *text, size_t n, tarry_error *error);

/* text[0..n) names a unit of concentration or amount of substance (M, nM, mol, ...). */
bool tarry_unit_is_molar(const char *text, size_t n);

/* The whole of text[0..n) as NUMBER [UNIT][/UNIT], blanks around the parts. False where it is
 * anything else, or too large for a number. */
bool tarry_quantity_read(const char *text, size_t n, tarry_units units, double *value,
                         tarry_dimension *dimension);

/* The unit text[0..n) (as `min`, `/h`, `kb/min`, `1/s`): scale to the units above and dimension.
 * TARRY_INPUT with a helpful message otherwise (molar units are named as such). */
int tarry_unit_read(const char *text, size_t n, tarry_units units, double *scale,
                    tarry_dimension *dimension, tarry_error *error);

/* Words for messages: "a time", "a rate", "a length", "a pure number", "length/time", ... */
const char *tarry_dimension_text(tarry_dimension dimension, char out[48]);

bool tarry_dimension_fits(tarry_dimension given, tarry_dimension due);

#endif
