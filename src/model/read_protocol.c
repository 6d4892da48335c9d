/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Steps are put in order of time, those of one time in the order of the file, and each time makes
 * one segment. What a step sets is worked out with the parameters before it. Parameters that are
 * expressions of others follow, unless they have been set themselves. A ramp is a row of steps. */
#include "model/read_run.h"

#include "base/error.h"
#include "base/number.h"
#include "base/text.h"
#include "model/expect.h"
#include "model/like_genes.h"
#include "model/parameter_order.h"
#include "model/protocol_steps.h"
#include "model/variation.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

static const double MOST_COUNT = 9007199254740992.0; /* 2^53: beyond it counts are not exact */
static const char PROMOTER[] = ".promoter";

enum { LONGEST_KEY = 160 };

typedef struct protocol_reader {
    tarry_builder *builder;
    tarry_protocol_steps steps;
    bool *fixed;                         /* by parameter: a step has set it */
    const tarry_protocol_ramp **ramping; /* by parameter: the ramp under way, or NULL */
    double *before;                      /* parameters before the step that is read */
    double *now;                         /* the segment's own, in the arena */
    tarry_text text;
} protocol_reader;

/* ---- settings ---------------------------------------------------------------------------------
 */

/* A step is the same for all cells. A parameter that varies may be set by what it was, since each
 * cell keeps its factor. */
static int refuse_others(const protocol_reader *in, const tarry_entry *entry,
                         const tarry_expression *expression, tarry_error *error) {
    const tarry_builder_parameter *parameters = in->builder->parameters.items;
    for (uint32_t i = 0; i < expression->n_parameters; i++) {
        const tarry_builder_parameter *read = &parameters[expression->parameters[i]];
        const bool itself = read->varies != NULL && strcmp(read->name, entry->key) == 0;
        if (read->root != NULL && !itself)
            return tarry_refuse_varied(in->builder, expression, entry->key, error);
    }
    return 0;
}

/* What a scalar comes to before the step. */
static int work_out(protocol_reader *in, const tarry_entry *entry, tarry_dimension due,
                    double *value, tarry_error *error) {
    tarry_expression expression;
    const int code = tarry_builder_expression(in->builder, entry->node, due, entry->key,
                                              &expression, error);
    if (code != 0 || refuse_others(in, entry, &expression, error) != 0)
        return code != 0 ? code : TARRY_INPUT;
    *value = tarry_expression_value(&expression, in->before, NULL);
    if (!isfinite(*value))
        return tarry_fail_at(error, TARRY_INPUT, entry->node->place,
                             "'%s' is set to what is no finite number (a division by zero, a "
                             "logarithm of 0?)",
                             entry->key);
    return 0;
}

static int fail_ramping(const tarry_entry *entry, const tarry_protocol_ramp *ramp,
                        tarry_error *error) {
    return tarry_fail_at(error, TARRY_INPUT, entry->place,
                         "'%s' is on its way in the ramp of line %d; no other step can set it "
                         "before that ramp has ended",
                         entry->key, ramp->values->place.line);
}

static int set_parameter(protocol_reader *in, const tarry_entry *entry, uint32_t index,
                         tarry_error *error) {
    if (in->ramping[index] != NULL)
        return fail_ramping(entry, in->ramping[index], error);
    in->fixed[index] = true;
    return work_out(in, entry, in->builder->parameters.items[index].dimension, &in->now[index],
                    error);
}

static int add_setting(protocol_reader *in, tarry_setting setting, tarry_error *error) {
    return TARRY_APPEND(&in->builder->settings, setting) == 0
               ? 0
               : tarry_fail_memory(error, "the protocol");
}

static int set_species(protocol_reader *in, const tarry_entry *entry, uint32_t index,
                       tarry_error *error) {
    const tarry_species *species = &in->builder->species.items[index];
    tarry_setting setting = {.species = (int32_t)index, .place = entry->place};
    if (species->role == TARRY_SPECIES_STATE)
        return tarry_fail_at(
            error, TARRY_INPUT, entry->place,
            "'%s' is a promoter state, which a step cannot set; write %s.promoter: "
            "STATE to move the promoter",
            entry->key, in->builder->genes.items[species->gene].name);
    if (species->role == TARRY_SPECIES_STAGE)
        return tarry_fail_at(error, TARRY_INPUT, entry->place,
                             "'%s' is a stage, whose molecules are under way; a step can read it "
                             "but not set it",
                             entry->key);
    const int code = work_out(in, entry, TARRY_PURE, &setting.value, error);
    if (code != 0)
        return code;
    if (setting.value < 0 || setting.value > MOST_COUNT || setting.value != floor(setting.value))
        return tarry_fail_at(error, TARRY_INPUT, entry->node->place,
                             "'%s' is a number of molecules: a whole number from 0 on, not '%s'",
                             entry->key, entry->node->text);
    return add_setting(in, setting, error);
}

