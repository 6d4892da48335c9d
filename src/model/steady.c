/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "model/steady.h"

/* The stationary law of a promoter. It is a semi-Markov process: from state i it goes to j with
 * probability p_ij after a mean dwell m_i. With the stationary law v of the embedded chain, v P =
 * v, the share of time in i is v_i m_i over the sum of all (Cinlar 1969, Adv. Appl. Prob. 1:123). A
 * state left at rates has p_ij = r_ij / R_i and m_i = 1 / R_i, R_i being the sum of its rates.
 *
 * The law is unique when exactly one class of states cannot be left; the others have weight 0. */

#include "base/error.h"
#include "base/memory.h"
#include "model/law.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

/* One gene's promoter as a graph. Arrays in `arena`, which lives for one gene. */
typedef struct promoter_graph {
    const tarry_steady_source *source;
    const tarry_gene *gene;
    const tarry_promoter_state *states; /* of the first allele */
    const tarry_builder_move *moves;    /* of this gene */
    size_t n_moves;
    uint32_t n;
    tarry_arena arena;
    double *chance; /* n * n: p_ij */
    double *dwell;  /* m_i; infinity where a state is never left */
    bool *reach;    /* n * n: j can be reached from i; i from itself always */
} promoter_graph;

static int fail_gene(const promoter_graph *graph, const char *why, tarry_error *error) {
    return tarry_fail_at(error, TARRY_INPUT, graph->gene->place,
                         "the gene '%s' cannot have 'start: steady': %s; name a state or give "
                         "weights, as start: {%s: 1}",
                         graph->gene->name, why, graph->states[0].name);
}

/* ---- the graph ----------------------------------------------------------------------------------
 */

/* Sums of rates and shares, row by row, then chances and mean dwells. */
static int fill_chances(promoter_graph *graph, tarry_error *error) {
    const tarry_segment *segment = &graph->source->segments[0];
    const uint32_t n = graph->n;
    for (size_t i = 0; i < graph->n_moves; i++) {
        const tarry_builder_move *move = &graph->moves[i];
        if (move->waits)
            return tarry_fail_at(error, TARRY_INPUT, move->place,
                                 "the gene '%s' cannot have 'start: steady', since this move waits "
                                 "for the clearance; name a state or give weights, as start: {%s: "
                                 "1}",
                                 graph->gene->name, graph->states[0].name);
        if (!move->timed && move->formula)
            return tarry_fail_at(error, TARRY_INPUT, move->place,
                                 "the gene '%s' cannot have 'start: steady', since this rate reads "
                                 "species; name a state or give weights, as start: {%s: 1}",
                                 graph->gene->name, graph->states[0].name);
        graph->chance[move->from * n + move->to] = move->timed ? move->share
                                                               : segment->rates[move->rate];
    }
    for (uint32_t i = 0; i < n; i++) {
        double sum = 0;
        for (uint32_t j = 0; j < n; j++)
            sum += graph->chance[i * n + j];
        const int32_t lag = graph->states[i].lag;
        graph->dwell[i] = 1 / sum;
        if (lag != TARRY_NONE)
            graph->dwell[i] = tarry_law_mean(&segment->laws[graph->source->lags[lag].delay]);
        for (uint32_t j = 0; sum > 0 && j < n; j++)
            graph->chance[i * n + j] /= sum;
    }
    return 0;
}

/* Which states can be reached from which (Warshall 1962, J. ACM 9:11). */
static void fill_reach(promoter_graph *graph) {
    const uint32_t n = graph->n;
    for (uint32_t i = 0; i < n; i++)
        for (uint32_t j = 0; j < n; j++)
            graph->reach[i * n + j] = i == j || graph->chance[i * n + j] > 0;
    for (uint32_t k = 0; k < n; k++)
        for (uint32_t i = 0; i < n; i++)
            for (uint32_t j = 0; graph->reach[i * n + k] && j < n; j++)
                graph->reach[i * n + j] = graph->reach[i * n + j] || graph->reach[k * n + j];
}

/* A state is closed when each state that it reaches can come back. All closed states must be of one
 * class; they are put into `members`. */
