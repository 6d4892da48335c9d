/* The table that a run prints: per gene the figures of bursts, times and products, then signals,
 * counts at the snapshots, lags in transit and notes. Windows stand side by side as far as the
 * width allows. Above GENES_SHOWN genes their spread is shown instead. */
#include "tarry/write.h"

#include "base/error.h"
#include "base/memory.h"
#include "model/model.h"
#include "report/groups.h"
#include "report/lines.h"
#include "report/rounding.h"
#include "report/snapshots.h"
#include "report/spread.h"

#include <math.h>
#include <stdio.h>
#include <string.h>

enum {
    GENES_SHOWN = 20,
    LINES_SHOWN = 40, /* of the sections after the genes */
    LABEL = 32,
    VALUE = 9,
    COLUMN = 24, /* one window: value, blank, interval */
    FEW = 20,    /* periods, below which an interval is marked */
};

/* Columns of `bursts` and `signals`. */
enum { NAME, WINDOW, QUANTITY, UNIT, FIGURE_VALUE, LOW, HIGH, SAMPLES };

typedef struct table_page {
    tarry_text *text;
    const tarry_network *network;
    const tarry_results *results;
    int width;
    bool marked_few;
} table_page;

typedef struct label {
    const char *quantity;
    const char *words;
} label;

static const label burst_labels[] = {
    {"burst_frequency", "bursts per time"},
    {"burst_size_mean", "initiations a burst, mean"},
    {"burst_size_sd", "initiations a burst, sd"},
    {"silent_fraction", "fraction with no initiation"},
    {"loud_frequency", "loud bursts per time"},
    {"loud_size_mean", "initiations a loud one, mean"},
    {"outside_fraction", "initiations outside bursts"},
    {"initiation_rate", "initiations per time"},
};

static const label time_labels[] = {
    {"active_time_mean", "active, mean"},      {"inactive_time_mean", "inactive, mean"},
    {"interval_mean", "burst to burst, mean"}, {"interval_sd", "burst to burst, sd"},
    {"active_fraction", "fraction active"},
};

/* What may be said of a product or a signal, as endings of a quantity's name. */
static const label moment_labels[] = {
    {"mean", "mean"},        {"sd", "sd"},
    {"fano", "Fano factor"}, {"cv2", "CV squared"},
    {"noise", "noise"},      {"decay_time", "autocorrelation decays in"},
    {"plateau", "plateau"},  {"amplitude", "amplitude"},
};

#define COUNT(array) (sizeof(array) / sizeof *(array))

static const label *find_label(const label *labels, size_t n, const char *quantity) {
    for (size_t i = 0; i < n; i++)
        if (!strcmp(labels[i].quantity, quantity))
            return &labels[i];
    return NULL;
}

/* The part of a quantity before "_mean" and its like, as a length; 0 where it has no such ending.
 */
static size_t product_part(const char *quantity, const label **moment) {
    *moment = NULL;
    const size_t n = strlen(quantity);
    size_t best = 0;
    for (size_t i = 0; i < COUNT(moment_labels); i++) {
        const size_t ending = strlen(moment_labels[i].quantity);
        if (n > ending + 1 && quantity[n - ending - 1] == '_' &&
            !strcmp(quantity + n - ending, moment_labels[i].quantity) && ending > best) {
            best = ending;
            *moment = &moment_labels[i];
        }
    }
    return best ? n - best - 1 : 0;
}

/* Rows of one gene or signal. */
typedef struct figure_rows {
    const tarry_table *table;
    const size_t *rows;
    size_t n;
} figure_rows;

/* The row of a quantity in a window, or the table's size. */
static size_t find_row(const figure_rows *entry, const char *quantity, const char *window) {
    for (size_t i = 0; i < entry->n; i++)
        if (!strcmp(tarry_table_text(entry->table, entry->rows[i], QUANTITY), quantity) &&
            !strcmp(tarry_table_text(entry->table, entry->rows[i], WINDOW), window))
            return entry->rows[i];
    return tarry_table_n_rows(entry->table);
}

