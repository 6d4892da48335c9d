/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Small models against their networks, worked out by hand from design.md, section 3, and the
 * contract in model/network.h. The starts are compared with stationary laws: closed forms, cycles
 * and chains solved by hand, and one general case by GSL's singular values. */
#include "network_text.h"
#include "support.h"

#include <gsl/gsl_linalg.h>
#include <math.h>
#include <stdio.h>
#include <string.h>

/* ---- structure ----------------------------------------------------------------------------------
 */

static const char *const GENE = "delays:\n"
                                "  elongation: {fixed: 3}\n"
                                "  folding: {erlang: {mean: 25, steps: 4}}\n"
                                "genes:\n"
                                "  vela:\n"
                                "    copies: 2\n"
                                "    promoter:\n"
                                "      shut: {to: {open: 0.04}}\n"
                                "      open: {to: {shut: 0.35}, initiates: 6}\n"
                                "    transcript:\n"
                                "      stages: {nascent: elongation, nuclear: 8 min}\n"
                                "      decay: 0.02\n"
                                "    protein:\n"
                                "      translation: 0.5\n"
                                "      stages: {immature: folding}\n"
                                "      lifetime: {exponential: {mean: 200}}\n";

START_TEST(a_gene_with_two_alleles) {
    const tarry_network *network = network_of(GENE);
    ck_assert_str_eq(species_text(network), "state vela.shut of 0\n"
                                            "state vela.open of 0\n"
                                            "allele vela.shut#1 of 0\n"
                                            "allele vela.open#1 of 0\n"
                                            "allele vela.shut#2 of 0\n"
                                            "allele vela.open#2 of 0\n"
                                            "stage vela.nascent of 0\n"
                                            "stage vela.nuclear of 0\n"
                                            "product vela.transcript of 0\n"
                                            "stage vela.immature of 0\n"
                                            "product vela.protein of 0\n");
    ck_assert_str_eq(
        reactions_text(network),
        "0. vela.shut>open: linear 0.04 vela.shut#1(1+0), -1 vela.shut, +1 vela.open, "
        "-1 vela.shut#1, +1 vela.open#1, open 0; affects 0 1 2\n"
        "1. vela.open>shut: linear 0.35 vela.open#1(1+0), +1 vela.shut, -1 vela.open, "
        "+1 vela.shut#1, -1 vela.open#1, close 0; affects 0 1 2\n"
        "2. vela.initiation: linear 6 vela.open#1(0+1), +1 vela.nascent, count 0, lag 0\n"
        "3. vela.shut>open: linear 0.04 vela.shut#2(1+0), -1 vela.shut, +1 vela.open, "
        "-1 vela.shut#2, +1 vela.open#2, open 1; affects 3 4 5\n"
        "4. vela.open>shut: linear 0.35 vela.open#2(1+0), +1 vela.shut, -1 vela.open, "
        "+1 vela.shut#2, -1 vela.open#2, close 1; affects 3 4 5\n"
        "5. vela.initiation: linear 6 vela.open#2(0+1), +1 vela.nascent, count 1, lag 0\n"
        "6. vela.transcript decay: linear 0.02 vela.transcript(1+0), -1 vela.transcript; "
        "affects 6 7\n"
        "7. vela.translation: linear 0.5 vela.transcript(0+1), +1 vela.immature, lag 2\n");
    ck_assert_str_eq(
        lags_text(network),
        "0. vela.nascent elongation 3 in vela.nascent | 1, -1 vela.nascent, +1 vela.nuclear, "
        "lag 1\n"
        "1. vela.nuclear fixed 8 in vela.nuclear | 1, -1 vela.nuclear, +1 vela.transcript; "
        "affects 6 7\n"
        "2. vela.immature folding 25 in vela.immature | 1, -1 vela.immature, +1 vela.protein, "
        "lag 3\n"
        "3. vela.protein exponential 200 in vela.protein | 1, needs 1 vela.protein, "
        "-1 vela.protein\n");
    network_end();
}
END_TEST

