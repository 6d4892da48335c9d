/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Models: whatever is read, an answer with words and a place, or a network whose parts fit together
 * and that can be checked. */

#include "fuzz.h"

#include "model/model.h"
#include "tarry/tarry.h"

#include <stdlib.h>
#include <string.h>

/* `check` lists sums and means: left to models of a size for which that takes no time. */
enum { MOST_REACTIONS = 60, MOST_SEGMENTS = 50 };

static void check_network(const tarry_network *network) {
    for (uint32_t s = 1; s < network->n_segments; s++)
        fuzz_must(network->segments[s].start >= network->segments[s - 1].start,
                  "segments come in order");
    for (uint32_t i = 0; i < network->n_effects; i++)
        fuzz_must(network->effects[i].changes.from <= network->effects[i].changes.to,
                  "ranges go forward");
    for (uint32_t i = 0; i < network->n_reactions; i++)
        fuzz_must(network->reactions[i].effect < network->n_effects, "a reaction has an effect");
    fuzz_must(network->run.until > 0 && network->run.n_frames >= 2, "a record has frames");
}

int fuzz_model(const uint8_t *data, size_t size) {
    tarry_model *model = NULL;
    tarry_error error = {0};
    char *report = NULL;
    tarry_start();
    if (tarry_model_read_text((const char *)data, size, "m.yaml", NULL, 0, &model, &error) != 0) {
        fuzz_must(model == NULL, "a model that was refused is not there");
        fuzz_must(error.code != TARRY_OK && error.message[0] != '\0', "an error has words");
        fuzz_must(error.line >= 0 && error.column >= 0, "an error has a place");
        return 0;
    }
    const tarry_network *network = &model->network;
    check_network(network);
    if (network->n_reactions <= MOST_REACTIONS && network->n_segments <= MOST_SEGMENTS &&
        tarry_check(model, &report, &error) == 0)
        fuzz_must(strlen(report) > 0, "a report says something");
    free(report);
    tarry_model_free(model);
    return 0;
}
