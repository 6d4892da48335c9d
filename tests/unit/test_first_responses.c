/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Which steps begin a first response, what is waited for, and that the engine tells it: by hand. */
#include "engine/cell.h"
#include "model/model.h"
#include "support.h"
#include "tarry/tarry.h"

#include <math.h>
#include <string.h>

typedef struct one_cell {
    tarry_model *model;
    tarry_engine *engine;
    tarry_cell *cell;
    tarry_record record;
} one_cell;

static void read_text(one_cell *one, const char *text) {
    tarry_error error = {0};
    *one = (one_cell){0};
    if (tarry_model_read_text(text, strlen(text), "text.yaml", NULL, 0, &one->model, &error))
        ck_abort_msg("%s", error.message);
}

static void run_text(one_cell *one, const char *text) {
    tarry_error error = {0};
    read_text(one, text);
    if (tarry_engine_new(&one->model->network, "direct", &one->engine, &error) ||
        tarry_cell_new(one->engine, &one->cell, &error) ||
        tarry_record_init(&one->record, &one->model->network, &error) ||
        tarry_cell_run(one->cell, 0, &one->record, &error))
        ck_abort_msg("%s", error.message);
}

static bool warns(const one_cell *one, const char *words) {
    for (size_t i = 0; i < tarry_model_n_warnings(one->model); i++)
        if (strstr(tarry_model_warning(one->model, i), words))
            return true;
    return false;
}

static void end(one_cell *one) {
    tarry_record_release(&one->record);
    tarry_cell_free(one->cell);
    tarry_engine_free(one->engine);
    tarry_model_free(one->model);
}

/* A ramp is one step, its end none; a step at `until` leaves no time to respond. */
START_TEST(steps) {
    static const double from[] = {0, 5, 20}, to[] = {5, 20, 40};
    one_cell one;
    read_text(&one, "tarry: 1\ntime: min\nparameters: {k: 0}\n"
                    "genes: {vela: {promoter: {on: {initiates: k}}, transcript: {decay: 1}}}\n"
                    "protocol:\n"
                    "  - {at: 0, set: {k: 1}}\n"
                    "  - {from: 5, to: 15, ramp: {k: 4}, steps: 10}\n"
                    "  - {every: 20, times: 2, from: 20, do: [{at: 0, set: {k: 1}}]}\n"
                    "run: {until: 40, every: 1}\n");
    const tarry_network *network = &one.model->network;
    ck_assert_uint_eq(network->n_responses, 3);
    for (uint32_t i = 0; i < 3; i++) {
        ck_assert_double_eq(network->responses[i].from, from[i]);
        ck_assert_double_eq(network->responses[i].to, to[i]);
    }
    for (uint32_t k = 0, n = 0; k < network->n_segments; k++) {
        const tarry_segment *segment = &network->segments[k];
        const bool begins = n < 3 && segment->start == from[n] && k > 0;
        ck_assert_int_eq(segment->response, begins ? (int32_t)n : TARRY_NONE);
        n += begins;
    }
    end(&one);
}
END_TEST

START_TEST(too_many_steps) {
    one_cell one;
    read_text(&one, "tarry: 1\ntime: min\nparameters: {k: 0}\n"
                    "genes: {vela: {promoter: {on: {initiates: k}}, transcript: {decay: 1}}}\n"
                    "protocol: [{every: 1, times: 101, do: [{at: 0, set: {k: k + 1}}]}]\n"
                    "run: {until: 200, every: 1}\n");
    ck_assert_uint_eq(one.model->network.n_responses, 100);
    ck_assert_double_eq(one.model->network.responses[99].to, 100);
    ck_assert(warns(&one, "the first 100 steps"));
    end(&one);
}
END_TEST