static int find_class(const promoter_graph *graph, uint32_t *members, uint32_t *n_members,
                      tarry_error *error) {
    const uint32_t n = graph->n;
    *n_members = 0;
    for (uint32_t i = 0; i < n; i++) {
        bool closed = true;
        for (uint32_t j = 0; j < n; j++)
            closed = closed && (!graph->reach[i * n + j] || graph->reach[j * n + i]);
        if (!closed)
            continue;
        if (*n_members > 0 && !graph->reach[i * n + members[0]])
            return fail_gene(graph,
                             "its promoter ends in one of several parts that cannot be left, and "
                             "which one depends on the state at the start",
                             error);
        members[(*n_members)++] = i;
    }
    return 0;
}

/* ---- the stationary law -------------------------------------------------------------------------
 */

/* The stationary law v of the chances p between n states, each of which reaches every other; p is
 * overwritten. States go out one by one, the last first, their moves handed on to those that are
 * left (Grassmann, Taksar & Heyman 1985, Oper. Res. 33:1107): nothing is ever subtracted, so that
 * small shares keep all their digits. */
static void eliminate(double *p, uint32_t n, double *v) {
    for (uint32_t k = n - 1; k > 0; k--) {
        double out = 0;
        for (uint32_t j = 0; j < k; j++)
            out += p[k * n + j];
        for (uint32_t i = 0; i < k; i++) {
            p[i * n + k] /= out;
            for (uint32_t j = 0; j < k; j++)
                p[i * n + j] += p[i * n + k] * p[k * n + j];
        }
    }
    double sum = v[0] = 1;
    for (uint32_t k = 1; k < n; k++) {
        v[k] = 0;
        for (uint32_t i = 0; i < k; i++)
            v[k] += v[i] * p[i * n + k];
        sum += v[k];
    }
    for (uint32_t k = 0; k < n; k++)
        v[k] /= sum;
}

static int embedded_law(promoter_graph *graph, const uint32_t *members, uint32_t n_members,
                        double *out, tarry_error *error) {
    double *p = tarry_arena_calloc(&graph->arena, (size_t)n_members * n_members, sizeof *p);
    if (p == NULL)
        return tarry_fail_memory(error, "the steady state of a promoter");
    for (uint32_t i = 0; i < n_members; i++)
        for (uint32_t j = 0; j < n_members; j++)
            p[i * n_members + j] = graph->chance[members[i] * graph->n + members[j]];
    eliminate(p, n_members, out);
    for (uint32_t i = 0; i < n_members; i++)
        if (!isfinite(out[i]))
            return tarry_fail_at(error, TARRY_NUMERIC, graph->gene->place,
                                 "the steady state of the promoter of '%s' could not be worked "
                                 "out; name a state under 'start'",
                                 graph->gene->name);
    return 0;
}

/* Shares of time into `weights`, which are all 0 before. */
static int steady_weights(promoter_graph *graph, double *weights, tarry_error *error) {
    uint32_t *members = tarry_arena_calloc(&graph->arena, graph->n, sizeof *members);
    double *v = tarry_arena_calloc(&graph->arena, graph->n, sizeof *v);
    uint32_t n_members = 0;
    if (members == NULL || v == NULL)
        return tarry_fail_memory(error, "the steady state of a promoter");
    int code = find_class(graph, members, &n_members, error);
    if (code != 0)
        return code;
    if (n_members == 1) { /* never left */
        weights[members[0]] = 1;
        return 0;
    }
    code = embedded_law(graph, members, n_members, v, error);
    double sum = 0;
    for (uint32_t i = 0; code == 0 && i < n_members; i++) {
        weights[members[i]] = v[i] * graph->dwell[members[i]];
        sum += weights[members[i]];
    }
    if (code == 0 && !(sum > 0 && isfinite(sum)))
        return fail_gene(graph, "its mean times in the states are too short or too long", error);
    return code;
}

/* ---- states without length ----------------------------------------------------------------------
 */

/* Does state `i` take no time at all in this segment? */
static bool takes_no_time(const promoter_graph *graph, const tarry_segment *segment, uint32_t i) {
    const int32_t lag = graph->states[i].lag;
    return lag != TARRY_NONE &&
           !(tarry_law_most(&segment->laws[graph->source->lags[lag].delay]) > 0);
}

