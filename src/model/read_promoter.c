/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "model/read_genes.h"

/* Promoters: any number of states and any graph between them. A state is left at rates (`to`) or
 * after a dwell that is drawn (`lasts`, `then`). What is read once for a gene is made for each of
 * its alleles. */

#include "base/error.h"
#include "base/memory.h"
#include "model/expect.h"

#include <math.h>
#include <string.h>

/* Probabilities are meant to add up to 1; a slip larger than this is an error. */
static const double SHARE_SLIP = 1e-6;

/* ---- ways out of a state ------------------------------------------------------------------------
 */

/* The rate of a move: a scalar, or {rate: ..., initiates: yes}. */
static int rate_node(const tarry_node *node, const tarry_node **rate, bool *initiates,
                     tarry_error *error) {
    static const char *const keys[] = {"rate", "initiates"};
    *rate = node;
    if (node->kind != TARRY_NODE_MAP)
        return 0;
    int code = tarry_expect_keys(node, "a move", keys, 2, error);
    if (code == 0)
        code = tarry_expect_value(node, "a move", "rate", rate, error);
    const tarry_node *answer = tarry_node_get(node, "initiates");
    if (code == 0 && answer != NULL)
        code = tarry_expect_answer(answer, "'initiates' of a move", initiates, error);
    return code;
}

static int add_move(tarry_gene_work *work, uint32_t from, const tarry_entry *to,
                    tarry_builder_move move, tarry_error *error) {
    int code = tarry_layout_need_state(&work->layout, to->key, to->place, &move.to, error);
    if (code != 0)
        return code;
    if (move.to == from)
        return tarry_fail_at(
            error, TARRY_INPUT, to->place,
            "the state '%s' leads to itself; leave this out, or name another state", to->key);
    move.gene = work->gene;
    move.from = from;
    move.place = to->place;
    return TARRY_APPEND(&work->builder->moves, move) == 0 ? 0
                                                          : tarry_fail_memory(error, "a promoter");
}

static int read_rates(tarry_gene_work *work, uint32_t from, const tarry_node *map,
                      tarry_error *error) {
    tarry_builder *builder = work->builder;
    int code = tarry_expect_map(map, "'to'", error);
    for (size_t i = 0; code == 0 && i < map->n; i++) {
        const tarry_entry *to = &map->entries[i];
        const char *what = tarry_arena_format(builder->arena, "%s.%s>%s", work->layout.name,
                                              work->states[from].name, to->key);
        if (what == NULL)
            return tarry_fail_memory(error, "a promoter");
        const tarry_node *rate = NULL;
        tarry_builder_move move = {.share = 1};
        code = rate_node(to->node, &rate, &move.initiates, error);
        move.waits = move.initiates && work->layout.clearance != NULL;
        if (move.initiates)
            work->states[from].active = true;
        if (code == 0)
            code = tarry_builder_rate(builder, rate, false, what, &move.formula, &move.rate, error);
        if (code == 0)
            code = add_move(work, from, to, move, error);
    }
    return code;
}

/* `then: open` or `then: {open: 0.7, primed: 0.3}`. */
static int read_shares(tarry_gene_work *work, uint32_t from, const tarry_node *then,
                       tarry_error *error) {
    if (then->kind == TARRY_NODE_SCALAR) {
        const tarry_entry only = {.key = then->text, .place = then->place, .node = then};
        return add_move(work, from, &only, (tarry_builder_move){.timed = true, .share = 1}, error);
    }
    const size_t first = work->builder->moves.n;
    int code = tarry_expect_map(then, "'then'", error);
    double sum = 0;
    for (size_t i = 0; code == 0 && i < then->n; i++) {
        const tarry_entry *to = &then->entries[i];
        tarry_builder_move move = {.timed = true};
        code = tarry_builder_constant_value(work->builder, to->node, TARRY_PURE,
                                            "a probability under 'then'", &move.share, error);
        if (code == 0 && !(move.share >= 0))
            code = tarry_fail_number(error, to->node->place,
                                     "a probability must be 0 or more, not ", move.share, "");
        sum += move.share;
        if (code == 0)
            code = add_move(work, from, to, move, error);
    }
    if (code == 0 && !(fabs(sum - 1) <= SHARE_SLIP))
        return tarry_fail_number(error, then->place, "the probabilities under 'then' add up to ",
                                 sum, "; they must add up to 1");
    for (size_t i = first; i < work->builder->moves.n; i++)
        work->builder->moves.items[i].share /= sum;
    return code;
}

