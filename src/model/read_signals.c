/* SPDX-License-Identifier: GPL-3.0-or-later */

/* `signals:`: what an instrument sees. A signal is a weighted sum of counts and of molecules under
 * way, each of which shines by the share of its own dwell that it has spent (a ramp). All numbers
 * in it hold for the whole run. */
#include "model/builder.h"

#include "base/error.h"
#include "base/number.h"
#include "model/expect.h"

#include <math.h>

static const char *const SIGNAL_KEYS[] = {"of",         "sum",   "ramp",   "brightness",
                                          "background", "noise", "allele", "responds_above",
                                          "detects"};

typedef struct signal_reader {
    tarry_builder *builder;
    uint32_t index;
    uint32_t allele; /* the one that is seen, from 1 on; 0: all */
} signal_reader;

/* ---- numbers ----------------------------------------------------------------------------------
 */

/* The number under `key`; `value` stays where there is none. */
static int read_number(signal_reader *in, const tarry_node *map, const char *key, const char *what,
                       double *value, tarry_error *error) {
    const tarry_node *node = tarry_node_get(map, key);
    if (node == NULL)
        return 0;
    return tarry_builder_constant_value(in->builder, node, TARRY_PURE, what, value, error);
}

/* `noise: sd`, or `noise: {fixed: sd, share: share of the signal}`. */
static int read_noise(signal_reader *in, const tarry_node *map, tarry_signal *signal,
                      tarry_error *error) {
    static const char *const keys[] = {"fixed", "share"};
    const tarry_node *node = tarry_node_get(map, "noise");
    const char *key = "noise";
    int code = 0;
    if (node == NULL)
        return 0;
    if (node->kind == TARRY_NODE_MAP) {
        code = tarry_expect_keys(node, "'noise'", keys, 2, error);
        if (code == 0)
            code = read_number(in, node, "share", "the share of the noise of a signal",
                               &signal->share, error);
        map = node;
        key = "fixed";
    }
    if (code == 0)
        code = read_number(in, map, key, "the noise of a signal", &signal->noise, error);
    if (code == 0 && signal->noise < 0)
        code = tarry_fail_at(error, TARRY_INPUT, node->place,
                             "'noise' is the sd of the read-out noise and not below 0");
    if (code == 0 && signal->share < 0)
        code = tarry_fail_at(error, TARRY_INPUT, node->place,
                             "'share' is the sd of the noise as a share of the signal and not "
                             "below 0");
    return code;
}

/* ---- what is seen -----------------------------------------------------------------------------
 */

static int add_weight(signal_reader *in, uint32_t species, double weight, tarry_error *error) {
    const tarry_weight row = {.species = species, .weight = weight};
    return TARRY_APPEND(&in->builder->weights, row) == 0 ? 0 : tarry_fail_memory(error, "a signal");
}

static int fail_fractions(tarry_place place, const tarry_ramp *ramp, tarry_error *error) {
    char from[TARRY_NUMBER_SIZE], to[TARRY_NUMBER_SIZE];
    tarry_number_write(ramp->from, from);
    tarry_number_write(ramp->to, to);
    return tarry_fail_at(error, TARRY_INPUT, place,
                         "a ramp goes from a fraction of the dwell to a later one, both from 0 to "
                         "1, as in ramp: {from: 0.1, to: 0.4}; this one goes from %s to %s",
                         from, to);
}

static int read_fractions(signal_reader *in, const tarry_node *map, tarry_ramp *ramp,
                          tarry_error *error) {
    static const char *const keys[] = {"from", "to"};
    const tarry_node *from = NULL, *to = NULL;
    int code = tarry_expect_keys(map, "'ramp'", keys, 2, error);
    if (code == 0)
        code = tarry_expect_value(map, "'ramp'", "from", &from, error);
    if (code == 0)
        code = tarry_expect_value(map, "'ramp'", "to", &to, error);
    if (code == 0)
        code = read_number(in, map, "from", "the start of a ramp", &ramp->from, error);
    if (code == 0)
        code = read_number(in, map, "to", "the end of a ramp", &ramp->to, error);
    if (code == 0 && !(ramp->from >= 0 && ramp->from <= ramp->to && ramp->to <= 1))
        code = fail_fractions(map->place, ramp, error);
    return code;
}

/* The lags of a stage stand side by side: one, or one an allele. */
static bool is_lag_of(const tarry_builder *builder, size_t lag, uint32_t species) {
    return lag < builder->lags.n && builder->lags.items[lag].stage == (int32_t)species;
}

