/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_TEST_KUMMER_H
#define TARRY_TEST_KUMMER_H

/* Stationary law of the transcripts of a two-state gene (Peccoud & Ycart 1995, Theor. Popul. Biol.
 * 48:222). */

/* Rates in units of the transcripts' decay. */
typedef struct two_state_rates {
    double open, shut, initiate;
} two_state_rates;

/* P(n) = nu^n/n! (a)_n/(k)_n 1F1(a + n; k + n; -nu), as exp(-nu) 1F1(shut; k + n; nu): all terms
 * are positive then (Kummer's transformation); by GSL. */
double kummer_law(two_state_rates rates, unsigned n);

#endif
