#include "report/figures_table.h"

#include "report/lines.h"
#include "report/rounding.h"

#include <stdio.h>
#include <string.h>

enum { FEW = 20 }; /* periods or events, below which an interval is marked */

/* Columns of the tables. */
enum { NAME, WINDOW, QUANTITY, UNIT, FIGURE, LOW, HIGH, SAMPLES };

/* Columns on the page. One window has room to spare; several are set close. */
typedef struct page_layout {
    int label;
    int value;    /* right-aligned */
    int gap;      /* between value and interval */
    int interval; /* left-aligned */
} page_layout;

static const page_layout wide = {34, 10, 2, 30};
static const page_layout close = {27, 7, 1, 18};

typedef struct figure_page {
    tarry_text *text;
    const tarry_network *network;
    const tarry_table *table;
    const page_layout *layout;
    uint32_t a_block; /* windows side by side */
    bool *marked;
} figure_page;

/* The rows of one gene or signal, in windows from .. to - 1. */
typedef struct figure_rows {
    const size_t *rows;
    size_t n;
    uint32_t from, to;
} figure_rows;

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

#define COUNT(array) (sizeof(array) / sizeof *(array))

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

static const char *text_of(const figure_page *page, size_t row, int column) {
    return tarry_table_text(page->table, row, column);
}

/* The row of a quantity in a window, or the table's size. */
static size_t find_row(const figure_page *page, const figure_rows *rows, const char *quantity,
                       uint32_t window) {
    const char *name = page->network->run.windows[window].name;
    for (size_t i = 0; i < rows->n; i++)
        if (!strcmp(text_of(page, rows->rows[i], QUANTITY), quantity) &&
            !strcmp(text_of(page, rows->rows[i], WINDOW), name))
            return rows->rows[i];
    return tarry_table_n_rows(page->table);
}

static void end_line(tarry_text *text) {
    while (text->size && text->data[text->size - 1] == ' ')
        text->data[--text->size] = '\0';
    tarry_text_add(text, "\n", 1);
}

/* ---- one figure ----------------------------------------------------------------------------- */

/* Value and interval as texts, with as many digits as the columns hold. */
static void round_to_fit(const figure_page *page, size_t row, bool few, char *value, char *interval,
                         size_t size) {
    const double low = tarry_table_number(page->table, row, LOW);
    const double high = tarry_table_number(page->table, row, HIGH);
    for (int digits = TARRY_ROUND_MOST; digits > 0; digits--) {
        tarry_rounded rounded;
        tarry_round(tarry_table_number(page->table, row, FIGURE), low, high, digits, &rounded);
        const bool bounded = rounded.low[0] != '\0';
        snprintf(value, size, "%s%s", rounded.value, few && bounded ? "*" : "");
        snprintf(interval, size, "%s%s%s", rounded.low, bounded ? " to " : "", rounded.high);
        if ((int)strlen(value) <= page->layout->value &&
            (int)strlen(interval) <= page->layout->interval)
            return;
    }
}

static void add_estimate(figure_page *page, size_t row) {
    char value[80] = "", interval[80] = "";
    const page_layout *layout = page->layout;
    if (row < tarry_table_n_rows(page->table)) {
        const bool few = tarry_table_number(page->table, row, SAMPLES) < FEW;
        round_to_fit(page, row, few, value, interval, sizeof value);
        *page->marked = *page->marked || strchr(value, '*');
    }
    tarry_lines_right(page->text, value, layout->value);
    tarry_lines_left(page->text, "", layout->gap);
    tarry_lines_left(page->text, interval, layout->interval);
}

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

/* Whether a quantity is a decay time, whose unit stands in the title of its group. */
static bool is_decay_time(const char *quantity) {
    static const char ending[] = "_decay_time";
    const size_t n = strlen(quantity);
    return n >= sizeof ending && !strcmp(quantity + n - (sizeof ending - 1), ending);
}

/* A line for a quantity, if any of the windows has it. Returns whether it has. */
static bool add_figure(figure_page *page, const figure_rows *rows, const char *words,
                       const char *quantity) {
    const size_t none = tarry_table_n_rows(page->table);
    const char *unit = NULL;
    char text[160], added[48];
    for (uint32_t w = rows->from; w < rows->to && !unit; w++) {
        const size_t row = find_row(page, rows, quantity, w);
        unit = row < none ? text_of(page, row, UNIT) : NULL;
    }
    if (!unit)
        return false;
    snprintf(text, sizeof text, "    %s%s", words,
             is_decay_time(quantity) ? "" : unit_words(unit, added));
    tarry_lines_left(page->text, text, page->layout->label);
    for (uint32_t w = rows->from; w < rows->to; w++)
        add_estimate(page, find_row(page, rows, quantity, w));
    end_line(page->text);
    return true;
}

/* ---- groups of figures ---------------------------------------------------------------------- */

static void add_group(figure_page *page, const figure_rows *rows, const char *title,
                      const label *labels, size_t n) {
    bool any = false;
    for (size_t i = 0; i < rows->n && !any; i++)
        any = find_label(labels, n, text_of(page, rows->rows[i], QUANTITY)) != NULL;
    if (!any)
        return;
    tarry_text_printf(page->text, "  %s\n", title);
    for (size_t i = 0; i < n; i++)
        add_figure(page, rows, labels[i].words, labels[i].quantity);
}

/* Whether row i is the first of its quantity. */
static bool is_first(const figure_page *page, const figure_rows *rows, size_t i) {
    const char *quantity = text_of(page, rows->rows[i], QUANTITY);
    for (size_t j = 0; j < i; j++)
        if (!strcmp(text_of(page, rows->rows[j], QUANTITY), quantity))
            return false;
    return true;
}

