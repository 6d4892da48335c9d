/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Exact covariances of counts and signals, and bursts, against closed forms. */

#include "support.h"

#include "exact/bursts.h"
#include "exact/covariance.h"
#include "exact/gauss.h"
#include "exact/moments.h"
#include "model/model.h"
#include "tarry/tarry.h"

#include <gsl/gsl_integration.h>
#include <math.h>
#include <stdarg.h>
#include <stdio.h>
#include <string.h>

/* ---- models -------------------------------------------------------------------------------- */

typedef struct subject {
    tarry_model *model;
    tarry_flow_index index;
    tarry_arena arena;
    tarry_exact_gene gene;
} subject;

static subject read_gene(const char *format, ...) __attribute__((format(printf, 1, 2)));

/* The first gene of a model, given from `genes:` on; recorded from 0 to 10 after 500 to settle. */
static subject read_gene(const char *format, ...) {
    char body[2048], text[4096], what[2048];
    va_list arguments;
    subject s = {0};
    tarry_error error = {0};
    va_start(arguments, format);
    vsnprintf(body, sizeof body, format, arguments);
    va_end(arguments);
    snprintf(text, sizeof text, "tarry: 1\ntime: min\n%srun: {until: 10, every: 1, settle: 500}\n",
             body);
    tarry_start();
    const int code = tarry_model_read_text(text, strlen(text), "m.yaml", NULL, 0, &s.model, &error);
    ck_assert_msg(code == 0, "%s", tarry_error_text(&error, what, (int)sizeof what));
    ck_assert_int_eq(tarry_flow_index_init(&s.index, &s.model->network, &error), 0);
    ck_assert_int_eq(
        tarry_exact_gene_read(&s.index, s.model->network.segments, 0, &s.arena, &s.gene, &error),
        0);
    return s;
}

static void release(subject *s) {
    tarry_flow_index_release(&s->index);
    tarry_arena_release(&s->arena);
    tarry_model_free(s->model);
}

static tarry_exact_view view_of(subject *s, const char *name) {
    const tarry_network *network = &s->model->network;
    tarry_exact_view view = {0};
    tarry_error error = {0};
    uint32_t i = 0;
    while (i < network->n_channels && strcmp(network->channels[i].name, name) != 0)
        i++;
    ck_assert_uint_lt(i, network->n_channels);
    ck_assert_int_eq(
        tarry_exact_view_read(network, &s->gene, &network->channels[i], &s->arena, &view, &error),
        0);
    ck_assert(tarry_exact_view_sees(&view));
    return view;
}

static tarry_exact_covariance covariance_of(subject *s, const char *one, const char *other) {
    const tarry_exact_view first = view_of(s, one), second = view_of(s, other);
    tarry_exact_covariance c = {0};
    tarry_error error = {0};
    const char *why = NULL;
    char what[2048];
    const int code = tarry_exact_covariance_init(&s->gene, &first, &second, 0, 10, 510, &s->arena,
                                                 &c, &why, &error);
    ck_assert_msg(code == 0, "%s", tarry_error_text(&error, what, (int)sizeof what));
    ck_assert_msg(why == NULL, "%s", why);
    return c;
}

/* ---- counts -------------------------------------------------------------------------------- */

/* Transcripts of an active gene that live a fixed time L: covariance k (L - |tau|) up to L; and
 * with an exponential life k/d exp(-d tau) (M/G/infinity: k times the integral of the survival from
 * tau on; Riordan 1951, Bell Syst. Tech. J. 30:293, from memory). */
START_TEST(an_active_genes_counts) {
    subject fixed = read_gene("genes: {vela: {promoter: {on: {initiates: 3}}, transcript: "
                              "{lifetime: {fixed: 4}}}}\n");
    subject decay = read_gene("genes: {vela: {promoter: {on: {initiates: 3}}, transcript: "
                              "{stages: {a: {gamma: {mean: 5, sd: 2}}}, decay: 0.4}}}\n");
    tarry_exact_covariance c = covariance_of(&fixed, "vela.transcript", "vela.transcript");
    tarry_exact_covariance d = covariance_of(&decay, "vela.transcript", "vela.transcript");
    for (double tau = 0; tau < 6; tau += 0.25) {
        ck_assert_double_eq_tol(tarry_exact_covariance_at(&c, tau), 3 * fmax(4 - tau, 0), 1e-9);
        ck_assert_double_eq_tol(tarry_exact_covariance_at(&d, tau), 7.5 * exp(-0.4 * tau), 1e-9);
    }
    tarry_exact_covariance_release(&c);
    tarry_exact_covariance_release(&d);
    release(&fixed);
    release(&decay);
}
END_TEST