static int fail_state(const protocol_reader *in, const tarry_entry *entry, uint32_t gene,
                      tarry_error *error) {
    const tarry_builder *builder = in->builder;
    const tarry_range promoters = builder->genes.items[gene].promoters;
    const tarry_range states = builder->promoters.items[promoters.from].states;
    tarry_text list = {0};
    for (uint32_t i = states.from; i < states.to; i++)
        tarry_text_printf(&list, "%s%s", i == states.from ? "" : ", ",
                          builder->states.items[i].name);
    const int code = list.failed ? tarry_fail_memory(error, "a message")
                                 : tarry_fail_at(error, TARRY_INPUT, entry->node->place,
                                                 "'%s' is no state of '%s'; its states are: %s",
                                                 entry->node->text, builder->genes.items[gene].name,
                                                 list.data);
    tarry_text_release(&list);
    return code;
}

static int set_promoter(protocol_reader *in, const tarry_entry *entry, uint32_t gene,
                        tarry_error *error) {
    const tarry_range promoters = in->builder->genes.items[gene].promoters;
    int code = tarry_expect_scalar(entry->node, entry->key, error);
    if (code != 0)
        return code;
    const int32_t state = tarry_builder_state(in->builder, gene, entry->node->text);
    if (state == TARRY_NONE)
        return fail_state(in, entry, gene, error);
    for (uint32_t i = promoters.from; code == 0 && i < promoters.to; i++)
        code = add_setting(in,
                           (tarry_setting){.species = TARRY_NONE,
                                           .promoter = i,
                                           .state = (uint32_t)state,
                                           .place = entry->place},
                           error);
    return code;
}

/* The gene whose promoter a key names ("vela.promoter"), or TARRY_NONE. */
static int32_t find_promoter(const tarry_builder *builder, const char *key) {
    const size_t n = strlen(key), tail = sizeof PROMOTER - 1;
    if (n <= tail || n >= LONGEST_KEY || strcmp(key + n - tail, PROMOTER) != 0)
        return TARRY_NONE;
    char name[LONGEST_KEY];
    snprintf(name, sizeof name, "%.*s", (int)(n - tail), key);
    return tarry_builder_find(builder, TARRY_SYMBOL_GENE, name);
}

static int fail_key(const protocol_reader *in, const tarry_entry *entry, tarry_error *error) {
    const tarry_like_genes *like = tarry_like_find(in->builder, entry->key, strlen(entry->key));
    if (like != NULL)
        return tarry_like_fail(like, entry->key, entry->place, error);
    const char *nearest = tarry_builder_nearest(
        in->builder, 1u << TARRY_SYMBOL_PARAMETER | 1u << TARRY_SYMBOL_SPECIES, entry->key);
    if (nearest != NULL)
        return tarry_fail_at(error, TARRY_INPUT, entry->place,
                             "there is no '%s' to set; did you mean '%s'?", entry->key, nearest);
    return tarry_fail_at(error, TARRY_INPUT, entry->place,
                         "there is no '%s' to set; a step sets parameters, species, and promoters "
                         "as in vela.promoter: open",
                         entry->key);
}

static int set_one(protocol_reader *in, const tarry_entry *entry, tarry_error *error) {
    const tarry_builder *builder = in->builder;
    const int32_t parameter = tarry_builder_find(builder, TARRY_SYMBOL_PARAMETER, entry->key);
    const int32_t species = tarry_builder_find(builder, TARRY_SYMBOL_SPECIES, entry->key);
    const int32_t gene = find_promoter(builder, entry->key);
    int code = 0;
    if (parameter != TARRY_NONE)
        code = set_parameter(in, entry, (uint32_t)parameter, error);
    else if (species != TARRY_NONE)
        code = set_species(in, entry, (uint32_t)species, error);
    else if (gene != TARRY_NONE)
        code = set_promoter(in, entry, (uint32_t)gene, error);
    else
        code = fail_key(in, entry, error);
    if (code == 0)
        tarry_text_printf(&in->text, "%s%s = %s", in->text.size > 0 ? ", " : "", entry->key,
                          entry->node->text);
    return code;
}

