/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "random_model.h"

#include "base/random.h"
#include "base/text.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>

enum {
    MOST_PARAMETERS = 5,
    MOST_DELAYS = 5,
    MOST_SPECIES = 4,
    MOST_GENES = 2,
    MOST_STATES = 4,
    MOST_STAGES = 2,
    MOST_REACTIONS = 6,
    UNTIL = 20
};

typedef struct gene_plan {
    unsigned n_states, n_stages;
    bool transcript, protein, steady;
    bool lasts[MOST_STATES];
} gene_plan;

typedef struct maker {
    tarry_stream stream;
    tarry_text out;
    unsigned n_parameters, n_delays, n_species, n_genes, n_reactions;
    bool has_signals, detects;
    gene_plan genes[MOST_GENES];
} maker;

/* ---- choosing ---- */

static unsigned pick(maker *m, unsigned n) {
    return (unsigned)(tarry_stream_next(&m->stream) % n);
}

static bool chance(maker *m, unsigned percent) {
    return pick(m, 100) < percent;
}

/* A number with two digits between low and high. */
static double number(maker *m, double low, double high) {
    const double x = low + (high - low) * tarry_unit(tarry_stream_next(&m->stream));
    char text[32];
    snprintf(text, sizeof text, "%.2g", x);
    return strtod(text, NULL);
}

#define WRITE(...) tarry_text_printf(&m->out, __VA_ARGS__)

static void write_number(maker *m, double low, double high) {
    tarry_text_add_number(&m->out, number(m, low, high));
}

/* ---- expressions ---- */

/* A name that a rate may read, or false where there is none yet. */
static bool write_counted(maker *m) {
    const unsigned which = pick(m, 4);
    if (which < 2 && m->n_species > 0) {
        WRITE("x%u", pick(m, m->n_species));
        return true;
    }
    if (m->n_genes == 0)
        return false;
    const unsigned g = pick(m, m->n_genes);
    const gene_plan *gene = &m->genes[g];
    if (which == 2 && gene->protein)
        WRITE("g%u.protein", g);
    else if (gene->transcript && chance(m, 60))
        WRITE("g%u.transcript", g);
    else
        WRITE("g%u.s%u", g, pick(m, gene->n_states));
    return true;
}

/* A rate from low to high or so; with `reads` it may depend on counts. */
static void write_rate(maker *m, double low, double high, bool reads) {
    if (reads && (m->n_species > 0 || m->n_genes > 0) && chance(m, 20)) {
        const size_t before = m->out.size;
        WRITE("\"");
        write_number(m, low, high);
        WRITE(chance(m, 50) ? " * hill(" : " * repress(");
        if (write_counted(m)) {
            WRITE(", %u, %u)\"", 1 + pick(m, 9), 1 + pick(m, 3));
            return;
        }
        m->out.size = before;
        m->out.data[before] = '\0';
    }
    if (m->n_parameters > 0 && chance(m, 40)) {
        WRITE("k%u", pick(m, m->n_parameters));
        if (chance(m, 30)) {
            WRITE(" * ");
            write_number(m, 0.5, 2);
        }
        return;
    }
    write_number(m, low, high);
    if (chance(m, 20))
        WRITE(" /min");
}

/* ---- delays ---- */

static void write_time(maker *m, double low, double high) {
    if (m->n_parameters > 0 && chance(m, 15)) {
        WRITE("1 / (k%u + 0.5)", pick(m, m->n_parameters));
        return;
    }
    write_number(m, low, high);
    if (chance(m, 20))
        WRITE(" min");
}

static void write_mean_and_sd(maker *m, const char *word) {
    /* Few shapes: each costs a table of quantiles, on both sides. */
    static const char *const shapes[] = {"mean: 2, sd: 1", "mean: 1, sd: 0.5", "mean: 3, sd: 1.5",
                                         "mean: 4, sd: 1"};
    WRITE("{%s: {%s}}", word, shapes[pick(m, 4)]);
}

static void write_delay(maker *m, int depth);

static void write_parts(maker *m, int depth) {
    const unsigned n = 1 + pick(m, 3);
    const bool mix = chance(m, 50);
    static const char *const shares[] = {"1", "0.25", "0.75", "0.5", "0.25", "0.25"};
    WRITE(mix ? "{mix: [" : "{total: [");
    for (unsigned i = 0; i < n; i++) {
        if (i > 0)
            WRITE(", ");
        if (mix)
            WRITE("{share: %s, lasts: ", shares[n * (n - 1) / 2 + i]);
        write_delay(m, depth + 1);
        if (mix)
            WRITE("}");
    }
    WRITE("]}");
}

