/* SPDX-License-Identifier: GPL-3.0-or-later */

/* The two texts of a figure. Places on the page are shares of its width and height, so that one
 * script does for every kind of picture; the legend is set by hand, one entry for each name in any
 * panel. Of long curves so many rows are left out that no more
 * stand close by than can be seen; the data have all.
 *
 * Colours are the project's own: between 3:1 and 6:1 against white and against a nearly black page
 * (WCAG 2.1, relative luminance 0.13 to 0.30), and chosen by search for the largest least distance
 * (in the space OKLab) in ordinary sight and in simulated deuteranopia and protanopia (Machado et
 * al. 2009, IEEE Trans. Vis. Comput. Graph. 15:1291). */
#include "report/plot.h"

#include "base/number.h"

#include <float.h>
#include <math.h>
#include <string.h>

static const char *const colours[TARRY_PLOT_COLOURS] = {"#1a728f", "#d47e1c", "#c21d3c", "#9489df",
                                                        "#8f26cf"};

enum {
    LEGEND_LEFT = 22,
    LEFT = 54, /* margins in 1/96 inch */
    RIGHT = 10,
    TOP = 4,
    BOTTOM = 37,
    LINE = 13,   /* height of a line of text */
    TICS = 16,   /* height of the numbers at an axis */
    GAP = 6,     /* between panels */
    SAMPLE = 20, /* width of a line in the legend */
    LETTER = 5,  /* a little less than a letter takes; BLANK makes up for it */
    BLANK = 16,
    MOST_POINTS = 320, /* of a smooth curve */
    FIRST_ENTRY = 10,  /* number of the legend's first label */
    X_TICS = 7,        /* at most, about */
    Y_TICS = 5,        /* at most, about */
};

static const double log_decades = 4.5; /* that a logarithmic axis shows at most */

/* ---- shape ---------------------------------------------------------------------------------- */

static int body_height(const tarry_plot *plot) {
    return plot->n_panels < 2 ? 176 : plot->n_panels == 2 ? 118 : plot->n_panels == 3 ? 92 : 74;
}

static size_t characters(const char *text) {
    size_t n = 0;
    for (; *text; text++)
        n += ((unsigned char)*text & 0xc0) != 0x80;
    return n;
}

/* True for the first series of its name on the page. */
static bool names_anew(const tarry_plot *plot, size_t series) {
    const char *name = plot->series[series].name;
    for (size_t i = 0; i < series; i++)
        if (!strcmp(plot->series[i].name, name))
            return false;
    return *name != '\0';
}

/* An entry of the legend: its place in 1/96 inch, x from the left and its line from 0. */
typedef struct entry {
    int x, line;
} entry;

/* Entries stand one after another, and go on in the next line where there is no more room. */
static entry next_entry(entry *end, const char *name) {
    const int width = SAMPLE + 4 + (int)characters(name) * LETTER + BLANK;
    if (end->x > LEGEND_LEFT && end->x + width > TARRY_PLOT_WIDTH + BLANK)
        *end = (entry){LEGEND_LEFT, end->line + 1};
    const entry at = *end;
    end->x += width;
    return at;
}

static int legend_lines(const tarry_plot *plot) {
    entry end = {LEGEND_LEFT, 0};
    for (size_t i = 0; i < plot->n_series; i++)
        if (names_anew(plot, i))
            next_entry(&end, plot->series[i].name);
    if (plot->mark_name)
        next_entry(&end, plot->mark_name);
    return end.line + (end.x > LEGEND_LEFT);
}

/* What stands above a panel: its title, or a little room for the number at the axis' end. */
static int title_height(const tarry_plot *plot, size_t panel) {
    return *plot->panels[panel].title ? LINE : GAP;
}

static int panel_height(const tarry_plot *plot, size_t panel) {
    return body_height(plot) + GAP + title_height(plot, panel) +
           (plot->own_x && panel + 1 < plot->n_panels ? TICS : 0);
}

