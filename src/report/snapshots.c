/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "report/snapshots.h"

#include "base/error.h"
#include "base/memory.h"
#include "report/groups.h"

#include <stdlib.h>
#include <string.h>

static bool is_snapshot(const tarry_run_plan *plan, double time) {
    for (uint32_t i = 0; i < plan->n_snapshots; i++)
        if (plan->snapshots[i] == time)
            return true;
    return false;
}

/* The rows of one name, which lie in the order of time. */
static void add_rows(tarry_snapshots *snapshots, const tarry_run_plan *plan,
                     const tarry_table *means, const tarry_groups *groups, size_t g) {
    const int time_column = tarry_table_column(means, "time");
    for (size_t i = groups->starts[g]; i < groups->starts[g + 1]; i++) {
        const size_t row = groups->rows[i];
        const double time = tarry_table_number(means, row, time_column);
        if (is_snapshot(plan, time))
            snapshots->items[snapshots->n++] = (tarry_snapshot){groups->names[g], time, row};
    }
}

int tarry_snapshots_init(tarry_snapshots *snapshots, const tarry_run_plan *plan,
                         const tarry_table *means, tarry_error *error) {
    tarry_groups groups = {0};
    memset(snapshots, 0, sizeof *snapshots);
    int status = tarry_groups_init(&groups, means, "name", error);
    if (!status) {
        snapshots->items = tarry_calloc(tarry_table_n_rows(means) + 1, sizeof *snapshots->items);
        if (!snapshots->items)
            status = tarry_fail_memory(error, "the moments at the snapshots");
    }
    for (size_t g = 0; !status && g < groups.n; g++)
        add_rows(snapshots, plan, means, &groups, g);
    tarry_groups_release(&groups);
    return status;
}

void tarry_snapshots_release(tarry_snapshots *snapshots) {
    free(snapshots->items);
    memset(snapshots, 0, sizeof *snapshots);
}

/* Names come in the order of species: the search goes on from the last one found. */
static const tarry_species *find_species(const tarry_network *network, const char *name,
                                         uint32_t *at) {
    for (uint32_t i = 0; i < network->n_species; i++) {
        const uint32_t here = (*at + i) % network->n_species;
        if (!strcmp(network->species[here].name, name)) {
            *at = here;
            return &network->species[here];
        }
    }
    return NULL;
}

const char *tarry_snapshots_title(const tarry_network *network) {
    return network->data && network->n_species == 0 ? "Means" : "Counts at the snapshots";
}

bool tarry_snapshots_tell(const tarry_network *network, const char *name, uint32_t *at) {
    if (network->data && network->run.n_frames == 0)
        return true;
    const bool changes = network->n_segments > 1 || !(network->run.settle > 0);
    const tarry_species *species = find_species(network, name, at);
    if (!species)
        return false;
    return species->role == TARRY_SPECIES_PLAIN ||
           (changes && network->run.n_snapshots > 1 && species->role != TARRY_SPECIES_STATE);
}
