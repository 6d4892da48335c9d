/* SPDX-License-Identifier: GPL-3.0-or-later */

/* 95 % intervals hold in about 95 % of 50 repeats of two small runs; `make coverage` does it at
 * length. Binomial statistics of 50 repeats: the sd of one share is 3.1 %, five of them make 80 %.
 */

#include "coverage.h"
#include "support.h"

#include <math.h>
#include <string.h>

static void check_model(size_t model) {
    static coverage_counts found;
    const int repeats = test_small() ? 20 : 50;
    coverage_run(model, repeats, test_small() ? 20 : 200, &found);
    double sum = 0, n = 0;
    for (size_t i = 0; i < found.n_classes; i++) {
        const coverage_counts *all = &found;
        const char *name = all->classes[i].name;
        if (strncmp(name, "bursts: ", 8) != 0 || strstr(name, "outside"))
            continue;
        const double share = coverage_share(&found, name);
        const double least = 0.95 - 5 * sqrt(0.95 * 0.05 / repeats);
        ck_assert_msg(share >= least, "%s: %s held in %g of %d repeats", coverage_title(model),
                      name, share, repeats);
        sum += share;
        n++;
    }
    ck_assert_double_ge(n, 12);
    /* Shares of one run hang together, so that their mean has nearly the sd of one figure's: half
     * of it here. */
    const double margin = 5 * sqrt(0.95 * 0.05 / repeats) / 2;
    ck_assert_msg(fabs(sum / n - 0.95) < margin, "%s: %g held over all", coverage_title(model),
                  sum / n);
}

START_TEST(test_short_record) {
    check_model(1);
}
END_TEST

START_TEST(test_long_record) {
    check_model(2);
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"short record, many cells", test_short_record},
        {"long record, few cells", test_long_record},
    };
    return run_tests("coverage", tests, sizeof tests / sizeof *tests);
}
