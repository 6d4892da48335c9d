/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Files of laboratory data: an answer with words and the file's name, or columns whose cells and
 * frames fit one another, and figures of them. */

#include "fuzz.h"

#include "study/data.h"
#include "tarry/tarry.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>

enum { MOST_FRAMES = 500, MOST_NAMES = 4 }; /* more of them are read, and not measured */

static void check_frames(const tarry_data *data) {
    const tarry_data_frames *frames = &data->frames;
    for (size_t c = 0; c < frames->n_cells; c++) {
        fuzz_must(frames->cell_at[c] < frames->cell_at[c + 1], "a cell has rows");
        for (size_t i = frames->cell_at[c]; i < frames->cell_at[c + 1]; i++) {
            const uint32_t row = frames->rows[i];
            fuzz_must(row < data->table.n_rows, "rows are there");
            fuzz_must(data->table.cells[row] == frames->cell[c], "rows are of their cell");
            fuzz_must(frames->frame[row] < frames->n_frames, "frames are there");
            fuzz_must(i == frames->cell_at[c] ||
                          frames->frame[row] > frames->frame[frames->rows[i - 1]],
                      "frames ascend in a cell");
        }
    }
}

static void check_means(const tarry_results *results) {
    const tarry_table *means = tarry_results_table(results, TARRY_TABLE_means);
    const int column = tarry_table_column(means, "mean");
    for (size_t row = 0; row < tarry_table_n_rows(means); row++)
        fuzz_must(!isnan(tarry_table_number(means, row, column)), "each row has a mean");
}

static void measure(const tarry_data *data) {
    const tarry_measure_options options = {.threads = 1, .traced = 2};
    tarry_results *results = NULL;
    tarry_error error = {0};
    if (data->frames.n_frames > MOST_FRAMES || data->table.n_names > MOST_NAMES)
        return;
    if (tarry_measure(data, &options, &results, &error) != 0)
        fuzz_must(error.message[0] != '\0', "an error has words");
    else
        check_means(results);
    tarry_results_free(results);
}

int fuzz_data(const uint8_t *bytes, size_t size) {
    static const tarry_override settings[] = {{"--time", 0, "time", "min"},
                                              {"--gaps", 0, "gaps", "missing"}};
    char path[64];
    FILE *file = tmpfile();
    tarry_data *data = NULL;
    tarry_error error = {0};
    if (file == NULL || fwrite(bytes, 1, size, file) != size || fflush(file) != 0)
        abort();
    snprintf(path, sizeof path, "/proc/self/fd/%d", fileno(file));
    tarry_start();
    /* `gaps` is of traces only: counts and means are read without it. */
    if (tarry_data_read(path, settings, 2, &data, &error) != 0 &&
        tarry_data_read(path, settings, 1, &data, &error) != 0) {
        fuzz_must(error.message[0] != '\0' && error.file[0] != '\0',
                  "an error has words and a file");
    } else {
        check_frames(data);
        measure(data);
        tarry_data_free(data);
    }
    fclose(file);
    return 0;
}
