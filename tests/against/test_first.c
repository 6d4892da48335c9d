/* SPDX-License-Identifier: GPL-3.0-or-later */

/* First responses against the chance that nothing has come yet. A gene's initiations are a
 * Markovian arrival process (D0 between them, D1 at them); if one that is a old has not given rise
 * to what is waited for with the chance g(a), each on its own, then none of those since the step
 * has with
 *
 *     G(t) = p w(t),   dw/da = (D0 + D1 g(a)) w,   w(0) = 1
 *
 * (standard queueing theory: common practice, no source). The equation is solved by GSL's
 * Prince-Dormand steps, g comes from GSL's gamma law or by hand. The genes are shut before the
 * step, so that nothing is under way then. */

#include "sample.h"
#include "support.h"

#include <gsl/gsl_cdf.h>
#include <gsl/gsl_errno.h>
#include <gsl/gsl_odeiv2.h>
#include <math.h>
#include <string.h>

#define K_OPEN 0.15
#define K_SHUT 0.5
#define K_INIT 0.8

/* ---- the chance of none -----------------------------------------------------------------------
 */

typedef double age_law(double age);

typedef struct none_yet {
    double k_open;
    age_law *not_there; /* g */
} none_yet;

static int slope(double a, const double w[], double dw[], void *context) {
    const none_yet *none = context;
    const double stays = K_INIT * (none->not_there(a) - 1);
    dw[0] = none->k_open * (w[1] - w[0]);
    dw[1] = K_SHUT * (w[0] - w[1]) + stays * w[1];
    return GSL_SUCCESS;
}

/* From `kink`, where g may jump, on anew. */
static double none_by(const none_yet *none, double p_open, double kink, double t) {
    none_yet own = *none;
    gsl_odeiv2_system system = {slope, NULL, 2, &own};
    gsl_odeiv2_driver *driver = gsl_odeiv2_driver_alloc_y_new(&system, gsl_odeiv2_step_rk8pd, 1e-3,
                                                              1e-11, 1e-11);
    double a = 0, w[2] = {1, 1};
    ck_assert_ptr_nonnull(driver);
    if (kink > 0 && kink < t)
        ck_assert_int_eq(gsl_odeiv2_driver_apply(driver, &a, kink, w), GSL_SUCCESS);
    gsl_odeiv2_driver_reset(driver);
    ck_assert_int_eq(gsl_odeiv2_driver_apply(driver, &a, t, w), GSL_SUCCESS);
    gsl_odeiv2_driver_free(driver);
    return (1 - p_open) * w[0] + p_open * w[1];
}

/* ---- g ----------------------------------------------------------------------------------------
 */

static double at_once(double age) {
    (void)age;
    return 0;
}

static double after_fixed(double age) {
    return age < 3;
}

/* A fixed stage of 3, then a gamma one of mean 4 and sd 2. */
static double after_two(double age) {
    return age <= 3 ? 1 : gsl_cdf_gamma_Q(age - 3, 4, 1);
}

/* Out after 3; then translated at 0.2 until it decays at 0.25; proteins fold for 2. */
static double no_protein(double age) {
    const double x = age - 5, k = 0.2, decay = 0.25;
    return x <= 0 ? 1 : (decay + k * exp(-(k + decay) * x)) / (k + decay);
}

/* ---- the simulated curves ---------------------------------------------------------------------
 */

#define GENE(name, copies, stages, rest)                                                           \
    "  " name ": {copies: " copies ", promoter: {shut: {to: {open: k}}, open: {to: {shut: 0.5},\n" \
    "    initiates: 0.8}}, transcript: {stages: {" stages "}, decay: 0.25}" rest "}\n"

static const char text[] = "tarry: 1\ntime: min\nparameters: {k: 0}\ngenes:\n" GENE(
    "vela", "1", "nascent: 3", "") GENE("lyra", "2", "nascent: 3", "")
    GENE("aster", "1", "nascent: 3, nuclear: {gamma: {mean: 4, sd: 2}}", "")
        GENE("deneb", "1", "nascent: 3",
             ", protein: {translation: 0.2, stages: {immature: 2}, half_life: "
             "9}") "  carina: {promoter: {shut: {to: {open: k}}, open: {to: "
                   "{shut: 0.5}, initiates: 0.8}},\n"
                   "    transcript: {stages: {nascent: 3}}}\n"
                   "signals: {spot: {sum: {carina.transcript: 2}, background: "
                   "1, responds_above: 2.5}}\n"
                   "protocol: [{at: 10, set: {k: 0.15}}, {at: 26, set: {k: "
                   "0.4}}]\n"
                   "run: {cells: 40000, settle: 5, until: 40, every: 0.5, "
                   "record: [vela, lyra, aster, deneb,\n"
                   "      carina, spot]}\n";