static int add_ramp(signal_reader *in, uint32_t species, tarry_ramp ramp, tarry_error *error) {
    tarry_builder *builder = in->builder;
    ramp.lag = (uint32_t)builder->stage_lags.items[species];
    do {
        const bool is_seen = in->allele == 0 ||
                             builder->lags.items[ramp.lag].allele + 1 == in->allele;
        if (is_seen && TARRY_APPEND(&builder->ramps, ramp) != 0)
            return tarry_fail_memory(error, "a signal");
        ramp.lag++;
    } while (is_lag_of(builder, ramp.lag, species));
    return 0;
}

/* Can one allele's molecules of this species be told from the others'? */
static int check_allele(const signal_reader *in, uint32_t species, tarry_place place,
                        tarry_error *error) {
    const tarry_builder *builder = in->builder;
    const tarry_species *row = &builder->species.items[species];
    const int32_t lag = builder->stage_lags.items[species];
    uint32_t n_lags = 0;
    while (lag != TARRY_NONE && is_lag_of(builder, (size_t)lag + n_lags, species))
        n_lags++;
    const uint32_t n_copies = row->gene == TARRY_NONE ? 0
                                                      : builder->genes.items[row->gene].n_copies;
    if (row->role != TARRY_SPECIES_STAGE || n_lags != n_copies)
        return tarry_fail_at(error, TARRY_INPUT, place,
                             "one allele's molecules can be seen in the first stage of a "
                             "transcript only; '%s' is none, so leave 'allele' out",
                             row->name);
    if (in->allele > n_copies)
        return tarry_fail_at(error, TARRY_INPUT, place,
                             "there is no allele %u of '%s': its gene has copies: %u", in->allele,
                             row->name, n_copies);
    return 0;
}

/* One species with a ramp, or with a plain weight where there is none. A molecule of one allele
 * shines through its own lag, as a ramp that is full from the start where none is given. */
static int add_part(signal_reader *in, const tarry_node *map, uint32_t species, tarry_place place,
                    double brightness, tarry_error *error) {
    tarry_builder *builder = in->builder;
    const tarry_node *fractions = map->kind == TARRY_NODE_MAP ? tarry_node_get(map, "ramp") : NULL;
    int code = in->allele != 0 ? check_allele(in, species, place, error) : 0;
    if (code != 0)
        return code;
    if (fractions == NULL && in->allele == 0)
        return add_weight(in, species, brightness, error);
    if (builder->stage_lags.items[species] == TARRY_NONE)
        return tarry_fail_at(error, TARRY_INPUT, place,
                             "'%s' is no stage, so its molecules have no dwell that a ramp could "
                             "follow; leave the ramp out",
                             builder->species.items[species].name);
    tarry_ramp ramp = {.signal = in->index, .brightness = brightness};
    if (fractions != NULL)
        code = read_fractions(in, fractions, &ramp, error);
    return code != 0 ? code : add_ramp(in, species, ramp, error);
}

static int read_of(signal_reader *in, const tarry_node *signal, const tarry_node *of,
                   tarry_error *error) {
    double brightness = 1;
    uint32_t species = 0;
    int code = tarry_expect_scalar(of, "'of'", error);
    if (code == 0)
        code = tarry_builder_need(in->builder, TARRY_SYMBOL_SPECIES, of->text, of->place, &species,
                                  error);
    if (code == 0)
        code = read_number(in, signal, "brightness", "the brightness of a signal", &brightness,
                           error);
    return code != 0 ? code : add_part(in, signal, species, of->place, brightness, error);
}

/* `NAME: weight` or `NAME: {ramp: ..., brightness: ...}`. */
static int read_term(signal_reader *in, const tarry_entry *entry, tarry_error *error) {
    static const char *const keys[] = {"ramp", "brightness"};
    double weight = 1;
    uint32_t species = 0;
    int code = tarry_builder_need(in->builder, TARRY_SYMBOL_SPECIES, entry->key, entry->place,
                                  &species, error);
    if (code != 0)
        return code;
    if (entry->node->kind == TARRY_NODE_SCALAR) {
        code = tarry_builder_constant_value(in->builder, entry->node, TARRY_PURE,
                                            "the weight of a species in a signal", &weight, error);
        return code != 0 ? code : add_part(in, entry->node, species, entry->place, weight, error);
    }
    code = tarry_expect_keys(entry->node, entry->key, keys, 2, error);
    if (code == 0)
        code = read_number(in, entry->node, "brightness", "the brightness of a signal", &weight,
                           error);
    return code != 0 ? code : add_part(in, entry->node, species, entry->place, weight, error);
}

