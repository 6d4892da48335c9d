/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Results -> files and text. Files are read back by what is not ours: jansson's parser, sha256sum
 * of the system, strtod of the C library. Expected texts are written out by hand. */
#include "base/file.h"
#include "base/table.h"
#include "model/model.h"
#include "report/json.h"
#include "report/lines.h"
#include "report/notes_list.h"
#include "report/rounding.h"
#include "tally/results.h"
#include "tarry/tarry.h"

#include "faults.h"
#include "support.h"

#include <errno.h>
#include <math.h>
#include <signal.h>
#include <stdio.h>
#include <stdlib.h>
#include <string.h>
#include <sys/resource.h>
#include <sys/stat.h>
#include <unistd.h>

static char model_text[] = "tarry: 1\ntitle: \"Tab\\tand \\u00e4\"\n";

static const char long_name[] = "a_plain_species_whose_name_is_so_long_that_it_needs_a_line";

/* A model as the writers see it: names, a plan, one gene with two alleles. */
static void fill_model(tarry_model *model, uint32_t n_windows) {
    static const double snapshots[] = {0, 600};
    static const tarry_window windows[] = {
        {.name = "before", .from = 0, .to = 60},
        {.name = "after", .from = 120, .to = 600},
    };
    static const tarry_window all = {.name = "all", .from = 0, .to = 600};
    static const tarry_gene genes[] = {{.name = "vela", .n_copies = 2}};
    static const tarry_species species[] = {{.name = "vela.open", .role = TARRY_SPECIES_STATE},
                                            {.name = "clasp", .role = TARRY_SPECIES_PLAIN},
                                            {.name = long_name, .role = TARRY_SPECIES_PLAIN}};
    memset(model, 0, sizeof *model);
    model->text = model_text;
    model->text_size = strlen(model_text);
    model->file = "some/where/vela.yaml";
    tarry_network *network = &model->network;
    network->title = "A title";
    network->time_unit = "min";
    network->n_genes = 1;
    network->genes = genes;
    network->n_species = 3;
    network->species = species;
    network->run = (tarry_run_plan){
        .cells = 200,
        .seed = 7,
        .settle = 2880,
        .until = 600,
        .every = 0.1,
        .n_frames = 6001,
        .n_lags = 11,
        .n_snapshots = 2,
        .snapshots = snapshots,
        .n_windows = n_windows,
        .windows = n_windows > 1 ? windows : &all,
    };
}

static void add_burst(tarry_results *results, const char *gene, const char *window,
                      const char *quantity, const char *unit, double value, double low, double high,
                      double samples) {
    ck_assert_int_eq(tarry_table_add(results->tables[TARRY_TABLE_bursts], NULL, gene, window,
                                     quantity, unit, value, low, high, samples),
                     0);
}

static void add_mean(tarry_results *results, const char *name, double time, double mean) {
    ck_assert_int_eq(tarry_table_add(results->tables[TARRY_TABLE_means], NULL, name, time, mean,
                                     2.5, 0.25, 0.125, 1.5, NAN, 0.1, NAN),
                     0);
}

static void add_first(tarry_results *results, double step, double time, double survival, double low,
                      double high) {
    ck_assert_int_eq(tarry_table_add(results->tables[TARRY_TABLE_first], NULL, "vela initiation",
                                     step, time, survival, low, high),
                     0);
}

/* Two steps with 16 after each. After the first three quarters respond, half of them all but at 4,
 * in the bin from 3.9375; after the second none. */
static void add_firsts(tarry_results *results) {
    add_first(results, 60, 0, 1, 1, 1);
    add_first(results, 60, 2, 0.75, 0.6, 0.85);
    add_first(results, 60, 4, 0.25, 0.1, 0.4);
    add_first(results, 60, 16, 0.25, 0.1, 0.4);
    add_first(results, 76, 0, 1, 1, 1);
    add_first(results, 76, 16, 1, 0.98, 1);
}

static tarry_results *make_results(void) {
    tarry_results *results = NULL;
    ck_assert_int_eq(tarry_results_new(&results, NULL), 0);
    results->n_cells = results->n_cells_asked = 200;
    results->firings = 123456789;
    results->completions = 0x1p53;
    add_burst(results, "vela", "all", "burst_frequency", "/min", 0.1, 0.095, 0.1 + 0.2, 12);
    add_burst(results, "vela", "all", "burst_size_mean", "", 1.0 / 3, NAN, NAN, 5000);
    add_burst(results, "vela", "all", "nascent_mean", "", 4.25, 4.0, 4.5, 200);
    add_mean(results, "clasp", 0, 14);
    add_mean(results, "clasp", 300, 11);
    add_mean(results, "clasp", 600, 9.75);
    add_firsts(results);
    return results;
}

