/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Conserved sums: weights y with y . change = 0 for everything that can happen.
 *
 * Unknowns are the weights of species and of lags: what is under way in a lag that holds no species
 * of its own counts as one more species, made where the lag is scheduled and lost where it ends, so
 * that sums hold at every moment. A stage holds its molecules under way itself, and the state of a
 * promoter its dwell. Random amounts force a weight of 0. The alleles' hidden states are left to
 * their sums. The protocol is not looked at but for the time until which a sum holds.
 *
 * Each group of connected unknowns is solved by itself, in whole numbers (nullspace.h). */

#include "model/analysis.h"

#include "base/error.h"
#include "model/nullspace.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

/* One thing that can happen: entries[from .. to). */
typedef struct entry {
    uint32_t unknown;
    int64_t amount;
} entry;

typedef struct solver {
    const tarry_network *network;
    tarry_arena *arena; /* of the answer */

    uint32_t n_unknowns; /* species, then lags */
    bool *dropped;       /* [unknown] weight is 0 */
    double *set_at;      /* [species] the first time at which the protocol sets it, or infinity */
    double *moved_at;    /* [promoter] the same for moving it */
    uint32_t *parent;    /* [unknown] union-find over what changes together */

    entry *entries;
    size_t n_entries, entries_capacity;
    size_t *row_starts; /* n_rows + 1 */
    size_t n_rows, rows_capacity;

    tarry_sum *sums;
    size_t n_sums, sums_capacity;
    uint32_t n_large, n_overflow;
} solver;

/* ---- what can happen ------------------------------------------------------------------------ */

static bool counts_under_way(const tarry_lag *lag) {
    return lag->stage == TARRY_NONE && lag->promoter == TARRY_NONE;
}

static int add_entry(solver *s, uint32_t unknown, int64_t amount) {
    if (s->dropped[unknown])
        return 0;
    if (tarry_grow((void **)&s->entries, &s->entries_capacity, s->n_entries + 1,
                   sizeof *s->entries))
        return 1;
    s->entries[s->n_entries++] = (entry){unknown, amount};
    return 0;
}

static int end_row(solver *s) {
    if (s->n_rows > 0 && s->row_starts[s->n_rows] == s->n_entries)
        return 0;
    if (s->n_rows == 0 && s->n_entries == 0)
        return 0;
    if (tarry_grow((void **)&s->row_starts, &s->rows_capacity, s->n_rows + 2,
                   sizeof *s->row_starts))
        return 1;
    if (s->n_rows == 0)
        s->row_starts[0] = 0;
    s->row_starts[++s->n_rows] = s->n_entries;
    return 0;
}

static int add_effect(solver *s, uint32_t index) {
    const tarry_network *network = s->network;
    const tarry_effect *effect = &network->effects[index];
    int short_of_memory = 0;
    for (uint32_t i = effect->changes.from; i < effect->changes.to; i++)
        short_of_memory |= add_entry(s, network->changes[i].species, network->changes[i].amount);
    for (uint32_t i = effect->schedules.from; i < effect->schedules.to; i++) {
        const uint32_t lag = network->schedules[i];
        if (counts_under_way(&network->lags[lag]))
            short_of_memory |= add_entry(s, network->n_species + lag, 1);
    }
    return short_of_memory;
}

/* A lag's end: each outcome, and the end without one (by chance, or skipped). */
static int add_lag(solver *s, uint32_t index) {
    const tarry_network *network = s->network;
    const tarry_lag *lag = &network->lags[index];
    const uint32_t unknown = network->n_species + index;
    const bool counted = counts_under_way(lag);
    bool may_do_nothing = lag->outcomes.from == lag->outcomes.to;
    int short_of_memory = 0;
    for (uint32_t i = lag->outcomes.from; i < lag->outcomes.to; i++) {
        const tarry_effect *effect = &network->effects[network->outcomes[i].effect];
        short_of_memory |= add_effect(s, network->outcomes[i].effect);
        if (counted)
            short_of_memory |= add_entry(s, unknown, -1);
        short_of_memory |= end_row(s);
        may_do_nothing |= effect->skip_short && effect->demands.from < effect->demands.to;
        may_do_nothing |= i + 1 == lag->outcomes.to && network->outcomes[i].cumulative < 1;
    }
    if (lag->may_be_lost)
        short_of_memory |= add_effect(s, lag->loss_effect) | end_row(s);
    if (counted && may_do_nothing)
        short_of_memory |= add_entry(s, unknown, -1) | end_row(s);
    return short_of_memory;
}

