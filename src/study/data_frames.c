/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Rows of traces put to cells and frames.
 *
 * The frame interval is what most neighbouring rows of a cell are apart: differences are put in
 * order, and where most of them lie within a tenth of each other there it is, their mean. Each row
 * must then lie on a frame, to a twentieth of the interval: times are often rounded. */
#include "study/data.h"

#include "base/error.h"
#include "base/memory.h"
#include "base/number.h"

#include <math.h>
#include <stdlib.h>
#include <string.h>

enum { MOST_FRAMES = 100000000, MOST_DIFFERENCES = 200000 };

static const double alike = 1.1;  /* differences within this factor are one interval */
static const double near = 0.2;   /* of the interval: what may tell how long it is */
static const double slack = 0.05; /* of the interval: how far a row may lie from its frame */

static bool counts(const tarry_data_options *options, double time) {
    return !(time < options->from) && !(time > options->to);
}

/* ---- the interval ---------------------------------------------------------------------------- */

static int ascending(const void *one, const void *other) {
    const double a = *(const double *)one, b = *(const double *)other;
    return (a > b) - (a < b);
}

/* Differences between rows of a cell, every so manieth of them; returns how many there are. */
static size_t gather(const tarry_data_table *table, const tarry_data_options *options, double *last,
                     double *differences) {
    const size_t step = table->n_rows / MOST_DIFFERENCES + 1;
    size_t n = 0, seen = 0;
    for (uint32_t c = 0; c < table->n_cells; c++)
        last[c] = NAN;
    for (size_t row = 0; row < table->n_rows; row++) {
        const double time = table->times[row];
        double *before = &last[table->cells[row]];
        if (!counts(options, time))
            continue;
        if (!isnan(*before) && seen++ % step == 0)
            differences[n++] = time - *before;
        *before = time;
    }
    return n;
}

/* The mean of those differences of which most are alike. */
static double most_common(double *differences, size_t n) {
    size_t best = 0, best_n = 0;
    qsort(differences, n, sizeof *differences, ascending);
    for (size_t from = 0, to = 0; from < n; from++) {
        while (to < n && differences[to] <= alike * differences[from])
            to++;
        if (to - from > best_n) {
            best = from;
            best_n = to - from;
        }
    }
    double sum = 0.0;
    for (size_t i = best; i < best + best_n; i++)
        sum += differences[i];
    return sum / (double)best_n;
}

/* The interval from the whole length of the cells, which rounded times tell better. */
static double refine(const tarry_data_table *table, const tarry_data_options *options, double *last,
                     double every) {
    double time = 0.0, frames = 0.0;
    for (uint32_t c = 0; c < table->n_cells; c++)
        last[c] = NAN;
    for (size_t row = 0; row < table->n_rows; row++) {
        double *before = &last[table->cells[row]];
        if (!counts(options, table->times[row]))
            continue;
        const double at = (table->times[row] - *before) / every, n = round(at);
        if (n >= 1.0 && n < 10.0 && fabs(at - n) < near) {
            time += table->times[row] - *before;
            frames += n;
        }
        *before = table->times[row];
    }
    return frames > 0.0 ? time / frames : every;
}

static int fail_one_frame(const tarry_data_table *table, tarry_error *error) {
    return tarry_fail_at(error, TARRY_INPUT, (tarry_place){table->path, 0, 0},
                         "no cell has two frames%s; for counts in fixed cells: --kind counts",
                         " (within --from and --to, where they were given)");
}

static int find_interval(tarry_data_frames *frames, const tarry_data_table *table,
                         const tarry_data_options *options, double *last, double *differences,
                         tarry_error *error) {
    const size_t n = gather(table, options, last, differences);
    if (n == 0)
        return fail_one_frame(table, error);
    frames->every = options->every;
    if (isnan(frames->every))
        frames->every = refine(table, options, last, most_common(differences, n));
    return TARRY_OK;
}

/* ---- rows to frames -------------------------------------------------------------------------- */

static int fail_uneven(const tarry_data_frames *frames, const tarry_data_table *table, size_t row,
                       tarry_error *error) {
    char every[TARRY_NUMBER_SIZE], start[TARRY_NUMBER_SIZE], time[TARRY_NUMBER_SIZE];
    tarry_number_write_rounded(frames->every, 6, every);
    tarry_number_write_rounded(frames->start, 6, start);
    tarry_number_write(table->times[row], time);
    return tarry_fail_at(
        error, TARRY_INPUT, tarry_data_table_place(table, row, table->time_field),
        "uneven frames: %s of cell %s is no whole number of frame intervals (%s, as most are) "
        "after the first time, %s; give each row the time of its frame, or the interval with "
        "--every",
        time, table->cell_names[table->cells[row]], every, start);
}

static int put_to_frames(tarry_data_frames *frames, const tarry_data_table *table,
                         const tarry_data_options *options, double *last, tarry_error *error) {
    double first = INFINITY;
    for (size_t row = 0; row < table->n_rows; row++)
        if (counts(options, table->times[row]))
            first = fmin(first, table->times[row]);
    frames->start = first;
    for (uint32_t c = 0; c < table->n_cells; c++)
        last[c] = -1.0;
    for (size_t row = 0; row < table->n_rows; row++) {
        frames->frame[row] = UINT32_MAX;
        if (!counts(options, table->times[row]))
            continue;
        const double at = (table->times[row] - first) / frames->every, frame = round(at);
        double *before = &last[table->cells[row]];
        if (!(fabs(at - frame) <= slack) || !(frame > *before))
            return fail_uneven(frames, table, row, error);
        if (frame >= MOST_FRAMES)
            return tarry_fail_at(error, TARRY_INPUT,
                                 tarry_data_table_place(table, row, table->time_field),
                                 "more than 1e8 frames from the first to this time are not taken");
        frames->frame[row] = (uint32_t)frame;
        if (frames->frame[row] >= frames->n_frames)
            frames->n_frames = frames->frame[row] + 1;
        *before = frame;
    }
    return TARRY_OK;
}

