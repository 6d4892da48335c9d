/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_REPORT_SUMMARY_H
#define TARRY_REPORT_SUMMARY_H

/* summary.json: what was found, the same bytes however the work was divided. run.json: how. */

#include "base/file.h"
#include "base/text.h"
#include "tarry/write.h"

/* A file of the run as summary.json lists it. `digest` is "" where the bytes may differ between
 * runs of the same model (run.json): then neither size nor SHA-256 is listed. */
typedef struct tarry_listed_file {
    const char *name;
    size_t size;
    char digest[TARRY_SHA256_TEXT];
} tarry_listed_file;

int tarry_summary_write(const tarry_model *model, const tarry_results *results,
                        const tarry_provenance *provenance, const tarry_listed_file *files,
                        size_t n_files, tarry_text *text, tarry_error *error);

int tarry_summary_write_run(const tarry_provenance *provenance, tarry_text *text,
                            tarry_error *error);

#endif