/* ---- ramps ------------------------------------------------------------------------------------
 */

static int ramped_parameter(const protocol_reader *in, const tarry_entry *entry, uint32_t *index,
                            tarry_error *error) {
    const tarry_builder *builder = in->builder;
    const int32_t found = tarry_builder_find(builder, TARRY_SYMBOL_PARAMETER, entry->key);
    *index = (uint32_t)found;
    if (found != TARRY_NONE)
        return 0;
    if (tarry_builder_find(builder, TARRY_SYMBOL_SPECIES, entry->key) != TARRY_NONE ||
        find_promoter(builder, entry->key) != TARRY_NONE)
        return tarry_fail_at(error, TARRY_INPUT, entry->place,
                             "a ramp changes parameters, and '%s' is none; use 'at' with 'set'",
                             entry->key);
    return fail_key(in, entry, error);
}

/* The line from the value before to the one given. */
static int begin_line(protocol_reader *in, tarry_protocol_ramp *ramp, size_t i, uint32_t index,
                      tarry_error *error) {
    const tarry_entry *entry = &ramp->values->entries[i];
    char until[TARRY_NUMBER_SIZE];
    if (in->ramping[index] != NULL)
        return fail_ramping(entry, in->ramping[index], error);
    const tarry_builder_parameter *parameter = &in->builder->parameters.items[index];
    if (parameter->root != NULL && parameter->varies == NULL && !in->fixed[index])
        return tarry_fail_at(
            error, TARRY_INPUT, entry->place,
            "'%s' differs from cell to cell, since '%s' varies, so that a ramp would "
            "begin elsewhere in each; set it first, or let '%s' ramp",
            entry->key, parameter->root, parameter->root);
    const int code = work_out(in, entry, in->builder->parameters.items[index].dimension,
                              &ramp->last[i], error);
    ramp->first[i] = in->before[index];
    in->fixed[index] = true;
    in->ramping[index] = ramp;
    tarry_number_write_rounded(ramp->until, 6, until);
    tarry_text_printf(&in->text, "%s%s to %s in %u steps until %s %s",
                      in->text.size > 0 ? ", " : "", entry->key, entry->node->text,
                      (unsigned)ramp->n, until, in->builder->network->time_unit);
    return code;
}

static void note_value(protocol_reader *in, const char *name, double value) {
    char text[TARRY_NUMBER_SIZE];
    tarry_number_write_rounded(value, 6, text);
    tarry_text_printf(&in->text, "%s%s = %s", in->text.size > 0 ? ", " : "", name, text);
}

/* In a stretch the value at its middle; from the end on what was given. */
static int go_along(protocol_reader *in, const tarry_protocol_step *step, tarry_error *error) {
    tarry_protocol_ramp *ramp = step->ramp;
    const bool ends = step->part == ramp->n;
    int code = 0;
    for (size_t i = 0; code == 0 && i < ramp->values->n; i++) {
        const tarry_entry *entry = &ramp->values->entries[i];
        uint32_t index = 0;
        code = ramped_parameter(in, entry, &index, error);
        if (code == 0 && step->part == 0)
            code = begin_line(in, ramp, i, index, error);
        if (code != 0)
            return code;
        const double share = (step->part + 0.5) / ramp->n;
        in->now[index] = ends ? ramp->last[i]
                              : ramp->first[i] + share * (ramp->last[i] - ramp->first[i]);
        if (step->part > 0)
            note_value(in, entry->key, in->now[index]);
        if (ends)
            in->ramping[index] = NULL;
    }
    return code;
}

/* ---- segments ---------------------------------------------------------------------------------
 */

static int set_all(protocol_reader *in, const tarry_protocol_step *step, tarry_error *error) {
    const tarry_builder *builder = in->builder;
    const size_t n = builder->parameters.n;
    int code = 0;
    if (n > 0)
        memcpy(in->before, in->now, n * sizeof *in->now);
    if (step->ramp != NULL)
        code = go_along(in, step, error);
    else
        for (size_t i = 0; code == 0 && i < step->set->n; i++)
            code = set_one(in, &step->set->entries[i], error);
    if (code == 0 && tarry_parameter_values(builder, in->fixed, in->now, error) != 0)
        code = tarry_error_context(error, "after the protocol's step in line %d", step->line);
    return code;
}

