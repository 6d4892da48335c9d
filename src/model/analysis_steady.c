/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Means of products when the record begins, against the steady state: what analysis_flow.h reads
 * back from the network and analysis_deficit.c works out for each path, put together. */

#include "model/analysis.h"

#include "base/error.h"
#include "model/analysis_flow.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

/* ---- the promoter --------------------------------------------------------------------------- */

/* reach[i][k]: state k can be reached from i (Warshall's closure). */
static void find_reach(const tarry_flow *flow, bool *reach) {
    const size_t n = flow->n_states;
    for (size_t i = 0; i < n; i++)
        for (size_t k = 0; k < n; k++)
            reach[i * n + k] = i == k || flow->moves[i * n + k] > 0;
    for (size_t via = 0; via < n; via++)
        for (size_t i = 0; i < n; i++)
            for (size_t k = 0; k < n && reach[i * n + via]; k++)
                reach[i * n + k] = reach[i * n + k] || reach[via * n + k];
}

/* The states that are come back to for ever, where they all lead to one another: how many, else 0.
 */
static size_t find_closed(const tarry_flow *flow, const bool *reach, size_t *closed) {
    const size_t n = flow->n_states;
    size_t n_closed = 0;
    for (size_t i = 0; i < n; i++) {
        bool returns = true;
        for (size_t k = 0; k < n; k++)
            returns = returns && (!reach[i * n + k] || reach[k * n + i]);
        if (returns && n_closed > 0 && !reach[closed[0] * n + i])
            return 0;
        if (returns)
            closed[n_closed++] = i;
    }
    return n_closed;
}

/* Stationary law of an irreducible chain by elimination without subtraction (Grassmann, Taksar &
 * Heyman 1985, Oper. Res. 33:1107). Spoils the rates. */
static void solve_chain(double *q, size_t n, double *pi) {
    for (size_t k = n; k-- > 1;) {
        double out = 0;
        for (size_t j = 0; j < k; j++)
            out += q[k * n + j];
        for (size_t i = 0; i < k; i++) {
            q[i * n + k] /= out;
            for (size_t j = 0; j < k; j++)
                q[i * n + j] += i == j ? 0 : q[i * n + k] * q[k * n + j];
        }
    }
    double sum = pi[0] = 1;
    for (size_t k = 1; k < n; k++) {
        pi[k] = 0;
        for (size_t i = 0; i < k; i++)
            pi[k] += pi[i] * q[i * n + k];
        sum += pi[k];
    }
    for (size_t k = 0; k < n; k++)
        pi[k] /= sum;
}

/* Mean rate of initiation under the stationary law of the moves; NaN where there are several. */
static int solve_stationary(const tarry_flow *flow, double *rate, tarry_error *error) {
    const size_t n = flow->n_states;
    bool *reach = tarry_calloc(n, n * sizeof *reach);
    size_t *closed = tarry_calloc(n, sizeof *closed);
    double *q = tarry_calloc(n + 1, n * sizeof *q);
    const bool fine = reach && closed && q;
    if (fine) {
        find_reach(flow, reach);
        const size_t m = find_closed(flow, reach, closed);
        double *pi = q + n * n;
        *rate = m > 0 ? 0 : NAN;
        for (size_t i = 0; i < m; i++)
            for (size_t k = 0; k < m; k++)
                q[i * m + k] = flow->moves[closed[i] * n + closed[k]];
        if (m > 0)
            solve_chain(q, m, pi);
        for (size_t i = 0; i < m; i++)
            *rate += pi[i] * flow->initiation[closed[i]];
    }
    free(reach);
    free(closed);
    free(q);
    return fine ? 0 : tarry_fail_memory(error, "the steady law of a promoter");
}

/* Initiations an allele per unit of time in the steady state; *why where there is no one value. */
static int steady_rate(const tarry_flow *flow, double *rate, const char **why, tarry_error *error) {
    *rate = flow->dwell_initiation;
    for (size_t i = 0; i < flow->n_states && flow->steady; i++)
        *rate += flow->start[i] * flow->initiation[i];
    const int code = flow->steady ? 0 : solve_stationary(flow, rate, error);
    if (!code && isnan(*rate))
        *why = "its promoter can end up in different states for ever";
    else if (!code && !(*rate > 0))
        *why = "in the steady state it is never initiated";
    return code;
}

/* ---- one gene ------------------------------------------------------------------------------- */

