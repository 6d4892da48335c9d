/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "results_text.h"

#include "base/table.h"
#include "base/text.h"

#include <check.h>

char *results_text(const tarry_results *results) {
    tarry_text text = {0};
    for (int i = 0; i < TARRY_N_RESULT_TABLES; i++)
        tarry_table_write_csv(tarry_results_table(results, (tarry_result_table)i), &text);
    if (tarry_results_cells(results))
        tarry_table_write_csv(tarry_results_cells(results), &text);
    for (size_t i = 0; i < tarry_results_n_warnings(results); i++)
        tarry_text_printf(&text, "%s\n", tarry_results_warning(results, i));
    tarry_text_printf(&text, "%lld cells, %.0f firings, %.0f completions\n",
                      (long long)tarry_results_n_cells(results), tarry_results_firings(results),
                      tarry_results_completions(results));
    ck_assert(!text.failed);
    return text.data;
}
