/* SPDX-License-Identifier: GPL-3.0-or-later */

/* How far the figures of a run are from exact laws, all of them together.
 *
 * Each figure z, on the scale of its interval, is off the exact z0 by t = (z - z0)/s. Among many
 * figures some t are large by chance, and figures of the same cells go together; so the largest |t|
 * is held against those of correct runs. These are made by giving the groups' pseudo-values random
 * signs, one for all figures of a group: t' = m' / s', m' and s' being mean and standard error of
 * the signed values (Cameron, Gelbach & Miller 2008, Rev. Econ. Stat. 90:414, for groups; maxima
 * over many figures: Romano & Wolf 2005, Econometrica 73:1237). Draws go on until enough of them
 * were larger to tell their share (Besag & Clifford 1991, Biometrika 78:301).
 *
 * Pseudo-values are (1 - G) times the moves m_g of the ledger, so with v_g = m_g / sqrt(sum m^2)
 * and c = sum of signed v_g, t'^2 = c^2 (G - 1)/(G - c^2): it grows with |c|, and only c is drawn.
 */
#include "study/self_check.h"

#include "base/error.h"
#include "base/memory.h"
#include "base/number.h"
#include "base/random.h"
#include "base/text.h"
#include "model/model.h"
#include "study/predict.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

#define uthash_nonfatal_oom(element) ((void)(element))
#define HASH_NONFATAL_OOM 1
#include <uthash.h>

enum {
    FEWEST_GROUPS = 20, /* 2^19 different draws, two of each: 1 in 10,000 can be told */
    MOST_ROWS = 256,    /* compared of a column */
    ENOUGH_LARGER = 50,
    MOST_DRAWS = 40000,
};

static const double alarm_share = 1e-4;
static const double rough =
    0.2; /* relative errors above this are of figures that rest on few events */
static const double events = 50; /* 1 / rough^2 */

/* A figure that is compared. */
typedef struct figure {
    tarry_ledger_column column;
    size_t row; /* of the run's table */
    double exact;
    double t;
    const tarry_estimate *estimate;
} figure;

typedef struct comparison {
    const tarry_results *run, *exact;
    figure *figures;
    size_t n, n_groups;
    tarry_text name; /* room to work in */
} comparison;

static const struct {
    tarry_result_table table;
    const char *name;
    size_t n_keys; /* the first columns tell rows apart */
} columns[TARRY_N_LEDGER_COLUMNS] = {
    [TARRY_LEDGER_means_mean] = {TARRY_TABLE_means, "mean", 2},
    [TARRY_LEDGER_distribution_probability] = {TARRY_TABLE_distribution, "probability", 5},
    [TARRY_LEDGER_bursts_value] = {TARRY_TABLE_bursts, "value", 3},
    [TARRY_LEDGER_signals_value] = {TARRY_TABLE_signals, "value", 3},
    [TARRY_LEDGER_burst_sizes_probability] = {TARRY_TABLE_burst_sizes, "probability", 4},
    [TARRY_LEDGER_dwells_survival] = {TARRY_TABLE_dwells, "survival", 4},
    [TARRY_LEDGER_autocorrelation_correlation] = {TARRY_TABLE_autocorrelation, "correlation", 4},
    [TARRY_LEDGER_first_survival] = {TARRY_TABLE_first, "survival", 3},
};

/* ---- rows with the same key ----------------------------------------------------------------- */

/* "vela.protein, 34": what tells a row apart, numbers to nine digits. */
static void write_key(const tarry_table *table, size_t row, size_t n_keys, tarry_text *key) {
    key->size = 0;
    for (int i = 0; i < (int)n_keys; i++) {
        const char *text = tarry_table_text(table, row, i);
        const double number = tarry_table_number(table, row, i);
        char digits[TARRY_NUMBER_SIZE] = "";
        if (!isnan(number))
            tarry_number_write_rounded(number, 9, digits);
        if (*text || *digits)
            tarry_text_printf(key, "%s%s", key->size > 0 ? ", " : "", *text ? text : digits);
    }
}

typedef struct entry {
    UT_hash_handle hh;
    size_t row;
    char key[];
} entry;

