/* How far means are from steady a time t after the start.
 *
 * A molecule counted at t was initiated a time X earlier, X being the sum of the independent steps
 * of its path (analysis_flow.h): whole lags on the way, and the age within the lag or the lifetime
 * it is met in. With lambda(s) the rate of initiation a time s after the start, and none before it,
 *
 *     mean(t) = weight E[lambda(t - X)],     1 - mean(t)/steady = E[h(t - X)],
 *     h(s) = 1 - lambda(s)/lambda(steady) for s >= 0, 1 for s < 0.
 *
 * Steps are taken in any order. Fixed lags shift t. Exponential and Erlang steps join the moves of
 * the promoter in one linear system v' = A v: u' = d (input - u), u(0) = 1, for each stage of rate
 * d; so w(s) = E[h(s - steps so far)] is a row times exp(A s) v(0), exact. What is left is put on a
 * grid, each bin's mass shared between its ends so that its mean is kept, convolved, and w averaged
 * over it: an error of the order of (width of a bin/width of w)^2, some 1e-6. */

#include "model/analysis.h"

#include "base/error.h"
#include "model/analysis_flow.h"

#include <gsl/gsl_blas.h>
#include <gsl/gsl_linalg.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

enum {
    GRID = 1024,
    MOST_STAGES = 24, /* an Erlang step with more goes onto the grid */
    MOST_STEPS = 128, /* parts of totals included */
};

static const double tail = 1e-12; /* of a law that the grid may miss */

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

/* ---- a path, sorted by how its steps are treated -------------------------------------------- */

typedef struct sorted {
    double shift;
    size_t n_stages;
    double stage_rates[MOST_STEPS];
    bool
        stage_averages[MOST_STEPS]; /* the last of an Erlang step met within: its stages' average */
    size_t stage_spans[MOST_STEPS]; /* how many stages that step has */
    size_t n_grid;
    tarry_flow_step grid[MOST_STEPS];
    bool full;
} sorted;

static void add_stage(sorted *s, double rate) {
    if (s->n_stages == MOST_STEPS) {
        s->full = true;
        return;
    }
    s->stage_rates[s->n_stages] = rate;
    s->stage_averages[s->n_stages] = false;
    s->stage_spans[s->n_stages++] = 1;
}

static void add_erlang(sorted *s, const tarry_law *law, bool whole) {
    const size_t n = (size_t)law->b;
    if (s->n_stages + n > MOST_STEPS) {
        s->full = true;
        return;
    }
    for (size_t i = 0; i < n; i++)
        add_stage(s, law->b / law->a);
    s->stage_averages[s->n_stages - 1] = !whole;
    s->stage_spans[s->n_stages - 1] = n;
}

static void sort_law(sorted *s, const tarry_law *law, tarry_flow_kind kind) {
    const bool whole = kind == TARRY_FLOW_WHOLE;
    if (tarry_law_mean(law) <= 0)
        return;
    if (law->kind == TARRY_LAW_FIXED && whole)
        s->shift += law->a;
    else if (law->kind == TARRY_LAW_EXPONENTIAL)
        add_stage(s, 1 / law->a);
    else if (law->kind == TARRY_LAW_ERLANG && law->b <= MOST_STAGES)
        add_erlang(s, law, whole);
    else if (law->kind == TARRY_LAW_TOTAL && whole)
        for (size_t i = 0; i < law->n; i++)
            sort_law(s, &law->parts[i], kind);
    else if (s->n_grid < MOST_STEPS)
        s->grid[s->n_grid++] = (tarry_flow_step){kind, law, 0};
    else
        s->full = true;
}

static void sort_path(const tarry_flow_path *path, sorted *s) {
    s->shift = 0;
    s->n_stages = s->n_grid = 0;
    s->full = false;
    for (size_t i = 0; i < path->n_steps; i++) {
        const tarry_flow_step *step = &path->steps[i];
        if (step->kind == TARRY_FLOW_DECAY)
            add_stage(s, step->rate);
        else
            sort_law(s, step->law, step->kind);
    }
}

/* ---- promoter and stages as one linear system ----------------------------------------------- */

/* v' = a v; w(s) = row . v(s). */
typedef struct chain {
    size_t n;
    gsl_matrix *a, *scaled, *exponential;
    gsl_vector *v, *next, *row;
} chain;