static int read_ways_out(tarry_gene_work *work, uint32_t index, const tarry_node *node,
                         tarry_error *error) {
    tarry_builder *builder = work->builder;
    tarry_state_plan *state = &work->states[index];
    const tarry_node *to = tarry_node_get(node, "to");
    const tarry_node *lasts = tarry_node_get(node, "lasts");
    const tarry_node *then = tarry_node_get(node, "then");
    if ((lasts == NULL) != (then == NULL))
        return tarry_fail_at(error, TARRY_INPUT, node->place,
                             "a state that lasts says so by both: lasts: DELAY, then: {state: "
                             "probability}");
    if (lasts != NULL && to != NULL)
        return tarry_fail_at(error, TARRY_INPUT, tarry_key_place(node, "to"),
                             "a state has either 'to' with rates, or 'lasts' and 'then'; not both");
    int code = 0;
    state->moves.from = (uint32_t)builder->moves.n;
    state->lasts = lasts != NULL;
    if (lasts != NULL)
        code = tarry_builder_delay_index(builder, lasts, &state->delay, error);
    if (code == 0 && then != NULL)
        code = read_shares(work, index, then, error);
    if (code == 0 && to != NULL)
        code = read_rates(work, index, to, error);
    state->moves.to = (uint32_t)builder->moves.n;
    return code;
}

/* ---- states -------------------------------------------------------------------------------------
 */

static int read_state(tarry_gene_work *work, uint32_t index, tarry_error *error) {
    static const char *const keys[] = {"to", "lasts", "then", "initiates"};
    const tarry_entry *entry = &work->layout.promoter->entries[index];
    tarry_state_plan *state = &work->states[index];
    state->name = entry->key;
    state->place = entry->place;
    int code = tarry_expect_keys(entry->node, entry->key, keys, 4, error);
    if (code == 0)
        code = read_ways_out(work, index, entry->node, error);
    const tarry_node *initiates = tarry_node_get(entry->node, "initiates");
    if (code != 0 || initiates == NULL)
        return code;
    state->initiates = true;
    state->active = true;
    const char *what = tarry_arena_format(work->builder->arena, "%s.initiation", work->layout.name);
    if (what == NULL)
        return tarry_fail_memory(error, "a promoter");
    return tarry_builder_rate(work->builder, initiates, false, what, &state->formula, &state->rate,
                              error);
}

/* `bursts_in: [open]` names the active states. */
static int read_active(tarry_gene_work *work, const tarry_node *bursts_in, tarry_error *error) {
    if (bursts_in == NULL)
        return 0;
    int code = tarry_expect_list(bursts_in, "'bursts_in'", error);
    for (uint32_t i = 0; i < work->layout.n_states; i++)
        work->states[i].active = false;
    for (size_t i = 0; code == 0 && i < bursts_in->n; i++) {
        const tarry_node *name = bursts_in->entries[i].node;
        uint32_t state = 0;
        code = tarry_expect_scalar(name, "a state under 'bursts_in'", error);
        if (code == 0)
            code = tarry_layout_need_state(&work->layout, name->text, name->place, &state, error);
        if (code == 0)
            work->states[state].active = true;
    }
    return code;
}

/* Bursts can be told where some states are active and others are not. */
static void set_active(tarry_gene_work *work) {
    tarry_builder *builder = work->builder;
    tarry_gene *gene = &builder->genes.items[work->gene];
    const uint32_t n_states = work->layout.n_states;
    uint32_t n_active = 0;
    for (uint32_t i = 0; i < n_states; i++)
        n_active += work->states[i].active;
    for (uint32_t i = gene->promoters.from; i < gene->promoters.to; i++)
        for (uint32_t j = 0; j < n_states; j++)
            builder->states.items[builder->promoters.items[i].states.from + j].active =
                work->states[j].active;
    gene->tells = n_active > 0 && n_active < n_states;
    for (uint32_t i = gene->tracks.from; i < gene->tracks.to; i++)
        builder->tracks.items[i].tells = gene->tells;
}

/* ---- start --------------------------------------------------------------------------------------
 */

