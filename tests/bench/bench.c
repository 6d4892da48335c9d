/* SPDX-License-Identifier: GPL-3.0-or-later */

/* How long a firing or a completion takes: the engine bare and with the default tallies, beside
 * loops written by hand for the same model, all in one run and one thread, turn about, so that a
 * machine whose speed drifts treats all alike. Medians of the rounds are printed.
 *
 *     bench count CASE WHAT
 *
 * does one cell of a case once, for those who count instructions (tests/instructions.sh): CASE is
 * a, b, c or d, WHAT is bare, tallied or hand. It prints the number of events. */

#define _POSIX_C_SOURCE 200809L

#include "hand_loop.h"

#include "base/file.h"
#include "base/text.h"
#include "engine/cell.h"
#include "model/model.h"
#include "tally/tally.h"
#include "tarry/tarry.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <time.h>

enum { ROUNDS = 7 };

typedef int (*hand_loop)(const hand_model *, double, uint64_t, hand_result *);

typedef struct bench_case {
    const char *title;
    const char *text; /* NULL: made by make_many */
    hand_loop hand, other_hand;
    int cells;
} bench_case;

static const hand_model gene = {0.04, 0.35, 6, 0.0198, 0.8, 0.00289, 2.3, 25, 1.2, 8};
static const double until = 3000;

#define GENE(name, transcript_lag, protein_lag)                                                    \
    "  " name ":\n"                                                                                \
    "    promoter:\n"                                                                              \
    "      shut: {to: {open: 0.04}}\n"                                                             \
    "      open: {to: {shut: 0.35}, initiates: 6}\n"                                               \
    "    transcript: {stages: {nascent: " transcript_lag "}, decay: 0.0198}\n"                     \
    "    protein: {translation: 0.8, stages: {immature: " protein_lag "}, decay: 0.00289}\n"

#define HEAD "tarry: 1\ntime: min\n"

static const bench_case cases[] = {
    {"(a) two-state gene, fixed lags",
     HEAD "genes:\n" GENE("vela", "{fixed: 2.3}", "{fixed: 25}") "run: {until: 3000}\n",
     hand_loop_fixed, hand_loop_fixed_rings, 8},
    {"(b) two-state gene, gamma lags",
     HEAD "genes:\n" GENE("vela", "{gamma: {mean: 2.3, sd: 1.2}}",
                          "{gamma: {mean: 25, sd: 8}}") "run: {until: 3000}\n",
     hand_loop_gamma, NULL, 8},
    {"(c) delayed feedback",
     HEAD "species: {m: 8, p: 160}\n"
          "reactions:\n"
          "  transcribe: {propensity: \"33 * repress(p, 40, 2)\", "
          "later: [{after: {fixed: 7.1}, makes: {m: 1}}]}\n"
          "  translate: {needs: {m: 1}, rate: 4.5, later: [{after: {fixed: 1.7}, makes: {p: 1}}]}\n"
          "  m_decay: {uses: {m: 1}, rate: 0.23}\n"
          "  p_decay: {uses: {p: 1}, rate: 0.23}\n"
          "run: {until: 3000}\n",
     NULL, NULL, 8},
    {"(d) 1,000 such genes, fixed lags", NULL, NULL, NULL, 1},
};

static void die(const tarry_error *error) {
    fprintf(stderr, "bench: %s\n", error->message);
    exit(1);
}

static double now(void) {
    struct timespec t;
    clock_gettime(CLOCK_MONOTONIC, &t);
    return (double)t.tv_sec + 1e-9 * (double)t.tv_nsec;
}

/* 1,000 genes written out; the text is the caller's. */
static char *make_many(const char *until_when) {
    tarry_text text = {0};
    tarry_text_add_string(&text, HEAD "genes:\n");
    for (int i = 0; i < 1000; i++) {
        char name[32];
        snprintf(name, sizeof name, "vela%d", i);
        tarry_text_printf(&text, GENE("%s", "{fixed: 2.3}", "{fixed: 25}"), name);
    }
    tarry_text_printf(&text, "run: {until: %s}\n", until_when);
    if (text.failed)
        exit(1);
    return text.data;
}

typedef struct bench {
    tarry_model *model;
    tarry_engine *engine;
    tarry_cell *cell;
    tarry_record record;
    tarry_tally_set *tallies;
    double *scratch;
} bench;

static void set_up(bench *b, const char *text) {
    tarry_error error;
    if (tarry_model_read_text(text, strlen(text), "bench.yaml", NULL, 0, &b->model, &error) ||
        tarry_engine_new(&b->model->network, "direct", &b->engine, &error) ||
        tarry_cell_new(b->engine, &b->cell, &error) ||
        tarry_record_init(&b->record, &b->model->network, &error) ||
        tarry_tally_set_new(&b->model->network, &b->tallies, &error))
        die(&error);
    b->scratch = calloc(tarry_tally_set_scratch(&b->model->network) + 1, sizeof(double));
    if (!b->scratch)
        exit(1);
}

static void tear_down(bench *b) {
    free(b->scratch);
    tarry_tally_set_free(b->tallies);
    tarry_record_release(&b->record);
    tarry_cell_free(b->cell);
    tarry_engine_free(b->engine);
    tarry_model_free(b->model);
}