int tarry_plot_height(const tarry_plot *plot) {
    int height = TOP + BOTTOM + LINE * legend_lines(plot);
    for (size_t i = 0; i < plot->n_panels; i++)
        height += panel_height(plot, i);
    return height;
}

/* ---- data ----------------------------------------------------------------------------------- */

static bool has_widths(const tarry_plot *plot) {
    for (size_t i = 0; i < plot->n_rows; i++)
        if (!isnan(plot->rows[i].width))
            return true;
    return false;
}

static bool has_bands(const tarry_plot *plot) {
    for (size_t i = 0; i < plot->n_rows; i++)
        if (!isnan(plot->rows[i].low))
            return true;
    return false;
}

static void add_field(tarry_text *data, const char *text) {
    tarry_text_add(data, "\"", 1);
    for (; *text; text++)
        tarry_text_add(data, *text == '"' ? "\"\"" : text, *text == '"' ? 2 : 1);
    tarry_text_add(data, "\"", 1);
}

/* Plain words stand as they are (RFC 4180). */
static void add_word(tarry_text *data, const char *text) {
    if (strpbrk(text, ",\"\r\n"))
        add_field(data, text);
    else
        tarry_text_add_string(data, text);
}

static void add_value(tarry_text *data, double value) {
    tarry_text_add(data, ",", 1);
    if (!isnan(value))
        tarry_text_add_number(data, value);
}

void tarry_plot_write_data(const tarry_plot *plot, tarry_text *data) {
    const bool widths = has_widths(plot), bands = has_bands(plot);
    tarry_text_printf(data, "panel,series,%s%s,%s%s\n", plot->x_name, widths ? ",width" : "",
                      plot->y_name, bands ? ",low,high" : "");
    for (size_t p = 0; p < plot->n_panels; p++) {
        const tarry_plot_panel *panel = &plot->panels[p];
        for (size_t s = panel->first_series; s < panel->first_series + panel->n_series; s++) {
            const tarry_plot_series *series = &plot->series[s];
            for (size_t r = series->first_row; r < series->first_row + series->n_rows; r++) {
                const tarry_plot_row *row = &plot->rows[r];
                add_word(data, panel->title);
                tarry_text_add(data, ",", 1);
                add_word(data, series->name);
                add_value(data, row->x);
                if (widths)
                    add_value(data, row->width);
                add_value(data, row->y);
                if (bands) {
                    add_value(data, row->low);
                    add_value(data, row->high);
                }
                tarry_text_add(data, "\n", 1);
            }
        }
    }
    data->failed = data->failed || plot->failed;
}

/* ---- pieces of the script ------------------------------------------------------------------- */

void tarry_plot_quote(tarry_text *text, const char *string) {
    tarry_text_add(text, "'", 1);
    for (; *string; string++) {
        const unsigned char c = (unsigned char)*string;
        if (c == '\'')
            tarry_text_add_string(text, "\xe2\x80\x99");
        else
            tarry_text_add(text, c < 0x20 || c == 0x7f ? " " : string, 1);
    }
    tarry_text_add(text, "'", 1);
}

static void add_number(tarry_text *script, double value) {
    char number[TARRY_NUMBER_SIZE];
    tarry_number_write_rounded(value, 6, number);
    tarry_text_add_string(script, number);
}

/* "set WORD at screen X" of a place in 1/96 inch of so many. */
static void set_margin(tarry_text *script, const char *side, int place, int of) {
    tarry_text_printf(script, "set %smargin at screen ", side);
    add_number(script, (double)place / of);
    tarry_text_add(script, "\n", 1);
}

static void set_label(tarry_text *script, int number, const char *text, double x, double y,
                      const char *how) {
    tarry_text_printf(script, "set label %d ", number);
    tarry_plot_quote(script, text);
    tarry_text_add_string(script, " at screen ");
    add_number(script, x);
    tarry_text_add_string(script, ", screen ");
    add_number(script, y);
    tarry_text_printf(script, " %s\n", how);
}