static int read_start_weights(tarry_gene_work *work, const tarry_node *map, double *weights,
                              tarry_error *error) {
    int code = tarry_expect_map(map, "'start'", error);
    double sum = 0;
    for (size_t i = 0; code == 0 && i < map->n; i++) {
        const tarry_entry *entry = &map->entries[i];
        uint32_t state = 0;
        double weight = 0;
        code = tarry_layout_need_state(&work->layout, entry->key, entry->place, &state, error);
        if (code == 0)
            code = tarry_builder_constant_value(work->builder, entry->node, TARRY_PURE,
                                                "a weight under 'start'", &weight, error);
        if (code == 0 && !(weight >= 0))
            code = tarry_fail_number(error, entry->node->place, "a weight must be 0 or more, not ",
                                     weight, "");
        if (code != 0)
            return code;
        weights[state] = weight;
        sum += weight;
    }
    if (code == 0 && !(sum > 0 && isfinite(sum)))
        return tarry_fail_number(error, map->place, "the weights under 'start' add up to ", sum,
                                 "; at least one must be above 0");
    return code;
}

/* Cumulative start weights; those of a steady start are worked out when all rates are known. */
static int read_start(tarry_gene_work *work, tarry_error *error) {
    tarry_builder *builder = work->builder;
    const tarry_node *start = tarry_node_get(work->layout.node, "start");
    const tarry_range promoters = builder->genes.items[work->gene].promoters;
    double *weights = tarry_arena_calloc(builder->arena, work->layout.n_states, sizeof *weights);
    if (weights == NULL)
        return tarry_fail_memory(error, "a promoter");
    const bool steady = start != NULL && start->kind == TARRY_NODE_SCALAR &&
                        strcmp(start->text, "steady") == 0;
    uint32_t first = 0;
    int code = 0;
    if (start != NULL && start->kind != TARRY_NODE_SCALAR)
        code = read_start_weights(work, start, weights, error);
    else if (start != NULL && !steady)
        code = tarry_layout_need_state(&work->layout, start->text, start->place, &first, error);
    if (code != 0)
        return code;
    if (start == NULL || (start->kind == TARRY_NODE_SCALAR && !steady))
        weights[first] = 1;
    if (!steady)
        tarry_cumulate(weights, work->layout.n_states);
    for (uint32_t i = promoters.from; i < promoters.to; i++) {
        builder->promoters.items[i].start = steady ? NULL : weights;
        builder->promoters.items[i].steady = steady;
    }
    return 0;
}

/* ---- reading ------------------------------------------------------------------------------------
 */

/* A lag of each allele at whose end the allele is ready to initiate again. */
static int make_clearance(tarry_gene_work *work, tarry_error *error) {
    tarry_builder *builder = work->builder;
    tarry_lag lag = {.name = tarry_arena_format(builder->arena, "%s.clearance", work->layout.name),
                     .stage = TARRY_NONE,
                     .promoter = TARRY_NONE,
                     .gene = (int32_t)work->gene,
                     .place = tarry_key_place(work->layout.node, "clearance")};
    if (lag.name == NULL)
        return tarry_fail_memory(error, "a promoter");
    int code = tarry_builder_delay_index(builder, work->layout.clearance, &lag.delay, error);
    for (uint32_t allele = 0; code == 0 && allele < work->layout.n_copies; allele++) {
        tarry_draft draft = {0};
        uint32_t index = 0, effect = 0;
        lag.allele = allele;
        code = tarry_builder_lag(builder, lag, &index, error);
        if (allele == 0)
            work->clearance = index;
        if (code == 0)
            code = tarry_draft_change(&draft, tarry_layout_ready(&work->layout, allele), 1, error);
        if (code == 0)
            code = tarry_builder_effect(builder, &draft, &effect, error);
        if (code == 0)
            code = tarry_builder_outcome(builder, index, 1, effect, error);
        tarry_draft_release(&draft);
    }
    return code;
}