/* ---- cells ----------------------------------------------------------------------------------- */

/* Rows in the order of cells (of their first appearance), within a cell in that of the file. */
static int sort_by_cell(tarry_data_frames *frames, const tarry_data_table *table,
                        tarry_error *error) {
    size_t *at = tarry_calloc((size_t)table->n_cells + 1, sizeof *at);
    frames->cell_at = tarry_calloc((size_t)table->n_cells + 1, sizeof *frames->cell_at);
    frames->cell = tarry_calloc(table->n_cells, sizeof *frames->cell);
    if (at == NULL || frames->cell_at == NULL || frames->cell == NULL) {
        free(at);
        return tarry_fail_memory(error, "the list of cells");
    }
    for (size_t row = 0; row < table->n_rows; row++)
        if (frames->frame[row] != UINT32_MAX)
            at[table->cells[row] + 1]++;
    for (uint32_t c = 0; c < table->n_cells; c++) {
        if (at[c + 1] > 0)
            frames->cell[frames->n_cells++] = c;
        at[c + 1] += at[c];
    }
    for (size_t i = 0; i < frames->n_cells; i++) {
        frames->cell_at[i] = at[frames->cell[i]];
        frames->cell_at[i + 1] = at[frames->cell[i] + 1];
    }
    for (size_t row = 0; row < table->n_rows; row++)
        if (frames->frame[row] != UINT32_MAX)
            frames->rows[at[table->cells[row]]++] = (uint32_t)row;
    free(at);
    return TARRY_OK;
}

bool tarry_data_known(const tarry_data_frames *frames, const double *values, size_t from, size_t to,
                      size_t *first, size_t *last) {
    while (from < to && isnan(values[frames->rows[from]]))
        from++;
    while (to > from && isnan(values[frames->rows[to - 1]]))
        to--;
    *first = from;
    *last = to - 1;
    return from < to;
}

/* Count what is missing of one name in one cell; true where the cell has all. */
static bool count_missing(tarry_data_frames *frames, const double *values, size_t cell) {
    size_t first, last;
    if (!tarry_data_known(frames, values, frames->cell_at[cell], frames->cell_at[cell + 1], &first,
                          &last))
        return false;
    const double span = (double)frames->frame[frames->rows[last]] -
                        (double)frames->frame[frames->rows[first]] + 1.0;
    double known = 0.0;
    uint32_t next = frames->frame[frames->rows[first]];
    for (size_t i = first; i <= last; i++) {
        const size_t row = frames->rows[i];
        if (isnan(values[row]))
            continue;
        if (frames->frame[row] != next && frames->gap_row == SIZE_MAX)
            frames->gap_row = row;
        next = frames->frame[row] + 1;
        known += 1.0;
    }
    frames->expected += span;
    frames->missing += span - known;
    return known >= (double)frames->n_frames;
}

static void look_at_cells(tarry_data_frames *frames, const tarry_data_table *table) {
    frames->whole = true;
    frames->gap_row = SIZE_MAX;
    for (size_t c = 0; c < frames->n_cells; c++) {
        const uint32_t first = frames->frame[frames->rows[frames->cell_at[c]]];
        const uint32_t last = frames->frame[frames->rows[frames->cell_at[c + 1] - 1]];
        if (last - first + 1 > frames->longest)
            frames->longest = last - first + 1;
        for (size_t k = 0; k < table->n_names; k++)
            if (!count_missing(frames, table->values[k], c))
                frames->whole = false;
    }
}

/* ---- the whole ------------------------------------------------------------------------------- */

int tarry_data_frames_find(tarry_data_frames *frames, const tarry_data_table *table,
                           const tarry_data_options *options, tarry_error *error) {
    *frames = (tarry_data_frames){0};
    frames->frame = tarry_calloc(table->n_rows, sizeof *frames->frame);
    frames->rows = tarry_calloc(table->n_rows, sizeof *frames->rows);
    double *last = tarry_calloc(table->n_cells, sizeof *last);
    double *differences = tarry_calloc(MOST_DIFFERENCES + 1, sizeof *differences);
    int code = TARRY_OK;
    if (frames->frame == NULL || frames->rows == NULL || last == NULL || differences == NULL)
        code = tarry_fail_memory(error, "the frames of the data");
    if (code == TARRY_OK)
        code = find_interval(frames, table, options, last, differences, error);
    if (code == TARRY_OK)
        code = put_to_frames(frames, table, options, last, error);
    free(last);
    free(differences);
    if (code == TARRY_OK)
        code = sort_by_cell(frames, table, error);
    if (code == TARRY_OK)
        look_at_cells(frames, table);
    return code;
}

void tarry_data_frames_release(tarry_data_frames *frames) {
    free(frames->frame);
    free(frames->rows);
    free(frames->cell_at);
    free(frames->cell);
    *frames = (tarry_data_frames){0};
}
