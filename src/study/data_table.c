/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Reading data: the header says which column is what, then each row is checked as it comes. The
 * text stays where it is and numbers go straight into one array a column: ten million rows take
 * seconds. */
#include "study/data.h"

#include "base/error.h"
#include "base/memory.h"
#include "base/number.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

/* The library never exits: a word that finds no memory is left out of the table of words. */
#define HASH_NONFATAL_OOM 1
#include <uthash.h>

enum {
    MOST_FIELDS = 2 * TARRY_DATA_MOST_NAMES + 8,
    LONGEST_NAME = 80,
};

static const double most_expanded = 1e7;

/* Of so large a share of whole numbers it is taken that counts were meant. */
static const double mostly = 0.9;

typedef enum column_role {
    ROLE_CELL,
    ROLE_TIME,
    ROLE_GROUP,
    ROLE_VALUE,
    ROLE_ERROR,
    ROLE_WEIGHT
} column_role;

/* Words met, numbered in their order. */
typedef struct word {
    UT_hash_handle hh;
    const char *text;
    uint32_t number;
} word;

typedef struct words {
    word *all, *last; /* `last`: found last, since neighbouring rows are often of one cell */
    size_t last_n;
    uint32_t n;
} words;

typedef struct reading {
    tarry_data_table *table;
    const tarry_data_options *options;
    tarry_csv csv;
    size_t n_columns;
    column_role roles[MOST_FIELDS];
    int of[MOST_FIELDS];          /* of standard errors: the column that they belong to */
    double *numbers[MOST_FIELDS]; /* [row] of columns that hold numbers */
    words cells, groups;
    size_t cells_capacity, names_capacity;
    double *last_time; /* [cell] */
    bool cell_again;   /* a cell came more than once */
} reading;

/* ---- the header ------------------------------------------------------------------------------ */

static bool is(const tarry_csv_field *field, const char *text) {
    return field->n == strlen(text) && memcmp(field->text, text, field->n) == 0;
}

static int fail_field(const reading *r, const tarry_csv_field *field, const char *message,
                      tarry_error *error) {
    return tarry_fail_at(error, TARRY_INPUT, tarry_csv_place(&r->csv, field->text), "%.*s: %s",
                         (int)(field->n < LONGEST_NAME ? field->n : LONGEST_NAME), field->text,
                         message);
}

static int check_name(const reading *r, const tarry_csv_field *field, tarry_error *error) {
    static const char letters[] =
        "abcdefghijklmnopqrstuvwxyzABCDEFGHIJKLMNOPQRSTUVWXYZ0123456789_.";
    if (field->n == 0)
        return tarry_fail_at(error, TARRY_INPUT, tarry_csv_place(&r->csv, field->text),
                             "this column has no name; the first line names all columns, as in "
                             "cell,time,spot");
    if (field->n > LONGEST_NAME)
        return fail_field(r, field, "a name has at most 80 letters", error);
    const bool first = strchr(letters + 52, field->text[0]) == NULL;
    for (size_t i = 0; i < field->n; i++)
        if (!first || memchr(letters, field->text[i], sizeof letters - 1) == NULL)
            return fail_field(r, field,
                              "the name of a column begins with a letter and goes on with letters, "
                              "digits, '_' and '.'",
                              error);
    return TARRY_OK;
}

/* Position of a column by name, or -1. */
static int find_column(const tarry_csv_field *fields, size_t n, const char *name, size_t length) {
    for (size_t i = 0; i < n; i++)
        if (fields[i].n == length && memcmp(fields[i].text, name, length) == 0)
            return (int)i;
    return -1;
}

/* The column whose standard error this one is, or -1. */
static int error_of(const tarry_csv_field *fields, size_t n, const tarry_csv_field *field) {
    if (field->n <= 3 || memcmp(field->text + field->n - 3, "_se", 3) != 0)
        return -1;
    return find_column(fields, n, field->text, field->n - 3);
}