static void write_delay(maker *m, int depth) {
    /* Round lengths, so that things fall together. */
    static const char *const rounds[] = {"0", "0.5", "1", "2", "2.5", "4"};
    switch (pick(m, depth > 1 ? 9 : 11)) {
    case 0:
    case 1:
    case 2:
        if (m->n_parameters > 0 && chance(m, 30)) /* a step of the protocol may change it */
            WRITE("{fixed: 1 / (k%u + 0.5)}", pick(m, m->n_parameters));
        else
            WRITE("{fixed: %s}", rounds[pick(m, 6)]);
        break;
    case 3:
        WRITE("{exponential: {mean: ");
        write_time(m, 0.1, 4);
        WRITE("}}");
        break;
    case 4:
        WRITE("{uniform: {from: %u, to: ", pick(m, 2));
        write_number(m, 1.5, 4);
        WRITE("}}");
        break;
    case 5:
        WRITE("{weibull: {shape: ");
        write_number(m, 0.5, 3);
        WRITE(", scale: ");
        write_time(m, 0.2, 3);
        WRITE("}}");
        break;
    case 6:
        if (chance(m, 25))
            WRITE("{table: {file: tests/unit/kept/lags.csv}}");
        else
            WRITE("{table: {values: [0.5, 1, 2], weights: [1, 2, %u]}}", pick(m, 3));
        break;
    case 7:
        WRITE("{table: {edges: [0, 1, 2, 4], weights: [1, %u, 2]}}", pick(m, 3));
        break;
    case 8:
        if (chance(m, 40))
            WRITE("{erlang: {steps: 4, mean: %u}}", 1 + pick(m, 4));
        else
            write_mean_and_sd(m, chance(m, 40) ? "gamma" : chance(m, 50) ? "lognormal" : "normal");
        break;
    default:
        write_parts(m, depth);
    }
}

/* By name or in place. */
static void write_lag(maker *m) {
    if (m->n_delays > 0 && chance(m, 60))
        WRITE("d%u", pick(m, m->n_delays));
    else if (chance(m, 30))
        write_number(m, 0.2, 4);
    else
        write_delay(m, 1);
}

static void write_parameters_and_delays(maker *m) {
    /* Few shapes, as of delays. */
    static const char *const factors[] = {
        "lognormal: {cv: 0.5}",
        "gamma: {cv: 0.5}",
        "normal: {cv: 0.25}",
        "uniform: {cv: 0.3}",
        "weibull: {cv: 0.4}",
        "erlang: {cv: 0.5}",
        "exponential: {cv: 1}",
        "table: {values: [1, 2, 5], weights: [3, 2, 1]}",
        "table: {edges: [1, 2, 4], weights: [1, 2]}",
        "mix: [{share: 0.25, lasts: 1}, {share: 0.75, lasts: {exponential: {mean: 2}}}]",
        "total: [1, {gamma: {mean: 2, sd: 1}}]"};
    const unsigned n_parameters = pick(m, MOST_PARAMETERS);
    const unsigned n_delays = pick(m, MOST_DELAYS);
    if (n_parameters > 0)
        WRITE("parameters:\n");
    for (unsigned i = 0; i < n_parameters; i++) {
        const bool varies = chance(m, 15);
        WRITE(varies ? "  k%u: {value: " : "  k%u: ", i);
        if (i > 0 && chance(m, 30))
            WRITE("k%u * ", pick(m, i));
        write_number(m, 0.1, 2);
        if (varies)
            WRITE(", varies: {%s}}", factors[pick(m, sizeof factors / sizeof *factors)]);
        WRITE("\n");
    }
    m->n_parameters = n_parameters;
    if (n_delays > 0)
        WRITE("delays:\n");
    for (unsigned i = 0; i < n_delays; i++) {
        WRITE("  d%u: ", i);
        write_delay(m, 0);
        WRITE("\n");
    }
    m->n_delays = n_delays;
}

/* ---- genes ---- */

