/* SPDX-License-Identifier: GPL-3.0-or-later */

#include "report/quantities.h"

#include "base/error.h"
#include "base/memory.h"

#include <stdio.h>
#include <stdlib.h>
#include <string.h>

typedef struct label {
    const char *quantity;
    const char *words;
} label;

static const label burst_labels[] = {
    {"burst_frequency", "bursts"},
    {"burst_size_mean", "size, mean"},
    {"burst_size_sd", "size, sd"},
    {"silent_fraction", "share without initiation"},
    {"loud_frequency", "loud bursts"},
    {"loud_size_mean", "loud size, mean"},
    {"outside_fraction", "share outside bursts"},
    {"initiation_rate", "initiations"},
};

static const label time_labels[] = {
    {"active_time_mean", "active, mean"}, {"inactive_time_mean", "inactive, mean"},
    {"interval_mean", "interval, mean"},  {"interval_sd", "interval, sd"},
    {"active_fraction", "share active"},
};

/* What may be said of a product or a signal, as endings of a quantity's name. */
static const label moment_labels[] = {
    {"mean", "mean"},        {"sd", "sd"},
    {"fano", "Fano factor"}, {"cv2", "CV squared"},
    {"noise", "noise"},      {"decay_time", "decay time"},
    {"plateau", "plateau"},  {"amplitude", "amplitude"},
};

static const label visible_labels[] = {
    {"visible_fraction", "share visible"},
    {"visible_frequency", "times visible"},
    {"visible_time_mean", "visible, mean"},
    {"dark_time_mean", "dark, mean"},
};

#define COUNT(array) (sizeof(array) / sizeof *(array))

/* What is being put together, and from what. */
typedef struct gathering {
    tarry_quantities *quantities;
    const tarry_network *network;
    const tarry_table *table;
    const size_t *rows;
    size_t n_rows;
} gathering;

static const label *find_label(const label *labels, size_t n, const char *quantity) {
    for (size_t i = 0; i < n; i++)
        if (!strcmp(labels[i].quantity, quantity))
            return &labels[i];
    return NULL;
}

static bool is_of_bursts(const char *quantity) {
    return find_label(burst_labels, COUNT(burst_labels), quantity) ||
           find_label(time_labels, COUNT(time_labels), quantity);
}

/* The length of "transcript" in "transcript_decay_time", and the words for the rest: 0 and those
 * for the whole where nothing stands before it. */
static size_t split_product(const char *quantity, const char **words) {
    const size_t n = strlen(quantity);
    size_t best = 0;
    *words = quantity;
    for (size_t i = 0; i < COUNT(moment_labels); i++) {
        const size_t ending = strlen(moment_labels[i].quantity);
        if (n < ending || ending <= best ||
            strcmp(quantity + n - ending, moment_labels[i].quantity))
            continue;
        if (n > ending && (n == ending + 1 || quantity[n - ending - 1] != '_'))
            continue;
        best = ending;
        *words = moment_labels[i].words;
    }
    return best && n > best ? n - best - 1 : 0;
}

static const char *text_of(const gathering *g, size_t i, int column) {
    return tarry_table_text(g->table, g->rows[i], column);
}

static const char *name_of(const gathering *g, size_t i) {
    return text_of(g, i, TARRY_QUANTITY_NAME);
}

/* The first row of a quantity, or n_rows. */
static size_t find_first(const gathering *g, const char *quantity) {
    size_t i = 0;
    while (i < g->n_rows && strcmp(name_of(g, i), quantity) != 0)
        i++;
    return i;
}

/* The window of a row. */
static uint32_t window_of(const gathering *g, size_t i) {
    const char *name = text_of(g, i, TARRY_QUANTITY_WINDOW);
    uint32_t w = 0;
    while (w < g->network->run.n_windows && strcmp(g->network->run.windows[w].name, name) != 0)
        w++;
    return w;
}

/* Add the quantity whose first row is row i, with its rows in all windows. */
static void add(gathering *g, size_t i, tarry_quantity_section section, const char *words,
                size_t product_size) {
    tarry_quantities *all = g->quantities;
    const uint32_t n_windows = g->network->run.n_windows;
    size_t *rows = all->rows + all->n * n_windows;
    for (uint32_t w = 0; w < n_windows; w++)
        rows[w] = tarry_table_n_rows(g->table);
    for (size_t j = i; j < g->n_rows; j++) {
        const uint32_t w = strcmp(name_of(g, j), name_of(g, i)) ? n_windows : window_of(g, j);
        if (w < n_windows && rows[w] == tarry_table_n_rows(g->table))
            rows[w] = g->rows[j];
    }
    all->items[all->n++] = (tarry_quantity){.section = section,
                                            .name = name_of(g, i),
                                            .words = words,
                                            .product_size = product_size,
                                            .unit = text_of(g, i, TARRY_QUANTITY_UNIT),
                                            .rows = rows};
}