static void forget_rows(entry **rows) {
    entry *each = *rows;
    HASH_CLEAR(hh, *rows); /* leaves the entries */
    while (each) {
        entry *next = each->hh.next;
        free(each);
        each = next;
    }
}

static int add_row(entry **rows, size_t row, const tarry_text *key) {
    entry *added = key->failed ? NULL : tarry_calloc(1, sizeof *added + key->size + 1);
    if (!added)
        return 1;
    added->row = row;
    memcpy(added->key, key->data, key->size);
    HASH_ADD_KEYPTR(hh, *rows, added->key, key->size, added);
    if (added->hh.tbl)
        return 0;
    free(added);
    return 1;
}

/* The rows of an exact table by their keys; to be forgotten, whatever is returned. */
static int index_rows(const tarry_table *table, size_t n_keys, entry **rows, tarry_error *error) {
    tarry_text key = {0};
    int failed = 0;
    for (size_t row = 0; !failed && row < tarry_table_n_rows(table); row++) {
        write_key(table, row, n_keys, &key);
        failed = add_row(rows, row, &key);
    }
    tarry_text_release(&key);
    return failed ? tarry_fail_memory(error, "a run beside its exact laws") : TARRY_OK;
}

/* ---- figures ------------------------------------------------------------------------------- */

static double spread_of(const tarry_estimate *estimate) {
    const double n = (double)estimate->n_moves;
    double sum = 0.0;
    for (size_t g = 0; g < estimate->n_moves; g++)
        sum += estimate->moves[g] * estimate->moves[g];
    return sqrt(sum * (n - 1.0) / n);
}

/* Does a mean over cells rest on events enough? From its exact value and spread, not from those
 * found: what is low by chance looks sharp too. Below Poisson's spread counts are taken as
 * binomial, and what is missing to the most must be enough as well. */
static bool mean_tells(const comparison *c, const figure *f, size_t exact_row) {
    const tarry_table *exact = c->exact->tables[TARRY_TABLE_means];
    const double sd = tarry_table_number(exact, exact_row, tarry_table_column(exact, "sd"));
    const double cells = (double)c->run->n_cells, variance = sd * sd;
    const double missing = variance < f->exact ? variance / (1.0 - variance / f->exact) : INFINITY;
    return cells * f->exact * f->exact >= events * variance && cells * missing >= events;
}

/* Does a share, of as many independent trials as its standard error tells of? */
static bool share_tells(const figure *f) {
    const double share = f->estimate->value, se = f->estimate->se;
    return share * (1.0 - share) * fmin(f->exact, 1.0 - f->exact) >= events * se * se;
}

/* Append the species or signal that a row is about: spread and correlation of it are those of few
 * large values where it comes in bursts. Nothing where it is about bursts themselves. */
static void add_name(const tarry_table *table, size_t row, tarry_ledger_column column,
                     tarry_text *name) {
    const char *quantity = tarry_table_text(table, row, 2), *end = strrchr(quantity, '_');
    switch (column) {
    case TARRY_LEDGER_signals_value:
        if (strcmp(quantity, "signal_mean") != 0)
            tarry_text_add_string(name, tarry_table_text(table, row, 0));
        break;
    case TARRY_LEDGER_autocorrelation_correlation:
        tarry_text_add_string(name, tarry_table_text(table, row, 1));
        break;
    case TARRY_LEDGER_bursts_value: /* "transcript_fano" of "vela" */
        if (end && (!strcmp(end, "_fano") || !strcmp(end, "_cv2")))
            tarry_text_printf(name, "%s.%.*s", tarry_table_text(table, row, 0),
                              (int)(end - quantity), quantity);
        break;
    default:
        break;
    }
}

/* Variance over the mean squared, background and noise off where that is told, else the largest at
 * any time; 0 where it is not known. */
