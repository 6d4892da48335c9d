/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_TALLY_JACKKNIFE_H
#define TARRY_TALLY_JACKKNIFE_H

/* Intervals by the delete-a-group jackknife (Efron & Stein 1981, Ann. Stat. 9:586; Kott 2001, J.
 * Off. Stat. 17:521): with z the figure on a scale on which it is nearly normal, z_g the same
 * without group g of G, s^2 = (G - 1)/G sum (z_g - z)^2, the interval is z -+ t s brought back from
 * the scale, t being Student's 0.975 quantile with G - 1 degrees of freedom. */

#include <stddef.h>

enum { TARRY_JACKKNIFE_MOST = 64 }; /* groups */

/* The scale on which an interval is symmetric. */
typedef enum tarry_scale {
    TARRY_SCALE_PLAIN,
    TARRY_SCALE_LOG,    /* positive figures */
    TARRY_SCALE_LOGIT,  /* fractions */
    TARRY_SCALE_LOGLOG, /* survival: log(-log S) */
} tarry_scale;

/* An estimate with its interval; low and high are NaN where there is none. `moves` are how far
 * leaving out each group moves the figure on the scale of its interval; there are none (n_moves 0)
 * where the interval does not rest on them. */
typedef struct tarry_estimate {
    double value, low, high;
    double se; /* on the plain scale; NaN where there is none */
    tarry_scale scale;
    size_t n_moves;
    double moves[TARRY_JACKKNIFE_MOST];
} tarry_estimate;

typedef struct tarry_jackknife {
    size_t n_groups;
    double t; /* Student's quantile; NaN with fewer than 2 groups */
} tarry_jackknife;

tarry_jackknife tarry_jackknife_of(size_t n_groups);

/* A figure on a scale: where its interval is symmetric. */
double tarry_to_scale(tarry_scale scale, double value);

/* The estimate from a figure and its replicates (one a group). There is no interval (NaN) where
 *   - there are fewer than 2 groups,
 *   - the figure or one of its replicates is not finite: it hangs on one group,
 *   - the figure lies at or beyond the border of the scale (0; for fractions and survival also 1).
 * Where only a replicate does, s is by the delta method from the plain scale. */
tarry_estimate tarry_jackknife_estimate(const tarry_jackknife *jackknife, double value,
                                        const double *replicates, tarry_scale scale);

/* The standard error alone, on the plain scale. */
double tarry_jackknife_se(const tarry_jackknife *jackknife, double value, const double *replicates);

/* A share, sum of counts over sum of totals (one of each a group): by the jackknife on the logit
 * scale. Where all counts are 0, or all are full, or all those counted (or left) are in one group,
 * by Wilson's interval: on the effective number of cells share (1 - share)/se^2, and with no or
 * full counts on `n_cells`, as if every cell spoke once. NaN where the totals are 0; no interval
 * with fewer than 2 groups. */
tarry_estimate tarry_jackknife_share(const tarry_jackknife *jackknife, const double *counts,
                                     const double *totals, double n_cells);

/* Wilson's 95 % interval (1927, J. Am. Stat. Assoc. 22:209) for a share seen in n trials. */
tarry_estimate tarry_wilson(double share, double n);

#endif
