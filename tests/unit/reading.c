/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "reading.h"

#include <check.h>
#include <string.h>

void reading_start(reading *in, const char *text, const tarry_override *overrides,
                   size_t n_overrides) {
    const tarry_node *root = NULL;
    memset(in, 0, sizeof *in);
    const int code = tarry_yaml_read(text, strlen(text), "m.yaml", &in->model.arena, &root,
                                     &in->error);
    ck_assert_msg(code == 0, "%s\n%d:%d: %s", text, in->error.line, in->error.column,
                  in->error.message);
    in->model.file = "m.yaml";
    in->model.network.arena = &in->model.arena;
    in->model.network.time_unit = "min";
    tarry_builder_init(&in->builder, &in->model, root, (tarry_units){60});
    in->builder.overrides = overrides;
    in->builder.n_overrides = n_overrides;
}

void reading_end(reading *in) {
    tarry_builder_release(&in->builder);
    tarry_notes_release(&in->model.notes);
    tarry_arena_release(&in->model.arena);
}

static int call(reading *in, reader *const *readers, size_t n) {
    int code = 0;
    for (size_t i = 0; i < n && code == 0; i++)
        code = readers[i](&in->builder, &in->error);
    return code;
}

void reading_pass(reading *in, reader *const *readers, size_t n) {
    const int code = call(in, readers, n);
    ck_assert_msg(code == 0, "%d:%d: %s", in->error.line, in->error.column, in->error.message);
}

void reading_refused(const char *text, const tarry_override *overrides, size_t n_overrides,
                     reader *const *readers, size_t n, tarry_code code, int line, int column,
                     const char *words) {
    reading in;
    reading_start(&in, text, overrides, n_overrides);
    const int found = call(&in, readers, n);
    ck_assert_msg(found != 0, "accepted:\n%s", text);
    ck_assert_msg(found == (int)code && in.error.code == code && in.error.line == line &&
                      in.error.column == column && strstr(in.error.message, words) != NULL,
                  "%s\nexpected %d, %d:%d: ...%s...\ngot      %d, %d:%d: %s", text, (int)code, line,
                  column, words, found, in.error.line, in.error.column, in.error.message);
    reading_end(&in);
}

double reading_parameter(const reading *in, const char *name) {
    const int32_t index = tarry_builder_find(&in->builder, TARRY_SYMBOL_PARAMETER, name);
    ck_assert_msg(index != TARRY_NONE, "%s", name);
    return in->builder.values[index];
}