static int name_role(reading *r, const tarry_csv_field *fields, size_t n, size_t i,
                     tarry_error *error) {
    static const struct {
        const char *name;
        column_role role;
    } known[] = {
        {"cell", ROLE_CELL}, {"time", ROLE_TIME}, {"group", ROLE_GROUP}, {"cells", ROLE_WEIGHT}};
    const tarry_csv_field *field = &fields[i];
    r->of[i] = error_of(fields, n, field);
    if (r->of[i] >= 0 && error_of(fields, n, &fields[r->of[i]]) >= 0)
        r->of[i] = -1; /* an error has none */
    for (size_t k = 0; k < sizeof known / sizeof *known; k++)
        if (r->of[i] >= 0 && is(&fields[r->of[i]], known[k].name))
            r->of[i] = -1;
    r->roles[i] = r->of[i] >= 0 ? ROLE_ERROR : ROLE_VALUE;
    for (size_t k = 0; k < sizeof known / sizeof *known; k++)
        if (is(field, known[k].name))
            r->roles[i] = known[k].role;
    if (find_column(fields, i, field->text, field->n) >= 0)
        return fail_field(r, field, "this column stands here twice; each name stands once", error);
    return TARRY_OK;
}

static int add_value(reading *r, const tarry_csv_field *field, size_t i, tarry_error *error) {
    tarry_data_table *table = r->table;
    if (table->n_names == TARRY_DATA_MOST_NAMES)
        return fail_field(r, field, "at most 200 columns of values are read", error);
    const char *name = tarry_arena_text(table->arena, field->text, field->n);
    if (name == NULL)
        return tarry_fail_memory(error, "the names of columns");
    table->names[table->n_names] = name;
    table->field_of[table->n_names++] = (int)i;
    return TARRY_OK;
}

static int read_header(reading *r, tarry_error *error) {
    tarry_csv_field fields[MOST_FIELDS];
    size_t n;
    int code = tarry_csv_row(&r->csv, fields, MOST_FIELDS, &n, error);
    const tarry_place place = {r->table->path, 1, 1};
    if (code == TARRY_OK && n == 0)
        return tarry_fail_at(error, TARRY_INPUT, place,
                             "this file is empty; its first line names the columns, as in "
                             "cell,time,spot");
    if (code == TARRY_OK && n == 1 &&
        (memchr(fields[0].text, ';', fields[0].n) || memchr(fields[0].text, '\t', fields[0].n)))
        return tarry_fail_at(error, TARRY_INPUT, tarry_csv_place(&r->csv, fields[0].text),
                             "columns must be parted by commas, not by semicolons or tabs");
    if (code == TARRY_OK && n > MOST_FIELDS)
        return tarry_fail_at(error, TARRY_INPUT, place, "at most 200 columns of values are read");
    r->n_columns = n;
    for (size_t i = 0; code == TARRY_OK && i < n; i++) {
        code = check_name(r, &fields[i], error);
        if (code == TARRY_OK)
            code = name_role(r, fields, n, i, error);
        if (code == TARRY_OK && r->roles[i] == ROLE_VALUE)
            code = add_value(r, &fields[i], i, error);
    }
    if (code != TARRY_OK)
        return code;
    r->table->time_field = find_column(fields, n, "time", 4);
    if (r->table->time_field < 0)
        return tarry_fail_at(error, TARRY_INPUT, tarry_csv_place(&r->csv, fields[0].text),
                             "there is no column `time`; the first line names the columns, as in "
                             "cell,time,spot or time,count");
    if (r->table->n_names == 0)
        return tarry_fail_at(error, TARRY_INPUT, tarry_csv_place(&r->csv, fields[0].text),
                             "there is no column of values; the first line names the columns, as "
                             "in cell,time,spot or time,count");
    return TARRY_OK;
}

/* ---- words ----------------------------------------------------------------------------------- */

/* The number of a word; *found: it was met before. UINT32_MAX: memory is short. */
static uint32_t number_of(words *w, tarry_arena *arena, const tarry_csv_field *field, bool *found) {
    word *known = w->last;
    *found = true;
    if (known != NULL && w->last_n == field->n && memcmp(known->text, field->text, field->n) == 0)
        return known->number;
    HASH_FIND(hh, w->all, field->text, field->n, known);
    if (known == NULL) {
        *found = false;
        known = tarry_arena_calloc(arena, 1, sizeof *known);
        const char *text = tarry_arena_text(arena, field->text, field->n);
        if (known == NULL || text == NULL)
            return UINT32_MAX;
        known->text = text;
        known->number = w->n;
        HASH_ADD_KEYPTR(hh, w->all, known->text, field->n, known);
        if (known->hh.tbl == NULL)
            return UINT32_MAX;
        w->n++;
    }
    w->last = known;
    w->last_n = field->n;
    return known->number;
}

