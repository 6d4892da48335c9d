#ifndef TARRY_WRITE_H
#define TARRY_WRITE_H

/* Results as files and as text. */

#include <stdbool.h>
#include "tarry/error.h"
#include "tarry/model.h"
#include "tarry/results.h"

/* What summary.json and run.json say about how the results came about. */
typedef struct tarry_provenance {
    const char *sampler;
    const tarry_override *overrides; /* as given on the command line */
    size_t n_overrides;
    long long keep;
    double seconds;
    int threads;
    bool partial; /* interrupted */
} tarry_provenance;

/* Refuse a folder that exists and is not empty (TARRY_INPUT), unless `overwrite`; to be asked
 * before simulating. Creates nothing. */
int tarry_write_check(const char *folder, bool overwrite, tarry_error *error);

/* Write every file of a run into `folder` (made where missing). With `overwrite` the old
 * summary.json goes first, then the files that it named are replaced, and those that this run does
 * not write are removed. summary.json comes last. */
int tarry_write_run(const char *folder, bool overwrite, const tarry_model *model,
                    const tarry_results *results, const tarry_provenance *provenance,
                    tarry_error *error);

/* The table per gene as NUL-ended text of at most `width` columns, to be freed with free(). */
int tarry_write_summary_table(const tarry_model *model, const tarry_results *results, int width,
                              char **text, tarry_error *error);

#endif