static void end_line(table_page *page) {
    tarry_text *text = page->text;
    while (text->size && text->data[text->size - 1] == ' ')
        text->data[--text->size] = '\0';
    tarry_text_add(text, "\n", 1);
}

/* "0.0359  0.0354 to 0.0364": one window's figure. */
static void add_estimate(table_page *page, const figure_rows *entry, size_t row) {
    tarry_rounded rounded;
    char value[TARRY_ROUNDED + 1], interval[2 * TARRY_ROUNDED + 8] = "";
    if (row >= tarry_table_n_rows(entry->table)) {
        tarry_lines_left(page->text, "", COLUMN);
        return;
    }
    tarry_round(tarry_table_number(entry->table, row, FIGURE_VALUE),
                tarry_table_number(entry->table, row, LOW),
                tarry_table_number(entry->table, row, HIGH), &rounded);
    const bool few = tarry_table_number(entry->table, row, SAMPLES) < FEW && rounded.low[0];
    page->marked_few = page->marked_few || few;
    snprintf(value, sizeof value, "%s%s", rounded.value, few ? "*" : "");
    if (rounded.low[0])
        snprintf(interval, sizeof interval, "%s to %s", rounded.low, rounded.high);
    tarry_lines_right(page->text, value, VALUE);
    tarry_text_add(page->text, " ", 1);
    tarry_lines_left(page->text, interval, COLUMN - VALUE - 1);
}

/* Windows from .. to - 1 stand side by side in one block. */
typedef struct window_block {
    uint32_t from, to;
} window_block;

/* What a unit adds to the words: " [/min]" of "/min per allele", nothing where it goes without
 * saying (pure numbers, counts, the signal's own). */
static const char *unit_words(const char *unit, char out[48]) {
    static const char *const dumb[] = {"", "1", "share", "initiations", "molecules", "signal"};
    const char *per = strstr(unit, " per ");
    const int n = per ? (int)(per - unit) : (int)strlen(unit);
    snprintf(out, 48, "%.*s", n < 40 ? n : 40, unit);
    for (size_t i = 0; i < COUNT(dumb); i++)
        if (!strcmp(out, dumb[i]))
            return "";
    snprintf(out, 48, " [%.*s]", n < 40 ? n : 40, unit);
    return out;
}

static void add_figure(table_page *page, const figure_rows *entry, window_block block,
                       const char *words, const char *quantity) {
    const size_t none = tarry_table_n_rows(entry->table);
    const tarry_window *windows = page->network->run.windows;
    const char *unit = NULL;
    char text[160], added[48];
    for (uint32_t w = block.from; w < block.to && !unit; w++) {
        const size_t row = find_row(entry, quantity, windows[w].name);
        if (row < none)
            unit = tarry_table_text(entry->table, row, UNIT);
    }
    if (!unit)
        return;
    snprintf(text, sizeof text, "    %s%s", words, unit_words(unit, added));
    tarry_lines_left(page->text, text, LABEL);
    for (uint32_t w = block.from; w < block.to; w++)
        add_estimate(page, entry, find_row(entry, quantity, windows[w].name));
    end_line(page);
}

static bool has_any(const figure_rows *entry, const label *labels, size_t n) {
    for (size_t i = 0; i < entry->n; i++)
        if (find_label(labels, n, tarry_table_text(entry->table, entry->rows[i], QUANTITY)))
            return true;
    return false;
}

static void add_group(table_page *page, const figure_rows *entry, window_block block,
                      const char *title, const label *labels, size_t n) {
    if (!has_any(entry, labels, n))
        return;
    tarry_text_printf(page->text, "  %s\n", title);
    for (size_t i = 0; i < n; i++)
        add_figure(page, entry, block, labels[i].words, labels[i].quantity);
}