typedef struct span {
    double from, to;
} span;

static void widen(span *range, double value) {
    if (!isfinite(value))
        return;
    range->from = fmin(range->from, value);
    range->to = fmax(range->to, value);
}

/* x that a panel's rows cover. */
static span x_range(const tarry_plot *plot, const tarry_plot_panel *panel) {
    span range = {DBL_MAX, -DBL_MAX};
    for (size_t s = panel->first_series; s < panel->first_series + panel->n_series; s++) {
        const tarry_plot_series *series = &plot->series[s];
        for (size_t r = series->first_row; r < series->first_row + series->n_rows; r++) {
            const tarry_plot_row *row = &plot->rows[r];
            const bool about = series->kind != TARRY_SERIES_SHADE && !isnan(row->width);
            widen(&range, about ? row->x - 0.5 * row->width : row->x);
            widen(&range, about ? row->x + 0.5 * row->width : row->x + row->width);
        }
    }
    if (!isnan(panel->x_from))
        range.from = panel->x_from;
    if (!isnan(panel->x_to))
        range.to = panel->x_to;
    if (!(range.from <= range.to))
        range = (span){0, 1};
    if (range.from == range.to)
        range = (span){range.from - 0.5, range.to + 0.5};
    return range;
}

/* Is it drawn divided by the width? */
static bool is_density(tarry_series_kind kind) {
    return kind == TARRY_SERIES_BARS || kind == TARRY_SERIES_DENSITY || kind == TARRY_SERIES_LAW;
}

/* y of all curves and bands within the panel's x range, above 0 only where `positive`. */
static span y_values(const tarry_plot *plot, const tarry_plot_panel *panel, span x, bool positive) {
    span range = {DBL_MAX, -DBL_MAX};
    for (size_t s = panel->first_series; s < panel->first_series + panel->n_series; s++) {
        const tarry_plot_series *series = &plot->series[s];
        if (series->kind == TARRY_SERIES_SHADE)
            continue;
        for (size_t r = series->first_row; r < series->first_row + series->n_rows; r++) {
            const tarry_plot_row *row = &plot->rows[r];
            const double by = is_density(series->kind) ? row->width : 1;
            const double values[] = {row->y / by, row->low / by, row->high / by};
            for (int i = 0; i < 3 && row->x >= x.from && row->x <= x.to; i++)
                if (!positive || values[i] > 0)
                    widen(&range, values[i]);
        }
    }
    return range;
}

static span y_range(const tarry_plot *plot, const tarry_plot_panel *panel, span x) {
    span range = y_values(plot, panel, x, panel->log_y);
    if (!(range.from <= range.to))
        return panel->log_y ? (span){0.1, 1} : (span){0, 1};
    if (panel->log_y) {
        const double top = ceil(log10(range.to) - 1e-9);
        const double least = fmax(range.from, panel->y_foot);
        const double foot = fmin(fmax(log10(least), top - log_decades), top - 1);
        return (span){pow(10, foot), pow(10, top)};
    }
    widen(&range, 0);
    if (range.from == range.to)
        range.to = 1;
    const double height = range.to - range.from;
    range.to += range.to > 0 ? 0.06 * height : 0;
    range.from -= range.from < 0 ? 0.06 * height : 0;
    return range;
}

static void set_range(tarry_text *script, char axis, span range) {
    tarry_text_printf(script, "set %crange [", axis);
    add_number(script, range.from);
    tarry_text_add_string(script, ":");
    add_number(script, range.to);
    tarry_text_add_string(script, "]\n");
}

static void add_colour(tarry_text *script, int colour) {
    if (colour < 0)
        tarry_text_add_string(script, "grey");
    else
        tarry_text_printf(script, "colour%d", colour % TARRY_PLOT_COLOURS + 1);
}