START_TEST(tracks_and_products_of_a_gene) {
    const tarry_network *network = network_of(GENE);
    ck_assert_uint_eq(network->n_genes, 1);
    ck_assert_uint_eq(network->n_promoters, 2);
    ck_assert_uint_eq(network->n_tracks, 2);
    const tarry_gene *gene = &network->genes[0];
    ck_assert_uint_eq(gene->n_copies, 2);
    ck_assert(gene->tells);
    ck_assert_int_eq(gene->place.line, 5);
    ck_assert_int_eq(gene->place.column, 3);
    ck_assert_uint_eq(gene->products.to - gene->products.from, 5);
    for (uint32_t i = 0; i < 5; i++)
        ck_assert_uint_eq(network->products[gene->products.from + i], 6 + i);
    for (uint32_t allele = 0; allele < 2; allele++) {
        const tarry_promoter *promoter = &network->promoters[gene->promoters.from + allele];
        ck_assert_uint_eq(promoter->allele, allele);
        ck_assert_uint_eq(promoter->track, gene->tracks.from + allele);
        ck_assert(network->tracks[promoter->track].tells);
        ck_assert(!promoter->steady);
        ck_assert(promoter->start[0] == 1 && promoter->start[1] == 1); /* the first state */
        const tarry_promoter_state *open = &network->states[promoter->states.from + 1];
        ck_assert_str_eq(open->name, "open");
        ck_assert(open->active && !open[-1].active);
        ck_assert_uint_eq(open->sum, 1);
        ck_assert_uint_eq(open->species, 3 + 2 * allele);
        ck_assert_int_eq(open->lag, TARRY_NONE);
    }
    network_end();
}
END_TEST

START_TEST(states_that_last) {
    const tarry_network *network = network_of(
        "genes:\n"
        "  mira:\n"
        "    start: {idle: 1, primed: 3}\n"
        "    bursts_in: [open]\n"
        "    promoter:\n"
        "      idle: {lasts: 20 min, then: {open: 0.75, primed: 0.25}}\n"
        "      primed: {to: {open: {rate: 0.1}}, initiates: 0.5 /min}\n"
        "      open: {lasts: {gamma: {mean: 4, sd: 2}}, then: idle, initiates: 6}\n"
        "    transcript: {half_life: 10}\n");
    ck_assert_str_eq(
        reactions_text(network),
        "0. mira.primed>open: linear 0.1 mira.primed(1+0), -1 mira.primed, +1 mira.open, open 0, "
        "lag 1; affects 0 1 2\n"
        "1. mira.initiation in primed: linear 0.5 mira.primed(0+1), +1 mira.transcript, count 0; "
        "affects 3\n"
        "2. mira.initiation in open: linear 6 mira.open(0+1), +1 mira.transcript, count 0; "
        "affects 3\n"
        "3. mira.transcript decay: linear 0.06931471805599453 mira.transcript(1+0), "
        "-1 mira.transcript; affects 3\n");
    ck_assert_str_eq(lags_text(network),
                     "0. mira.idle fixed 20 in - | 0.75, -1 mira.idle, +1 mira.open, open 0, "
                     "lag 1; affects 2 | 1, -1 mira.idle, +1 mira.primed; affects 0 1\n"
                     "1. mira.open gamma 4 in - | 1, +1 mira.idle, -1 mira.open, close 0, lag 0; "
                     "affects 2\n");
    ck_assert_int_eq(network->states[0].lag, 0);
    ck_assert_int_eq(network->states[1].lag, TARRY_NONE);
    ck_assert_int_eq(network->states[2].lag, 1);
    ck_assert_int_eq(network->lags[1].promoter, 0);
    const double *start = network->promoters[0].start;
    ck_assert(start[0] == 0.25 && start[1] == 1 && start[2] == 1);
    ck_assert_str_eq(network_notes(), "");
    network_end();
}
END_TEST