/* Whether an earlier row of the entry has this quantity. */
static bool came_before(const figure_rows *entry, size_t i) {
    const char *quantity = tarry_table_text(entry->table, entry->rows[i], QUANTITY);
    for (size_t j = 0; j < i; j++)
        if (!strcmp(tarry_table_text(entry->table, entry->rows[j], QUANTITY), quantity))
            return true;
    return false;
}

static void add_product(table_page *page, const figure_rows *entry, window_block block,
                        size_t row) {
    const label *moment;
    char words[128];
    const char *quantity = tarry_table_text(entry->table, row, QUANTITY);
    const size_t n = product_part(quantity, &moment);
    if (n)
        snprintf(words, sizeof words, "%.*s %s", (int)(n < 60 ? n : 60), quantity, moment->words);
    else
        snprintf(words, sizeof words, "%s", quantity);
    add_figure(page, entry, block, words, quantity);
}

/* What belongs to no list above: the products of a gene, in the order of the table. */
static void add_products(table_page *page, const figure_rows *entry, window_block block) {
    bool any = false;
    for (size_t i = 0; i < entry->n; i++) {
        const char *quantity = tarry_table_text(entry->table, entry->rows[i], QUANTITY);
        if (find_label(burst_labels, COUNT(burst_labels), quantity) ||
            find_label(time_labels, COUNT(time_labels), quantity) || came_before(entry, i))
            continue;
        if (!any)
            tarry_text_add_string(page->text, "  Molecules in a cell\n");
        any = true;
        add_product(page, entry, block, entry->rows[i]);
    }
}

static void add_head(table_page *page, const char *name, const char *remark, window_block block) {
    const tarry_run_plan *plan = &page->network->run;
    char words[160];
    snprintf(words, sizeof words, "%s%s", name, remark);
    tarry_text_add(page->text, "\n", 1);
    tarry_lines_left(page->text, words, LABEL);
    for (uint32_t w = block.from; w < block.to; w++) {
        tarry_lines_right(page->text, plan->n_windows > 1 ? plan->windows[w].name : "value", VALUE);
        tarry_text_add(page->text, " ", 1);
        tarry_lines_left(page->text, "95 % interval", COLUMN - VALUE - 1);
    }
    end_line(page);
}

/* Windows that fit side by side. */
static uint32_t windows_a_block(const table_page *page) {
    const int fit = (page->width - LABEL) / COLUMN;
    return fit < 1 ? 1 : (uint32_t)fit;
}

static void add_gene(table_page *page, const char *name, const figure_rows *entry) {
    const tarry_network *network = page->network;
    const uint32_t n_windows = network->run.n_windows;
    char remark[48] = "";
    for (uint32_t g = 0; g < network->n_genes; g++)
        if (!strcmp(network->genes[g].name, name) && network->genes[g].n_copies > 1)
            snprintf(remark, sizeof remark, " (%u alleles)", (unsigned)network->genes[g].n_copies);
    for (uint32_t w = 0; w < n_windows; w += windows_a_block(page)) {
        const uint32_t to = w + windows_a_block(page);
        const window_block block = {w, to < n_windows ? to : n_windows};
        add_head(page, name, remark, block);
        add_group(page, entry, block, "Bursts of one allele", burst_labels, COUNT(burst_labels));
        add_group(page, entry, block, "Times of one allele", time_labels, COUNT(time_labels));
        add_products(page, entry, block);
    }
}

static void add_signal(table_page *page, const char *name, const figure_rows *entry) {
    const uint32_t n_windows = page->network->run.n_windows;
    for (uint32_t w = 0; w < n_windows; w += windows_a_block(page)) {
        const uint32_t to = w + windows_a_block(page);
        const window_block block = {w, to < n_windows ? to : n_windows};
        add_head(page, name, " (signal)", block);
        for (size_t i = 0; i < entry->n; i++) {
            const char *quantity = tarry_table_text(entry->table, entry->rows[i], QUANTITY);
            const label *moment;
            if (came_before(entry, i))
                continue;
            if (product_part(quantity, &moment) == 0)
                moment = find_label(moment_labels, COUNT(moment_labels), quantity);
            add_figure(page, entry, block, moment ? moment->words : quantity, quantity);
        }
    }
}

