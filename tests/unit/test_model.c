/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Whole models, read as a user's: the head of the file, values at a step of the protocol, files
 * beside the model, many genes, and memory that runs out. Rules: design.md, section 3. */
#include "base/text.h"
#include "faults.h"
#include "model/model.h"
#include "support.h"
#include "tarry/tarry.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>

static tarry_model *read_text(const char *text) {
    tarry_model *model = NULL;
    tarry_error error = {0};
    const int code = tarry_model_read_text(text, strlen(text), "m.yaml", NULL, 0, &model, &error);
    ck_assert_msg(code == 0, "%s\n%d:%d: %s", text, error.line, error.column, error.message);
    return model;
}

static void refused(const char *text, int line, int column, const char *words) {
    tarry_model *model = NULL;
    tarry_error error = {0};
    const int code = tarry_model_read_text(text, strlen(text), "m.yaml", NULL, 0, &model, &error);
    ck_assert_msg((code == TARRY_INPUT || code == TARRY_NOT_YET) && error.line == line &&
                      error.column == column && strstr(error.message, words) != NULL &&
                      strcmp(error.file, "m.yaml") == 0,
                  "%s\nexpected %d:%d: ...%s...\ngot %d:%d: %s", text, line, column, words,
                  error.line, error.column, error.message);
    ck_assert_ptr_null(model);
}

/* The first note with these words. */
static const char *noted(const tarry_model *model, const char *words) {
    for (size_t i = 0; i < tarry_model_n_warnings(model); i++)
        if (strstr(tarry_model_warning(model, i), words) != NULL)
            return tarry_model_warning(model, i);
    ck_abort_msg("no note says '%s'", words);
    return "";
}

/* Told by the size alone; nothing of the text is looked at. */
START_TEST(too_large) {
    tarry_model *model = NULL;
    tarry_error error = {0};
    ck_assert_int_eq(
        tarry_model_read_text("", ((size_t)64 << 20) + 1, "m.yaml", NULL, 0, &model, &error),
        TARRY_INPUT);
    ck_assert_str_eq(error.message, "this model is too large: at most 67108864 bytes are read");
    ck_assert_ptr_null(model);
}
END_TEST

START_TEST(head_of_the_file) {
    refused("", 1, 1, "");
    refused("- tarry\n", 1, 1, "must be a map");
    refused("time: min\nrun: {until: 1}\n", 1, 1, "tarry: 1");
    refused("tarry: 2\ntime: min\n", 1, 8, "version '2'");
    refused("tarry: 1\nrun: {until: 1}\n", 1, 1, "needs 'time'");
    refused("tarry: 1\ntime: ms\nrun: {until: 1}\n", 2, 7, "must be s, min, h or d, not 'ms'");
    refused("tarry: 1\ntime: min\nrnu: {until: 1}\n", 3, 1, "did you mean 'run'?");
    refused("tarry: 1\ntime: min\nrun: {until: 1}\nfit: {}\n", 4, 1, "'fit' cannot be used yet");
    refused("tarry: 1\ntime: min\ntitle: [a]\n", 3, 8, "'title' must be a single value");
    tarry_model *model = read_text("tarry: 1\ntime: h\ntitle: Off and on\nrun: {until: 90 min}\n");
    ck_assert_str_eq(model->network.title, "Off and on");
    ck_assert_str_eq(model->network.time_unit, "h");
    ck_assert(model->network.run.until == 1.5);
    size_t size = 0;
    ck_assert_str_eq(tarry_model_text(model, &size),
                     "tarry: 1\ntime: h\ntitle: Off and on\nrun: {until: 90 min}\n");
    ck_assert_uint_eq(size, 56);
    tarry_model_free(model);
    tarry_model_free(NULL);
}
END_TEST

