/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Quantities and units: what is read is a finite number that comes back the same from its digits.
 */

#include "fuzz.h"

#include "base/number.h"
#include "model/quantity.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

int fuzz_quantity(const uint8_t *data, size_t size) {
    static const tarry_units minutes = {60};
    char *text = fuzz_text(data, size);
    const size_t n = strlen(text);
    tarry_dimension dimension = {0};
    tarry_error error = {0};
    double value = 0, again = 1, scale = 0;
    char digits[TARRY_NUMBER_SIZE], words[48];
    if (tarry_quantity_read(text, n, minutes, &value, &dimension)) {
        fuzz_must(isfinite(value), "a quantity is finite");
        tarry_number_write(value, digits);
        fuzz_must(tarry_quantity_read(digits, strlen(digits), minutes, &again, &dimension) &&
                      again == value,
                  "a number comes back from its digits");
    }
    if (tarry_unit_read(text, n, minutes, &scale, &dimension, &error) == 0) {
        fuzz_must(isfinite(scale) && scale > 0, "a unit has a size");
        tarry_dimension_text(dimension, words);
        fuzz_must(strlen(words) < sizeof words, "a dimension has words");
    } else {
        fuzz_must(error.message[0] != '\0', "an error has words");
    }
    free(text);
    return 0;
}