static int add_all(table_page *page, tarry_result_table which, const char *column,
                   void (*add)(table_page *, const char *, const figure_rows *),
                   tarry_error *error) {
    const tarry_table *table = tarry_results_table(page->results, which);
    tarry_groups groups = {0};
    int status = tarry_groups_init(&groups, table, column, error);
    if (!status && groups.n > GENES_SHOWN) {
        status = tarry_spread_write(table, &groups, page->text, error);
    } else if (!status) {
        for (size_t g = 0; g < groups.n; g++) {
            const figure_rows entry = {table, groups.rows + groups.starts[g],
                                       groups.starts[g + 1] - groups.starts[g]};
            add(page, groups.names[g], &entry);
        }
    }
    tarry_groups_release(&groups);
    return status;
}

/* Roles worth a line: promoter states have theirs in the times. */
static bool is_counted(const tarry_network *network, const char *name, bool plain_only) {
    for (uint32_t i = 0; i < network->n_species; i++)
        if (!strcmp(network->species[i].name, name))
            return network->species[i].role == TARRY_SPECIES_PLAIN ||
                   (!plain_only && network->species[i].role != TARRY_SPECIES_STATE);
    return false;
}

static void add_cells(table_page *page, const tarry_table *table, size_t row,
                      const char *const *columns, size_t n, int width) {
    for (size_t i = 0; i < n; i++) {
        char number[TARRY_ROUNDED];
        tarry_round_plain(tarry_table_number(table, row, tarry_table_column(table, columns[i])),
                          number);
        tarry_lines_right(page->text, number, width);
    }
    end_line(page);
}

static void add_counts_head(table_page *page) {
    char time[32];
    snprintf(time, sizeof time, "time [%s]", page->network->time_unit);
    tarry_text_add(page->text, "\n", 1);
    tarry_lines_left(page->text, "Counts at the snapshots", LABEL);
    tarry_lines_right(page->text, time, VALUE);
    tarry_text_printf(page->text, "%9s%9s%9s%9s\n", "mean", "s.e.", "sd", "Fano");
}

/* Means at the snapshots: of plain species, and of all counts where time is what matters. */
static int add_counts(table_page *page, tarry_error *error) {
    static const char *const columns[] = {"time", "mean", "mean_se", "sd", "fano"};
    const tarry_table *means = tarry_results_table(page->results, TARRY_TABLE_means);
    const bool plain_only = page->network->run.n_snapshots < 2;
    tarry_snapshots snapshots = {0};
    size_t n = 0;
    const int status = tarry_snapshots_init(&snapshots, &page->network->run, means, error);
    for (size_t i = 0; !status && i < snapshots.n && n <= LINES_SHOWN; i++) {
        const tarry_snapshot *item = &snapshots.items[i];
        if (!is_counted(page->network, item->name, plain_only))
            continue;
        if (!n)
            add_counts_head(page);
        if (n++ == LINES_SHOWN) {
            tarry_text_add_string(page->text, "  ... and more in means.csv\n");
            break;
        }
        tarry_text_add(page->text, "  ", 2);
        tarry_lines_left(page->text, item->name, LABEL - 2);
        add_cells(page, means, item->row, columns, COUNT(columns), 9);
    }
    tarry_snapshots_release(&snapshots);
    return status;
}