static const tarry_provenance provenance = {
    .sampler = "direct", .keep = 1, .seconds = 1.5, .threads = 2};

static char *read_file(const char *folder, const char *name, size_t *size) {
    char path[2048];
    snprintf(path, sizeof path, "%s/%s", folder, name);
    FILE *file = fopen(path, "rb");
    ck_assert_msg(file != NULL, "%s is missing", path);
    char *bytes = malloc(1 << 20);
    *size = fread(bytes, 1, (1 << 20) - 1, file);
    bytes[*size] = '\0';
    ck_assert_int_eq(fclose(file), 0);
    return bytes;
}

static bool is_there(const char *folder, const char *name) {
    char path[2048];
    snprintf(path, sizeof path, "%s/%s", folder, name);
    return access(path, F_OK) == 0;
}

static void put_file(const char *folder, const char *name, const char *content) {
    char path[2048];
    snprintf(path, sizeof path, "%s/%s", folder, name);
    FILE *file = fopen(path, "wb");
    ck_assert_ptr_nonnull(file);
    fputs(content, file);
    ck_assert_int_eq(fclose(file), 0);
}

static json_t *read_json(const char *folder, const char *name) {
    char path[2048];
    json_error_t error;
    snprintf(path, sizeof path, "%s/%s", folder, name);
    json_t *json = json_load_file(path, JSON_REJECT_DUPLICATES, &error);
    ck_assert_msg(json != NULL, "%s line %d: %s", path, error.line, error.text);
    return json;
}

static void write_ok(const char *folder, bool overwrite, const tarry_results *results) {
    tarry_model model;
    tarry_error error = {0};
    fill_model(&model, 1);
    ck_assert_msg(tarry_write_run(folder, overwrite, &model, results, &provenance, &error) == 0,
                  "%s", error.message);
}

START_TEST(test_csv) {
    const char *folder = test_path("out");
    tarry_results *results = make_results();
    write_ok(folder, false, results);
    size_t size;
    char *bytes = read_file(folder, "bursts.csv", &size);
    /* 0.1 + 0.2 is the double 0.30000000000000004: its shortest digits (IEEE 754). */
    ck_assert_str_eq(bytes, "gene,window,quantity,unit,value,low,high,samples\n"
                            "vela,all,burst_frequency,/min,0.1,0.095,0.30000000000000004,12\n"
                            "vela,all,burst_size_mean,,0.3333333333333333,,,5000\n"
                            "vela,all,nascent_mean,,4.25,4,4.5,200\n");
    free(bytes);
    ck_assert(!is_there(folder, "signals.csv")); /* no rows: no file */
    tarry_results_free(results);
}
END_TEST

static double figure(const json_t *summary, const char *quantity, const char *field) {
    const json_t *value = NULL;
    const json_t *gene = json_object_get(json_object_get(summary, "genes"), "vela");
    value = json_object_get(json_object_get(json_object_get(gene, "all"), quantity), field);
    ck_assert_msg(value != NULL, "%s %s is missing", quantity, field);
    return json_is_null(value) ? NAN : json_number_value(value);
}

static double response(const json_t *list, size_t i, const char *figure_name, const char *end) {
    const json_t *of = json_object_get(json_array_get(list, i), figure_name);
    const json_t *number = json_object_get(of, end);
    ck_assert_ptr_nonnull(number);
    return json_is_null(number) ? NAN : json_number_value(number);
}