static int measure_product(const tarry_flow *flow, const tarry_flow_product *product, double rate,
                           double t, tarry_distance *d, tarry_error *error) {
    double weight = 0, missing = 0;
    d->why = product->why;
    for (size_t i = 0; i < product->n_paths && !d->why; i++) {
        double deficit = 0;
        bool too_long = false;
        const int code = tarry_flow_deficit(flow, &product->paths[i], rate, t, &deficit, &too_long,
                                            error);
        if (code)
            return code;
        weight += product->paths[i].weight;
        missing += product->paths[i].weight * deficit;
        if (too_long)
            d->why = "it is made in too many steps";
    }
    if (!d->why && product->n_paths == 0)
        d->why = "nothing makes it";
    d->steady = d->why ? NAN : flow->n_copies * rate * weight;
    d->relative = d->why || !(weight > 0) ? NAN : -missing / weight;
    d->mean = weight > 0 ? d->steady * (1 + d->relative) : d->steady;
    return 0;
}

static int measure_gene(const tarry_flow *flow, double t, tarry_distance *items,
                        tarry_error *error) {
    double rate = 0;
    const char *why = flow->why;
    const int code = why ? 0 : steady_rate(flow, &rate, &why, error);
    if (code)
        return code;
    for (size_t i = 0; i < flow->n_products; i++) {
        items[i].species = flow->products[i].species;
        if (!why) {
            const int failed = measure_product(flow, &flow->products[i], rate, t, &items[i], error);
            if (failed)
                return failed;
            continue;
        }
        items[i].why = why;
        items[i].steady = items[i].mean = items[i].relative = NAN;
    }
    return 0;
}

/* ---- many genes ----------------------------------------------------------------------------- */

static bool same_doubles(const double *one, const double *other, size_t n) {
    for (size_t i = 0; i < n; i++)
        if (!(one[i] == other[i]))
            return false;
    return true;
}

static bool same_path(const tarry_flow_path *one, const tarry_flow_path *other) {
    if (one->n_steps != other->n_steps || one->weight != other->weight)
        return false;
    for (size_t i = 0; i < one->n_steps; i++) {
        const tarry_flow_step *a = &one->steps[i], *b = &other->steps[i];
        if (a->kind != b->kind || a->rate != b->rate ||
            (a->law != b->law && (!a->law || !b->law || !tarry_law_same(a->law, b->law))))
            return false;
    }
    return true;
}

static bool same_products(const tarry_flow *one, const tarry_flow *other) {
    for (size_t i = 0; i < one->n_products; i++) {
        const tarry_flow_product *a = &one->products[i], *b = &other->products[i];
        if (a->n_paths != b->n_paths || a->why || b->why)
            return false;
        for (size_t k = 0; k < a->n_paths; k++)
            if (!same_path(&a->paths[k], &b->paths[k]))
                return false;
    }
    return true;
}

/* Both genes have the same means. (Where a reason is given, it names the gene's own parts.) */
static bool same_flow(const tarry_flow *one, const tarry_flow *other) {
    const size_t n = one->n_states;
    return !one->why && !other->why && n == other->n_states && one->n_copies == other->n_copies &&
           one->steady == other->steady && one->dwell_initiation == other->dwell_initiation &&
           one->n_products == other->n_products && same_doubles(one->start, other->start, n) &&
           same_doubles(one->initiation, other->initiation, n) &&
           same_doubles(one->moves, other->moves, n * n) && same_products(one, other);
}

/* Work through the genes; like ones that follow each other share their figures. */
typedef struct walk {
    tarry_flow_index index;
    tarry_arena arena[2]; /* of this gene's flow and the last one's */
    tarry_flow flow[2];
    int now;
    size_t n_worked_out;
} walk;

static void walk_release(walk *w) {
    tarry_flow_index_release(&w->index);
    tarry_arena_release(&w->arena[0]);
    tarry_arena_release(&w->arena[1]);
}

/* Read the next gene's flow; *like: it has the means of the last one. */
static int walk_read(walk *w, uint32_t gene, bool first, bool *like, tarry_error *error) {
    w->now = 1 - w->now;
    tarry_arena_release(&w->arena[w->now]);
    const int code = tarry_flow_read(&w->index, gene, &w->arena[w->now], &w->flow[w->now], error);
    *like = !code && !first && same_flow(&w->flow[0], &w->flow[1]);
    return code;
}

