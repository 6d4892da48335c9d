/* SPDX-License-Identifier: GPL-3.0-or-later */

/* The engine's rules that can be told from outside: what stops a cell and how it is said, what is
 * dropped, counted, cancelled, and what does not change when something else is recorded. */

#include "support.h"

#include "engine/cell.h"
#include "model/model.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

typedef struct machine {
    tarry_model *model;
    tarry_engine *engine;
    tarry_cell *cell;
    tarry_record record;
} machine;

#define HEAD "tarry: 1\ntime: min\n"

static machine *machine_new(const char *text) {
    tarry_error error;
    char line[2048];
    machine *m = calloc(1, sizeof *m);
    ck_assert_ptr_nonnull(m);
    if (tarry_model_read_text(text, strlen(text), "test.yaml", NULL, 0, &m->model, &error) ||
        tarry_engine_new(&m->model->network, "direct", &m->engine, &error) ||
        tarry_cell_new(m->engine, &m->cell, &error) ||
        tarry_record_init(&m->record, &m->model->network, &error))
        ck_abort_msg("%s", tarry_error_text(&error, line, sizeof line));
    return m;
}

static void machine_free(machine *m) {
    tarry_record_release(&m->record);
    tarry_cell_free(m->cell);
    tarry_engine_free(m->engine);
    tarry_model_free(m->model);
    free(m);
}

static void run(machine *m, int64_t number) {
    tarry_error error;
    if (tarry_cell_run(m->cell, number, &m->record, &error))
        ck_abort_msg("%s", error.message);
}

static size_t channel_of(const machine *m, const char *name) {
    const tarry_network *network = &m->model->network;
    for (size_t i = 0; i < network->n_channels; i++)
        if (strcmp(network->channels[i].name, name) == 0)
            return i;
    ck_abort_msg("no %s", name);
    return 0;
}

static double snapshot(const machine *m, const char *name, size_t i) {
    return m->record.snapshots[channel_of(m, name) * m->model->network.run.n_snapshots + i];
}

/* ---- what stops a cell ------------------------------------------------------------------------
 */

static void check_stop(const char *text, tarry_code code, const char *const *says, size_t n) {
    machine *m = machine_new(text);
    tarry_error error;
    ck_assert_int_eq(tarry_cell_run(m->cell, 3, &m->record, &error), code);
    ck_assert_int_eq(error.code, code);
    for (size_t i = 0; i < n; i++)
        ck_assert_msg(strstr(error.message, says[i]), "\"%s\" is not in \"%s\"", says[i],
                      error.message);
    ck_assert_ptr_nonnull(strstr(error.message, "cell 3, time "));
    machine_free(m);
}

#define CHECK_STOP(text, code, ...)                                                                \
    do {                                                                                           \
        const char *const says[] = {__VA_ARGS__};                                                  \
        check_stop(HEAD text, code, says, sizeof says / sizeof *says);                             \
    } while (0)

START_TEST(test_bad_propensities) {
    CHECK_STOP("species: {x: 0}\nreactions: {grow: {makes: {x: 1}, propensity: 5.5 - x}}\n"
               "run: {until: 100}\n",
               TARRY_RUN, "propensity of \"grow\" is -0.5", "x = 6");
    CHECK_STOP("species: {x: 3}\nreactions:\n  go: {uses: {x: 1}, rate: 1}\n"
               "  odd: {makes: {x: 1}, propensity: 1 / x - 1 / x + 0 / x}\nrun: {until: 100}\n",
               TARRY_RUN, "propensity of \"odd\" is", "nan", "every count is 0");
    CHECK_STOP("species: {x: 3}\nreactions:\n  go: {uses: {x: 1}, rate: 1}\n"
               "  odd: {makes: {x: 1}, propensity: 0.001 / x}\nrun: {until: 100}\n",
               TARRY_RUN, "propensity of \"odd\" is inf");
    CHECK_STOP("species: {x: 0}\nreactions:\n  one: {makes: {x: 1}, rate: 1e308}\n"
               "  other: {makes: {x: 1}, rate: 1e308}\nrun: {until: 100}\n",
               TARRY_RUN, "the propensities add up to infinity");
    CHECK_STOP(
        "species: {a: 1, b: 1, c: 1, e: 1, f: 1, g: 1, i: 1, j: 1, k: 1, l: 1, m: 1, n: 1, o: 1}\n"
        "reactions: {odd: {makes: {a: 1}, propensity: -a}}\nrun: {until: 100}\n",
        TARRY_RUN, "propensity of \"odd\" is -1", "a = 1, b = 1", ", ...");
}
END_TEST

