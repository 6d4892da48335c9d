/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Files of measured lags, read for a model: an answer with words and a line, or shares that add up
 * to 1 on values that ascend. */

#include "fuzz.h"

#include "model/model.h"
#include "tarry/tarry.h"

#include <math.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <unistd.h>

/* The bytes in a file without a name that stays open; its path below /dev/fd. */
static FILE *put(const uint8_t *data, size_t size, char path[64]) {
    FILE *file = tmpfile();
    if (file == NULL || fwrite(data, 1, size, file) != size || fflush(file) != 0)
        abort();
    snprintf(path, 64, "/proc/self/fd/%d", fileno(file));
    return file;
}

static void check_law(const tarry_law *law) {
    const size_t n_points = law->n + (law->kind == TARRY_LAW_BINS);
    double sum = 0;
    fuzz_must(law->kind == TARRY_LAW_BINS || law->kind == TARRY_LAW_VALUES, "a table is one");
    for (size_t i = 0; i < law->n; i++)
        sum += law->weights[i];
    fuzz_must(fabs(sum - 1) < 1e-9, "shares add up to 1");
    for (size_t i = 1; i < n_points; i++)
        fuzz_must(law->points[i] > law->points[i - 1], "values ascend");
    fuzz_must(law->points[0] >= 0, "lags are not negative");
}

int fuzz_table(const uint8_t *data, size_t size) {
    char path[64], text[512];
    FILE *file = put(data, size, path);
    tarry_model *model = NULL;
    tarry_error error = {0};
    snprintf(
        text, sizeof text,
        "tarry: 1\ntime: min\ndelays: {d: {table: {file: %s}}}\n"
        "genes: {vela: {promoter: {on: {initiates: 1}}, transcript: {stages: {n: d}, decay: 1}}}\n"
        "run: {until: 10, every: 1}\n",
        path);
    tarry_start();
    if (tarry_model_read_text(text, strlen(text), "m.yaml", NULL, 0, &model, &error) != 0) {
        fuzz_must(error.message[0] != '\0' && error.line > 0, "an error has words and a line");
    } else {
        check_law(&model->network.segments[0].laws[0]);
        tarry_model_free(model);
    }
    fclose(file);
    return 0;
}