static void plan_genes(maker *m) {
    m->n_genes = pick(m, MOST_GENES + 1);
    for (unsigned g = 0; g < m->n_genes; g++) {
        gene_plan *gene = &m->genes[g];
        gene->n_states = 1 + pick(m, MOST_STATES);
        gene->transcript = chance(m, 85);
        gene->n_stages = gene->transcript ? pick(m, MOST_STAGES + 1) : 0;
        gene->protein = gene->transcript && chance(m, 40);
        gene->steady = chance(m, 40);
        for (unsigned s = 0; s < gene->n_states; s++)
            gene->lasts[s] = gene->n_states > 1 && chance(m, 30);
    }
}

/* Two different states other than s, or one. */
static void write_targets(maker *m, const gene_plan *gene, unsigned s, bool lasts) {
    const unsigned n = gene->n_states, first = (s + 1 + pick(m, n - 1)) % n;
    unsigned second = (s + 1 + pick(m, n - 1)) % n;
    const bool two = second != first;
    if (lasts) {
        WRITE(two ? "          s%u: 0.6\n          s%u: 0.4\n" : "          s%u: 1\n", first,
              second);
        return;
    }
    for (unsigned i = 0; i < (two ? 2u : 1u); i++) {
        const bool initiates = chance(m, 15);
        WRITE(initiates ? "          s%u:\n            initiates: yes\n            rate: "
                        : "          s%u: ",
              i == 0 ? first : second);
        write_rate(m, 0.1, 1.5, !gene->steady);
        WRITE("\n");
    }
}

static void write_state(maker *m, const gene_plan *gene, unsigned s) {
    const bool stays = gene->n_states == 1;
    const bool initiates = s == 0 ? stays || chance(m, 30) : chance(m, 60);
    WRITE("      s%u:", s);
    if (stays && !initiates) {
        WRITE(" {}\n");
        return;
    }
    WRITE("\n");
    if (gene->lasts[s]) {
        WRITE("        lasts: ");
        write_lag(m);
        WRITE("\n        then:\n");
        write_targets(m, gene, s, true);
    } else if (!stays) {
        WRITE("        to:\n");
        write_targets(m, gene, s, false);
    }
    if (initiates) {
        WRITE("        initiates: ");
        write_rate(m, 0.5, 5, true);
        WRITE("\n");
    }
}

static void write_fate(maker *m) {
    switch (pick(m, 4)) {
    case 0:
        WRITE("      half_life: ");
        write_time(m, 0.5, 5);
        break;
    case 1:
        WRITE("      lifetime: ");
        write_lag(m);
        break;
    default:
        WRITE("      decay: ");
        write_rate(m, 0.2, 2, false);
    }
    WRITE("\n");
}

static void write_gene(maker *m, unsigned g) {
    const gene_plan *gene = &m->genes[g];
    WRITE("  g%u:\n", g);
    if (chance(m, 40))
        WRITE("    copies: %u\n", chance(m, 15) ? 16 : 1 + pick(m, 3));
    if (gene->steady)
        WRITE("    start: steady\n");
    else if (chance(m, 30))
        WRITE("    start: s%u\n", pick(m, gene->n_states));
    else if (gene->n_states > 1 && chance(m, 40))
        WRITE("    start: {s0: 0.3, s1: 0.7}\n");
    if (chance(m, 15))
        WRITE("    bursts_in: [s%u]\n", pick(m, gene->n_states));
    if (chance(m, 25)) {
        WRITE("    clearance: ");
        write_lag(m);
        WRITE("\n");
    }
    WRITE("    promoter:\n");
    for (unsigned s = 0; s < gene->n_states; s++)
        write_state(m, gene, s);
    if (!gene->transcript)
        return;
    WRITE("    transcript:\n");
    bool first_lost = false;
    if (gene->n_stages > 0)
        WRITE("      stages:\n");
    for (unsigned i = 0; i < gene->n_stages; i++) {
        const bool lost = chance(m, 25);
        first_lost = first_lost || (i == 0 && lost);
        WRITE(lost ? "        t%u:\n          lasts: " : "        t%u: ", i);
        write_lag(m);
        WRITE("\n");
        if (lost) {
            WRITE("          lost: ");
            write_rate(m, 0, 1, false);
            WRITE("\n");
        }
    }
    write_fate(m);
    if (gene->n_stages > 0 && !first_lost && chance(m, 30)) {
        WRITE("      no_overtaking: yes\n");
        if (chance(m, 60))
            WRITE("      headway: %s\n", chance(m, 50) ? "0.25" : "0.1");
    }
    if (!gene->protein)
        return;
    WRITE("    protein:\n      translation: ");
    write_rate(m, 0.2, 1.5, chance(m, 30));
    WRITE("\n");
    if (gene->n_stages > 0 && chance(m, 40))
        WRITE("      from: [t0%s]\n", chance(m, 50) ? ", transcript" : "");
    if (chance(m, 50)) {
        WRITE("      stages:\n        folding: ");
        write_lag(m);
        WRITE("\n");
    }
    write_fate(m);
}