START_TEST(plain_reactions) {
    const tarry_network *network = network_of(
        "species: {clasp: 14, pin: 9, pair: 0, pre: 0, mature: 2 * 3}\n"
        "parameters: {c: 0.4}\n"
        "reactions:\n"
        "  bind:  {uses: {pin: 1, clasp: 1}, makes: {pair: 1}, rate: c}\n"
        "  twin:  {uses: {pin: 2}, makes: {pin: 1}, needs: {pin: 1, clasp: 2}, rate: 1.5}\n"
        "  start: {makes: {pre: 1}, rate: 3, later: [{after: 5, uses: {pre: 1}, makes: {mature: 1},"
        " later: [{after: 7, chance: 0.9, uses: {mature: 1}, if_short: skip}]}, {after: 9,"
        " makes: {pin: 2}}]}\n"
        "  shots: {makes: {mature: {geometric: {mean: 5, from: 1}}, pair: {poisson: {mean: c}},"
        " pin: {table: {values: [0, 4], weights: [1, 3]}}}, rate: 0.1}\n"
        "  odd:   {uses: {clasp: 1}, propensity: 0.2 * pair / (1 + clasp)}\n"
        "  help:  {uses: {clasp: 1}, rate: c * mature}\n"
        "bursts:\n"
        "  firing: {opens: [start], closes: [odd, help], counts: [shots, odd]}\n");
    ck_assert_str_eq(species_text(network), "plain clasp of -1 from 14\n"
                                            "plain pin of -1 from 9\n"
                                            "plain pair of -1\n"
                                            "plain pre of -1\n"
                                            "plain mature of -1 from 6\n");
    ck_assert_str_eq(
        reactions_text(network),
        "0. bind: ways 0.4 clasp(1+0) pin(1+0), -1 clasp, -1 pin, +1 pair; affects 0 1 4 5\n"
        "1. twin: ways 1.5 clasp(0+2) pin(2+1), -1 pin; affects 0 1\n"
        "2. start: constant 3, +1 pre, open 0, lag 0, lag 2\n"
        "3. shots: constant 0.1, geometric mature 1 5, poisson pair 0.4, table pin 0:0.25 4:1, "
        "count 0; affects 0 1 4 5\n"
        "4. odd: propensity 0.2 * pair / (1 + clasp) clasp(1+0), -1 clasp, count 0, close 0; "
        "affects 0 1 4 5\n"
        "5. help: expression c * mature clasp(1+0), -1 clasp, close 0; affects 0 1 4 5\n");
    ck_assert_str_eq(lags_text(network),
                     "0. start.later fixed 5 in - | 1, needs 1 pre, -1 pre, +1 mature, lag 1; "
                     "affects 5\n"
                     "1. start.later.2 fixed 7 in - | 0.9, skip without 1 mature, -1 mature; "
                     "affects 5\n"
                     "2. start.later.3 fixed 9 in - | 1, +2 pin; affects 0 1\n");
    ck_assert_uint_eq(network->n_genes, 1);
    ck_assert_str_eq(network->genes[0].name, "firing");
    ck_assert_int_eq(network->tracks[0].gene, TARRY_NONE);
    network_end();
}
END_TEST

/* What is used and made again does not change; shares that slip by rounding are put right. */
START_TEST(catalysts_and_thirds) {
    const tarry_network *network = network_of(
        "species: {clasp: 1, pin: 0}\n"
        "reactions: {go: {uses: {clasp: 1}, makes: {clasp: 1, pin: 1}, rate: 2}}\n"
        "genes:\n"
        "  mira: {promoter: {a: {lasts: 1, then: {b: 0.3333333, c: 0.3333333,"
        " e: 0.3333333}}, b: {}, c: {}, e: {}}}\n");
    ck_assert_str_eq(reactions_text(network), "0. go: linear 2 clasp(1+0), +1 pin\n");
    const tarry_outcome *outcomes = &network->outcomes[network->lags[0].outcomes.from];
    ck_assert_double_eq_tol(outcomes[0].cumulative, 1. / 3, 1e-15);
    ck_assert_double_eq_tol(outcomes[1].cumulative, 2. / 3, 1e-15);
    ck_assert(outcomes[2].cumulative == 1);
    network_end();
}
END_TEST

START_TEST(dependents_are_those_that_read) {
    const tarry_network *network = network_of("species: {a: 1, b: 1, c: 1}\n"
                                              "reactions:\n"
                                              "  one: {uses: {a: 1}, needs: {b: 1}, rate: 1}\n"
                                              "  two: {makes: {a: 1}, rate: b + b * c}\n"
                                              "  three: {uses: {b: 1}, propensity: b * c}\n");
    static const uint32_t start[] = {0, 1, 4, 6};
    static const uint32_t rows[] = {0, 0, 1, 2, 1, 2};
    ck_assert_mem_eq(network->dependent_start, start, sizeof start);
    ck_assert_mem_eq(network->dependents, rows, sizeof rows);
    network_end();
}
END_TEST

START_TEST(a_product_with_a_lifetime_made_by_others) {
    const tarry_network *network = network_of(
        "genes:\n"
        "  vela: {promoter: {on: {initiates: 1}}, transcript: {lifetime: 4}}\n"
        "reactions:\n"
        "  inject: {makes: {vela.transcript: 2}, rate: 1}\n");
    ck_assert_str_eq(reactions_text(network),
                     "0. vela.initiation: linear 1 vela.on(0+1), +1 vela.transcript, count 0, "
                     "lag 0\n"
                     "1. inject: constant 1, +2 vela.transcript, lag 0, lag 0\n");
    network_end();
}
END_TEST

/* ---- delays -------------------------------------------------------------------------------------
 */