/* Two states (rates a, b; initiation k; decay d; K = a + b; p = a/K): the covariance of the
 * initiation rate is k^2 p (1 - p) exp(-K h), so that of the transcripts is
 * k p/d exp(-d tau) + k^2 p (1 - p) (d exp(-K tau) - K exp(-d tau))/(d (d^2 - K^2)) (shot noise
 * filtered by an exponential; common practice, Paulsson 2005 for tau = 0). */
START_TEST(two_states_counts) {
    const double a = 0.2, b = 0.7, k = 6, d = 0.15, K = a + b, p = a / K;
    subject s = read_gene(
        "genes: {vela: {start: steady, copies: 2, promoter: {shut: {to: {open: 0.2}}, "
        "open: {to: {shut: 0.7}, initiates: 6}}, transcript: {stages: {n: {fixed: "
        "3}}, decay: 0.15}}}\n");
    tarry_exact_covariance c = covariance_of(&s, "vela.transcript", "vela.transcript");
    ck_assert_double_eq_tol(c.mean[0], 2 * k * p / d, 1e-9);
    for (double tau = 0; tau < 20; tau += 0.5) {
        const double switching = k * k * p * (1 - p) * (d * exp(-K * tau) - K * exp(-d * tau)) /
                                 (d * (d * d - K * K));
        ck_assert_double_eq_tol(tarry_exact_covariance_at(&c, tau),
                                2 * (k * p / d * exp(-d * tau) + switching), 1e-8);
    }
    tarry_exact_covariance_release(&c);
    release(&s);
}
END_TEST

/* The variance by the covariance at lag 0 and by the generating function are one number, for each
 * stage of a gene with all sorts of lags and losses. */
START_TEST(two_routes_to_one_variance) {
    subject s = read_gene(
        "genes:\n  vela:\n    start: steady\n    clearance: {exponential: {mean: 0.2}}\n    "
        "promoter:\n"
        "      far: {lasts: {erlang: {steps: 2, mean: 8}}, then: {near: 0.6, open: 0.4}}\n"
        "      near: {to: {open: 0.4, far: 0.1}}\n"
        "      open: {to: {near: 0.6, far: 0.2}, initiates: 4}\n"
        "    transcript:\n      stages:\n        a: {lasts: {lognormal: {mean: 3, sd: 1.5}}, lost: "
        "0.05}\n"
        "        b: {mix: [{share: 0.3, lasts: {fixed: 2}}, {share: 0.7, lasts: {total: [{fixed: "
        "1}, "
        "{exponential: {mean: 2}}]}}]}\n"
        "        c: {lasts: {weibull: {shape: 0.8, scale: 2}}, lost: 0.1}\n"
        "      lifetime: {uniform: {from: 3, to: 9}}\n");
    static const char *const names[] = {"vela.a", "vela.b", "vela.c", "vela.transcript"};
    for (size_t i = 0; i < 4; i++) {
        tarry_exact_covariance c = covariance_of(&s, names[i], names[i]);
        tarry_exact_carried carried = {0};
        tarry_exact_moments m;
        tarry_error error = {0};
        const double time = 5;
        ck_assert_int_eq(tarry_exact_carry_stage(&s.gene.transcript, i, 500, &carried, &error), 0);
        ck_assert_int_eq(tarry_exact_moments_at(&s.gene, &carried, &time, 1, &m, &error), 0);
        ck_assert_double_eq_tol(c.mean[0], m.mean, 1e-8 * m.mean);
        ck_assert_double_eq_tol(tarry_exact_covariance_at(&c, 0), m.variance, 1e-7 * m.variance);
        tarry_exact_carried_release(&carried);
        tarry_exact_covariance_release(&c);
    }
    release(&s);
}
END_TEST

/* ---- signals ------------------------------------------------------------------------------- */

/* Fixed dwell D of an active gene seen with a step at fraction f: a molecule shines for (1 - f) D,
 * so the covariance is k B^2 ((1 - f) D - tau) up to there. With a ramp from 0 to 1: k B^2 integral
 * from 0 to D - tau of x (x + tau)/D^2 (by hand). Of two colours, a step early (f1) and a step late
 * (f2), the second follows the first: k (overlap of [f1 D, D] and [f2 D - tau, D - tau]).
 */