static void chain_release(chain *c) {
    gsl_matrix_free(c->a);
    gsl_matrix_free(c->scaled);
    gsl_matrix_free(c->exponential);
    gsl_vector_free(c->v);
    gsl_vector_free(c->next);
    gsl_vector_free(c->row);
}

/* The promoter, where it is not steady: v begins with the chances of its states. */
static void chain_add_promoter(chain *c, const tarry_flow *flow, double rate) {
    for (size_t i = 0; i < flow->n_states; i++) {
        for (size_t k = 0; k < flow->n_states; k++) {
            *gsl_matrix_ptr(c->a, k, i) += flow->moves[i * flow->n_states + k];
            *gsl_matrix_ptr(c->a, i, i) -= flow->moves[i * flow->n_states + k];
        }
        gsl_vector_set(c->v, i, flow->start[i]);
        gsl_vector_set(c->row, i, 1 - flow->initiation[i] / rate);
    }
}

static int chain_init(chain *c, const tarry_flow *flow, const sorted *s, double rate) {
    const size_t n_states = flow->steady ? 0 : flow->n_states;
    c->n = n_states + s->n_stages;
    if (c->n == 0)
        return 0;
    c->a = gsl_matrix_calloc(c->n, c->n);
    c->scaled = gsl_matrix_calloc(c->n, c->n);
    c->exponential = gsl_matrix_calloc(c->n, c->n);
    c->v = gsl_vector_calloc(c->n);
    c->next = gsl_vector_calloc(c->n);
    c->row = gsl_vector_calloc(c->n);
    if (!c->a || !c->scaled || !c->exponential || !c->v || !c->next || !c->row)
        return 1;
    if (n_states > 0)
        chain_add_promoter(c, flow, rate);
    for (size_t i = 0; i < s->n_stages; i++) {
        const size_t at = n_states + i;
        for (size_t k = 0; k < at; k++)
            gsl_matrix_set(c->a, at, k, s->stage_rates[i] * gsl_vector_get(c->row, k));
        gsl_matrix_set(c->a, at, at, -s->stage_rates[i]);
        gsl_vector_set(c->v, at, 1);
        gsl_vector_set_zero(c->row);
        const size_t span = s->stage_averages[i] ? s->stage_spans[i] : 1;
        for (size_t k = 0; k < span; k++)
            gsl_vector_set(c->row, at - k, 1 / (double)span);
    }
    return 0;
}

/* exp(a time) into `exponential`. */
static int chain_exponential(chain *c, double time) {
    if (c->n == 0)
        return 0;
    gsl_matrix_memcpy(c->scaled, c->a);
    gsl_matrix_scale(c->scaled, time);
    return gsl_linalg_exponential_ss(c->scaled, c->exponential, GSL_MODE_DEFAULT);
}

static int chain_step(chain *c) {
    if (c->n == 0)
        return 0;
    const int status = gsl_blas_dgemv(CblasNoTrans, 1, c->exponential, c->v, 0, c->next);
    gsl_vector_memcpy(c->v, c->next);
    return status;
}

static double chain_value(const chain *c) {
    double value = 0;
    for (size_t i = 0; i < c->n; i++)
        value += gsl_vector_get(c->row, i) * gsl_vector_get(c->v, i);
    return value;
}

/* ---- steps on a grid ------------------------------------------------------------------------ */

/* The length beyond which the step has next to no mass. */
static double step_most(const tarry_flow_step *step) {
    const double most = tarry_law_most(step->law);
    double x = isfinite(most) ? most : tarry_law_quantile(step->law, 1 - tail, tail);
    const double mean = tarry_law_mean(step->law);
    while (step->kind == TARRY_FLOW_REMAINING && x < most && x < 1e6 * mean &&
           mean - tarry_law_survival_integral(step->law, x) > tail * mean)
        x *= 1.25;
    return fmin(x, most);
}

/* Masses of the step at 0, h, ..., GRID h: each bin's mass is put onto its ends so that its mean is
 * kept. Within a bin the survival of a lag that is met is taken as straight. */
