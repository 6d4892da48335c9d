/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Ways of initiating and of translating that are no plain rates, against the truncated master
 * equation, the renewal law of the queue GI/M/infinity, and the cumulants of a Poisson cluster. */

#include "master.h"
#include "sample.h"
#include "support.h"

#include <gsl/gsl_integration.h>
#include <math.h>

enum { CELLS = 40000 };

/* ---- moves that initiate ---- */

enum { MOST = 40, STATES = 3, ALL = STATES * (MOST + 1) };

static const char moving[] = "tarry: 1\ntime: min\ngenes:\n  vela:\n    promoter:\n"
                             "      empty: {to: {poised: 1.5}}\n"
                             "      poised: {to: {empty: {rate: 2.5, initiates: yes}, shut: 0.5}}\n"
                             "      shut: {to: {empty: {rate: 0.3, initiates: no}}}\n"
                             "    transcript: {decay: 0.2}\n"
                             "run: {until: 60, every: 60, snapshots: [1, 5, 60]}\n";

static size_t place(size_t state, size_t n) {
    return state * (MOST + 1) + n;
}

/* States empty (0), poised (1), shut (2), with n transcripts; more than MOST are not reached. */
static size_t list_moves(master_move *moves) {
    size_t k = 0;
    for (size_t n = 0; n <= MOST; n++) {
        moves[k++] = (master_move){place(0, n), place(1, n), 1.5};
        moves[k++] = (master_move){place(1, n), place(2, n), 0.5};
        moves[k++] = (master_move){place(2, n), place(0, n), 0.3};
        if (n < MOST)
            moves[k++] = (master_move){place(1, n), place(0, n + 1), 2.5};
        for (size_t state = 0; state < STATES && n > 0; state++)
            moves[k++] = (master_move){place(state, n), place(state, n - 1), 0.2 * (double)n};
    }
    return k;
}

START_TEST(test_moves_that_initiate) {
    static master_move moves[8 * (MOST + 1)];
    static double p[ALL], counts[ALL], poised[ALL], law[MOST + 1];
    static const double wait[] = {1, 4, 55};
    const size_t n_moves = list_moves(moves);
    for (size_t i = 0; i < ALL; i++) {
        p[i] = i == 0;
        counts[i] = (double)(i % (MOST + 1));
        poised[i] = i / (MOST + 1) == 1;
    }
    sample_cells *cells = sample_new(moving, CELLS);
    for (size_t t = 0; t < 3; t++) {
        master_solve(ALL, moves, n_moves, p, wait[t]);
        for (size_t n = 0; n <= MOST; n++)
            law[n] = p[place(0, n)] + p[place(1, n)] + p[place(2, n)];
        ck_assert_double_lt(law[MOST], 1e-9);
        const master_moments exact = master_moments_of(ALL, p, counts);
        check_counts("transcripts", sample_values(cells, "vela.transcript", t), cells->n_cells, law,
                     MOST + 1);
        check_mean_and_sd("transcripts", cells, "vela.transcript", t, exact.mean, exact.sd,
                          exact.kurtosis);
        const master_moments state = master_moments_of(ALL, p, poised);
        check_mean_and_sd("poised", cells, "vela.poised", t, state.mean, state.sd, state.kurtosis);
    }
    sample_free(cells);
}
END_TEST

/* A burst is a time poised; it ends with one initiation, or with none when the gene is shut. */
START_TEST(test_bursts_of_moves) {
    tarry_model *model = NULL;
    tarry_results *results = run_results(
        "tarry: 1\ntime: min\ngenes:\n  vela:\n    start: steady\n    promoter:\n"
        "      empty: {to: {poised: 1.5}}\n"
        "      poised: {to: {empty: {rate: 2.5, initiates: yes}, shut: 0.5}}\n"
        "      shut: {to: {empty: 0.3}}\n"
        "run: {cells: 2000, until: 100, every: 1}\n",
        &model);
    /* A competition of exponential times, and a cycle: empty, poised, and shut once in six. */
    const double frequency = 1 / (1 / 1.5 + 1 / 3.0 + 1 / 0.3 / 6);
    check_figure("time poised", burst_figure(results, "vela", "all", "active_time_mean"), 1 / 3.0);
    check_figure("size", burst_figure(results, "vela", "all", "burst_size_mean"), 2.5 / 3);
    check_figure("frequency", burst_figure(results, "vela", "all", "burst_frequency"), frequency);
    check_figure("rate", burst_figure(results, "vela", "all", "initiation_rate"),
                 frequency * 2.5 / 3);
    check_figure("silent", burst_figure(results, "vela", "all", "silent_fraction"), 0.5 / 3);
    ck_assert(burst_figure(results, "vela", "all", "outside_fraction").value == 0);
    tarry_results_free(results);
    tarry_model_free(model);
}
END_TEST