/* ---- one field ------------------------------------------------------------------------------- */

static bool is_missing(const tarry_csv_field *field) {
    return field->n == 0 || is(field, "NaN") || is(field, "nan") || is(field, "NA") ||
           is(field, "NAN");
}

static int fail_number(const reading *r, const tarry_csv_field *field, tarry_number_status status,
                       tarry_error *error) {
    if (status == TARRY_NUMBER_RANGE)
        return fail_field(r, field, "this number is too large", error);
    return fail_field(r, field,
                      "a number is due here, as in 12.5 or 3e-2 (a value that is missing: nothing, "
                      "or NaN)",
                      error);
}

static int read_value(const reading *r, const tarry_csv_field *field, double *out,
                      tarry_error *error) {
    *out = NAN;
    if (is_missing(field))
        return TARRY_OK;
    const tarry_number_status status = tarry_number_read(field->text, field->n, out);
    return status == TARRY_NUMBER_OK ? TARRY_OK : fail_number(r, field, status, error);
}

static int read_time(const reading *r, const tarry_csv_field *field, double *out,
                     tarry_error *error) {
    const int code = read_value(r, field, out, error);
    if (code == TARRY_OK && isnan(*out))
        return tarry_fail_at(error, TARRY_INPUT, tarry_csv_place(&r->csv, field->text),
                             "the time is missing here; each row has one");
    return code;
}

static int read_weight(const reading *r, const tarry_csv_field *field, double *out,
                       tarry_error *error) {
    const int code = read_value(r, field, out, error);
    if (code == TARRY_OK && !(*out >= 0.0 && *out == floor(*out)))
        return fail_field(r, field, "how many cells have this count is due here, a whole number",
                          error);
    return code;
}

/* ---- rows ------------------------------------------------------------------------------------ */

static int new_cell(reading *r, const tarry_csv_field *field, tarry_error *error) {
    tarry_data_table *table = r->table;
    const uint32_t n = r->cells.n;
    void *times = r->last_time, *names = (void *)table->cell_names;
    const bool failed = tarry_grow(&times, &r->cells_capacity, n, sizeof(double)) != 0 ||
                        tarry_grow(&names, &r->names_capacity, n, sizeof(char *)) != 0;
    (void)field;
    r->last_time = times;
    table->cell_names = names;
    if (failed)
        return tarry_fail_memory(error, "the list of cells");
    table->cell_names[n - 1] = r->cells.last->text;
    return TARRY_OK;
}

static int read_cell(reading *r, const tarry_csv_field *fields, size_t i, size_t row, double time,
                     tarry_error *error) {
    bool found;
    const tarry_csv_field *field = &fields[i];
    if (field->n == 0)
        return tarry_fail_at(error, TARRY_INPUT, tarry_csv_place(&r->csv, field->text),
                             "the cell is missing here; each row names one");
    const uint32_t cell = number_of(&r->cells, r->table->arena, field, &found);
    if (cell == UINT32_MAX)
        return tarry_fail_memory(error, "the list of cells");
    r->table->cells[row] = cell;
    if (!found) {
        const int code = new_cell(r, field, error);
        if (code != TARRY_OK)
            return code;
    } else {
        r->cell_again = true;
        const tarry_csv_field *at = &fields[r->table->time_field];
        if (!(time > r->last_time[cell])) {
            const bool same = time == r->last_time[cell];
            return tarry_fail_at(error, TARRY_INPUT, tarry_csv_place(&r->csv, at->text),
                                 "cell %s %s the time %.*s; the times of a cell must go up from "
                                 "row to row",
                                 r->table->cell_names[cell], same ? "has twice" : "goes back to",
                                 (int)at->n, at->text);
        }
    }
    r->last_time[cell] = time;
    return TARRY_OK;
}

static int read_group(reading *r, const tarry_csv_field *field, size_t row, tarry_error *error) {
    bool found;
    if (field->n == 0)
        return tarry_fail_at(error, TARRY_INPUT, tarry_csv_place(&r->csv, field->text),
                             "the group is missing here; each row names one");
    const uint32_t group = number_of(&r->groups, r->table->arena, field, &found);
    if (group == UINT32_MAX)
        return tarry_fail_memory(error, "the list of groups");
    r->table->groups[row] = group;
    return TARRY_OK;
}

