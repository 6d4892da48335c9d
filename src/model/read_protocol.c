/* Steps are put in order of time, those of one time in the order of the file, and each time makes
 * one segment. What a step sets is worked out with the parameters before it. Parameters that are
 * expressions of others follow, unless they have been set themselves. */
#include "model/read_run.h"

#include "base/error.h"
#include "base/number.h"
#include "base/text.h"
#include "model/expect.h"
#include "model/parameter_order.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>

static const double MOST_COUNT = 9007199254740992.0; /* 2^53: beyond it counts are not exact */
static const char PROMOTER[] = ".promoter";

enum { LONGEST_KEY = 160 };

typedef struct protocol_step {
    double at;
    size_t number; /* in the file */
    const tarry_node *set;
} protocol_step;

typedef struct protocol_reader {
    tarry_builder *builder;
    protocol_step *steps;
    bool *fixed;    /* by parameter: a step has set it */
    double *before; /* parameters before the step that is read */
    double *now;    /* the segment's own, in the arena */
    tarry_text text;
} protocol_reader;

/* ---- steps ------------------------------------------------------------------------------------
 */

static int read_time(protocol_reader *in, const tarry_node *item, double until, double *at,
                     tarry_error *error) {
    const tarry_node *node = NULL;
    char one[TARRY_NUMBER_SIZE], two[TARRY_NUMBER_SIZE];
    int code = tarry_expect_value(item, "a step of the protocol", "at", &node, error);
    if (code == 0)
        code = tarry_builder_constant_value(in->builder, node, TARRY_TIME, "the time of a step", at,
                                            error);
    if (code != 0 || (*at >= 0 && *at <= until))
        return code;
    tarry_number_write(*at, one);
    tarry_number_write(until, two);
    return tarry_fail_at(error, TARRY_INPUT, node->place,
                         "a step at %s lies outside the record, which runs from 0 to %s ('until')",
                         one, two);
}

static int read_step(protocol_reader *in, const tarry_node *item, double until, size_t number,
                     tarry_error *error) {
    static const char *const keys[] = {"at",    "set",   "from",  "to", "ramp",
                                       "steps", "every", "times", "do"};
    static const char *const later[] = {"ramp", "steps", "every", "times", "do", "from", "to"};
    protocol_step *step = &in->steps[number];
    int code = tarry_expect_keys(item, "a step of the protocol", keys, 9, error);
    if (code == 0)
        code = tarry_expect_not_yet(item, "a step of the protocol", later, 7, error);
    if (code == 0)
        code = read_time(in, item, until, &step->at, error);
    if (code == 0)
        code = tarry_expect_value(item, "a step of the protocol", "set", &step->set, error);
    if (code == 0)
        code = tarry_expect_map(step->set, "'set'", error);
    if (code == 0 && step->set->n == 0)
        code = tarry_fail_at(error, TARRY_INPUT, step->set->place,
                             "'set' is empty; name what the step sets, as in set: {k_open: 0.4}");
    step->number = number;
    return code;
}

static int by_time(const void *one, const void *other) {
    const protocol_step *a = one, *b = other;
    if (a->at != b->at)
        return a->at < b->at ? -1 : 1;
    return (a->number > b->number) - (a->number < b->number);
}

/* ---- settings ---------------------------------------------------------------------------------
 */

/* What a scalar comes to before the step. */
static int work_out(protocol_reader *in, const tarry_entry *entry, tarry_dimension due,
                    double *value, tarry_error *error) {
    tarry_expression expression;
    const int code = tarry_builder_expression(in->builder, entry->node, due, entry->key,
                                              &expression, error);
    if (code != 0)
        return code;
    *value = tarry_expression_value(&expression, in->before, NULL);
    if (!isfinite(*value))
        return tarry_fail_at(error, TARRY_INPUT, entry->node->place,
                             "'%s' is set to what is no finite number (a division by zero, a "
                             "logarithm of 0?)",
                             entry->key);
    return 0;
}

static int set_parameter(protocol_reader *in, const tarry_entry *entry, uint32_t index,
                         tarry_error *error) {
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

/* ---- segments ---------------------------------------------------------------------------------
 */

static int set_all(protocol_reader *in, const protocol_step *step, tarry_error *error) {
    const tarry_builder *builder = in->builder;
    const size_t n = builder->parameters.n;
    int code = 0;
    if (n > 0)
        memcpy(in->before, in->now, n * sizeof *in->now);
    for (size_t i = 0; code == 0 && i < step->set->n; i++)
        code = set_one(in, &step->set->entries[i], error);
    if (code == 0 && tarry_parameter_values(builder, in->fixed, in->now, error) != 0)
        code = tarry_error_context(error, "after the protocol's step in line %d",
                                   step->set->place.line);
    return code;
}

/* A new segment with the parameters of the last one, or with those before any step. */
static int add_segment(protocol_reader *in, double start, tarry_error *error) {
    tarry_builder *builder = in->builder;
    const size_t n = builder->parameters.n;
    const double *last = in->now != NULL ? in->now : builder->values;
    const uint32_t settings = (uint32_t)builder->settings.n;
    tarry_segment segment = {.start = start, .settings = {settings, settings}, .text = ""};
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

/* The steps of one time; returns their code, and their number in *taken. */
static int read_moment(protocol_reader *in, const protocol_step *steps, size_t n, size_t *taken,
                       tarry_error *error) {
    tarry_builder *builder = in->builder;
    int code = add_segment(in, steps[0].at, error);
    in->text.size = 0;
    *taken = 0;
    while (code == 0 && *taken < n && steps[*taken].at == steps[0].at)
        code = set_all(in, &steps[(*taken)++], error);
    if (code != 0)
        return code;
    tarry_segment *segment = &builder->segments.items[builder->segments.n - 1];
    segment->settings.to = (uint32_t)builder->settings.n;
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
    for (size_t i = 0; code == 0 && i < list->n; i++)
        code = read_step(in, list->entries[i].node, until, i, error);
    if (code != 0 || list->n == 0)
        return code;
    qsort(in->steps, list->n, sizeof *in->steps, by_time);
    for (size_t i = 0, taken = 0; code == 0 && i < list->n; i += taken)
        code = read_moment(in, in->steps + i, list->n - i, &taken, error);
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
    in.steps = tarry_calloc(list->n, sizeof *in.steps);
    in.fixed = tarry_calloc(builder->parameters.n, sizeof *in.fixed);
    in.before = tarry_calloc(builder->parameters.n, sizeof *in.before);
    if (in.steps == NULL || in.fixed == NULL || in.before == NULL)
        code = tarry_fail_memory(error, "the protocol");
    if (code == 0)
        code = read_list(&in, list, error);
    free(in.steps);
    free(in.fixed);
    free(in.before);
    tarry_text_release(&in.text);
    return code;
}