/* Walk from state to state without time passing; 1: on the path, 2: done. */
static bool finds_cycle(const promoter_graph *graph, const bool *instant, char *mark, uint32_t i) {
    mark[i] = 1;
    for (size_t k = 0; k < graph->n_moves; k++) {
        const tarry_builder_move *move = &graph->moves[k];
        if (move->from != i || !(move->share > 0) || !instant[move->to])
            continue;
        if (mark[move->to] == 1 ||
            (mark[move->to] == 0 && finds_cycle(graph, instant, mark, move->to)))
            return true;
    }
    mark[i] = 2;
    return false;
}

static int check_cycles(promoter_graph *graph, const tarry_segment *segment, tarry_error *error) {
    bool *instant = tarry_arena_calloc(&graph->arena, graph->n, sizeof *instant);
    char *mark = tarry_arena_calloc(&graph->arena, graph->n, 1);
    if (instant == NULL || mark == NULL)
        return tarry_fail_memory(error, "a promoter");
    for (uint32_t i = 0; i < graph->n; i++)
        instant[i] = takes_no_time(graph, segment, i);
    for (uint32_t i = 0; i < graph->n; i++)
        if (instant[i] && mark[i] == 0 && finds_cycle(graph, instant, mark, i))
            return tarry_fail_at(error, TARRY_INPUT, graph->gene->place,
                                 "the promoter of '%s' goes round from state to state, '%s' among "
                                 "them, in no time; give one of them a length above 0",
                                 graph->gene->name, graph->states[i].name);
    return 0;
}

/* ---- all genes ----------------------------------------------------------------------------------
 */

static int set_start(promoter_graph *graph, tarry_error *error) {
    double *weights = tarry_arena_calloc(graph->source->arena, graph->n, sizeof *weights);
    graph->chance = tarry_arena_calloc(&graph->arena, (size_t)graph->n * graph->n, sizeof(double));
    graph->dwell = tarry_arena_calloc(&graph->arena, graph->n, sizeof(double));
    graph->reach = tarry_arena_calloc(&graph->arena, (size_t)graph->n * graph->n, sizeof(bool));
    if (weights == NULL || graph->chance == NULL || graph->dwell == NULL || graph->reach == NULL)
        return tarry_fail_memory(error, "the steady state of a promoter");
    int code = fill_chances(graph, error);
    if (code != 0)
        return code;
    fill_reach(graph);
    code = steady_weights(graph, weights, error);
    if (code != 0)
        return code;
    tarry_cumulate(weights, graph->n);
    const tarry_range promoters = graph->gene->promoters;
    for (uint32_t i = promoters.from; i < promoters.to; i++)
        graph->source->promoters[i].start = weights;
    return 0;
}

static int finish_gene(promoter_graph *graph, tarry_error *error) {
    const tarry_steady_source *source = graph->source;
    const tarry_promoter *promoter = &source->promoters[graph->gene->promoters.from];
    graph->n = promoter->states.to - promoter->states.from;
    graph->states = &source->states[promoter->states.from];
    int code = 0;
    bool lasts = false;
    for (uint32_t i = 0; i < graph->n; i++)
        lasts = lasts || graph->states[i].lag != TARRY_NONE;
    for (size_t i = 0; code == 0 && lasts && i < source->n_segments; i++)
        code = check_cycles(graph, &source->segments[i], error);
    if (code == 0 && promoter->steady)
        code = set_start(graph, error);
    return code;
}

int tarry_steady_starts(const tarry_steady_source *source, tarry_error *error) {
    size_t move = 0;
    int code = 0;
    for (uint32_t i = 0; code == 0 && i < source->n_genes; i++) {
        promoter_graph graph = {.source = source, .gene = &source->genes[i]};
        if (graph.gene->promoters.from == graph.gene->promoters.to)
            continue;
        const size_t first = move;
        while (move < source->n_moves && source->moves[move].gene == i)
            move++;
        graph.n_moves = move - first;
        graph.moves = move > first ? &source->moves[first] : NULL;
        code = finish_gene(&graph, error);
        tarry_arena_release(&graph.arena);
    }
    return code;
}