START_TEST(test_summary) {
    const char *folder = test_path("out");
    tarry_results *results = make_results();
    tarry_error error = {0};
    tarry_model model;
    const tarry_override overrides[] = {{"--set", 1, "k_open", "0.1 /min"},
                                        {"--cells", 0, "cells", "20\xff"}};
    tarry_provenance told = provenance;
    told.overrides = overrides;
    told.n_overrides = 2;
    fill_model(&model, 2);
    ck_assert_int_eq(tarry_write_run(folder, false, &model, results, &told, &error), 0);
    json_t *summary = read_json(folder, "summary.json");

    ck_assert_str_eq(json_string_value(json_object_get(summary, "tarry")), TARRY_VERSION);
    ck_assert_str_eq(json_string_value(json_object_get(summary, "status")), "complete");
    ck_assert_int_eq(json_integer_value(json_object_get(summary, "seed")), 7);
    ck_assert_int_eq(json_integer_value(json_object_get(summary, "cells")), 200);
    ck_assert(json_number_value(json_object_get(summary, "completions")) == 0x1p53);
    const json_t *options = json_object_get(summary, "options");
    ck_assert_uint_eq(json_array_size(options), 2);
    ck_assert_str_eq(json_string_value(json_object_get(json_array_get(options, 0), "value")),
                     "0.1 /min");
    ck_assert_str_eq(json_string_value(json_object_get(json_array_get(options, 1), "value")),
                     "20?");
    const json_t *run = json_object_get(summary, "run");
    ck_assert(json_number_value(json_object_get(run, "every")) == 0.1);
    ck_assert(json_number_value(json_object_get(run, "lags")) == 1);
    ck_assert_uint_eq(json_array_size(json_object_get(run, "windows")), 2);
    const json_t *text = json_object_get(json_object_get(summary, "model"), "text");
    ck_assert_str_eq(json_string_value(text), model_text);
    const json_t *file = json_object_get(json_object_get(summary, "model"), "file");
    ck_assert_str_eq(json_string_value(file), "vela.yaml");

    ck_assert(figure(summary, "burst_frequency", "value") == 0.1);
    ck_assert(figure(summary, "burst_frequency", "high") == 0.1 + 0.2);
    ck_assert(figure(summary, "burst_size_mean", "value") == 1.0 / 3);
    ck_assert(isnan(figure(summary, "burst_size_mean", "low")));
    ck_assert(figure(summary, "nascent_mean", "samples") == 200);
    const json_t *clasp = json_object_get(json_object_get(summary, "species"), "clasp");
    ck_assert_uint_eq(json_array_size(clasp), 2); /* at 0 and 600, not at the frame of 300 */
    ck_assert(json_number_value(json_object_get(json_array_get(clasp, 1), "mean")) == 9.75);
    const json_t *first = json_object_get(json_object_get(summary, "first"), "vela initiation");
    ck_assert_uint_eq(json_array_size(first), 2);
    ck_assert(response(first, 0, "responders", "value") == 0.75);
    ck_assert(response(first, 0, "responders", "low") == 0.6);
    ck_assert(response(first, 0, "responders", "high") == 0.9);
    ck_assert_double_eq_tol(response(first, 0, "median", "value"), 3.96875, 1e-12);
    ck_assert_double_eq_tol(response(first, 0, "median", "low"), 3.95, 1e-12);
    ck_assert_double_eq_tol(response(first, 0, "median", "high"), 3.9375 + 0.0625 * 7 / 9, 1e-12);
    ck_assert(response(first, 1, "responders", "value") == 0);
    ck_assert(isnan(response(first, 1, "median", "value")));
    json_decref(summary);

    size_t size;
    char *bytes = read_file(folder, "summary.json", &size);
    ck_assert_ptr_nonnull(strstr(bytes, "\"value\": 0.1,")); /* not 0.10000000000000001 */
    free(bytes);
    tarry_results_free(results);
}
END_TEST

/* What sha256sum of the system says of a file. */
static void system_digest(const char *folder, const char *name, char out[65]) {
    char command[2200];
    snprintf(command, sizeof command, "sha256sum '%s/%s'", folder, name);
    FILE *pipe = popen(command, "r");
    ck_assert_ptr_nonnull(pipe);
    ck_assert_uint_eq(fread(out, 1, 64, pipe), 64);
    out[64] = '\0';
    pclose(pipe);
}

START_TEST(test_digests) {
    const char *folder = test_path("out");
    tarry_results *results = make_results();
    write_ok(folder, false, results);
    json_t *summary = read_json(folder, "summary.json");
    const json_t *files = json_object_get(summary, "files");
    char digest[65];
    ck_assert_uint_eq(json_array_size(files), 5); /* means, bursts, first, run.json, page */
    for (size_t i = 0; i < json_array_size(files); i++) {
        const json_t *file = json_array_get(files, i);
        const char *name = json_string_value(json_object_get(file, "name"));
        size_t size;
        free(read_file(folder, name, &size));
        if (!strcmp(name, "run.json")) {
            ck_assert_ptr_null(json_object_get(file, "sha256"));
            continue;
        }
        ck_assert_uint_eq((size_t)json_integer_value(json_object_get(file, "size")), size);
        system_digest(folder, name, digest);
        ck_assert_str_eq(json_string_value(json_object_get(file, "sha256")), digest);
    }
    put_file(folder, "model.txt", model_text);
    system_digest(folder, "model.txt", digest);
    const json_t *model = json_object_get(summary, "model");
    ck_assert_str_eq(json_string_value(json_object_get(model, "sha256")), digest);
    json_decref(summary);
    tarry_results_free(results);
}
END_TEST

