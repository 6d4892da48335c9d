/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Drawing lags by inversion.
 *
 * A drawer is a law made ready: the kind of formula and its numbers side by side. Whatever takes a
 * library's special functions is done at set-up, into tables that laws of the same shape share:
 * gamma and Erlang laws in units of their scale, lognormal laws of their median, normal laws of
 * their sd. The order of operations is fixed, so a number gives the same lag in every build. */

#include "engine/draw.h"

#include "base/error.h"
#include "engine/quantile_table.h"

#include <gsl/gsl_math.h>
#include <math.h>
#include <stdbool.h>
#include <stdlib.h>

typedef enum formula {
    FIXED,       /* a */
    EXPONENTIAL, /* -log u * a */
    UNIFORM,     /* a + u * b */
    WEIBULL,     /* (-log u)^b * a */
    QUANTILES,   /* table at u * a */
    SOLVED,      /* quantile of `standard` at u * a */
    BINS,        /* within a row, found through the guide */
    VALUES,      /* a row */
    MIX,
    TOTAL,
} formula;

/* One bin or value: all u below `cumulative` that are not below the row before. */
typedef struct row {
    double cumulative;
    double below; /* cumulative of the row before */
    double from;
    double slope; /* bins: width over share */
} row;

struct tarry_drawer {
    formula formula;
    uint32_t log2_intervals; /* QUANTILES */
    double a, b;
    const tarry_cubic *cubics; /* QUANTILES */
    const row *rows;           /* BINS, VALUES; MIX: `cumulative` only */
    const uint32_t *guide;     /* BINS, VALUES: the first row for each 1/n_guide of u */
    double n_guide;            /* a power of two */
    uint32_t n_parts;          /* MIX, TOTAL */
    const struct tarry_drawer *parts;
    const double *met;         /* MIX, TOTAL: cumulative chances that a part is the one met */
    const tarry_law *law;      /* for what is left of a lag */
    const tarry_law *standard; /* SOLVED */
};

typedef struct shared_table {
    tarry_law_kind kind; /* GAMMA, LOGNORMAL or NORMAL */
    double shape;
    tarry_quantile_table table;
} shared_table;

struct tarry_drawer_set {
    tarry_arena arena;
    const tarry_drawer_set *lender; /* of tables, or NULL */
    shared_table *tables;
    size_t n_tables;
    size_t tables_capacity;
};

/* Shapes closer than this, as a share, give lags closer than a table is exact. */
static const double same_shape = 1e-12;

/* ---- making ---- */

int tarry_drawer_set_new(tarry_drawer_set **set, tarry_error *error) {
    *set = tarry_calloc(1, sizeof **set);
    return *set ? TARRY_OK : tarry_fail_memory(error, "the drawing of lags");
}

int tarry_drawer_set_new_from(const tarry_drawer_set *lender, tarry_drawer_set **set,
                              tarry_error *error) {
    const int code = tarry_drawer_set_new(set, error);
    if (code == TARRY_OK)
        (*set)->lender = lender;
    return code;
}

void tarry_drawer_set_clear(tarry_drawer_set *set) {
    tarry_arena_release(&set->arena);
}

void tarry_drawer_set_free(tarry_drawer_set *set) {
    if (!set)
        return;
    for (size_t i = 0; i < set->n_tables; i++)
        tarry_quantile_table_release(&set->tables[i].table);
    free(set->tables);
    tarry_arena_release(&set->arena);
    free(set);
}

size_t tarry_drawer_set_bytes(const tarry_drawer_set *set) {
    size_t bytes = set->arena.used;
    for (size_t i = 0; i < set->n_tables; i++)
        bytes += tarry_quantile_table_bytes(&set->tables[i].table);
    return bytes;
}

static void use_table(const shared_table *shared, tarry_drawer *drawer) {
    drawer->formula = QUANTILES;
    drawer->cubics = shared->table.cubics;
    drawer->log2_intervals = shared->table.log2_intervals;
}