START_TEST(test_counts_past_2_to_53) {
    CHECK_STOP("species: {x: 9007199254740990}\nreactions: {grow: {makes: {x: 1}, rate: 1}}\n"
               "run: {until: 1000}\n",
               TARRY_RUN, "the count of \"x\" reached 2^53");
}
END_TEST

START_TEST(test_limits) {
    CHECK_STOP("species: {x: 1}\nreactions: {grow: {uses: {x: 1}, makes: {x: 2}, rate: 1}}\n"
               "run: {until: 1000}\nlimits: {firings: 1000}\n",
               TARRY_LIMIT, "more than 1000 firings", "\"grow\"", "x = 1002");
    CHECK_STOP("species: {x: 0}\n"
               "reactions: {start: {rate: 50, later: [{after: {fixed: 10}, makes: {x: 1}}]}}\n"
               "run: {until: 1000}\nlimits: {pending: 200}\n",
               TARRY_LIMIT, "more than 200 completions are under way", "start.later");
}
END_TEST

START_TEST(test_short_completion) {
    CHECK_STOP(
        "species: {x: 1}\n"
        "reactions: {doom: {needs: {x: 1}, rate: 5, later: [{after: {fixed: 2}, uses: {x: 1}}]}}\n"
        "run: {until: 1000}\n",
        TARRY_RUN, "uses more of \"x\" than there is", "if_short: skip");
}
END_TEST

/* ---- what is dropped or happens sometimes -------------------------------------------------------
 */

/* From one molecule many removals start and one finds it; the rest are dropped and counted. */
START_TEST(test_skipped) {
    machine *m = machine_new(HEAD
                             "species: {x: 1, y: 0}\nreactions: {doom: {needs: {x: 1}, rate: 5, "
                             "later: [{after: {fixed: 2}, "
                             "uses: {x: 1}, makes: {y: 1}, if_short: skip}]}}\nrun: {until: 20}\n");
    int64_t dropped = 0;
    for (int i = 0; i < 20; i++) {
        run(m, i);
        ck_assert_double_eq(snapshot(m, "x", 0), 0);
        ck_assert_double_eq(snapshot(m, "y", 0), 1);
        ck_assert_int_eq(m->record.skipped[0], m->record.firings[0] - 1);
        ck_assert_int_eq(m->record.completions[0], m->record.firings[0]);
        dropped += m->record.skipped[0];
    }
    ck_assert_int_gt(dropped, 50);
    machine_free(m);
}
END_TEST

/* 0.3 of 20 x 1,000 completions: binomial, sd 65; five of them either way. */
START_TEST(test_chance) {
    machine *m = machine_new(HEAD "species: {x: 0}\nreactions: {start: {rate: 100, "
                                  "later: [{after: {fixed: 1}, makes: {x: 1}, chance: 0.3}]}}\n"
                                  "run: {until: 11}\n");
    double made = 0, over = 0;
    for (int i = 0; i < 20; i++) {
        run(m, i);
        made += snapshot(m, "x", 0);
        over += (double)m->record.completions[0];
    }
    ck_assert_double_gt(over, 18000);
    ck_assert_double_le(fabs(made - 0.3 * over), 5 * sqrt(0.21 * over));
    machine_free(m);
}
END_TEST

/* Lags of 0 complete before the next reaction, nested ones too: no frame ever shows one under way.
 */
