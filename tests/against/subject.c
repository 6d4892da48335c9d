/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "subject.h"

#include "support.h"

#include "tarry/tarry.h"

#include <stdio.h>
#include <string.h>

subject subject_read(const char *body) {
    char text[4096], what[2048];
    subject s = {0};
    tarry_error error = {0};
    snprintf(text, sizeof text, "tarry: 1\ntime: min\n%s", body);
    tarry_start();
    int code = tarry_model_read_text(text, strlen(text), "m.yaml", NULL, 0, &s.model, &error);
    ck_assert_msg(code == 0, "%s", tarry_error_text(&error, what, (int)sizeof what));
    code = tarry_flow_index_init(&s.index, &s.model->network, &error);
    if (code == 0)
        code = tarry_exact_gene_read(&s.index, s.model->network.segments, 0, &s.arena, &s.gene,
                                     &error);
    ck_assert_msg(code == 0, "%s", tarry_error_text(&error, what, (int)sizeof what));
    ck_assert_msg(s.gene.why == NULL, "%s", s.gene.why);
    return s;
}

void subject_release(subject *s) {
    tarry_flow_index_release(&s->index);
    tarry_arena_release(&s->arena);
    tarry_model_free(s->model);
}

tarry_exact_view subject_view(subject *s, const char *name) {
    const tarry_network *network = &s->model->network;
    tarry_exact_view view = {0};
    tarry_error error = {0};
    uint32_t i = 0;
    while (i < network->n_channels && strcmp(network->channels[i].name, name) != 0)
        i++;
    ck_assert_uint_lt(i, network->n_channels);
    ck_assert_int_eq(
        tarry_exact_view_read(network, &s->gene, &network->channels[i], &s->arena, &view, &error),
        0);
    ck_assert_msg(view.why == NULL, "%s", view.why);
    ck_assert(tarry_exact_view_sees(&view));
    return view;
}