static void add_transit(table_page *page) {
    static const char *const columns[] = {"mean_pending", "mean_drawn", "sd_drawn", "lost"};
    const tarry_table *transit = tarry_results_table(page->results, TARRY_TABLE_transit);
    const bool one_window = page->network->run.n_windows < 2;
    const size_t n = tarry_table_n_rows(transit);
    char unit[48];
    if (!n || page->network->n_genes > GENES_SHOWN)
        return;
    snprintf(unit, sizeof unit, "\nLags in transit [%s]", page->network->time_unit);
    tarry_text_add(page->text, "", 0);
    tarry_lines_left(page->text, unit + 1, LABEL);
    tarry_text_printf(page->text, "%12s%12s%12s%12s\n", "under way", "mean lag", "sd of lag",
                      "lost");
    for (size_t row = 0; row < n && row < LINES_SHOWN; row++) {
        char words[160];
        snprintf(words, sizeof words, "  %s%s%s", tarry_table_text(transit, row, 0),
                 one_window ? "" : ", ", one_window ? "" : tarry_table_text(transit, row, 2));
        tarry_lines_left(page->text, words, LABEL);
        add_cells(page, transit, row, columns, COUNT(columns), 12);
    }
    if (n > LINES_SHOWN)
        tarry_text_add_string(page->text, "  ... and more in transit.csv\n");
}

static void add_top(table_page *page) {
    const tarry_run_plan *plan = &page->network->run;
    const int64_t n = tarry_results_n_cells(page->results);
    const int64_t asked = tarry_results_n_cells_asked(page->results);
    const char *unit = page->network->time_unit;
    char until[TARRY_ROUNDED], every[TARRY_ROUNDED], settle[TARRY_ROUNDED];
    tarry_text line = {0};
    if (page->network->title[0])
        tarry_lines_wrap(page->text, "", page->network->title, page->width);
    tarry_round_plain(plan->until, until);
    tarry_round_plain(plan->every, every);
    tarry_round_plain(plan->settle, settle);
    tarry_text_printf(&line, "%lld cells", (long long)n);
    if (n < asked)
        tarry_text_printf(&line, " of %lld (interrupted)", (long long)asked);
    tarry_text_printf(&line, ", %s %s recorded every %s %s", until, unit, every, unit);
    if (plan->settle > 0)
        tarry_text_printf(&line, " after %s %s to settle", settle, unit);
    tarry_text_printf(&line, ", seed %llu", (unsigned long long)plan->seed);
    for (uint32_t w = 0; plan->n_windows > 1 && w < plan->n_windows; w++) {
        tarry_round_plain(plan->windows[w].from, every);
        tarry_round_plain(plan->windows[w].to, until);
        tarry_text_printf(&line, "%s%s from %s to %s %s",
                          w ? ", " : "; windows: ", plan->windows[w].name, every, until, unit);
    }
    page->text->failed = page->text->failed || line.failed;
    if (!line.failed)
        tarry_lines_wrap(page->text, "", line.data, page->width);
    tarry_text_release(&line);
}

static void add_notes(table_page *page) {
    const size_t n = tarry_results_n_warnings(page->results);
    if (!n && !page->marked_few)
        return;
    tarry_text_add_string(page->text, "\nNotes\n");
    if (page->marked_few)
        tarry_lines_wrap(page->text, "* ", "from fewer than 20 periods or events", page->width);
    for (size_t i = 0; i < n; i++)
        tarry_lines_wrap(page->text, "- ", tarry_results_warning(page->results, i), page->width);
}

int tarry_write_summary_table(const tarry_model *model, const tarry_results *results, int width,
                              char **text, tarry_error *error) {
    tarry_text out = {0};
    table_page page = {&out, &model->network, results, width, false};
    add_top(&page);
    int status = add_all(&page, TARRY_TABLE_bursts, "gene", add_gene, error);
    if (!status)
        status = add_all(&page, TARRY_TABLE_signals, "signal", add_signal, error);
    if (!status)
        status = add_counts(&page, error);
    if (!status) {
        add_transit(&page);
        add_notes(&page);
        if (out.failed)
            status = tarry_fail_memory(error, "the table of results");
    }
    if (status)
        tarry_text_release(&out);
    *text = out.data;
    return status;
}