START_TEST(test_zero_lags) {
    machine *m = machine_new(
        HEAD "species: {a: 0, b: 0, c: 0}\nreactions: {start: {makes: {a: 1}, rate: 20, "
             "later: [{after: {fixed: 0}, uses: {a: 1}, makes: {b: 1}, "
             "later: [{after: {fixed: 0}, uses: {b: 1}, makes: {c: 1}}]}]}}\n"
             "run: {until: 50, every: 0.5}\n");
    run(m, 0);
    const uint32_t n = m->model->network.run.n_frames;
    for (uint32_t i = 0; i < n; i++) {
        ASSERT_FAST(m->record.frames[channel_of(m, "a") * n + i] == 0, "a at frame %u", i);
        ASSERT_FAST(m->record.frames[channel_of(m, "b") * n + i] == 0, "b at frame %u", i);
    }
    ck_assert_double_eq(snapshot(m, "c", 0), (double)m->record.firings[0]);
    ck_assert_int_gt(m->record.firings[0], 500);
    machine_free(m);
}
END_TEST

/* ---- ties and frames --------------------------------------------------------------------------
 */

/* A state that lasts 2 min exactly and one that lasts 3: everything is known without chance. A
 * frame at the time of a move shows the state after it. */
START_TEST(test_frames_show_the_state_after_all) {
    machine *m = machine_new(HEAD "genes:\n  vela:\n    promoter:\n"
                                  "      shut: {lasts: {fixed: 2}, then: {open: 1}}\n"
                                  "      open: {lasts: {fixed: 3}, then: {shut: 1}, initiates: 1}\n"
                                  "    transcript: {half_life: 1 min}\n"
                                  "run: {until: 10, every: 1}\n");
    run(m, 0);
    static const double open[] = {0, 0, 1, 1, 1, 0, 0, 1, 1, 1, 0};
    for (int i = 0; i < 11; i++)
        ck_assert_double_eq(m->record.frames[channel_of(m, "vela.open") * 11 + (size_t)i], open[i]);
    /* Marks at 2, 5, 7, 10 and, running on, at 12. */
    static const double times[] = {2, 5, 7, 10, 12};
    ck_assert_uint_eq(m->record.n_marks, 5);
    for (size_t i = 0; i < 5; i++) {
        ck_assert_double_eq(m->record.marks[i].time, times[i]);
        ck_assert_uint_eq(m->record.marks[i].opens, i % 2 == 0);
    }
    ck_assert_double_eq(m->record.end, 12);
    ck_assert_int_eq(m->record.status[0], TARRY_TRACK_CLOSED);
    machine_free(m);
}
END_TEST

/* Moving the promoter by hand starts a new dwell and forgets the old one. */
START_TEST(test_protocol_moves_promoters) {
    machine *m = machine_new(HEAD "genes:\n  vela:\n    promoter:\n"
                                  "      shut: {lasts: {fixed: 4}, then: {open: 1}}\n"
                                  "      open: {lasts: {fixed: 3}, then: {shut: 1}, initiates: 1}\n"
                                  "    transcript: {half_life: 1 min}\n"
                                  "protocol: [{at: 1 min, set: {vela.promoter: open}}]\n"
                                  "run: {until: 10, every: 1}\n");
    run(m, 0);
    static const double open[] = {0, 1, 1, 1, 0, 0, 0, 0, 1, 1, 1};
    for (int i = 0; i < 11; i++)
        ck_assert_double_eq(m->record.frames[channel_of(m, "vela.open") * 11 + (size_t)i], open[i]);
    /* The dwell of 4 that began at 0 was cancelled at 1: of 1 min in the first window it is lost.
     */
    ck_assert_double_eq(m->record.lags[0].lost + m->record.lags[1].lost, 1);
    ck_assert_double_eq(m->record.lags[0].pending, 1);
    machine_free(m);
}
END_TEST

/* ---- named bursts ------------------------------------------------------------------------------
 */