static void add_labelled(gathering *g, tarry_quantity_section section, const label *labels,
                         size_t n) {
    for (size_t i = 0; i < n; i++) {
        const size_t row = find_first(g, labels[i].quantity);
        if (row < g->n_rows)
            add(g, row, section, labels[i].words, 0);
    }
}

/* Whether an earlier row speaks of the product whose name is the first n bytes. */
static bool was_product(const gathering *g, size_t i, const char *name, size_t n) {
    const char *words;
    for (size_t j = 0; j < i; j++) {
        const char *quantity = name_of(g, j);
        if (!is_of_bursts(quantity) && split_product(quantity, &words) == n &&
            !memcmp(quantity, name, n))
            return true;
    }
    return false;
}

/* All that is said of the product that row `first` is the first to name. */
static void add_product(gathering *g, size_t first) {
    const char *name = name_of(g, first);
    const char *words;
    const size_t n = split_product(name, &words);
    for (size_t i = first; i < g->n_rows; i++) {
        const char *quantity = name_of(g, i);
        if (!is_of_bursts(quantity) && find_first(g, quantity) == i &&
            split_product(quantity, &words) == n && !memcmp(quantity, name, n))
            add(g, i, TARRY_SECTION_PRODUCTS, words, n);
    }
}

static void add_products(gathering *g) {
    for (size_t i = 0; i < g->n_rows; i++) {
        const char *words;
        const char *quantity = name_of(g, i);
        const size_t n = split_product(quantity, &words);
        if (!is_of_bursts(quantity) && !was_product(g, i, quantity, n))
            add_product(g, i);
    }
}

static void add_of_signal(gathering *g) {
    for (size_t i = 0; i < g->n_rows; i++) {
        const char *words;
        split_product(name_of(g, i), &words);
        const label *visible = find_label(visible_labels, COUNT(visible_labels), name_of(g, i));
        words = visible ? visible->words : words;
        if (find_first(g, name_of(g, i)) == i)
            add(g, i, TARRY_SECTION_SIGNAL, words, 0);
    }
}

int tarry_quantities_init(tarry_quantities *quantities, const tarry_network *network,
                          const tarry_table *table, const size_t *rows, size_t n_rows,
                          tarry_error *error) {
    gathering g = {quantities, network, table, rows, n_rows};
    memset(quantities, 0, sizeof *quantities);
    quantities->items = tarry_calloc(n_rows, sizeof *quantities->items);
    quantities->rows = tarry_calloc(n_rows, network->run.n_windows * sizeof *quantities->rows);
    if (!quantities->items || !quantities->rows)
        return tarry_fail_memory(error, "the quantities of a gene");
    if (!strcmp(tarry_table_column_name(table, TARRY_QUANTITY_OF), "signal")) {
        add_of_signal(&g);
        return 0;
    }
    add_labelled(&g, TARRY_SECTION_BURSTS, burst_labels, COUNT(burst_labels));
    add_labelled(&g, TARRY_SECTION_TIMES, time_labels, COUNT(time_labels));
    add_products(&g);
    return 0;
}

void tarry_quantities_release(tarry_quantities *quantities) {
    free(quantities->items);
    free(quantities->rows);
    memset(quantities, 0, sizeof *quantities);
}

size_t tarry_quantities_find(const tarry_quantities *quantities, const char *name, uint32_t window,
                             size_t n_rows) {
    for (size_t i = 0; i < quantities->n; i++)
        if (!strcmp(quantities->items[i].name, name))
            return quantities->items[i].rows[window];
    return n_rows;
}

const char *tarry_quantity_unit(const char *unit, char out[48]) {
    const char *per = strstr(unit, " per ");
    const size_t n = per ? (size_t)(per - unit) : strlen(unit);
    snprintf(out, 48, "%.*s", n < 40 ? (int)n : 40, unit);
    if (!strcmp(out, "1") || !strcmp(out, "share"))
        out[0] = '\0';
    return out;
}

const char *tarry_section_title(tarry_quantity_section section, bool alleles) {
    switch (section) {
    case TARRY_SECTION_BURSTS:
        return alleles ? "Bursts of one allele" : "Bursts";
    case TARRY_SECTION_TIMES:
        return alleles ? "Times of one allele" : "Times";
    case TARRY_SECTION_PRODUCTS:
        return "Molecules in a cell";
    case TARRY_SECTION_SIGNAL:
        break;
    }
    return "";
}

const tarry_gene *tarry_network_gene(const tarry_network *network, const char *name) {
    for (uint32_t g = 0; g < network->n_genes; g++)
        if (!strcmp(network->genes[g].name, name))
            return &network->genes[g];
    return NULL;
}

bool tarry_gene_has_alleles(const tarry_gene *gene) {
    return gene && gene->promoters.from < gene->promoters.to;
}
