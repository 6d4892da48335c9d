/* SPDX-License-Identifier: GPL-3.0-or-later */

/* Distributions at the snapshots. Neighbouring bins are joined where there are more than can be
 * told apart; of what is joined the interval is Wilson's on the number of cells, since at one time
 * every cell speaks once. */
#include "report/figure_parts.h"

#include "base/error.h"
#include "base/memory.h"
#include "base/number.h"
#include "tally/jackknife.h"
#include "tally/real_bins.h"

#include <float.h>
#include <math.h>
#include <stdlib.h>
#include <string.h>

enum {
    MOST_SINGLE = 40,
    BINS = 36,
    SPIKE = 3, /* times as high as all others: the axis is logarithmic */
};

static const double tail = 0.002; /* share of cells that may lie beyond the picture, at each end */

/* Rows of one name at one time: a run of rows[from .. to). */
typedef struct snapshot_rows {
    size_t from, to;
    double time;
} snapshot_rows;

/* How the bins of a panel are joined. */
typedef struct joining {
    double origin, step; /* bins begin at origin + k step */
    double from, to;     /* of the picture */
} joining;

static bool same_time(double one, double other) {
    return fabs(other - one) <= 0 || (isnan(one) && isnan(other));
}

/* The snapshots of a name: at most TARRY_PLOT_SERIES, the last one among them. With `pooled` what
 * was pooled over the window in their place. */
static size_t find_snapshots(const tarry_figure_rows *rows, bool pooled,
                             snapshot_rows found[TARRY_PLOT_SERIES]) {
    size_t n = 0;
    for (size_t i = 0; i < rows->n;) {
        const double time = tarry_figure_number(rows, i, "time");
        size_t to = i + 1;
        while (to < rows->n && same_time(time, tarry_figure_number(rows, to, "time")))
            to++;
        if (isnan(time) == pooled) {
            found[n < TARRY_PLOT_SERIES ? n : TARRY_PLOT_SERIES - 1] = (snapshot_rows){i, to, time};
            n += n < TARRY_PLOT_SERIES;
        }
        i = to;
    }
    return n;
}

static double centre(const tarry_figure_rows *rows, size_t i, bool whole) {
    const double count = tarry_figure_number(rows, i, "count");
    return whole ? count + 0.5 * (tarry_figure_number(rows, i, "width") - 1) : count;
}

static joining join_bins(const tarry_figure_rows *rows, const snapshot_rows *shots, size_t n,
                         bool whole, bool pooled) {
    joining how = {0, 0, DBL_MAX, -DBL_MAX};
    double widest = 0;
    for (size_t s = 0; s < n; s++) {
        double below = 0;
        for (size_t i = shots[s].from; i < shots[s].to; i++) {
            const double width = tarry_figure_number(rows, i, "width");
            const double x = centre(rows, i, whole);
            widest = fmax(widest, width);
            if (below < 1 - tail)
                how.to = fmax(how.to, x + 0.5 * width);
            below += tarry_figure_number(rows, i, "probability");
            if (below > tail)
                how.from = fmin(how.from, x - 0.5 * width);
        }
    }
    const double n_bins = (how.to - how.from) / widest;
    const double edge = centre(rows, shots[0].from, whole) -
                        0.5 * tarry_figure_number(rows, shots[0].from, "width");
    const size_t single = pooled ? TARRY_REAL_BINS
                                 : MOST_SINGLE; /* to keep the table's intervals */
    how.step = widest * (n_bins > (double)single ? ceil(n_bins / BINS) : 1);
    how.origin = whole ? -0.5 : edge - how.step * ceil((edge - how.from) / how.step);
    return how;
}

/* All bins of the picture, those too that nothing fell into. One that is a bin of the table as it
 * stands has the table's interval. */
static void add_bins(const tarry_figure_rows *rows, const snapshot_rows *shot, const joining *how,
                     bool whole, double n_cells, tarry_plot *plot) {
    size_t i = shot->from;
    for (double k = floor((how->from - how->origin) / how->step + 1e-9);
         how->origin + k * how->step < how->to; k++) {
        const double end = how->origin + (k + 1) * how->step;
        double share = 0;
        size_t n = 0, last = 0;
        for (; i < shot->to && centre(rows, i, whole) < end; i++) {
            if (centre(rows, i, whole) < end - how->step)
                continue;
            share += tarry_figure_number(rows, i, "probability");
            last = i;
            n++;
        }
        const bool as_it_is = n == 1 && tarry_figure_number(rows, last, "width") >= how->step;
        tarry_estimate interval = tarry_wilson(share, n_cells);
        if (as_it_is)
            interval = (tarry_estimate){.low = tarry_figure_number(rows, last, "low"),
                                        .high = tarry_figure_number(rows, last, "high")};
        else if (n_cells < 2)
            interval = (tarry_estimate){.low = NAN, .high = NAN};
        tarry_plot_add_wide_row(plot, end - 0.5 * how->step, how->step, share, interval.low,
                                interval.high);
    }
}

