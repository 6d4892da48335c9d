/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Incomplete gamma functions.
 *
 * Below a = 20, and far from the middle, GSL's are used: there they are right to 1e-12. Near the
 * middle at large a GSL (2.7) was found to be wrong by 1e-11 at a = 1e4, 1e-5 at 1e6 and wholly
 * from 1e7 on, so there Temme's uniform expansion takes over (Temme 1979, SIAM J. Math. Anal.
 * 10:757; DLMF 8.12), summed as one series in eta:
 *
 *   eta^2 / 2 = mu - log(1 + mu), mu = (x - a) / a, eta with the sign of mu
 *   Q = erfc(eta sqrt(a/2)) / 2 + R,  P = erfc(-eta sqrt(a/2)) / 2 - R
 *   R = exp(-a eta^2 / 2) / sqrt(2 pi a) * S(eta)
 *
 * dQ/dx gives S' - a eta S = a (1 - f(eta) / G) with f = eta / mu = sum f_n eta^n and G the scaled
 * gamma function. Comparing powers: s_(n-1) = (n+1)/a s_(n+1) + f_n / G, which is stable downwards,
 * and G = 1 + G s_1 / a from the lowest power. */

#include "model/incomplete_gamma.h"

#include <gsl/gsl_errno.h>
#include <gsl/gsl_math.h>
#include <gsl/gsl_sf_erf.h>
#include <gsl/gsl_sf_gamma.h>
#include <gsl/gsl_sf_log.h>
#include <math.h>
#include <stdbool.h>

enum { N_TERMS = 29 };

static const double large_shape = 20;

/* f_n, the coefficients of eta / mu: with mu = sum b_n eta^n, b_1 = 1 and
 * (n + 1) b_n = b_(n-1) - sum_(k=2)^(n-1) k b_k b_(n-k+1), from mu mu' = eta (1 + mu); worked out
 * with 34 digits. They fall like (2 sqrt(pi))^-n. */
static const double f[N_TERMS] = {
    1.00000000000000000e+00,  -3.33333333333333333e-01, 8.33333333333333333e-02,
    -1.48148148148148148e-02, 1.15740740740740741e-03,  3.52733686067019400e-04,
    -1.78755144032921811e-04, 3.91926317852243778e-05,  -2.18544851067999216e-06,
    -1.85406221071515996e-06, 8.29671134095308601e-07,  -1.76659527368260793e-07,
    6.70785354340149858e-09,  1.02618097842403080e-08,  -4.38203601845335319e-09,
    9.14769958223679023e-10,  -2.55141939949462498e-11, -5.83077213255042507e-11,
    2.43619480206674162e-11,  -5.02766928011417559e-12, 1.10043920319561348e-13,
    3.37176326240098538e-13,  -1.39238872241816207e-13, 2.85348938070474432e-14,
    -5.13911183424257262e-16, -1.97522882943494428e-15, 8.09952115670456133e-16,
    -1.65225312163981618e-16, 2.53054300974788842e-18,
};

/* A GSL status: an underflow is a plain 0, anything else is not a number. */
static double value_of(int status, gsl_sf_result result) {
    if (status == GSL_EUNDRFLW)
        return 0;
    return status == GSL_SUCCESS ? result.val : NAN;
}

static double erfc_of(double x) {
    gsl_sf_result result;
    const int status = gsl_sf_erfc_e(x, &result);
    return value_of(status, result);
}

/* mu - log(1 + mu) = eta^2 / 2 */
static double half_eta_squared(double a, double x) {
    gsl_sf_result result;
    const double ratio = x / a;
    if (ratio < 0.5 || ratio > 2)
        return ratio - 1 - log(ratio);
    const int status = gsl_sf_log_1plusx_mx_e((x - a) / a, &result);
    return -value_of(status, result);
}

/* True where Temme's expansion holds: large a, |eta| < 1. */
static bool is_middle(double a, double x) {
    return a >= large_shape && x > 0.3 * a && x < 2.3 * a;
}

/* Q where `upper`, else P. */
static double middle(double a, double x, bool upper) {
    const double half_square = half_eta_squared(a, x);
    const double eta = copysign(sqrt(2 * half_square), x - a);
    double next = 0, after = 0; /* G s_n and G s_(n+1) on the way down */
    double first = 0;           /* G s_1 */
    double sum = 0;
    for (int n = N_TERMS - 1; n >= 1; n--) {
        const double s = f[n] + (n + 1) / a * after;
        after = next;
        next = s;
        if (n == 2)
            first = s;
        sum = sum * eta + s;
    }
    const double scaled_gamma = 1 + first / a;
    const double rest = exp(-a * half_square) / sqrt(2 * M_PI * a) * sum / scaled_gamma;
    const double whole = 0.5 * erfc_of((upper ? eta : -eta) * sqrt(0.5 * a));
    return upper ? whole + rest : whole - rest;
}

double tarry_gamma_lower(double a, double x) {
    gsl_sf_result result;
    if (!(x > 0))
        return isnan(x) ? x : 0;
    if (isinf(x))
        return 1;
    if (is_middle(a, x))
        return middle(a, x, false);
    const int status = gsl_sf_gamma_inc_P_e(a, x, &result);
    return value_of(status, result);
}

double tarry_gamma_upper(double a, double x) {
    gsl_sf_result result;
    if (!(x > 0))
        return isnan(x) ? x : 1;
    if (isinf(x))
        return 0;
    if (is_middle(a, x))
        return middle(a, x, true);
    const int status = gsl_sf_gamma_inc_Q_e(a, x, &result);
    return value_of(status, result);
}

double tarry_gamma_term(double a, double x) {
    gsl_sf_result result;
    if (!(x > 0) || isinf(x))
        return 0;
    if (a < 1) {
        const int status = gsl_sf_gamma_e(a + 1, &result);
        return pow(x, a) * exp(-x) / value_of(status, result);
    }
    const int status = gsl_sf_gammastar_e(a, &result);
    return exp(-a * half_eta_squared(a, x)) / (sqrt(2 * M_PI * a) * value_of(status, result));
}