START_TEST(labels_of_an_active_gene) {
    const double k = 3, D = 4, B = 1.5;
    subject s = read_gene(
        "genes: {vela: {promoter: {on: {initiates: 3}}, transcript: {stages: {n: "
        "{fixed: 4}}, decay: 1}}}\n"
        "signals:\n  late: {of: vela.n, ramp: {from: 0.6, to: 0.6}, brightness: 1.5}\n"
        "  slope: {of: vela.n, ramp: {from: 0, to: 1}, brightness: 1.5}\n"
        "  early: {of: vela.n, ramp: {from: 0.1, to: 0.1}}\n");
    tarry_exact_covariance late = covariance_of(&s, "late", "late");
    tarry_exact_covariance slope = covariance_of(&s, "slope", "slope");
    tarry_exact_covariance cross = covariance_of(&s, "early", "late");
    for (double tau = 0; tau < 5; tau += 0.2) {
        const double left = fmax(D - tau, 0);
        ck_assert_double_eq_tol(tarry_exact_covariance_at(&late, tau),
                                k * B * B * fmax(0.4 * D - tau, 0), 1e-9);
        ck_assert_double_eq_tol(
            tarry_exact_covariance_at(&slope, tau),
            k * B * B * (left * left * left / 3 + tau * left * left / 2) / D / D, 1e-9);
        const double from = fmax(0.1 * D, 0.6 * D - tau), back = fmax(0.1 * D, 0.6 * D + tau);
        ck_assert_double_eq_tol(tarry_exact_covariance_at(&cross, tau),
                                k * B * fmax(D - tau - from, 0), 1e-9);
        ck_assert_double_eq_tol(tarry_exact_covariance_at(&cross, -tau), k * B * fmax(D - back, 0),
                                1e-9);
    }
    tarry_exact_covariance_release(&late);
    tarry_exact_covariance_release(&slope);
    tarry_exact_covariance_release(&cross);
    release(&s);
}
END_TEST

/* The covariance of a sum is that of its parts and of the parts with each other, and a dwell that
 * is seen from 0.2 on, in full from 0.7, shines for 1 - (0.2 + 0.7)/2 of itself in the mean. */
START_TEST(sums_of_signals) {
    subject s = read_gene(
        "genes: {vela: {start: steady, promoter: {shut: {to: {open: 0.2}}, open: {to: {shut: 0.7}, "
        "initiates: 6}}, transcript: {stages: {n: {gamma: {mean: 4, sd: 2}}, m: {exponential: "
        "{mean: "
        "3}}}, decay: 0.5}}}\n"
        "signals:\n  ramp: {of: vela.n, ramp: {from: 0.2, to: 0.7}}\n"
        "  rest: {sum: {vela.m: 2, vela.transcript: 1}}\n"
        "  both: {sum: {vela.n: {ramp: {from: 0.2, to: 0.7}}, vela.m: 2, vela.transcript: 1}}\n");
    tarry_exact_covariance ramp = covariance_of(&s, "ramp", "ramp");
    tarry_exact_covariance rest = covariance_of(&s, "rest", "rest");
    tarry_exact_covariance cross = covariance_of(&s, "ramp", "rest");
    tarry_exact_covariance both = covariance_of(&s, "both", "both");
    ck_assert_double_eq_tol(ramp.mean[0], 6 * (0.2 / 0.9) * 4 * 0.55, 1e-9);
    for (double tau = 0; tau < 12; tau += 0.75) {
        const double sum = tarry_exact_covariance_at(&ramp, tau) +
                           tarry_exact_covariance_at(&rest, tau) +
                           tarry_exact_covariance_at(&cross, tau) +
                           tarry_exact_covariance_at(&cross, -tau);
        ck_assert_double_eq_tol(tarry_exact_covariance_at(&both, tau), sum, 1e-7);
    }
    tarry_exact_covariance_release(&ramp);
    tarry_exact_covariance_release(&rest);
    tarry_exact_covariance_release(&cross);
    tarry_exact_covariance_release(&both);
    release(&s);
}
END_TEST

/* ---- bursts -------------------------------------------------------------------------------- */

static tarry_exact_bursts bursts_of(subject *s) {
    tarry_exact_bursts b;
    tarry_error error = {0};
    const char *why = NULL;
    ck_assert_int_eq(tarry_exact_bursts_read(&s->gene, 0, 10, &s->arena, &b, &why, &error), 0);
    ck_assert_msg(why == NULL, "%s", why);
    return b;
}

/* Two states: geometric sizes with q = k/(k + b), exponential dwells (check-values, from memory).
 */