static int gather_rows(solver *s) {
    const tarry_network *network = s->network;
    int short_of_memory = 0;
    for (uint32_t i = 0; i < network->n_reactions && !short_of_memory; i++)
        short_of_memory = add_effect(s, network->reactions[i].effect) | end_row(s);
    for (uint32_t i = 0; i < network->n_lags && !short_of_memory; i++)
        short_of_memory = add_lag(s, i);
    return short_of_memory;
}

static void drop_unknowns(solver *s) {
    const tarry_network *network = s->network;
    for (uint32_t i = 0; i < network->n_species; i++)
        s->dropped[i] = network->species[i].role == TARRY_SPECIES_ALLELE;
    for (uint32_t i = 0; i < network->n_lags; i++)
        s->dropped[network->n_species + i] = !counts_under_way(&network->lags[i]);
    for (uint32_t e = 0; e < network->n_effects; e++) {
        const tarry_range amounts = network->effects[e].amounts;
        for (uint32_t i = amounts.from; i < amounts.to; i++)
            s->dropped[network->amounts[i].species] = true;
    }
}

/* ---- groups of what changes together --------------------------------------------------------- */

static uint32_t find_root(uint32_t *parent, uint32_t i) {
    while (parent[i] != i)
        i = parent[i] = parent[parent[i]];
    return i;
}

/* The lower index becomes the root, so that a group's root is its first unknown. */
static void join(uint32_t *parent, uint32_t i, uint32_t k) {
    i = find_root(parent, i);
    k = find_root(parent, k);
    if (i < k)
        parent[k] = i;
    else
        parent[i] = k;
}

static void join_rows(solver *s) {
    for (uint32_t i = 0; i < s->n_unknowns; i++)
        s->parent[i] = i;
    for (size_t r = 0; r < s->n_rows; r++)
        for (size_t i = s->row_starts[r] + 1; i < s->row_starts[r + 1]; i++)
            join(s->parent, s->entries[s->row_starts[r]].unknown, s->entries[i].unknown);
}

/* ---- one group ------------------------------------------------------------------------------ */

typedef struct group {
    size_t n;                 /* unknowns */
    const uint32_t *unknowns; /* ascending */
} group;

/* ---- values --------------------------------------------------------------------------------- */

static int64_t weight_of(const group *g, const int64_t *y, uint32_t unknown) {
    for (size_t i = 0; i < g->n; i++)
        if (g->unknowns[i] == unknown)
            return y[i];
    return 0;
}

/* What a promoter's state adds at its start. False where that depends on the state drawn. */
static bool add_promoter(const tarry_network *network, const tarry_promoter *promoter,
                         const group *g, const int64_t *y, double *value) {
    double before = 0;
    int64_t weight = 0;
    bool first = true;
    for (uint32_t i = promoter->states.from; i < promoter->states.to; i++) {
        const double cumulative = promoter->start[i - promoter->states.from];
        if (cumulative > before) {
            const int64_t here = weight_of(g, y, network->states[i].sum);
            if (!first && here != weight)
                return false;
            weight = here;
            first = false;
        }
        before = cumulative;
    }
    *value += (double)weight;
    return true;
}

static bool reads_promoter(const tarry_network *network, const tarry_promoter *promoter,
                           const group *g, const int64_t *y) {
    for (uint32_t i = promoter->states.from; i < promoter->states.to; i++)
        if (weight_of(g, y, network->states[i].sum) != 0)
            return true;
    return false;
}

/* The promoters of the gene whose states are in the group (a group holds one gene's at most, unless
 * reactions tie genes together, which they may not). */
static bool add_promoters(const tarry_network *network, const group *g, const int64_t *y,
                          double *value) {
    int32_t gene = TARRY_NONE;
    for (size_t i = 0; i < g->n && gene == TARRY_NONE; i++)
        if (y[i] != 0 && g->unknowns[i] < network->n_species &&
            network->species[g->unknowns[i]].role == TARRY_SPECIES_STATE)
            gene = network->species[g->unknowns[i]].gene;
    if (gene == TARRY_NONE)
        return true;
    const tarry_range promoters = network->genes[gene].promoters;
    for (uint32_t p = promoters.from; p < promoters.to; p++)
        if (reads_promoter(network, &network->promoters[p], g, y) &&
            !add_promoter(network, &network->promoters[p], g, y, value))
            return false;
    return true;
}

