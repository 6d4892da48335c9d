/* SPDX-License-Identifier: GPL-3.0-or-later */

#ifndef TARRY_REPORT_PAGE_PARTS_H
#define TARRY_REPORT_PAGE_PARTS_H

/* What the files that write report.html share. Each part appends its section, or nothing where the
 * run has nothing for it. */

#include "base/text.h"
#include "model/model.h"
#include "report/figure.h"
#include "report/groups.h"
#include "report/quantities.h"
#include "report/rounding.h"

enum {
    TARRY_PAGE_GENES = 20,  /* up to so many genes or signals, each has a section */
    TARRY_PAGE_ROWS = 200,  /* most rows of a table about single names */
    TARRY_PAGE_ALL = 2000,  /* most rows of the table of all genes */
    TARRY_PAGE_ABREAST = 4, /* windows beside each other */
};

typedef struct tarry_page {
    tarry_text *text;
    const tarry_model *model;
    const tarry_network *network;
    const tarry_results *results;
    const tarry_provenance *provenance;
    const tarry_figure_list *figures;
    tarry_groups genes, signals; /* rows of `bursts` and `signals` */
    bool exact;                  /* predicted: there are no cells and no intervals */
    bool marked;                 /* a figure carries the star of those that rest on few periods */
    uint32_t owner;              /* the gene that a name was of last */
} tarry_page;

/* A number and its interval as the tables have them; NaN where there is none. */
typedef struct tarry_page_value {
    double value, low, high;
    double samples; /* NaN where they are not told */
} tarry_page_value;

/* Whether a gene or signal has a section of its own. */
bool tarry_page_shows(const tarry_page *page, const tarry_groups *groups, const char *name);

/* The same for a species or first response by its name: whether it is of a gene that has one, or of
 * no gene. */
bool tarry_page_shows_of(tarry_page *page, const char *name);

/* Whether a gene or signal (one of them is NULL) has a picture. */
bool tarry_page_has_picture(const tarry_page *page, const char *gene, const char *signal);

/* page_style.c: the style sheet; the script that sorts, and the policy that lets only it run. */
extern const char tarry_page_style[];
extern const char tarry_page_script[];
void tarry_page_policy(bool with_script, tarry_text *text);

/* page_words.c: what a gene does in a window, in sentences. */
void tarry_page_tell_gene(tarry_page *page, const tarry_table *table,
                          const tarry_quantities *quantities, const char *name, uint32_t window);

/* page_cells.c: parts of tables. */
void tarry_page_begin_table(tarry_page *page, const char *caption, bool wide);
void tarry_page_end_table(tarry_page *page, bool wide);
/* Heads and cells of a number and its interval; exact values have none. */
void tarry_page_add_value_head(tarry_page *page, const char *words, const char *unit);
void tarry_page_add_value(tarry_page *page, const tarry_page_value *value);
void tarry_page_add_number(tarry_page *page, double value);
void tarry_page_add_rounded(tarry_page *page, const tarry_rounded *rounded, bool few);
tarry_page_value tarry_page_value_of(const tarry_table *table, size_t row);

/* page_genes.c */
int tarry_page_genes(tarry_page *page, tarry_error *error);
int tarry_page_signals(tarry_page *page, tarry_error *error);

/* page_many.c: the spread over genes or signals, and all genes a line each. */
int tarry_page_spread(tarry_page *page, const tarry_table *table, const tarry_groups *groups,
                      tarry_error *error);
void tarry_page_all_genes(tarry_page *page);

/* page_tables.c */
int tarry_page_counts(tarry_page *page, tarry_error *error);
int tarry_page_responses(tarry_page *page, tarry_error *error);
void tarry_page_transit(tarry_page *page);

/* page_figures.c */
void tarry_page_figures(tarry_page *page);

/* page_repeat.c: the model, how to repeat the run, how to cite it. */
void tarry_page_repeat(tarry_page *page);

#endif