/* Recorded genes and named bursts; what nothing counts is not waited for. */
START_TEST(waited_for) {
    static const char *const names[] = {"lyra initiation", "lyra.transcript", "lyra.protein",
                                        "shots initiation"};
    one_cell one;
    read_text(&one, "tarry: 1\ntime: min\nparameters: {k: 1}\n"
                    "genes:\n"
                    "  vela: {promoter: {on: {initiates: k}}, transcript: {decay: 1}}\n"
                    "  lyra: {promoter: {on: {initiates: k}}, transcript: {stages: {nascent: 2},\n"
                    "    decay: 1}, protein: {translation: 1, stages: {immature: 1}, decay: 1}}\n"
                    "species: {x: 0}\n"
                    "reactions: {shoot: {makes: {x: 1}, rate: 1}}\n"
                    "bursts: {shots: {opens: [shoot], closes: [shoot], counts: [shoot]}, calm: "
                    "{opens: [shoot], closes: [shoot]}}\n"
                    "signals: {spot: {of: vela.transcript, responds_above: 3}}\n"
                    "protocol: [{at: 5, set: {k: 2}}]\n"
                    "run: {until: 40, every: 1, record: [lyra]}\n");
    const tarry_network *network = &one.model->network;
    ck_assert_uint_eq(network->n_firsts, 4);
    for (uint32_t i = 0; i < 4; i++)
        ck_assert_str_eq(network->firsts[i].name, names[i]);
    /* Before a protein: nascent, transcript, immature. */
    ck_assert_uint_eq(network->firsts[2].before.to - network->firsts[2].before.from, 3);
    ck_assert_uint_eq(network->firsts[1].before.to - network->firsts[1].before.from, 1);
    ck_assert(warns(&one, "'spot' is not recorded"));
    end(&one);
    read_text(&one, "tarry: 1\ntime: min\n"
                    "genes: {vela: {promoter: {on: {initiates: 1}}, transcript: {decay: 1}}}\n"
                    "signals: {spot: {of: vela.transcript, responds_above: 3}}\n"
                    "run: {until: 40, every: 1}\n");
    ck_assert_uint_eq(one.model->network.n_responses, 0);
    ck_assert_uint_eq(one.model->network.n_firsts, 0);
    ck_assert(warns(&one, "'responds_above' of 'spot' says nothing here"));
    end(&one);
}
END_TEST

/* Moved at 10, the promoter initiates 1 later; the stages are fixed, and the transcript lives for
 * 0.001 in which it gives rise to ten proteins or so. At 13.5 the transcript is under way. What
 * plain reactions add is no response of the gene. */
START_TEST(times) {
    static const double expected[3][3] = {{NAN, NAN, NAN}, {1, NAN, NAN}, {NAN, 4.5, 6.5}};
    static const double under_way[3][3] = {{0, 0, 0}, {0, 0, 0}, {0, 1, 1}};
    one_cell one;
    run_text(&one, "tarry: 1\ntime: min\nparameters: {k: 0, r: 0}\n"
                   "genes:\n"
                   "  vela:\n"
                   "    promoter:\n"
                   "      shut: {}\n"
                   "      primed: {lasts: {fixed: 1}, then: {ready: 1}}\n"
                   "      ready: {to: {shut: {rate: 1e6, initiates: yes}}}\n"
                   "    transcript: {stages: {nascent: 3, nuclear: 4}, lifetime: {fixed: 0.001}}\n"
                   "    protein: {translation: 1e4, stages: {immature: 2}}\n"
                   "species: {x: 1}\n"
                   "reactions: {gift: {uses: {x: 1}, makes: {vela.protein: 1}, rate: r}}\n"
                   "protocol:\n"
                   "  - {at: 5, set: {r: 1e6}}\n"
                   "  - {at: 10, set: {vela.promoter: primed}}\n"
                   "  - {at: 13.5, set: {k: 1}}\n"
                   "run: {until: 30, every: 1, seed: 1}\n");
    ck_assert_uint_eq(one.model->network.n_responses, 3);
    ck_assert_uint_eq(one.model->network.n_firsts, 3);
    for (size_t r = 0; r < 3; r++) {
        for (size_t i = 0; i < 3; i++) {
            const double time = one.record.firsts[3 * r + i];
            if (isnan(expected[r][i]))
                ck_assert_msg(isnan(time), "%zu %zu: %g", r, i, time);
            else
                ck_assert_double_eq_tol(time, expected[r][i], 1e-3);
            ck_assert_double_eq(one.record.under_way[3 * r + i], under_way[r][i]);
        }
    }
    /* A new cell begins anew. */
    tarry_error error = {0};
    ck_assert_int_eq(tarry_cell_run(one.cell, 0, &one.record, &error), TARRY_OK);
    ck_assert(isnan(one.record.firsts[0]));
    ck_assert_double_eq(one.record.under_way[3 * 2 + 2], 1);
    end(&one);
}
END_TEST

int main(void) {
    const test_entry tests[] = {{"steps", steps},
                                {"too many steps", too_many_steps},
                                {"waited for", waited_for},
                                {"times", times}};
    return run_tests("first_responses", tests, sizeof tests / sizeof tests[0]);
}
