/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "random_cells.h"

#include "random_model.h"
#include "same_cells.h"
#include "support.h"

#include <stdlib.h>

enum { N_CELLS = 2 };

static bool still_differs(const char *text, void *context) {
    char where[SAME_CELLS_TEXT];
    (void)context;
    return compare_text(text, N_CELLS, NULL, where) == CELLS_DIFFER;
}

static void report_difference(const char *text, uint64_t number) {
    char where[SAME_CELLS_TEXT];
    char *small = shrink_model(text, still_differs, NULL);
    ck_assert_ptr_nonnull(small);
    compare_text(small, N_CELLS, NULL, where);
    ck_abort_msg("random model %llu: %s\nto be kept in tests/unit/kept:\n%s",
                 (unsigned long long)number, where, small);
}

void check_random_models(uint64_t from, uint64_t to) {
    double n_firings = 0, n_run = 0;
    for (uint64_t i = from; i < to; i++) {
        char where[SAME_CELLS_TEXT];
        double firings = 0;
        char *text = random_model(i);
        if (text == NULL)
            ck_abort_msg("memory is short");
        const same_cells result = compare_text(text, N_CELLS, &firings, where);
        if (result == CELLS_DIFFER)
            report_difference(text, i);
        n_run += result == CELLS_SAME;
        n_firings += firings;
        free(text);
    }
    const double n = (double)(to - from);
    ck_assert_msg(n_run > 0.8 * n, "only %g of %g random models run", n_run, n);
    ck_assert_msg(n_firings > 500 * n, "only %g reactions in %g random models", n_firings, n);
}
