/* Two routes to one number: what a simulation finds and what is worked out must agree, for models
 * of different structure. Each figure with an interval gives Z = (found - exact)/standard error.
 * Standard errors come from at most 64 groups of cells, so Z follows Student's t there; figures of
 * one run hang together. The largest |Z| of each table is held below 6 (a chance of 1e-7 for each
 * of some thousand figures with 63 degrees of freedom), and the mean square of Z over a table of
 * hundreds below 2. */

#include "support.h"

#include "tarry/tarry.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

static const char *const models[] = {
    /* three states, two of them active, export by a gamma lag */
    "genes:\n  vela:\n    start: steady\n    promoter:\n      off: {to: {low: 0.2}}\n"
    "      low: {to: {off: 0.3, high: 0.4}, initiates: 1}\n      high: {to: {low: 0.8}, initiates: "
    "6}\n"
    "    transcript: {stages: {nascent: {fixed: 2}, nuclear: {gamma: {mean: 3, sd: 1.5}}}, decay: "
    "0.3}\n"
    "signals: {spot: {of: vela.nascent, ramp: {from: 0.2, to: 0.5}, noise: 0.4}}\n",
    /* a lasting Erlang state, three copies, losses, a lifetime that is not exponential */
    "genes:\n  vela:\n    copies: 3\n    start: steady\n    promoter:\n"
    "      shut: {lasts: {erlang: {steps: 3, mean: 9}}, then: {open: 1}}\n"
    "      open: {to: {shut: 0.5}, initiates: 3}\n"
    "    transcript: {stages: {a: {lasts: {exponential: {mean: 4}}, lost: 0.1}}, lifetime: "
    "{weibull: "
    "{shape: 2, scale: 5}}}\nsignals: {all: {sum: {vela.a: 1, vela.transcript: 2}}}\n",
    /* pausing: the move initiates; a clearance of exponential length; a lag from a table */
    "genes:\n  vela:\n    clearance: {exponential: {mean: 0.3}}\n    promoter:\n"
    "      empty: {to: {paused: 2}}\n      paused: {to: {empty: {rate: 1.5, initiates: yes}}}\n"
    "    bursts_in: [paused]\n    transcript: {stages: {n: {table: {edges: [1, 2, 4], weights: [1, "
    "3]}}}, "
    "decay: 0.4}\nsignals: {late: {of: vela.n, ramp: {from: 0.5, to: 0.5}, background: 1}}\n",
    /* an induction from a gene that is hardly ever on */
    "parameters: {k: 0.02}\ngenes:\n  vela:\n    start: steady\n    promoter:\n"
    "      shut: {to: {open: k}}\n      open: {to: {shut: 0.6}, initiates: 4}\n"
    "    transcript: {stages: {n: {uniform: {from: 1, to: 3}}, m: {lognormal: {mean: 2, sd: 1}}}, "
    "decay: "
    "0.5}\nprotocol: [{at: 5, set: {k: 0.5}}]\nsignals: {both: {sum: {vela.n: 1, vela.m: 1}}}\n",
    /* two colours on one gene, one of which sees one allele */
    "genes:\n  vela:\n    copies: 2\n    start: steady\n    promoter:\n      shut: {to: {open: "
    "0.25}}\n"
    "      open: {to: {shut: 0.75}, initiates: 5}\n"
    "    transcript: {stages: {n: {mix: [{share: 0.4, lasts: {fixed: 2}}, {share: 0.6, lasts: "
    "{erlang: "
    "{steps: 2, mean: 5}}}]}}, decay: 1}\n"
    "signals:\n  head: {of: vela.n, ramp: {from: 0.1, to: 0.3}}\n"
    "  tail: {of: vela.n, ramp: {from: 0.6, to: 0.9}, brightness: 2}\n"
    "  one: {of: vela.n, ramp: {from: 0.1, to: 0.3}, allele: 1, noise: {fixed: 0.1, share: 0.2}}\n",
};

/* ---- tables -------------------------------------------------------------------------------- */

/* The rows of a table by their first columns, in the order of the exact one. */
typedef struct pairing {
    const tarry_table *found, *exact;
    int keys[4]; /* columns, n_keys of them */
    int n_keys;
} pairing;

static bool same_row(const pairing *p, size_t i, size_t j) {
    for (int k = 0; k < p->n_keys; k++) {
        const double x = tarry_table_number(p->found, i, p->keys[k]);
        const double y = tarry_table_number(p->exact, j, p->keys[k]);
        if (strcmp(tarry_table_text(p->found, i, p->keys[k]),
                   tarry_table_text(p->exact, j, p->keys[k])) != 0)
            return false;
        if (isnan(x) != isnan(y) || fabs(x - y) > 1e-9)
            return false;
    }
    return true;
}

typedef struct score {
    size_t n;
    double sum, most;
    char where[128];
} score;

static void add_z(score *s, double z, const tarry_table *table, size_t row, const char *what) {
    s->n++;
    s->sum += z * z;
    if (fabs(z) <= s->most)
        return;
    s->most = fabs(z);
    snprintf(s->where, sizeof s->where, "%s row %zu (%s), %s", tarry_table_name(table), row,
             tarry_table_text(table, row, 0), what);
}

/* The standard error behind an interval, or a column of it. */
typedef double spread(const tarry_table *table, size_t row);

static double interval_error(const tarry_table *table, size_t row) {
    return (tarry_table_number(table, row, tarry_table_column(table, "high")) -
            tarry_table_number(table, row, tarry_table_column(table, "low"))) /
           3.92;
}

