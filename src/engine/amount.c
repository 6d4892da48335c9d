/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Random numbers of molecules by inversion.
 *
 * Geometric: n - least >= j exactly where u <= q^j. Poisson: from 0 upwards for small means; else a
 * first guess by Cornish and Fisher's expansion of the quantile, then steps of one to the first n
 * whose cdf reaches u, with cdf and survival by Temme's expansion, whichever is smaller. */

#include "engine/amount.h"

#include "base/logarithm.h"
#include "base/random.h"
#include "model/incomplete_gamma.h"

#include <gsl/gsl_cdf.h>
#include <math.h>

static const double small_mean = 30;

static double geometric(double mean, double u) {
    return mean > 0 ? floor(tarry_log(u) / -log1p(1 / mean)) : 0;
}

static double poisson_small(double mean, double u) {
    double n = 0, term = exp(-mean), sum = term;
    while (u >= sum && term > 0) {
        n++;
        term *= mean / n;
        sum += term;
    }
    return n;
}

/* u < P(X <= n) */
static int is_reached(double n, double mean, double u) {
    if (n < 0)
        return 0;
    if (u < 0.5)
        return u < tarry_gamma_upper(n + 1, mean);
    return 1 - u > tarry_gamma_lower(n + 1, mean);
}

static double poisson_large(double mean, double u) {
    const double z = u < 0.5 ? gsl_cdf_ugaussian_Pinv(u) : gsl_cdf_ugaussian_Qinv(1 - u);
    const double skew = (z * z - 1) / 6 + (z - z * z * z) / (72 * sqrt(mean));
    double n = fmax(0, floor(mean + sqrt(mean) * z + skew + 0.5));
    if (is_reached(n, mean, u)) {
        while (is_reached(n - 1, mean, u))
            n--;
        return n;
    }
    do
        n++;
    while (!is_reached(n, mean, u));
    return n;
}

/* Sums from below lose the upper tail, whatever the mean. */
static double poisson(double mean, double u) {
    if (!(mean > 0))
        return 0;
    return mean < small_mean && u < 0.99 ? poisson_small(mean, u) : poisson_large(mean, u);
}

static double from_table(const tarry_amount *amount, double u) {
    uint32_t i = 0;
    while (i + 1 < amount->n && u >= amount->cumulative[i])
        i++;
    return amount->values[i];
}

double tarry_amount_draw(const tarry_amount *amount, double mean, uint64_t bits) {
    const double u = tarry_unit(bits);
    switch (amount->kind) {
    case TARRY_AMOUNT_GEOMETRIC:
        return amount->least + geometric(mean - amount->least, u);
    case TARRY_AMOUNT_POISSON:
        return poisson(mean, u);
    default:
        return from_table(amount, u);
    }
}