/* Unknown until the first opens or closes; opening while open is ignored and counted. */
START_TEST(test_named_bursts) {
    machine *m = machine_new(HEAD
                             "species: {x: 0}\nreactions:\n  up: {rate: 1}\n  down: {rate: 0.2}\n"
                             "  make: {makes: {x: 1}, rate: 3}\n"
                             "bursts: {pulse: {opens: [up], closes: [down], counts: [make]}}\n"
                             "run: {until: 40}\n");
    for (int i = 0; i < 10; i++) {
        run(m, i);
        const tarry_record *r = &m->record;
        ck_assert_int_eq(r->status[0], TARRY_TRACK_UNKNOWN);
        for (size_t k = 1; k < r->n_marks; k++) {
            ck_assert_uint_ne(r->marks[k].opens, r->marks[k - 1].opens);
            ck_assert_int_ge(r->marks[k].count, r->marks[k - 1].count);
        }
        ck_assert_int_eq(r->ignored + (int64_t)r->n_marks, r->firings[0] + r->firings[1]);
        ck_assert_int_gt(r->ignored, 0);
    }
    machine_free(m);
}
END_TEST

/* ---- what must not matter ----------------------------------------------------------------------
 */

#define GENE                                                                                       \
    "genes:\n  vela:\n    copies: 2\n    start: steady\n    promoter:\n"                           \
    "      shut: {to: {open: 0.1}}\n      open: {to: {shut: 0.3}, initiates: 2}\n"                 \
    "    transcript: {stages: {nascent: {gamma: {mean: 3, sd: 1}}}, half_life: 5}\n"               \
    "signals: {spot: {of: vela.nascent, ramp: {from: 0.2, to: 0.7}, noise: 0.4}}\n"

/* Another frame interval, other names recorded: the same cell to the bit, noise included. */
START_TEST(test_recording_changes_nothing) {
    machine *one = machine_new(HEAD GENE
                               "run: {settle: 20, until: 60, every: 1, snapshots: [12, 60]}\n");
    machine *other = machine_new(
        HEAD GENE
        "run: {settle: 20, until: 60, every: 0.5, snapshots: [12, 60], record: [spot]}\n");
    for (int i = 0; i < 5; i++) {
        run(one, i);
        run(other, i);
        for (size_t t = 0; t < 2; t++) {
            ck_assert_double_eq(snapshot(one, "spot", t), snapshot(other, "spot", t));
            ck_assert_double_eq(snapshot(one, "vela.transcript", t),
                                snapshot(other, "vela.transcript", t));
        }
        const double *a = one->record.frames + channel_of(one, "spot") * 61;
        for (size_t t = 0; t < 61; t++)
            ASSERT_FAST(a[t] == other->record.frames[2 * t], "frame %zu", t);
        ck_assert_double_eq(a[12], snapshot(one, "spot", 0));
    }
    machine_free(one);
    machine_free(other);
}
END_TEST

/* A cell is the same cell whatever ran before it in the same workspace. */
START_TEST(test_cells_do_not_depend_on_each_other) {
    machine *m = machine_new(HEAD GENE "run: {settle: 20, until: 60, every: 1}\n");
    run(m, 7);
    const size_t n = 61 * (size_t)m->record.n_recorded;
    double *first = malloc(n * sizeof *first);
    ck_assert_ptr_nonnull(first);
    memcpy(first, m->record.frames, n * sizeof *first);
    run(m, 3);
    ck_assert_mem_ne(first, m->record.frames, n * sizeof *first);
    run(m, 7);
    ck_assert_mem_eq(first, m->record.frames, n * sizeof *first);
    int64_t firings, completions;
    tarry_error error;
    int64_t sum = 0;
    for (uint32_t i = 0; i < m->model->network.n_reactions; i++)
        sum += m->record.firings[i];
    /* Bare, a cell does not run on. */
    ck_assert_int_eq(tarry_cell_run_bare(m->cell, 7, &firings, &completions, &error), TARRY_OK);
    ck_assert_int_le(firings, sum);
    ck_assert_int_gt(firings, sum / 2);
    free(first);
    machine_free(m);
}
END_TEST

/* ---- samplers by word ---------------------------------------------------------------------------
 */

/* A cell without a record has the same events: molecules that are lost or cancelled, completions
 * that are skipped or happen by chance, steps, a lag of one value only, limits beyond any count. */