START_TEST(two_states_bursts) {
    const double a = 0.2, b = 0.7, k = 6, q = k / (k + b);
    subject s = read_gene("genes: {vela: {start: steady, promoter: {shut: {to: {open: 0.2}}, open: "
                          "{to: {shut: 0.7}, initiates: 6}}, transcript: {decay: 1}}}\n");
    const tarry_exact_bursts x = bursts_of(&s);
    tarry_error error = {0};
    double survival = 0;
    ck_assert_double_eq_tol(x.frequency, a * b / (a + b), 1e-12);
    ck_assert_double_eq_tol(x.size_mean, k / b, 1e-9);
    ck_assert_double_eq_tol(x.size_sd, sqrt(k / b * (1 + k / b)), 1e-8);
    ck_assert_double_eq_tol(x.active.mean, 1 / b, 1e-12);
    ck_assert_double_eq_tol(x.inactive.mean, 1 / a, 1e-12);
    ck_assert_double_eq_tol(x.interval.mean, 1 / a + 1 / b, 1e-12);
    ck_assert_double_eq_tol(x.interval.sd, sqrt(1 / a / a + 1 / b / b), 1e-10);
    ck_assert_double_eq_tol(x.active_fraction, a / (a + b), 1e-12);
    ck_assert_double_eq_tol(x.initiation_rate, k * a / (a + b), 1e-12);
    ck_assert_double_eq_tol(x.outside_fraction, 0, 1e-15);
    for (size_t n = 0; n < x.n_sizes; n++)
        ck_assert_double_eq_tol(x.sizes[n], (1 - q) * pow(q, (double)n), 1e-13);
    ck_assert_int_eq(tarry_exact_dwell_survival(&x.active, 2.5, &survival, &error), 0);
    ck_assert_double_eq_tol(survival, exp(-b * 2.5), 1e-12);
    release(&s);
}
END_TEST

/* Two active states, entered at the first: with B_i = k_i/(k_i + out_i) and so on, sizes are those
 * of the first state, and with the probability of moving on those of the second as well; by hand,
 * the generating function (k1, k2: initiation; m: 1 -> 2; s1, s2: to shut) (s1 + m s2/(s2 + k2 (1 -
 * z)))/(s1 + m + k1 (1 - z)), expanded. Every shut period is exponential. */
START_TEST(two_active_states_bursts) {
    const double k1 = 2, k2 = 9, m = 0.5, s1 = 0.4, s2 = 1.2, open = 0.3;
    subject s = read_gene(
        "genes: {vela: {start: steady, promoter: {shut: {to: {low: 0.3}}, low: {to: "
        "{shut: 0.4, high: 0.5}, initiates: 2}, high: {to: {shut: 1.2}, initiates: "
        "9}}, transcript: {decay: 1}}}\n");
    const tarry_exact_bursts x = bursts_of(&s);
    const double leave = s1 + m, q1 = k1 / (k1 + leave), q2 = k2 / (k2 + s2);
    ck_assert_double_eq_tol(x.active.mean, 1 / leave + m / leave / s2, 1e-12);
    ck_assert_double_eq_tol(x.inactive.mean, 1 / open, 1e-12);
    ck_assert_double_eq_tol(x.size_mean, k1 / leave + m / leave * k2 / s2, 1e-8);
    for (size_t n = 0; n < 40; n++) {
        double p = s1 / leave * (1 - q1) * pow(q1, (double)n);
        for (size_t j = 0; j <= n; j++)
            p += m / leave * (1 - q1) * pow(q1, (double)j) * (1 - q2) * pow(q2, (double)(n - j));
        ck_assert_double_eq_tol(x.sizes[n], p, 1e-12);
    }
    release(&s);
}
END_TEST

START_TEST(nodes_are_those_of_gsl) {
    gsl_integration_glfixed_table *t = gsl_integration_glfixed_table_alloc(TARRY_GAUSS);
    for (size_t i = 0; i < TARRY_GAUSS; i++) {
        double x, w;
        ck_assert_int_eq(gsl_integration_glfixed_point(-1, 1, i, &x, &w, t), 0);
        ck_assert_double_eq_tol(tarry_gauss_node[i], x, 1e-16);
        ck_assert_double_eq_tol(tarry_gauss_weight[i], w, 1e-16);
    }
    gsl_integration_glfixed_table_free(t);
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"an active gene's counts", an_active_genes_counts},
        {"two states' counts", two_states_counts},
        {"two routes to one variance", two_routes_to_one_variance},
        {"labels of an active gene", labels_of_an_active_gene},
        {"sums of signals", sums_of_signals},
        {"two states' bursts", two_states_bursts},
        {"two active states' bursts", two_active_states_bursts},
        {"nodes are those of GSL", nodes_are_those_of_gsl},
    };
    return run_tests("exact covariance", tests, sizeof tests / sizeof *tests);
}