/* ---- clearance ---- */

/* Transforms E exp(-s x) of the time from one initiation to the next. */

static const double rate = 2, tau = 0.8, decay = 0.25, poise = 1.2;

/* A gene always on: tau, then an exponential time. */
static double always_on(double s) {
    return exp(-s * tau) * rate / (rate + s);
}

/* An initiating move: back in the state after an exponential time, ready after tau; when both are
 * over, another exponential time. */
static double held_move(double s) {
    const double both = (1 - exp(-poise * tau)) * exp(-s * tau) +
                        poise / (poise + s) * exp(-(poise + s) * tau);
    return both * rate / (rate + s);
}

/* Binomial moments of the number of transcripts in the steady state of GI/M/infinity (Takacs 1958,
 * Acta Math. Acad. Sci. Hung. 9:45): B_r = (mean / r) prod_{i<r} phi(i d)/(1 - phi(i d)). */
static void renewal_moments(double (*phi)(double s), double interval, master_moments *exact) {
    double b[5] = {1, 1 / (interval * decay)};
    for (int r = 2; r <= 4; r++) {
        const double f = phi((r - 1) * decay);
        b[r] = b[r - 1] * (r - 1) / r * f / (1 - f);
    }
    /* Factorial moments r! B_r, raw ones by Stirling's numbers, then central ones. */
    const double f1 = b[1], f2 = 2 * b[2], f3 = 6 * b[3], f4 = 24 * b[4];
    const double m2 = f2 + f1, m3 = f3 + 3 * f2 + f1, m4 = f4 + 6 * f3 + 7 * f2 + f1;
    const double variance = m2 - f1 * f1;
    const double c4 = m4 - 4 * f1 * m3 + 6 * f1 * f1 * m2 - 3 * f1 * f1 * f1 * f1;
    *exact = (master_moments){f1, sqrt(variance), c4 / (variance * variance) - 3};
}

START_TEST(test_clearance) {
    static const char text[] =
        "tarry: 1\ntime: min\ngenes:\n"
        "  vela: {clearance: 0.8, promoter: {on: {initiates: 2}}, transcript: {decay: 0.25}}\n"
        "  mira: {clearance: 0.8, transcript: {decay: 0.25}, promoter: {\n"
        "     off: {to: {on: 1.2}}, on: {to: {off: {rate: 2, initiates: yes}}}}}\n"
        "  twin: {copies: 2, clearance: 0.8, promoter: {on: {initiates: 2}},\n"
        "     transcript: {decay: 0.25}}\n"
        "run: {settle: 100, until: 10, every: 10}\n";
    sample_cells *cells = sample_new(text, CELLS);
    master_moments exact;
    renewal_moments(always_on, tau + 1 / rate, &exact);
    check_mean_and_sd("always on", cells, "vela.transcript", 0, exact.mean, exact.sd,
                      exact.kurtosis);
    check_mean_and_sd("two alleles", cells, "twin.transcript", 0, 2 * exact.mean,
                      sqrt(2) * exact.sd, exact.kurtosis / 2);
    renewal_moments(held_move, tau + exp(-poise * tau) / poise + 1 / rate, &exact);
    check_mean_and_sd("held move", cells, "mira.transcript", 0, exact.mean, exact.sd,
                      exact.kurtosis);
    sample_free(cells);
}
END_TEST

/* The promoter goes on switching: shares of time and dwells are those without clearance, while
 * initiations come at most once in tau. */