START_TEST(test_same_bytes) {
    tarry_results *results = make_results();
    tarry_model model;
    tarry_provenance other = provenance;
    fill_model(&model, 1);
    other.threads = 64;
    other.seconds = 1e6;
    ck_assert_int_eq(tarry_write_run(test_path("a"), false, &model, results, &provenance, NULL), 0);
    ck_assert_int_eq(tarry_write_run(test_path("b"), false, &model, results, &other, NULL), 0);
    size_t size, other_size;
    char *bytes = read_file(test_path("a"), "summary.json", &size);
    char *other_bytes = read_file(test_path("b"), "summary.json", &other_size);
    ck_assert_uint_eq(size, other_size);
    ck_assert_mem_eq(bytes, other_bytes, size);
    free(bytes);
    free(other_bytes);
    json_t *run = read_json(test_path("b"), "run.json");
    ck_assert_int_eq(json_integer_value(json_object_get(run, "threads")), 64);
    ck_assert(json_number_value(json_object_get(run, "seconds")) == 1e6);
    char *build = tarry_build();
    ck_assert_str_eq(json_string_value(json_object_get(run, "build")), build);
    free(build);
    json_decref(run);
    tarry_results_free(results);
}
END_TEST

START_TEST(test_partial) {
    tarry_results *results = make_results();
    tarry_model model;
    tarry_provenance partial = provenance;
    char *table = NULL;
    fill_model(&model, 1);
    partial.partial = true;
    results->n_cells = 17;
    ck_assert_int_eq(tarry_write_run(test_path("out"), false, &model, results, &partial, NULL), 0);
    json_t *summary = read_json(test_path("out"), "summary.json");
    ck_assert_str_eq(json_string_value(json_object_get(summary, "status")), "partial");
    ck_assert_int_eq(json_integer_value(json_object_get(summary, "cells")), 17);
    ck_assert_int_eq(json_integer_value(json_object_get(summary, "cells_asked")), 200);
    json_decref(summary);
    ck_assert_int_eq(tarry_write_summary_table(&model, results, 80, &table, NULL), 0);
    ck_assert_ptr_nonnull(strstr(table, "17 cells of 200 (interrupted)"));
    free(table);
    tarry_results_free(results);
}
END_TEST

static int check_code(const char *folder, bool overwrite) {
    tarry_error error = {0};
    const int status = tarry_write_check(folder, overwrite, &error);
    ck_assert_int_eq(status, (int)error.code);
    return status;
}

START_TEST(test_check) {
    const char *folder = test_path("out");
    ck_assert_int_eq(check_code(folder, false), 0);
    ck_assert(!is_there(test_folder(), "out"));
    ck_assert_int_eq(mkdir(folder, 0777), 0);
    ck_assert_int_eq(check_code(folder, false), 0);
    put_file(folder, "notes.txt", "mine");
    ck_assert_int_eq(check_code(folder, false), TARRY_INPUT);
    ck_assert_int_eq(check_code(folder, true), 0);
    ck_assert_int_eq(check_code(test_path("no/such"), false), TARRY_INPUT);
    ck_assert_int_eq(check_code(test_path("out/notes.txt"), true), TARRY_INPUT);
    if (geteuid() != 0) { /* root may write everywhere */
        chmod(folder, 0555);
        ck_assert_int_eq(check_code(test_path("out/below"), false), TARRY_INPUT);
        chmod(folder, 0777);
    }
}
END_TEST

START_TEST(test_overwrite) {
    const char *folder = test_path("out");
    tarry_results *results = make_results();
    results->cells = tarry_table_new("cells", "cell:number time:number clasp:number");
    tarry_table_add(results->cells, NULL, 0.0, 0.0, 14.0);
    write_ok(folder, false, results);
    ck_assert(is_there(folder, "cells.csv"));
    put_file(folder, "notes.txt", "mine");
    tarry_table_free(results->cells);
    results->cells = NULL;

    tarry_model model;
    tarry_error error = {0};
    fill_model(&model, 1);
    ck_assert_int_eq(tarry_write_run(folder, false, &model, results, &provenance, &error),
                     TARRY_INPUT);
    ck_assert(is_there(folder, "cells.csv"));
    results->firings = 5;
    write_ok(folder, true, results);
    ck_assert(!is_there(folder, "cells.csv")); /* named before, not written now */
    ck_assert(is_there(folder, "notes.txt"));
    json_t *summary = read_json(folder, "summary.json");
    ck_assert(json_number_value(json_object_get(summary, "firings")) == 5);
    json_decref(summary);

    put_file(folder, "cells.csv", "not from a run");
    ck_assert_int_eq(check_code(folder, true), TARRY_INPUT);
    ck_assert_int_eq(tarry_write_run(folder, true, &model, results, &provenance, &error),
                     TARRY_INPUT);
    ck_assert(is_there(folder, "summary.json")); /* nothing was touched */
    tarry_results_free(results);
}
END_TEST