/* Rates, means, formulas and laws in each segment. */
START_TEST(values_change_at_a_step) {
    tarry_model *model = read_text("tarry: 1\n"
                                   "time: min\n"
                                   "parameters: {k: 2, double: 2 * k}\n"
                                   "delays: {wait: {gamma: {mean: double, sd: 1}}}\n"
                                   "species: {x: 3}\n"
                                   "genes:\n"
                                   "  vela:\n"
                                   "    promoter: {on: {initiates: double}}\n"
                                   "    transcript: {stages: {young: wait}, half_life: k}\n"
                                   "reactions:\n"
                                   "  burst: {makes: {x: {geometric: {mean: k}}}, rate: k * x}\n"
                                   "protocol:\n"
                                   "  - {at: 4, set: {k: 8}}\n"
                                   "run: {until: 10}\n");
    const tarry_network *network = &model->network;
    ck_assert_uint_eq(network->n_segments, 2);
    double counts[8] = {0};
    const uint32_t x = network->n_species - 1;
    for (int i = 0; i < 2; i++) {
        const tarry_segment *segment = &network->segments[i];
        const double k = i == 0 ? 2 : 8;
        ck_assert(segment->rates[network->reactions[0].rate] == 2 * k);
        ck_assert_double_eq_tol(segment->rates[network->reactions[1].rate], log(2) / k, 1e-15);
        ck_assert(segment->means[0] == k);
        counts[x] = 5;
        ck_assert(tarry_expression_value(&segment->formulas[0], NULL, counts) == 5 * k);
        ck_assert(segment->laws[0].a == 2 * k && segment->laws[0].b == 1);
    }
    tarry_model_free(model);
}
END_TEST

START_TEST(values_that_go_wrong_at_a_step) {
    static const char head[] = "tarry: 1\n"
                               "time: min\n"
                               "parameters: {k: 2}\n"
                               "protocol:\n"
                               "  - {at: 4, set: {k: -1}}\n"
                               "run: {until: 10}\n";
    static const struct {
        const char *rest;
        int column;
        const char *words;
    } cases[] = {
        {"reactions: {go: {rate: k}}\n", 24, "the rate of 'go' is -1"},
        {"reactions: {go: {rate: 1, later: [{after: {fixed: k}}]}}\n", 43, ""},
        {"reactions: {go: {rate: 1, later: [{after: 1, chance: k / 2}]}}\n", 54,
         "'chance', 'k / 2', would change at a step of the protocol"},
        {"species: {x: k}\n", 14, "would change at a step"},
    };
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        char text[1000];
        snprintf(text, sizeof text, "%s%s", head, cases[i].rest);
        refused(text, 7, cases[i].column, cases[i].words);
        refused(text, 7, cases[i].column, "after the step '");
    }
}
END_TEST

static void write_file(const char *path, const char *text) {
    FILE *file = fopen(path, "w");
    ck_assert_ptr_nonnull(file);
    fputs(text, file);
    ck_assert_int_eq(fclose(file), 0);
}

START_TEST(tables_lie_beside_the_model) {
    const char *path = test_path("m.yaml");
    tarry_model *model = NULL;
    tarry_error error = {0};
    write_file(test_path("lags.csv"), "value,weight\n5,1\n");
    write_file(path, "tarry: 1\n"
                     "time: min\n"
                     "delays: {wait: {table: {file: lags.csv}}}\n"
                     "run: {until: 1}\n");
    ck_assert_msg(tarry_model_read(path, NULL, 0, &model, &error) == 0, "%s", error.message);
    ck_assert(model->network.segments[0].laws[0].points[0] == 5);
    tarry_model_free(model);
    write_file(test_path("lags.csv"), "value,weight\n5,x\n");
    ck_assert_int_eq(tarry_model_read(path, NULL, 0, &model, &error), TARRY_INPUT);
    ck_assert_str_eq(error.file, test_path("lags.csv"));
    ck_assert_int_eq(error.line, 2);
    ck_assert_int_eq(error.column, 3);
    ck_assert_int_eq(tarry_model_read(test_path("none.yaml"), NULL, 0, &model, &error), TARRY_FILE);
    ck_assert_ptr_null(model);
}
END_TEST