START_TEST(test_clearance_and_switching) {
    tarry_model *model = NULL;
    tarry_results *results = run_results(
        "tarry: 1\ntime: min\ngenes:\n  vela:\n    clearance: 2\n    start: steady\n    promoter:\n"
        "      shut: {to: {open: 0.5}}\n      open: {to: {shut: 1}, initiates: 100}\n"
        "run: {cells: 2000, until: 100, every: 1}\n",
        &model);
    check_figure("open", burst_figure(results, "vela", "all", "active_fraction"), 1 / 3.0);
    check_figure("dwell", burst_figure(results, "vela", "all", "active_time_mean"), 1);
    /* Always ready after tau; then it takes a time to be open and initiate. With the two-state
     * chain started open at an initiation: P(open at tau) by its relaxation, and mean times h_open,
     * h_shut to the next initiation by first-step analysis (common practice). */
    const double open = 1 / 3.0 + 2 / 3.0 * exp(-1.5 * 2);
    const double h_open = (1 + 1 / 0.5) / 100, h_shut = 1 / 0.5 + h_open;
    check_figure("rate", burst_figure(results, "vela", "all", "initiation_rate"),
                 1 / (2 + open * h_open + (1 - open) * h_shut));
    tarry_results_free(results);
    tarry_model_free(model);
}
END_TEST

/* ---- transcripts that are translated on the way ---- */

enum { FIXED = 2, LIFE = 3 };
static const double start_rate = 1.5, translation = 0.9, loss = 0.4;

/* Proteins left, on average, of a transcript that was begun a time `age` ago and was translated
 * from `from` on: each was made at a steady rate and decays exponentially. */
static double left_of(double age, double from) {
    const double young = fmax(age - (FIXED + LIFE), 0), old = fmax(age - from, 0);
    return translation / loss * (exp(-loss * young) - exp(-loss * old));
}

typedef struct cluster {
    double from;
    int power;
} cluster;

/* The n-th moment of a Poisson number of this mean (Stirling's numbers). */
static double cluster_moment(double age, void *context) {
    const cluster *c = context;
    const double m = left_of(age, c->from);
    switch (c->power) {
    case 1:
        return m;
    case 2:
        return m * (1 + m);
    default:
        return m * (1 + m * (7 + m * (6 + m)));
    }
}

/* Cumulants of a Poisson cluster process (Campbell's theorem; Cox & Isham 1980, Point Processes):
 * rate times the integral of the cluster's moments over the ages. */
static double cumulant(double from, int power, double t) {
    static const double kinks[] = {0, FIXED, FIXED + LIFE, 1e9};
    gsl_integration_workspace *workspace = gsl_integration_workspace_alloc(200);
    ck_assert_ptr_nonnull(workspace);
    cluster c = {from, power};
    gsl_function f = {cluster_moment, &c};
    double sum = 0;
    for (size_t i = 0; i < 3 && kinks[i] < t; i++) {
        double part, error;
        ck_assert_int_eq(gsl_integration_qags(&f, kinks[i], fmin(kinks[i + 1], t), 1e-10, 1e-10,
                                              200, workspace, &part, &error),
                         0);
        sum += part;
    }
    gsl_integration_workspace_free(workspace);
    return start_rate * sum;
}

START_TEST(test_translated_on_the_way) {
    static const char text[] =
        "tarry: 1\ntime: min\ngenes:\n"
        "  both: {promoter: {on: {initiates: 1.5}}, transcript: {stages: {nascent: 2}, lifetime: "
        "3},\n"
        "     protein: {translation: 0.9, from: [nascent, transcript], decay: 0.4}}\n"
        "  late: {promoter: {on: {initiates: 1.5}}, transcript: {stages: {nascent: 2}, lifetime: "
        "3},\n"
        "     protein: {translation: 0.9, from: [transcript], decay: 0.4}}\n"
        "run: {until: 40, every: 40, snapshots: [1.5, 4, 40]}\n";
    static const double times[] = {1.5, 4, 40};
    sample_cells *cells = sample_new(text, CELLS);
    for (size_t i = 0; i < 6; i++) {
        const double t = times[i % 3], from = i < 3 ? 0 : FIXED;
        const char *name = i < 3 ? "both.protein" : "late.protein";
        if (t <= from) {
            ck_assert_double_eq(sample_mean(cells, name, i % 3), 0);
            continue;
        }
        const double variance = cumulant(from, 2, t);
        check_mean_and_sd(name, cells, name, i % 3, cumulant(from, 1, t), sqrt(variance),
                          cumulant(from, 4, t) / (variance * variance));
    }
    sample_free(cells);
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"moves that initiate", test_moves_that_initiate},
        {"bursts of moves", test_bursts_of_moves},
        {"clearance", test_clearance},
        {"clearance and switching", test_clearance_and_switching},
        {"translated on the way", test_translated_on_the_way},
    };
    return run_tests("initiation", tests, sizeof tests / sizeof *tests);
}