/* Every state of a promoter weighs the same: moving it changes nothing. */
static bool moves_freely(const tarry_network *network, const tarry_promoter *promoter,
                         const group *g, const int64_t *y) {
    for (uint32_t i = promoter->states.from + 1; i < promoter->states.to; i++)
        if (weight_of(g, y, network->states[i].sum) !=
            weight_of(g, y, network->states[promoter->states.from].sum))
            return false;
    return true;
}

/* When the protocol first changes the sum. */
static double time_until(const solver *s, const group *g, const int64_t *y) {
    const tarry_network *network = s->network;
    double until = HUGE_VAL;
    for (size_t i = 0; i < g->n; i++) {
        const uint32_t species = g->unknowns[i];
        if (y[i] == 0 || species >= network->n_species)
            continue;
        until = fmin(until, s->set_at[species]);
        if (network->species[species].role != TARRY_SPECIES_STATE)
            continue;
        const tarry_range promoters = network->genes[network->species[species].gene].promoters;
        for (uint32_t p = promoters.from; p < promoters.to; p++)
            if (s->moved_at[p] < until && !moves_freely(network, &network->promoters[p], g, y))
                until = s->moved_at[p];
    }
    return until;
}

static void note_settings(solver *s) {
    const tarry_network *network = s->network;
    for (uint32_t i = 0; i < network->n_species; i++)
        s->set_at[i] = HUGE_VAL;
    for (uint32_t i = 0; i < network->n_promoters; i++)
        s->moved_at[i] = HUGE_VAL;
    for (uint32_t k = network->n_segments; k-- > 0;) {
        const tarry_range settings = network->segments[k].settings;
        for (uint32_t i = settings.from; i < settings.to; i++) {
            const tarry_setting *setting = &network->settings[i];
            if (setting->species != TARRY_NONE)
                s->set_at[setting->species] = network->segments[k].start;
            else
                s->moved_at[setting->promoter] = network->segments[k].start;
        }
    }
}

static int keep_sum(solver *s, const group *g, const int64_t *y) {
    const tarry_network *network = s->network;
    tarry_sum sum = {0};
    tarry_sum_term *terms = tarry_arena_calloc(s->arena, g->n, sizeof *terms);
    if (!terms)
        return 1;
    for (size_t i = 0; i < g->n; i++) {
        if (y[i] == 0)
            continue;
        const uint32_t unknown = g->unknowns[i];
        const bool species = unknown < network->n_species;
        terms[sum.n_terms++] = (tarry_sum_term){
            species ? (int32_t)unknown : TARRY_NONE,
            species ? TARRY_NONE : (int32_t)(unknown - network->n_species), y[i]};
        if (species)
            sum.value += (double)y[i] * network->species[unknown].start;
    }
    sum.terms = terms;
    sum.known = add_promoters(network, g, y, &sum.value);
    sum.until = time_until(s, g, y);
    if (tarry_grow((void **)&s->sums, &s->sums_capacity, s->n_sums + 1, sizeof *s->sums))
        return 1;
    s->sums[s->n_sums++] = sum;
    return 0;
}

/* ---- all groups ----------------------------------------------------------------------------- */

/* Rows and unknowns in order of their groups. */
typedef struct order {
    uint32_t *column;       /* [unknown] its place in its group */
    uint32_t *sizes;        /* [root] unknowns in the group */
    size_t *unknown_starts; /* [root + 1] */
    uint32_t *unknowns;     /* by group */
    size_t *row_starts;     /* [root + 1] */
    size_t *rows;           /* by group */
} order;

static void order_release(order *o) {
    free(o->column);
    free(o->sizes);
    free(o->unknown_starts);
    free(o->unknowns);
    free(o->row_starts);
    free(o->rows);
}

static int order_init(order *o, const solver *s) {
    const size_t n = s->n_unknowns;
    o->column = tarry_calloc(n, sizeof *o->column);
    o->sizes = tarry_calloc(n, sizeof *o->sizes);
    o->unknown_starts = tarry_calloc(n + 1, sizeof *o->unknown_starts);
    o->unknowns = tarry_calloc(n, sizeof *o->unknowns);
    o->row_starts = tarry_calloc(n + 1, sizeof *o->row_starts);
    o->rows = tarry_calloc(s->n_rows, sizeof *o->rows);
    return !o->column || !o->sizes || !o->unknown_starts || !o->unknowns || !o->row_starts ||
           !o->rows;
}

static uint32_t row_root(const solver *s, size_t row) {
    return find_root(s->parent, s->entries[s->row_starts[row]].unknown);
}

