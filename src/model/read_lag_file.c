/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "model/read_delays.h"

/* Measured histograms of waiting times: small CSV files that lie beside the model. A row is
 * from,to,weight or value,weight; times may carry units, weights any sum. */

#include "base/error.h"
#include "base/file.h"
#include "base/memory.h"

#include <stdlib.h>
#include <string.h>

enum { MOST_COLUMNS = 3, LARGEST_FILE = 16 << 20 };

typedef struct lag_rows {
    tarry_builder *builder;
    tarry_scope scope; /* finds nothing: only quantities stand in a file */
    const char *path;
    bool bins;
    TARRY_LIST(tarry_expression) points;
    TARRY_LIST(tarry_expression) weights;
    double last; /* where the bin before ended */
} lag_rows;

/* One line of a file cut at its commas, without blanks around the parts. */
typedef struct row_cells {
    char *texts[MOST_COLUMNS];
    int columns[MOST_COLUMNS]; /* in the line, from 1 */
    int n;                     /* may be MOST_COLUMNS + 1: too many */
} row_cells;

static tarry_name_kind find_nothing(void *context, const char *name, size_t n, uint32_t *index,
                                    tarry_dimension *dimension) {
    (void)context, (void)name, (void)n, (void)index, (void)dimension;
    return TARRY_NAME_UNKNOWN;
}

/* The path of `name` beside the model file. */
static char *beside(const tarry_builder *builder, const char *name) {
    const char *slash = strrchr(builder->model->file, '/');
    if (name[0] == '/' || slash == NULL)
        return tarry_arena_text(builder->arena, name, strlen(name));
    return tarry_arena_format(builder->arena, "%.*s/%s", (int)(slash - builder->model->file),
                              builder->model->file, name);
}

static bool is_blank(char c) {
    return c == ' ' || c == '\t' || c == '\r';
}

static void cut(char *line, row_cells *out) {
    out->n = 0;
    for (char *at = line; at != NULL;) {
        char *comma = strchr(at, ',');
        if (comma != NULL)
            *comma = '\0';
        char *text = at;
        while (is_blank(*text))
            text++;
        size_t n = strlen(text);
        while (n > 0 && is_blank(text[n - 1]))
            text[--n] = '\0';
        if (out->n == MOST_COLUMNS) {
            out->n++;
            return;
        }
        out->texts[out->n] = text;
        out->columns[out->n++] = (int)(text - line) + 1;
        at = comma == NULL ? NULL : comma + 1;
    }
}

static bool is_header(const row_cells *cells, const char *const *names, int n) {
    if (cells->n != n)
        return false;
    for (int i = 0; i < n; i++)
        if (strcmp(cells->texts[i], names[i]) != 0)
            return false;
    return true;
}

static int read_header(lag_rows *rows, const row_cells *cells, int line, tarry_error *error) {
    static const char *const of_bins[] = {"from", "to", "weight"};
    static const char *const of_values[] = {"value", "weight"};
    rows->bins = is_header(cells, of_bins, 3);
    if (rows->bins || is_header(cells, of_values, 2))
        return 0;
    return tarry_fail_at(error, TARRY_INPUT, (tarry_place){rows->path, line, 1},
                         "the first line must be 'from,to,weight' or 'value,weight'");
}

static int read_cell(lag_rows *rows, const row_cells *cells, int line, int i, tarry_dimension due,
                     tarry_expression *out, tarry_error *error) {
    tarry_builder *builder = rows->builder;
    const tarry_place place = {rows->path, line, cells->columns[i]};
    if (cells->texts[i][0] == '\0')
        return tarry_fail_at(error, TARRY_INPUT, place, "a number is missing here");
    const char *text = tarry_arena_text(builder->arena, cells->texts[i], strlen(cells->texts[i]));
    if (text == NULL)
        return tarry_fail_memory(error, "a table of lags");
    return tarry_expression_compile(text, place, due, builder->units, &rows->scope, builder->arena,
                                    out, error);
}

static int keep(lag_rows *rows, const tarry_expression *point, const tarry_expression *weight,
                tarry_error *error) {
    if ((point != NULL && TARRY_APPEND(&rows->points, *point) != 0) ||
        (weight != NULL && TARRY_APPEND(&rows->weights, *weight) != 0))
        return tarry_fail_memory(error, "a table of lags");
    return 0;
}

