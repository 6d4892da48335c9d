/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "kummer.h"

#include <check.h>
#include <gsl/gsl_sf_gamma.h>
#include <gsl/gsl_sf_hyperg.h>
#include <math.h>

double kummer_law(two_state_rates rates, unsigned n) {
    const double k = rates.open + rates.shut;
    gsl_sf_result f;
    ck_assert_int_eq(gsl_sf_hyperg_1F1_e(rates.shut, k + n, rates.initiate, &f), 0);
    const double log_p = n * log(rates.initiate) - gsl_sf_lnfact(n) + gsl_sf_lnpoch(rates.open, n) -
                         gsl_sf_lnpoch(k, n) - rates.initiate;
    return exp(log_p) * f.val;
}