static int read_row(reading *r, const tarry_csv_field *fields, size_t row, tarry_error *error) {
    tarry_data_table *table = r->table;
    double time;
    int code = read_time(r, &fields[table->time_field], &time, error);
    table->times[row] = time;
    for (size_t i = 0; code == TARRY_OK && i < r->n_columns; i++) {
        switch (r->roles[i]) {
        case ROLE_TIME:
            break;
        case ROLE_CELL:
            code = read_cell(r, fields, i, row, time, error);
            break;
        case ROLE_GROUP:
            code = read_group(r, &fields[i], row, error);
            break;
        case ROLE_WEIGHT:
            code = read_weight(r, &fields[i], &r->numbers[i][row], error);
            break;
        case ROLE_VALUE:
        case ROLE_ERROR:
            code = read_value(r, &fields[i], &r->numbers[i][row], error);
            break;
        }
    }
    return code;
}

static int fail_columns(const reading *r, const tarry_csv_field *fields, size_t n,
                        tarry_error *error) {
    const bool few = n < r->n_columns;
    const tarry_place place = tarry_csv_place(&r->csv, fields[(few ? n : r->n_columns) - 1].text);
    if (few)
        return tarry_fail_at(error, TARRY_INPUT, place,
                             "too few columns: %zu, and the first line names %zu", n, r->n_columns);
    return tarry_fail_at(error, TARRY_INPUT, place,
                         "too many columns: the first line names %zu (a decimal comma? numbers are "
                         "written with a point)",
                         r->n_columns);
}

static int read_rows(reading *r, tarry_error *error) {
    tarry_csv_field fields[MOST_FIELDS];
    tarry_data_table *table = r->table;
    table->first_row = r->csv;
    for (;;) {
        size_t n;
        int code = tarry_csv_row(&r->csv, fields, r->n_columns, &n, error);
        if (code == TARRY_OK && n == 0)
            break;
        if (code == TARRY_OK && n != r->n_columns)
            code = fail_columns(r, fields, n, error);
        if (code == TARRY_OK)
            code = read_row(r, fields, table->n_rows, error);
        if (code != TARRY_OK)
            return code;
        table->n_rows++;
    }
    if (table->n_rows == 0)
        return tarry_fail_at(error, TARRY_INPUT, tarry_csv_place(&r->csv, r->csv.line_start),
                             "there are no rows below the names of the columns");
    return TARRY_OK;
}

tarry_place tarry_data_table_place(const tarry_data_table *table, size_t row, int field) {
    tarry_csv csv = table->first_row;
    tarry_csv_field fields[MOST_FIELDS];
    size_t n = 0;
    for (size_t i = 0; i <= row; i++)
        tarry_csv_row(&csv, fields, MOST_FIELDS, &n, NULL);
    return tarry_csv_place(&csv, fields[(size_t)field < n ? field : 0].text);
}

/* ---- memory ---------------------------------------------------------------------------------- */

static size_t count_lines(const tarry_csv *csv) {
    size_t n = 1;
    for (const char *at = csv->at; at < csv->end; n++) {
        at = memchr(at, '\n', (size_t)(csv->end - at));
        if (at == NULL)
            break;
        at++;
    }
    return n;
}

static int make_columns(reading *r, tarry_error *error) {
    tarry_data_table *table = r->table;
    const size_t n = count_lines(&r->csv);
    bool failed = false;
    table->times = tarry_calloc(n, sizeof *table->times);
    failed = table->times == NULL;
    for (size_t i = 0; i < r->n_columns; i++) {
        if (r->roles[i] == ROLE_CELL)
            failed |= (table->cells = tarry_calloc(n, sizeof *table->cells)) == NULL;
        else if (r->roles[i] == ROLE_GROUP)
            failed |= (table->groups = tarry_calloc(n, sizeof *table->groups)) == NULL;
        else if (r->roles[i] != ROLE_TIME)
            failed |= (r->numbers[i] = tarry_calloc(n, sizeof(double))) == NULL;
        if (r->roles[i] == ROLE_WEIGHT)
            table->weights = r->numbers[i];
        for (size_t k = 0; k < table->n_names; k++) {
            if (r->roles[i] == ROLE_VALUE && table->field_of[k] == (int)i)
                table->values[k] = r->numbers[i];
            if (r->roles[i] == ROLE_ERROR && table->field_of[k] == r->of[i])
                table->errors[k] = r->numbers[i];
        }
    }
    return failed ? tarry_fail_memory(error, "the columns of the data") : TARRY_OK;
}