/* What instructions are counted of must keep its name. */
#define COUNTED static __attribute__((noinline))

/* Nanoseconds an event. */
COUNTED double time_bare(bench *b, int cells, double *n_events) {
    tarry_error error;
    int64_t events = 0;
    const double start = now();
    for (int i = 0; i < cells; i++) {
        int64_t firings, completions;
        if (tarry_cell_run_bare(b->cell, i, &firings, &completions, &error))
            die(&error);
        events += firings + completions;
    }
    *n_events = (double)events;
    return 1e9 * (now() - start) / (double)events;
}

static int64_t count_events(const bench *b) {
    int64_t events = 0;
    for (uint32_t i = 0; i < b->model->network.n_reactions; i++)
        events += b->record.firings[i];
    for (uint32_t i = 0; i < b->model->network.n_lags; i++)
        events += b->record.completions[i];
    return events;
}

COUNTED double time_tallied(bench *b, int cells, int round, double *n_events) {
    tarry_error error;
    int64_t events = 0;
    const double start = now();
    for (int i = 0; i < cells; i++) {
        const int64_t number = (int64_t)round * cells + i;
        if (tarry_cell_run(b->cell, number, &b->record, &error) ||
            tarry_tally_set_add(b->tallies, &b->record, b->scratch, &error))
            die(&error);
        events += count_events(b);
    }
    *n_events = (double)events;
    return 1e9 * (now() - start) / (double)events;
}

COUNTED double time_hand(hand_loop loop, int cells, double *n_events) {
    int64_t events = 0;
    const double start = now();
    for (int i = 0; i < cells; i++) {
        hand_result result;
        if (loop(&gene, until, (uint64_t)i + 1, &result))
            exit(1);
        events += result.firings + result.completions;
    }
    *n_events = (double)events;
    return 1e9 * (now() - start) / (double)events;
}

static int compare(const void *one, const void *other) {
    const double a = *(const double *)one, b = *(const double *)other;
    return (a > b) - (a < b);
}

static double median(double values[ROUNDS]) {
    qsort(values, ROUNDS, sizeof *values, compare);
    return values[ROUNDS / 2];
}

static void run_case(const bench_case *c) {
    char *many = c->text ? NULL : make_many("100");
    bench b = {0};
    double bare[ROUNDS], tallied[ROUNDS], hand[ROUNDS] = {0}, other[ROUNDS] = {0}, events, ignored;
    double to_hand[ROUNDS] = {0}, to_bare[ROUNDS], to_other[ROUNDS] = {0};
    set_up(&b, many ? many : c->text);
    for (int i = 0; i < ROUNDS; i++) {
        bare[i] = time_bare(&b, c->cells, &events);
        tallied[i] = time_tallied(&b, c->cells, i, &events);
        to_bare[i] = tallied[i] / bare[i];
        if (c->hand)
            to_hand[i] = bare[i] / (hand[i] = time_hand(c->hand, c->cells, &ignored));
        if (c->other_hand)
            to_other[i] = bare[i] / (other[i] = time_hand(c->other_hand, c->cells, &ignored));
    }
    printf("%-34s %9.0f %7.1f %9.1f %7.2f", c->title, events, median(bare), median(tallied),
           median(to_bare));
    if (c->hand)
        printf(" %7.1f %7.2f", median(hand), median(to_hand));
    printf("\n");
    if (c->other_hand)
        printf("%-34s %9s %7s %9s %7s %7.1f %7.2f\n", "    with a queue for each lag by hand", "",
               "", "", "", median(other), median(to_other));
    tear_down(&b);
    free(many);
}

static void print_hash(const char *path) {
    tarry_text text = {0};
    tarry_error error;
    char hash[TARRY_SHA256_TEXT];
    if (tarry_file_read(path, 1 << 20, &text, &error))
        die(&error);
    tarry_sha256(text.data, text.size, hash);
    printf("hand loops: %s, SHA-256 %s\n", path, hash);
    tarry_text_release(&text);
}

/* One cell, once. Returns the exit status. */
static int count(const char *letter, const char *what) {
    const size_t n_cases = sizeof cases / sizeof *cases;
    const size_t i = (size_t)(letter[0] - 'a');
    const bench_case *c = &cases[i < n_cases ? i : 0];
    char *many = c->text ? NULL : make_many("20");
    bench b = {0};
    double events = 0;
    set_up(&b, many ? many : c->text);
    if (!strcmp(what, "bare"))
        time_bare(&b, 1, &events);
    else if (!strcmp(what, "tallied"))
        time_tallied(&b, 1, 0, &events);
    else if (!strcmp(what, "hand") && c->hand)
        time_hand(c->hand, 1, &events);
    printf("%.0f\n", events);
    tear_down(&b);
    free(many);
    return events > 0 ? 0 : 2;
}

int main(int n_words, char **words) {
    tarry_start();
    hand_loop_set_up();
    if (n_words == 4 && !strcmp(words[1], "count"))
        return count(words[2], words[3]);
    print_hash("tests/bench/hand_loop.c");
    printf("%-34s %9s %7s %9s %7s %7s %7s\n", "ns a firing or completion, one thread", "events",
           "bare", "tallied", "/ bare", "by hand", "bare /");
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++)
        run_case(&cases[i]);
    return 0;
}