/* What the time to settle does not take into account is said. */
START_TEST(settle_by_itself) {
    tarry_model *model = read_text(
        "tarry: 1\ntime: min\nspecies: {x: 0, y: 3}\nreactions: {go: {makes: {x: 1}, rate: 1}}\n"
        "genes:\n"
        "  vela: {promoter: {on: {initiates: 2}}, transcript: {decay: 0.1}}\n"
        "  mira: {promoter: {on: {initiates: x}}, transcript: {decay: 0.1}}\n"
        "run: {until: 10, settle: auto}\n");
    ck_assert(model->network.run.settle > 60);
    ck_assert_ptr_nonnull(
        strstr(noted(model, "goes by"),
               "m.yaml:8:26: 'settle: auto' goes by the 1 mean that can be worked "
               "out; 1 cannot, and may take longer to be steady "
               "('mira.transcript': the rate of 'mira.initiation' reads counts of "
               "species)"));
    ck_assert_ptr_nonnull(strstr(noted(model, "plain"), "of which 1 changes in this model"));
    tarry_model_free(model);
    refused("tarry: 1\ntime: min\ngenes:\n"
            "  mira: {promoter: {on: {initiates: mira.transcript}}, transcript: {decay: 0.1}}\n"
            "run: {until: 10, settle: auto}\n",
            5, 26, "no product has a steady mean that is known ('mira.transcript': the rate of");
}
END_TEST

START_TEST(no_memory) {
    static const char text[] =
        "tarry: 1\n"
        "time: min\n"
        "delays: {a: {gamma: {mean: 3, sd: 1}}, b: {mix: [{share: 1, lasts: a}]}}\n"
        "genes:\n"
        "  vela:\n"
        "    copies: 2\n"
        "    start: steady\n"
        "    promoter: {shut: {lasts: a, then: open}, open: {to: {shut: 2}, initiates: x}}\n"
        "    transcript: {stages: {nascent: b}, lifetime: 3}\n"
        "  mira: {start: steady, promoter: {on: {initiates: 1}}, transcript: {decay: 1}}\n"
        "  lyra: {many: 2, promoter: {on: {initiates: lyra.transcript}},\n"
        "         transcript: {stages: {young: {fixed: 1}}, decay: 2}}\n"
        "species: {x: 14, y: 0}\n"
        "reactions:\n"
        "  go: {uses: {x: 1}, makes: {y: {table: {values: [1, 2], weights: [1, 1]}}}, rate: 1,\n"
        "       later: [{after: a, uses: {y: 1}, makes: {x: {poisson: {mean: 3}}}}]}\n"
        "parameters: {k: 1}\n"
        "bursts: {go_on: {opens: [go], closes: [go]}}\n"
        "signals: {spot: {of: vela.nascent, ramp: {from: 0, to: 1}, brightness: 1}}\n"
        "protocol: [{from: 1, to: 2, ramp: {k: 2}, steps: 2},\n"
        "           {every: 1, times: 2, do: [{at: 3, set: {x: 1}}]}]\n"
        "run: {until: 10, settle: auto}\n";
    long n = 0;
    for (;; n++) {
        tarry_model *model = NULL;
        tarry_error error = {0};
        faults_arm(FAULT_MEMORY, n, 0);
        const int code = tarry_model_read_text(text, strlen(text), "m.yaml", NULL, 0, &model,
                                               &error);
        const bool struck = faults_struck();
        faults_clear();
        if (!struck) {
            ck_assert_msg(code == 0, "%d:%d: %s", error.line, error.column, error.message);
            tarry_model_free(model);
            break;
        }
        ASSERT_FAST(code == TARRY_MEMORY, "allocation %ld: %d: %s", n, code, error.message);
        ASSERT_FAST(model == NULL, "allocation %ld", n);
    }
    ck_assert_int_gt(n, 100);
}
END_TEST

/* Reading takes a time in proportion to the genes: twice as many take less than three times as
 * long, where a quadratic step would take four. */
static double seconds_for(int n_genes) {
    tarry_text text = {0};
    tarry_text_add_string(&text, "tarry: 1\ntime: min\ndelays: {wait: {fixed: 2}}\ngenes:\n");
    for (int i = 0; i < n_genes; i++)
        tarry_text_printf(&text,
                          "  g%d:\n"
                          "    copies: 2\n"
                          "    start: steady\n"
                          "    promoter: {shut: {to: {open: 1}}, open: {to: {shut: 1 /min},"
                          " initiates: \"2 * repress(g%d.protein, 40, 2)\"}}\n"
                          "    transcript: {stages: {nascent: wait}, half_life: 35}\n"
                          "    protein: {translation: 0.05, half_life: 4 h}\n",
                          i, (i * 7 + 1) % n_genes);
    tarry_text_add_string(&text, "run: {until: 10}\n");
    ck_assert(!text.failed);
    const clock_t before = clock();
    tarry_model *model = read_text(text.data);
    const double seconds = (double)(clock() - before) / CLOCKS_PER_SEC;
    ck_assert_uint_eq(model->network.n_reactions, 9u * (unsigned)n_genes);
    tarry_model_free(model);
    tarry_text_release(&text);
    return seconds;
}