/* A summary.json that names what no run writes, or is none, gives nothing away. */
START_TEST(test_foreign_summary) {
    const char *folder = test_path("out");
    tarry_results *results = make_results();
    ck_assert_int_eq(mkdir(folder, 0777), 0);
    put_file(test_folder(), "thesis.txt", "mine");
    put_file(folder, "notes.txt", "mine");
    put_file(folder, "summary.json",
             "{\"tarry\": \"0.1.0\", \"files\": [{\"name\": \"../thesis.txt\"}, "
             "{\"name\": \"notes.txt\"}, {\"name\": 5}, {}]}");
    write_ok(folder, true, results);
    ck_assert(is_there(test_folder(), "thesis.txt"));
    ck_assert(is_there(folder, "notes.txt"));
    put_file(folder, "summary.json", "{\"title\": \"another program's\"}");
    ck_assert_int_eq(check_code(folder, true), TARRY_INPUT);
    put_file(folder, "summary.json", "no JSON at all");
    ck_assert_int_eq(check_code(folder, true), TARRY_INPUT);
    tarry_results_free(results);
}
END_TEST

static void check_nothing_left(const char *folder) {
    static const char *const names[] = {"summary.json",       "run.json",         "bursts.csv",
                                        "means.csv",          "bursts.csv.part0", "means.csv.part0",
                                        "summary.json.part0", "run.json.part0"};
    for (size_t i = 0; i < sizeof names / sizeof *names; i++)
        ck_assert_msg(!is_there(folder, names[i]), "%s was left behind", names[i]);
}

/* Fail each call of one kind in turn: an error comes, and nothing half-made stays. Returns how many
 * there were. */
static long fail_in_turn(const char *folder, fault which, int number, int expected) {
    tarry_model model;
    tarry_results *results = make_results();
    long n = 0;
    fill_model(&model, 1);
    for (;; n++) {
        tarry_error error = {0};
        faults_arm(which, n, number);
        const int status = tarry_write_run(folder, false, &model, results, &provenance, &error);
        const bool struck = faults_struck();
        faults_clear();
        if (!struck) {
            ck_assert_int_eq(status, 0);
            break;
        }
        ck_assert_msg(status == expected, "call %ld: %d %s", n, status, error.message);
        ck_assert_int_eq(status, (int)error.code);
        check_nothing_left(folder);
    }
    ck_assert(is_there(folder, "summary.json"));
    tarry_results_free(results);
    return n;
}

START_TEST(test_faults_of_files) {
    static const fault kinds[] = {FAULT_OPEN, FAULT_WRITE, FAULT_FSYNC, FAULT_CLOSE, FAULT_RENAME};
    const fault which = kinds[_i];
    ck_assert_int_ge(fail_in_turn(test_path("out"), which, ENOSPC, TARRY_FILE), 4); /* four files */
}
END_TEST

/* Each file is flushed before it gets its name, and the names before summary.json gets its own. */
START_TEST(test_names_are_flushed) {
    const long n_files = fail_in_turn(test_path("out"), FAULT_RENAME, EIO, TARRY_FILE);
    ck_assert_int_eq(fail_in_turn(test_path("other"), FAULT_FSYNC, EIO, TARRY_FILE), n_files + 1);
}
END_TEST

START_TEST(test_faults_of_memory) {
    ck_assert_int_ge(fail_in_turn(test_path("out"), FAULT_MEMORY, 0, TARRY_MEMORY), 10);
}
END_TEST

/* jansson's own allocations, which the faults above do not reach. */
static long allocations_left;

static void *failing_malloc(size_t size) {
    return allocations_left-- == 0 ? NULL : malloc(size);
}

START_TEST(test_faults_of_json) {
    tarry_model model;
    tarry_results *results = make_results();
    const char *folder = test_path("out");
    fill_model(&model, 1);
    long n = 0;
    for (;; n++) {
        json_set_alloc_funcs(failing_malloc, free);
        allocations_left = n;
        const int status = tarry_write_run(folder, false, &model, results, &provenance, NULL);
        json_set_alloc_funcs(malloc, free);
        if (allocations_left >= 0) {
            ck_assert_int_eq(status, 0);
            break;
        }
        ck_assert_int_eq(status, TARRY_MEMORY);
        check_nothing_left(folder);
    }
    ck_assert_int_ge(n, 100);
    tarry_results_free(results);
}
END_TEST

/* A disk that is full, played by the limit on a file's size: means.csv fits, summary.json does not.
 */