/* Whether an earlier row speaks of the product whose name is the first n bytes. */
static bool was_product(const figure_page *page, const figure_rows *rows, size_t i,
                        const char *name, size_t n) {
    const char *words;
    for (size_t j = 0; j < i; j++) {
        const char *quantity = text_of(page, rows->rows[j], QUANTITY);
        if (!is_of_bursts(quantity) && split_product(quantity, &words) == n &&
            !memcmp(quantity, name, n))
            return true;
    }
    return false;
}

/* All that is said of one product, its name before the first line. */
static void add_product(figure_page *page, const figure_rows *rows, size_t first) {
    enum { NAME_WIDTH = 11 };
    const char *name = text_of(page, rows->rows[first], QUANTITY);
    const char *words;
    const size_t n = split_product(name, &words);
    bool named = n == 0;
    char line[128];
    if (n >= NAME_WIDTH) {
        tarry_text_printf(page->text, "    %.*s\n", (int)n, name);
        named = true;
    }
    for (size_t i = first; i < rows->n; i++) {
        const char *quantity = text_of(page, rows->rows[i], QUANTITY);
        if (is_of_bursts(quantity) || !is_first(page, rows, i) ||
            split_product(quantity, &words) != n || memcmp(quantity, name, n))
            continue;
        snprintf(line, sizeof line, "%-*.*s%s", n ? NAME_WIDTH : 0, named ? 0 : (int)n, name,
                 words);
        named = add_figure(page, rows, line, quantity) || named;
    }
}

static void add_products(figure_page *page, const figure_rows *rows) {
    bool any = false;
    for (size_t i = 0; i < rows->n; i++) {
        const char *words;
        const char *quantity = text_of(page, rows->rows[i], QUANTITY);
        const size_t n = split_product(quantity, &words);
        if (is_of_bursts(quantity) || was_product(page, rows, i, quantity, n))
            continue;
        if (!any)
            tarry_text_printf(page->text, "  Molecules in a cell (decay times in %s)\n",
                              page->network->time_unit);
        any = true;
        add_product(page, rows, i);
    }
}

/* ---- blocks --------------------------------------------------------------------------------- */

/* The gene of this name, or NULL for a signal. */
static const tarry_gene *find_gene(const tarry_network *network, const char *name) {
    for (uint32_t g = 0; g < network->n_genes; g++)
        if (!strcmp(network->genes[g].name, name))
            return &network->genes[g];
    return NULL;
}

static void add_head(figure_page *page, const char *name, const tarry_gene *gene,
                     const figure_rows *rows) {
    const tarry_run_plan *plan = &page->network->run;
    const page_layout *layout = page->layout;
    char words[160];
    if (gene && gene->n_copies > 1)
        snprintf(words, sizeof words, "%s (%u alleles)", name, (unsigned)gene->n_copies);
    else
        snprintf(words, sizeof words, "%s", name);
    tarry_text_add(page->text, "\n", 1);
    tarry_lines_left(page->text, words, layout->label);
    for (uint32_t w = rows->from; w < rows->to; w++) {
        tarry_lines_right(page->text, plan->n_windows > 1 ? plan->windows[w].name : "value",
                          layout->value);
        tarry_lines_left(page->text, "", layout->gap);
        tarry_lines_left(page->text, "95 % interval", layout->interval);
    }
    end_line(page->text);
}

static void add_gene(figure_page *page, const char *name, const figure_rows *rows) {
    const tarry_gene *gene = find_gene(page->network, name);
    const bool alleles = gene && gene->promoters.from < gene->promoters.to;
    add_head(page, name, gene, rows);
    add_group(page, rows, alleles ? "Bursts of one allele" : "Bursts", burst_labels,
              COUNT(burst_labels));
    add_group(page, rows, alleles ? "Times of one allele" : "Times", time_labels,
              COUNT(time_labels));
    add_products(page, rows);
}

static void add_signal(figure_page *page, const char *name, const figure_rows *rows) {
    add_head(page, name, NULL, rows);
    for (size_t i = 0; i < rows->n; i++) {
        const char *words;
        const char *quantity = text_of(page, rows->rows[i], QUANTITY);
        if (!is_first(page, rows, i))
            continue;
        split_product(quantity, &words);
        add_figure(page, rows, words, quantity);
    }
}

void tarry_figures_write(const tarry_network *network, const tarry_table *table,
                         const tarry_groups *groups, int width, bool *marked, tarry_text *text) {
    const uint32_t n_windows = network->run.n_windows;
    const page_layout *layout = n_windows > 1 ? &close : &wide;
    const int column = layout->value + layout->gap + layout->interval;
    const int fit = (width - layout->label) / column;
    figure_page page = {.text = text,
                        .network = network,
                        .table = table,
                        .layout = layout,
                        .a_block = fit < 1 ? 1 : (uint32_t)fit,
                        .marked = marked};
    const bool is_signal = !strcmp(tarry_table_column_name(table, NAME), "signal");
    for (size_t g = 0; g < groups->n; g++) {
        for (uint32_t w = 0; w < n_windows; w += page.a_block) {
            const uint32_t to = n_windows - w < page.a_block ? n_windows : w + page.a_block;
            const figure_rows rows = {groups->rows + groups->starts[g],
                                      groups->starts[g + 1] - groups->starts[g], w, to};
            if (is_signal)
                add_signal(&page, groups->names[g], &rows);
            else
                add_gene(&page, groups->names[g], &rows);
        }
    }
}
