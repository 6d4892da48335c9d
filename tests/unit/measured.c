/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "measured.h"

#include "support.h"

#include <math.h>
#include <stdio.h>

enum { MOST_OPTIONS = 16 };

int measured_file(measured *m, const char *path, const char *const *options) {
    tarry_override settings[MOST_OPTIONS];
    size_t n = 0;
    *m = (measured){0};
    for (; options[2 * n] && n < MOST_OPTIONS; n++)
        settings[n] = (tarry_override){
            .option = options[2 * n], .name = options[2 * n] + 2, .value = options[2 * n + 1]};
    int code = tarry_data_read(path, settings, n, &m->data, &m->error);
    if (!code) {
        const tarry_measure_options how = {.threads = 1};
        code = tarry_measure(m->data, &how, &m->results, &m->error);
    }
    return code;
}

int measured_try(measured *m, const char *text, const char *const *options) {
    const char *path = test_path("data.csv");
    FILE *file = fopen(path, "wb"); /* without the flush to disk of base/file */
    ck_assert_ptr_nonnull(file);
    ck_assert_int_ge(fputs(text, file), 0);
    ck_assert_int_eq(fclose(file), 0);
    return measured_file(m, path, options);
}

void measured_release(measured *m) {
    tarry_results_free(m->results);
    tarry_data_free(m->data);
    *m = (measured){0};
}

void measured_pass(measured *m, const char *text, const char *const *options) {
    const int code = measured_try(m, text, options);
    ck_assert_msg(code == TARRY_OK, "%s", m->error.message);
}

void measured_row(tarry_text *text, size_t cell, double time, const double *values, size_t n) {
    tarry_text_printf(text, "%zu,", cell);
    tarry_text_add_number(text, time);
    for (size_t i = 0; i < n; i++) {
        tarry_text_add_string(text, ",");
        if (isnan(values[i]))
            tarry_text_add_string(text, "NaN");
        else
            tarry_text_add_number(text, values[i]);
    }
    tarry_text_add_string(text, "\n");
    ck_assert(!text->failed);
}