START_TEST(test_bare) {
    machine *m = machine_new(
        HEAD
        "parameters: {k: 3, length: 2}\n"
        "delays: {only: {table: {values: [1.5], weights: [1]}}, way: {fixed: length}}\n"
        "genes:\n"
        "  vela:\n"
        "    promoter: {on: {initiates: k}}\n"
        "    transcript: {stages: {a: {lasts: way, lost: 0.2}, b: only}, half_life: 4}\n"
        "    protein: {translation: 0.5, lifetime: {uniform: {from: 1, to: 3}}}\n"
        "species: {pre: 0, mature: 0}\n"
        "reactions:\n"
        "  start: {makes: {pre: 1}, rate: 2, later: [{after: only, chance: 0.5, uses: {pre: 1}, "
        "makes: {mature: 1}, if_short: skip}]}\n"
        "  rob: {uses: {pre: 1}, rate: 1}\n"
        "  end: {uses: {mature: 1}, rate: 0.3}\n"
        "protocol: [{at: 10, set: {k: 6}}, {at: 20, set: {length: 3, mature: 4}}]\n"
        "run: {cells: 3, settle: 5, until: 40, every: 1}\n"
        "limits: {firings: 1e12}\n");
    const tarry_network *network = &m->model->network;
    for (int64_t cell = 0; cell < 3; cell++) {
        tarry_error error = {0};
        int64_t firings, completions, fired = 0, completed = 0;
        run(m, cell);
        for (uint32_t i = 0; i < network->n_reactions; i++)
            fired += m->record.firings[i];
        for (uint32_t i = 0; i < network->n_lags; i++)
            completed += m->record.completions[i];
        ck_assert_int_eq(tarry_cell_run_bare(m->cell, cell, &firings, &completions, &error), 0);
        ck_assert_int_gt(firings, 300);
        ck_assert_int_eq(firings, fired);
        ck_assert_int_eq(completions, completed);
    }
    machine_free(m);
}
END_TEST

START_TEST(test_samplers) {
    machine *m = machine_new(HEAD GENE "run: {until: 60}\n");
    tarry_engine *engine = NULL;
    tarry_error error;
    ck_assert_int_eq(tarry_engine_new(&m->model->network, "direkt", &engine, &error), TARRY_INPUT);
    ck_assert_ptr_nonnull(strstr(error.message, "direkt"));
    ck_assert_int_eq(tarry_engine_new(&m->model->network, "next", &engine, &error), TARRY_NOT_YET);
    machine_free(m);
}
END_TEST

START_TEST(test_lag_bins) {
    static const double lengths[] = {1e-9, 0.3, 1, 1.124, 1.126, 7.99, 8, 123.4, 1e9};
    for (size_t i = 0; i < sizeof lengths / sizeof *lengths; i++) {
        const uint32_t bin = tarry_lag_bin(lengths[i]);
        ck_assert_double_le(tarry_lag_bin_start(bin), lengths[i]);
        if (bin + 1 < TARRY_LAG_BINS)
            ck_assert_double_gt(tarry_lag_bin_start(bin + 1), lengths[i]);
    }
    ck_assert_uint_eq(tarry_lag_bin(0), 0);
    ck_assert_uint_eq(tarry_lag_bin(1.124), tarry_lag_bin(1));
    ck_assert_uint_eq(tarry_lag_bin(1.126), tarry_lag_bin(1) + 1);
    ck_assert_uint_eq(tarry_lag_bin(1e300), TARRY_LAG_BINS - 1);
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"bad propensities", test_bad_propensities},
        {"counts past 2^53", test_counts_past_2_to_53},
        {"limits", test_limits},
        {"short completion", test_short_completion},
        {"skipped", test_skipped},
        {"chance", test_chance},
        {"zero lags", test_zero_lags},
        {"frames show the state after all", test_frames_show_the_state_after_all},
        {"protocol moves promoters", test_protocol_moves_promoters},
        {"named bursts", test_named_bursts},
        {"recording changes nothing", test_recording_changes_nothing},
        {"cells do not depend on each other", test_cells_do_not_depend_on_each_other},
        {"bare", test_bare},
        {"samplers", test_samplers},
        {"lag bins", test_lag_bins},
    };
    return run_tests("engine", tests, sizeof tests / sizeof *tests);
}