static void set_marks(const tarry_plot *plot, const tarry_plot_panel *panel, span x,
                      tarry_text *script) {
    for (size_t m = panel->first_mark; m < panel->first_mark + panel->n_marks; m++) {
        const tarry_plot_mark *mark = &plot->marks[m];
        if (!mark->level && (mark->at < x.from || mark->at > x.to))
            continue;
        tarry_text_add_string(script, mark->level ? "set arrow from graph 0, first "
                                                  : "set arrow from first ");
        add_number(script, mark->at);
        tarry_text_add_string(script, mark->level ? " to graph 1, first " : ", graph 0 to first ");
        add_number(script, mark->at);
        tarry_text_add_string(script, mark->level ? "" : ", graph 1");
        tarry_text_add_string(script, " nohead back dashtype 3 linewidth 1.2 linecolor rgb ");
        add_colour(script, mark->colour);
        tarry_text_add(script, "\n", 1);
    }
}

/* ---- series --------------------------------------------------------------------------------- */

/* Columns of the data, by number. */
typedef struct columns {
    int x, width, y, low, high;
} columns;

static columns columns_of(const tarry_plot *plot) {
    const int shift = has_widths(plot);
    return (columns){3, 4, 4 + shift, 5 + shift, 6 + shift};
}

static bool series_has_band(const tarry_plot *plot, const tarry_plot_series *series) {
    for (size_t r = series->first_row; r < series->first_row + series->n_rows; r++)
        if (!isnan(plot->rows[r].low))
            return true;
    return false;
}

/* "data every K::FIRST::LAST using" */
static void add_source(const tarry_plot_series *series, tarry_text *script) {
    const bool smooth = series->kind == TARRY_SERIES_LINE &&
                        series->n_rows > 2 * (size_t)MOST_POINTS;
    const size_t step = smooth ? series->n_rows / MOST_POINTS : 1;
    tarry_text_add_string(script, "data every ");
    if (step > 1)
        tarry_text_printf(script, "%zu", step);
    tarry_text_printf(script, "::%zu::%zu using ", series->first_row,
                      series->first_row + series->n_rows - 1);
}

static void add_look(const tarry_plot_series *series, tarry_text *script) {
    static const char *const looks[] = {
        [TARRY_SERIES_LINE] = " linewidth 1.5",
        [TARRY_SERIES_TRACE] = " linewidth 0.8",
        [TARRY_SERIES_BARS] = " fillstyle transparent solid 0.45 noborder",
        [TARRY_SERIES_DENSITY] = " linewidth 1.5",
        [TARRY_SERIES_LAW] = " linewidth 1.2",
        [TARRY_SERIES_SHADE] = " fillstyle transparent solid 0.3 noborder",
    };
    if (series->kind == TARRY_SERIES_LAW)
        tarry_text_add_string(script, "dark");
    else
        add_colour(script, series->colour);
    const bool again = series->colour >= TARRY_PLOT_COLOURS;
    const bool filled = series->kind == TARRY_SERIES_BARS || series->kind == TARRY_SERIES_SHADE;
    if (again && filled)
        tarry_text_add_string(script, " fillstyle transparent pattern 4 noborder");
    else
        tarry_text_printf(script, "%s%s", looks[series->kind], again ? " dashtype 2" : "");
}

/* ":COLUMN", or ":(COLUMN divided by the width)". */
static void add_column(const columns *at, int column, bool divided, tarry_text *script) {
    if (divided)
        tarry_text_printf(script, ":($%d/$%d)", column, at->width);
    else
        tarry_text_printf(script, ":%d", column);
}