/* A gap between two bins becomes a bin of weight 0. */
static int keep_gap(lag_rows *rows, const tarry_expression *from, int line, tarry_error *error) {
    const double start = tarry_expression_value(from, NULL, NULL);
    if (rows->points.n == 0)
        return keep(rows, from, NULL, error);
    if (start == rows->last)
        return 0;
    if (!(start > rows->last))
        return tarry_fail_at(error, TARRY_INPUT, (tarry_place){rows->path, line, 1},
                             "this bin begins before the one above ends; bins must ascend");
    row_cells zero = {.texts = {(char[]){"0"}}, .columns = {1}, .n = 1};
    tarry_expression nothing = {0};
    const int code = read_cell(rows, &zero, line, 0, TARRY_PURE, &nothing, error);
    return code == 0 ? keep(rows, from, &nothing, error) : code;
}

static int read_row(lag_rows *rows, const row_cells *cells, int line, tarry_error *error) {
    const int n = rows->bins ? 3 : 2;
    if (cells->n != n)
        return tarry_fail_at(error, TARRY_INPUT, (tarry_place){rows->path, line, 1},
                             "%s columns; there must be %d as in the first line",
                             cells->n < n ? "too few" : "too many", n);
    tarry_expression columns[MOST_COLUMNS] = {{0}};
    for (int i = 0; i < n; i++) {
        const int code = read_cell(rows, cells, line, i, i == n - 1 ? TARRY_PURE : TARRY_TIME,
                                   &columns[i], error);
        if (code != 0)
            return code;
    }
    if (!rows->bins)
        return keep(rows, &columns[0], &columns[1], error);
    const int code = keep_gap(rows, &columns[0], line, error);
    if (code != 0)
        return code;
    rows->last = tarry_expression_value(&columns[1], NULL, NULL);
    return keep(rows, &columns[1], &columns[2], error);
}

/* Blank lines are passed over. */
static int read_lines(lag_rows *rows, char *text, tarry_error *error) {
    bool header = false;
    int line = 0;
    for (char *at = text; at != NULL;) {
        char *end = strchr(at, '\n');
        if (end != NULL)
            *end = '\0';
        line++;
        row_cells parts;
        cut(at, &parts);
        const bool blank = parts.n == 1 && parts.texts[0][0] == '\0';
        int code = 0;
        if (!blank && !header)
            code = read_header(rows, &parts, line, error);
        else if (!blank)
            code = read_row(rows, &parts, line, error);
        if (code != 0)
            return code;
        header = header || !blank;
        at = end == NULL ? NULL : end + 1;
    }
    if (rows->weights.n == 0)
        return tarry_fail_at(error, TARRY_INPUT, (tarry_place){rows->path, line, 1},
                             "this table of lags has no rows");
    return 0;
}

static int move_to_law(lag_rows *rows, tarry_law_template *law, tarry_error *error) {
    tarry_arena *arena = rows->builder->arena;
    tarry_expression *points = tarry_arena_calloc(arena, rows->points.n, sizeof *points);
    tarry_expression *weights = tarry_arena_calloc(arena, rows->weights.n, sizeof *weights);
    if (points == NULL || weights == NULL)
        return tarry_fail_memory(error, "a table of lags");
    for (size_t i = 0; i < rows->points.n; i++)
        points[i] = rows->points.items[i];
    for (size_t i = 0; i < rows->weights.n; i++)
        weights[i] = rows->weights.items[i];
    law->kind = rows->bins ? TARRY_LAW_BINS : TARRY_LAW_VALUES;
    law->n = rows->weights.n;
    law->points = points;
    law->weights = weights;
    return 0;
}

int tarry_read_lag_file(tarry_builder *builder, const tarry_node *file, tarry_law_template *law,
                        tarry_error *error) {
    lag_rows rows = {.builder = builder, .scope = {.find = find_nothing}};
    rows.path = beside(builder, file->text);
    if (rows.path == NULL)
        return tarry_fail_memory(error, "a table of lags");
    tarry_text text = {0};
    tarry_error fault = {0};
    int code = tarry_file_read(rows.path, LARGEST_FILE, &text, &fault);
    if (code != 0)
        code = tarry_fail_at(error, code == TARRY_MEMORY ? TARRY_MEMORY : TARRY_INPUT, file->place,
                             "the table of lags '%s': %s", rows.path, fault.message);
    else if (text.size == 0 || strlen(text.data) != text.size)
        code = tarry_fail_at(error, TARRY_INPUT, file->place, "the table of lags '%s' is %s",
                             file->text, text.size == 0 ? "empty" : "no text");
    else
        code = read_lines(&rows, text.data, error);
    if (code == 0)
        code = move_to_law(&rows, law, error);
    tarry_text_release(&text);
    free(rows.points.items);
    free(rows.weights.items);
    return code;
}