static void step_masses(const tarry_flow_step *step, double h, double *mass) {
    const bool whole = step->kind == TARRY_FLOW_WHOLE;
    const double mean = tarry_law_mean(step->law);
    double survival = tarry_law_survival(step->law, 0);
    double integral = 0;
    memset(mass, 0, (GRID + 2) * sizeof *mass);
    mass[0] = whole ? 1 - survival : 0;
    for (size_t k = 0; k <= GRID; k++) {
        const double x = (double)(k + 1) * h;
        const double survival_after = tarry_law_survival(step->law, x);
        const double integral_after = tarry_law_survival_integral(step->law, x);
        const double area = (integral_after - integral) / h;
        const double drop = survival - survival_after;
        const double bin = whole ? drop : area * h / mean;
        const double moment = whole ? area - survival_after : (area / 2 - drop / 12) * h / mean;
        mass[k] += bin - moment;
        mass[k + 1] += moment;
        survival = survival_after;
        integral = integral_after;
    }
}

static void convolve(const double *one, const double *other, double *out) {
    for (size_t k = 0; k <= GRID; k++) {
        double sum = 0;
        for (size_t j = 0; j <= k; j++)
            sum += one[j] * other[k - j];
        out[k] = sum;
    }
}

/* Masses of all grid steps together; `room` holds 3 (GRID + 2). Returns the array with the result.
 */
static const double *grid_masses(const sorted *s, double h, double *room) {
    double *all = room, *one = room + (GRID + 2), *next = room + 2 * (GRID + 2);
    step_masses(&s->grid[0], h, all);
    for (size_t i = 1; i < s->n_grid; i++) {
        step_masses(&s->grid[i], h, one);
        convolve(all, one, next);
        double *swap = all;
        all = next;
        next = swap;
    }
    return all;
}

/* E[w(t - grid steps)]. */
static int average_over_grid(chain *c, const sorted *s, double t, double *room, double *out) {
    double most = 0;
    for (size_t i = 0; i < s->n_grid; i++)
        most += step_most(&s->grid[i]);
    const bool whole = most >= t;
    const double h = (whole ? t : most) / GRID;
    const double *mass = grid_masses(s, h, room);
    int status = chain_exponential(c, whole ? 0 : t - most);
    if (!status)
        status = chain_step(c);
    if (!status)
        status = chain_exponential(c, h);
    double sum = 0, total = 0;
    for (size_t k = GRID + 1; k-- > 0 && !status;) {
        const double w = chain_value(c);
        /* at the start itself w jumps from 1 */
        sum += mass[k] * (whole && k == GRID ? (1 + w) / 2 : w);
        total += mass[k];
        status = chain_step(c);
    }
    *out = sum + fmax(0, 1 - total);
    return status;
}

/* ---- from paths to means -------------------------------------------------------------------- */

/* 1 - mean/steady of the molecules that come by this path. */
static int path_deficit(const tarry_flow *flow, const tarry_flow_path *path, double rate, double t,
                        double *deficit, bool *too_long, tarry_error *error) {
    sorted *s = tarry_calloc(1, sizeof *s);
    double *room = tarry_calloc(3, (GRID + 2) * sizeof *room);
    chain c = {0};
    int status = 0;
    *deficit = 1;
    int code = s && room ? 0 : tarry_fail_memory(error, "the steps to a mean");
    if (!code) {
        sort_path(path, s);
        t -= s->shift;
        *too_long = s->full;
        if (chain_init(&c, flow, s, rate))
            code = tarry_fail_memory(error, "the steps to a mean");
    }
    if (!code && t >= 0 && !s->full) {
        if (s->n_grid > 0 && t > 0) {
            status = average_over_grid(&c, s, t, room, deficit);
        } else if (s->n_grid == 0) {
            status = chain_exponential(&c, t);
            status = status ? status : chain_step(&c);
            *deficit = chain_value(&c);
        }
    }
    chain_release(&c);
    free(room);
    free(s);
    if (!code && (status || !isfinite(*deficit)))
        code = tarry_fail(error, TARRY_NUMERIC, "the mean at the start of the record failed");
    return code;
}

static int measure_product(const tarry_flow *flow, const tarry_flow_product *product, double rate,
                           double t, tarry_distance *d, tarry_error *error) {
    double weight = 0, missing = 0;
    d->why = product->why;
    for (size_t i = 0; i < product->n_paths && !d->why; i++) {
        double deficit = 0;
        bool too_long = false;
        const int code = path_deficit(flow, &product->paths[i], rate, t, &deficit, &too_long,
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