static void add_band(const columns *at, const tarry_plot_series *series, bool log_y,
                     tarry_text *script) {
    const bool divided = is_density(series->kind);
    add_source(series, script);
    tarry_text_printf(script, "%d", at->x);
    /* What lies at 0 is at the foot of a logarithmic axis. */
    if (log_y && divided)
        tarry_text_printf(script, ":($%d/$%d > foot ? $%d/$%d : foot)", at->low, at->width, at->low,
                          at->width);
    else if (log_y)
        tarry_text_printf(script, ":($%d > foot ? $%d : foot)", at->low, at->low);
    else
        add_column(at, at->low, divided, script);
    add_column(at, at->high, divided, script);
    tarry_text_add_string(script, " with filledcurves linecolor rgb ");
    add_colour(script, series->colour);
    tarry_text_add_string(script, " fillstyle transparent solid 0.25 noborder notitle, \\\n     ");
}

static void add_bars(const columns *at, const tarry_plot_series *series, bool band,
                     tarry_text *script) {
    add_source(series, script);
    tarry_text_printf(script, "%d:($%d/$%d):%d with boxes", at->x, at->y, at->width, at->width);
    tarry_text_add_string(script, " linecolor rgb ");
    add_look(series, script);
    tarry_text_add_string(script, " notitle");
    if (!band)
        return;
    tarry_text_add_string(script, ", \\\n     ");
    add_source(series, script);
    tarry_text_printf(
        script,
        "%d:($%d/$%d):(0):(($%d - $%d)/$%d) with vectors nohead linewidth 0.8 linecolor "
        "rgb ",
        at->x, at->low, at->width, at->high, at->low, at->width);
    add_colour(script, series->colour);
    tarry_text_add_string(script, " notitle");
}

static void add_line(const columns *at, const tarry_plot_series *series, tarry_text *script) {
    add_source(series, script);
    tarry_text_printf(script, "%d", at->x);
    add_column(at, at->y, is_density(series->kind), script);
    tarry_text_add_string(script, " with lines");
    tarry_text_add_string(script, " linecolor rgb ");
    add_look(series, script);
    tarry_text_add_string(script, " notitle");
}

static void add_series(const tarry_plot *plot, const tarry_plot_panel *panel,
                       const tarry_plot_series *series, tarry_text *script) {
    const columns at = columns_of(plot);
    const bool band = series_has_band(plot, series);
    switch (series->kind) {
    case TARRY_SERIES_SHADE:
        add_source(series, script);
        tarry_text_printf(script,
                          "($%d + 0.5*$%d):(foot):%d:($%d + $%d):(foot):(head) with boxxyerror",
                          at.x, at.width, at.x, at.x, at.width);
        tarry_text_add_string(script, " linecolor rgb ");
        add_look(series, script);
        tarry_text_add_string(script, " notitle");
        break;
    case TARRY_SERIES_BARS:
        add_bars(&at, series, band, script);
        break;
    case TARRY_SERIES_LINE:
    case TARRY_SERIES_DENSITY:
        if (band)
            add_band(&at, series, panel->log_y, script);
        add_line(&at, series, script);
        break;
    case TARRY_SERIES_TRACE:
    case TARRY_SERIES_LAW:
        add_line(&at, series, script);
        break;
    }
}

/* ---- the legend ------------------------------------------------------------------------------ */

/* "from screen X, screen Y to screen X, screen Y" about an entry's middle line. */
static void add_sample(const tarry_plot *plot, entry at, double half_height, tarry_text *script) {
    const int height = tarry_plot_height(plot);
    const double y = TOP + (at.line + 0.5) * LINE;
    const double corners[2][2] = {{at.x, y + half_height}, {at.x + SAMPLE, y - half_height}};
    for (int i = 0; i < 2; i++) {
        tarry_text_add_string(script, i ? " to screen " : " from screen ");
        add_number(script, corners[i][0] / TARRY_PLOT_WIDTH);
        tarry_text_add_string(script, ", screen ");
        add_number(script, 1 - corners[i][1] / height);
    }
}

static void add_entry_name(const tarry_plot *plot, entry at, const char *name, int number,
                           tarry_text *script) {
    set_label(script, number, name, (at.x + SAMPLE + 4.0) / TARRY_PLOT_WIDTH,
              1 - (TOP + (at.line + 0.5) * LINE) / tarry_plot_height(plot), "left");
}