static int read_sum(signal_reader *in, const tarry_node *signal, const tarry_node *sum,
                    tarry_error *error) {
    static const char *const of_only[] = {"ramp", "brightness"};
    int code = tarry_expect_map(sum, "'sum'", error);
    for (size_t i = 0; code == 0 && i < 2; i++)
        if (tarry_node_get(signal, of_only[i]) != NULL)
            return tarry_fail_at(error, TARRY_INPUT, tarry_key_place(signal, of_only[i]),
                                 "'%s' goes with 'of'; in a sum each species has its own, as in "
                                 "sum: {vela.nascent: {ramp: {from: 0.1, to: 0.4}}}",
                                 of_only[i]);
    if (code == 0 && sum->n == 0)
        code = tarry_fail_at(error, TARRY_INPUT, sum->place,
                             "'sum' is empty; name species with their weights, as in sum: "
                             "{vela.transcript: 1}");
    for (size_t i = 0; code == 0 && i < sum->n; i++)
        code = read_term(in, &sum->entries[i], error);
    return code;
}

/* ---- a signal ---------------------------------------------------------------------------------
 */

static int read_allele(signal_reader *in, const tarry_node *signal, tarry_error *error) {
    const tarry_node *node = tarry_node_get(signal, "allele");
    double allele = 0;
    const int code = node == NULL ? 0
                                  : tarry_expect_count(node, "'allele'", 1, 1000, &allele, error);
    in->allele = (uint32_t)allele;
    return code;
}

/* `detects: {above: level, from_first: yes}`. */
static int read_detects(signal_reader *in, const tarry_node *map, tarry_signal *signal,
                        tarry_error *error) {
    static const char *const keys[] = {"above", "from_first"};
    const tarry_node *detects = tarry_node_get(map, "detects"), *above = NULL;
    if (detects == NULL)
        return 0;
    int code = tarry_expect_keys(detects, "'detects'", keys, 2, error);
    if (code == 0)
        code = tarry_expect_value(detects, "'detects'", "above", &above, error);
    if (code == 0)
        code = read_number(in, detects, "above", "the level that a signal is detected above",
                           &signal->detects_above, error);
    const tarry_node *from_first = tarry_node_get(detects, "from_first");
    if (code == 0 && from_first != NULL)
        code = tarry_expect_answer(from_first, "'from_first'", &signal->from_first, error);
    return code;
}

static int read_signal(signal_reader *in, const tarry_entry *entry, tarry_error *error) {
    tarry_builder *builder = in->builder;
    const tarry_node *node = entry->node;
    tarry_signal signal = {
        .name = entry->key, .responds_above = NAN, .detects_above = NAN, .place = entry->place};
    signal.weights.from = (uint32_t)builder->weights.n;
    int code = tarry_builder_check_name(entry->key, entry->place, "a signal", error);
    if (code == 0)
        code = tarry_builder_enter(builder, TARRY_SYMBOL_SIGNAL, entry->key, in->index,
                                   entry->place, error);
    if (code == 0)
        code = tarry_expect_keys(node, entry->key, SIGNAL_KEYS, 9, error);
    if (code == 0)
        code = read_allele(in, node, error);
    if (code != 0)
        return code;
    const tarry_node *of = tarry_node_get(node, "of"), *sum = tarry_node_get(node, "sum");
    if ((of != NULL) == (sum != NULL))
        return tarry_fail_at(error, TARRY_INPUT, node->place,
                             "the signal '%s' needs either 'of', a stage or species, or 'sum', "
                             "weights of several",
                             entry->key);
    code = of != NULL ? read_of(in, node, of, error) : read_sum(in, node, sum, error);
    if (code == 0)
        code = read_number(in, node, "background", "the background of a signal", &signal.background,
                           error);
    if (code == 0)
        code = read_noise(in, node, &signal, error);
    if (code == 0)
        code = read_number(in, node, "responds_above", "the level that a signal responds above",
                           &signal.responds_above, error);
    if (code == 0)
        code = read_detects(in, node, &signal, error);
    signal.weights.to = (uint32_t)builder->weights.n;
    if (code == 0 && TARRY_APPEND(&builder->signals, signal) != 0)
        code = tarry_fail_memory(error, "a signal");
    return code;
}

int tarry_read_signals(tarry_builder *builder, tarry_error *error) {
    const tarry_node *map = tarry_node_get(builder->root, "signals");
    if (map == NULL)
        return 0;
    int code = tarry_expect_map(map, "'signals'", error);
    for (size_t i = 0; code == 0 && i < map->n; i++) {
        signal_reader in = {.builder = builder, .index = (uint32_t)i};
        code = read_signal(&in, &map->entries[i], error);
    }
    return code;
}
