/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Two routes to one number: what a simulation finds and what is worked out must agree, for models
 * of different structure. */

#include "agree.h"
#include "support.h"

#include "tarry/tarry.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

static const char *const models[] = {
    /* three states, two of them active, export by a gamma lag */
    "genes:\n  vela:\n    start: steady\n    promoter:\n      off: {to: {low: 0.2}}\n"
    "      low: {to: {off: 0.3, high: 0.4}, initiates: 1}\n      high: {to: {low: 0.8}, initiates: "
    "6}\n"
    "    transcript: {stages: {nascent: {fixed: 2}, nuclear: {gamma: {mean: 3, sd: 1.5}}}, decay: "
    "0.3}\n"
    "signals: {spot: {of: vela.nascent, ramp: {from: 0.2, to: 0.5}, noise: 0.4}}\n",
    /* a lasting Erlang state, three copies, losses, a lifetime that is not exponential */
    "genes:\n  vela:\n    copies: 3\n    start: steady\n    promoter:\n"
    "      shut: {lasts: {erlang: {steps: 3, mean: 9}}, then: {open: 1}}\n"
    "      open: {to: {shut: 0.5}, initiates: 3}\n"
    "    transcript: {stages: {a: {lasts: {exponential: {mean: 4}}, lost: 0.1}}, lifetime: "
    "{weibull: "
    "{shape: 2, scale: 5}}}\nsignals: {all: {sum: {vela.a: 1, vela.transcript: 2}}}\n",
    /* pausing: the move initiates; a clearance of exponential length; a lag from a table */
    "genes:\n  vela:\n    clearance: {exponential: {mean: 0.3}}\n    promoter:\n"
    "      empty: {to: {paused: 2}}\n      paused: {to: {empty: {rate: 1.5, initiates: yes}}}\n"
    "    bursts_in: [paused]\n    transcript: {stages: {n: {table: {edges: [1, 2, 4], weights: [1, "
    "3]}}}, "
    "decay: 0.4}\nsignals: {late: {of: vela.n, ramp: {from: 0.5, to: 0.5}, background: 1}}\n",
    /* an induction from a gene that is hardly ever on */
    "parameters: {k: 0.02}\ngenes:\n  vela:\n    start: steady\n    promoter:\n"
    "      shut: {to: {open: k}}\n      open: {to: {shut: 0.6}, initiates: 4}\n"
    "    transcript: {stages: {n: {uniform: {from: 1, to: 3}}, m: {lognormal: {mean: 2, sd: 1}}}, "
    "decay: "
    "0.5}\nprotocol: [{at: 5, set: {k: 0.5}}]\nsignals: {both: {sum: {vela.n: 1, vela.m: 1}}}\n",
    /* two colours on one gene, one of which sees one allele */
    "genes:\n  vela:\n    copies: 2\n    start: steady\n    promoter:\n      shut: {to: {open: "
    "0.25}}\n"
    "      open: {to: {shut: 0.75}, initiates: 5}\n"
    "    transcript: {stages: {n: {mix: [{share: 0.4, lasts: {fixed: 2}}, {share: 0.6, lasts: "
    "{erlang: "
    "{steps: 2, mean: 5}}}]}}, decay: 1}\n"
    "signals:\n  head: {of: vela.n, ramp: {from: 0.1, to: 0.3}}\n"
    "  tail: {of: vela.n, ramp: {from: 0.6, to: 0.9}, brightness: 2}\n"
    "  one: {of: vela.n, ramp: {from: 0.1, to: 0.3}, allele: 1, noise: {fixed: 0.1, share: 0.2}}\n",
    /* a protein that matures, and light of it */
    "genes:\n  vela:\n    start: steady\n    promoter:\n      shut: {to: {open: 0.4}}\n"
    "      open: {to: {shut: 0.6}, initiates: 2}\n"
    "    transcript: {stages: {n: {gamma: {mean: 2, sd: 1}}}, decay: 0.5}\n"
    "    protein: {translation: 0.8, stages: {dark: {gamma: {mean: 2, sd: 1}}}, decay: 0.4}\n"
    "signals: {light: {of: vela.protein, brightness: 2, noise: 1, background: 3}}\n",
    /* proteins that are lost on the way and live a time that is not exponential, of two copies;
     * seen together with the transcript */
    "genes:\n  vela:\n    copies: 2\n    start: steady\n    promoter:\n"
    "      shut: {lasts: {erlang: {steps: 2, mean: 3}}, then: {open: 1}}\n"
    "      open: {to: {shut: 1}, initiates: 1.5}\n"
    "    transcript: {stages: {n: {lasts: {fixed: 1}, lost: 0.2}}, lifetime: {uniform: {from: 1, "
    "to: 4}}}\n"
    "    protein: {translation: 0.7, stages: {dark: {lasts: {lognormal: {mean: 2, sd: 1}}, lost: "
    "0.1}}, "
    "lifetime: {weibull: {shape: 2, scale: 3}}}\n"
    "signals: {both: {sum: {vela.transcript: 1, vela.protein: 0.5}}}\n",
    /* proteins of an induction; the first one */
    "parameters: {k: 0.05}\ngenes:\n  vela:\n    start: steady\n    promoter:\n"
    "      shut: {to: {open: k}}\n      open: {to: {shut: 0.6}, initiates: 2}\n"
    "    transcript: {stages: {n: {fixed: 1.5}}, decay: 0.7}\n"
    "    protein: {translation: 1, stages: {dark: {exponential: {mean: 1}}}, decay: 0.5}\n"
    "protocol: [{at: 5, set: {k: 0.5}}]\n",
    /* a clearance of two steps and two stages of a protein */
    "genes:\n  vela:\n    start: steady\n    clearance: {erlang: {steps: 2, mean: 0.4}}\n    "
    "promoter:\n"
    "      shut: {to: {open: 0.3}}\n      open: {to: {shut: 0.3}, initiates: 2}\n"
    "    transcript: {decay: 0.5}\n"
    "    protein: {translation: 0.6, stages: {a: {fixed: 1}, b: {exponential: {mean: 2}}}, decay: "
    "0.5}\n",
    /* two genes in one signal */
    "genes:\n  vela:\n    start: steady\n    promoter:\n      shut: {to: {open: 0.3}}\n"
    "      open: {to: {shut: 0.5}, initiates: 2}\n    transcript: {stages: {n: {fixed: 2}}, decay: "
    "0.8}\n"
    "  lyra:\n    promoter: {on: {initiates: 1}}\n    transcript: {lifetime: {fixed: 3}}\n"
    "signals: {sum: {sum: {vela.n: 1, lyra.transcript: 0.7}}}\n",
    /* parameters that differ from cell to cell: one, and two */
    "parameters:\n  k: {value: 3, varies: {gamma: {cv: 0.4}}}\ngenes:\n  vela:\n    start: steady\n"
    "    promoter:\n      shut: {to: {open: 0.3}}\n      open: {to: {shut: 0.5}, initiates: k}\n"
    "    transcript: {stages: {n: {gamma: {mean: 2, sd: 1}}}, decay: 0.5}\n"
    "signals: {spot: {of: vela.n, ramp: {from: 0.2, to: 0.6}, noise: 0.3}}\n",
    "parameters:\n  size: {value: 1, varies: {lognormal: {cv: 0.3}}}\n  loss: {value: 0.8, varies: "
    "{uniform: {cv: 0.3}}}\n"
    "genes:\n  vela:\n    start: steady\n    promoter:\n      shut: {to: {open: 0.3}}\n"
    "      open: {to: {shut: 0.5}, initiates: 4 * size}\n    transcript: {stages: {n: "
    "{exponential: "
    "{mean: 1}}}, decay: loss}\n",

    /* a promoter that moves to another state as it initiates, from a gene that starts shut */
    "genes:\n  vela:\n    promoter:\n      shut: {to: {ready: 0.5}}\n"
    "      ready: {to: {open: {rate: 1, initiates: yes}, shut: 0.4}}\n"
    "      open: {to: {shut: 0.6}, initiates: 1.5}\n"
    "    transcript: {stages: {n: {table: {edges: [0, 1, 3], weights: [1, 2]}}}, decay: 0.6}\n"
    "    protein: {translation: 0.5, lifetime: {gamma: {mean: 3, sd: 1}}}\n",
};

