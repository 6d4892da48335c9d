/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Tables: cells row by row, each a number or a pointer to a text that the table keeps once. */
#include "base/table.h"

#include "base/error.h"
#include "base/memory.h"

#include <assert.h>
#include <math.h>
#include <stdarg.h>
#include <stdlib.h>
#include <string.h>

/* The library never exits: a word that finds no memory is left out of the table of words. */
#define HASH_NONFATAL_OOM 1
#include <uthash.h>

typedef union value {
    double number;
    const char *text; /* one of the words, or "" */
} value;

typedef struct word {
    UT_hash_handle hh;
    size_t length;
    char text[];
} word;

typedef struct column {
    const char *name;
    bool is_text;
} column;

struct tarry_table {
    tarry_arena names;
    const char *name;
    column *columns;
    size_t n_columns;
    value *cells; /* [row][column] */
    size_t n_rows;
    size_t capacity; /* of cells */
    word *words;
    size_t word_bytes;
};

/* The next "name:type" of a list parted by blanks, at *at; false at its end. */
static bool next_column(const char **at, const char **name, size_t *length, bool *is_text) {
    const char *start = *at + strspn(*at, " ");
    const size_t n = strcspn(start, " ");
    if (n == 0)
        return false;
    *at = start + n;
    size_t colon = n;
    while (colon > 0 && start[colon - 1] != ':')
        colon--;
    assert(colon > 1);
    *is_text = n - colon == 4 && strncmp(start + colon, "text", 4) == 0;
    assert(*is_text || (n - colon == 6 && strncmp(start + colon, "number", 6) == 0));
    *name = start;
    *length = colon - 1;
    return true;
}

static bool add_columns(tarry_table *table, const char *columns) {
    const char *at = columns, *name;
    size_t length, capacity = 0;
    bool is_text;
    void *array = NULL;
    while (next_column(&at, &name, &length, &is_text)) {
        if (tarry_arena_grow(&table->names, &array, &capacity, table->n_columns + 1,
                             sizeof(column)) != 0)
            return false;
        table->columns = array;
        column *new = &table->columns[table->n_columns++];
        new->name = tarry_arena_text(&table->names, name, length);
        new->is_text = is_text;
        if (new->name == NULL)
            return false;
    }
    return true;
}

tarry_table *tarry_table_new(const char *name, const char *columns) {
    tarry_table *table = tarry_calloc(1, sizeof *table);
    if (table == NULL)
        return NULL;
    table->name = tarry_arena_text(&table->names, name, strlen(name));
    if (table->name == NULL || !add_columns(table, columns)) {
        tarry_table_free(table);
        return NULL;
    }
    return table;
}

void tarry_table_free(tarry_table *table) {
    if (table == NULL)
        return;
    word *each = table->words;
    HASH_CLEAR(hh, table->words); /* the words themselves stay, and stay linked */
    while (each != NULL) {
        word *next = each->hh.next;
        free(each);
        each = next;
    }
    free(table->cells);
    tarry_arena_release(&table->names);
    free(table);
}

/* The table's own copy of a text; NULL when memory is short. */
static const char *keep_text(tarry_table *table, const char *text) {
    const size_t length = text != NULL ? strlen(text) : 0;
    if (length == 0)
        return "";
    word *found = NULL;
    HASH_FIND(hh, table->words, text, length, found);
    if (found != NULL)
        return found->text;

    word *new = tarry_calloc(1, sizeof *new + length + 1);
    if (new == NULL)
        return NULL;
    new->length = length;
    memcpy(new->text, text, length + 1);
    HASH_ADD_KEYPTR(hh, table->words, new->text, length, new);
    if (new->hh.tbl == NULL) {
        free(new);
        return NULL;
    }
    table->word_bytes += sizeof *new + length + 1;
    return new->text;
}

/* Memory for one more row; NULL where it is short. */
static value *next_row(tarry_table *table) {
    void *cells = table->cells;
    const size_t n = table->n_columns;
    if (tarry_grow(&cells, &table->capacity, (table->n_rows + 1) * n, sizeof(value)) != 0)
        return NULL;
    table->cells = cells;
    return table->cells + table->n_rows * n;
}

