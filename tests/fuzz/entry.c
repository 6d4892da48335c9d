/* SPDX-License-Identifier: GPL-3.0-or-later */

/* What libFuzzer calls. FUZZ_TARGET is one of the functions of fuzz.h, by the Makefile. */

#include "fuzz.h"

int LLVMFuzzerTestOneInput(const uint8_t *data, size_t size);

int LLVMFuzzerTestOneInput(const uint8_t *data, size_t size) {
    return FUZZ_TARGET(data, size);
}