START_TEST(test_full_disk) {
    tarry_model model;
    tarry_results *results = make_results();
    tarry_error error = {0};
    struct rlimit limit;
    const char *folder = test_path("out");
    fill_model(&model, 1);
    ck_assert_int_eq(getrlimit(RLIMIT_FSIZE, &limit), 0);
    const rlim_t before = limit.rlim_cur;
    signal(SIGXFSZ, SIG_IGN);
    limit.rlim_cur = 1024;
    ck_assert_int_eq(setrlimit(RLIMIT_FSIZE, &limit), 0);
    const int status = tarry_write_run(folder, false, &model, results, &provenance, &error);
    limit.rlim_cur = before;
    ck_assert_int_eq(setrlimit(RLIMIT_FSIZE, &limit), 0);
    ck_assert_int_eq(status, TARRY_FILE);
    ck_assert_ptr_nonnull(strstr(error.message, strerror(EFBIG)));
    check_nothing_left(folder);
    write_ok(folder, false, results);
    tarry_results_free(results);
}
END_TEST

/* Common practice, no source: two digits of half the interval. */
START_TEST(test_rounding) {
    static const struct {
        double value, low, high;
        const char *text, *low_text, *high_text;
    } cases[] = {
        {0.035912, 0.035412, 0.036412, "0.03591", "0.03541", "0.03641"},
        {17.1234, 16.9, 17.3, "17.12", "16.90", "17.30"},
        {12345.678, 12000.1, 12700.9, "12346", "12000", "12701"},
        {1e-6, 0.9e-6, 1.1e-6, "1.00e-06", "9.0e-07", "1.10e-06"},
        {1.0 / 3, NAN, NAN, "0.3333", "", ""},
        {4, 4, 4, "4", "4", "4"},
        {NAN, NAN, NAN, "-", "", ""},
        {-0.0001, -0.02, 0.02, "0.000", "-0.020", "0.020"},
        {3.14159265358979, 3.14159265358, 3.1415926536, "3.141593", "3.141593", "3.141593"},
        {5, -300, 310, "5", "-300", "310"},
    };
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        tarry_rounded rounded;
        tarry_round(cases[i].value, cases[i].low, cases[i].high, TARRY_ROUND_MOST, &rounded);
        ck_assert_str_eq(rounded.value, cases[i].text);
        if (i != 3) { /* bounds take the value's last digit, or its number of digits with powers */
            ck_assert_str_eq(rounded.low, cases[i].low_text);
            ck_assert_str_eq(rounded.high, cases[i].high_text);
        }
    }
}
END_TEST

START_TEST(test_rounding_alone) {
    static const struct {
        double value;
        const char *text;
    } cases[] = {
        {0.09999996, "0.1000"}, {0.0999949, "0.09999"}, {2.3333333, "2.333"}, {4, "4"},  {0, "0"},
        {123456.7, "123457"},   {1e-7, "1.000e-07"},    {3.5e9, "3.500e+09"}, {NAN, "-"}};
    for (size_t i = 0; i < sizeof cases / sizeof *cases; i++) {
        char text[TARRY_ROUNDED];
        tarry_round_plain(cases[i].value, text);
        ck_assert_str_eq(text, cases[i].text);
    }
}
END_TEST

static void check_width(const char *text, int width) {
    for (const char *at = text; *at;) {
        int n = 0;
        for (; *at && *at != '\n'; at++)
            n += ((unsigned char)*at & 0xc0) != 0x80;
        ck_assert_int_le(n, width);
        at += *at == '\n';
    }
}

START_TEST(test_table) {
    tarry_model model;
    tarry_results *results = make_results();
    char *table = NULL;
    fill_model(&model, 1);
    add_mean(results, long_name, 600, 5);
    ck_assert_int_eq(tarry_notes_add(&results->notes, (tarry_place){0}, NULL,
                                     "A note that is long enough to be broken into two lines, "
                                     "since %d characters do not fit into one",
                                     100),
                     0);
    ck_assert_int_eq(tarry_write_summary_table(&model, results, 80, &table, NULL), 0);
    check_width(table, 80);
    ck_assert_ptr_nonnull(strstr(table, "vela (2 alleles)"));
    ck_assert_ptr_nonnull(strstr(table, "0.10*  0.10 to 0.30")); /* 12 periods only */
    ck_assert_ptr_nonnull(strstr(table, "4.25  4.00 to 4.50"));
    ck_assert_ptr_nonnull(strstr(table, "\n- A note that"));
    ck_assert_ptr_nonnull(strstr(table, "  clasp "));
    ck_assert_ptr_null(strstr(table, "vela.open"));
    ck_assert_ptr_nonnull(strstr(table, "vela initiation           60    0.75 0.60 to 0.90"));
    ck_assert_ptr_nonnull(strstr(table, "   3.969 3.950 to 3.986\n"));
    ck_assert_ptr_nonnull(strstr(table, "vela initiation           76"));
    free(table);
    tarry_results_free(results);
}
END_TEST