START_TEST(named_delays_are_shared) {
    const tarry_network *network = network_of(
        "delays: {wait: {fixed: 3}, unused: {fixed: 4}}\n"
        "reactions:\n"
        "  a: {rate: 1, later: [{after: wait}]}\n"
        "  b: {rate: 1, later: [{after: wait}, {after: {fixed: 3}}]}\n");
    ck_assert_uint_eq(network->n_delays, 3);
    ck_assert_uint_eq(network->lags[0].delay, 0);
    ck_assert_uint_eq(network->lags[1].delay, 0);
    ck_assert_uint_eq(network->lags[2].delay, 2);
    network_end();
}
END_TEST

static const tarry_law *law_of(const char *yaml) {
    char model[1000];
    snprintf(model, sizeof model,
             "parameters: {length: 4 kb, speed: 2 kb/min, n: 3}\n"
             "delays:\n"
             "  whole: %s\n"
             "  part: {fixed: length / speed}\n",
             yaml);
    return &network_of(model)->segments[0].laws[0];
}

START_TEST(every_law) {
    static const struct {
        const char *yaml;
        tarry_law_kind kind;
        double a, b;
    } plain[] = {
        {"{fixed: length / speed + 30 s}", TARRY_LAW_FIXED, 2.5, 0},
        {"6 min", TARRY_LAW_FIXED, 6, 0},
        {"part", TARRY_LAW_FIXED, 2, 0},
        {"{exponential: {mean: 1 h}}", TARRY_LAW_EXPONENTIAL, 60, 0},
        {"{erlang: {steps: n, mean: 5}}", TARRY_LAW_ERLANG, 5, 3},
        {"{gamma: {sd: 4, mean: 8}}", TARRY_LAW_GAMMA, 8, 4},
        {"{lognormal: {mean: 8, sd: 4}}", TARRY_LAW_LOGNORMAL, 8, 4},
        {"{normal: {mean: 8, sd: 4}}", TARRY_LAW_NORMAL, 8, 4},
        {"{uniform: {from: 2, to: 4}}", TARRY_LAW_UNIFORM, 2, 4},
        {"{weibull: {shape: 2, scale: 7}}", TARRY_LAW_WEIBULL, 7, 2},
    };
    for (size_t i = 0; i < sizeof plain / sizeof *plain; i++) {
        const tarry_law *law = law_of(plain[i].yaml);
        ck_assert_msg(law->kind == plain[i].kind && law->a == plain[i].a && law->b == plain[i].b,
                      "%s: %d %g %g", plain[i].yaml, (int)law->kind, law->a, law->b);
    }
    network_end();
}
END_TEST

START_TEST(laws_made_of_others) {
    const tarry_law *law = law_of("{table: {edges: [0, 2, 3], weights: [3, 1]}}");
    ck_assert(law->kind == TARRY_LAW_BINS && law->n == 2);
    ck_assert(law->points[0] == 0 && law->points[1] == 2 && law->points[2] == 3);
    ck_assert(law->weights[0] == 0.75 && law->weights[1] == 0.25);
    law = law_of("{table: {values: [5, 1, 5], weights: [1, 2, 1]}}"); /* put into order */
    ck_assert(law->kind == TARRY_LAW_VALUES && law->n == 2);
    ck_assert(law->points[0] == 1 && law->points[1] == 5);
    ck_assert(law->weights[0] == 0.5 && law->weights[1] == 0.5);
    law = law_of("{mix: [{share: 0.25, lasts: part}, {share: 0.75, lasts: {fixed: 9}}]}");
    ck_assert(law->kind == TARRY_LAW_MIX && law->n == 2 && law->weights[0] == 0.25);
    ck_assert(law->parts[0].a == 2 && law->parts[1].a == 9);
    law = law_of("{total: [part, {exponential: {mean: 4}}, part]}");
    ck_assert(law->kind == TARRY_LAW_TOTAL && law->n == 3 && law->parts[2].a == 2);
    ck_assert(law->parts[1].kind == TARRY_LAW_EXPONENTIAL);
    network_end();
}
END_TEST

/* ---- starts in the steady state -----------------------------------------------------------------
 */

static void check_start(const char *promoter, const double *shares, size_t n) {
    char model[2000];
    snprintf(model, sizeof model,
             "parameters: {k_on: 0.04, k_off: 0.35}\n"
             "genes:\n"
             "  vela:\n"
             "    start: steady\n"
             "    promoter: %s\n",
             promoter);
    const tarry_network *network = network_of(model);
    double below = 0;
    ck_assert(network->promoters[0].steady);
    for (size_t i = 0; i < n; i++) {
        below += shares[i];
        ck_assert_msg(fabs(network->promoters[0].start[i] - below) < 1e-14, "%s: state %zu: %.17g",
                      promoter, i, network->promoters[0].start[i]);
    }
    ck_assert(network->promoters[0].start[n - 1] == 1);
    network_end();
}