START_TEST(many_genes) {
    const int n_genes = test_small() ? 1000 : 10000;
    const double half = seconds_for(n_genes / 2);
    const double whole = seconds_for(n_genes);
    ck_assert_msg(whole < 3 * half + 0.1, "%g s, then %g s", half, whole);
}
END_TEST

/* What like genes have in common stands once, however many there are. */
START_TEST(like_genes_share) {
    static const int numbers[] = {2, 500};
    for (size_t i = 0; i < 2; i++) {
        char text[512];
        const uint32_t n = (uint32_t)numbers[i];
        snprintf(text, sizeof text,
                 "tarry: 1\ntime: min\ngenes:\n"
                 "  vela: {many: %u, copies: 2, promoter: {shut: {to: {open: 0.04}}, open: {to: "
                 "{shut: 0.35}, initiates: 2}}, transcript: {stages: {nascent: {fixed: 3}}, "
                 "half_life: 35}}\nrun: {until: 10}\n",
                 (unsigned)n);
        tarry_model *model = read_text(text);
        ck_assert_uint_eq(model->network.n_genes, n);
        ck_assert_uint_eq(model->network.n_promoters, 2 * n);
        ck_assert_uint_eq(model->network.n_lags, n);
        ck_assert_uint_eq(model->network.n_rates, 4); /* two moves, initiation, decay */
        ck_assert_uint_eq(model->network.n_delays, 1);
        tarry_model_free(model);
    }
}
END_TEST

/* The common name outside the genes: under `record` it means all, elsewhere nothing. */
START_TEST(common_name_of_like_genes) {
    static const char head[] = "tarry: 1\ntime: min\ngenes:\n"
                               "  vela: {many: 3, promoter: {on: {initiates: 2}}, transcript: "
                               "{decay: 1}}\n"
                               "  lyra: {promoter: {on: {initiates: 2}}, transcript: {decay: 1}}\n";
    char text[512];
    snprintf(text, sizeof text, "%srun: {until: 10, record: [vela]}\n", head);
    tarry_model *model = read_text(text);
    ck_assert_uint_eq(model->network.n_channels, 8); /* a state and a product of each gene */
    for (uint32_t i = 0; i < 8; i++)
        ck_assert_int_eq(model->network.channels[i].recorded, i < 6);
    tarry_model_free(model);
    snprintf(text, sizeof text, "%srun: {until: 10, record: [vela.transcript]}\n", head);
    refused(text, 6, 27, "'vela' stands for 3 like genes, vela_1 to vela_3");
    snprintf(text, sizeof text,
             "%srun: {until: 10}\nprotocol: [{at: 1, set: {vela.promoter: on}}]\n", head);
    refused(text, 7, 26, "name one of them, as vela_1.promoter");
    snprintf(text, sizeof text, "%srun: {until: 10}\nspecies: {vela: 3}\n", head);
    refused(text, 7, 11, "'vela' would name a species here, but it names many like genes already");
    snprintf(text, sizeof text,
             "%srun: {until: 10}\nreactions: {go: {rate: 1}}\nbursts: {vela: {opens: [go], "
             "closes: [go]}}\n",
             head);
    refused(text, 8, 10, "it names many like genes already");
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"too large", too_large},
        {"head of the file", head_of_the_file},
        {"values change at a step", values_change_at_a_step},
        {"values that go wrong at a step", values_that_go_wrong_at_a_step},
        {"tables lie beside the model", tables_lie_beside_the_model},
        {"settle by itself", settle_by_itself},
        {"no memory", no_memory},
        {"many genes", many_genes},
        {"like genes share", like_genes_share},
        {"common name of like genes", common_name_of_like_genes},
    };
    tarry_start();
    return run_tests("model", tests, sizeof tests / sizeof *tests);
}