static double exact_cv2(const tarry_results *exact, const char *name) {
    const tarry_table *signals = exact->tables[TARRY_TABLE_signals];
    const tarry_table *means = exact->tables[TARRY_TABLE_means];
    const int value = tarry_table_column(signals, "value"), cv2 = tarry_table_column(means, "cv2");
    double largest = 0.0;
    for (size_t row = 0; row < tarry_table_n_rows(signals); row++)
        if (!strcmp(tarry_table_text(signals, row, 0), name) &&
            !strcmp(tarry_table_text(signals, row, 2), "amplitude"))
            largest = fmax(largest, tarry_table_number(signals, row, value));
    for (size_t row = 0; !(largest > 0.0) && row < tarry_table_n_rows(means); row++)
        if (!strcmp(tarry_table_text(means, row, 0), name))
            largest = fmax(largest, tarry_table_number(means, row, cv2));
    return largest;
}

/* Are the cells as many as for a mean of single frames? */
static bool spread_tells(comparison *c, const figure *f) {
    tarry_text *name = &c->name;
    name->size = 0;
    add_name(c->run->tables[columns[f->column].table], f->row, f->column, name);
    if (name->failed || name->size == 0)
        return !name->failed;
    return (double)c->run->n_cells >= events * exact_cv2(c->exact, name->data);
}

/* Is the law of t that of Student, near enough? Not where the figure rests on few events. */
static bool tells(comparison *c, const figure *f, double spread, size_t exact_row) {
    if (!(spread > 0.0) || !isfinite(f->t))
        return false;
    if (f->column == TARRY_LEDGER_means_mean)
        return mean_tells(c, f, exact_row);
    if (f->estimate->scale == TARRY_SCALE_LOGIT || f->estimate->scale == TARRY_SCALE_LOGLOG)
        return share_tells(f);
    const double size = f->column == TARRY_LEDGER_signals_value &&
                                f->estimate->scale == TARRY_SCALE_PLAIN
                            ? fabs(f->exact)
                            : 1.0; /* else relative, or a correlation */
    return spread <= rough * size && spread_tells(c, f);
}

static void add_figure(comparison *c, const entry *rows, tarry_ledger_column column,
                       const tarry_ledger_entry *kept, tarry_text *key) {
    const tarry_table *run = c->run->tables[columns[column].table];
    const tarry_table *exact = c->exact->tables[columns[column].table];
    const entry *found;
    write_key(run, kept->row, columns[column].n_keys, key);
    if (key->failed || !key->data)
        return;
    HASH_FIND(hh, rows, key->data, key->size, found);
    if (!found || kept->estimate.n_moves < c->n_groups)
        return;
    figure f = {.column = column, .row = kept->row, .estimate = &kept->estimate};
    const double spread = spread_of(f.estimate);
    f.exact = tarry_table_number(exact, found->row,
                                 tarry_table_column(exact, columns[column].name));
    f.t = (tarry_to_scale(f.estimate->scale, f.estimate->value) -
           tarry_to_scale(f.estimate->scale, f.exact)) /
          spread;
    if (tells(c, &f, spread, found->row))
        c->figures[c->n++] = f;
}

/* Of many figures of a column every so many. */
static void thin(comparison *c, size_t first) {
    const size_t n = c->n - first, step = (n + MOST_ROWS - 1) / MOST_ROWS;
    size_t left = 0;
    for (size_t i = 0; i<n; i += step> 0 ? step : 1)
        c->figures[first + left++] = c->figures[first + i];
    c->n = first + left;
}

static int add_column(comparison *c, tarry_ledger_column column, tarry_error *error) {
    const struct tarry_ledger_page *page = &c->run->ledger->pages[column];
    entry *rows = NULL;
    tarry_text key = {0};
    const size_t first = c->n;
    if (page->n == 0)
        return TARRY_OK;
    const int code = index_rows(c->exact->tables[columns[column].table], columns[column].n_keys,
                                &rows, error);
    for (size_t i = 0; !code && i < page->n; i++)
        add_figure(c, rows, column, &page->entries[i], &key);
    const bool failed = key.failed;
    forget_rows(&rows);
    tarry_text_release(&key);
    thin(c, first);
    return !code && failed ? tarry_fail_memory(error, "a run beside its exact laws") : code;
}

/* ---- the largest difference, and those of correct runs -------------------------------------- */

