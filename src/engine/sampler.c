/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "engine/sampler.h"

#include "base/error.h"

#include <string.h>

static const tarry_sampler *const samplers[] = {&tarry_sampler_direct};

/* Exact methods that have their place in the table but are not written yet. */
static const char *const later[] = {"next", "rejection"};

int tarry_sampler_find(const char *word, const tarry_sampler **sampler, tarry_error *error) {
    for (size_t i = 0; i < sizeof samplers / sizeof *samplers; i++) {
        if (strcmp(word, samplers[i]->word) == 0) {
            *sampler = samplers[i];
            return TARRY_OK;
        }
    }
    for (size_t i = 0; i < sizeof later / sizeof *later; i++)
        if (strcmp(word, later[i]) == 0)
            return tarry_fail(error, TARRY_NOT_YET,
                              "the sampler \"%s\" cannot be used yet; use \"direct\"", word);
    return tarry_fail(error, TARRY_INPUT, "there is no sampler \"%s\"; use \"direct\"", word);
}
