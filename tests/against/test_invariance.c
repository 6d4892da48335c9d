/* SPDX-License-Identifier: GPL-3.0-or-later */

/* What must not matter in law: the unit of time, the order of genes, a fixed lag once all is
 * settled, the frames. Each variant must follow the exact law by itself (kummer.h). */

#include "kummer.h"
#include "sample.h"
#include "support.h"

#include <stdio.h>
#include <string.h>

enum { CELLS = 10000, MOST = 200 };

static const two_state_rates slow = {0.5, 2, 20}, quick = {2, 1, 10};

/* Genes decay with 1 per min. `lag` is what stands under `stages`, may be empty. */
#define GENE(name, open, shut, initiate, lag)                                                      \
    "  " name ":\n    start: steady\n    promoter:\n      shut: {to: {open: " open " /min}}\n"     \
    "      open: {to: {shut: " shut " /min}, initiates: " initiate " /min}\n"                      \
    "    transcript: {" lag "decay: 1 /min}\n"
#define SLOW(lag) GENE("vela", "0.5", "2", "20", lag)
#define QUICK(lag) GENE("deneb", "2", "1", "10", lag)
#define RUN "run: {settle: 40 min, until: 4 min, every: 1 min}\n"

static void check_gene(const char *what, const sample_cells *cells, const char *name,
                       two_state_rates rates) {
    static double law[MOST];
    for (unsigned n = 0; n < MOST; n++)
        law[n] = kummer_law(rates, n);
    check_counts(what, sample_values(cells, name, 0), cells->n_cells, law, MOST);
}

static void check_both(const char *what, const char *text) {
    sample_cells *cells = sample_new(text, CELLS);
    check_gene(what, cells, "vela.transcript", slow);
    check_gene(what, cells, "deneb.transcript", quick);
    sample_free(cells);
}

START_TEST(test_order_of_genes) {
    check_both("vela first", "tarry: 1\ntime: min\ngenes:\n" SLOW("") QUICK("") RUN);
    check_both("deneb first", "tarry: 1\ntime: min\ngenes:\n" QUICK("") SLOW("") RUN);
}
END_TEST

START_TEST(test_unit_of_time) {
    static const char *const units[] = {"s", "h", "d"};
    for (size_t i = 0; i < 3; i++) {
        char text[1024];
        snprintf(text, sizeof text, "tarry: 1\ntime: %s\ngenes:\n" SLOW("") QUICK("") RUN,
                 units[i]);
        check_both(units[i], text);
    }
}
END_TEST

START_TEST(test_fixed_lag_after_settling) {
    check_both("fixed lags",
               "tarry: 1\ntime: min\ngenes:\n" SLOW("stages: {nascent: {fixed: 7 min}}, ")
                   QUICK("stages: {nascent: {fixed: 0.3 min}}, ") RUN);
}
END_TEST

START_TEST(test_frames) {
    check_both("many frames",
               "tarry: 1\ntime: min\ngenes:\n" SLOW("") QUICK(
                   "") "run: {settle: 40 min, until: 4 min, every: 0.01 min, record: [vela]}\n");
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"order of genes", test_order_of_genes},
        {"unit of time", test_unit_of_time},
        {"fixed lag after settling", test_fixed_lag_after_settling},
        {"frames", test_frames},
    };
    return run_tests("invariance", tests, sizeof tests / sizeof *tests);
}