/* Some that are all alike, and that nothing else speaks of. */
static void write_like_genes(maker *m) {
    WRITE("  many:\n    many: %u\n    promoter:\n      off:\n        to:\n          on: ",
          2 + pick(m, 4));
    write_rate(m, 0.1, 1, false);
    WRITE("\n      on:\n        to:\n          off: ");
    write_rate(m, 0.1, 1, false);
    WRITE("\n        initiates: ");
    write_rate(m, 0.2, 2, false);
    WRITE("\n    transcript:\n      stages:\n        t: ");
    write_lag(m);
    WRITE("\n      decay: ");
    write_rate(m, 0.2, 2, false);
    WRITE("\n");
}

/* ---- reactions ---- */

static void write_species_map(maker *m, const char *indent, const char *key, bool random,
                              bool single) {
    const unsigned n = 1 + pick(m, m->n_species > 1 && !single ? 2 : 1),
                   first = pick(m, m->n_species);
    WRITE("%s%s:\n", indent, key);
    for (unsigned i = 0; i < n; i++) {
        WRITE("%s  x%u: ", indent, (first + i) % m->n_species);
        if (!random || !chance(m, 30)) {
            WRITE("%u\n", single ? 1 : 1 + pick(m, 2));
            continue;
        }
        switch (pick(m, 4)) {
        case 0:
            WRITE("{geometric: {mean: ");
            write_number(m, 0.5, 4);
            WRITE("}}\n");
            break;
        case 1:
            WRITE("{geometric: {mean: %u, from: 1}}\n", 1 + pick(m, 4));
            break;
        case 2:
            WRITE("{poisson: {mean: ");
            write_number(m, 0.5, 40);
            WRITE("}}\n");
            break;
        default:
            WRITE("{table: {values: [0, 1, 3], weights: [2, 1, 1]}}\n");
        }
    }
}

static void write_later(maker *m, int depth, bool single) {
    char indent[32];
    snprintf(indent, sizeof indent, "%*s", 8 + 4 * depth, "");
    const unsigned n = single ? 1 : 1 + pick(m, 2);
    WRITE("%.*slater:\n", 4 + 4 * depth, indent);
    for (unsigned i = 0; i < n; i++) {
        WRITE("%.*s- after: ", 6 + 4 * depth, indent);
        write_lag(m);
        WRITE("\n");
        if (chance(m, 40)) {
            write_species_map(m, indent, "uses", false, false);
            WRITE("%sif_short: %s\n", indent, chance(m, 97) ? "skip" : "stop");
        }
        write_species_map(m, indent, "makes", !single, single);
        if (chance(m, 30))
            WRITE("%schance: 0.%u\n", indent, 1 + pick(m, 9));
        if (depth == 0 && chance(m, 20))
            write_later(m, 1, true);
    }
}

static void write_reaction(maker *m, unsigned r) {
    WRITE("  r%u:\n", r);
    bool reads = false;
    if (chance(m, 60)) {
        write_species_map(m, "    ", "uses", false, false);
        reads = true;
    }
    if (chance(m, 25)) {
        WRITE("    needs:\n      ");
        if (!write_counted(m))
            WRITE("x0");
        WRITE(": %u\n", 1 + pick(m, 2));
    }
    /* What uses molecules makes one at most, so that nothing feeds on itself without end. */
    const bool makes = !reads || chance(m, 50);
    if (makes)
        write_species_map(m, "    ", "makes", !reads, reads);
    if (chance(m, 15)) {
        WRITE("    propensity: \"");
        write_number(m, 0.2, 3);
        WRITE(" * x%u / (1 + x%u)\"\n", pick(m, m->n_species), pick(m, m->n_species));
    } else {
        WRITE("    rate: ");
        write_rate(m, 0.05, reads ? 0.5 : 3, true);
        WRITE("\n");
    }
    if (!(reads && makes) && chance(m, 60))
        write_later(m, 0, reads);
}