/* A table of another set where the shape is there up to rounding, else the law itself. */
static int borrow_table(tarry_drawer_set *set, tarry_law_kind kind, double shape,
                        const tarry_law *law, tarry_drawer *drawer, tarry_error *error) {
    const tarry_drawer_set *lender = set->lender;
    for (size_t i = 0; i < lender->n_tables; i++)
        if (lender->tables[i].kind == kind &&
            fabs(lender->tables[i].shape - shape) <= same_shape * shape) {
            use_table(&lender->tables[i], drawer);
            return TARRY_OK;
        }
    tarry_law *standard = tarry_arena_calloc(&set->arena, 1, sizeof *standard);
    if (!standard)
        return tarry_fail_memory(error, "the drawing of a lag");
    *standard = *law;
    drawer->formula = SOLVED;
    drawer->standard = standard;
    return TARRY_OK;
}

/* The table of `law`, which is the one of its shape in standard units; made where it is new. */
static int share_table(tarry_drawer_set *set, tarry_law_kind kind, double shape,
                       const tarry_law *law, tarry_drawer *drawer, tarry_error *error) {
    size_t i = 0;
    if (set->lender)
        return borrow_table(set, kind, shape, law, drawer, error);
    while (i < set->n_tables && !(set->tables[i].kind == kind && set->tables[i].shape == shape))
        i++;
    if (i == set->n_tables) {
        if (tarry_grow((void **)&set->tables, &set->tables_capacity, i + 1, sizeof *set->tables))
            return tarry_fail_memory(error, "the list of quantile tables");
        set->tables[i] = (shared_table){.kind = kind, .shape = shape};
        const int code = tarry_quantile_table_init(&set->tables[i].table, law, error);
        if (code)
            return code;
        set->n_tables++;
    }
    use_table(&set->tables[i], drawer);
    return TARRY_OK;
}

static int make_gamma(tarry_drawer_set *set, const tarry_law *law, tarry_drawer *drawer,
                      tarry_error *error) {
    const double ratio = law->a / law->b;
    const double shape = law->kind == TARRY_LAW_ERLANG ? law->b : ratio * ratio;
    const tarry_law standard = {.kind = TARRY_LAW_ERLANG, .a = shape, .b = shape};
    drawer->a = law->a / shape;
    return share_table(set, TARRY_LAW_GAMMA, shape, &standard, drawer, error);
}

static int make_lognormal(tarry_drawer_set *set, const tarry_law *law, tarry_drawer *drawer,
                          tarry_error *error) {
    const double ratio = law->b / law->a;
    const double mean = sqrt(1 + ratio * ratio); /* of the law whose median is 1 */
    const tarry_law standard = {.kind = TARRY_LAW_LOGNORMAL, .a = mean, .b = ratio * mean};
    drawer->a = law->a / mean;
    return share_table(set, TARRY_LAW_LOGNORMAL, ratio, &standard, drawer, error);
}

static int make_normal(tarry_drawer_set *set, const tarry_law *law, tarry_drawer *drawer,
                       tarry_error *error) {
    const double ratio = law->a / law->b;
    const tarry_law standard = {.kind = TARRY_LAW_NORMAL, .a = ratio, .b = 1};
    drawer->a = law->b;
    return share_table(set, TARRY_LAW_NORMAL, ratio, &standard, drawer, error);
}

