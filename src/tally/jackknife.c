/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Intervals from delete-a-group replicates.
 *
 * The spread is taken about the figure from all groups, as Kott (2001) does, not about the mean of
 * the replicates. Groups differ in size by at most one cell; for a mean the variance so estimated
 * is then high by 0.2 % at most (docs/statistics.md). */
#include "tally/jackknife.h"

#include <gsl/gsl_cdf.h>
#include <math.h>

double tarry_to_scale(tarry_scale scale, double x) {
    switch (scale) {
    case TARRY_SCALE_LOG:
        return log(x);
    case TARRY_SCALE_LOGIT:
        return log(x) - log1p(-x);
    case TARRY_SCALE_LOGLOG:
        return log(-log(x));
    case TARRY_SCALE_PLAIN:
        break;
    }
    return x;
}

static double from_scale(tarry_scale scale, double z) {
    switch (scale) {
    case TARRY_SCALE_LOG:
        return exp(z);
    case TARRY_SCALE_LOGIT:
        return 1.0 / (1.0 + exp(-z));
    case TARRY_SCALE_LOGLOG:
        return exp(-exp(z));
    case TARRY_SCALE_PLAIN:
        break;
    }
    return z;
}

/* |dz/dx|, for the delta method. */
static double slope(tarry_scale scale, double x) {
    switch (scale) {
    case TARRY_SCALE_LOG:
        return 1.0 / x;
    case TARRY_SCALE_LOGIT:
        return 1.0 / (x * (1.0 - x));
    case TARRY_SCALE_LOGLOG:
        return -1.0 / (x * log(x));
    case TARRY_SCALE_PLAIN:
        break;
    }
    return 1.0;
}

tarry_jackknife tarry_jackknife_of(size_t n_groups) {
    tarry_jackknife jackknife = {n_groups, NAN};
    if (n_groups >= 2)
        jackknife.t = gsl_cdf_tdist_Pinv(0.975, (double)n_groups - 1.0);
    return jackknife;
}

double tarry_jackknife_se(const tarry_jackknife *jackknife, double value,
                          const double *replicates) {
    const size_t n = jackknife->n_groups;
    if (n < 2)
        return NAN;
    double sum = 0.0;
    for (size_t g = 0; g < n; g++)
        sum += (replicates[g] - value) * (replicates[g] - value);
    const double se = sqrt(sum * (double)(n - 1) / (double)n);
    return isfinite(se) ? se : NAN;
}

/* The standard error on the scale, on which the figure is z, and the moves; infinite or NaN where a
 * replicate lies at its border or beyond. */
static double scaled_se(const tarry_jackknife *jackknife, double z, const double *replicates,
                        tarry_scale scale, double *moves) {
    const size_t n = jackknife->n_groups;
    double sum = 0.0;
    for (size_t g = 0; g < n; g++) {
        moves[g] = tarry_to_scale(scale, replicates[g]) - z;
        sum += moves[g] * moves[g];
    }
    return sqrt(sum * (double)(n - 1) / (double)n);
}

tarry_estimate tarry_jackknife_estimate(const tarry_jackknife *jackknife, double value,
                                        const double *replicates, tarry_scale scale) {
    tarry_estimate estimate = {.value = value, .low = NAN, .high = NAN, .se = NAN, .scale = scale};
    estimate.se = tarry_jackknife_se(jackknife, value, replicates);
    const double z = tarry_to_scale(scale, value);
    if (!isfinite(estimate.se) || !isfinite(z))
        return estimate;
    double s = scaled_se(jackknife, z, replicates, scale, estimate.moves);
    if (isfinite(s))
        estimate.n_moves = jackknife->n_groups;
    else
        s = estimate.se * slope(scale, value);
    const double one = from_scale(scale, z - jackknife->t * s);
    const double other = from_scale(scale, z + jackknife->t * s);
    estimate.low = one < other ? one : other; /* log(-log S) falls as S rises */
    estimate.high = one < other ? other : one;
    if (s <= 0.0) /* not to come back from the scale a rounding off */
        estimate.low = estimate.high = value;
    return estimate;
}

tarry_estimate tarry_wilson(double share, double n) {
    const double z = 1.959963984540054; /* the normal law's 0.975 quantile */
    tarry_estimate estimate = {.value = share, .low = NAN, .high = NAN, .se = NAN};
    if (!(n > 0.0) || !(share >= 0.0 && share <= 1.0))
        return estimate;
    const double spread = share * (1.0 - share) / n;
    const double centre = (share + z * z / (2.0 * n)) / (1.0 + z * z / n);
    const double half = z / (1.0 + z * z / n) * sqrt(spread + z * z / (4.0 * n * n));
    estimate.se = sqrt(spread);
    estimate.low = share > 0.0 ? fmax(centre - half, 0.0) : 0.0;
    estimate.high = share < 1.0 ? fmin(centre + half, 1.0) : 1.0;
    return estimate;
}

/* By Wilson, on the number of independent trials that would give the jackknife's standard error. */
static tarry_estimate share_by_wilson(double share, double se, double n_cells) {
    const double n = se > 0.0 ? share * (1.0 - share) / (se * se) : n_cells;
    tarry_estimate estimate = tarry_wilson(share, n);
    estimate.se = se;
    return estimate;
}

tarry_estimate tarry_jackknife_share(const tarry_jackknife *jackknife, const double *counts,
                                     const double *totals, double n_cells) {
    const size_t n = jackknife->n_groups;
    double count = 0.0, total = 0.0;
    for (size_t g = 0; g < n; g++) {
        count += counts[g];
        total += totals[g];
    }
    double replicates[TARRY_JACKKNIFE_MOST] = {0};
    int at_border = 0;
    for (size_t g = 0; g < n; g++) {
        const double left = count - counts[g], of = total - totals[g];
        replicates[g] = left / of;
        at_border |= left <= 0.0 || left >= of;
    }
    const double share = count / total;
    const double se = tarry_jackknife_se(jackknife, share, replicates);
    if (at_border && isfinite(se))
        return share_by_wilson(share, se, n_cells);
    return tarry_jackknife_estimate(jackknife, share, replicates, TARRY_SCALE_LOGIT);
}