static void set_legend(const tarry_plot *plot, tarry_text *script) {
    entry end = {LEGEND_LEFT, 0};
    int number = FIRST_ENTRY;
    for (size_t s = 0; s < plot->n_series; s++) {
        const tarry_plot_series *series = &plot->series[s];
        if (!names_anew(plot, s))
            continue;
        const bool filled = series->kind == TARRY_SERIES_BARS || series->kind == TARRY_SERIES_SHADE;
        const entry at = next_entry(&end, series->name);
        tarry_text_printf(script, filled ? "set object %d rectangle" : "set arrow %d", number);
        add_sample(plot, at, filled ? 3.5 : 0, script);
        tarry_text_add_string(script, filled ? " fillcolor rgb " : " nohead linecolor rgb ");
        add_look(series, script);
        tarry_text_add(script, "\n", 1);
        add_entry_name(plot, at, series->name, number++, script);
    }
    if (plot->mark_name) {
        const entry at = next_entry(&end, plot->mark_name);
        tarry_text_printf(script, "set arrow %d", number);
        add_sample(plot, at, 0, script);
        tarry_text_add_string(script, " nohead linecolor rgb grey linewidth 1.2 dashtype 3\n");
        add_entry_name(plot, at, plot->mark_name, number, script);
    }
}

/* ---- the script ----------------------------------------------------------------------------- */

static void set_terminal(const tarry_plot *plot, tarry_figure_format format, tarry_text *script) {
    const int height = tarry_plot_height(plot);
    const double cm = 2.54 / 96, dots = 300.0 / 96;
    if (format == TARRY_FIGURE_PDF) {
        tarry_text_add_string(script,
                              "set terminal pdfcairo noenhanced font 'sans-serif,7.5' size ");
        add_number(script, TARRY_PLOT_WIDTH * cm);
        tarry_text_add_string(script, "cm,");
        add_number(script, height * cm);
        tarry_text_add_string(script, "cm\n");
    } else if (format == TARRY_FIGURE_PNG) {
        tarry_text_printf(script,
                          "set terminal pngcairo noenhanced font 'sans-serif,7.5' fontscale 3.125 "
                          "linewidth 3.125 pointscale 3.125 size %.0f,%.0f\n",
                          TARRY_PLOT_WIDTH * dots, height * dots);
    } else {
        tarry_text_printf(script,
                          "set terminal svg noenhanced font 'sans-serif,10' size %d,%d dynamic "
                          "background 'white'\n",
                          TARRY_PLOT_WIDTH, height);
    }
}

static void write_head(const tarry_plot *plot, const char *stem, tarry_text *script) {
    tarry_text_printf(script,
                      "# %s, from %s.csv. Change what you like and run, in this folder:\n"
                      "#     gnuplot %s.gp\n"
                      "reset\nset encoding utf8\nmodel = ",
                      plot->heading, stem, stem);
    tarry_plot_quote(script, plot->title);
    tarry_text_printf(script, "\ndata = '%s.csv'\n", stem);
    for (int i = 0; i < TARRY_PLOT_COLOURS; i++)
        tarry_text_printf(script, "colour%d = '%s'\n", i + 1, colours[i]);
    tarry_text_add_string(script, "dark = '#000000'\ngrey = '#808080'\n");
}

static void write_settings(tarry_text *script) {
    tarry_text_add_string(script, "set datafile separator comma\n"
                                  "set datafile columnheaders\n"
                                  "set border 3\n"
                                  "set tics nomirror out scale 0.6\n"
                                  "set style fill transparent\n"
                                  "set bars 0\n");
    tarry_text_add_string(script, "unset key\nset multiplot\n");
}