/* v[group][figure]: moves over the root of the sum of their squares. */
static double *scaled_moves(const comparison *c, tarry_error *error) {
    double *v = tarry_calloc(c->n_groups * c->n, sizeof *v);
    if (!v) {
        tarry_fail_memory(error, "a run beside its exact laws");
        return NULL;
    }
    for (size_t k = 0; k < c->n; k++) {
        const tarry_estimate *e = c->figures[k].estimate;
        double sum = 0.0;
        for (size_t g = 0; g < c->n_groups; g++)
            sum += e->moves[g] * e->moves[g];
        for (size_t g = 0; g < c->n_groups; g++)
            v[g * c->n + k] = e->moves[g] / sqrt(sum);
    }
    return v;
}

/* The largest |c| of one draw. */
static double draw_largest(const comparison *c, const double *v, tarry_stream *stream,
                           double *restrict sums) {
    const uint64_t signs = tarry_stream_next(stream);
    memset(sums, 0, c->n * sizeof *sums);
    for (size_t g = 0; g < c->n_groups; g++) {
        const double sign = signs >> g & 1 ? 1.0 : -1.0;
        const double *of_group = v + g * c->n;
        for (size_t k = 0; k < c->n; k++)
            sums[k] += sign * of_group[k];
    }
    double largest = 0.0;
    for (size_t k = 0; k < c->n; k++)
        largest = fmax(largest, fabs(sums[k]));
    return largest;
}

static int share_of_larger(const comparison *c, double t, double *share, tarry_error *error) {
    const double n = (double)c->n_groups, bound = sqrt(t * t * n / (t * t + n - 1.0));
    double *v = scaled_moves(c, error), *sums = v ? tarry_calloc(c->n, sizeof *sums) : NULL;
    tarry_stream stream;
    int larger = 0, draws = 0;
    tarry_stream_init(&stream, 1, 0, TARRY_STREAM_NOISE);
    for (; sums && draws < MOST_DRAWS && larger < ENOUGH_LARGER; draws++)
        larger += draw_largest(c, v, &stream, sums) >= bound;
    *share = larger < ENOUGH_LARGER ? (larger + 1.0) / (draws + 1.0)
                                    : (double)larger / (double)draws;
    const int code = sums ? TARRY_OK : tarry_fail_memory(error, "a run beside its exact laws");
    free(v);
    free(sums);
    return code;
}

/* "means.csv, vela.protein, 34: mean 102.3, exact value 100". */
static char *describe(const comparison *c, const figure *f, tarry_error *error) {
    tarry_text text = {0}, key = {0};
    char value[TARRY_NUMBER_SIZE], exact[TARRY_NUMBER_SIZE];
    write_key(c->run->tables[columns[f->column].table], f->row, columns[f->column].n_keys, &key);
    tarry_number_write_rounded(f->estimate->value, 4, value);
    tarry_number_write_rounded(f->exact, 4, exact);
    if (!key.failed)
        tarry_text_printf(&text, "%s.csv, %s: %s %s, exact value %s",
                          tarry_table_name(c->run->tables[columns[f->column].table]), key.data,
                          columns[f->column].name, value, exact);
    if (key.failed || text.failed) {
        tarry_text_release(&text);
        tarry_fail_memory(error, "a run beside its exact laws");
    }
    tarry_text_release(&key);
    return text.data;
}

static int judge(comparison *c, tarry_self_check *check, tarry_error *error) {
    const figure *worst = &c->figures[0];
    for (size_t i = 1; i < c->n; i++)
        if (fabs(c->figures[i].t) > fabs(worst->t))
            worst = &c->figures[i];
    check->largest = fabs(worst->t);
    check->where = describe(c, worst, error);
    int code = check->where ? share_of_larger(c, worst->t, &check->share_larger, error)
                            : TARRY_MEMORY;
    check->alarm = !code && check->share_larger <= alarm_share;
    if (!code)
        check->n_compared = c->n;
    return code;
}