START_TEST(test_faults_of_table) {
    tarry_model model;
    tarry_results *results = make_results();
    char *table = NULL;
    long n = 0;
    fill_model(&model, 1);
    for (;; n++) {
        tarry_error error = {0};
        faults_arm(FAULT_MEMORY, n, 0);
        const int status = tarry_write_summary_table(&model, results, 80, &table, &error);
        const bool struck = faults_struck();
        faults_clear();
        if (!struck) {
            ck_assert_int_eq(status, 0);
            break;
        }
        ck_assert_int_eq(status, TARRY_MEMORY);
        ck_assert_int_eq((int)error.code, TARRY_MEMORY);
        ck_assert_ptr_null(table);
    }
    ck_assert_int_ge(n, 10);
    free(table);
    tarry_results_free(results);
}
END_TEST

START_TEST(test_table_of_windows) {
    tarry_model model;
    tarry_results *results = make_results();
    char *table = NULL;
    fill_model(&model, 2);
    add_burst(results, "vela", "before", "initiation_rate", "/min", 3.25, 3.0, 3.5, 200);
    add_burst(results, "vela", "after", "initiation_rate", "/min", 31.25, 31.0, 31.5, 200);
    ck_assert_int_eq(tarry_write_summary_table(&model, results, 80, &table, NULL), 0);
    check_width(table, 80);
    const char *before = strstr(table, "3.25 3.00 to 3.50");
    const char *after = strstr(table, "31.25 31.00 to 31.50");
    ck_assert_ptr_nonnull(before);
    ck_assert_ptr_nonnull(after);
    ck_assert_ptr_null(memchr(before, '\n', (size_t)(after - before))); /* side by side */
    free(table);
    tarry_results_free(results);
}
END_TEST

/* Values 1 to 25: median 13, tenths 3.4 and 22.6 (linear between order statistics; Hyndman & Fan
 * 1996, Am. Stat. 50:361, definition 7: 1 + 0.1 * 24 and 1 + 0.9 * 24). */
START_TEST(test_table_of_many_genes) {
    tarry_model model;
    tarry_results *results = NULL;
    char *table = NULL, name[16], line[128];
    fill_model(&model, 1);
    ck_assert_int_eq(tarry_results_new(&results, NULL), 0);
    for (int i = 25; i >= 1; i--) {
        snprintf(name, sizeof name, "vela_%d", i);
        add_burst(results, name, "all", "burst_size_mean", "", i, i - 0.5, i + 0.5, 200);
        add_burst(results, name, "all", "silent_fraction", "", i == 9, NAN, NAN, 200);
    }
    ck_assert_int_eq(tarry_write_summary_table(&model, results, 80, &table, NULL), 0);
    check_width(table, 80);
    ck_assert_ptr_null(strstr(table, "vela_7"));
    snprintf(line, sizeof line, "%-35s%22s%22s\n", "  burst_size_mean", "vela_1", "vela_25");
    ck_assert_ptr_nonnull(strstr(table, line));
    snprintf(line, sizeof line, "%-35s%22s%22s\n", "  silent_fraction", "24 alike", "vela_9");
    ck_assert_ptr_nonnull(strstr(table, line));
    snprintf(line, sizeof line, "%9s%9s%9s%9s%9s\n", "13", "3.400", "22.60", "1", "25");
    ck_assert_ptr_nonnull(strstr(table, line));
    free(table);
    tarry_results_free(results);
}
END_TEST

START_TEST(test_lines) {
    tarry_text text = {0};
    tarry_lines_left(&text, "\xc3\xa4\x1b[1m", 8); /* an umlaut is one character, no control */
    tarry_lines_right(&text, "ab", 4);
    ck_assert_str_eq(text.data, "\xc3\xa4?[1m     ab");
    tarry_text_release(&text);
    tarry_lines_wrap(&text, "- ", "one two  three averyverylongword", 10);
    ck_assert_str_eq(text.data, "- one two\n  three\n  averyverylongword\n");
    tarry_text_release(&text);
}
END_TEST

