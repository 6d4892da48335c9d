/* SPDX-License-Identifier: GPL-3.0-or-later */

/* A ramp of the protocol: molecules that are born and die at rates which both go up in steps. The
 * count begins at 0 and so is Poisson at every time (Bartlett 1949, J. R. Stat. Soc. B 11:211, from
 * memory); its mean obeys m' = k(t) - g(t) m, integrated here from stretch to stretch by GSL's
 * Runge-Kutta-Fehlberg method. The rates of the stretches are those that docs/model.md defines. */

#include "sample.h"
#include "support.h"

#include <gsl/gsl_errno.h>
#include <gsl/gsl_odeiv2.h>
#include <math.h>

enum { STRETCHES = 4 };
static const double FROM = 4, TO = 12;
static const double K0 = 2, K1 = 30, G0 = 0.1, G1 = 0.5;

typedef struct rates {
    double k, g;
} rates;

static int derivative(double t, const double m[], double out[], void *context) {
    const rates *now = context;
    (void)t;
    out[0] = now->k - now->g * m[0];
    return GSL_SUCCESS;
}

/* Carry the mean from one time to another under constant rates. */
static void integrate(double from, double to, rates now, double *mean) {
    gsl_odeiv2_system system = {derivative, NULL, 1, &now};
    gsl_odeiv2_driver *driver = gsl_odeiv2_driver_alloc_y_new(&system, gsl_odeiv2_step_rkf45, 1e-4,
                                                              1e-12, 1e-12);
    ck_assert_ptr_nonnull(driver);
    ck_assert_int_eq(gsl_odeiv2_driver_apply(driver, &from, to, mean), GSL_SUCCESS);
    gsl_odeiv2_driver_free(driver);
}

static double exact_mean(double time) {
    double mean = 0;
    integrate(0, fmin(time, FROM), (rates){K0, G0}, &mean);
    for (int j = 0; j < STRETCHES; j++) {
        const double width = (TO - FROM) / STRETCHES, from = FROM + j * width;
        const double share = (j + 0.5) / STRETCHES;
        const rates now = {K0 + share * (K1 - K0), G0 + share * (G1 - G0)};
        if (time > from)
            integrate(from, fmin(time, from + width), now, &mean);
    }
    if (time > TO)
        integrate(TO, time, (rates){K1, G1}, &mean);
    return mean;
}

START_TEST(test_birth_and_death) {
    static const double times[] = {4, 6, 9, 12, 20};
    sample_cells *sample = sample_new(
        "tarry: 1\ntime: min\nparameters: {k: 2, g: 0.1}\nspecies: {x: 0}\nreactions:\n"
        "  birth: {makes: {x: 1}, rate: k}\n  death: {uses: {x: 1}, rate: g}\n"
        "protocol:\n  - {from: 4, to: 12, ramp: {k: 30, g: 0.5}, steps: 4}\n"
        "run: {until: 20, every: 20, snapshots: [4, 6, 9, 12, 20]}\n",
        40000);
    for (size_t i = 0; i < sizeof times / sizeof *times; i++) {
        const double mean = exact_mean(times[i]);
        check_mean_and_sd("ramp", sample, "x", i, mean, sqrt(mean), 1 / mean);
    }
    sample_free(sample);
}
END_TEST

int main(void) {
    const test_entry tests[] = {{"birth_and_death", test_birth_and_death}};
    return run_tests("ramp", tests, sizeof tests / sizeof *tests);
}