/* A new segment with the parameters of the last one, or with those before any step. */
static int add_segment(protocol_reader *in, double start, tarry_error *error) {
    tarry_builder *builder = in->builder;
    const size_t n = builder->parameters.n;
    const double *last = in->now != NULL ? in->now : builder->values;
    const uint32_t settings = (uint32_t)builder->settings.n;
    tarry_segment segment = {.start = start,
                             .moment = TARRY_MOMENT_STEP,
                             .response = TARRY_NONE,
                             .settings = {settings, settings},
                             .text = ""};
    in->now = tarry_arena_calloc(builder->arena, n, sizeof *in->now);
    if (in->now == NULL)
        return tarry_fail_memory(error, "the protocol");
    if (n > 0)
        memcpy(in->now, last, n * sizeof *in->now);
    segment.parameters = in->now;
    return TARRY_APPEND(&builder->segments, segment) == 0
               ? 0
               : tarry_fail_memory(error, "the protocol");
}

/* What a step is to a reader of the protocol; of several at one time the first kind counts. */
static tarry_moment moment_of(const tarry_protocol_step *step) {
    if (step->ramp == NULL || step->part == 0)
        return TARRY_MOMENT_STEP;
    return step->part == step->ramp->n ? TARRY_MOMENT_RAMP_END : TARRY_MOMENT_RAMP_PART;
}

/* Which parameters have been set so far. */
static int keep_set(const protocol_reader *in, tarry_segment *segment, tarry_error *error) {
    const size_t n = in->builder->parameters.n;
    bool *is_set = tarry_arena_calloc(in->builder->arena, n, sizeof *is_set);
    if (is_set == NULL)
        return tarry_fail_memory(error, "the protocol");
    if (n > 0)
        memcpy(is_set, in->fixed, n * sizeof *is_set);
    segment->is_set = is_set;
    return 0;
}

/* The steps of one time; returns their code, and their number in *taken. */
static int read_moment(protocol_reader *in, const tarry_protocol_step *steps, size_t n,
                       size_t *taken, tarry_error *error) {
    tarry_builder *builder = in->builder;
    int code = add_segment(in, steps[0].at, error);
    tarry_moment moment = TARRY_MOMENT_RAMP_PART;
    in->text.size = 0;
    *taken = 0;
    while (code == 0 && *taken < n && steps[*taken].at == steps[0].at) {
        const tarry_moment this = moment_of(&steps[*taken]);
        moment = this < moment ? this : moment;
        code = set_all(in, &steps[(*taken)++], error);
    }
    if (code != 0)
        return code;
    tarry_segment *segment = &builder->segments.items[builder->segments.n - 1];
    segment->moment = moment;
    segment->settings.to = (uint32_t)builder->settings.n;
    code = keep_set(in, segment, error);
    if (code != 0)
        return code;
    if (!in->text.failed)
        segment->text = tarry_arena_text(builder->arena, in->text.data, in->text.size);
    return in->text.failed || segment->text == NULL ? tarry_fail_memory(error, "the protocol") : 0;
}

static int read_list(protocol_reader *in, const tarry_node *list, tarry_error *error) {
    const tarry_node *run = NULL;
    double until = 0;
    int code = tarry_run_map(in->builder, &run, error);
    if (code == 0)
        code = tarry_read_until(in->builder, run, &until, error);
    if (code == 0)
        code = tarry_read_protocol_steps(in->builder, list, until, &in->steps, error);
    for (size_t i = 0, taken = 0; code == 0 && i < in->steps.n; i += taken)
        code = read_moment(in, in->steps.items + i, in->steps.n - i, &taken, error);
    return code;
}

int tarry_read_protocol(tarry_builder *builder, tarry_error *error) {
    const tarry_node *list = tarry_node_get(builder->root, "protocol");
    protocol_reader in = {.builder = builder};
    int code = add_segment(&in, 0, error);
    if (code == 0 && list != NULL)
        code = tarry_expect_list(list, "'protocol'", error);
    if (code != 0 || list == NULL)
        return code;
    in.fixed = tarry_calloc(builder->parameters.n, sizeof *in.fixed);
    in.ramping = tarry_calloc(builder->parameters.n, sizeof *in.ramping);
    in.before = tarry_calloc(builder->parameters.n, sizeof *in.before);
    if (in.ramping == NULL || in.fixed == NULL || in.before == NULL)
        code = tarry_fail_memory(error, "the protocol");
    if (code == 0)
        code = read_list(&in, list, error);
    free(in.steps.items);
    free(in.ramping);
    free(in.fixed);
    free(in.before);
    tarry_text_release(&in.text);
    return code;
}