/* Rows of bins or values with a share above 0. */
static int make_rows(tarry_drawer_set *set, const tarry_law *law, tarry_drawer *drawer,
                     tarry_error *error) {
    row *rows = tarry_arena_calloc(&set->arena, law->n, sizeof *rows);
    uint32_t n = 0, n_guide = 1;
    double sum = 0;
    if (!rows)
        return tarry_fail_memory(error, "a table of lags");
    for (size_t i = 0; i < law->n; i++) {
        if (law->weights[i] <= 0)
            continue;
        rows[n] = (row){.below = sum, .from = law->points[i]};
        sum += law->weights[i];
        rows[n].cumulative = sum;
        if (law->kind == TARRY_LAW_BINS)
            rows[n].slope = (law->points[i + 1] - law->points[i]) / law->weights[i];
        n++;
    }
    rows[n - 1].cumulative = 1;
    while (n_guide < 2 * n)
        n_guide *= 2;
    uint32_t *guide = tarry_arena_calloc(&set->arena, n_guide, sizeof *guide);
    if (!guide)
        return tarry_fail_memory(error, "a table of lags");
    for (uint32_t g = 0, i = 0; g < n_guide; g++) {
        while (rows[i].cumulative <= (double)g / n_guide)
            i++;
        guide[g] = i;
    }
    drawer->formula = law->kind == TARRY_LAW_BINS ? BINS : VALUES;
    if (n == 1 && law->kind == TARRY_LAW_VALUES) {
        drawer->formula = FIXED;
        drawer->a = rows[0].from;
    }
    drawer->rows = rows;
    drawer->guide = guide;
    drawer->n_guide = n_guide;
    return TARRY_OK;
}

static int make(tarry_drawer_set *set, const tarry_law *law, tarry_drawer *drawer,
                tarry_error *error);

/* Of a lag met at a random moment: long parts are met more often. */
static void list_met(const tarry_law *law, double *met) {
    double sum = 0;
    for (size_t i = 0; i < law->n; i++) {
        const double share = law->kind == TARRY_LAW_MIX ? law->weights[i] : 1;
        sum += share * tarry_law_mean(&law->parts[i]);
        met[i] = sum;
    }
    for (size_t i = 0; i < law->n; i++)
        met[i] = i + 1 < law->n ? met[i] / sum : 1;
}

static int make_parts(tarry_drawer_set *set, const tarry_law *law, tarry_drawer *drawer,
                      tarry_error *error) {
    tarry_drawer *parts = tarry_arena_calloc(&set->arena, law->n, sizeof *parts);
    row *rows = tarry_arena_calloc(&set->arena, law->n, sizeof *rows);
    double *met = tarry_arena_calloc(&set->arena, law->n, sizeof *met);
    bool all_fixed = true;
    double length = 0, sum = 0;
    if (!parts || !rows || !met)
        return tarry_fail_memory(error, "the parts of a lag");
    for (size_t i = 0; i < law->n; i++) {
        const int code = make(set, &law->parts[i], &parts[i], error);
        if (code)
            return code;
        all_fixed = all_fixed && parts[i].formula == FIXED;
        length += parts[i].a;
        sum += law->kind == TARRY_LAW_MIX ? law->weights[i] : 0;
        rows[i].cumulative = i + 1 < law->n ? sum : 1;
    }
    drawer->formula = law->kind == TARRY_LAW_MIX ? MIX : TOTAL;
    if (drawer->formula == TOTAL && all_fixed) {
        drawer->formula = FIXED;
        drawer->a = length;
    }
    drawer->n_parts = (uint32_t)law->n;
    list_met(law, met);
    drawer->parts = parts;
    drawer->met = met;
    drawer->rows = rows;
    return TARRY_OK;
}

static int make(tarry_drawer_set *set, const tarry_law *law, tarry_drawer *drawer,
                tarry_error *error) {
    drawer->a = law->a;
    drawer->law = law;
    switch (law->kind) {
    case TARRY_LAW_FIXED:
        drawer->formula = FIXED;
        return TARRY_OK;
    case TARRY_LAW_EXPONENTIAL:
        drawer->formula = EXPONENTIAL;
        return TARRY_OK;
    case TARRY_LAW_UNIFORM:
        drawer->formula = UNIFORM;
        drawer->b = law->b - law->a;
        return TARRY_OK;
    case TARRY_LAW_WEIBULL:
        drawer->formula = WEIBULL;
        drawer->b = 1 / law->b;
        return TARRY_OK;
    case TARRY_LAW_ERLANG:
    case TARRY_LAW_GAMMA:
        return make_gamma(set, law, drawer, error);
    case TARRY_LAW_LOGNORMAL:
        return make_lognormal(set, law, drawer, error);
    case TARRY_LAW_NORMAL:
        return make_normal(set, law, drawer, error);
    case TARRY_LAW_BINS:
    case TARRY_LAW_VALUES:
        return make_rows(set, law, drawer, error);
    case TARRY_LAW_MIX:
    case TARRY_LAW_TOTAL:
        return make_parts(set, law, drawer, error);
    case TARRY_N_LAWS:
        break;
    }
    return tarry_fail(error, TARRY_NUMERIC, "a lag of this kind cannot be drawn");
}