static double mean_error(const tarry_table *table, size_t row) {
    return tarry_table_number(table, row, tarry_table_column(table, "mean_se"));
}

/* Of a promoter's state (a Fano factor below 1) the sd hardly changes with p near 1/2, and its
 * error is no normal one. */
static double sd_error(const tarry_table *table, size_t row) {
    if (tarry_table_number(table, row, tarry_table_column(table, "fano")) < 0.95)
        return 0;
    return tarry_table_number(table, row, tarry_table_column(table, "sd_se"));
}

static score compare(const tarry_results *found, const tarry_results *exact,
                     tarry_result_table which, const char *const *keys, const char *value,
                     spread *error_of, double least) {
    score s = {0};
    pairing p = {tarry_results_table(found, which), tarry_results_table(exact, which), {0}, 0};
    for (; keys[p.n_keys] != NULL; p.n_keys++)
        p.keys[p.n_keys] = tarry_table_column(p.found, keys[p.n_keys]);
    const int column = tarry_table_column(p.found, value);
    size_t start = 0;
    for (size_t j = 0; j < tarry_table_n_rows(p.exact); j++) {
        size_t i = start;
        while (i < tarry_table_n_rows(p.found) && !same_row(&p, i, j))
            i++;
        if (i == tarry_table_n_rows(p.found))
            continue; /* nothing was found there, or at another time */
        start = i;
        const double x = tarry_table_number(p.found, i, column);
        const double y = tarry_table_number(p.exact, j, column);
        const double se = error_of(p.found, i);
        if (se > 0 && x > least && isfinite(y))
            add_z(&s, (x - y) / se, p.found, i, value);
    }
    return s;
}

static void hold(const score *s, size_t model, size_t n_least) {
    ck_assert_msg(s->n >= n_least, "model %zu: %zu figures only of %s", model, s->n, s->where);
    ck_assert_msg(s->most < 6, "model %zu: Z is %.2f at %s", model, s->most, s->where);
    if (s->n >= 100)
        ck_assert_msg(s->sum / (double)s->n < 4, "model %zu: mean square of Z is %.2f", model,
                      s->sum / (double)s->n);
}

/* ---- the test ------------------------------------------------------------------------------ */

static void check_model(size_t m) {
    static const char *const by_name[] = {"name", "time", NULL};
    static const char *const counts[] = {"name", "window", "time", "count", NULL};
    static const char *const figures[] = {"gene", "window", "quantity", NULL};
    static const char *const signals[] = {"signal", "window", "quantity", NULL};
    static const char *const sizes[] = {"gene", "window", "size", NULL};
    static const char *const dwells[] = {"gene", "window", "period", "time", NULL};
    static const char *const lags[] = {"window", "first", "second", "lag", NULL};
    static const char *const firsts[] = {"name", "step", "time", NULL};
    const bool induced = strstr(models[m], "protocol:") != NULL;
    char text[4096], what[1024];
    tarry_model *model = NULL;
    tarry_results *found = NULL, *exact = NULL;
    tarry_error error = {0};
    const tarry_run_options options = {.threads = 2};
    snprintf(text, sizeof text,
             "tarry: 1\ntime: min\n%srun: {cells: %d, settle: 100, until: 40, every: 0.5, "
             "snapshots: [0, "
             "10, 40], lags: 8}\n",
             models[m], test_small() ? 400 : 3000);
    tarry_start();
    int code = tarry_model_read_text(text, strlen(text), "m.yaml", NULL, 0, &model, &error);
    if (code == 0)
        code = tarry_run(model, &options, &found, &error);
    if (code == 0)
        code = tarry_predict(model, &exact, &error);
    ck_assert_msg(code == 0, "model %zu: %s", m, tarry_error_text(&error, what, sizeof what));
    score s = compare(found, exact, TARRY_TABLE_means, by_name, "mean", mean_error, -1e9);
    hold(&s, m, 300);
    s = compare(found, exact, TARRY_TABLE_means, by_name, "sd", sd_error, -1e9);
    hold(&s, m, 80);
    s = compare(found, exact, TARRY_TABLE_distribution, counts, "probability", interval_error,
                0.02);
    hold(&s, m, 12);
    s = compare(found, exact, TARRY_TABLE_bursts, figures, "value", interval_error, -1e9);
    hold(&s, m, induced || test_small() ? 4 : 10);
    s = compare(found, exact, TARRY_TABLE_signals, signals, "value", interval_error, -1e9);
    hold(&s, m, 3);
    if (induced) {
        s = compare(found, exact, TARRY_TABLE_first, firsts, "survival", interval_error, 0.02);
        hold(&s, m, 10);
    } else {
        s = compare(found, exact, TARRY_TABLE_burst_sizes, sizes, "probability", interval_error,
                    0.02);
        hold(&s, m, 1);
        s = compare(found, exact, TARRY_TABLE_dwells, dwells, "survival", interval_error, 0.02);
        hold(&s, m, 20);
        s = compare(found, exact, TARRY_TABLE_autocorrelation, lags, "correlation", interval_error,
                    -1e9);
        hold(&s, m, 30);
    }
    tarry_results_free(found);
    tarry_results_free(exact);
    tarry_model_free(model);
}

START_TEST(simulation_and_prediction_agree) {
    for (size_t m = 0; m < sizeof models / sizeof *models; m++)
        check_model(m);
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"simulation and prediction agree", simulation_and_prediction_agree},
    };
    return run_tests("predict", tests, sizeof tests / sizeof *tests);
}