/* ---- the test ------------------------------------------------------------------------------ */

static void check_model(size_t m) {
    static const size_t least[][AGREE_KINDS] = {{300, 80, 3, 4, 3, 1, 20, 30, 0},
                                                {300, 80, 3, 4, 0, 1, 20, 8, 0},
                                                {300, 80, 3, 3, 0, 0, 0, 8, 0},
                                                {300, 80, 3, 4, 0, 0, 0, 0, 10}};
    const bool is_induced = strstr(models[m], "protocol:") != NULL;
    const bool differs = strstr(models[m], "varies:") != NULL;
    const bool is_seen = strstr(models[m], "signals:") != NULL;
    const size_t *n_least = least[is_induced ? 3 : differs ? 2 : is_seen ? 0 : 1];
    char text[4096], what[1024];
    tarry_model *model = NULL;
    tarry_results *found = NULL, *exact = NULL;
    tarry_error error = {0};
    const tarry_run_options options = {.threads = 2};
    snprintf(text, sizeof text,
             "tarry: 1\ntime: min\n%srun: {cells: %d, settle: 100, until: 40, every: 0.5, "
             "snapshots: [0, 10, 40], lags: 8}\n",
             models[m], test_small() ? 400 : 3000);
    tarry_start();
    int code = tarry_model_read_text(text, strlen(text), "m.yaml", NULL, 0, &model, &error);
    if (code == 0)
        code = tarry_run(model, &options, &found, &error);
    if (code == 0)
        code = tarry_predict(model, &exact, &error);
    ck_assert_msg(code == 0, "model %zu: %s", m, tarry_error_text(&error, what, sizeof what));
    for (int k = 0; k < AGREE_KINDS; k++) {
        const agree_score s = agree_compare(found, exact, &agree_figures[k], NULL, NULL);
        snprintf(what, sizeof what, "model %zu", m);
        agree_hold(&s, what, n_least[k]);
    }
    tarry_results_free(found);
    tarry_results_free(exact);
    tarry_model_free(model);
}

START_TEST(simulation_and_prediction_agree) {
    for (size_t m = 0; m < sizeof models / sizeof *models; m++)
        check_model(m);
}
END_TEST

int main(void) {
    const test_entry tests[] = {
        {"simulation and prediction agree", simulation_and_prediction_agree},
    };
    return run_tests("predict", tests, sizeof tests / sizeof *tests);
}