int tarry_self_check_compare(tarry_results *results, const tarry_results *exact,
                             int64_t n_resampled, tarry_error *error) {
    const size_t room = (size_t)TARRY_N_LEDGER_COLUMNS * TARRY_LEDGER_ROWS;
    comparison c = {.run = results, .exact = exact};
    c.n_groups = n_resampled < TARRY_JACKKNIFE_MOST ? (size_t)n_resampled : TARRY_JACKKNIFE_MOST;
    c.figures = tarry_calloc(room, sizeof *c.figures);
    int code = c.figures ? TARRY_OK : tarry_fail_memory(error, "a run beside its exact laws");
    for (int i = 0; !code && i < TARRY_N_LEDGER_COLUMNS; i++)
        code = add_column(&c, (tarry_ledger_column)i, error);
    if (!code && c.n > 0)
        code = judge(&c, &results->self_check, error);
    if (!code && c.name.failed)
        code = tarry_fail_memory(error, "a run beside its exact laws");
    tarry_text_release(&c.name);
    free(c.figures);
    return code;
}

static int note_alarm(tarry_results *results, tarry_error *error) {
    const tarry_self_check *check = &results->self_check;
    char largest[TARRY_NUMBER_SIZE];
    tarry_number_write_fixed(check->largest, 1, largest);
    return tarry_notes_add(
        &results->notes, (tarry_place){0}, error,
        "this run does not agree with the exact laws of its model: of %zu figures the farthest is "
        "%s standard errors off (%s), and fewer than 1 in 10,000 correct runs have one so far; "
        "either is wrong, so use neither, and report it",
        check->n_compared, largest, check->where);
}

int tarry_self_check_run(const tarry_network *network, tarry_results *results, tarry_error *error) {
    tarry_error why = {0};
    if (network->n_genes > TARRY_SELF_CHECK_GENES || results->n_cells < FEWEST_GROUPS)
        return TARRY_OK;
    int code = tarry_predict_network(network, true, &results->exact, &why);
    if (code == TARRY_NUMERIC)
        return tarry_notes_add(&results->notes, (tarry_place){0}, error,
                               "no exact laws stand beside the figures: %s", why.message);
    if (code && error)
        *error = why;
    if (!code)
        code = tarry_self_check_compare(results, results->exact, results->n_cells, error);
    if (!code && results->self_check.alarm)
        code = note_alarm(results, error);
    return code;
}

/* ---- data ------------------------------------------------------------------------------------ */

static int note_unlike(const tarry_model *model, tarry_results *results, tarry_error *error) {
    const tarry_self_check *check = &results->self_check;
    char largest[TARRY_NUMBER_SIZE];
    tarry_number_write_fixed(check->largest, 1, largest);
    return tarry_notes_add(
        &results->notes, (tarry_place){0}, error,
        "these data are not as %s has it: of %zu figure%s the farthest is %s standard errors off "
        "(%s), and fewer than 1 in 10,000 data sets of that model have one so far",
        model->file, check->n_compared, check->n_compared > 1 ? "s" : "", largest, check->where);
}

/* Is it about a name that the data have? Notes begin with the name. */
static bool is_measured(const tarry_network *data, const char *note) {
    for (uint32_t i = 0; i < data->n_channels; i++) {
        const size_t n = strlen(data->channels[i].name);
        if (!strncmp(note, data->channels[i].name, n) && (note[n] == ':' || note[n] == ','))
            return true;
    }
    return false;
}

static int take_notes(const tarry_network *data, tarry_results *results, tarry_error *error) {
    int code = TARRY_OK;
    for (size_t i = 0; !code && i < tarry_results_n_warnings(results->exact); i++) {
        const char *note = tarry_results_warning(results->exact, i);
        if (is_measured(data, note))
            code = tarry_notes_add(&results->notes, (tarry_place){0}, error, "%s: %s",
                                   data->data->beside->file, note);
    }
    return code;
}

int tarry_self_check_beside(const tarry_network *data, tarry_results *results, tarry_error *error) {
    const tarry_model *model = data->data->beside;
    const int64_t n = data->data->resampled ? data->data->n_resampled : 0;
    int code = tarry_predict_network(&model->network, true, &results->exact, error);
    if (!code)
        code = take_notes(data, results, error);
    if (!code && n >= FEWEST_GROUPS)
        code = tarry_self_check_compare(results, results->exact, n, error);
    if (!code && results->self_check.alarm)
        code = note_unlike(model, results, error);
    return code;
}