static void write_reactions(maker *m) {
    if (m->n_species == 0)
        return;
    m->n_reactions = 1 + pick(m, MOST_REACTIONS);
    WRITE("reactions:\n");
    for (unsigned r = 0; r < m->n_reactions; r++)
        write_reaction(m, r);
    for (unsigned s = 0; s < m->n_species; s++) { /* so that nothing grows without end */
        WRITE("  sink%u: {uses: {x%u: 1}, rate: ", s, s);
        write_number(m, 0.3, 1.5);
        WRITE("}\n");
    }
}

static void write_bursts(maker *m) {
    if (m->n_reactions < 2 || !chance(m, 30))
        return;
    WRITE("bursts:\n  named:\n    opens: [r%u]\n    closes: [sink%u]\n    counts: [r%u]\n",
          pick(m, m->n_reactions), pick(m, m->n_species), pick(m, m->n_reactions));
}

/* ---- what is seen, and when what is done ---- */

static void write_ramp(maker *m) {
    static const char *const ramps[] = {"from: 0.1, to: 0.4", "from: 0.5, to: 0.5",
                                        "from: 0, to: 0", "from: 0, to: 1", "from: 0.3, to: 0.9"};
    WRITE("{%s}", ramps[pick(m, 5)]);
}

static void write_signals(maker *m) {
    const unsigned n = pick(m, 3);
    bool headed = false;
    for (unsigned i = 0; i < n && m->n_genes > 0; i++) {
        const unsigned g = pick(m, m->n_genes);
        const gene_plan *gene = &m->genes[g];
        if (!gene->transcript)
            continue;
        if (!headed)
            WRITE("signals:\n");
        headed = m->has_signals = true;
        WRITE("  light%u:\n", i);
        if (gene->n_stages > 0 && chance(m, 60)) {
            const bool one_allele = chance(m, 30);
            WRITE("    of: g%u.t%u\n    ramp: ", g, one_allele ? 0 : pick(m, gene->n_stages));
            write_ramp(m);
            WRITE("\n");
            if (one_allele)
                WRITE("    allele: 1\n");
            if (chance(m, 50))
                WRITE("    brightness: %u\n", 1 + pick(m, 5));
        } else {
            WRITE("    sum:\n      g%u.transcript: 1.5\n", g);
            if (gene->n_stages > 0) {
                WRITE("      g%u.t0: {ramp: ", g);
                write_ramp(m);
                WRITE("}\n");
            }
            if (gene->protein)
                WRITE("      g%u.protein: 0.1\n", g);
        }
        if (chance(m, 30))
            WRITE("    responds_above: %u\n", 1 + pick(m, 4));
        if (chance(m, 20)) {
            m->detects = true;
            WRITE("    detects: {above: %u, from_first: %s}\n", 1 + pick(m, 4),
                  chance(m, 50) ? "yes" : "no");
        }
        if (chance(m, 50))
            WRITE("    background: 2\n");
        if (chance(m, 50))
            WRITE(chance(m, 60) ? "    noise: 0.3\n" : "    noise: {fixed: 0.3, share: 0.1}\n");
    }
}

static void write_setting(maker *m) {
    const unsigned which = pick(m, 4);
    if (which == 0 && m->n_genes > 0) {
        const unsigned g = pick(m, m->n_genes);
        WRITE("      g%u.promoter: s%u\n", g, pick(m, m->genes[g].n_states));
    } else if (which == 1 && m->n_species > 0) {
        WRITE("      x%u: %u\n", pick(m, m->n_species), pick(m, 9));
    } else if (which == 2 && m->n_genes > 0 && m->genes[0].transcript) {
        WRITE("      g0.transcript: %u\n", pick(m, 9));
    } else {
        WRITE("      k%u: ", pick(m, m->n_parameters));
        write_number(m, 0.1, 2);
        WRITE("\n");
    }
}

static void write_ramp_or_repeat(maker *m) {
    if (chance(m, 50)) {
        WRITE("  - from: %u\n    to: %u\n    ramp:\n      k%u: ", pick(m, 5), 6 + pick(m, 9),
              pick(m, m->n_parameters));
        write_number(m, 0.1, 2);
        WRITE("\n    steps: %u\n", 1 + pick(m, 6));
        return;
    }
    WRITE("  - every: %u\n    times: %u\n    do:\n      - at: %u\n        set:\n    ",
          5 + pick(m, 3), 1 + pick(m, 3), pick(m, 3));
    write_setting(m);
}