void tarry_data_table_release(tarry_data_table *table) {
    free(table->cells);
    free(table->groups);
    free(table->times);
    free(table->weights);
    free(table->group_of);
    free((void *)table->cell_names);
    for (size_t k = 0; k < table->n_names; k++) {
        free(table->values[k]);
        free(table->errors[k]);
    }
    *table = (tarry_data_table){0};
}

/* ---- what kind it is ------------------------------------------------------------------------- */

static bool is_count(double value) {
    return value >= 0.0 && value <= 0x1p53 && value == floor(value);
}

/* Whole numbers, that is; those below 0 are refused later. */
static bool mostly_counts(const tarry_data_table *table) {
    double n = 0.0, counts = 0.0;
    for (size_t k = 0; k < table->n_names; k++) {
        for (size_t row = 0; row < table->n_rows; row++) {
            n += !isnan(table->values[k][row]);
            counts += table->values[k][row] == floor(table->values[k][row]);
        }
    }
    return counts >= mostly * n;
}

static tarry_data_kind find_kind(const reading *r) {
    const tarry_data_table *table = r->table;
    if (table->weights != NULL)
        return TARRY_DATA_COUNTS;
    for (size_t k = 0; k < table->n_names; k++)
        if (table->errors[k] != NULL)
            return TARRY_DATA_MEANS;
    if (table->cells != NULL)
        return r->cell_again ? TARRY_DATA_TRACES : TARRY_DATA_COUNTS;
    return mostly_counts(table) ? TARRY_DATA_COUNTS : TARRY_DATA_MEANS;
}

static int check_counts(const tarry_data_table *table, tarry_error *error) {
    for (size_t row = 0; row < table->n_rows; row++) {
        for (size_t k = 0; k < table->n_names; k++) {
            const double value = table->values[k][row];
            char text[TARRY_NUMBER_SIZE];
            if (isnan(value) || is_count(value))
                continue;
            tarry_number_write(value, text);
            return tarry_fail_at(error, TARRY_INPUT,
                                 tarry_data_table_place(table, row, table->field_of[k]),
                                 value < 0.0 ? "%s: a count of molecules is not negative"
                                             : "%s: a count of molecules is a whole number (means "
                                               "or brightness? --kind means, or a column `cell` "
                                               "and --kind traces)",
                                 text);
        }
    }
    return TARRY_OK;
}

/* What the kind needs and what it cannot have. */
static int check_kind(const reading *r, tarry_error *error) {
    const tarry_data_table *table = r->table;
    const tarry_place head = {table->path, table->first_row.line, 1};
    if (table->kind == TARRY_DATA_TRACES && table->cells == NULL)
        return tarry_fail_at(error, TARRY_INPUT, head,
                             "traces need a column `cell`, as in cell,time,spot");
    if (table->weights != NULL &&
        (table->kind != TARRY_DATA_COUNTS || table->n_names != 1 || table->cells != NULL))
        return tarry_fail_at(error, TARRY_INPUT, head,
                             "a column `cells` says how many cells have a count: it stands beside "
                             "one column of counts, as in time,count,cells");
    for (size_t k = 0; k < table->n_names; k++)
        if (table->errors[k] != NULL && table->kind != TARRY_DATA_MEANS)
            return tarry_fail_at(error, TARRY_INPUT, head,
                                 "%s_se: standard errors stand beside means only (--kind means)",
                                 table->names[k]);
    if (table->kind == TARRY_DATA_COUNTS && r->cell_again)
        return tarry_fail_at(error, TARRY_INPUT, head,
                             "cells come more than once, so that these are no counts in fixed "
                             "cells; for films: --kind traces (and --counted %s where they are "
                             "counts)",
                             table->names[0]);
    return table->kind == TARRY_DATA_COUNTS ? check_counts(table, error) : TARRY_OK;
}