/* The exact shares of the same bins. */
static void add_exact_bins(const tarry_figure_rows *rows, double time, const joining *how,
                           tarry_plot *plot) {
    tarry_figure_add_exact_series(plot);
    for (double k = floor((how->from - how->origin) / how->step + 1e-9);
         how->origin + k * how->step < how->to; k++) {
        const double end = how->origin + (k + 1) * how->step;
        double share = 0;
        for (size_t i = 0; i < rows->n; i++) {
            const double x = centre(rows, i, true);
            if (fabs(tarry_figure_number(rows, i, "time") - time) <= 1e-9 * (1 + time) &&
                x >= end - how->step && x < end)
                share += tarry_figure_number(rows, i, "probability");
        }
        if (share > 0)
            tarry_plot_add_wide_row(plot, end - 0.5 * how->step, how->step, share, NAN, NAN);
    }
    tarry_plot_drop_empty_series(plot);
}

/* "at 300 min" */
static const char *name_snapshot(tarry_figure_work *work, double time, tarry_plot *plot) {
    char number[TARRY_NUMBER_SIZE];
    tarry_number_write_rounded(time, 5, number);
    const char *name = tarry_arena_format(&work->arena, "at %s %s", number,
                                          work->network->time_unit);
    plot->failed = plot->failed || !name;
    return name ? name : "";
}

/* The largest bar of a series and the next to it. */
static void find_tops(const tarry_plot *plot, const tarry_plot_series *series, double tops[2]) {
    for (size_t r = 0; r < series->n_rows; r++) {
        const tarry_plot_row *row = &plot->rows[series->first_row + r];
        const double y = row->y / row->width;
        tops[1] = fmax(tops[1], fmin(tops[0], y));
        tops[0] = fmax(tops[0], y);
    }
}

/* Where most cells hold nothing, all else lies flat on a linear axis: it becomes logarithmic,
 * without the bins that are empty. */
static void choose_axis(tarry_plot *plot) {
    tarry_plot_panel *panel = &plot->panels[plot->n_panels - 1];
    double largest = 0, second = 0;
    for (size_t s = panel->first_series; s < plot->n_series; s++) {
        double tops[2] = {0, 0};
        find_tops(plot, &plot->series[s], tops);
        largest = fmax(largest, tops[0]);
        second = fmax(second, tops[1]);
    }
    panel->log_y = second > 0 && largest > SPIKE * second;
    if (panel->log_y)
        tarry_plot_drop_zeros(plot);
}

/* Films of data need no snapshots. */
static bool is_pooled(const tarry_figure_work *work) {
    return work->network->data && work->network->run.n_snapshots == 0;
}

static void add_panel(tarry_figure_work *work, const tarry_channel *channel, tarry_plot *plot) {
    const tarry_figure_rows rows = tarry_figure_rows_of(work, TARRY_TABLE_distribution,
                                                        channel->name);
    const bool whole = channel->species != TARRY_NONE;
    const bool pooled = is_pooled(work);
    snapshot_rows shots[TARRY_PLOT_SERIES];
    const size_t n = find_snapshots(&rows, pooled, shots);
    if (n == 0)
        return;
    tarry_plot_panel *panel = tarry_plot_add_panel(plot, tarry_figure_short_name(channel->name));
    if (!panel)
        return;
    const joining how = join_bins(&rows, shots, n, whole, pooled);
    panel->x_from = whole ? fmax(how.from, -0.5) : how.from;
    panel->x_to = how.to;
    for (size_t s = 0; s < n; s++) {
        tarry_plot_add_series(plot, TARRY_SERIES_DENSITY,
                              pooled ? "" : name_snapshot(work, shots[s].time, plot), (int)s);
        add_bins(&rows, &shots[s], &how, whole, (double)tarry_results_n_cells(work->results), plot);
    }
    const tarry_figure_rows exact = tarry_figure_exact_rows_of(work, TARRY_TABLE_distribution,
                                                               channel->name);
    for (size_t s = 0; whole && s < n; s++)
        add_exact_bins(&exact, shots[s].time, &how, plot);
    if (!plot->failed)
        choose_axis(plot);
}

int tarry_figure_counts(tarry_figure_work *work, const tarry_figure_subject *subject,
                        tarry_error *error) {
    tarry_plot plot = {.x_label = subject->of_signals ? "signal" : "molecules in a cell",
                       .y_label = subject->of_signals ? "density" : "probability of a count",
                       .x_name = subject->of_signals ? "signal" : "count",
                       .y_name = "probability",
                       .own_x = true,
                       .whole_x = !subject->of_signals};
    tarry_figure_words words = {.kind = subject->of_signals ? "distribution" : "counts",
                                .title = is_pooled(work)       ? "Values over all frames"
                                         : subject->of_signals ? "Signals at the snapshots"
                                                               : "Counts at the snapshots"};
    for (size_t i = 0; i < subject->n_channels && plot.n_panels < TARRY_PLOT_PANELS; i++)
        add_panel(work, &work->network->channels[subject->channels[i]], &plot);
    tarry_text_add_string(
        &words.caption,
        is_pooled(work)
            ? "Share of all frames of all cells by their value; where there are many "
              "neighbouring bins are joined, and the band of these counts each cell once."
            : "Share of cells by what they hold at each snapshot; where counts are "
              "many, neighbours are joined. On a logarithmic axis counts that no cell had "
              "are left out.");
    tarry_figure_add_band_words(work, &words.caption);
    tarry_text_printf(&words.alternative, "Distributions over cells for %s, a panel each.",
                      subject->words);
    return tarry_figure_finish(work, subject, &plot, &words, error);
}