/* 1, 2 or 5 times a power of ten, at least `step`. */
static double round_up(double step) {
    const double power = pow(10, floor(log10(step) + 1e-9));
    const double digit = step / power;
    return power * (digit <= 1 + 1e-9 ? 1 : digit <= 2 + 1e-9 ? 2 : digit <= 5 + 1e-9 ? 5 : 10);
}

static void set_axes(const tarry_plot *plot, size_t p, span x, span y, tarry_text *script) {
    const bool last = p + 1 == plot->n_panels;
    tarry_text_printf(script, "%s logscale y\n", plot->panels[p].log_y ? "set" : "unset");
    set_range(script, 'x', x);
    set_range(script, 'y', y);
    tarry_text_add_string(script, "foot = ");
    add_number(script, y.from);
    tarry_text_add_string(script, "; head = ");
    add_number(script, y.to);
    tarry_text_printf(script, "\nset format y '%%g'\n");
    tarry_text_printf(script, last || plot->own_x ? "set format x '%%g'\n" : "set format x ''\n");
    tarry_text_add_string(script, "set ytics ");
    if (plot->panels[p].log_y)
        tarry_text_add_string(script, "autofreq");
    else
        add_number(script, round_up((y.to - y.from) / Y_TICS));
    if (plot->whole_x) {
        tarry_text_add_string(script, "\nset xtics ");
        add_number(script, fmax(1, round_up((x.to - x.from) / X_TICS)));
    }
    tarry_text_add_string(script, "\nset xlabel ");
    tarry_plot_quote(script, last ? plot->x_label : "");
    tarry_text_add_string(script, " offset 0,0.5\n");
}

static void write_panel(const tarry_plot *plot, size_t p, int top, tarry_text *script) {
    const tarry_plot_panel *panel = &plot->panels[p];
    const int height = tarry_plot_height(plot), from = top + title_height(plot, p);
    const span x = x_range(plot, panel);
    tarry_text_add(script, "\n", 1);
    set_margin(script, "t", height - from, height);
    set_margin(script, "b", height - from - body_height(plot), height);
    set_axes(plot, p, x, y_range(plot, panel, x), script);
    if (*panel->title)
        set_label(script, 1, panel->title, (double)LEFT / TARRY_PLOT_WIDTH,
                  1 - (from - 0.5 * LINE) / height, "left");
    tarry_text_add_string(script, "unset arrow\n");
    if (p == 0)
        set_legend(plot, script);
    set_marks(plot, panel, x, script);
    tarry_text_add_string(script, "plot ");
    bool first = true;
    for (size_t s = panel->first_series; s < panel->first_series + panel->n_series; s++) {
        if (plot->series[s].n_rows == 0)
            continue;
        tarry_text_add_string(script, first ? "" : ", \\\n     ");
        add_series(plot, panel, &plot->series[s], script);
        first = false;
    }
    tarry_text_printf(script, "\nunset label\n%s", p == 0 ? "unset object\n" : "");
}

void tarry_plot_write_script(const tarry_plot *plot, const char *stem, const char *output,
                             tarry_figure_format format, tarry_text *script) {
    const int height = tarry_plot_height(plot);
    int top = TOP + LINE * legend_lines(plot);
    write_head(plot, stem, script);
    set_terminal(plot, format, script);
    tarry_text_printf(script, "set output '%s'\n", output);
    write_settings(script);
    set_margin(script, "l", LEFT, TARRY_PLOT_WIDTH);
    set_margin(script, "r", TARRY_PLOT_WIDTH - RIGHT, TARRY_PLOT_WIDTH);
    const double middle = 1 - 0.5 * (top + height - BOTTOM) / height;
    set_label(script, 2, plot->y_label, 7.0 / TARRY_PLOT_WIDTH, middle, "center rotate");
    for (size_t p = 0; p < plot->n_panels; p++) {
        write_panel(plot, p, top, script);
        top += panel_height(plot, p);
    }
    tarry_text_add_string(script, "\nunset multiplot\nset output\n");
    script->failed = script->failed || plot->failed;
}