START_TEST(test_notes) {
    static const char *const notes[] = {"a, window w1: too short", "of another form",
                                        "b, window w1: too short", "c, window w2: too short"};
    tarry_results *results = NULL;
    tarry_text text = {0};
    ck_assert_int_eq(tarry_results_new(&results, NULL), 0);
    for (size_t i = 0; i < sizeof notes / sizeof *notes; i++)
        ck_assert_int_eq(tarry_notes_add(&results->notes, (tarry_place){0}, NULL, "%s", notes[i]),
                         0);
    tarry_notes_list(results, 80, &text);
    ck_assert_str_eq(text.data, "- a, b, window w1: too short\n- of another form\n"
                                "- c, window w2: too short\n");
    tarry_text_release(&text);
    tarry_results_free(results);
}
END_TEST

/* JSON texts that come back the same through jansson's parser. */
/* Of more than twelve notes on single genes the first three stand for all. */
START_TEST(test_many_notes) {
    tarry_results *results = NULL;
    tarry_text text = {0};
    ck_assert_int_eq(tarry_results_new(&results, NULL), 0);
    for (int i = 0; i < 13; i++)
        ck_assert_int_eq(tarry_notes_add(&results->notes, (tarry_place){0}, NULL,
                                         "vela_%d, window all: %d periods", i, i),
                         0);
    ck_assert_int_eq(tarry_notes_add(&results->notes, (tarry_place){0}, NULL, "of the run"), 0);
    tarry_notes_list(results, 80, &text);
    ck_assert_str_eq(text.data,
                     "- vela_0, window all: 0 periods\n- vela_1, window all: 1 periods\n"
                     "- vela_2, window all: 2 periods\n- of the run\n"
                     "- 10 more notes of these kinds are under `warnings` in summary.json\n");
    tarry_text_release(&text);
    tarry_results_free(results);
}
END_TEST

START_TEST(test_json) {
    const double numbers[] = {0.1, 1e300, 5e-324, -0.0, 123456789012345680.0, 1.0 / 3};
    bool failed = false;
    tarry_text text = {0};
    json_t *list = json_array();
    for (size_t i = 0; i < sizeof numbers / sizeof *numbers; i++)
        tarry_json_append(list, tarry_json_number(numbers[i]), &failed);
    tarry_json_append(list, tarry_json_number(INFINITY), &failed);
    tarry_json_append(list, tarry_json_text("quote \" back \\ tab \t end"), &failed);
    tarry_json_append(list, json_object(), &failed);
    tarry_json_append(list, json_true(), &failed);
    ck_assert(!failed);
    tarry_json_write(list, 0, &text);
    json_t *back = json_loads(text.data, 0, NULL);
    ck_assert_ptr_nonnull(back);
    for (size_t i = 0; i < sizeof numbers / sizeof *numbers; i++)
        ck_assert(json_number_value(json_array_get(back, i)) == numbers[i]);
    ck_assert(json_is_null(json_array_get(back, 6)));
    ck_assert_str_eq(json_string_value(json_array_get(back, 7)), "quote \" back \\ tab \t end");
    ck_assert_int_eq(strncmp(text.data, "[\n  0.1,\n  1e300,", 17), 0);
    json_decref(list);
    json_decref(back);
    tarry_text_release(&text);
}
END_TEST

int main(void) {
    Suite *suite = suite_create("report");
    TCase *tests = tcase_create("report");
    tcase_set_timeout(tests, 60);
    tcase_add_test(tests, test_csv);
    tcase_add_test(tests, test_summary);
    tcase_add_test(tests, test_digests);
    tcase_add_test(tests, test_same_bytes);
    tcase_add_test(tests, test_partial);
    tcase_add_test(tests, test_check);
    tcase_add_test(tests, test_overwrite);
    tcase_add_test(tests, test_foreign_summary);
    tcase_add_loop_test(tests, test_faults_of_files, 0, 5);
    tcase_add_test(tests, test_names_are_flushed);
    tcase_add_test(tests, test_faults_of_memory);
    tcase_add_test(tests, test_faults_of_json);
    tcase_add_test(tests, test_full_disk);
    tcase_add_test(tests, test_rounding);
    tcase_add_test(tests, test_rounding_alone);
    tcase_add_test(tests, test_table);
    tcase_add_test(tests, test_faults_of_table);
    tcase_add_test(tests, test_table_of_windows);
    tcase_add_test(tests, test_table_of_many_genes);
    tcase_add_test(tests, test_lines);
    tcase_add_test(tests, test_notes);
    tcase_add_test(tests, test_many_notes);
    tcase_add_test(tests, test_json);
    suite_add_tcase(suite, tests);
    SRunner *runner = srunner_create(suite);
    srunner_run_all(runner, CK_ENV);
    const int failed = srunner_ntests_failed(runner);
    srunner_free(runner);
    return failed;
}