static void write_protocol(maker *m) {
    if (m->n_parameters == 0 || !chance(m, 50))
        return;
    const unsigned n = 1 + pick(m, 3);
    unsigned at = pick(m, 4);
    WRITE("protocol:\n");
    if (chance(m, 25)) {
        write_ramp_or_repeat(m);
        return;
    }
    for (unsigned i = 0; i < n && at <= UNTIL; i++, at += 1 + pick(m, 8)) {
        WRITE("  - at: %u%s\n    set:\n", at, chance(m, 30) ? ".25" : "");
        write_setting(m);
    }
}

static void write_run(maker *m) {
    static const char *const everies[] = {"0.5", "1", "2", "0.1", "4"};
    WRITE("run:\n  cells: 3\n  seed: 1\n  until: %d\n  every: %s\n", (int)UNTIL,
          everies[pick(m, 5)]);
    if (m->n_genes > 0 && chance(m, 10)) {
        WRITE("  settle: auto\n");
    } else if (chance(m, 50)) {
        WRITE("  settle: ");
        write_number(m, 1, 15);
        WRITE("\n");
    }
    if (chance(m, 20))
        WRITE("  lags: %u\n", 4 * pick(m, 4));
    if (chance(m, 50))
        WRITE("  snapshots: [0, %u, 7.3, %d]\n", 1 + pick(m, 6), (int)UNTIL);
    if (chance(m, 40))
        WRITE("  windows:\n    early: [0, %u]\n    late: [%u, %d]\n", 2 + pick(m, 8), pick(m, 15),
              (int)UNTIL);
    if (m->n_species > 0 && !m->detects && chance(m, 20))
        WRITE("  record: [x0]\n");
    else if (m->has_signals && chance(m, 30))
        WRITE("  visible: [1, 3, 0.5 min]\n");
    WRITE("limits:\n  firings: 30000\n  pending: 3000\n%s",
          chance(m, 10) ? "  memory: 1 GB\n" : "");
}

char *random_model(uint64_t number_of_model) {
    maker made = {.n_species = 0}, *m = &made;
    tarry_stream_init(&m->stream, 1, number_of_model, TARRY_STREAM_PARAMETERS);
    WRITE("tarry: 1\ntime: min\n");
    write_parameters_and_delays(m);
    plan_genes(m);
    m->n_species = m->n_genes == 0 ? 1 + pick(m, MOST_SPECIES) : pick(m, MOST_SPECIES + 1);
    if (m->n_genes > 0)
        WRITE("genes:\n");
    for (unsigned g = 0; g < m->n_genes; g++)
        write_gene(m, g);
    if (m->n_genes > 0 && chance(m, 10))
        write_like_genes(m);
    if (m->n_species > 0)
        WRITE("species:\n");
    for (unsigned s = 0; s < m->n_species; s++)
        WRITE("  x%u: %u\n", s, pick(m, 12));
    write_reactions(m);
    write_bursts(m);
    write_signals(m);
    write_protocol(m);
    write_run(m);
    if (made.out.failed) {
        tarry_text_release(&made.out);
        return NULL;
    }
    return made.out.data;
}

/* ---- shrinking ---- */

static size_t indent_of(const char *line) {
    return strspn(line, " ");
}

static const char *next_line(const char *line) {
    const char *end = strchr(line, '\n');
    return end ? end + 1 : line + strlen(line);
}

/* The text without the line at `from` and what is indented below it. */
static char *without(const char *text, const char *from) {
    const char *to = next_line(from);
    while (*to != '\0' && indent_of(to) > indent_of(from))
        to = next_line(to);
    const size_t head = (size_t)(from - text), tail = strlen(to);
    char *less = malloc(head + tail + 1);
    if (less == NULL)
        return NULL;
    memcpy(less, text, head);
    memcpy(less + head, to, tail + 1);
    return less;
}

char *shrink_model(const char *text, bool (*shows)(const char *text, void *context),
                   void *context) {
    char *best = malloc(strlen(text) + 1);
    if (best == NULL)
        return NULL;
    memcpy(best, text, strlen(text) + 1);
    for (bool smaller = true; smaller;) {
        smaller = false;
        for (size_t at = 0; best[at] != '\0';) {
            char *less = without(best, best + at);
            if (less != NULL && shows(less, context)) {
                free(best);
                best = less;
                smaller = true;
                continue; /* another line stands here now */
            }
            free(less);
            at = (size_t)(next_line(best + at) - best);
        }
    }
    return best;
}
