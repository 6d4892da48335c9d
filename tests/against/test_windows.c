/* SPDX-License-Identifier: GPL-3.0-or-later */

/* The figures of each window equal those of a run that has only that regime: once a step is long
 * past, nothing tells the two apart. Dwells that begin in a window may go on past the next step, so
 * the windows end long before it. */

#include "agree.h"
#include "support.h"

#include <stdio.h>
#include <string.h>

static const char genes[] =
    "genes:\n  vela:\n    copies: 2\n    start: steady\n    promoter:\n"
    "      shut: {to: {open: k}}\n      open: {to: {shut: 1}, initiates: rate}\n"
    "    transcript: {stages: {nascent: {gamma: {mean: lag, sd: 0.5}}}, decay: 0.5}\n"
    "signals: {spot: {of: vela.nascent, ramp: {from: 0.2, to: 0.6}, noise: 0.3}}\n";

static tarry_results *run(const char *parameters, const char *rest) {
    char text[4096], what[1024];
    tarry_model *model = NULL;
    tarry_results *results = NULL;
    tarry_error error = {0};
    const tarry_run_options options = {.threads = 2};
    snprintf(text, sizeof text, "tarry: 1\ntime: min\nparameters: %s\n%s%s", parameters, genes,
             rest);
    tarry_start();
    int code = tarry_model_read_text(text, strlen(text), "m.yaml", NULL, 0, &model, &error);
    if (code == 0)
        code = tarry_run(model, &options, &results, &error);
    ck_assert_msg(code == 0, "%s", tarry_error_text(&error, what, sizeof what));
    tarry_model_free(model);
    return results;
}

/* Windows of one run with two steps against three runs of one regime each, with seeds of their own.
 */
START_TEST(windows_are_runs_of_their_regimes) {
    static const struct {
        const char *window, *parameters;
        int seed;
    } regimes[] = {{"slow", "{k: 0.2, rate: 3, lag: 2}", 2},
                   {"fast", "{k: 0.8, rate: 3, lag: 2}", 3},
                   {"late", "{k: 0.8, rate: 1, lag: 4}", 4}};
    static const size_t least[AGREE_KINDS] = {0, 0, 10, 15, 6, 3, 20, 30, 0};
    const int cells = test_small() ? 200 : 1500;
    char rest[1024];
    snprintf(
        rest, sizeof rest,
        "protocol: [{at: 80, set: {k: 0.8}}, {at: 160, set: {rate: 1, lag: 4}}]\n"
        "run: {cells: %d, settle: 100, until: 240, every: 0.5, lags: 8, windows: {slow: [0, 40], "
        "fast: [120, 140], late: [200, 240]}}\n",
        cells);
    tarry_results *all = run(regimes[0].parameters, rest);
    for (size_t i = 0; i < sizeof regimes / sizeof *regimes; i++) {
        snprintf(rest, sizeof rest,
                 "run: {cells: %d, settle: 100, until: %d, every: 0.5, lags: 8, seed: %d}\n", cells,
                 i == 1 ? 20 : 40, regimes[i].seed);
        tarry_results *one = run(regimes[i].parameters, rest);
        for (int k = 0; k < AGREE_KINDS; k++) {
            if (k == AGREE_MEANS || k == AGREE_SDS || k == AGREE_FIRST)
                continue; /* these are not told by windows */
            const agree_score s = agree_compare(all, one, &agree_figures[k], regimes[i].window,
                                                "all");
            agree_hold(&s, regimes[i].window, test_small() ? least[k] / 3 : least[k]);
        }
        tarry_results_free(one);
    }
    tarry_results_free(all);
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"windows are runs of their regimes", windows_are_runs_of_their_regimes},
    };
    return run_tests("windows", tests, sizeof tests / sizeof *tests);
}