/* Reasons are kept in the arena of the answer, those of a flow die with it. */
static int keep_reasons(tarry_distance *items, size_t n, tarry_arena *arena, tarry_error *error) {
    for (size_t i = 0; i < n; i++)
        if (items[i].why &&
            !(items[i].why = tarry_arena_text(arena, items[i].why, strlen(items[i].why))))
            return tarry_fail_memory(error, "the distances from the steady state");
    return 0;
}

static int walk_genes(walk *w, double t, tarry_arena *arena, tarry_distance *items,
                      tarry_distances *out, tarry_error *error) {
    const tarry_network *network = w->index.network;
    size_t last = 0;
    for (uint32_t g = 0; g < network->n_genes; g++) {
        const tarry_range promoters = network->genes[g].promoters;
        const size_t n = network->genes[g].products.to - network->genes[g].products.from;
        bool like = false;
        if (promoters.from == promoters.to)
            continue;
        int code = walk_read(w, g, w->n_worked_out == 0, &like, error);
        if (code)
            return code;
        if (!like && w->n_worked_out == TARRY_DISTANCES_MOST) {
            out->n_left_out++;
            w->now = 1 - w->now;
            continue;
        }
        tarry_distance *mine = items + out->n;
        for (size_t i = 0; i < n && like; i++) {
            mine[i] = items[last + i];
            mine[i].species = w->flow[w->now].products[i].species;
        }
        if (!like) {
            w->n_worked_out++;
            code = measure_gene(&w->flow[w->now], t, mine, error);
            if (!code)
                code = keep_reasons(mine, n, arena, error);
            if (code)
                return code;
        }
        for (size_t i = 0; i < n; i++)
            mine[i].gene = g;
        last = out->n;
        out->n += n;
    }
    return 0;
}

int tarry_analysis_distances(const tarry_network *network, double settle, tarry_arena *arena,
                             tarry_distances *distances, tarry_error *error) {
    walk w = {0};
    size_t n = 0;
    for (uint32_t g = 0; g < network->n_genes; g++)
        n += network->genes[g].products.to - network->genes[g].products.from;
    tarry_distance *items = tarry_arena_calloc(arena, n, sizeof *items);
    *distances = (tarry_distances){.items = items};
    int code = items ? tarry_flow_index_init(&w.index, network, error)
                     : tarry_fail_memory(error, "the distances from the steady state");
    if (!code)
        code = walk_genes(&w, settle, arena, items, distances, error);
    walk_release(&w);
    return code;
}

/* ---- the time to settle --------------------------------------------------------------------- */

/* The largest distance at a time after the start. */
static int largest_distance(const tarry_network *network, double t, double *largest,
                            size_t *n_unknown, tarry_error *error) {
    tarry_arena arena = {0};
    tarry_distances d;
    const int code = tarry_analysis_distances(network, t, &arena, &d, error);
    *largest = 0;
    *n_unknown = 0;
    for (size_t i = 0; i < d.n && !code; i++) {
        if (d.items[i].why)
            ++*n_unknown;
        else if (fabs(d.items[i].relative) > *largest)
            *largest = fabs(d.items[i].relative);
    }
    tarry_arena_release(&arena);
    return code;
}

int tarry_analysis_settle(const tarry_network *network, double tolerance, double *settle,
                          size_t *n_unknown, tarry_error *error) {
    enum { QUIET = 3, MOST_DOUBLINGS = 60 };
    double low = 0, high = 0, largest = 0;
    int quiet = 0, n = 0; /* times in a row that are near enough */
    int code = 0;
    for (double t = 0; quiet < QUIET && n < MOST_DOUBLINGS && !code; n++) {
        code = largest_distance(network, t, &largest, n_unknown, error);
        if (largest > tolerance) {
            low = t;
            quiet = 0;
        } else if (quiet++ == 0) {
            high = t;
        }
        t = t > 0 ? 2 * t : network->run.until / 64;
    }
    if (!code && quiet < QUIET)
        return tarry_fail(error, TARRY_NUMERIC,
                          "no time to settle was found: give one, as settle: 10 h");
    while (!code && high - low > 0.01 * high) {
        const double middle = (low + high) / 2;
        code = largest_distance(network, middle, &largest, n_unknown, error);
        if (largest > tolerance)
            low = middle;
        else
            high = middle;
    }
    *settle = high;
    return code;
}