static int make_lags(const tarry_gene_work *work, tarry_error *error) {
    tarry_builder *builder = work->builder;
    const tarry_range promoters = builder->genes.items[work->gene].promoters;
    int code = 0;
    for (uint32_t i = promoters.from; i < promoters.to; i++)
        for (uint32_t j = 0; code == 0 && j < work->layout.n_states; j++) {
            if (!work->states[j].lasts)
                continue;
            tarry_promoter_state *state =
                &builder->states.items[builder->promoters.items[i].states.from + j];
            const tarry_lag lag = {.name = builder->species.items[state->sum].name,
                                   .delay = work->states[j].delay,
                                   .stage = TARRY_NONE,
                                   .promoter = (int32_t)i,
                                   .gene = (int32_t)work->gene,
                                   .allele = i - promoters.from,
                                   .place = work->states[j].place};
            uint32_t index = 0;
            code = tarry_builder_lag(builder, lag, &index, error);
            state->lag = (int32_t)index;
        }
    return code;
}

int tarry_read_promoter(tarry_gene_work *work, tarry_error *error) {
    const uint32_t n_states = work->layout.n_states;
    const tarry_node *bursts_in = tarry_node_get(work->layout.node, "bursts_in");
    work->states = tarry_arena_calloc(work->builder->arena, n_states, sizeof *work->states);
    if (work->states == NULL)
        return tarry_fail_memory(error, "a promoter");
    for (uint32_t i = 0; i < n_states; i++)
        work->states[i].name = work->layout.promoter->entries[i].key;
    int code = 0;
    for (uint32_t i = 0; code == 0 && i < n_states; i++)
        code = read_state(work, i, error);
    if (code == 0)
        code = read_active(work, bursts_in, error);
    if (code != 0)
        return code;
    set_active(work);
    code = read_start(work, error);
    if (code == 0)
        code = make_lags(work, error);
    if (code == 0 && work->layout.clearance != NULL)
        code = make_clearance(work, error);
    return code;
}

/* ---- building -----------------------------------------------------------------------------------
 */

/* What an initiation does on one allele, but for a change of state. */
static int draft_initiation(const tarry_gene_work *work, uint32_t allele, tarry_draft *draft,
                            tarry_error *error) {
    const tarry_builder *builder = work->builder;
    const tarry_gene_layout *layout = &work->layout;
    const uint32_t track = builder->genes.items[work->gene].tracks.from + allele;
    int code = tarry_draft_mark(draft, track, TARRY_MARK_COUNT, error);
    if (code == 0 && work->own_lags) {
        code = tarry_draft_change(draft, tarry_layout_transcript(layout), 1, error);
        if (code == 0)
            code = tarry_draft_schedule(draft, work->first_lag + allele, error);
    } else if (code == 0 && layout->transcript != NULL) {
        code = tarry_draft_make(draft, builder, tarry_layout_transcript(layout), 1, error);
    }
    if (code != 0 || layout->clearance == NULL)
        return code;
    code = tarry_draft_change(draft, tarry_layout_ready(layout, allele), -1, error);
    if (code == 0)
        code = tarry_draft_schedule(draft, work->clearance + allele, error);
    return code;
}

/* What a change of state does to one allele. */
static int draft_move(const tarry_gene_work *work, uint32_t allele, const tarry_builder_move *move,
                      tarry_draft *draft, tarry_error *error) {
    const tarry_builder *builder = work->builder;
    const tarry_gene *gene = &builder->genes.items[work->gene];
    const tarry_promoter *promoter = &builder->promoters.items[gene->promoters.from + allele];
    const tarry_promoter_state *from = &builder->states.items[promoter->states.from + move->from];
    const tarry_promoter_state *to = &builder->states.items[promoter->states.from + move->to];
    int code = tarry_draft_change(draft, from->species, -1, error);
    if (code == 0)
        code = tarry_draft_change(draft, to->species, 1, error);
    if (code == 0 && from->sum != from->species)
        code = tarry_draft_change(draft, from->sum, -1, error);
    if (code == 0 && to->sum != to->species)
        code = tarry_draft_change(draft, to->sum, 1, error);
    if (code == 0 && from->active != to->active)
        code = tarry_draft_mark(draft, promoter->track,
                                to->active ? TARRY_MARK_OPEN : TARRY_MARK_CLOSE, error);
    if (code == 0 && to->lag != TARRY_NONE)
        code = tarry_draft_schedule(draft, (uint32_t)to->lag, error);
    return code;
}