/* Two states: share open k_on/(k_on + k_off). A cycle: shares as the mean dwells. A chain: detailed
 * balance. A state that lasts counts by its mean whatever its law. States that are left for ever
 * count nothing. All solved by hand. */
START_TEST(steady_starts_by_hand) {
    check_start("{shut: {to: {open: k_on}}, open: {to: {shut: k_off}, initiates: 1}}",
                (double[]){0.35 / 0.39, 0.04 / 0.39}, 2);
    check_start("{a: {to: {b: 2}}, b: {to: {c: 3}}, c: {to: {a: 5}, initiates: 1}}",
                (double[]){15. / 31, 10. / 31, 6. / 31}, 3);
    check_start("{a: {to: {b: 1}}, b: {to: {a: 2, c: 3}}, c: {to: {b: 4}, initiates: 1}}",
                (double[]){8. / 15, 4. / 15, 3. / 15}, 3);
    /* The embedded chain spends 1 : 0.75 + 0.25 : 0.25 visits in idle, open, primed; dwells are 20,
     * 4 and 10. */
    check_start("{idle: {lasts: {gamma: {mean: 20, sd: 9}}, then: {open: 0.75, primed: 0.25}},"
                " open: {lasts: 4, then: idle, initiates: 1}, primed: {to: {open: 0.1}}}",
                (double[]){20 / 26.5, 4 / 26.5, 2.5 / 26.5}, 3);
    check_start(
        "{new: {to: {shut: 7}}, shut: {to: {open: 1}}, open: {to: {shut: 3}, initiates: 1}}",
        (double[]){0, 0.75, 0.25}, 3);
    check_start("{new: {to: {last: 7}}, last: {initiates: 1}}", (double[]){0, 1}, 2);
    check_start("{only: {initiates: 1}}", (double[]){1}, 1);
}
END_TEST

/* The null vector of the transposed generator, as the last right singular vector of GSL. */
START_TEST(a_steady_start_by_singular_values) {
    enum { N = 6 };
    double rates[N][N];
    char promoter[1500] = "{";
    size_t at = 1;
    gsl_matrix *generator = gsl_matrix_calloc(N, N);
    for (size_t i = 0; i < N; i++) {
        at += (size_t)snprintf(promoter + at, sizeof promoter - at, "s%zu: {initiates: 1, to: {",
                               i);
        for (size_t j = 0; j < N; j++) {
            rates[i][j] = i == j ? 0 : (double)((7 * i + 5 * j * j + 3 * i * j) % 11 + 1) / 8;
            if (i == j)
                continue;
            at += (size_t)snprintf(promoter + at, sizeof promoter - at, "%ss%zu: %g",
                                   j == (i == 0) ? "" : ", ", j, rates[i][j]);
            *gsl_matrix_ptr(generator, j, i) += rates[i][j];
            *gsl_matrix_ptr(generator, i, i) -= rates[i][j];
        }
        at += (size_t)snprintf(promoter + at, sizeof promoter - at, "}}%s", i + 1 < N ? ", " : "}");
    }
    gsl_matrix *v = gsl_matrix_alloc(N, N);
    gsl_vector *s = gsl_vector_alloc(N), *work = gsl_vector_alloc(N);
    ck_assert_int_eq(gsl_linalg_SV_decomp(generator, v, s, work), 0);
    double shares[N], sum = 0;
    for (size_t i = 0; i < N; i++)
        sum += gsl_matrix_get(v, i, N - 1);
    for (size_t i = 0; i < N; i++)
        shares[i] = gsl_matrix_get(v, i, N - 1) / sum;
    check_start(promoter, shares, N);
    gsl_matrix_free(generator);
    gsl_matrix_free(v);
    gsl_vector_free(s);
    gsl_vector_free(work);
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"a gene with two alleles", a_gene_with_two_alleles},
        {"tracks and products of a gene", tracks_and_products_of_a_gene},
        {"states that last", states_that_last},
        {"plain reactions", plain_reactions},
        {"catalysts and thirds", catalysts_and_thirds},
        {"dependents are those that read", dependents_are_those_that_read},
        {"a product with a lifetime made by others", a_product_with_a_lifetime_made_by_others},
        {"named delays are shared", named_delays_are_shared},
        {"every law", every_law},
        {"laws made of others", laws_made_of_others},
        {"steady starts by hand", steady_starts_by_hand},
        {"a steady start by singular values", a_steady_start_by_singular_values},
    };
    return run_tests("network", tests, sizeof tests / sizeof *tests);
}