int tarry_drawer_set_add(tarry_drawer_set *set, const tarry_law *law, const tarry_drawer **drawer,
                         tarry_error *error) {
    tarry_drawer *made = tarry_arena_calloc(&set->arena, 1, sizeof *made);
    if (!made)
        return tarry_fail_memory(error, "the drawing of a lag");
    *drawer = made;
    return make(set, law, made, error);
}

double tarry_drawer_fixed(const tarry_drawer *drawer) {
    return drawer->formula == FIXED ? drawer->a : -1;
}

/* ---- drawing ---- */

static const row *find_row(const tarry_drawer *drawer, double u) {
    const row *found = drawer->rows + drawer->guide[(uint32_t)(u * drawer->n_guide)];
    while (u >= found->cumulative)
        found++;
    return found;
}

double tarry_draw_at(const tarry_drawer *drawer, uint64_t bits) {
    const double u = tarry_unit(bits);
    switch (drawer->formula) {
    case EXPONENTIAL:
        return -tarry_log(u) * drawer->a;
    case UNIFORM:
        return drawer->a + u * drawer->b;
    case WEIBULL:
        return pow(-tarry_log(u), drawer->b) * drawer->a;
    case QUANTILES:
        return tarry_quantile_table_at(drawer->cubics, drawer->log2_intervals, bits) * drawer->a;
    case SOLVED:
        return tarry_law_quantile(drawer->standard, u, 1 - u) * drawer->a;
    case BINS: {
        const row *in = find_row(drawer, u);
        return in->from + (u - in->below) * in->slope;
    }
    case VALUES:
        return find_row(drawer, u)->from;
    case FIXED:
        return drawer->a;
    default:
        return NAN;
    }
}

static double draw_mix(const tarry_drawer *drawer, tarry_stream *stream) {
    const double u = tarry_unit(tarry_stream_next(stream));
    const row *rows = drawer->rows;
    uint32_t i = 0;
    while (u >= rows[i].cumulative)
        i++;
    return tarry_draw(&drawer->parts[i], stream);
}

static double draw_total(const tarry_drawer *drawer, tarry_stream *stream) {
    double sum = 0;
    for (uint32_t i = 0; i < drawer->n_parts; i++)
        sum += tarry_draw(&drawer->parts[i], stream);
    return sum;
}

double tarry_draw(const tarry_drawer *drawer, tarry_stream *stream) {
    if (drawer->formula == QUANTILES)
        return tarry_quantile_table_at(drawer->cubics, drawer->log2_intervals,
                                       tarry_stream_next(stream)) *
               drawer->a;
    switch (drawer->formula) {
    case FIXED:
        return drawer->a;
    case MIX:
        return draw_mix(drawer, stream);
    case TOTAL:
        return draw_total(drawer, stream);
    default:
        return tarry_draw_at(drawer, tarry_stream_next(stream));
    }
}

double tarry_draw_remaining(const tarry_drawer *drawer, tarry_stream *stream) {
    const double u = tarry_unit(tarry_stream_next(stream));
    uint32_t i = 0;
    if (drawer->formula == FIXED)
        return u * drawer->a;
    if (drawer->formula != MIX && drawer->formula != TOTAL)
        return tarry_law_remaining_quantile(drawer->law, u);
    while (!(u < drawer->met[i]) && i + 1 < drawer->n_parts)
        i++;
    double length = tarry_draw_remaining(&drawer->parts[i], stream);
    while (drawer->formula == TOTAL && ++i < drawer->n_parts)
        length += tarry_draw(&drawer->parts[i], stream);
    return length;
}