static int build_rate(const tarry_gene_work *work, uint32_t allele, const tarry_builder_move *move,
                      tarry_error *error) {
    tarry_draft draft = {0};
    const char *name = tarry_arena_format(work->builder->arena, "%s.%s>%s", work->layout.name,
                                          work->states[move->from].name,
                                          work->states[move->to].name);
    const tarry_factor factors[] = {
        {.species = tarry_layout_state(&work->layout, allele, move->from), .used = 1},
        {.species = tarry_layout_ready(&work->layout, allele), .used = 1}};
    int code = 0;
    if (move->initiates)
        code = draft_initiation(work, allele, &draft, error);
    if (code == 0)
        code = draft_move(work, allele, move, &draft, error);
    if (code == 0)
        code = tarry_gene_reaction(work, name, factors, move->waits ? 2 : 1, move->formula,
                                   move->rate, (int32_t)allele, &draft, move->place, error);
    tarry_draft_release(&draft);
    return code;
}

/* The outcomes of the dwell in a state that lasts. */
static int build_outcomes(const tarry_gene_work *work, uint32_t allele, uint32_t index,
                          tarry_error *error) {
    tarry_builder *builder = work->builder;
    const tarry_range moves = work->states[index].moves;
    const tarry_promoter *promoter =
        &builder->promoters.items[builder->genes.items[work->gene].promoters.from + allele];
    tarry_lag *lag = &builder->lags.items[builder->states.items[promoter->states.from + index].lag];
    lag->outcomes.from = (uint32_t)builder->outcomes.n;
    double cumulative = 0;
    int code = 0;
    for (uint32_t i = moves.from; code == 0 && i < moves.to; i++) {
        const tarry_builder_move *move = &builder->moves.items[i];
        tarry_draft draft = {0};
        tarry_outcome outcome = {0};
        cumulative += move->share;
        outcome.cumulative = i + 1 == moves.to ? 1 : fmin(cumulative, 1);
        code = draft_move(work, allele, move, &draft, error);
        if (code == 0)
            code = tarry_builder_effect(builder, &draft, &outcome.effect, error);
        tarry_draft_release(&draft);
        if (code == 0 && TARRY_APPEND(&builder->outcomes, outcome) != 0)
            code = tarry_fail_memory(error, "a promoter");
    }
    lag->outcomes.to = (uint32_t)builder->outcomes.n;
    return code;
}

static int build_initiation(const tarry_gene_work *work, uint32_t allele, uint32_t index, bool only,
                            tarry_error *error) {
    const tarry_builder *builder = work->builder;
    const tarry_state_plan *state = &work->states[index];
    const char *name = only ? tarry_arena_format(builder->arena, "%s.initiation", work->layout.name)
                            : tarry_arena_format(builder->arena, "%s.initiation in %s",
                                                 work->layout.name, state->name);
    const tarry_factor factors[] = {
        {.species = tarry_layout_state(&work->layout, allele, index), .needed = 1},
        {.species = tarry_layout_ready(&work->layout, allele), .used = 1}};
    tarry_draft draft = {0};
    int code = draft_initiation(work, allele, &draft, error);
    if (code == 0)
        code = tarry_gene_reaction(work, name, factors, work->layout.clearance != NULL ? 2 : 1,
                                   state->formula, state->rate, (int32_t)allele, &draft,
                                   state->place, error);
    tarry_draft_release(&draft);
    return code;
}

static int build_state(const tarry_gene_work *work, uint32_t allele, uint32_t index, bool only,
                       tarry_error *error) {
    const tarry_state_plan *state = &work->states[index];
    int code = 0;
    if (state->lasts)
        code = build_outcomes(work, allele, index, error);
    for (uint32_t i = state->moves.from; code == 0 && !state->lasts && i < state->moves.to; i++) {
        const tarry_builder_move move = work->builder->moves.items[i];
        code = build_rate(work, allele, &move, error);
    }
    if (code == 0 && state->initiates)
        code = build_initiation(work, allele, index, only, error);
    return code;
}

int tarry_build_promoter(const tarry_gene_work *work, tarry_error *error) {
    uint32_t n_initiating = 0;
    for (uint32_t i = 0; i < work->layout.n_states; i++)
        n_initiating += work->states[i].initiates;
    int code = 0;
    for (uint32_t allele = 0; code == 0 && allele < work->layout.n_copies; allele++)
        for (uint32_t i = 0; code == 0 && i < work->layout.n_states; i++)
            code = build_state(work, allele, i, n_initiating == 1, error);
    return code;
}