enum { STEP = 1, TIME, SURVIVAL };

typedef struct curve {
    const tarry_table *table;
    double n;
} curve;

typedef struct point {
    double time, survival;
} point;

/* The last point of a curve that is not later than `latest`. */
static point point_of(const curve *c, const char *name, double step, double latest) {
    point best = {-1, NAN};
    for (size_t row = 0; row < tarry_table_n_rows(c->table); row++) {
        const double time = tarry_table_number(c->table, row, TIME);
        if (strcmp(tarry_table_text(c->table, row, 0), name) == 0 &&
            tarry_table_number(c->table, row, STEP) == step && time <= latest && time > best.time)
            best = (point){time, tarry_table_number(c->table, row, SURVIVAL)};
    }
    ck_assert_msg(best.time > 0, "no point of '%s' before %g", name, latest);
    return best;
}

static void check_point(const curve *c, const char *name, point seen, double exact) {
    char what[80];
    snprintf(what, sizeof what, "%s, none by %g", name, seen.time);
    check_z(what, (seen.survival - exact) / sqrt(exact * (1 - exact) / c->n));
}

/* After the first step, at which all are shut. */
static void check_curve(const curve *c, const char *name, age_law *not_there, double kink,
                        int copies) {
    static const double times[] = {4, 6, 8, 10, 13, 16};
    const none_yet none = {K_OPEN, not_there};
    for (size_t i = 0; i < sizeof times / sizeof *times; i++) {
        if (times[i] <= kink)
            continue;
        const point seen = point_of(c, name, 10, times[i]);
        check_point(c, name, seen, pow(none_by(&none, 0, kink, seen.time), copies));
    }
}

START_TEST(test_first) {
    tarry_model *model = NULL;
    tarry_results *results = run_results(text, &model);
    const curve c = {tarry_results_table(results, TARRY_TABLE_first),
                     (double)tarry_results_n_cells(results)};
    check_curve(&c, "vela initiation", at_once, 0, 1);
    check_curve(&c, "vela.transcript", after_fixed, 3, 1);
    check_curve(&c, "lyra initiation", at_once, 0, 2);
    check_curve(&c, "lyra.transcript", after_fixed, 3, 2);
    check_curve(&c, "aster.transcript", after_two, 3, 1);
    check_curve(&c, "deneb.protein", no_protein, 5, 1);
    tarry_results_free(results);
    tarry_model_free(model);
}
END_TEST

/* Transcripts that stay: the first frame above the level is the first from the first one on. */
START_TEST(test_signal) {
    static const double times[] = {4, 6, 10, 15.5};
    const none_yet none = {K_OPEN, after_fixed};
    tarry_model *model = NULL;
    tarry_results *results = run_results(text, &model);
    const curve c = {tarry_results_table(results, TARRY_TABLE_first),
                     (double)tarry_results_n_cells(results)};
    for (size_t i = 0; i < sizeof times / sizeof *times; i++) {
        /* Points lie at the ends of bins that hold a frame, up to half a minute after it. */
        point seen = point_of(&c, "spot", 10, times[i]);
        seen.time = floor(2 * seen.time) / 2;
        check_point(&c, "spot", seen, none_by(&none, 0, 3, seen.time));
    }
    tarry_results_free(results);
    tarry_model_free(model);
}
END_TEST

/* After the second step, at which the first is 16 old: open by then in a share known in closed form
 * (two states from one of them: p (1 - exp(-(k_open + k_shut) t)), common practice). */
START_TEST(test_second_step) {
    static const double times[] = {0.5, 2, 5, 14};
    const none_yet none = {0.4, at_once};
    const double sum = K_OPEN + K_SHUT;
    const double p_open = K_OPEN / sum * (1 - exp(-sum * 16));
    tarry_model *model = NULL;
    tarry_results *results = run_results(text, &model);
    const curve c = {tarry_results_table(results, TARRY_TABLE_first),
                     (double)tarry_results_n_cells(results)};
    for (size_t i = 0; i < sizeof times / sizeof *times; i++) {
        const point seen = point_of(&c, "vela initiation", 26, times[i]);
        check_point(&c, "vela initiation, second step", seen, none_by(&none, p_open, 0, seen.time));
    }
    tarry_results_free(results);
    tarry_model_free(model);
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"first", test_first}, {"signal", test_signal}, {"second step", test_second_step}};
    return run_tests("first", tests, sizeof tests / sizeof *tests);
}
