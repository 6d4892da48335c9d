/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_STUDY_DATA_H
#define TARRY_STUDY_DATA_H

/* Laboratory data on their way from a file to what estimators take in:
 *
 *   data_options.c  what the command line asks for
 *   data_table.c    text -> columns, every field checked
 *   data_frames.c   rows -> cells and frames: the frame interval, what is missing
 *   data_gaps.c     are frames missing where a signal is dark?
 *   data_network.c  names, times and windows as a network, so that estimators and report need to
 *                   know of no files
 *   data_visible.c  by which thresholds traces are visible
 *   data_beside.c   a model whose exact laws stand beside the figures
 *   measure.c       cells -> records -> tallies -> results */

#include <stdbool.h>
#include "base/csv.h"
#include "model/model.h"
#include "model/quantity.h"
#include "tarry/measure.h"

typedef enum tarry_data_kind {
    TARRY_DATA_TRACES,
    TARRY_DATA_COUNTS,
    TARRY_DATA_MEANS,
    TARRY_DATA_UNKNOWN,
} tarry_data_kind;

extern const char *const tarry_data_kind_names[]; /* of the first three */

typedef enum tarry_data_gaps {
    TARRY_DATA_GAPS_ASK, /* an error where there are many */
    TARRY_DATA_GAPS_DARK,
    TARRY_DATA_GAPS_MISSING,
} tarry_data_gaps;

typedef struct tarry_data_options {
    const char *unit; /* of time */
    tarry_units units;
    tarry_data_kind kind;
    const char *counted; /* names with commas between them, "all", or NULL */
    tarry_film_mean mean;
    tarry_data_gaps gaps;
    double background;
    double from, to, every, lags; /* NaN where not given */
    const char *visible;          /* "LOW,HIGH,LENGTH", "auto" or NULL */
    const char *of_traces;        /* an option that was given and is of traces only, or NULL */
    double *snapshots;            /* ascending, in the arena */
    size_t n_snapshots;
} tarry_data_options;

/* Texts stay those of the settings. */
int tarry_data_options_read(const tarry_override *settings, size_t n, tarry_arena *arena,
                            tarry_data_options *options, tarry_error *error);

enum { TARRY_DATA_MOST_NAMES = 200 }; /* columns of values */

/* The columns of a file. Arrays are of the heap, names in the arena. */
typedef struct tarry_data_table {
    const char *path;
    tarry_arena *arena;
    tarry_csv first_row; /* where the rows begin, to find one again for a message */
    tarry_data_kind kind;
    size_t n_rows;
    uint32_t *cells;  /* [row] number of the cell in the order met; NULL: there is no such column */
    uint32_t *groups; /* [row]; NULL: there is no such column */
    double *times;    /* [row] */
    size_t n_names;
    const char *names[TARRY_DATA_MOST_NAMES];
    double *values[TARRY_DATA_MOST_NAMES]; /* [row], NaN: missing */
    double *errors[TARRY_DATA_MOST_NAMES]; /* [row] of means: their standard errors; may be NULL */
    double *weights;                       /* [row] how many cells it stands for; NULL: one */
    int field_of[TARRY_DATA_MOST_NAMES];   /* its place in a row */
    int time_field;
    uint32_t n_cells, n_groups;
    const char **cell_names; /* [cell] */
    uint32_t *group_of;      /* [cell]; NULL where there are no groups */
} tarry_data_table;

/* `text` must outlive the table. Release accepts a half-built or zeroed one. */
int tarry_data_table_read(tarry_data_table *table, const char *path, const tarry_text *text,
                          const tarry_data_options *options, tarry_arena *arena,
                          tarry_error *error);
void tarry_data_table_release(tarry_data_table *table);

/* Where a field (number `field`, or 0) of a row stands, for messages. */
tarry_place tarry_data_table_place(const tarry_data_table *table, size_t row, int field);

/* Rows put to cells and frames. Only rows within --from and --to count. */
typedef struct tarry_data_frames {
    double start, every; /* frame i is at start + i every */
    uint32_t n_frames;
    uint32_t *frame; /* [row] */
    uint32_t *rows;  /* rows that count, cell by cell, each in order of time */
    size_t *cell_at; /* [n_cells + 1] into rows; cells without rows are left out */
    uint32_t *cell;  /* [n_cells] number in the table */
    size_t n_cells;
    uint32_t longest;         /* frames from first to last of a cell, at most */
    bool whole;               /* all cells have all frames and values */
    double expected, missing; /* frames times names between the first and last value of a cell */
    size_t gap_row;           /* the row behind the first gap */
} tarry_data_frames;

int tarry_data_frames_find(tarry_data_frames *frames, const tarry_data_table *table,
                           const tarry_data_options *options, tarry_error *error);
void tarry_data_frames_release(tarry_data_frames *frames);

/* First and last of the rows [from, to) of `frames` in which a value is known; false where none is.
 */
bool tarry_data_known(const tarry_data_frames *frames, const double *values, size_t from, size_t to,
                      size_t *first, size_t *last);

/* How values beside gaps compare with all others: the probability that one beside a gap is less
 * than another (ties count half) and the deviate of Mann & Whitney's test (1947, Ann. Math. Stat.
 * 18:50), with ties as in Lehmann (1975, Nonparametrics, 1.4). NaN where there are none of either.
 * Returns 0 or TARRY_MEMORY. */
typedef struct tarry_gap_test {
    double n_beside, n_other;
    double below; /* probability */
    double z;
} tarry_gap_test;

int tarry_data_gap_test(const tarry_data_frames *frames, const double *values, tarry_gap_test *test,
                        tarry_error *error);

struct tarry_data {
    tarry_text text; /* the file; freed once it is read */
    tarry_data_options options;
    tarry_data_table table;
    tarry_data_frames frames; /* of traces */
    size_t n_units;           /* cells or rows that are taken in */
    uint32_t *unit_group;     /* [unit] the group that it is left out with */
    uint32_t *snapshot;       /* [row] of counts and means: number of its time */
    tarry_data_plan plan;
    tarry_model *model;
    tarry_model *beside; /* NULL: none is asked for */
};

/* The network and plan of data whose table (and frames) are there. */
int tarry_data_network_build(tarry_data *data, tarry_error *error);

/* Thresholds of a column, in the arena, or NULL where none are asked for; and a note on those that
 * were found. */
int tarry_data_thresholds(const tarry_data *data, size_t column,
                          const tarry_thresholds **thresholds, tarry_error *error);
int tarry_data_note_thresholds(const tarry_data *data, tarry_notes *notes, tarry_error *error);

/* The half-sample mode of n > 0 values. */
double tarry_data_mode(const double *ascending_values, size_t n);

/* Read the model that --beside names, with the parameters of --set, and make its record that of the
 * data. */
int tarry_data_beside_read(tarry_data *data, const tarry_override *settings, size_t n,
                           tarry_error *error);

#endif