static void order_fill(order *o, const solver *s) {
    const uint32_t n = s->n_unknowns;
    for (uint32_t i = 0; i < n; i++)
        if (!s->dropped[i])
            o->column[i] = o->sizes[find_root(s->parent, i)]++;
    for (size_t r = 0; r < s->n_rows; r++)
        o->row_starts[row_root(s, r) + 1]++;
    for (uint32_t i = 0; i < n; i++) {
        o->unknown_starts[i + 1] = o->unknown_starts[i] + o->sizes[i];
        o->row_starts[i + 1] += o->row_starts[i];
    }
    for (uint32_t i = 0; i < n; i++)
        if (!s->dropped[i])
            o->unknowns[o->unknown_starts[find_root(s->parent, i)] + o->column[i]] = i;
    memset(o->sizes, 0, n * sizeof *o->sizes);
    for (size_t r = 0; r < s->n_rows; r++) {
        const uint32_t root = row_root(s, r);
        o->rows[o->row_starts[root] + o->sizes[root]++] = r;
    }
}

static bool eliminate(const solver *s, const order *o, uint32_t root, tarry_nullspace *space) {
    for (size_t i = o->row_starts[root]; i < o->row_starts[root + 1]; i++) {
        memset(space->row, 0, space->n * sizeof *space->row);
        for (size_t k = s->row_starts[o->rows[i]]; k < s->row_starts[o->rows[i] + 1]; k++)
            space->row[o->column[s->entries[k].unknown]] += s->entries[k].amount;
        if (!tarry_nullspace_take(space))
            return false;
    }
    return tarry_nullspace_solve(space);
}

static int do_group(solver *s, const order *o, uint32_t root) {
    const group g = {o->unknown_starts[root + 1] - o->unknown_starts[root],
                     o->unknowns + o->unknown_starts[root]};
    tarry_nullspace space = {0};
    if (g.n == 0)
        return 0;
    if (g.n > TARRY_SUMS_LARGEST) {
        s->n_large++;
        return 0;
    }
    int short_of_memory = tarry_nullspace_init(&space, g.n);
    if (!short_of_memory && !eliminate(s, o, root, &space))
        s->n_overflow++;
    else
        for (size_t b = 0; b < space.n_basis && !short_of_memory; b++)
            short_of_memory = keep_sum(s, &g, space.basis + b * g.n);
    tarry_nullspace_release(&space);
    return short_of_memory;
}

static int solve(solver *s) {
    order o = {0};
    int short_of_memory = order_init(&o, s);
    if (!short_of_memory)
        order_fill(&o, s);
    for (uint32_t root = 0; root < s->n_unknowns && !short_of_memory; root++)
        short_of_memory = do_group(s, &o, root);
    order_release(&o);
    return short_of_memory;
}

static int hand_out(const solver *s, tarry_sums *sums) {
    tarry_sum *copy = tarry_arena_calloc(s->arena, s->n_sums, sizeof *copy);
    if (!copy)
        return 1;
    if (s->n_sums > 0)
        memcpy(copy, s->sums, s->n_sums * sizeof *copy);
    *sums = (tarry_sums){copy, (uint32_t)s->n_sums, s->n_large, s->n_overflow};
    return 0;
}

int tarry_analysis_sums(const tarry_network *network, tarry_arena *arena, tarry_sums *sums,
                        tarry_error *error) {
    solver s = {.network = network, .arena = arena};
    s.n_unknowns = network->n_species + network->n_lags;
    s.dropped = tarry_calloc(s.n_unknowns, sizeof *s.dropped);
    s.parent = tarry_calloc(s.n_unknowns, sizeof *s.parent);
    s.set_at = tarry_calloc(network->n_species, sizeof *s.set_at);
    s.moved_at = tarry_calloc(network->n_promoters, sizeof *s.moved_at);
    int short_of_memory = !s.dropped || !s.parent || !s.set_at || !s.moved_at;
    if (!short_of_memory) {
        note_settings(&s);
        drop_unknowns(&s);
        short_of_memory = gather_rows(&s);
    }
    if (!short_of_memory) {
        join_rows(&s);
        short_of_memory = solve(&s) || hand_out(&s, sums);
    }
    free(s.dropped);
    free(s.parent);
    free(s.set_at);
    free(s.moved_at);
    free(s.entries);
    free(s.row_starts);
    free(s.sums);
    return short_of_memory ? tarry_fail_memory(error, "conserved sums") : 0;
}
