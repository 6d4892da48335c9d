/* SPDX-License-Identifier: GPL-3.0-or-later */

/* `visible: [LOW, HIGH, LENGTH]` of `run:`: when recorded signals are told to be visible. */
#include "model/read_run.h"

#include "base/error.h"
#include "model/expect.h"

static int read_thresholds(tarry_builder *builder, const tarry_node *list,
                           tarry_thresholds *thresholds, tarry_error *error) {
    if (list->n != 3)
        return tarry_fail_at(error, TARRY_INPUT, list->place,
                             "'visible' needs three values: below which a signal is dark, above "
                             "which it is visible, and how long a change must last to count, as in "
                             "[2, 4, 1 min]");
    int code = tarry_builder_constant_value(builder, list->entries[0].node, TARRY_PURE,
                                            "the lower threshold of 'visible'", &thresholds->low,
                                            error);
    if (code == 0)
        code = tarry_builder_constant_value(builder, list->entries[1].node, TARRY_PURE,
                                            "the upper threshold of 'visible'", &thresholds->high,
                                            error);
    if (code == 0)
        code = tarry_builder_constant_value(builder, list->entries[2].node, TARRY_TIME,
                                            "the shortest length of 'visible'", &thresholds->least,
                                            error);
    if (code == 0 && !(thresholds->low <= thresholds->high))
        code = tarry_fail_at(error, TARRY_INPUT, list->place,
                             "the lower threshold of 'visible' comes first and must not be above "
                             "the upper one");
    if (code == 0 && !(thresholds->least >= 0 && thresholds->least < builder->network->run.until))
        code = tarry_fail_at(
            error, TARRY_INPUT, list->entries[2].node->place,
            "the shortest length of 'visible' must lie between 0 and the end of the "
            "record");
    return code;
}

static int share_out(tarry_builder *builder, tarry_thresholds read, tarry_place place,
                     tarry_error *error) {
    tarry_thresholds *thresholds = tarry_arena_calloc(builder->arena, 1, sizeof *thresholds);
    size_t n = 0;
    if (thresholds == NULL)
        return tarry_fail_memory(error, "the thresholds of signals");
    *thresholds = read;
    for (size_t i = 0; i < builder->channels.n; i++) {
        tarry_channel *channel = &builder->channels.items[i];
        if (channel->signal == TARRY_NONE || !channel->recorded)
            continue;
        channel->thresholds = thresholds;
        n++;
    }
    return n > 0 ? 0
                 : tarry_fail_at(error, TARRY_INPUT, place,
                                 "'visible' is said of recorded signals, and there is none: give "
                                 "the model a signal, or name one under 'record'");
}

int tarry_read_visible(tarry_builder *builder, const tarry_node *run, tarry_error *error) {
    tarry_run_value from;
    tarry_node list = {0};
    tarry_thresholds thresholds = {0};
    int code = 0;
    tarry_run_find(builder, run, "visible", &from);
    if (from.node == NULL)
        return 0;
    if (from.node->kind == TARRY_NODE_SCALAR) {
        code = tarry_run_split(builder->arena, from.node, &list, error);
    } else {
        code = tarry_expect_list(from.node, "'visible'", error);
        list = *from.node;
    }
    if (code == 0)
        code = read_thresholds(builder, &list, &thresholds, error);
    if (code == 0)
        code = share_out(builder, thresholds, from.node->place, error);
    return tarry_run_context(&from, code, error);
}