int tarry_table_add(tarry_table *table, tarry_error *error, ...) {
    value *row = next_row(table);
    if (row == NULL)
        return tarry_fail_memory(error, "a table of results");
    bool short_of_memory = false;
    va_list arguments;
    va_start(arguments, error);
    for (size_t j = 0; j < table->n_columns; j++) {
        if (table->columns[j].is_text) {
            row[j].text = keep_text(table, va_arg(arguments, const char *));
            short_of_memory = short_of_memory || row[j].text == NULL;
        } else {
            row[j].number = va_arg(arguments, double);
        }
    }
    va_end(arguments);
    if (short_of_memory)
        return tarry_fail_memory(error, "a table of results");
    table->n_rows++;
    return 0;
}

int tarry_table_add_numbers(tarry_table *table, const double *numbers, tarry_error *error) {
    value *row = next_row(table);
    if (row == NULL)
        return tarry_fail_memory(error, "a table of results");
    for (size_t j = 0; j < table->n_columns; j++) {
        assert(!table->columns[j].is_text);
        row[j].number = numbers[j];
    }
    table->n_rows++;
    return 0;
}

/* A text of CSV: in quotes where it holds what would end it, quotes within doubled. */
static void add_quoted(tarry_text *text, const char *field) {
    if (strpbrk(field, ",\"\r\n") == NULL) {
        tarry_text_add_string(text, field);
        return;
    }
    tarry_text_add(text, "\"", 1);
    for (const char *at = field; *at != '\0'; at++) {
        if (*at == '"')
            tarry_text_add(text, "\"", 1);
        tarry_text_add(text, at, 1);
    }
    tarry_text_add(text, "\"", 1);
}

void tarry_table_write_csv(const tarry_table *table, tarry_text *text) {
    for (size_t j = 0; j < table->n_columns; j++) {
        if (j > 0)
            tarry_text_add(text, ",", 1);
        add_quoted(text, table->columns[j].name);
    }
    tarry_text_add(text, "\n", 1);
    for (size_t i = 0; i < table->n_rows; i++) {
        const value *row = table->cells + i * table->n_columns;
        for (size_t j = 0; j < table->n_columns; j++) {
            if (j > 0)
                tarry_text_add(text, ",", 1);
            if (table->columns[j].is_text)
                add_quoted(text, row[j].text);
            else if (!isnan(row[j].number))
                tarry_text_add_number(text, row[j].number);
        }
        tarry_text_add(text, "\n", 1);
    }
}

const char *tarry_table_name(const tarry_table *table) {
    return table->name;
}

size_t tarry_table_n_rows(const tarry_table *table) {
    return table->n_rows;
}

size_t tarry_table_n_columns(const tarry_table *table) {
    return table->n_columns;
}

const char *tarry_table_column_name(const tarry_table *table, size_t index) {
    assert(index < table->n_columns);
    return table->columns[index].name;
}

int tarry_table_column(const tarry_table *table, const char *name) {
    for (size_t j = 0; j < table->n_columns; j++)
        if (strcmp(table->columns[j].name, name) == 0)
            return (int)j;
    return -1;
}

/* The cell, or NULL where it is outside the table or of the other type. */
static const value *find_cell(const tarry_table *table, size_t row, int index, bool is_text) {
    if (row >= table->n_rows || (size_t)index >= table->n_columns)
        return NULL;
    if (table->columns[index].is_text != is_text)
        return NULL;
    return &table->cells[row * table->n_columns + (size_t)index];
}

const char *tarry_table_text(const tarry_table *table, size_t row, int index) {
    const value *cell = find_cell(table, row, index, true);
    return cell != NULL ? cell->text : "";
}

double tarry_table_number(const tarry_table *table, size_t row, int index) {
    const value *cell = find_cell(table, row, index, false);
    return cell != NULL ? cell->number : NAN;
}

size_t tarry_table_bytes(const tarry_table *table) {
    return sizeof *table + table->names.used + table->capacity * sizeof(value) + table->word_bytes +
           HASH_OVERHEAD(hh, table->words);
}