/* A cell is in one group. */
static int check_groups(tarry_data_table *table, tarry_error *error) {
    if (table->groups == NULL || table->cells == NULL)
        return TARRY_OK;
    table->group_of = tarry_calloc(table->n_cells, sizeof *table->group_of);
    if (table->group_of == NULL)
        return tarry_fail_memory(error, "the list of groups");
    for (uint32_t c = 0; c < table->n_cells; c++)
        table->group_of[c] = UINT32_MAX;
    for (size_t row = 0; row < table->n_rows; row++) {
        uint32_t *of = &table->group_of[table->cells[row]];
        if (*of == UINT32_MAX)
            *of = table->groups[row];
        else if (*of != table->groups[row])
            return tarry_fail_at(error, TARRY_INPUT, tarry_data_table_place(table, row, 0),
                                 "cell %s stands in a second group here; a cell is in one group "
                                 "(cells of two dishes must not share a name)",
                                 table->cell_names[table->cells[row]]);
    }
    return TARRY_OK;
}

/* ---- counts with the number of cells that have them ------------------------------------------ */

/* A row for each cell in the place of one for each count. */
static int expand(tarry_data_table *table, tarry_error *error) {
    double n = 0.0;
    for (size_t row = 0; row < table->n_rows; row++)
        n += table->weights[row];
    if (n > most_expanded)
        return tarry_fail_at(error, TARRY_INPUT, (tarry_place){table->path, 0, 0},
                             "the column `cells` adds up to more than 1e7 cells, the most that are "
                             "taken; measure a part "
                             "of the times at once");
    double *times = tarry_calloc((size_t)n, sizeof *times);
    double *values = tarry_calloc((size_t)n, sizeof *values);
    uint32_t *groups = tarry_calloc((size_t)n, sizeof *groups);
    if (times == NULL || values == NULL || groups == NULL) {
        free(times);
        free(values);
        free(groups);
        return tarry_fail_memory(error, "the cells of the data");
    }
    size_t to = 0;
    for (size_t row = 0; row < table->n_rows; row++) {
        for (double i = 0.0; i < table->weights[row]; i += 1.0) {
            times[to] = table->times[row];
            values[to] = table->values[0][row];
            groups[to++] = table->groups != NULL ? table->groups[row] : 0;
        }
    }
    free(table->times);
    free(table->values[0]);
    table->times = times;
    table->values[0] = values;
    table->n_rows = to;
    if (table->groups == NULL) {
        free(groups);
        return TARRY_OK;
    }
    free(table->groups);
    table->groups = groups;
    return TARRY_OK;
}

/* ---- the whole ------------------------------------------------------------------------------- */

/* Comments stand at the head only. */
static void pass_comments(tarry_csv *csv) {
    tarry_csv_field line;
    for (tarry_csv ahead = *csv; tarry_csv_line(&ahead, &line); *csv = ahead)
        if (line.n == 0 || line.text[0] != '#')
            return;
}

static int read_all(reading *r, tarry_error *error) {
    pass_comments(&r->csv);
    int code = read_header(r, error);
    if (code == TARRY_OK)
        code = make_columns(r, error);
    return code != TARRY_OK ? code : read_rows(r, error);
}

int tarry_data_table_read(tarry_data_table *table, const char *path, const tarry_text *text,
                          const tarry_data_options *options, tarry_arena *arena,
                          tarry_error *error) {
    *table = (tarry_data_table){.path = path, .arena = arena};
    reading r = {.table = table, .options = options, .csv = tarry_csv_of(path, text)};
    int code = TARRY_OK;
    if (memchr(text->data, '\0', text->size) != NULL)
        code = tarry_fail_at(error, TARRY_INPUT, (tarry_place){path, 1, 1},
                             "this is no text; a CSV file is due here");
    if (code == TARRY_OK)
        code = read_all(&r, error);
    table->n_cells = r.cells.n;
    table->n_groups = r.groups.n;
    if (code == TARRY_OK) {
        table->kind = options->kind != TARRY_DATA_UNKNOWN ? options->kind : find_kind(&r);
        code = check_kind(&r, error);
    }
    if (code == TARRY_OK)
        code = check_groups(table, error);
    if (code == TARRY_OK && table->weights != NULL)
        code = expand(table, error);
    HASH_CLEAR(hh, r.cells.all);
    HASH_CLEAR(hh, r.groups.all);
    free(r.last_time);
    return code;
}
